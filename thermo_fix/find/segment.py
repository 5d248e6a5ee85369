"""Outline regions that stand out from a background."""

from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from thermo_fix.records import MaskArray

_BLOCK = np.ones((3, 3), np.uint8)
_HALF = 0.5
"""Level of the outline as a share of the peak: the half-height contour of a blurred edge lies
where the edge is."""
_SEED_SIGMAS = 5.0
_OUTLINE_SIGMAS = 3.0


@dataclass(frozen=True, slots=True)
class Outline:
    """One region of an image."""

    mask: MaskArray
    """(rows, columns) of the whole image."""
    peak_px: tuple[int, int]
    """x, y of the pixel whose 3 x 3 neighbourhood stands out most."""
    peak_k: float
    """How far it stands out, K, positive."""


def outline_regions(
    excess: NDArray[np.float32],
    inside: MaskArray,
    min_delta_k: float,
    min_area_px: int,
    sigma_k: float,
) -> list[Outline]:
    """Outline the regions in which an image exceeds its background.

    Seeds are pixels whose 3 x 3 mean exceeds ``min_delta_k`` (and 5 standard deviations of that
    mean); each grows, connected, down to half of its peak (hysteresis). Touching regions are one,
    unless the saddle between two peaks lies lower than the lesser peak by ``min_delta_k``.

    Parameters
    ----------
    excess
        (rows, columns), K: temperature minus background, for cold findings its negative.
    inside
        (rows, columns): pixels that may belong to a region.
    min_delta_k
        K.
    min_area_px
        Smallest number of pixels; a region also holds at least one 3 x 3 block.
    sigma_k
        Pixel noise, K.

    Returns
    -------
    list of Outline
        The one with the highest peak first.

    """
    smooth = box_mean(excess, inside)
    seed_level = max(min_delta_k, _SEED_SIGMAS * sigma_k / 3.0)
    floor = max(_HALF * min_delta_k, _OUTLINE_SIGMAS * sigma_k / 3.0)
    free = inside & (smooth > floor)
    found: list[Outline] = []
    taken = np.zeros(excess.shape, bool)
    count, areas = cv2.connectedComponents(free.astype(np.uint8), connectivity=8)
    for area in range(1, count):
        rest = areas == area
        while True:
            peak = _peak(smooth, rest)
            if peak is None or peak[1] < seed_level:
                break
            (row, column), height = peak
            level = max(_HALF * height, floor)
            grown = _connected(rest & (smooth > level), row, column)
            skirt = _skirt(smooth, rest & ~grown, grown, seed_level, min_delta_k)
            rest &= ~(grown | skirt)
            # The outline itself is taken from the pixels as they are: a mean over 3 x 3 pixels
            # would round it off. Single pixels lost to noise inside are filled.
            mask = _solid(grown_outline(excess, grown, level), inside & ~taken)
            if np.count_nonzero(mask) < min_area_px or not _has_block(mask):
                continue
            taken |= mask
            found.append(Outline(mask, (column, row), height))
    return sorted(found, key=lambda region: (-region.peak_k, region.peak_px))


def box_mean(values: NDArray[np.float32], inside: MaskArray) -> NDArray[np.float32]:
    """Mean over the usable pixels of each 3 x 3 neighbourhood, (rows, columns)."""
    total = cv2.blur(
        np.where(inside, values, 0.0).astype(np.float32), (3, 3), borderType=cv2.BORDER_CONSTANT
    )
    share = cv2.blur(inside.astype(np.float32), (3, 3), borderType=cv2.BORDER_CONSTANT)
    return np.asarray(np.where(inside, total / np.maximum(share, 1e-6), np.nan), np.float32)


def grown_outline(excess: NDArray[np.float32], grown: MaskArray, level: float) -> MaskArray:
    """Return the pixels above the level that touch a region grown on the smoothed image."""
    near = cv2.dilate(grown.astype(np.uint8), _BLOCK) > 0
    with np.errstate(invalid="ignore"):
        above = near & (excess > level)
    core = cv2.erode(grown.astype(np.uint8), _BLOCK, borderValue=0) > 0
    return above | core


def _solid(mask: MaskArray, free: MaskArray) -> MaskArray:
    """Fill small gaps as far as pixels are free, and return the largest part."""
    # With a border of its own, so that a gap beside the edge of the image is no gap inside.
    padded = np.pad((mask & free).astype(np.uint8), 1)
    kept = cv2.morphologyEx(padded, cv2.MORPH_CLOSE, _BLOCK)[1:-1, 1:-1].copy()
    kept[~free] = 0
    count, parts, stats, _ = cv2.connectedComponentsWithStats(kept, connectivity=8)
    if count <= 2:
        return kept > 0
    largest = 1 + int(np.argmax(stats[1:, cv2.CC_STAT_AREA]))
    return np.asarray(parts == largest)


def _peak(smooth: NDArray[np.float32], where: MaskArray) -> tuple[tuple[int, int], float] | None:
    if not where.any():
        return None
    flat = int(np.nanargmax(np.where(where, smooth, -np.inf)))
    row, column = np.unravel_index(flat, smooth.shape)
    return (int(row), int(column)), float(smooth[row, column])


def _connected(mask: MaskArray, row: int, column: int) -> MaskArray:
    _, parts = cv2.connectedComponents(mask.astype(np.uint8), connectivity=8)
    return np.asarray(parts == parts[row, column])


def _skirt(
    smooth: NDArray[np.float32],
    rest: MaskArray,
    grown: MaskArray,
    seed_level: float,
    min_delta_k: float,
) -> MaskArray:
    """Return the flanks of a region: what is left of it without a peak of its own.

    A part has a peak of its own where every way from it to the region dips below it by at least
    ``min_delta_k``.
    """
    skirt = np.zeros(rest.shape, bool)
    count, parts = cv2.connectedComponents(rest.astype(np.uint8), connectivity=8)
    touching = cv2.dilate(grown.astype(np.uint8), np.ones((5, 5), np.uint8)) > 0
    for part in range(1, count):
        here = parts == part
        peak = _peak(smooth, here)
        if peak is None or peak[1] < seed_level:
            skirt |= here
            continue
        (row, column), height = peak
        above = (rest | grown) & (smooth > height - min_delta_k)
        joined = bool(np.any(_connected(above, row, column) & grown))
        skirt |= here if joined else here & touching
    return skirt


def _has_block(mask: MaskArray) -> bool:
    return bool(cv2.erode(mask.astype(np.uint8), _BLOCK, borderValue=0).any())
