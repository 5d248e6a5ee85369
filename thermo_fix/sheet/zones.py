"""Polygons of zones: are they sound, and which pixels do they cover.

Coordinates are (x, y) with the origin at the outer corner of the first pixel, so that the centre
of the pixel in row r and column c lies at (c + 0.5, r + 0.5).
"""

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError, ImageError
from thermo_fix.records import LabelArray, MaskArray, Zone

Point = tuple[float, float]
Polygon = Sequence[Point]

MAX_POINTS = 2000
"""Corners of one polygon; the search for crossing sides grows with their square."""
MAX_COORDINATE = 1e6
"""Pixels; larger than any image."""
MAX_ZONES = 10_000
"""Zones of one image; the labels are 16-bit."""


def clean_polygon(points: Polygon) -> tuple[Point, ...]:
    """Leave out corners that repeat the one before, and a last one that repeats the first."""
    kept: list[Point] = []
    for point in points:
        if not kept or point != kept[-1]:
            kept.append(point)
    while len(kept) > 1 and kept[-1] == kept[0]:
        kept.pop()
    return tuple(kept)


def polygon_problem(polygon: Polygon) -> str | None:
    """Say what is wrong with a cleaned polygon, whatever the image; None when it is sound."""
    if len(polygon) > MAX_POINTS:
        return f"{len(polygon)} points are too many for a zone (at most {MAX_POINTS})"
    if len(polygon) < 3:
        return f"a zone needs at least 3 different points, this one has {len(polygon)}"
    for x, y in polygon:
        if not (abs(x) <= MAX_COORDINATE and abs(y) <= MAX_COORDINATE):
            return f"the point [{x:g}, {y:g}] is no place in an image"
    crossing = _first_crossing(polygon)
    if _twice_area(polygon) == 0.0 and _all_on_one_line(polygon):
        return "all points lie on one line, so the zone has no area"
    if crossing is not None:
        first, second = crossing
        return (
            f"the outline crosses or touches itself: the side from point {first + 1} meets the "
            f"side from point {second + 1}; list the corners in order around the zone"
        )
    return None


def check_polygon(zone: Zone, width: int, height: int) -> str | None:
    """Check a zone against the size of its image, known only once the image is read.

    Returns a note for the report when part of the zone lies off the image, else None. Raises
    ``ImageError`` when no pixel's centre lies in the zone.
    """
    if not zone_mask(zone.polygon, (height, width)).any():
        xs, ys = zip(*zone.polygon, strict=True)
        off = max(xs) <= 0 or max(ys) <= 0 or min(xs) >= width or min(ys) >= height
        trouble = "lies wholly off the image" if off else "covers no pixel"
        raise ImageError(
            f'zone "{zone.name}" {trouble} ({width} x {height} pixels; its points span '
            f"x {min(xs):g} to {max(xs):g}, y {min(ys):g} to {max(ys):g}); mend its polygon"
        )
    if all(0 <= x <= width and 0 <= y <= height for x, y in zone.polygon):
        return None
    return (
        f'Zone "{zone.name}" reaches beyond the image ({width} x {height} pixels) and is cut off '
        "at its edge."
    )


def zone_mask(polygon: Polygon, shape: tuple[int, int]) -> MaskArray:
    """Pixels whose centre lies inside a polygon; what lies off the image is cut off.

    ``shape`` is (rows, columns), and so is the mask. A centre exactly on a side belongs to the
    zone on its right (or below), never to both and never to none: zones that share a side share
    no pixel and leave no gap. Even-odd rule along each row of pixel centres.
    """
    rows, columns = shape
    # Where the number of sides to the left of a pixel centre changes; one spare column takes
    # the crossings beyond the right edge.
    changes = np.zeros((rows, columns + 1), dtype=bool)
    for (x0, y0), (x1, y1) in _upward_sides(polygon):
        first = max(0, int(np.ceil(y0 - 0.5)))
        stop = min(rows, int(np.ceil(y1 - 0.5)))
        if first >= stop:
            continue
        row = np.arange(first, stop)
        x = x0 + (row + 0.5 - y0) * ((x1 - x0) / (y1 - y0))
        column = np.clip(np.ceil(x - 0.5), 0, columns).astype(np.intp)
        changes[row, column] ^= True
    mask: MaskArray = np.logical_xor.accumulate(changes, axis=1)[:, :columns]
    return mask


