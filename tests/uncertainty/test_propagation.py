"""The worked examples of JCGM 100, JCGM 101 and others through the program's own propagation.

Expected values: ``tests/data/published_uncertainty_checks.json``, each row with its source, how it
was obtained and its tolerance. Where a Monte Carlo result is compared, the tolerance adds the
scatter of the draws.
"""

import math
from collections.abc import Iterator

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy import constants, stats

from tests.uncertainty.published import expected, inputs, names
from thermo_fix.errors import DomainError
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.propagation import (
    as_distribution,
    combined_u,
    coverage_factor,
    difference,
    effective_freedom,
    monte_carlo,
)
from thermo_fix.uncertainty.variables import Variable, uniform_draws

TRIALS = 1_000_000
Draws = NDArray[np.float64]


@pytest.fixture(autouse=True)
def _forget_draws() -> Iterator[None]:
    yield
    # A million draws for each variable would be kept for the rest of the run.
    uniform_draws.cache_clear()


def rectangular(name: str, low: float, high: float) -> Variable:
    # JCGM 100:2008, 4.3.7.
    return Variable(name, (low + high) / 2.0, (high - low) / math.sqrt(12.0), "rectangular")


def test_every_row_names_its_source() -> None:
    assert len(names()) == 22
    for name in names():
        assert expected(name)


# ---- JCGM 100 -----------------------------------------------------------------------------------


def _end_gauge() -> tuple[dict[str, float], dict[str, float]]:
    """Contributions and freedom of H.1: l = ls + d - ls (dalpha theta + alphas dtheta)."""
    row = inputs("H1")
    ls, theta, alphas = row["ls_nm"][0], row["theta"][0], row["alphas"][0]
    dalpha, dtheta = row["dalpha"][0], row["dtheta"][0]
    slopes = {
        "ls_nm": 1.0 - (dalpha * theta + alphas * dtheta),
        "d_nm": 1.0,
        "alphas": -ls * dtheta,
        "theta": -ls * dalpha,
        "dalpha": -ls * theta,
        "dtheta": -ls * alphas,
    }
    parts = {key: slope * row[key][1] for key, slope in slopes.items()}
    freedom = {key: row[key][2] for key in slopes if row[key][2] != "inf"}
    return parts, freedom


def test_end_gauge_first_order() -> None:
    parts, freedom = _end_gauge()
    row = expected("H1")
    assert [abs(part) for part in parts.values()] == pytest.approx(
        row["contributions_nm"], abs=0.05
    )
    u = combined_u(parts)
    assert u == pytest.approx(row["uc_nm"], abs=0.01)
    assert round(u) == row["printed_uc"]
    effective = effective_freedom(parts, freedom)
    assert effective == pytest.approx(row["veff"], abs=0.01)
    # The guide truncates the effective degrees of freedom to the next lower integer (G.4.1).
    assert math.floor(effective) == row["printed_veff"]
    k = coverage_factor(0.99, math.floor(effective))
    assert k == pytest.approx(row["k99"], abs=0.005)
    assert round(k * round(u)) == row["U99_printed"]


def test_end_gauge_with_second_order_terms() -> None:
    row = inputs("H1")
    ls = row["ls_nm"][0]
    parts, _ = _end_gauge()
    # JCGM 100, H.1.7: the products of two inputs whose other factor is zero.
    parts["theta x dalpha"] = ls * row["theta"][1] * row["dalpha"][1]
    parts["alphas x dtheta"] = ls * row["alphas"][1] * row["dtheta"][1]
    assert combined_u(parts) == pytest.approx(expected("H1_second"), abs=1.0)
    assert combined_u(parts) == pytest.approx(33.911, abs=0.001)  # computed in the same row


def test_end_gauge_by_monte_carlo_finds_the_second_order_terms() -> None:
    row = inputs("H1")
    keys = ("ls_nm", "d_nm", "alphas", "theta", "dalpha", "dtheta")
    variables = [Variable(key, row[key][0], row[key][1]) for key in keys]

    def length(
        ls: Draws, d: Draws, alphas: Draws, theta: Draws, dalpha: Draws, dtheta: Draws
    ) -> Draws:
        return ls + d - ls * (dalpha * theta + alphas * dtheta)

    found = monte_carlo(length, variables, draws=TRIALS)
    assert found.mean == pytest.approx(expected("H1")["l_nm"], abs=0.2)
    # Products of independent normal inputs have exactly the variance of first plus second order;
    # the draws scatter by 0.07 %.
    assert found.u == pytest.approx(33.911, rel=0.003)


