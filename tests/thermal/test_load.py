"""Rises under another load.

Expected numbers: dT2 = dT1 (I2/I1)^n in plain arithmetic, and n = 2/(1 + m) from a heat loss as
dT^(1 + m), unless a comment says otherwise.
"""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from thermo_fix.defaults import default_for
from thermo_fix.errors import DomainError
from thermo_fix.thermal.load import (
    EXPONENT_RANGE,
    LEAST_LOAD,
    difference_at_load,
    exponent_of_cooling,
    load_factor,
    rise_at_load,
)

# Rise at full load from 10 K at part load; power law, plain arithmetic, to 1e-3 K.
FROM_TEN_K = {
    1.5: {0.4: 39.528, 0.5: 28.284, 0.6: 21.517, 0.8: 13.975},
    1.6: {0.4: 43.322, 0.5: 30.314, 0.6: 22.644, 0.8: 14.291},
    1.8: {0.4: 52.035, 0.5: 34.822, 0.6: 25.08, 0.8: 14.943},
    2.0: {0.4: 62.5, 0.5: 40.0, 0.6: 27.778, 0.8: 15.625},
}

rises = st.floats(0.1, 100.0)
currents = st.floats(1.0, 1000.0)
exponents = st.floats(*EXPONENT_RANGE)


@pytest.mark.parametrize(
    ("exponent", "share", "expected"),
    [(n, share, value) for n, row in FROM_TEN_K.items() for share, value in row.items()],
)
def test_rise_at_full_load(exponent: float, share: float, expected: float) -> None:
    found = rise_at_load(10.0, share * 125.0, 125.0, exponent).rise_k
    assert found == pytest.approx(expected, abs=1e-3)


def test_exponents_of_cooling_laws() -> None:
    # Forced or linear, laminar and turbulent natural convection.
    assert exponent_of_cooling(0.0) == 2.0
    assert exponent_of_cooling(0.25) == pytest.approx(1.6, abs=1e-12)
    assert exponent_of_cooling(1.0 / 3.0) == pytest.approx(1.5, abs=1e-12)
    with pytest.raises(DomainError):
        exponent_of_cooling(-0.1)


@given(st.floats(0.0, 0.4), currents, currents)
def test_exponent_is_that_of_a_heat_balance(m: float, current_a: float, other_a: float) -> None:
    # Independent of the power law: solve I^2 r = c dT^(1 + m) for both currents.
    def balance(current: float) -> float:
        return float((current**2 * 1e-3) ** (1.0 / (1.0 + m)))

    expected = balance(other_a)
    found = rise_at_load(balance(current_a), current_a, other_a, exponent_of_cooling(m)).rise_k
    assert found == pytest.approx(expected, rel=1e-9)


def test_default_exponent_spans_the_published_range() -> None:
    # Published exponents of about 1.5 to 2 (Lyon, Orlove and Peters, Proc. SPIE 4020, 2000, from
    # memory); the 1.8 of IEEE C37.010 (from memory) lies inside.
    default = default_for("load_exponent")
    assert default.value is not None
    assert default.u is not None
    half_width = default.u * math.sqrt(3.0)
    assert default.value - half_width == pytest.approx(1.5, abs=1e-3)
    assert default.value + half_width == pytest.approx(2.0, abs=1e-3)


def test_least_load() -> None:
    # NETA MTS 2019 practice; NFPA 70B:2023, 7.4.
    assert LEAST_LOAD == 0.4


def test_same_load_changes_nothing() -> None:
    found = rise_at_load(12.5, 40.0, 40.0, 1.75)
    assert found.rise_k == 12.5
    assert found.by_rise == 1.0
    assert found.by_exponent == 0.0


@given(rises, currents, currents, exponents)
def test_there_and_back(rise_k: float, current_a: float, other_a: float, exponent: float) -> None:
    there = rise_at_load(rise_k, current_a, other_a, exponent).rise_k
    assert rise_at_load(there, other_a, current_a, exponent).rise_k == pytest.approx(rise_k)


