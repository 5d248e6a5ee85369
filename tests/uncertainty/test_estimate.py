"""An estimate: when first order is good enough, and what is reported when it is not."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy import stats

from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable, standard_deviates

Draws = NDArray[np.float64]
ONE = Variable("one", 0.0, 1.0)
TWO = Variable("two", 0.0, 1.0)


def linear(value: float, parts: dict[str, float]) -> Estimate:
    """A sum of normal inputs: linear by construction."""
    draws = np.full(DRAWS, value)
    for name, part in parts.items():
        draws = draws + part * Variable(name, 0.0, 1.0).draw()
    return Estimate(value, parts, draws)


def quadratic(bend: float) -> Estimate:
    """y = x + bend x^2 of a standard normal x: mean bend, variance 1 + 2 bend^2."""
    x = ONE.draw()
    return Estimate(0.0, {"one": 1.0}, x + bend * x**2)


def test_sum_of_normal_inputs_is_linear() -> None:
    estimate = linear(70.0, {"a": 1.2, "b": -0.5})
    assert estimate.is_linear
    assert estimate.u == estimate.first_order_u == pytest.approx(1.3)
    low, high = estimate.interval()
    # 1.960 standard uncertainties (JCGM 100, table G.1).
    assert (high - 70.0, 70.0 - low) == pytest.approx((1.96 * 1.3, 1.96 * 1.3), rel=1e-4)
    low, high = estimate.interval(0.99)
    assert high - 70.0 == pytest.approx(2.576 * 1.3, rel=1e-4)


@pytest.mark.parametrize(("bend", "is_linear"), [(0.0, True), (0.03, True), (0.1, False)])
def test_bend_sets_it_off(bend: float, is_linear: bool) -> None:
    # The 95 % interval of x + b x^2 lies at +/- 1.96 + 3.84 b: its middle is off by 3.84 b, so the
    # tolerated 0.2 u is a bend of 0.05.
    assert quadratic(bend).is_linear is is_linear
    assert quadratic(-bend).is_linear is is_linear


def test_tolerated_bend_costs_less_than_half_a_percent_of_coverage() -> None:
    # Exact coverage of the symmetric interval for the worst bend that passes: b = 0.2/3.84.
    bend = 0.2 / 3.84

    def root(y: float) -> float:
        return (-1.0 + math.sqrt(1.0 + 4.0 * bend * y)) / (2.0 * bend)

    held = stats.norm.cdf(root(1.96)) - stats.norm.cdf(root(-1.96))
    assert abs(held - 0.95) < 0.005


def test_bent_estimate_reports_its_draws() -> None:
    estimate = quadratic(0.3)
    assert estimate.u == pytest.approx(math.sqrt(1.0 + 2.0 * 0.3**2), rel=0.02)  # closed form
    low, high = estimate.interval()
    draws = np.sort(estimate.draws)
    assert (low, high) == pytest.approx(np.quantile(draws, [0.025, 0.975]))
    assert high > 1.5 * -low


def test_too_small_or_too_large_first_order_sets_it_off() -> None:
    draws = ONE.draw()
    assert Estimate(0.0, {"one": 1.0}, draws).is_linear
    assert not Estimate(0.0, {"one": 1.05}, draws).is_linear
    assert not Estimate(0.0, {"one": 0.95}, draws).is_linear
    assert not Estimate(0.2, {"one": 1.0}, draws).is_linear


def test_rectangular_input_alone_is_linear() -> None:
    camera = Variable("camera", 0.0, 1.0, "rectangular")
    estimate = Estimate(0.0, {"camera": 1.0}, camera.draw())
    assert estimate.is_linear
    # Its symmetric interval, 1.96 u, holds more than 95 %: the whole distribution ends at 1.73 u.
    assert estimate.interval()[1] > math.sqrt(3.0)


def test_a_single_lost_draw_sets_it_off() -> None:
    draws = ONE.draw().copy()
    draws[17] = np.nan
    estimate = Estimate(0.0, {"one": 1.0}, draws)
    assert not estimate.is_linear
    assert estimate.distribution.lost == 1
    assert estimate.u == pytest.approx(1.0, rel=0.02)


def test_without_solutions_there_is_no_uncertainty() -> None:
    draws = np.full(DRAWS, np.nan)
    draws[: DRAWS // 3] = 20.0
    estimate = Estimate(20.0, {"one": 1.0}, draws)
    assert not estimate.is_linear
    assert math.isnan(estimate.u)
    assert all(math.isnan(end) for end in estimate.interval())


def test_exact_estimate() -> None:
    estimate = Estimate(20.0, {}, np.full(DRAWS, 20.0))
    assert estimate.is_linear
    assert estimate.u == 0.0
    assert estimate.interval() == (20.0, 20.0)


def test_difference_loses_what_is_common() -> None:
    first = linear(50.0, {"camera": 1.0, "noise of a": 0.1})
    second = linear(40.0, {"camera": 1.0, "noise of b": 0.1})
    gap = first.minus(second)
    assert gap.value == 10.0
    assert gap.contributions["camera"] == 0.0
    assert gap.u == pytest.approx(0.1 * math.sqrt(2.0))
    assert gap.draws.std() == pytest.approx(0.1 * math.sqrt(2.0), rel=0.02)


def test_difference_to_itself_is_exact() -> None:
    estimate = quadratic(0.4)
    gap = estimate.minus(estimate)
    assert gap.value == 0.0
    assert gap.first_order_u == 0.0
    assert not gap.draws.any()


@settings(max_examples=50, deadline=None)
@given(
    first=st.dictionaries(st.sampled_from("abcde"), st.floats(-3.0, 3.0), min_size=1),
    second=st.dictionaries(st.sampled_from("abcde"), st.floats(-3.0, 3.0), min_size=1),
)
def test_difference_of_linear_estimates_by_draws_and_first_order(
    first: dict[str, float], second: dict[str, float]
) -> None:
    gap = linear(1.0, first).minus(linear(2.0, second))
    # Five independent sets of 20 000 draws: their sample correlations reach 2 %.
    assert gap.draws.std() == pytest.approx(gap.first_order_u, rel=0.03, abs=1e-9)


def test_halving_a_variable() -> None:
    parts = {"one": 2.0, "two": 0.7}
    estimate = linear(5.0, parts)
    halved = estimate.halved("one", standard_deviates("one", DRAWS, SEED, "normal"))
    assert halved == pytest.approx(5.0 + 1.0 * ONE.draw() + 0.7 * TWO.draw(), abs=1e-9)
    assert halved.std() == pytest.approx(math.hypot(1.0, 0.7), rel=0.02)
