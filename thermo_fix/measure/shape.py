"""What the shape and the edge of a region look like, in numbers without a unit of temperature.

All are taken of the height: temperature over the level around the region, as a share of the
region's own peak. They do not change with the sense, the size in kelvins, or the orientation.
"""

import math
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray
from skimage.measure import find_contours

from thermo_fix.records import MaskArray

_SMOOTHING_PX = 1.0
"""Takes off most of the pixel noise and widens a sharp edge by little."""
_OUTLINE = 0.5
"""Height at which shapes are compared: there a blurred edge lies where the edge is."""
_RING_GAP = 0.35
_RING_WIDTH = 0.5
"""Gap and width of the ring around a region, in shares of the square root of its area."""
_LEAST_RING_PX = 60
_LEAST_AREA_PX = 45
_LEAST_BREADTH_PX = 3.0
_RAY_STEP_DEG = 5
_RAY_HALF_WIDTH_DEG = 20
_LEAST_SPREAD_RAYS_DEG = 40
_LINE_HEIGHT = 0.12
"""Mean height beyond the outline, over that of most directions, at which a line is seen there."""


@dataclass(frozen=True, slots=True)
class Shape:
    """Descriptors of one region."""

    elongation: float
    """Longer over shorter side of the smallest rectangle around the outline; 1 or more."""
    rectangularity: float
    """Area over that of this rectangle; 1 for a rectangle, 0.79 for an ellipse."""
    straight_share: float
    """Share of the outline in long straight runs; 1 for a polygon of few sides."""
    solidity: float
    """Area over that of the convex hull; 1 for a convex outline."""
    raggedness: float
    """Length of the outline over that of the hull; 1 for a convex outline."""
    edge_width: float
    """Width of the edge, height over gradient, as a share of the breadth of the region."""
    edge_width_px: float
    """The same in pixels."""
    unevenness: float
    """Spread of the gradient along the outline over its median: a plume is sharp at its root and
    fades at its end."""
    variation: float
    """Spread of the height inside, away from the edge."""
    trend: float
    """Change of the height along the region's axis, from end to end, by its best straight line."""
    one_sided: float
    """Place of the peak along the axis: 0 in the middle, 1 at an end."""
    mottling: float
    """Spread of the height inside about its smooth course."""
    lines: int
    """Straight structures that run from the region outwards."""
    breadth_px: float
    """Diameter of the largest circle in the region."""


def describe(
    temperature: NDArray[np.float32], usable: MaskArray, mask: MaskArray, sign: float
) -> Shape | None:
    """Describe a region.

    Parameters
    ----------
    temperature
        (rows, columns), K or degC; any value where not usable.
    usable
        (rows, columns): pixels of the same surface.
    mask
        (rows, columns): the region.
    sign
        1 for a hot region, -1 for a cold one.

    Returns
    -------
    Shape or None
        None where the region is too small or narrow, or too little is seen around it.

    """
    window = _around(mask)
    temperature, usable, mask = temperature[window], usable[window], mask[window]
    height = _height(temperature, usable, mask, sign)
    if height is None:
        return None
    outlined = _part_at(height, mask, _OUTLINE)
    area = int(np.count_nonzero(outlined))
    if area < _LEAST_AREA_PX:
        return None
    inner = cv2.distanceTransform(
        np.pad(outlined.astype(np.uint8), 1), cv2.DIST_L2, cv2.DIST_MASK_PRECISE
    )[1:-1, 1:-1]
    # A circle of one pixel has its centre half a pixel from the edge.
    breadth = 2.0 * (float(inner.max()) - 0.5)
    contour = _outline(height, outlined)
    if breadth < _LEAST_BREADTH_PX or contour is None:
        return None
    (_, _), sides, _ = cv2.minAreaRect(contour)
    shorter, longer = sorted(max(float(side), 1.0) for side in sides)
    hull = cv2.convexHull(contour)
    drawn_area = abs(float(cv2.contourArea(contour)))
    edge_px, unevenness = _edge(height, contour)
    core = outlined & (inner > 0.5 * float(inner.max()))
    trend, one_sided = _along(height, outlined)
    return Shape(
        elongation=longer / shorter,
        rectangularity=min(drawn_area / (longer * shorter), 1.0),
        straight_share=_straight_share(contour, math.sqrt(drawn_area)),
        solidity=drawn_area / max(float(cv2.contourArea(hull)), 1.0),
        raggedness=cv2.arcLength(contour, True) / max(cv2.arcLength(hull, True), 1.0),
        edge_width=edge_px / breadth,
        edge_width_px=edge_px,
        unevenness=unevenness,
        variation=_spread(height[core]),
        trend=trend,
        one_sided=one_sided,
        mottling=_mottling(height, core, breadth),
        lines=_lines(height, usable, outlined),
        breadth_px=breadth,
    )