@given(rises, currents, st.floats(1.01, 5.0), exponents)
def test_more_current_is_warmer_and_a_greater_exponent_more_so(
    rise_k: float, current_a: float, times: float, exponent: float
) -> None:
    more = rise_at_load(rise_k, current_a, times * current_a, exponent)
    assert more.rise_k > rise_k
    assert more.by_exponent > 0.0
    assert more.by_current < 0.0 < more.by_other
    less = rise_at_load(rise_k, times * current_a, current_a, exponent)
    assert less.rise_k < rise_k
    assert less.by_exponent < 0.0


@given(st.floats(1.0, 50.0), st.floats(5.0, 200.0), st.floats(5.0, 200.0), st.floats(1.4, 2.1))
def test_sensitivities_are_the_slopes(
    rise_k: float, current_a: float, other_a: float, exponent: float
) -> None:
    given_values = (rise_k, current_a, other_a, exponent)
    found = rise_at_load(*given_values)
    for place, slope in enumerate(found[1:]):
        step = 1e-5 * given_values[place]
        ends = []
        for sign in (1.0, -1.0):
            moved = list(given_values)
            moved[place] += sign * step
            ends.append(rise_at_load(*moved).rise_k)
        assert slope == pytest.approx((ends[0] - ends[1]) / (2.0 * step), rel=1e-5, abs=1e-7)


def test_no_current_at_the_other_load_is_no_rise() -> None:
    assert rise_at_load(10.0, 50.0, 0.0, 1.75) == (0.0, 0.0, 0.0, 0.0, 0.0)


@pytest.mark.parametrize(
    ("rise_k", "current_a", "other_a", "exponent", "words"),
    [
        (10.0, 0.0, 100.0, 1.75, "without current"),
        (10.0, -1.0, 100.0, 1.75, "without current"),
        (10.0, math.nan, 100.0, 1.75, "without current"),
        (10.0, 50.0, -1.0, 1.75, "cannot be negative"),
        (10.0, 50.0, math.nan, 1.75, "cannot be negative"),
        (-0.1, 50.0, 100.0, 1.75, "not warmer than the air"),
        (math.nan, 50.0, 100.0, 1.75, "not warmer than the air"),
        (math.inf, 50.0, 100.0, 1.75, "not warmer than the air"),
        (10.0, 50.0, 100.0, 0.99, "exponent"),
        (10.0, 50.0, 100.0, 2.51, "exponent"),
        (10.0, 50.0, 100.0, math.nan, "exponent"),
    ],
)
def test_what_cannot_be_scaled_is_refused(
    rise_k: float, current_a: float, other_a: float, exponent: float, words: str
) -> None:
    with pytest.raises(DomainError, match=words):
        rise_at_load(rise_k, current_a, other_a, exponent)


def test_ends_of_the_range_are_accepted() -> None:
    assert rise_at_load(0.0, 50.0, 100.0, 1.0).rise_k == 0.0
    assert rise_at_load(10.0, 50.0, 100.0, 2.5).rise_k == pytest.approx(10.0 * 2.0**2.5)


def test_draws_of_the_exponent_may_reach_beyond() -> None:
    exponent = np.array([0.9, 1.75, 2.6])
    found = load_factor(50.0, 100.0, exponent)
    assert np.allclose(found, 2.0**exponent)


def test_difference_of_unequal_currents_at_one_load() -> None:
    # Two sound parts whose rises go with the square of the current: nothing is left.
    rise, like = 18.0 * (88.0 / 125.0) ** 2, 18.0 * (62.0 / 125.0) ** 2
    assert difference_at_load(rise, 88.0, like, 62.0, 88.0, 2.0) == pytest.approx(0.0, abs=1e-12)
    assert difference_at_load(rise, 88.0, like, 62.0, 125.0, 2.0) == pytest.approx(0.0, abs=1e-12)
    # A fault on top of that scales by the factor of its own current.
    more = difference_at_load(rise + 3.0, 88.0, like, 62.0, 125.0, 2.0)
    assert more == pytest.approx(3.0 * (125.0 / 88.0) ** 2)
