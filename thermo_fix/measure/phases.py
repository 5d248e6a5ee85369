"""Groups of like zones: what their levels, gradients and currents say together."""

import math
from dataclasses import dataclass
from typing import NamedTuple

import cv2
import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.measure.limit_check import hottest_px
from thermo_fix.measure.spot import first_order, spot_at_extreme, spot_of_median
from thermo_fix.measure.warmth import current_of, exponent_of, told_air
from thermo_fix.records import Assessment, CorrectedFrame, Figure, MaskArray
from thermo_fix.thermal.load import rise_at_load
from thermo_fix.thermal.phases import Gradient, Pattern, PatternKind, Phase, decide, fit_gradient
from thermo_fix.uncertainty.propagation import combined_u, difference
from thermo_fix.uncertainty.variables import Variable

_LEAST_PX = 9
_LEAST_REST_PX = 400
_LONG = 1.3
"""Length over width from which a zone has a long axis of its own."""
_MARGIN_PX = 3
SOURCE = (
    "Common practice of electrical thermography, no single source: a gradient away from a joint "
    "speaks for contact resistance, even warmth for load"
)
_LEAD: dict[PatternKind, str] = {
    "hot connection": "Pattern of a hot connection at {names}: ",
    "no current": "Pattern of a part without current, {names}: ",
    "unbalanced load": "Pattern of an unbalanced load, {names}: ",
    "shared cause": "Pattern of a cause that all share: ",
    "alike": "Alike: ",
    "cannot tell": "Cannot tell: ",
}
_SCREENING = (
    " An indication from surface temperatures: confirm it by measurement before anything is done."
)


class Parts(NamedTuple):
    """A value with its signed contributions, without draws."""

    value: float
    contributions: dict[str, float]

    def minus(self, other: "Parts") -> "Parts":
        """Return the difference; what is common cancels."""
        return Parts(self.value - other.value, difference(self.contributions, other.contributions))

    @property
    def u(self) -> float:
        """Standard uncertainty, first order."""
        return combined_u(self.contributions)


@dataclass(frozen=True, slots=True)
class _Member:
    label: int
    name: str
    whole: Parts
    """Median temperature, degC."""
    peak: Parts
    gradient: Gradient
    air: Variable | None
    current: Variable | None

    @property
    def rise(self) -> Parts | None:
        if self.air is None:
            return None
        return self.whole.minus(Parts(self.air.value, {self.air.name: self.air.u}))


def group_words(corrected: CorrectedFrame) -> tuple[str, ...]:
    """Return the ``like`` words that at least two zones of an image share."""
    words = [zone.like for zone in corrected.job.zones if zone.like is not None and not zone.ignore]
    return tuple(word for word in dict.fromkeys(words) if words.count(word) > 1)


def assess_group(corrected: CorrectedFrame, word: str) -> Assessment | None:
    """Assess one group of like zones.

    Parameters
    ----------
    corrected
        The image.
    word
        Their ``like`` word.

    Returns
    -------
    Assessment or None
        None where fewer than two zones can be measured.

    """
    members = [
        member
        for label, zone in enumerate(corrected.job.zones, 1)
        if zone.like == word and not zone.ignore and zone.role is None
        for member in [_member(corrected, label)]
        if member is not None
    ]
    if len(members) < 2:
        return None
    phases = _phases(corrected, members)
    pattern = decide(phases, corrected.job.detect.min_delta_k)
    return Assessment(
        kind="phases",
        title=f"Like zones: {word}",
        statement=_statement(pattern),
        figures=tuple(_figures(members, phases, pattern)),
        source=SOURCE,
    )


def _statement(pattern: Pattern) -> str:
    names = " and ".join(pattern.names)
    sentence = _LEAD[pattern.kind].format(names=names) + pattern.reason + "."
    return sentence if pattern.kind == "alike" else sentence + _SCREENING


def _member(corrected: CorrectedFrame, label: int) -> _Member | None:
    zone = corrected.job.zones[label - 1]
    inside = _inner(corrected, label)
    place = hottest_px(corrected, label)
    if place is None or np.count_nonzero(inside) < _LEAST_PX:
        return None
    equation = corrected.equations[label]
    file = corrected.job.file
    whole = spot_of_median(corrected, f"whole of zone {zone.name} of {file}", label, inside)
    peak = spot_at_extreme(corrected, f"hottest of zone {zone.name} of {file}", label, place)
    surface_c = corrected.surface_k.astype(np.float64) - ZERO_CELSIUS_K
    return _Member(
        label=label,
        name=zone.name,
        whole=Parts(*first_order(whole, equation)),
        peak=Parts(*first_order(peak, equation)),
        gradient=gradient_of(surface_c, inside, equation.noise_k, equation.nonuniformity_k),
        air=told_air(corrected.inputs[label]),
        current=current_of(zone, file),
    )


