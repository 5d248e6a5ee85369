"""The whole program against simulated surveys whose truth is known.

The simulator shares no code and no air model with the program. The bounds asserted here are our
own aims (common practice, no source); the figures reached are printed (pytest -s shows them).
"""

import json
from pathlib import Path

import pytest

from tests.scene_scoring import (
    HEADER,
    Score,
    added,
    line,
    main,
    overlap_px,
    score_folder,
    score_image,
)
from tests.simulator import KINDS, write_survey
from thermo_fix.records import Finding

GIVEN = Path(__file__).parent / "data" / "scenes"
IMAGES = 3
SHAPES = {11: (240, 320), 12: (120, 160), 13: (240, 320)}
"""Rows and columns by seed; the pixel type (degC, K, centikelvin) goes by the seed too."""


@pytest.fixture(scope="module")
def simulated(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Score]:
    """Scores of unperturbed surveys by kind and seed."""
    scores = {}
    for kind in KINDS:
        for seed in SHAPES:
            folder = tmp_path_factory.mktemp(f"{kind}-{seed}") / "survey"
            write_survey(folder, kind, seed, images=IMAGES, shape=SHAPES[seed])
            scores[f"{kind}-{seed}"] = score_folder(folder, folder.parent / "results")
    print()
    print(HEADER)
    for name, score in scores.items():
        print(line(name, score))
    print(line("total", added(scores.values())))
    return scores


def assert_aims(score: Score) -> None:
    names = (*score.missed_names, *score.false_names)
    assert not score.failed
    assert score.found_share >= 0.98, names
    assert score.false_share <= 0.03, names
    assert score.area_share >= 0.80, score.area_ratios
    assert score.extreme_share(0.3) >= 0.95, score.extreme_errors_k
    assert max(abs(error) for error in score.median_errors_k) <= 0.05


def test_planted_anomalies_are_found_and_measured(simulated: dict[str, Score]) -> None:
    total = added(simulated.values())
    assert total.planted >= 60  # else the shares say little
    assert_aims(total)


@pytest.mark.parametrize("kind", KINDS)
def test_no_kind_of_survey_is_left_behind(simulated: dict[str, Score], kind: str) -> None:
    score = added(each for name, each in simulated.items() if name.rsplit("-", 1)[0] == kind)
    assert score.planted > 0
    assert score.planted - score.found <= 1, score.missed_names
    assert score.false <= 1, score.false_names


@pytest.mark.parametrize("name", ["electrical-3", "hard-inside-8"])
def test_given_scenes(name: str, tmp_path: Path) -> None:
    score = score_folder(GIVEN / name, tmp_path / "results")
    assert score.planted == {"electrical-3": 5, "hard-inside-8": 9}[name]
    assert_aims(score)


@pytest.mark.parametrize(("kind", "seed"), [("building", 21), ("electrical", 22)])
def test_truth_lies_within_the_stated_uncertainty(kind: str, seed: int, tmp_path: Path) -> None:
    # Sheet inputs and camera offset are drawn with the uncertainties that the sheet states. The
    # offset is common to nothing but its image, so each image is one draw for a two-sided 99.7 %.
    folder = tmp_path / "survey"
    write_survey(folder, kind, seed, images=4, perturb=True, shape=(120, 160))
    score = score_folder(folder, tmp_path / "results")
    assert score.found_share == 1.0
    assert score.false == 0
    assert score.coverage(factor=3.0) == 1.0
    # The perturbation is felt, so the coverage is not a matter of course.
    assert max(abs(error) for error in score.median_errors_k) > 0.1


def test_sloping_edges_of_the_band_matter_little(tmp_path: Path) -> None:
    folder = tmp_path / "survey"
    write_survey(folder, "building", 31, images=3, response="soft", shape=(240, 320))
    score = score_folder(folder, tmp_path / "results")
    assert score.found_share == 1.0
    assert score.false == 0
    assert score.extreme_share(0.3) == 1.0
    assert max(abs(error) for error in score.median_errors_k) <= 0.1


# ---- the scoring itself ------------------------------------------------------------------------


def finding(box: tuple[int, int, int, int], sense: str = "hot", area_px: int = 100) -> Finding:
    return Finding(
        id="1.1",
        image="a.tif",
        zone=None,
        sense="hot" if sense == "hot" else "cold",
        bbox_px=box,
        area_px=area_px,
        area_m2=None,
        u_area_m2=None,
        extreme_c=31.0,
        extreme_px=(box[0], box[1]),
        mean_c=30.0,
        reference_kind="surroundings",
        reference_name="surroundings",
        reference_c=20.0,
        delta_k=11.0,
        u_extreme_k=0.4,
        u_delta_k=0.2,
    )


PLANTED = {
    "label": "spot",
    "sense": "hot",
    "delta_k": 11.0,
    "area_px": 80,
    "bbox_px": [10, 10, 20, 20],
    "true_extreme_c": 30.5,
}


def test_scoring_counts_a_match() -> None:
    score = score_image([finding((12, 12, 22, 22))], [PLANTED])
    assert (score.planted, score.found, score.findings, score.false) == (1, 1, 1, 0)
    assert score.area_ratios == (1.25,)
    assert score.extreme_errors_k == (0.5,)
    assert score.coverage(1.0) == 0.0
    assert score.coverage(2.0) == 1.0


@pytest.mark.parametrize(
    ("box", "sense", "found", "false"),
    [
        ((20, 10, 25, 20), "hot", 0, 0),  # beside the box: not found, but near enough
        ((23, 10, 28, 20), "hot", 0, 0),  # a gap of 3 pixels
        ((24, 10, 28, 20), "hot", 0, 1),  # a gap of 4 pixels
        ((12, 12, 22, 22), "cold", 0, 1),  # the other sense
        ((19, 19, 29, 29), "hot", 1, 0),  # one pixel of overlap
    ],
)
def test_scoring_of_near_misses(
    box: tuple[int, int, int, int], sense: str, found: int, false: int
) -> None:
    score = score_image([finding(box, sense)], [PLANTED])
    assert (score.found, score.false) == (found, false)


def test_scoring_of_nothing() -> None:
    assert score_image([], []).found_share == 1.0
    nothing_found = score_image([], [PLANTED])
    assert nothing_found.found_share == 0.0
    assert nothing_found.missed_names == ("planted 1 (spot, 11.0 K)",)


def test_overlap_of_boxes() -> None:
    assert overlap_px((0, 0, 4, 4), (2, 3, 9, 9)) == 2
    assert overlap_px((0, 0, 4, 4), (4, 0, 8, 4)) == 0


def test_scoring_as_a_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = tmp_path / "small survey"
    write_survey(folder, "building", 3, images=1, shape=(120, 160))
    planted = sum(
        len(each["planted"]) for each in json.loads((folder / "truth.json").read_text("utf-8"))
    )
    before = sorted(path.name for path in folder.iterdir())
    assert main([str(folder)]) == 0
    printed = capsys.readouterr().out.splitlines()
    assert printed[0] == HEADER
    assert printed[1].startswith("small survey")
    assert f"/{planted} " in printed[1]
    assert any(row.startswith("total") for row in printed)
    assert sorted(path.name for path in folder.iterdir()) == before
