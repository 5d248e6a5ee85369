"""Geometry of the plots: histogram of an image, overview of all findings, scale bar.

Positions are in per cent of the plot, so that text keeps its size on every screen.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from thermo_fix.records import Finding
from thermo_fix.report.catalogue import Words
from thermo_fix.report.drawing import Tick, short
from thermo_fix.report.formatting import COVERAGE, Units, known, with_unit
from thermo_fix.report.view import GradeKey

_MOST_MARKERS: Final = 4
"""Findings of an image that are marked in its histogram, worst first."""

_LABEL_WIDTH: Final = 15.0
"""Per cent of the histogram's width that a label takes: markers closer than that share one."""

_BAR_SHARE: Final = 0.3
"""Longest scale bar as a share of the picture's width."""

_NUMBERED: Final = 60
"""Findings that the overview numbers, worst first."""

_DRAWN: Final = 600
"""Findings that the overview draws, worst first."""


@dataclass(frozen=True, slots=True)
class Marker:
    """A temperature marked in the histogram."""

    percent: float
    text: str
    reference: bool


@dataclass(frozen=True, slots=True)
class Histogram:
    """Pixels by surface temperature, on the colour scale of the picture."""

    path: str
    """Outline in a box 64 wide and 100 high."""
    bins: int
    markers: tuple[Marker, ...]


@dataclass(frozen=True, slots=True)
class ScaleBar:
    """A round length at the target."""

    percent: float
    """Of the picture's width."""
    text: str


@dataclass(frozen=True, slots=True)
class Dot:
    """A finding in the overview."""

    x: float
    y: float
    number: int
    grade: GradeKey
    numbered: bool


@dataclass(frozen=True, slots=True)
class Overview:
    """All findings: size of the difference against its expanded uncertainty, both logarithmic."""

    dots: tuple[Dot, ...]
    x_ticks: tuple[Tick, ...]
    y_ticks: tuple[Tick, ...]
    limit: tuple[float, float, float, float]
    """Line on which the uncertainty equals the difference: x1, y1, x2, y2."""
    left_out: int
    """Findings without a known difference and uncertainty."""
    cut: bool
    """Whether only the worst of them are drawn."""
    grades: tuple[GradeKey, ...]
    """Those that occur."""


def histogram(
    counts: Sequence[int],
    low_c: float,
    high_c: float,
    findings: Sequence[tuple[int, Finding]],
    words: Words,
) -> Histogram | None:
    """The histogram of an image with the extremes and references of its worst findings."""
    most = max(counts, default=0)
    if most == 0:
        return None
    # Square roots, so that a small hot part shows beside a large background.
    steps = "".join(
        f"L{x} {short(100.0 - 100.0 * math.sqrt(count / most))}h1" for x, count in enumerate(counts)
    )
    return Histogram(
        path=f"M0 100{steps}L{len(counts)} 100Z",
        bins=len(counts),
        markers=_markers(low_c, high_c, findings[:_MOST_MARKERS], words),
    )


def _markers(
    low_c: float, high_c: float, findings: Sequence[tuple[int, Finding]], words: Words
) -> tuple[Marker, ...]:
    wanted: list[tuple[float, int, bool]] = []
    for number, finding in findings:
        for value, is_reference in ((finding.extreme_c, False), (finding.reference_c, True)):
            if value is not None and math.isfinite(value):
                wanted.append((100.0 * (value - low_c) / (high_c - low_c), number, is_reference))
    inside = sorted(each for each in wanted if 0.0 <= each[0] <= 100.0)
    markers: list[Marker] = []
    for is_reference in (False, True):
        start = -math.inf
        places: list[tuple[float, list[int]]] = []
        for place, number, kind in inside:
            if kind != is_reference:
                continue
            if place - start >= _LABEL_WIDTH:
                start = place
                places.append((place, [number]))
                continue
            # Too near for a label of its own: the line stands, the label is shared.
            places[-1][1].append(number)
            markers.append(Marker(place, "", is_reference))
        for place, numbers in places:
            listed = ", ".join(str(number) for number in sorted(numbers))
            text = words("histogram.reference", list=listed) if is_reference else listed
            markers.append(Marker(place, text, is_reference))
    return tuple(markers)


def scale_bar(pixel_m: float | None, width: int, units: Units) -> ScaleBar | None:
    """A bar of 1, 2 or 5 times a power of ten that fits into the picture's corner."""
    if pixel_m is None or not pixel_m > 0.0:
        return None
    whole_m = pixel_m * width
    power = 10.0 ** math.floor(math.log10(_BAR_SHARE * whole_m))
    length = max(step * power for step in (1.0, 2.0, 5.0) if step * power <= _BAR_SHARE * whole_m)
    factor, unit = (
        (1.0, "m") if length >= 1.0 else (100.0, "cm") if length >= 0.01 else (1000.0, "mm")
    )
    text = with_unit(units.shortest(length * factor, 3), unit)
    return ScaleBar(100.0 * length / whole_m, text)


def overview(ranked: Sequence[Finding], units: Units) -> Overview | None:
    """The overview of findings, worst first; None where fewer than two can be drawn."""
    pairs = [
        (
            number,
            finding,
            abs(units.from_kelvin_difference(finding.delta_k or 0.0)),
            COVERAGE * units.from_kelvin_difference(finding.u_delta_k or 0.0),
        )
        for number, finding in enumerate(ranked, 1)
        if known(finding.delta_k) and known(finding.u_delta_k)
    ]
    known_pairs = [pair for pair in pairs if pair[2] > 0.0 and pair[3] > 0.0]
    pairs = known_pairs[:_DRAWN]
    if len(pairs) < 2:
        return None
    x_low, x_high = _ends([pair[2] for pair in pairs])
    y_low, y_high = _ends([pair[3] for pair in pairs])

    def across(value: float) -> float:
        return 100.0 * math.log(value / x_low) / math.log(x_high / x_low)

    def up(value: float) -> float:
        return 100.0 - 100.0 * math.log(value / y_low) / math.log(y_high / y_low)

    start, end = max(x_low, y_low), min(x_high, y_high)
    drawn = tuple(
        Dot(across(x), up(y), number, finding.grade or "ungraded", number <= _NUMBERED)
        for number, finding, x, y in pairs
    )
    keys: tuple[GradeKey, ...] = ("act", "plan", "watch", "note", "ungraded")
    return Overview(
        dots=drawn,
        x_ticks=tuple(Tick(across(v), units.shortest(v, 3)) for v in _round(x_low, x_high)),
        y_ticks=tuple(Tick(up(v), units.shortest(v, 3)) for v in _round(y_low, y_high)),
        limit=(across(start), up(start), across(end), up(end)) if start < end else (0, 0, 0, 0),
        left_out=len(ranked) - len(known_pairs),
        cut=len(known_pairs) > len(pairs),
        grades=tuple(key for key in keys if any(dot.grade == key for dot in drawn)),
    )


def _ends(values: Sequence[float]) -> tuple[float, float]:
    """Ends of a logarithmic axis with room beside the outermost values."""
    low, high = min(values) / 1.3, max(values) * 1.3
    return (low, high) if high / low >= 3.0 else (low / 1.3, high * 1.3)


def _round(low: float, high: float) -> list[float]:
    """Round numbers on a logarithmic axis."""
    powers = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    span = high / low
    steps = (
        (1.0, 2.0, 3.0, 5.0, 7.0) if span < 10.0 else (1.0, 2.0, 5.0) if span < 300.0 else (1.0,)
    )
    return [step * 10.0**p for p in powers for step in steps if low <= step * 10.0**p <= high]