def gradient_of(
    surface_c: NDArray[np.float64], inside: MaskArray, noise_k: float, nonuniformity_k: float
) -> Gradient:
    """Return the gradient along a zone, away from its warmest place.

    Parameters
    ----------
    surface_c
        (rows, columns), degC.
    inside
        (rows, columns): the zone, clear of its blurred edge.
    noise_k, nonuniformity_k
        Of one pixel, and of two places of the image, K.

    Returns
    -------
    Gradient
        Along the long axis; where a zone has none, along the rows or the columns, whichever shows
        the greater fall.

    """
    rows, columns = np.nonzero(inside)
    values = surface_c[rows, columns]
    points = np.column_stack([columns, rows]).astype(np.float64)
    points -= points.mean(axis=0)
    spread, axes = np.linalg.eigh(np.cov(points.T))
    if spread[1] >= _LONG**2 * max(spread[0], 1e-9):
        directions = [axes[:, 1]]
    else:
        directions = [np.array([1.0, 0.0]), np.array([0.0, 1.0])]
    best: Gradient | None = None
    for direction in directions:
        along = points @ direction
        step = np.floor(along - along.min() + 1e-6).astype(np.int64)
        count = np.bincount(step)
        total = np.bincount(step, weights=values)
        kept = count >= 0.5 * np.median(count[count > 0])
        profile = total[kept] / count[kept]
        noise = noise_k / math.sqrt(float(np.median(count[kept])))
        found = fit_gradient(np.flatnonzero(kept).astype(np.float64), profile, noise)
        if best is None or found.drop_k > best.drop_k:
            best = found
    assert best is not None  # there is at least one direction
    return best._replace(u_drop_k=math.hypot(best.u_drop_k, math.sqrt(2.0) * nonuniformity_k))


def _inner(corrected: CorrectedFrame, label: int) -> MaskArray:
    here = (corrected.labels == label) & np.isfinite(corrected.surface_k)
    clear: MaskArray = cv2.erode(here.astype(np.uint8), np.ones((3, 3), np.uint8)) > 0
    return clear if np.count_nonzero(clear) >= _LEAST_PX else here


def _phases(corrected: CorrectedFrame, members: list[_Member]) -> list[Phase]:
    ordered = sorted(members, key=lambda each: each.whole.value)
    middle = ordered[(len(ordered) - 1) // 2]
    # The part that is in the middle as a whole may be the one with the hottest place.
    peaks = sorted(members, key=lambda each: each.peak.value)
    middle_peak = peaks[(len(peaks) - 1) // 2].peak
    rest_c = _rest_c(corrected)
    phases = []
    for member in members:
        excess = member.whole.minus(middle.whole)
        peak = member.peak.minus(middle_peak)
        rise = member.rise
        left = _unexplained(corrected, member, middle)
        phases.append(
            Phase(
                name=member.name,
                excess_k=excess.value,
                u_excess_k=excess.u,
                peak_excess_k=peak.value,
                u_peak_excess_k=peak.u,
                gradient_k=member.gradient.drop_k,
                u_gradient_k=member.gradient.u_drop_k,
                rise_k=None if rise is None else rise.value,
                over_surroundings_k=None if rest_c is None else member.whole.value - rest_c,
                current_a=None if member.current is None else member.current.value,
                unexplained_k=None if left is None else left.value,
                u_unexplained_k=None if left is None else left.u,
            )
        )
    return phases


def _unexplained(corrected: CorrectedFrame, member: _Member, middle: _Member) -> Parts | None:
    """Excess over the middle zone if that carried the same current, first order."""
    own, like = member.rise, middle.rise
    current, other = member.current, middle.current
    if own is None or like is None or current is None or other is None:
        return None
    if min(current.value, other.value) <= 0.0 or like.value < 0.0:
        return None
    if member is middle:
        return Parts(0.0, {})
    exponent = exponent_of(corrected.inputs[member.label])
    at = rise_at_load(like.value, other.value, current.value, exponent.value)
    parts = {name: at.by_rise * part for name, part in like.contributions.items()}
    for variable, sensitivity in (
        (other, at.by_current),
        (current, at.by_other),
        (exponent, at.by_exponent),
    ):
        parts[variable.name] = parts.get(variable.name, 0.0) + sensitivity * variable.u
    return own.minus(Parts(at.rise_k, parts))


def _rest_c(corrected: CorrectedFrame) -> float | None:
    """Median temperature of the image outside all zones, degC."""
    zones = (corrected.labels != 0).astype(np.uint8)
    size = 2 * _MARGIN_PX + 1
    near = cv2.dilate(zones, np.ones((size, size), np.uint8))
    rest = (near == 0) & np.isfinite(corrected.surface_k)
    if np.count_nonzero(rest) < _LEAST_REST_PX:
        return None
    return float(np.median(corrected.surface_k[rest])) - ZERO_CELSIUS_K


def _figures(members: list[_Member], phases: list[Phase], pattern: Pattern) -> list[Figure]:
    figures = []
    for member, phase in zip(members, phases, strict=True):
        rise = member.rise
        if rise is None:
            figures.append(
                Figure(f"{member.name}: temperature", member.whole.value, member.whole.u, "degC")
            )
        else:
            figures.append(Figure(f"{member.name}: rise over the air", rise.value, rise.u, "K"))
        figures.append(
            Figure(f"{member.name}: over the middle one", phase.excess_k, phase.u_excess_k, "K")
        )
        if pattern.kind == "alike":
            continue
        decay = member.gradient.decay_px
        figures.append(
            Figure(
                f"{member.name}: fall along it",
                member.gradient.drop_k,
                member.gradient.u_drop_k if math.isfinite(member.gradient.u_drop_k) else None,
                "K",
                f"to 1/e over {decay:.0f} pixels" if math.isfinite(decay) else "straight",
            )
        )
        if member.current is not None:
            figures.append(
                Figure(f"{member.name}: current", member.current.value, member.current.u, "A")
            )
        if phase.unexplained_k is not None and phase.excess_k != 0.0:
            figures.append(
                Figure(
                    f"{member.name}: left at equal current",
                    phase.unexplained_k,
                    phase.u_unexplained_k,
                    "K",
                )
            )
    return figures
