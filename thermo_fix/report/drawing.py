"""Geometry of what the page draws: outlines, labels, crops, colour bars, bars of a budget.

No words and no markup. Lengths inside a picture are in its pixels; positions of labels are in
per cent of the picture, so that their text keeps its size on every screen.
"""

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

from thermo_fix.records import Finding, Sense, Zone
from thermo_fix.report.formatting import Units

_LABEL_SHARE: Final = 0.052
"""Size of a label as a share of the picture's width, for keeping labels apart (about 21 px of a
picture 400 px wide)."""

_CROP_LABEL_SHARE: Final = 0.08
"""The same for a crop, which is drawn about 270 px wide."""

_CROP_ASPECT: Final = 4.0 / 3.0
_CROP_SHARE: Final = 0.3
"""Smallest width of a crop as a share of the picture: enough around a finding to recognise."""


@dataclass(frozen=True, slots=True)
class Mark:
    """A finding drawn over a picture."""

    number: int
    sense: Sense
    path: str
    """Outline as SVG path data."""
    label_x: float
    label_y: float
    """Centre of the label, per cent of the picture's width and height."""
    extreme_x: float
    extreme_y: float
    """Centre of the extreme's pixel, in pixels."""


@dataclass(frozen=True, slots=True)
class ZoneMark:
    """A zone drawn over a picture."""

    name: str
    points: str
    """Corners as an SVG point list."""
    label_x: float
    label_y: float
    """Top left corner, per cent."""
    ignored: bool


@dataclass(frozen=True, slots=True)
class Tick:
    """A round number on a colour bar."""

    percent: float
    text: str


@dataclass(frozen=True, slots=True)
class Crop:
    """The part of a picture around one finding."""

    x: float
    y: float
    width: float
    height: float
    label_x: float
    label_y: float
    """Centre of the label, per cent of the crop."""

    @property
    def view_box(self) -> str:
        """The SVG view box."""
        return " ".join(short(value) for value in (self.x, self.y, self.width, self.height))

    @property
    def pen(self) -> float:
        """Width of a thin line inside this crop, px."""
        return self.width / 260.0


def short(value: float) -> str:
    """A coordinate with at most two decimals."""
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text in {"-0", ""} else text


def pen(width: int) -> float:
    """Width of a thin line in a picture ``width`` pixels wide, px."""
    return width / 420.0


def outline(finding: Finding) -> str:
    """Outline of a finding as SVG path data; its bounding box where there is no contour."""
    loops = [
        loop
        for loop in finding.contours
        if len(loop) >= 3 and all(math.isfinite(value) for point in loop for value in point)
    ]
    if not loops:
        x0, y0, x1, y1 = (float(value) for value in finding.bbox_px)
        loops = [((x0, y0), (x1, y0), (x1, y1), (x0, y1))]
    return "".join(
        "M" + "L".join(f"{short(x)} {short(y)}" for x, y in _open(loop)) + "Z" for loop in loops
    )


def _open(loop: Sequence[tuple[float, float]]) -> Sequence[tuple[float, float]]:
    """A loop without the repeated first point: Z closes the path."""
    return loop[:-1] if loop[0] == loop[-1] else loop


def marks(findings: Iterable[tuple[int, Finding]], width: int, height: int) -> tuple[Mark, ...]:
    """Marks of numbered findings, with labels that stay inside the picture and apart."""
    taken: list[tuple[float, float]] = []
    drawn: list[Mark] = []
    for number, finding in findings:
        x, y = _label_place(finding.bbox_px, width, height, _LABEL_SHARE * width, taken)
        taken.append((x, y))
        drawn.append(
            Mark(
                number=number,
                sense=finding.sense,
                path=outline(finding),
                label_x=100.0 * x / width,
                label_y=100.0 * y / height,
                extreme_x=finding.extreme_px[0] + 0.5,
                extreme_y=finding.extreme_px[1] + 0.5,
            )
        )
    return tuple(drawn)