def _impedance() -> tuple[dict[str, dict[str, float]], dict[tuple[str, str], float]]:
    """H.2: contributions of V, I, phi to R, X, Z, and the correlations of the means."""
    row = inputs("H2")
    data = np.array([row["V"], np.array(row["I_mA"]) * 1e-3, row["phi_rad"]])
    v, i, phi = data.mean(axis=1)
    u = data.std(axis=1, ddof=1) / math.sqrt(data.shape[1])
    r = np.corrcoef(data)
    slopes = {
        "R": (math.cos(phi) / i, -v * math.cos(phi) / i**2, -v * math.sin(phi) / i),
        "X": (math.sin(phi) / i, -v * math.sin(phi) / i**2, v * math.cos(phi) / i),
        "Z": (1.0 / i, -v / i**2, 0.0),
    }
    names = ("V", "I", "phi")
    parts = {
        output: {name: slope * every for name, slope, every in zip(names, each, u, strict=True)}
        for output, each in slopes.items()
    }
    return parts, {
        ("V", "I"): float(r[0, 1]),
        ("V", "phi"): float(r[0, 2]),
        ("I", "phi"): float(r[1, 2]),
    }


def test_correlated_inputs() -> None:
    parts, correlations = _impedance()
    row = expected("H2")
    for (first, second), r in correlations.items():
        assert r == pytest.approx(row["r_inputs"][f"{first},{second}"], abs=0.005)
    unrounded = {"R": 0.07107, "X": 0.29558, "Z": 0.23634}  # tolerance column of the row
    for output, contributions in parts.items():
        u = combined_u(contributions, correlations)
        assert u == pytest.approx(row[output][1], abs=0.001)
        assert u == pytest.approx(unrounded[output], abs=1e-5)


def test_correlation_of_outputs_through_their_difference() -> None:
    # u^2(y1 - y2) = u1^2 + u2^2 - 2 r u1 u2 (JCGM 100, F.1.2.3): the same contributions that give a
    # difference of two temperatures give their correlation.
    parts, correlations = _impedance()
    for pair, r in expected("H2")["r_outputs_computed"].items():
        first, second = pair.split(",")
        u1, u2 = (combined_u(parts[each], correlations) for each in (first, second))
        gap = combined_u(difference(parts[first], parts[second]), correlations)
        assert (u1**2 + u2**2 - gap**2) / (2.0 * u1 * u2) == pytest.approx(r, abs=0.001)


def test_coverage_factor_and_effective_freedom() -> None:
    row = expected("k")
    assert coverage_factor(0.99, 16) == pytest.approx(row["k"], abs=0.005)
    four = dict.fromkeys("abcd", 1.0)
    assert effective_freedom(four, dict.fromkeys("abcd", 10.0)) == pytest.approx(row["veff"])
    two = effective_freedom({"a": 0.57, "b": 0.25}, {"a": 9.0})
    assert two == pytest.approx(expected("welch2"), abs=0.1)
    # Normal distribution, JCGM 100 table G.1: 1.960 for 95 %, 2.576 for 99 %.
    assert coverage_factor(0.95) == pytest.approx(1.960, abs=5e-4)
    assert coverage_factor(0.99) == pytest.approx(2.576, abs=5e-4)
    assert effective_freedom({"a": 1.0}, {}) == math.inf


@pytest.mark.parametrize("probability", [0.0, 1.0, -0.5, 95.0])
def test_coverage_probability_out_of_range_is_refused(probability: float) -> None:
    with pytest.raises(DomainError, match="between 0 and 1"):
        coverage_factor(probability)


@pytest.mark.parametrize(
    ("pair", "r", "said"),
    [
        (("a", "b"), 1.2, "not in -1 to 1"),
        (("a", "c"), 0.5, "both must contribute"),
        (("a", "a"), 0.5, "both must contribute"),
    ],
)
def test_impossible_correlations_are_refused(pair: tuple[str, str], r: float, said: str) -> None:
    with pytest.raises(DomainError, match=said):
        combined_u({"a": 1.0, "b": 2.0}, {pair: r})


