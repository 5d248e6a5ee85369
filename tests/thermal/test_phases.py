"""Patterns of like parts: each is recognised, and what fits none is not named.

The cases are simulated: a fin that is heated at one end, parts whose rise goes with a power of
their current, noise. Their truth is that of the simulation; the thresholds are common practice,
no source, unless a comment says otherwise.
"""

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from thermo_fix.thermal.phases import (
    SHARED_RISE_K,
    Phase,
    decide,
    fit_gradient,
)

MIN_DELTA_K = 2.0
SOUND = Phase("A", 0.0, 0.0, 0.0, 0.1, 0.1, 0.15, rise_k=10.0, over_surroundings_k=7.0)


def phases(*excesses: float, u: float = 0.2) -> list[Phase]:
    return [
        replace(
            SOUND,
            name="ABCDEF"[number],
            excess_k=excess,
            u_excess_k=u if excess else 0.0,
            peak_excess_k=excess,
            u_peak_excess_k=u,
            rise_k=10.0 + excess,
            over_surroundings_k=7.0 + excess,
        )
        for number, excess in enumerate(excesses)
    ]


# ---------------------------------------------------------------- the gradient


@pytest.mark.parametrize("decay_px", [8.0, 15.0, 30.0])
def test_fin_heated_at_its_end(decay_px: float) -> None:
    # Infinite fin: theta = theta0 exp(-s / L) (any textbook of heat transfer).
    place = np.arange(80.0)
    rng = np.random.default_rng(int(decay_px))
    profile = 30.0 + 12.0 * np.exp(-place / decay_px) + rng.normal(0.0, 0.02, place.size)
    found = fit_gradient(place, profile, 0.02)
    far = float(np.mean(12.0 * np.exp(-place[60:] / decay_px)))
    near = float(np.mean(12.0 * np.exp(-place[:3] / decay_px)))
    assert found.drop_k == pytest.approx(near - far, abs=0.1)
    assert found.decay_px == pytest.approx(decay_px, rel=0.15)
    assert found.warmest_px <= 2.0
    assert found.u_drop_k < 0.05


def test_joint_in_the_middle_cools_to_both_sides() -> None:
    place = np.arange(61.0)
    profile = 30.0 + 8.0 * np.exp(-np.abs(place - 30.0) / 6.0)
    found = fit_gradient(place, profile)
    assert found.warmest_px == 30.0
    assert found.decay_px == pytest.approx(6.0, rel=0.1)
    assert found.drop_k == pytest.approx(8.0, rel=0.15)


def test_even_part_has_no_gradient() -> None:
    rng = np.random.default_rng(5)
    found = fit_gradient(np.arange(60.0), 35.0 + rng.normal(0.0, 0.02, 60), 0.02)
    assert found.drop_k < 0.08


def test_straight_fall_has_no_decay_length() -> None:
    place = np.arange(60.0)
    found = fit_gradient(place, 40.0 - 0.1 * place)
    assert math.isinf(found.decay_px)
    assert found.drop_k == pytest.approx(0.1 * (52.0 - 1.0), abs=0.1)


def test_too_few_points_tell_nothing() -> None:
    assert math.isinf(fit_gradient(np.arange(5.0), np.arange(5.0)).u_drop_k)
    empty = np.full(20, np.nan)
    assert fit_gradient(np.arange(20.0), empty).drop_k == 0.0


# ---------------------------------------------------------------- the patterns


def test_hot_connection() -> None:
    group = phases(0.0, 6.0, -0.1)
    group[1] = replace(group[1], gradient_k=5.0, peak_excess_k=9.0)
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("hot connection", ("B",))
    assert "5.0 K along B" in found.reason


def test_hot_place_without_a_gradient_is_not_alike() -> None:
    group = phases(0.0, 0.3, 0.1)
    group[0] = replace(group[0], peak_excess_k=3.0)
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("cannot tell", ("A",))
    assert "3.0 K warmer" in found.reason


def test_two_hot_connections() -> None:
    group = phases(0.0, 6.0, 5.0, 0.1)
    group[1] = replace(group[1], gradient_k=5.0)
    group[2] = replace(group[2], gradient_k=4.0)
    assert decide(group, MIN_DELTA_K).names == ("B", "C")


@pytest.mark.parametrize(("gradient_k", "is_hot"), [(0.99, False), (1.0, True)])
def test_least_gradient_is_half_the_smallest_difference(gradient_k: float, is_hot: bool) -> None:
    group = phases(0.0, 6.0, 0.0)
    group[1] = replace(group[1], gradient_k=gradient_k)
    assert (decide(group, MIN_DELTA_K).kind == "hot connection") is is_hot


def test_gradient_that_all_share_is_no_connection() -> None:
    group = [replace(each, gradient_k=4.0) for each in phases(0.0, 0.3, -0.2)]
    assert decide(group, MIN_DELTA_K).kind == "alike"


def test_gradient_within_its_uncertainty_is_none() -> None:
    group = phases(0.0, 6.0, 0.0)
    group[1] = replace(group[1], gradient_k=3.0, u_gradient_k=1.6)
    assert decide(group, MIN_DELTA_K).kind == "cannot tell"


