"""The contents of ``findings.csv``: the findings, one a row."""

import csv
import math
import re
import unicodedata
from pathlib import Path

from thermo_fix.records import Finding, SurveyResult

COLUMNS = (
    "id",
    "image",
    "zone",
    "sense",
    "x0_px",
    "y0_px",
    "x1_px",
    "y1_px",
    "area_px",
    "area_m2",
    "extreme_degC",
    "extreme_x_px",
    "extreme_y_px",
    "mean_degC",
    "reference_kind",
    "reference",
    "reference_degC",
    "delta_K",
    "u_extreme_K",
    "u_delta_K",
    "grade",
    "grade_probability_1",
    "worse_probability_1",
    "criterion",
    "settle",
    "cautions",
)
_FORMULA_STARTS = ("=", "+", "-", "@")
_SEPARATORS = re.compile("([;\t\r\n]+)")


def write_table(path: Path, result: SurveyResult) -> None:
    """Write the findings as UTF-8 CSV (RFC 4180), worst first.

    A text that a spreadsheet would take for a formula is preceded by an apostrophe; so is a part
    of it that would stand in a cell of its own where semicolons, tabs or line ends separate.
    """
    # A file name that is no text keeps its odd bytes as escapes.
    with path.open("w", encoding="utf-8", errors="backslashreplace", newline="") as stream:
        writer = csv.writer(stream)
        writer.writerow(COLUMNS)
        for finding in result.findings:
            writer.writerow(_row(finding))


def _row(finding: Finding) -> list[str]:
    return [
        finding.id,
        _text(finding.image),
        _text(finding.zone or ""),
        finding.sense,
        *(str(edge) for edge in finding.bbox_px),
        str(finding.area_px),
        _number(finding.area_m2, 6),
        _number(finding.extreme_c, 2),
        str(finding.extreme_px[0]),
        str(finding.extreme_px[1]),
        _number(finding.mean_c, 2),
        finding.reference_kind,
        _text(finding.reference_name),
        _number(finding.reference_c, 2),
        _number(finding.delta_k, 2),
        _number(finding.u_extreme_k, 3),
        _number(finding.u_delta_k, 3),
        finding.grade or "",
        _number(finding.grade_probability, 3),
        _number(finding.worse_probability, 3),
        _text(finding.criterion or ""),
        _text(finding.settle),
        _text(" ".join(finding.cautions)),
    ]


def _number(value: float | None, digits: int) -> str:
    return "" if value is None or not math.isfinite(value) else f"{value:.{digits}f}"


def _text(text: str) -> str:
    pieces = _SEPARATORS.split(text)
    safe = "".join(f"'{piece}" if _is_like_formula(piece) else piece for piece in pieces)
    return f"'{safe}" if safe.startswith(("\t", "\r", "\n")) else safe


def _is_like_formula(text: str) -> bool:
    """Whether a spreadsheet might compute a text; it may pass over what cannot be seen.

    Full-width and small forms count as the signs that they stand for.
    """
    for character in text:
        if character.isprintable() and not character.isspace():
            return unicodedata.normalize("NFKC", character).startswith(_FORMULA_STARTS)
    return False
