"""The electrical trade, from a folder to what the results say of load, wind, phases and limits.

The tiny surveys hold surface temperatures that the test chooses: the camera's recorded settings
are those of the sheet, so that a reading is the surface temperature. Expected numbers follow from
them by the formula named beside them.
"""

import json
import shutil
from collections.abc import Callable, Mapping
from pathlib import Path

import numpy as np
import pytest
import tifffile
from numpy.typing import NDArray

from tests.sheets import IMAGE, ZONE, load, refused
from thermo_fix.demo import demo_surveys
from thermo_fix.records import (
    GRADES,
    Assessment,
    Condition,
    Finding,
    Grading,
    ImageResult,
    SurveyResult,
)
from thermo_fix.survey import RunOptions, run_survey

AIR_C = 20.0
SHAPE = (80, 150)
BOXES = {"A": (20, 15, 40, 65), "B": (65, 15, 85, 65), "C": (110, 15, 130, 65)}
HEAD = """
[survey]
purpose = "electrical"
[camera]
pixel = "celsius"
noise_k = 0.05
accuracy_k = 0.5
accuracy_fraction = 0.0
recorded = { emissivity = 0.95, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }
[radiation]
model = "band"
[scene]
emissivity = { value = 0.95, u = 0.01 }
reflected_c = { value = 20.0, u = 0.5 }
transmittance = { value = 1.0, u = 0.001 }
"""
AIR = "air_c = { value = 20.0, u = 0.2 }\n"

Picture = NDArray[np.float64]


def zone(name: str, extra: str = "") -> str:
    x0, y0, x1, y1 = BOXES[name]
    corners = f"[[{x0}, {y0}], [{x1}, {y0}], [{x1}, {y1}], [{x0}, {y1}]]"
    return f'[[image.zone]]\nname = "{name}"\npolygon = {corners}\nlike = "poles"\n{extra}\n'


def picture(levels: Mapping[str, float], around_c: float = AIR_C + 1.0) -> Picture:
    scene = np.full(SHAPE, around_c)
    for name, level in levels.items():
        x0, y0, x1, y1 = BOXES[name]
        scene[y0:y1, x0:x1] = level
    return scene


def run(
    folder: Path,
    scene: Picture,
    zones: Mapping[str, str],
    head: str = AIR,
    after: str = "[detect]\nmin_delta_k = 2.0\n",
    seed: int = 1,
) -> SurveyResult:
    noisy = scene + np.random.default_rng(seed).normal(0.0, 0.05, scene.shape)
    tifffile.imwrite(folder / "a.tif", noisy.astype(np.float32))
    sheet = HEAD + head + after + '[[image]]\nfile = "a.tif"\n'
    sheet += "".join(zone(name, extra) for name, extra in zones.items())
    (folder / "survey.toml").write_text(sheet, encoding="utf-8")
    return run_survey(folder, options=RunOptions(jobs=1, pictures=False))


def load_of(load_a: float | str, rated_a: float = 100.0) -> str:
    return f"load_a = {load_a}\nrated_a = {rated_a}"


def graded(finding: Finding, criterion: str, scenario: str = "") -> Grading:
    (found,) = [
        each
        for each in finding.gradings
        if (each.criterion, each.scenario) == (criterion, scenario)
    ]
    return found


def scenarios(finding: Finding) -> set[str]:
    return {each.scenario for each in finding.gradings} - {""}


def of_kind(said: Finding | ImageResult, kind: str) -> Assessment:
    (found,) = [each for each in said.assessments if each.kind == kind]
    return found


def figure(assessment: Assessment, label: str) -> tuple[float, float]:
    (found,) = [each for each in assessment.figures if each.label == label]
    assert found.value is not None
    return found.value, found.u or 0.0


def only(result: SurveyResult) -> Finding:
    (finding,) = result.findings
    return finding