def label_zones(zones: Sequence[Zone], shape: tuple[int, int]) -> LabelArray:
    """Label each pixel with its zone: 0 for the rest of the image, i + 1 for ``zones[i]``.

    Where zones overlap the later one has the pixel. ``shape`` is (rows, columns).
    """
    if len(zones) > MAX_ZONES:
        raise DomainError(f"{len(zones)} zones in one image are too many (at most {MAX_ZONES})")
    labels: NDArray[np.int16] = np.zeros(shape, dtype=np.int16)
    for index, zone in enumerate(zones):
        labels[zone_mask(zone.polygon, shape)] = index + 1
    return labels


def overlap_notes(zones: Sequence[Zone], shape: tuple[int, int]) -> tuple[str, ...]:
    """Say which zones overlap and who has the pixels, one sentence for each pair."""
    labels: NDArray[np.int16] = np.zeros(shape, dtype=np.int16)
    lost: dict[tuple[int, int], int] = {}
    for index, zone in enumerate(zones):
        mask = zone_mask(zone.polygon, shape)
        owners, counts = np.unique(labels[mask], return_counts=True)
        for owner, count in zip(owners.tolist(), counts.tolist(), strict=True):
            if owner:
                lost[owner - 1, index] = count
        labels[mask] = index + 1
    return tuple(
        f'Zones "{zones[first].name}" and "{zones[second].name}" overlap: {count} pixels belong '
        f'to "{zones[second].name}", which stands later in the sheet.'
        for (first, second), count in sorted(lost.items())
    )


def _upward_sides(polygon: Polygon) -> Iterator[tuple[Point, Point]]:
    """Yield the sides that are not level, lower y first: both owners of a side compute alike."""
    for start, end in zip(polygon, (*polygon[1:], polygon[0]), strict=True):
        if start[1] < end[1]:
            yield start, end
        elif start[1] > end[1]:
            yield end, start


def _twice_area(polygon: Polygon) -> float:
    following = (*polygon[1:], polygon[0])
    return abs(sum(a[0] * b[1] - a[1] * b[0] for a, b in zip(polygon, following, strict=True)))


def _turn(a: Point, b: Point, c: Point) -> float:
    """Above 0 where c lies to one side of the line from a to b, below 0 on the other, 0 on it."""
    return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])


def _all_on_one_line(polygon: Polygon) -> bool:
    return all(_turn(polygon[0], polygon[1], point) == 0.0 for point in polygon)


def _within_box(a: Point, b: Point, point: Point) -> bool:
    return min(a[0], b[0]) <= point[0] <= max(a[0], b[0]) and (
        min(a[1], b[1]) <= point[1] <= max(a[1], b[1])
    )


def _meet(a: Point, b: Point, c: Point, d: Point) -> bool:
    """Whether two sides share a point."""
    c_side, d_side = _turn(a, b, c), _turn(a, b, d)
    a_side, b_side = _turn(c, d, a), _turn(c, d, b)
    if (
        (c_side > 0) != (d_side > 0)
        and (a_side > 0) != (b_side > 0)
        and 0.0
        not in (
            c_side,
            d_side,
            a_side,
            b_side,
        )
    ):
        return True
    return (
        (c_side == 0 and _within_box(a, b, c))
        or (d_side == 0 and _within_box(a, b, d))
        or (a_side == 0 and _within_box(c, d, a))
        or (b_side == 0 and _within_box(c, d, b))
    )


def _first_crossing(polygon: Polygon) -> tuple[int, int] | None:
    """Two sides (numbers of their first corners) that meet where they should not."""
    count = len(polygon)
    sides = [(polygon[i], polygon[(i + 1) % count]) for i in range(count)]
    for i in range(count):
        a, b = sides[i]
        c = sides[(i + 1) % count][1]
        # A side that runs back over the one before it.
        back = (b[0] - a[0]) * (c[0] - b[0]) + (b[1] - a[1]) * (c[1] - b[1])
        if _turn(a, b, c) == 0.0 and back < 0.0:
            return tuple(sorted((i, (i + 1) % count)))  # type: ignore[return-value]
    # In order of their left ends, so that most pairs need no look.
    order = sorted(range(count), key=lambda i: min(sides[i][0][0], sides[i][1][0]))
    for place, i in enumerate(order):
        a, b = sides[i]
        right = max(a[0], b[0])
        for j in order[place + 1 :]:
            c, d = sides[j]
            if min(c[0], d[0]) > right:
                break
            if (i - j) % count in (1, count - 1):
                continue
            if _meet(a, b, c, d):
                return (i, j) if i < j else (j, i)
    return None