parts_strategy = st.dictionaries(
    st.sampled_from("abcdef"), st.floats(-100.0, 100.0, allow_subnormal=False), min_size=1
)


@given(parts_strategy)
def test_fully_correlated_inputs_add_up(parts: dict[str, float]) -> None:
    # JCGM 100, 5.2.2 note 1: with all r = 1 the combined u is the linear sum.
    pairs = [(a, b) for a in parts for b in parts if a < b]
    u = combined_u(parts, dict.fromkeys(pairs, 1.0))
    assert u == pytest.approx(abs(sum(parts.values())), abs=1e-4)


@given(parts_strategy, parts_strategy)
def test_difference_is_linear(first: dict[str, float], second: dict[str, float]) -> None:
    net = difference(first, second)
    assert set(net) == {*first, *second}
    assert math.fsum(net.values()) == pytest.approx(
        math.fsum(first.values()) - math.fsum(second.values()), abs=1e-9
    )
    assert combined_u(difference(first, first)) == 0.0
    # No difference is less certain than two errors that add, or more than two that cancel.
    both = combined_u(first) + combined_u(second)
    assert abs(combined_u(first) - combined_u(second)) - 1e-9 <= combined_u(net) <= both + 1e-9


# ---- JCGM 101 -----------------------------------------------------------------------------------


def _sum(*terms: Draws) -> Draws:
    return np.asarray(np.sum(terms, axis=0))


def test_sum_of_normal_inputs() -> None:
    found = monte_carlo(_sum, [Variable(f"x{i}", 0.0, 1.0) for i in range(4)], draws=TRIALS)
    row = expected("S1_922")
    assert found.mean == pytest.approx(0.0, abs=0.01)
    assert found.u == pytest.approx(row["u"], abs=0.01)
    # The ends of the interval scatter by 0.005 at a million draws.
    assert found.interval() == pytest.approx(row["interval95"], abs=0.02)
    assert found.shortest_interval() == pytest.approx(row["interval95"], abs=0.06)


def test_sum_of_rectangular_inputs() -> None:
    found = monte_carlo(
        _sum, [Variable(f"x{i}", 0.0, 1.0, "rectangular") for i in range(4)], draws=TRIALS
    )
    row = expected("S1_923")
    assert found.u == pytest.approx(row["u"], abs=0.01)
    assert found.interval() == pytest.approx([-row["analytic"], row["analytic"]], abs=0.02)


def test_one_dominant_rectangular_input_beats_first_order() -> None:
    u = (1.0, 1.0, 1.0, 10.0)
    variables = [Variable(f"x{i}", 0.0, each, "rectangular") for i, each in enumerate(u)]
    found = monte_carlo(_sum, variables, draws=TRIALS)
    row = expected("S1_924")
    assert found.u == pytest.approx(row["u"], abs=0.05)
    assert found.interval() == pytest.approx(row["MC_interval95"], abs=0.05)
    parts = {f"x{i}": each for i, each in enumerate(u)}
    half = coverage_factor(0.95) * combined_u(parts)
    assert [-half, half] == pytest.approx(row["GUF_interval95"], abs=0.05)


def test_mass_calibration() -> None:
    nominal, air = 100_000.0, 1.2
    variables = [
        Variable("mRc", 100_000.0, 0.050),
        Variable("dmRc", 1.234, 0.020),
        rectangular("ra", 1.10, 1.30),
        rectangular("rw", 7000.0, 9000.0),
        rectangular("rr", 7950.0, 8050.0),
    ]

    def deviation(mass: Draws, small: Draws, ra: Draws, rw: Draws, rr: Draws) -> Draws:
        return (mass + small) * (1.0 + (ra - air) * (1.0 / rw - 1.0 / rr)) - nominal

    found = monte_carlo(deviation, variables, draws=TRIALS)
    row = expected("S1_93")
    assert found.mean == pytest.approx(row["mean"], abs=3e-4)
    assert found.u == pytest.approx(row["MC_u"], abs=3e-4)
    # Ends of a shortest interval scatter more than those of a symmetric one.
    assert found.shortest_interval() == pytest.approx(row["MC_shortest95"], abs=0.004)
    # First order: at the best estimates the air density has no slope, for rw = rr.
    first = {"mRc": 0.050, "dmRc": 0.020}
    assert combined_u(first) == pytest.approx(row["GUF1_u"], abs=1e-4)
    # With the mixed second derivatives, of ra with rw and of ra with rr (JCGM 100, 5.1.2 note).
    mixed = (nominal + 1.234) * variables[2].u / 8000.0**2
    second = {**first, "ra rw": mixed * variables[3].u, "ra rr": mixed * variables[4].u}
    assert combined_u(second) == pytest.approx(row["GUF2_u"], abs=1e-4)


