"""What unequal like parts say: a hot connection, another load, a shared cause, no current.

A joint of high resistance makes its heat in one place, and the heat fades along the conductor:
a gradient. A greater current warms the whole length evenly, in proportion to I^n. A part through
which nothing flows takes the temperature of what is around it. Where the numbers fit none of
these, or two of them, the answer is that they cannot tell. Common practice of electrical
thermography, no single source; the thresholds are judged unless a source is named.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

PatternKind = Literal[
    "hot connection", "no current", "unbalanced load", "shared cause", "alike", "cannot tell"
]

SHARED_RISE_K = 21.0
"""Rise over the air from which like parts that agree are warm for a cause they share: the class
of 21 to 40 K of ANSI/NETA MTS, table 100.18, column for rise over ambient air."""
_SURE = 2.0
"""A difference counts beyond this many standard uncertainties (k = 2)."""
_LOCAL_SHARE = 0.5
"""Least height of a gradient, as a share of the smallest difference of a finding."""
_LOCAL_LEAD = 2.0
"""A gradient is a part's own when it is this many times that of its like."""
_UNHEATED_SHARE = 0.25
"""A part without current keeps at most this share of the warmth of its like."""
_LEFT_SHARE = 0.5
"""A current explains a difference when at most this share of it is left."""


class Gradient(NamedTuple):
    """How the temperature falls along a part, away from its warmest place."""

    drop_k: float
    """From the warmest place to the farthest quarter of the part, K."""
    u_drop_k: float
    """Standard uncertainty from the scatter of the profile, K."""
    decay_px: float
    """Distance over which the excess falls to 1/e, pixels; infinite for a straight fall."""
    warmest_px: float
    """Place of the warmest point along the axis, pixels from the start of the profile."""


_UNKNOWN = Gradient(0.0, math.inf, math.inf, 0.0)
_LEAST_POINTS = 6
_FAR = 0.75
"""Share of the greatest distance from the warmest place from which a point counts as far."""


def fit_gradient(
    place_px: NDArray[np.float64], profile_k: NDArray[np.float64], noise_k: float = 0.0
) -> Gradient:
    """Measure the fall of a temperature profile away from its warmest place.

    The fall is read from the profile: its greatest mean of three points, minus the mean of the
    points that are farthest from there. For the length over which it decays,
    T(s) = a + b exp(-|s - s0| / L) is fitted, the temperature along a conductor that is heated
    at s0 and cooled along its length (a fin): L is searched, a and b follow by least squares.

    Parameters
    ----------
    place_px
        (n,), rising, pixels along the part.
    profile_k
        (n,), temperature, K or degC.
    noise_k
        Standard deviation of one point, K; the scatter from point to point counts where it is
        larger.

    Returns
    -------
    Gradient
        With an infinite uncertainty for fewer than six points.

    """
    good = np.isfinite(profile_k)
    place, profile = place_px[good], profile_k[good]
    if len(place) < _LEAST_POINTS:
        return _UNKNOWN
    smooth = np.convolve(profile, np.ones(3) / 3.0, mode="valid")
    top = int(np.argmax(smooth)) + 1
    warmest = float(place[top])
    distance = np.abs(place - warmest)
    reach = float(distance.max())
    far = distance >= _FAR * reach
    drop = float(smooth[top - 1] - profile[far].mean())
    # Second differences leave out a slope; of white noise they have a variance of 6 sigma^2.
    scatter = float(np.median(np.abs(np.diff(profile, 2)))) / 0.6745 / math.sqrt(6.0)
    sigma = max(noise_k, scatter)
    u_drop = sigma * math.sqrt(1.0 / 3.0 + 1.0 / np.count_nonzero(far))
    return Gradient(max(drop, 0.0), u_drop, _decay_px(distance, profile, reach), warmest)


def _decay_px(distance: NDArray[np.float64], profile: NDArray[np.float64], reach: float) -> float:
    best, found = math.inf, math.inf
    for decay in np.geomspace(1.0, 20.0 * reach, 60):
        shape = np.exp(-distance / decay)
        design = np.column_stack([np.ones_like(shape), shape])
        solution, _, rank, _ = np.linalg.lstsq(design, profile, rcond=None)
        left = float(np.sum((profile - design @ solution) ** 2))
        if rank == 2 and left < best:
            best, found = left, float(decay)
    # A decay much longer than the part cannot be told from a straight line.
    return found if found < 5.0 * reach else math.inf