def with_currents(group: list[Phase], *currents: float, left: float, u: float) -> list[Phase]:
    return [
        replace(
            each,
            current_a=current,
            unexplained_k=left if each.excess_k else 0.0,
            u_unexplained_k=u if each.excess_k else 0.0,
        )
        for each, current in zip(group, currents, strict=True)
    ]


def test_unbalanced_load() -> None:
    group = with_currents(phases(0.0, 5.0, 0.0), 60, 88, 62, left=-1.4, u=1.3)
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("unbalanced load", ("B",))
    assert "without a gradient" in found.reason


@pytest.mark.parametrize(
    ("left", "u", "kind"),
    [
        (2.4, 1.3, "unbalanced load"),
        (2.7, 1.3, "cannot tell"),  # more than twice its uncertainty
        (2.5, 1.3, "unbalanced load"),
        (2.6, 5.0, "cannot tell"),  # more than half of the excess, however uncertain
    ],
)
def test_current_explains_both_sides_of_the_edge(left: float, u: float, kind: str) -> None:
    group = with_currents(phases(0.0, 5.0, 0.0), 60, 88, 62, left=left, u=u)
    assert decide(group, MIN_DELTA_K).kind == kind


def test_warm_phase_without_currents_cannot_be_told() -> None:
    found = decide(phases(0.0, 5.0, 0.0), MIN_DELTA_K)
    assert found.kind == "cannot tell"
    assert "load_a" in found.reason
    assert "speaks for another load" in found.reason


def test_warm_phase_with_currents_but_without_air() -> None:
    group = [
        replace(each, current_a=50.0, rise_k=None, over_surroundings_k=None)
        for each in phases(0.0, 5.0, 0.0)
    ]
    found = decide(group, MIN_DELTA_K)
    assert found.kind == "cannot tell"
    assert "air_c" in found.reason


def test_warm_part_said_to_carry_no_current() -> None:
    group = [replace(each, current_a=40.0) for each in phases(0.0, 5.0, 0.0)]
    group[1] = replace(group[1], current_a=0.0)
    found = decide(group, MIN_DELTA_K)
    assert found.kind == "cannot tell"
    assert "another source" in found.reason


def test_part_without_current() -> None:
    group = phases(0.0, 0.2, -6.5, 0.4)
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("no current", ("C",))


def test_of_two_the_cold_one_is_without_current() -> None:
    group = phases(0.0, 6.5)
    group[0] = replace(group[0], rise_k=0.5, over_surroundings_k=0.3)
    group[1] = replace(group[1], rise_k=7.0, over_surroundings_k=6.8)
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("no current", ("A",))


@pytest.mark.parametrize(("share", "kind"), [(0.25, "no current"), (0.26, "cannot tell")])
def test_warmth_that_a_part_without_current_keeps(share: float, kind: str) -> None:
    group = phases(0.0, 0.0, -5.0)
    group[2] = replace(group[2], over_surroundings_k=7.0 * share, rise_k=10.0 * share)
    assert decide(group, MIN_DELTA_K).kind == kind


def test_cold_part_with_a_stated_current_is_a_contradiction() -> None:
    group = [replace(each, current_a=40.0) for each in phases(0.0, 0.2, -6.5, 0.4)]
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("cannot tell", ("C",))
    assert "40 A in C" in found.reason


@pytest.mark.parametrize(("rise_k", "kind"), [(20.9, "alike"), (21.0, "shared cause")])
def test_all_warm_together(rise_k: float, kind: str) -> None:
    # 21 K: lower edge of the class 21 to 40 K over ambient air, ANSI/NETA MTS table 100.18.
    assert SHARED_RISE_K == 21.0
    group = [replace(each, rise_k=rise_k) for each in phases(0.0, 0.3, -0.2)]
    assert decide(group, MIN_DELTA_K).kind == kind


def test_difference_within_its_uncertainty_cannot_be_told() -> None:
    found = decide(phases(0.0, 2.5, 0.0, u=1.3), MIN_DELTA_K)
    assert found.kind == "cannot tell"
    assert "expanded uncertainty" in found.reason


def test_equal_warmth_at_unequal_current_cannot_be_told() -> None:
    group = with_currents(phases(0.0, 0.5, 0.0), 60, 30, 60, left=6.0, u=1.0)
    found = decide(group, MIN_DELTA_K)
    assert (found.kind, found.names) == ("cannot tell", ("B",))
    assert "currents differ" in found.reason


@pytest.mark.parametrize("group", [[], phases(0.0)])
def test_one_part_has_no_like(group: list[Phase]) -> None:
    assert decide(group, MIN_DELTA_K).kind == "cannot tell"


@given(
    st.lists(st.floats(-30.0, 30.0), min_size=2, max_size=6),
    st.floats(0.05, 3.0),
    st.floats(0.5, 5.0),
)
@settings(max_examples=60)
def test_no_pattern_of_load_or_connection_without_evidence(
    excesses: list[float], u: float, min_delta_k: float
) -> None:
    # Without gradients, currents, air and surroundings neither may be named.
    group = [
        replace(each, rise_k=None, over_surroundings_k=None)
        for each in phases(*(excess - min(excesses) for excess in excesses), u=u)
    ]
    assert decide(group, min_delta_k).kind in ("alike", "cannot tell")