def _squares(x1: Draws, x2: Draws) -> Draws:
    return x1**2 + x2**2


@pytest.mark.parametrize("x1", ["0", "0.01", "0.05"])
def test_sum_of_squares_near_zero(x1: str) -> None:
    row = expected(f"S1_94_{x1}")
    start, u = float(x1), 0.005
    variables = [Variable("x1", start, u), Variable("x2", 0.0, u)]
    found = monte_carlo(_squares, variables, draws=TRIALS)
    # The draws scatter by 0.1 % of u; the row allows 0.1 % as well.
    assert found.mean == pytest.approx(row["mean"], abs=0.005 * row["u"])
    assert found.u == pytest.approx(row["u"], rel=0.005)
    assert found.shortest_interval() == pytest.approx(row["shortest95"], abs=1e-5)
    parts = {"x1": 2.0 * start * u, "x2": 0.0}
    assert combined_u(parts) == pytest.approx(row["GUF_u"], abs=1e-12)
    # First order is 0 at the origin; the program has to notice and take the draws instead.
    draws = _squares(*(each.draw() for each in variables))
    estimate = Estimate(start**2, parts, draws)
    if x1 != "0.05":  # there the bend is just at what is tolerated
        assert not estimate.is_linear
    assert estimate.u == pytest.approx(row["u"], rel=0.02)


@pytest.mark.parametrize("index", [0, 1, 2])
def test_sum_of_squares_of_correlated_inputs(index: int) -> None:
    r, u = 0.9, 0.005
    start = inputs("S1_94_r09")["x1"][index]

    def model(first: Draws, second: Draws) -> Draws:
        x1 = start + u * first
        x2 = u * (r * first + math.sqrt(1.0 - r * r) * second)
        return _squares(x1, x2)

    found = monte_carlo(model, [Variable("a", 0.0, 1.0), Variable("b", 0.0, 1.0)], draws=TRIALS)
    assert found.u == pytest.approx(expected("S1_94_r09")["u"][index], rel=0.005)


def test_gauge_block_calibration_with_other_distributions() -> None:
    # The program draws normal and rectangular inputs only; the others are made here from
    # rectangular ones, by their quantile functions (JCGM 101, 6.4).
    trials = 400_000
    count = 11
    variables = [rectangular(f"r{i}", 0.0, 1.0) for i in range(count)]
    nominal = 50_000_000.0

    def student(r: Draws, freedom: float) -> Draws:
        return np.asarray(stats.t.ppf(r, freedom))

    def curvilinear(low: float, high: float, d: float, r1: Draws, r2: Draws) -> Draws:
        start = (low - d) + 2.0 * d * r1
        stop = (low + high) - start
        return start + (stop - start) * r2

    def deviation(*r: Draws) -> Draws:
        ls = 50_000_623.0 + 25.0 * student(r[0], 18)
        d = 215.0 + 6.0 * student(r[1], 24) + 4.0 * student(r[2], 5) + 7.0 * student(r[3], 8)
        alphas = 9.5e-6 + 4.0e-6 * r[4]
        theta = stats.norm.ppf(r[5], -0.1, 0.2) + 0.5 * np.sin(2.0 * np.pi * r[6])
        dalpha = curvilinear(-1e-6, 1e-6, 0.1e-6, r[7], r[8])
        dtheta = curvilinear(-0.05, 0.05, 0.025, r[9], r[10])
        return np.asarray(ls + d - ls * (dalpha * theta + alphas * dtheta) - nominal)

    found = monte_carlo(deviation, variables, draws=trials)
    row = expected("S1_95")
    assert found.mean == pytest.approx(row["mean_nm"], abs=0.5)
    assert found.u == pytest.approx(row["u_nm"], abs=0.3)
    assert found.interval(0.99) == pytest.approx(row["interval99_nm"], abs=1.5)


