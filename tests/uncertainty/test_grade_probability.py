"""A grade as a probability (JCGM 106), and which input would settle it."""

import math
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import stats

from tests.uncertainty.in_memory import scene_inputs
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct.inputs import Models, equation_of
from thermo_fix.criteria import Criterion, built_in, parse_criteria
from thermo_fix.grade import grade_finding
from thermo_fix.measure.spot import Spot, temperature_of
from thermo_fix.radiometry.blackbody import TotalModel
from thermo_fix.records import Camera, Finding, Grading, MeasuredRegion, SceneInputs, VariableWords
from thermo_fix.uncertainty.equation import CALIBRATION
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import DRAWS, Variable

LIKE = built_in()["neta-like-components"]
SCATTER = 4.0 * 0.5 / math.sqrt(DRAWS)
"""Four standard deviations of a share near one half."""


def measured(quantity: str, estimate: Estimate) -> MeasuredRegion:
    """A finding of which only one quantity is known."""
    finding = Finding(
        id="1.1",
        image="a.tif",
        zone="lug B",
        sense="hot",
        bbox_px=(0, 0, 5, 5),
        area_px=25,
        area_m2=None,
        u_area_m2=None,
        extreme_c=50.0,
        extreme_px=(2, 2),
        mean_c=49.0,
        reference_kind="like component",
        reference_name="lug A",
        reference_c=45.0,
        delta_k=5.0,
        u_extreme_k=1.0,
        u_delta_k=1.0,
    )
    words = {
        name: VariableWords(name, f"measure {name}", None, 0.0, "1")
        for name in estimate.contributions
    }
    return MeasuredRegion(finding, {quantity: estimate}, {}, None, words)


def graded(quantity: str, estimate: Estimate, criterion: Criterion = LIKE) -> Grading:
    (grading,) = grade_finding(measured(quantity, estimate), [criterion], {}).gradings
    return grading


def normal(value: float, u: float) -> Estimate:
    return Estimate(value, {"a": u}, Variable("a", value, u).draw())


# ---- probabilities -------------------------------------------------------------------------------


@pytest.mark.parametrize("value", [0.2, 1.0, 3.7, 4.0, 4.4, 9.0, 14.6, 15.4, 40.0])
@pytest.mark.parametrize("u", [0.1, 0.5, 2.0])
def test_chances_are_those_of_the_normal_distribution(value: float, u: float) -> None:
    # Classes of the criterion: from 1 watch, from 4 plan, above 15 act (data/criteria.toml); JCGM
    # 106:2012, 7.2: the probability of an interval is a difference of Phi.
    below = [stats.norm.cdf(limit, value, u) for limit in (1.0, 4.0, 15.0)]
    expected = {
        "none": below[0],
        "watch": below[1] - below[0],
        "plan": below[2] - below[1],
        "act": 1.0 - below[2],
    }
    grading = graded("like_difference", normal(value, u))
    assert sum(grading.chances.values()) == pytest.approx(1.0, abs=1e-12)
    for grade, chance in expected.items():
        assert grading.chances.get(grade, 0.0) == pytest.approx(chance, abs=SCATTER), grade
    likeliest = max(expected, key=lambda each: expected[each])
    if max(expected.values()) > 0.5 + SCATTER:
        assert (grading.grade or "none") == likeliest


def test_chance_of_a_higher_grade() -> None:
    finding = grade_finding(measured("like_difference", normal(4.4, 0.5)), [LIKE], {})
    assert finding.grade == "plan"
    assert finding.grade_probability == pytest.approx(stats.norm.cdf(0.8), abs=SCATTER)
    assert finding.worse_probability == pytest.approx(0.0, abs=1e-9)
    lower = grade_finding(measured("like_difference", normal(3.6, 0.5)), [LIKE], {})
    assert lower.grade == "watch"
    assert lower.worse_probability == pytest.approx(stats.norm.sf(0.8), abs=SCATTER)