def _around(mask: MaskArray) -> tuple[slice, slice]:
    """Return the part of the image that bears on a region: all that a ray from it reaches."""
    found = []
    occupied = [np.flatnonzero(mask.any(axis=axis)) for axis in (1, 0)]
    reach = 3 * max(int(each[-1] - each[0]) + 1 for each in occupied) + 8
    for each, length in zip(occupied, mask.shape, strict=True):
        found.append(slice(max(0, int(each[0]) - reach), min(length, int(each[-1]) + 1 + reach)))
    return found[0], found[1]


def _height(
    temperature: NDArray[np.float32], usable: MaskArray, mask: MaskArray, sign: float
) -> NDArray[np.float32] | None:
    """Smoothed height as a share of the peak; 0 where not usable."""
    size = math.sqrt(np.count_nonzero(mask))
    gap, width = max(3, round(_RING_GAP * size)), max(4, round(_RING_WIDTH * size))
    ring = _grown(mask, gap + width) & ~_grown(mask, gap) & usable
    if np.count_nonzero(ring) < _LEAST_RING_PX:
        return None
    rows, columns = np.nonzero(ring)
    values = temperature[ring].astype(np.float64)
    kept = np.ones(len(values), bool)
    terms = np.stack([np.ones(len(values)), rows, columns], axis=1)
    plane = np.array([float(np.median(values)), 0.0, 0.0])
    for _ in range(5):
        residual = values - terms @ plane
        spread = 1.4826 * float(np.median(np.abs(residual[kept] - np.median(residual[kept]))))
        kept = np.abs(residual - np.median(residual)) <= 2.0 * max(spread, 1e-3)
        plane = np.linalg.lstsq(terms[kept], values[kept], rcond=None)[0]
    row, column = np.indices(temperature.shape)
    base = plane[0] + plane[1] * row + plane[2] * column
    excess = np.where(usable, sign * (temperature - base), 0.0).astype(np.float32)
    weight = cv2.GaussianBlur(usable.astype(np.float32), (0, 0), _SMOOTHING_PX)
    smooth = cv2.GaussianBlur(excess, (0, 0), _SMOOTHING_PX) / np.maximum(weight, 0.1)
    peak = float(np.percentile(smooth[mask], 95))
    if not peak > 0.0:
        return None
    return np.asarray(smooth / peak * usable, np.float32)


def _grown(mask: MaskArray, by: int) -> MaskArray:
    kernel = cv2.getStructuringElement(cv2.MORPH_ELLIPSE, (2 * by + 1, 2 * by + 1))
    return np.asarray(cv2.dilate(mask.astype(np.uint8), kernel) > 0)


def _part_at(height: NDArray[np.float32], mask: MaskArray, level: float) -> MaskArray:
    """Return the connected part above a level that holds most of the region."""
    count, parts = cv2.connectedComponents((height > level).astype(np.uint8), connectivity=4)
    shared = np.bincount(parts[mask], minlength=count)
    shared[0] = 0
    return np.asarray((parts == int(np.argmax(shared))) & bool(shared.any()))


def _outline(height: NDArray[np.float32], part: MaskArray) -> NDArray[np.float32] | None:
    """Return the outer contour at half height between the pixels, as (x, y) in float32."""
    # Nothing but this part, and closed where the image ends.
    alone = np.where(_grown(part, 1), height, 0.0)
    lines = find_contours(np.pad(alone, 1), _OUTLINE)
    if not lines:
        return None
    longest = max(lines, key=len)
    points = (longest[:, ::-1] - 1.0).astype(np.float32)
    return points[:, None, :] if len(points) >= 8 else None


def _edge(height: NDArray[np.float32], contour: NDArray[np.float32]) -> tuple[float, float]:
    """Width of the edge, px, and the spread of its gradient along the outline."""
    slope_x = cv2.Sobel(height, cv2.CV_32F, 1, 0, ksize=3, scale=0.125)
    slope_y = cv2.Sobel(height, cv2.CV_32F, 0, 1, ksize=3, scale=0.125)
    steep = np.hypot(slope_x, slope_y)
    x, y = contour[:, 0, 0], contour[:, 0, 1]
    rows, columns = steep.shape
    # At the edge of the image the outline is where the image ends, not where the region does.
    inside = (x > 1.5) & (y > 1.5) & (x < columns - 2.5) & (y < rows - 2.5)
    if np.count_nonzero(inside) < 8:
        return math.inf, 0.0
    at = cv2.remap(steep, x[inside][:, None], y[inside][:, None], cv2.INTER_LINEAR)[:, 0]
    low, middle, high = np.percentile(at, [15, 50, 85])
    middle = max(float(middle), 1e-4)
    return 1.0 / middle, float(high - low) / middle