def joint(scene: Picture, name: str, height_k: float) -> Picture:
    """A joint at the upper end of a zone, fading along it."""
    x0, y0, x1, y1 = BOXES[name]
    fade = height_k * np.exp(-np.arange(y1 - y0) / 10.0)
    result = scene.copy()
    result[y0:y1, x0:x1] += fade[:, np.newaxis]
    return result


# ---------------------------------------------------------------- load


def test_difference_and_rise_at_full_load(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    result = run(tmp_path, scene, dict.fromkeys("ABC", load_of(50.0)))
    finding = only(result)
    assert finding.zone == "B"
    factor = 2.0**1.75  # dT2 = dT1 (I2/I1)^n at half load with the default n = 1.75
    now = graded(finding, "neta-like-components")
    full = graded(finding, "neta-like-components", "full load")
    assert now.value is not None
    assert full.value == pytest.approx(now.value * factor, rel=0.03)
    rise = graded(finding, "neta-rise-over-air", "full load")
    assert rise.value is not None
    assert rise.value == pytest.approx((finding.extreme_c - AIR_C) * factor, rel=1e-6)
    # The exponent alone: u(ln factor) = ln 2 x 0.144.
    assert rise.u is not None
    assert rise.u >= rise.value * np.log(2.0) * 0.144
    assert now.grade == "plan"
    assert full.grade == "act"
    assert finding.grade == "plan", "a scenario does not head the finding"
    said = of_kind(finding, "load")
    assert "50% of the rated 100 A" in said.statement
    surface, _ = figure(said, "surface temperature, full load")
    assert surface == pytest.approx(AIR_C + rise.value)
    assert figure(said, "exponent n") == (1.75, 0.144)


def test_stated_load_and_exponent(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    head = AIR + "load_exponent = { value = 2.0, u = 0.05 }\ntarget_load_a = 80\n"
    finding = only(run(tmp_path, scene, dict.fromkeys("ABC", "load_a = 40"), head))
    assert scenarios(finding) == {"stated load"}
    rise = graded(finding, "neta-rise-over-air", "stated load")
    assert rise.value == pytest.approx((finding.extreme_c - AIR_C) * 4.0, rel=1e-6)
    assert "At stated load (80 A)" in of_kind(finding, "load").statement


def test_load_without_a_rating_says_what_it_needs(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    finding = only(run(tmp_path, scene, dict.fromkeys("ABC", "load_a = 40")))
    assert scenarios(finding) == set()
    assert "need rated_a" in of_kind(finding, "load").statement


def test_rating_without_a_load_adds_nothing(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    finding = only(run(tmp_path, scene, dict.fromkeys("ABC", "rated_a = 40")))
    assert scenarios(finding) == set()
    assert {each.kind for each in finding.assessments} == {"phases"}


def test_without_the_air_equal_loads_still_scale_the_difference(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    finding = only(run(tmp_path, scene, dict.fromkeys("ABC", load_of(50.0)), head=""))
    full = graded(finding, "neta-like-components", "full load")
    assert finding.delta_k is not None
    assert full.value == pytest.approx(finding.delta_k * 2.0**1.75)


def test_without_the_air_unequal_loads_do_not(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    loads = {"A": load_of(30.0), "B": load_of(50.0), "C": load_of(30.0)}
    finding = only(run(tmp_path, scene, loads, head=""))
    assert scenarios(finding) == set()
    assert "(air_c)" in of_kind(finding, "load").statement


def test_current_of_the_like_is_taken_as_the_same_where_not_told(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    finding = only(run(tmp_path, scene, {"A": "", "B": load_of(50.0), "C": ""}))
    full = graded(finding, "neta-like-components", "full load")
    assert finding.delta_k is not None
    assert full.value == pytest.approx(finding.delta_k * 2.0**1.75, rel=1e-6)
    assert "taken to carry the same current" in of_kind(finding, "load").statement


def test_heat_without_current_is_not_scaled(tmp_path: Path) -> None:
    scene = joint(picture({"A": 21.0, "B": 28.0, "C": 21.0}), "B", 4.0)
    finding = only(run(tmp_path, scene, dict.fromkeys("ABC", load_of(0))))
    assert finding.sense == "hot"
    assert scenarios(finding) == set()
    assert any("said to carry no current" in caution for caution in finding.cautions)
    assert "another source" in of_kind(finding, "load").statement


@pytest.mark.parametrize(("load_a", "cautioned"), [(100.0, False), (100.1, True)])
def test_overload_is_cautioned_not_refused(tmp_path: Path, load_a: float, cautioned: bool) -> None:
    scene = joint(picture({"A": 40.0, "B": 40.0, "C": 40.0}), "B", 8.0)
    result = run(tmp_path, scene, dict.fromkeys("ABC", load_of(load_a)))
    finding = only(result)
    assert any("overloaded" in caution for caution in finding.cautions) is cautioned
    assert any("more than its rated" in note for note in result.survey.notes) is cautioned


@pytest.mark.parametrize(("load_a", "far"), [(39.9, True), (40.0, False)])
def test_far_from_full_load(tmp_path: Path, load_a: float, far: bool) -> None:
    # 40 % of the rating: NETA MTS 2019 practice; NFPA 70B:2023, 7.4.
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    finding = only(run(tmp_path, scene, dict.fromkeys("ABC", load_of(load_a))))
    assert bool(of_kind(finding, "load").cautions) is far
    assert any("below 40 %" in caution for caution in finding.cautions) is far


def test_current_with_its_own_uncertainty(tmp_path: Path) -> None:
    scene = joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "B", 8.0)
    loose = dict.fromkeys("ABC", load_of("{ value = 50, u = 5 }"))
    tight = dict.fromkeys("ABC", load_of("{ value = 50, u = 0.1 }"))
    found = []
    for name, loads in (("loose", loose), ("tight", tight)):
        folder = tmp_path / name
        folder.mkdir()
        full = graded(only(run(folder, scene, loads)), "neta-rise-over-air", "full load")
        assert full.u is not None
        found.append(full.u)
    assert found[0] > 1.5 * found[1]


# ---------------------------------------------------------------- phases


def uneven(share_b: float, exponent: float = 1.75) -> Picture:
    return picture({"A": AIR_C + 9.0, "B": AIR_C + 9.0 * share_b**exponent, "C": AIR_C + 9.0})


def test_warm_phase_that_its_current_explains(tmp_path: Path) -> None:
    loads = {"A": load_of(50.0), "B": load_of(75.0), "C": load_of(50.0)}
    result = run(tmp_path, uneven(1.5), loads)
    finding = only(result)
    equal = graded(finding, "neta-like-components", "equal load")
    assert equal.value == pytest.approx(0.0, abs=0.3)
    assert equal.u is not None
    assert equal.grade is None
    said = of_kind(finding, "load")
    explained, _ = figure(said, "explained by the current")
    # rise_Y ((I_X / I_Y)^n - 1)
    assert explained == pytest.approx(9.0 * (1.5**1.75 - 1.0), abs=0.3)
    assert "may explain it all" in said.statement
    (image,) = result.images
    group = of_kind(image, "phases")
    assert group.statement.startswith("Pattern of an unbalanced load, B:")
    assert group.statement.endswith("before anything is done.")
    assert group.statement in of_kind(finding, "phases").statement


def test_warm_phase_that_its_current_does_not_explain(tmp_path: Path) -> None:
    loads = {"A": load_of(50.0), "B": load_of(55.0), "C": load_of(50.0)}
    result = run(tmp_path, uneven(1.5), loads)
    assert "does not explain it" in of_kind(result.images[0], "phases").statement
    finding = only(result)
    equal = graded(finding, "neta-like-components", "equal load")
    assert equal.value == pytest.approx(9.0 * (1.5**1.75 - 1.1**1.75), abs=0.3)
    assert equal.grade == "plan"


PATTERNS: dict[str, tuple[Picture, dict[str, str], str]] = {
    "hot connection": (
        joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "C", 9.0),
        dict.fromkeys("ABC", load_of(50.0)),
        "Pattern of a hot connection at C:",
    ),
    "hot connection, loads not told": (
        joint(picture({"A": 28.0, "B": 28.0, "C": 28.0}), "C", 9.0),
        dict.fromkeys("ABC", ""),
        "Pattern of a hot connection at C:",
    ),
    "load": (
        picture({"A": 26.0, "B": 26.0, "C": 26.0 + 6.0}),
        {"A": load_of(50.0), "B": load_of(50.0), "C": load_of(50.0 * 2.0 ** (1.0 / 1.75))},
        "Pattern of an unbalanced load, C:",
    ),
    "load, not told": (
        picture({"A": 26.0, "B": 26.0, "C": 32.0}),
        dict.fromkeys("ABC", ""),
        "Cannot tell: C is warmer over the whole length",
    ),
    "open": (
        picture({"A": 30.0, "B": 21.2, "C": 30.2}),
        dict.fromkeys("ABC", ""),
        "Pattern of a part without current, B:",
    ),
    "shared": (
        picture({"A": 48.0, "B": 48.3, "C": 47.8}),
        dict.fromkeys("ABC", load_of(80.0)),
        "Pattern of a cause that all share:",
    ),
    "alike": (
        picture({"A": 28.0, "B": 28.2, "C": 27.9}),
        dict.fromkeys("ABC", load_of(50.0)),
        "Alike:",
    ),
}


@pytest.mark.parametrize("seed", [1, 2, 3])
@pytest.mark.parametrize("name", PATTERNS)
def test_patterns_in_noise(tmp_path: Path, name: str, seed: int) -> None:
    scene, zones, start = PATTERNS[name]
    result = run(tmp_path, scene, zones, seed=seed)
    assert of_kind(result.images[0], "phases").statement.startswith(start)


def test_joint_in_the_part_that_is_in_the_middle_as_a_whole(tmp_path: Path) -> None:
    # A small spot leaves the median of its zone alone, so that the zone can be the middle one.
    scene = picture({"A": 28.6, "B": 28.0, "C": 27.4})
    scene[30:40, 68:80] += 20.0
    result = run(tmp_path, scene, dict.fromkeys("ABC", ""))
    assert "hot connection at B" in of_kind(result.images[0], "phases").statement


def test_no_group_no_pattern(tmp_path: Path) -> None:
    result = run(tmp_path, picture({"A": 28.0}), {"A": load_of(50.0)})
    assert result.images[0].assessments == ()


# ---------------------------------------------------------------- wind


def windy(folder: Path, head: str) -> SurveyResult:
    scene = joint(picture({"A": 25.0, "B": 25.0, "C": 25.0}), "B", 6.0)
    return run(folder, scene, dict.fromkeys("ABC", load_of(50.0)), AIR + head)


def wind_condition(result: SurveyResult) -> Condition | None:
    found = [each for each in result.conditions if each.name == "Wind"]
    return found[0] if found else None


def test_rise_without_wind(tmp_path: Path) -> None:
    result = windy(tmp_path, "outdoors = true\nwind_m_s = { value = 4.0, u = 0.3 }\n")
    finding = only(result)
    # 1.86 at 4 m/s: table in common use, no source; from memory.
    calm = graded(finding, "neta-rise-over-air", "without wind")
    assert calm.value is not None
    assert calm.value == pytest.approx((finding.extreme_c - AIR_C) * 1.86, rel=1e-6)
    both = graded(finding, "neta-rise-over-air", "full load without wind")
    assert both.value == pytest.approx(calm.value * 2.0**1.75, rel=1e-6)
    assert finding.delta_k is not None
    like = graded(finding, "neta-like-components", "without wind")
    assert like.value == pytest.approx(finding.delta_k * 1.86, rel=1e-6)
    assert "cools" in of_kind(finding, "wind").statement
    condition = wind_condition(result)
    assert condition is not None
    assert condition.state == "met"


@pytest.mark.parametrize(("wind", "state"), [(8.0, "met"), (8.01, "not met")])
def test_too_much_wind(tmp_path: Path, wind: float, state: str) -> None:
    result = windy(tmp_path, f"outdoors = true\nwind_m_s = {wind}\n")
    condition = wind_condition(result)
    assert condition is not None
    assert condition.state == state
    finding = only(result)
    assert ("without wind" in scenarios(finding)) is (state == "met")
    assert ("Not corrected" in of_kind(finding, "wind").statement) is (state == "not met")


@pytest.mark.parametrize("wind", [0.0, 1.0])
def test_calm_needs_no_correction(tmp_path: Path, wind: float) -> None:
    finding = only(windy(tmp_path, f"outdoors = true\nwind_m_s = {wind}\n"))
    assert "without wind" not in scenarios(finding)
    assert "needs no correction" in of_kind(finding, "wind").statement


def test_wind_not_told_outdoors(tmp_path: Path) -> None:
    result = windy(tmp_path, "outdoors = true\n")
    condition = wind_condition(result)
    assert condition is not None
    assert condition.state == "not told"
    assert "was not told" in of_kind(only(result), "wind").statement


@pytest.mark.parametrize("head", ["", "outdoors = false\n", "wind_m_s = 5\n"])
def test_indoors_there_is_no_wind(tmp_path: Path, head: str) -> None:
    result = windy(tmp_path, head)
    assert wind_condition(result) is None
    assert not any(each.kind == "wind" for each in only(result).assessments)
    noted = any("outdoors = true" in note for note in result.survey.notes)
    assert noted is head.startswith("wind")


# ---------------------------------------------------------------- limits


def limited(folder: Path, limit: str, head: str = "", load_a: float = 50.0) -> SurveyResult:
    scene = joint(picture({"A": 40.0, "B": 40.0, "C": 40.0}), "B", 26.0)
    extra = f"{load_of(load_a)}\nlimit = {limit}"
    return run(folder, scene, {**dict.fromkeys("AC", load_of(load_a)), "B": extra}, AIR + head)


def test_limit_as_measured_and_under_other_conditions(tmp_path: Path) -> None:
    result = limited(tmp_path, '"conductor insulation 75"', "design_air_c = 35\n")
    assert result.survey.criteria[-1] == "absolute-limit", "a limit brings its criterion along"
    finding = only(result)
    now = graded(finding, "absolute-limit")
    assert now.value == pytest.approx(finding.extreme_c)
    assert 60.0 < finding.extreme_c < 65.0
    assert now.grade is None
    rise = finding.extreme_c - AIR_C
    expected = {
        "design ambient": 35.0 + rise,
        "full load": AIR_C + rise * 2.0**1.75,
        "full load at design ambient": 35.0 + rise * 2.0**1.75,
    }
    for scenario, value in expected.items():
        found = graded(finding, "absolute-limit", scenario)
        assert found.value == pytest.approx(value, rel=1e-6)
        assert found.grade == "act"
    said = of_kind(finding, "limit")
    assert any("surface" in caution and "inside" in caution for caution in said.cautions)
    assert any("from memory" in caution for caution in said.cautions)
    margin, _ = figure(said, "margin as measured")
    assert margin == pytest.approx(75.0 - finding.extreme_c)


def test_limit_of_a_zone_wins_over_that_of_the_survey(tmp_path: Path) -> None:
    scene = joint(picture({"A": 40.0, "B": 40.0, "C": 40.0}), "B", 26.0)
    after = (
        '[detect]\nmin_delta_k = 2.0\n[criteria]\nuse = ["absolute-limit", "house-difference"]\n'
        "[criteria.settings]\nabsolute_limit_c = 200\n"
    )
    finding = only(run(tmp_path, scene, {"A": "", "B": "limit = 60.0", "C": ""}, AIR, after))
    assert graded(finding, "absolute-limit").grade == "act"
    other = tmp_path / "other"
    other.mkdir()
    finding = only(run(other, scene, dict.fromkeys("ABC", ""), AIR, after))
    assert graded(finding, "absolute-limit").grade is None


@pytest.mark.parametrize(("distance_k", "grade"), [(3.0, "watch"), (-3.0, "act"), (13.0, None)])
def test_both_sides_of_a_limit(tmp_path: Path, distance_k: float, grade: str | None) -> None:
    probe = tmp_path / "probe"
    probe.mkdir()
    hottest = only(limited(probe, "99")).extreme_c
    finding = only(limited(tmp_path, f"{hottest + distance_k:.2f}"))
    assert graded(finding, "absolute-limit").grade == grade


def test_limit_of_rise_goes_with_the_air(tmp_path: Path) -> None:
    # IEC 60034-1: 80 K for class B by resistance, whatever the air is up to 40 degC.
    result = limited(tmp_path, '"winding rise, class B"', "design_air_c = 35\n")
    finding = only(result)
    said = of_kind(finding, "limit")
    assert figure(said, "limit")[0] == pytest.approx(AIR_C + 80.0)
    assert scenarios(finding) >= {"full load"}
    assert not any("design" in scenario for scenario in scenarios(finding))
    now = graded(finding, "absolute-limit")
    assert now.u is not None
    assert finding.u_extreme_k is not None
    assert now.u > finding.u_extreme_k, "the error of the air counts"
    assert graded(finding, "absolute-limit", "full load").grade == "act"


def test_limit_of_rise_needs_the_air(tmp_path: Path) -> None:
    scene = joint(picture({"A": 40.0, "B": 40.0, "C": 40.0}), "B", 26.0)
    zones = {"A": "", "B": 'limit = "winding rise, class B"', "C": ""}
    finding = only(run(tmp_path, scene, zones, head=""))
    assert "air_c was not told" in of_kind(finding, "limit").statement
    assert graded(finding, "absolute-limit").grade is None


@pytest.mark.parametrize(("limit", "words"), [("75", "within their limits"), ("50", "A is above")])
def test_like_parts_that_are_all_too_hot(tmp_path: Path, limit: str, words: str) -> None:
    zones = dict.fromkeys("ABC", f"{load_of(100.0)}\nlimit = {limit}")
    result = run(tmp_path, picture({"A": 60.0, "B": 60.2, "C": 60.1}), zones)
    assert result.findings == ()
    assert words in of_kind(result.images[0], "limit").statement


# ---------------------------------------------------------------- the sheet


def test_keys_of_the_trade_are_inherited(tmp_path: Path) -> None:
    text = (
        "[scene]\noutdoors = true\nload_exponent = 1.8\ntarget_load_a = 70\ndesign_air_c = 40\n"
        'limit = "termination 75"\n'
        + IMAGE
        + ZONE
        + "outdoors = false\nlimit = 105\nload_a = { value = 12, u = 0.5 }\n"
    )
    (image,) = load(tmp_path, text).images
    (inner,) = image.zones
    assert image.inputs.limit is not None
    assert inner.inputs.limit is not None
    assert (image.inputs.limit.temperature_c, inner.inputs.limit.temperature_c) == (75.0, 105.0)
    assert (image.inputs.outdoors, inner.inputs.outdoors) == (True, False)
    assert (inner.inputs.target_load_a, inner.inputs.design_air_c) == (70.0, 40.0)
    exponent = inner.inputs.values["load_exponent"]
    assert (exponent.value, exponent.u, exponent.u_origin) == (1.8, 0.144, "assumed")
    assert (inner.load_a, inner.load_u_a) == (12.0, 0.5)


BAD: dict[str, tuple[str, tuple[str, ...]]] = {
    "exponent": ("[scene]\nload_exponent = 0.9\n", ("line 2", "between 1 and 2.5")),
    "exponent of percent": ("[scene]\nload_exponent = 175\n", ("between 1 and 2.5",)),
    "target 0": ("[scene]\ntarget_load_a = 0\n", ("above zero",)),
    "outdoors": ('[scene]\noutdoors = "yes"\n', ("true or false",)),
    "limit near": (
        '[scene]\nlimit = "conductor insulaton 75"\n',
        ('unknown limit "conductor insulaton 75"', '"conductor insulation 75"'),
    ),
    "limit below absolute zero": ("[scene]\nlimit = -300\n", ("absolute zero",)),
    "limit of a wrong type": ("[scene]\nlimit = true\n", ("text",)),
    "design": ("[scene]\ndesign_air_c = 4000\n", ("3000",)),
    "negative load": (IMAGE + ZONE + "load_a = -1\n", ("must not be below zero",)),
    "negative load in a table": (
        IMAGE + ZONE + "load_a = { value = -1, u = 1 }\n",
        ("must not be below zero",),
    ),
    "load in a wrong unit": (
        IMAGE + ZONE + "load_a = { value = 5, u = 50 }\n",
        ("larger than the value",),
    ),
}


@pytest.mark.parametrize("name", BAD)
def test_mistakes_in_the_keys_of_the_trade(tmp_path: Path, name: str) -> None:
    text, parts = BAD[name]
    (line,) = refused(tmp_path, text)
    for part in parts:
        assert part in line


# ---------------------------------------------------------------- the demo


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> SurveyResult:
    folder = tmp_path_factory.mktemp("demo") / "electrical"
    shutil.copytree(demo_surveys()["electrical"], folder)
    return run_survey(folder, options=RunOptions(jobs=1))


@pytest.fixture
def image_of(demo: SurveyResult) -> Callable[[str], ImageResult]:
    return lambda file: next(image for image in demo.images if image.file == file)


def test_demo_terminal_is_worse_at_full_load(image_of: Callable[[str], ImageResult]) -> None:
    (finding,) = image_of("IR_0206.tif").findings
    now = graded(finding, "neta-like-components")
    full = graded(finding, "neta-like-components", "full load")
    assert (now.grade, full.grade) == ("plan", "act")
    assert finding.grade is not None
    assert GRADES.index(full.grade or "note") > GRADES.index(finding.grade)
    # 4.4 K were planted at 11.3 of 25 A: 4.4 x (25 / 11.3)^1.75.
    assert full.value is not None
    assert full.u is not None
    assert abs(full.value - 4.4 * (25.0 / 11.3) ** 1.75) <= 2.0 * full.u
    assert "termination 90" in of_kind(finding, "limit").statement


def test_demo_feeder_is_explained_by_its_current(image_of: Callable[[str], ImageResult]) -> None:
    image = image_of("IR_0202.tif")
    assert "unbalanced load, feeder B" in of_kind(image, "phases").statement
    (finding,) = image.findings
    assert graded(finding, "neta-like-components", "equal load").grade is None


def test_demo_fuse_carries_no_current(image_of: Callable[[str], ImageResult]) -> None:
    image = image_of("IR_0203.tif")
    assert "without current, fuse 3" in of_kind(image, "phases").statement
    assert "without current, fuse 3" in of_kind(image.findings[0], "phases").statement


def test_demo_lug_is_a_hot_connection(image_of: Callable[[str], ImageResult]) -> None:
    groups = [each for each in image_of("IR_0201.tif").assessments if each.kind == "phases"]
    assert [each.title for each in groups] == ["Like zones: lugs", "Like zones: conductors"]
    assert "hot connection at lug B" in groups[0].statement
    assert "hot connection at conductor B" in groups[1].statement
    # The excess was planted with a decay of 30 pixels along the conductor.
    (fall,) = [each for each in groups[1].figures if each.label == "conductor B: fall along it"]
    assert "over 29 pixels" in fall.note or "over 3" in fall.note


def test_demo_results_hold_the_assessments(demo: SurveyResult) -> None:
    document = json.loads((demo.survey.folder / "results" / "findings.json").read_text("utf-8"))
    kinds = {each["kind"] for finding in document["findings"] for each in finding["assessments"]}
    assert kinds == {"load", "limit", "phases"}
    for finding in document["findings"]:
        for each in finding["assessments"]:
            assert each["statement"].endswith(".")
            assert each["source"]