@dataclass(frozen=True, slots=True)
class Phase:
    """One of several like parts, in numbers."""

    name: str
    excess_k: float
    """Of the part as a whole over the middle one of the group (of two: over the cooler), K."""
    u_excess_k: float
    peak_excess_k: float
    """Of its warmest place over the middle one of the warmest places, K."""
    u_peak_excess_k: float
    gradient_k: float
    """Fall of temperature along it, away from its warmest place, K."""
    u_gradient_k: float
    rise_k: float | None = None
    """Of the part as a whole over the air, K; None where the air was not told."""
    over_surroundings_k: float | None = None
    """Of the part as a whole over what surrounds the parts in the image, K."""
    current_a: float | None = None
    unexplained_k: float | None = None
    """Excess that is left at equal current, K; None where it cannot be told."""
    u_unexplained_k: float | None = None


class Pattern(NamedTuple):
    """What the group shows."""

    kind: PatternKind
    names: tuple[str, ...]
    """The parts that differ."""
    reason: str
    """One plain sentence; the evidence is in the numbers."""


def decide(phases: Sequence[Phase], min_delta_k: float) -> Pattern:
    """Name the pattern of a group of like parts.

    Parameters
    ----------
    phases
        Two or more.
    min_delta_k
        Smallest difference that counts, K.

    Returns
    -------
    Pattern
        ``cannot tell`` where the numbers fit no pattern, with the reason.

    """
    if len(phases) < 2:
        return Pattern("cannot tell", (), "there is no like part to compare with")
    for step in (_hot_connection, _no_current, _unequal_levels):
        found = step(phases, min_delta_k)
        if found is not None:
            return found
    return _alike(phases, min_delta_k)


def _hot_connection(phases: Sequence[Phase], min_delta_k: float) -> Pattern | None:
    least = _LOCAL_SHARE * min_delta_k
    hot = [
        each
        for each in phases
        if each.gradient_k >= least
        and each.gradient_k > _SURE * each.u_gradient_k
        and each.gradient_k > _LOCAL_LEAD * _median_of_others(phases, each, "gradient_k")
        and _clear(each.peak_excess_k, each.u_peak_excess_k, min_delta_k)
    ]
    if not hot:
        return None
    falls = " and ".join(f"{each.gradient_k:.1f} K along {each.name}" for each in hot)
    return Pattern(
        "hot connection",
        tuple(each.name for each in hot),
        f"the temperature falls by {falls}, away from its warmest place, and not so along its "
        "like: heat is made in one place, as by the resistance of a contact",
    )


def _no_current(phases: Sequence[Phase], min_delta_k: float) -> Pattern | None:
    dead = []
    for each in phases:
        others = [other.excess_k for other in phases if other is not each]
        lag = float(np.median(others)) - each.excess_k
        # The uncertainty of the middle part is its own: of two, that of the other counts.
        u = each.u_excess_k or max(other.u_excess_k for other in phases)
        if not _clear(lag, u, min_delta_k):
            continue
        for level in ("over_surroundings_k", "rise_k"):
            own = getattr(each, level)
            middle = _median_of_others(phases, each, level)
            if own is not None and middle >= min_delta_k and own <= _UNHEATED_SHARE * middle:
                dead.append(each)
                break
    if not dead:
        return None
    names = tuple(each.name for each in dead)
    if any(each.current_a for each in dead):
        told = " and ".join(
            f"{each.current_a:g} A in {each.name}" for each in dead if each.current_a
        )
        return Pattern(
            "cannot tell",
            names,
            f"it is as cold as what surrounds it while its like are warm, and yet the sheet tells "
            f"{told}: check the current, the emissivity and the zone",
        )
    return Pattern(
        "no current",
        names,
        "it is hardly warmer than what surrounds it while its like are warm: no current flows, as "
        "in an open circuit, a blown fuse or a part that is switched off",
    )


