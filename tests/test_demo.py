"""The demo surveys against what was planted in them."""

import json
import shutil
from pathlib import Path
from typing import Any

import pytest

from tests.scene_scoring import Score, score_result
from thermo_fix.demo import demo_surveys
from thermo_fix.records import Finding, SurveyResult
from thermo_fix.survey import RunOptions, run_survey

TRUTH: dict[str, list[dict[str, Any]]] = json.loads(
    (Path(__file__).parent / "data" / "demo_truth.json").read_text("utf-8")
)
BROKEN = {"building": "IR_0109.tif", "electrical": "IR_0208.tif"}


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> dict[str, SurveyResult]:
    done = {}
    for name, source in demo_surveys().items():
        folder = tmp_path_factory.mktemp("demo") / name
        shutil.copytree(source, folder)
        done[name] = run_survey(folder, options=RunOptions(jobs=1, planes=False, pictures=False))
    return done


def scored(results: dict[str, SurveyResult], name: str) -> Score:
    return score_result(results[name], TRUTH[name])


def test_both_surveys_are_there() -> None:
    assert sorted(demo_surveys()) == ["building", "electrical"]


@pytest.mark.parametrize("name", ["building", "electrical"])
def test_what_was_planted_is_found_and_nothing_else(
    results: dict[str, SurveyResult], name: str
) -> None:
    score = scored(results, name)
    print(f"\n{name}: {score.found}/{score.planted} found, {score.false} false")
    assert score.planted == {"building": 10, "electrical": 4}[name]
    assert score.missed_names == ()
    assert score.false_names == ()
    # The loose lug's warmth reaches into the conductor's zone, which makes two findings of it.
    assert score.area_share >= {"building": 0.8, "electrical": 0.75}[name], score.area_ratios


@pytest.mark.parametrize("name", ["building", "electrical"])
def test_truth_lies_within_the_stated_uncertainty(
    results: dict[str, SurveyResult], name: str
) -> None:
    # The demo camera is off and its sheet's inputs are rounded or taken from tables, on purpose.
    score = scored(results, name)
    assert score.coverage(factor=2.0) == 1.0, (score.extreme_errors_k, score.extreme_u_k)


@pytest.mark.parametrize("name", ["building", "electrical"])
def test_only_the_file_that_is_broken_on_purpose_fails(
    results: dict[str, SurveyResult], name: str
) -> None:
    assert [image.file for image in results[name].failed] == [BROKEN[name]]


def findings_of(results: dict[str, SurveyResult], name: str, file: str) -> tuple[Finding, ...]:
    (image,) = [image for image in results[name].images if image.file == file]
    return image.findings


def test_sound_images_have_no_finding(results: dict[str, SurveyResult]) -> None:
    for name, truths in TRUTH.items():
        for truth in truths:
            if truth.get("planted") == [] and not truth.get("explained"):
                assert findings_of(results, name, truth["file"]) == (), truth["file"]


def test_a_warmth_that_the_current_explains_is_one_finding_of_its_zone(
    results: dict[str, SurveyResult],
) -> None:
    (truth,) = [each for each in TRUTH["electrical"] if each.get("explained")]
    found = findings_of(results, "electrical", truth["file"])
    assert [finding.zone for finding in found] == [each["zone"] for each in truth["explained"]]


def test_every_finding_is_graded_and_says_its_uncertainty(
    results: dict[str, SurveyResult],
) -> None:
    for result in results.values():
        assert result.findings
        for finding in result.findings:
            assert finding.grade is not None
            assert finding.u_extreme_k is not None
            assert finding.u_extreme_k > 0.0
            assert finding.u_delta_k is not None
            # Errors that are common to a region and its reference drop out of a difference.
            assert finding.u_delta_k < finding.u_extreme_k
