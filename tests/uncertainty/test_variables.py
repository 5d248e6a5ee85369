"""Named variables: the same name is the same error, everywhere and always."""

import math
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from thermo_fix.errors import DomainError
from thermo_fix.uncertainty.variables import (
    DRAWS,
    SEED,
    Shape,
    Variable,
    standard_deviates,
    uniform_draws,
)


def test_same_name_same_draws_whatever_value_and_u() -> None:
    first = Variable("emissivity [scene]", 0.9, 0.02)
    second = Variable("emissivity [scene]", 0.5, 0.1)
    errors = (first.draw() - 0.9) / 0.02, (second.draw() - 0.5) / 0.1
    assert errors[0] == pytest.approx(errors[1], abs=1e-9)


def test_draws_are_the_same_in_another_process() -> None:
    code = (
        "from thermo_fix.uncertainty.variables import Variable\n"
        "print(*(repr(float(x)) for x in Variable('distance_m [scene]', 8.0, 0.4).draw(5)))"
    )
    said = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True
    ).stdout
    here = Variable("distance_m [scene]", 8.0, 0.4).draw(5)
    assert [float(each) for each in said.split()] == here.tolist()


def test_other_names_and_seeds_give_independent_draws() -> None:
    names = [f"variable {number}" for number in range(40)]
    draws = np.array([uniform_draws(name, DRAWS, SEED) for name in names])
    off = np.corrcoef(draws)[~np.eye(len(names), dtype=bool)]
    # A correlation of independent draws scatters by 1/sqrt(20000) = 0.0071; of 780 pairs the
    # greatest lies near 3.2 of those, and beyond 5 of them by chance once in 2000 times.
    assert np.abs(off).max() < 5.0 / math.sqrt(DRAWS)
    reseeded = uniform_draws(names[0], DRAWS, SEED + 1)
    assert abs(np.corrcoef(draws[0], reseeded)[0, 1]) < 5.0 / math.sqrt(DRAWS)


def test_shared_draws_cannot_be_written_to() -> None:
    draws = uniform_draws("x", 100, SEED)
    with pytest.raises(ValueError, match="read-only"):
        draws[0] = 0.5


@pytest.mark.parametrize("shape", ["normal", "rectangular"])
def test_distribution_is_the_one_named(shape: str) -> None:
    value, u = 3.0, 0.25
    variable = Variable("x", value, u, "normal" if shape == "normal" else "rectangular")
    half = u * math.sqrt(3.0)
    theory = stats.norm(value, u) if shape == "normal" else stats.uniform(value - half, 2.0 * half)
    draws = variable.draw()
    # Kolmogorov and Smirnov: 1.95/sqrt(n) is passed by chance once in 1000 times.
    assert stats.kstest(draws, theory.cdf).statistic < 1.95 / math.sqrt(DRAWS)
    assert draws.mean() == pytest.approx(value, abs=4.0 * u / math.sqrt(DRAWS))
    assert draws.std() == pytest.approx(u, rel=0.02)
    if shape == "rectangular":
        assert np.abs(draws - value).max() <= half


@pytest.mark.parametrize(
    ("value", "u", "lower", "upper"),
    [
        (0.97, 0.03, 1e-3, 1.0),  # near 1
        (0.05, 0.04, 1e-3, 1.0),  # near 0
        (0.5, 0.6, 1e-3, 1.0),  # both ends
        (1.0, 0.02, 1e-3, 1.0),  # at the bound
        (0.0, 0.5, 0.0, math.inf),  # a distance
    ],
)
def test_cut_distribution_stays_inside_and_is_the_truncated_normal(
    value: float, u: float, lower: float, upper: float
) -> None:
    variable = Variable("cut", value, u, lower=lower, upper=upper)
    assert variable.is_cut
    draws = variable.draw()
    assert draws.min() >= lower
    assert draws.max() <= upper
    theory = stats.truncnorm((lower - value) / u, (upper - value) / u, value, u)
    assert stats.kstest(draws, theory.cdf).statistic < 1.95 / math.sqrt(DRAWS)
    assert draws.mean() == pytest.approx(theory.mean(), abs=4.0 * u / math.sqrt(DRAWS))


def test_bounds_far_away_leave_the_normal_distribution_alone() -> None:
    free = Variable("x", 0.90, 0.02)
    bounded = Variable("x", 0.90, 0.02, lower=1e-3, upper=1.0)
    assert not bounded.is_cut
    assert np.array_equal(free.draw(), bounded.draw())


@given(
    value=st.floats(1e-3, 1.0),
    u=st.floats(1e-6, 2.0),
    name=st.text(min_size=1, max_size=5),
)
def test_no_emissivity_is_ever_drawn_outside_its_bounds(value: float, u: float, name: str) -> None:
    variable = Variable(name, value, u, lower=1e-3, upper=1.0)
    draws = variable.draw(500)
    assert np.isfinite(draws).all()
    if variable.is_cut:
        assert draws.min() >= 1e-3 - 1e-12
        assert draws.max() <= 1.0 + 1e-12
    else:
        # Bounds beyond three standard uncertainties: reached by 0.3 % of the draws at most.
        assert np.mean((draws < 1e-3) | (draws > 1.0)) < 0.02


def test_exact_input_is_a_constant() -> None:
    draws = Variable("x", 4.2, 0.0).draw(7)
    assert draws.tolist() == [4.2] * 7
    assert not Variable("x", 1.0, 0.0, lower=0.0, upper=1.0).is_cut


@pytest.mark.parametrize("u", [-0.1, math.nan])
def test_impossible_uncertainty_is_refused(u: float) -> None:
    with pytest.raises(DomainError, match="standard uncertainty cannot be"):
        Variable("x", 1.0, u)


@pytest.mark.parametrize("value", [-0.1, 1.1, math.nan])
def test_value_outside_its_bounds_is_refused(value: float) -> None:
    with pytest.raises(DomainError, match="lies outside"):
        Variable("emissivity", value, 0.1, lower=0.0, upper=1.0)


@pytest.mark.parametrize("shape", ["normal", "rectangular"])
def test_standard_deviates_are_those_of_the_variable(shape: str) -> None:
    kind: Shape = "normal" if shape == "normal" else "rectangular"
    draws = Variable("x", 5.0, 0.3, kind).draw()
    deviates = standard_deviates("x", DRAWS, SEED, kind)
    assert (draws - 5.0) / 0.3 == pytest.approx(deviates, abs=1e-9)