def test_equal_chances_go_to_the_worse_grade() -> None:
    draws = np.repeat([3.5, 4.5], DRAWS // 2)
    grading = graded("like_difference", Estimate(4.0, {"a": 0.5}, draws))
    assert grading.chances["watch"] == grading.chances["plan"] == 0.5
    assert grading.grade == "plan"


def test_skewed_draws_are_taken_as_they_are() -> None:
    # Lognormal: median 3.9 just below the class limit, mean above it. P(X >= 4) in closed form.
    spread = 0.5
    draws = 3.9 * np.exp(spread * Variable("a", 0.0, 1.0).draw())
    grading = graded("like_difference", Estimate(3.9, {"a": 3.9 * spread}, draws))
    at_least = stats.norm.sf(math.log(4.0 / 3.9) / spread)
    above = stats.norm.sf(math.log(15.0 / 3.9) / spread)
    assert grading.chances["plan"] == pytest.approx(at_least - above, abs=SCATTER)
    assert grading.chances["act"] == pytest.approx(above, abs=SCATTER)


def test_lost_draws_do_not_count_for_any_grade() -> None:
    draws = Variable("a", 5.0, 0.1).draw().copy()
    draws[: DRAWS // 4] = np.nan
    grading = graded("like_difference", Estimate(5.0, {"a": 0.1}, draws))
    assert sum(grading.chances.values()) == pytest.approx(1.0)
    assert grading.chances["plan"] == pytest.approx(1.0)


def test_same_seed_same_chances() -> None:
    first = graded("like_difference", normal(4.1, 0.7))
    assert graded("like_difference", normal(4.1, 0.7)) == first


# ---- what would settle it ------------------------------------------------------------------------

LIMIT = parse_criteria(
    """
[[criterion]]
id = "limit"
title = "A limit of the test's own"
source = "this test"
quantity = "surface_c"
unit = "degC"
senses = ["hot"]
gaps = "none"
[[criterion.class]]
above = 70.0
label = "above"
text = "above"
grade = "act"
""",
    "limit.toml",
)[0]

Doubt = dict[str, float]
Change = Callable[[SceneInputs, Camera], tuple[SceneInputs, Camera]]


def surface(inputs: SceneInputs, camera: Camera, reading_c: float) -> Estimate:
    spot = Spot("finding 1.1", 0, reading_c + ZERO_CELSIUS_K, 0.745)
    return temperature_of(spot, equation_of(inputs, camera, Models(TotalModel(), None)))


def doubt_by_brute_force(inputs: SceneInputs, camera: Camera, reading_c: float) -> Doubt:
    """Doubt about the grade with the u of one input after the other halved, everything redone."""

    def doubt(changed: SceneInputs, taken: Camera) -> float:
        draws = surface(changed, taken, reading_c).draws
        above = float(np.mean(draws[np.isfinite(draws)] > 70.0))
        return min(above, 1.0 - above)

    found: Doubt = {}
    for key, given in inputs.values.items():
        halved = replace(inputs, values={**inputs.values, key: replace(given, u=given.u / 2.0)})
        found[given.name] = doubt(halved, camera)
    found[CALIBRATION] = doubt(inputs, replace(camera, accuracy_k=camera.accuracy_k / 2.0))
    found["noise of finding 1.1"] = doubt(inputs, replace(camera, noise_k=camera.noise_k / 2.0))
    less = replace(camera, nonuniformity_k=camera.nonuniformity_k / 2.0)
    found["non-uniformity of finding 1.1"] = doubt(inputs, less)
    return found


def reading_for(surface_c: float, inputs: SceneInputs, camera: Camera) -> float:
    """The reading that gives this surface temperature (bisection)."""
    low, high = -50.0, 400.0
    for _ in range(60):
        middle = (low + high) / 2.0
        equation = equation_of(inputs, camera, Models(TotalModel(), None))
        found = equation.temperature_k(middle + ZERO_CELSIUS_K)
        low, high = (low, middle) if found > surface_c + ZERO_CELSIUS_K else (middle, high)
    return middle


CASES = {
    "poor emissivity": (
        {"emissivity": (0.7, 0.06), "reflected_c": (22.0, 1.0), "air_c": (20.0, 1.0)},
        Camera(noise_k=0.05, accuracy_k=1.0, accuracy_fraction=0.0, nonuniformity_k=0.05),
        "emissivity",
    ),
    "poor camera": (
        {"emissivity": (0.95, 0.005), "reflected_c": (22.0, 1.0), "air_c": (20.0, 1.0)},
        Camera(noise_k=0.05, accuracy_k=4.0, accuracy_fraction=0.0, nonuniformity_k=0.05),
        CALIBRATION,
    ),
    "unknown surroundings": (
        {"emissivity": (0.5, 0.005), "reflected_c": (40.0, 8.0), "air_c": (20.0, 1.0)},
        Camera(noise_k=0.05, accuracy_k=0.5, accuracy_fraction=0.0, nonuniformity_k=0.05),
        "reflected_c",
    ),
    "noisy": (
        {"emissivity": (0.95, 0.003), "reflected_c": (22.0, 1.0), "air_c": (20.0, 1.0)},
        Camera(noise_k=1.5, accuracy_k=0.3, accuracy_fraction=0.0, nonuniformity_k=0.05),
        "noise",
    ),
    "thick air": (
        {
            "emissivity": (0.95, 0.003),
            "reflected_c": (22.0, 1.0),
            "air_c": (20.0, 1.0),
            "transmittance": (0.8, 0.05),
        },
        Camera(noise_k=0.05, accuracy_k=0.5, accuracy_fraction=0.0, nonuniformity_k=0.05),
        "transmittance",
    ),
}


@pytest.mark.parametrize("name", list(CASES))
@pytest.mark.parametrize("over_k", [-2.0, -0.7, 0.7, 2.0])
def test_settle_names_the_input_that_lowers_the_doubt_most(name: str, over_k: float) -> None:
    values, camera, _ = CASES[name]
    inputs = scene_inputs(**values)
    reading_c = reading_for(70.0 + over_k, inputs, camera)
    estimate = surface(inputs, camera, reading_c)
    assert estimate.value == pytest.approx(70.0 + over_k, abs=1e-3)
    grading = graded("surface_c", estimate, LIMIT)
    doubt = doubt_by_brute_force(inputs, camera, reading_c)
    best = min(doubt, key=lambda each: doubt[each])
    assert grading.settle.removeprefix("measure ") == best


@pytest.mark.parametrize("name", list(CASES))
def test_settle_names_the_one_that_dominates(name: str) -> None:
    values, camera, dominant = CASES[name]
    inputs = scene_inputs(**values)
    estimate = surface(inputs, camera, reading_for(71.0, inputs, camera))
    assert graded("surface_c", estimate, LIMIT).settle.startswith(f"measure {dominant}")


def test_no_doubt_nothing_to_settle() -> None:
    assert graded("like_difference", normal(8.0, 0.2)).settle == ""


def test_at_a_limit_the_largest_contribution_is_named() -> None:
    # Exactly on the limit halving any u leaves the chances at one half, and their scatter must not
    # choose; what is known worst decides on which side the estimate will come to lie.
    parts = {"c": 0.3, "a": -1.0, "b": 0.6}
    draws: NDArray[np.float64] = np.full(DRAWS, 15.0)
    for each, u in parts.items():
        draws = draws + u * Variable(each, 0.0, 1.0).draw()
    grading = graded("like_difference", Estimate(15.0, parts, draws))
    assert max(grading.chances.values()) == pytest.approx(0.5, abs=SCATTER)
    assert grading.settle == "measure a"