def _label_place(
    bbox: tuple[float, float, float, float],
    width: float,
    height: float,
    size: float,
    taken: Sequence[tuple[float, float]],
) -> tuple[float, float]:
    """The first place beside a box that hides neither the box nor another label.

    Failing that, the first that hides no label; failing that, the first of all.
    """
    x0, y0, x1, y1 = bbox
    gap = 0.7 * size
    middle_x, middle_y = (x0 + x1) / 2.0, (y0 + y1) / 2.0
    half_wide, half_high = (x1 - x0 + size) / 2.0, (y1 - y0 + size) / 2.0
    wanted = (
        (x0 - gap, y0 - gap),
        (x1 + gap, y0 - gap),
        (x1 + gap, y1 + gap),
        (x0 - gap, y1 + gap),
        (middle_x, y0 - gap),
        (middle_x, y1 + gap),
        (x0 - gap, middle_y),
        (x1 + gap, middle_y),
    )
    edge = 0.55 * size
    places = [
        (min(max(x, edge), width - edge), min(max(y, edge), height - edge)) for x, y in wanted
    ]
    apart = [
        (x, y)
        for x, y in places
        if all(max(abs(x - other_x), abs(y - other_y)) >= size for other_x, other_y in taken)
    ]
    clear = [
        (x, y) for x, y in apart if abs(x - middle_x) >= half_wide or abs(y - middle_y) >= half_high
    ]
    return (clear or apart or places)[0]


def zone_marks(zones: Iterable[Zone], width: int, height: int) -> tuple[ZoneMark, ...]:
    """Zones as polygons; the name stands at the upper left of each."""
    drawn: list[ZoneMark] = []
    for zone in zones:
        left = min(x for x, _ in zone.polygon)
        top = min(y for _, y in zone.polygon)
        drawn.append(
            ZoneMark(
                name=zone.name,
                points=" ".join(f"{short(x)},{short(y)}" for x, y in zone.polygon),
                label_x=100.0 * max(left, 0.0) / width,
                label_y=100.0 * max(top, 0.0) / height,
                ignored=zone.ignore,
            )
        )
    return tuple(drawn)


def crop(finding: Finding, width: int, height: int) -> Crop:
    """The window around a finding: its box with as much again beside it, inside the picture."""
    x0, y0, x1, y1 = finding.bbox_px
    wide = max(2.2 * (x1 - x0), _CROP_SHARE * width, 2.2 * (y1 - y0) * _CROP_ASPECT)
    wide = min(wide, float(width), height * _CROP_ASPECT)
    high = min(wide / _CROP_ASPECT, float(height))
    left = min(max((x0 + x1 - wide) / 2.0, 0.0), width - wide)
    top = min(max((y0 + y1 - high) / 2.0, 0.0), height - high)
    box = (x0 - left, y0 - top, x1 - left, y1 - top)
    label_x, label_y = _label_place(box, wide, high, _CROP_LABEL_SHARE * wide, ())
    return Crop(left, top, wide, high, 100.0 * label_x / wide, 100.0 * label_y / high)


def ticks(low_c: float, high_c: float, units: Units, *, wanted: int = 6) -> tuple[Tick, ...]:
    """Round numbers on the scale from ``low_c`` to ``high_c``, in the printed unit.

    At most ``wanted`` of them, on a step of 1, 2 or 5 times a power of ten.
    """
    low, high = units.from_celsius(low_c), units.from_celsius(high_c)
    rough = (high - low) / wanted
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(factor * power for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= rough)
    decimals = max(0, -math.floor(math.log10(step)))
    first, last = math.ceil(low / step), math.floor(high / step)
    return tuple(
        Tick(100.0 * (count * step - low) / (high - low), units.fixed(count * step, decimals))
        for count in range(first, last + 1)
    )


def shares(contributions: Sequence[float]) -> tuple[float, ...]:
    """Length of each bar in per cent of the longest."""
    longest = max(contributions, default=0.0)
    return tuple(100.0 * value / longest if longest > 0.0 else 0.0 for value in contributions)