# ---- other documents ----------------------------------------------------------------------------


def test_thermal_expansion() -> None:
    row, result = inputs("NIST_E13"), expected("NIST_E13")
    (l0, u_l0), (t0, u_t0) = row["L0"], row["T0"]
    (l1, u_l1), (t1, u_t1) = row["L1"], row["T1"]
    value = (l1 - l0) / (l0 * (t1 - t0))
    parts = {
        "L0": -l1 / (l0**2 * (t1 - t0)) * u_l0,
        "L1": u_l1 / (l0 * (t1 - t0)),
        "T0": value / (t1 - t0) * u_t0,
        "T1": -value / (t1 - t0) * u_t1,
    }
    assert value == pytest.approx(result["value"], abs=1e-9)
    assert combined_u(parts) == pytest.approx(result["u_GUM"], abs=1e-8)

    def expansion(first: Draws, cold: Draws, second: Draws, hot: Draws) -> Draws:
        return (second - first) / (first * (hot - cold))

    found = monte_carlo(
        expansion,
        [Variable(key, *row[key]) for key in ("L0", "T0", "L1", "T1")],
        draws=TRIALS,
    )
    # The document draws rescaled t distributions, whose sample deviation wanders; normal draws
    # here, so the printed 1.74e-6 is met within 1.2 %.
    assert found.u == pytest.approx(result["u_MC"], rel=0.012)


def test_stefan_boltzmann_constant_from_others() -> None:
    row, result = inputs("NIST_SB"), expected("NIST_SB")
    powers = {"h": 1.0, "R": 4.0, "Rinf": 4.0, "Ar_e": -4.0, "alpha": -8.0}
    molar_mass = 1e-3  # kg/mol, molar mass constant before 2019, exact
    value = 32.0 * math.pi**5 / (15.0 * constants.c**6 * molar_mass**4)
    for key, power in powers.items():
        value *= row[key][0] ** power
    parts = {key: power * value * row[key][1] / row[key][0] for key, power in powers.items()}
    assert value == pytest.approx(result["sigma"], abs=1e-13)
    assert combined_u(parts) == pytest.approx(result["u"], abs=1e-15)


def test_logarithm_of_a_rectangular_input() -> None:
    x = rectangular("x", 0.1, 1.1)
    row = expected("NPL_log")
    parts = {"x": x.u / x.value}
    assert [math.log(x.value), combined_u(parts)] == pytest.approx(row["GUM"], abs=0.001)
    found = monte_carlo(np.log, [x], draws=TRIALS)
    assert [found.mean, found.u] == pytest.approx(row["exact"], abs=0.002)
    assert found.shortest_interval() == pytest.approx(row["shortest95_exact"], abs=0.01)
    # A skewed result far from first order is noticed.
    assert not Estimate(math.log(x.value), parts, np.log(x.draw())).is_linear


# ---- draws without a solution -------------------------------------------------------------------


def test_lost_draws_are_counted_and_too_many_refused() -> None:
    draws = np.array([3.0, np.nan, 1.0, 2.0, np.nan])
    found = as_distribution(draws)
    assert found.lost == 2
    assert found.draws.tolist() == [1.0, 2.0, 3.0]
    with pytest.raises(DomainError, match="no solution"):
        as_distribution(np.array([1.0, np.nan, np.nan]))


def test_same_seed_same_result() -> None:
    variables = [Variable("a", 1.0, 0.1), Variable("b", 2.0, 0.2)]
    first = monte_carlo(np.multiply, variables)
    again = monte_carlo(np.multiply, variables)
    other = monte_carlo(np.multiply, variables, seed=1)
    assert np.array_equal(first.draws, again.draws)
    assert not np.array_equal(first.draws, other.draws)
    assert first.u == pytest.approx(other.u, rel=0.05)