def _unequal_levels(phases: Sequence[Phase], min_delta_k: float) -> Pattern | None:
    odd = [each for each in phases if _clear(abs(each.excess_k), each.u_excess_k, min_delta_k)]
    if not odd:
        return None
    names = tuple(each.name for each in odd)
    warm = all(each.excess_k > 0.0 for each in odd)
    how = "warmer" if warm else "cooler" if all(each.excess_k < 0.0 for each in odd) else "unlike"
    evenly = f"{' and '.join(names)} {_are(names)} {how} over the whole length, without a gradient"
    lacking = [each.name for each in phases if each.current_a is None]
    if lacking:
        return Pattern(
            "cannot tell",
            names,
            f"{evenly}, which speaks for another load and not for a connection; the currents "
            f"(load_a) of {', '.join(lacking)} were not told, so that it is not confirmed",
        )
    if any(each.current_a == 0.0 and each.excess_k > 0.0 for each in odd):
        return Pattern(
            "cannot tell", names, f"{evenly}, and yet without current: the heat has another source"
        )
    left = [each for each in odd if each.unexplained_k is None or each.u_unexplained_k is None]
    if left:
        return Pattern(
            "cannot tell",
            names,
            f"{evenly}; whether its current explains that cannot be said without the rise over "
            "the air (air_c)",
        )
    if all(_is_explained(each) for each in odd):
        return Pattern(
            "unbalanced load",
            names,
            f"{evenly}, and the rises over the air are to each other as the currents ask within "
            "their uncertainty",
        )
    more = [each for each in odd if not _is_explained(each)]
    rest = " and ".join(f"{each.unexplained_k or 0.0:+.1f} K of {each.name}" for each in more)
    return Pattern(
        "cannot tell",
        names,
        f"{evenly}, but its current does not explain it ({rest} left at equal current): look for "
        "a joint outside the zone, another cross-section or another cooling",
    )


def _alike(phases: Sequence[Phase], min_delta_k: float) -> Pattern:
    near = [each for each in phases if abs(each.excess_k) >= min_delta_k]
    if near:
        return Pattern(
            "cannot tell",
            tuple(each.name for each in near),
            "the differences are not larger than their expanded uncertainty (k = 2)",
        )
    spots = [
        each for each in phases if _clear(each.peak_excess_k, each.u_peak_excess_k, min_delta_k)
    ]
    if spots:
        names = tuple(each.name for each in spots)
        return Pattern(
            "cannot tell",
            names,
            f"as a whole they are alike, but {' and '.join(names)} {_has(names)} a place that is "
            f"{spots[0].peak_excess_k:.1f} K warmer than that of its like, without a clear "
            "gradient: look nearer",
        )
    unlike = [
        each
        for each in phases
        if each.unexplained_k is not None
        and each.u_unexplained_k is not None
        and _clear(abs(each.unexplained_k), each.u_unexplained_k, min_delta_k)
    ]
    if unlike:
        names = tuple(each.name for each in unlike)
        return Pattern(
            "cannot tell",
            names,
            f"all are equally warm although their currents differ: at equal current "
            f"{' and '.join(names)} would be {unlike[0].unexplained_k or 0.0:+.1f} K off",
        )
    rises = [each.rise_k for each in phases if each.rise_k is not None]
    if len(rises) == len(phases) and min(rises) >= SHARED_RISE_K:
        return Pattern(
            "shared cause",
            tuple(each.name for each in phases),
            f"all are alike and at least {min(rises):.0f} K over the air: a cause that they share, "
            "such as the load, harmonics, poor ventilation or a warm enclosure, and not one "
            "connection",
        )
    return Pattern("alike", (), "no part differs from its like by more than counts")


def _clear(value_k: float, u_k: float, min_delta_k: float) -> bool:
    return value_k >= min_delta_k and value_k > _SURE * u_k


def _is_explained(phase: Phase) -> bool:
    left, u = phase.unexplained_k, phase.u_unexplained_k
    assert left is not None  # sorted out by the caller
    assert u is not None
    return abs(left) <= _SURE * u and abs(left) <= _LEFT_SHARE * abs(phase.excess_k)


def _median_of_others(phases: Sequence[Phase], phase: Phase, name: str) -> float:
    values = [getattr(other, name) for other in phases if other is not phase]
    known = [value for value in values if value is not None]
    return float(np.median(known)) if known else 0.0


def _has(names: tuple[str, ...]) -> str:
    return "has" if len(names) == 1 else "have"


def _are(names: tuple[str, ...]) -> str:
    return "is" if len(names) == 1 else "are"