def _straight_share(contour: NDArray[np.float32], size: float) -> float:
    # A disc's longest chord within this tolerance is 0.37 of its size, and so not long.
    tolerance = max(0.7, 0.03 * size)
    corners = cv2.approxPolyDP(contour, tolerance, True)[:, 0, :].astype(np.float64)
    sides = np.hypot(*(np.roll(corners, -1, axis=0) - corners).T)
    total = float(sides.sum())
    return float(sides[sides >= 0.42 * size].sum()) / total if total > 0.0 else 0.0


def _spread(values: NDArray[np.float32]) -> float:
    if len(values) < 5:
        return 0.0
    low, high = np.percentile(values, [10, 90])
    return float(high - low)


def _along(height: NDArray[np.float32], part: MaskArray) -> tuple[float, float]:
    """Trend of the height along the axis in which it changes most, and the place of the peak."""
    rows, columns = np.nonzero(part)
    values = height[part].astype(np.float64)
    x, y = columns - columns.mean(), rows - rows.mean()
    terms = np.stack([np.ones(len(x)), x, y], axis=1)
    _, by_x, by_y = np.linalg.lstsq(terms, values, rcond=None)[0]
    steep = math.hypot(by_x, by_y)
    if steep == 0.0:
        return 0.0, 0.0
    place = (by_x * x + by_y * y) / steep
    low, high = np.percentile(place, [3, 97])
    length = max(float(high - low), 1.0)
    top = values >= np.percentile(values, 90)
    peak = (float(np.mean(place[top])) - 0.5 * float(low + high)) / (0.5 * length)
    return steep * length, abs(peak)


def _mottling(height: NDArray[np.float32], core: MaskArray, breadth: float) -> float:
    """Spread inside about a smooth surface of second order."""
    rows, columns = np.nonzero(core)
    if len(rows) < 25:
        return 0.0
    x = (columns - columns.mean()) / breadth
    y = (rows - rows.mean()) / breadth
    terms = np.stack([np.ones(len(x)), x, y, x * x, x * y, y * y], axis=1)
    values = height[core].astype(np.float64)
    rest = values - terms @ np.linalg.lstsq(terms, values, rcond=None)[0]
    return float(np.std(rest))


def _lines(height: NDArray[np.float32], usable: MaskArray, part: MaskArray) -> int:
    """Count the directions in which a narrow straight structure leaves the region."""
    rows, columns = np.nonzero(part)
    weights = np.clip(height[part].astype(np.float64), 0.0, None) ** 4
    row, column = np.average(rows, weights=weights), np.average(columns, weights=weights)
    radius = math.sqrt(len(rows) / math.pi)
    far = np.hypot(rows - row, columns - column).max()
    start, stop = max(1.3 * radius, 1.05 * float(far)), 2.6 * max(radius, float(far))
    angles = np.deg2rad(np.arange(0, 360, _RAY_STEP_DEG))
    distances = np.arange(start, stop, 1.0)
    x = (column + np.outer(np.cos(angles), distances)).astype(np.float32)
    y = (row + np.outer(np.sin(angles), distances)).astype(np.float32)
    seen = cv2.remap(height, x, y, cv2.INTER_LINEAR, borderValue=0.0)
    inside = cv2.remap(usable.astype(np.float32), x, y, cv2.INTER_LINEAR, borderValue=0.0) > 0.9
    counted = inside.sum(axis=1)
    level = np.where(
        counted >= 0.5 * len(distances),
        np.where(inside, seen, 0.0).sum(axis=1) / np.maximum(counted, 1),
        np.nan,
    )
    if np.count_nonzero(np.isfinite(level)) < 0.5 * len(level):
        return 0
    excess = np.nan_to_num(level - np.nanmedian(level))
    found = 0
    while True:
        best = int(np.argmax(excess))
        if excess[best] < _LINE_HEIGHT:
            return found
        apart = np.abs((np.arange(len(excess)) - best + 36) % 72 - 36) * _RAY_STEP_DEG
        width = np.count_nonzero((excess > 0.5 * excess[best]) & (apart < 60)) * _RAY_STEP_DEG
        excess[apart < _LEAST_SPREAD_RAYS_DEG] = 0.0
        if width <= 2 * _RAY_HALF_WIDTH_DEG:
            found += 1
