"""The contents of ``findings.json``. Its JSON Schema is ``data/findings.schema.json``."""

import json
import math
from collections.abc import Iterable
from pathlib import Path
from typing import Any

from thermo_fix.records import (
    Assessment,
    BudgetLine,
    Finding,
    Grading,
    ImageResult,
    InputLine,
    SurveyResult,
)
from thermo_fix.version import __version__

SCHEMA_VERSION = 1


def findings_document(
    result: SurveyResult, *, run_time: str, sheet_sha256: str | None
) -> dict[str, Any]:
    """Return the whole survey result as JSON values.

    Parameters
    ----------
    result
        Of the run.
    run_time
        ISO 8601; the only thing that differs between two runs.
    sheet_sha256
        Hash of the survey sheet; None without one.

    Returns
    -------
    dict
        Temperatures in degC, differences and uncertainties (k = 1) in K; null where not known.

    """
    survey = result.survey
    return {
        "schema": SCHEMA_VERSION,
        "tool": {"name": "thermo_fix", "version": __version__, "run_time": run_time},
        "survey": {
            "title": survey.title,
            "purpose": survey.purpose,
            "date": None if survey.date is None else survey.date.isoformat(),
            "surveyor": survey.surveyor,
            "sheet_sha256": sheet_sha256,
            "radiation_model": survey.model,
            "criteria": list(survey.criteria),
            "criteria_settings": dict(survey.criteria_settings),
            "notes": list(survey.notes),
            "cautions": list(result.cautions),
            "conditions": [
                {
                    "name": each.name,
                    "state": each.state,
                    "value": each.value,
                    "rule": each.rule,
                    "source": each.source,
                }
                for each in result.conditions
            ],
        },
        "images": [_image(image) for image in result.images],
        "findings": [
            _finding(finding, _sharing(image.findings))
            for image in result.images
            for finding in image.findings
        ],
    }


def write_document(path: Path, document: dict[str, Any]) -> None:
    """Write a document as UTF-8 JSON, one key a line, without NaN."""
    text = json.dumps(document, ensure_ascii=False, indent=1, allow_nan=False)
    # A file name that is no text keeps its odd bytes as JSON escapes.
    path.write_text(text + "\n", encoding="utf-8", errors="backslashreplace", newline="\n")


def _image(image: ImageResult) -> dict[str, Any]:
    return {
        "file": image.file,
        "sha256": image.sha256,
        "status": image.status,
        "error": image.error,
        "asset": image.asset,
        "taken": None if image.taken is None else image.taken.isoformat(),
        "width": image.width,
        "height": image.height,
        "inputs": [_input(line) for line in image.inputs],
        "unsolved_px": image.unsolved_px,
        "min_c": _number(image.min_c),
        "median_c": _number(image.median_c),
        "max_c": _number(image.max_c),
        "u_median_k": _number(image.u_median_k),
        "recorded_median_c": _number(image.recorded_median_c),
        "notes": list(image.notes),
        "cautions": list(image.cautions),
        "assessments": [_assessment(each) for each in image.assessments],
    }


def _input(line: InputLine) -> dict[str, Any]:
    return {
        "key": line.key,
        "where": line.where,
        "value": _number(line.value),
        "text": line.text,
        "u": _number(line.u),
        "unit": line.unit,
        "origin": line.origin,
        "note": line.note,
    }


def _sharing(findings: Iterable[Finding]) -> dict[str, list[str]]:
    """Return the findings of one image that each variable concerns."""
    sharing: dict[str, list[str]] = {}
    for finding in findings:
        for line in finding.budget:
            if line.contribution_k > 0.0:
                sharing.setdefault(line.name, []).append(finding.id)
    return sharing


def _finding(finding: Finding, sharing: dict[str, list[str]]) -> dict[str, Any]:
    def lines(budget: Iterable[BudgetLine]) -> list[dict[str, Any]]:
        return [
            {
                "input": line.input,
                "variable": line.name,
                "value": _number(line.value),
                "u": _number(line.u),
                "unit": line.unit,
                "sensitivity": _number(line.sensitivity),
                "contribution_k": _number(line.contribution_k),
                "correlated_with": [
                    other for other in sharing.get(line.name, []) if other != finding.id
                ],
            }
            for line in budget
        ]

    budget = lines(finding.budget)
    return {
        "id": finding.id,
        "image": finding.image,
        "zone": finding.zone,
        "sense": finding.sense,
        "bbox_px": list(finding.bbox_px),
        "area_px": finding.area_px,
        "area_m2": _number(finding.area_m2),
        "u_area_m2": _number(finding.u_area_m2),
        "extreme_c": _number(finding.extreme_c),
        "extreme_px": list(finding.extreme_px),
        "mean_c": _number(finding.mean_c),
        "apparent_c": _number(finding.apparent_c),
        "reference_kind": finding.reference_kind,
        "reference_name": finding.reference_name,
        "reference_c": _number(finding.reference_c),
        "delta_k": _number(finding.delta_k),
        "u_extreme_k": _number(finding.u_extreme_k),
        "u_delta_k": _number(finding.u_delta_k),
        "interval95_c": None
        if finding.interval_c is None
        else [_number(end) for end in finding.interval_c],
        "uncertainty_method": finding.method,
        "model_difference_k": _number(finding.model_difference_k),
        "grade": finding.grade,
        "grade_probability": _number(finding.grade_probability),
        "worse_probability": _number(finding.worse_probability),
        "criterion": finding.criterion,
        "settle": finding.settle,
        "gradings": [_grading(each) for each in finding.gradings],
        "assessments": [_assessment(each) for each in finding.assessments],
        "cautions": list(finding.cautions),
        "contours": [[list(point) for point in contour] for contour in finding.contours],
        "budget": budget,
        "delta_budget": lines(finding.delta_budget),
        "correlated_with": sorted({other for line in budget for other in line["correlated_with"]}),
    }


def _grading(grading: Grading) -> dict[str, Any]:
    return {
        "criterion": grading.criterion,
        "scenario": grading.scenario,
        "quantity": grading.quantity,
        "value": _number(grading.value),
        "u": _number(grading.u),
        "unit": grading.unit,
        "grade": grading.grade,
        "class": grading.class_label,
        "class_text": grading.class_text,
        "chances": {grade: _number(chance) for grade, chance in grading.chances.items()},
        "missing": list(grading.missing),
        "settle": grading.settle,
        "note": grading.note,
    }


def _assessment(assessment: Assessment) -> dict[str, Any]:
    return {
        "kind": assessment.kind,
        "title": assessment.title,
        "statement": assessment.statement,
        "figures": [
            {
                "label": each.label,
                "value": _number(each.value),
                "u": _number(each.u),
                "unit": each.unit,
                "note": each.note,
            }
            for each in assessment.figures
        ],
        "cautions": list(assessment.cautions),
        "source": assessment.source,
    }


def _number(value: float | None) -> float | None:
    """Return a number that JSON can hold, to nine significant digits."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{value:.9g}")
