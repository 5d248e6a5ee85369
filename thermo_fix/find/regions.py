"""Find the regions of one corrected image."""

from dataclasses import replace
from typing import NamedTuple

import cv2
import numpy as np
from numpy.typing import NDArray

from thermo_fix.find.background import background
from thermo_fix.find.noise import noise_sigma, without_spikes
from thermo_fix.find.segment import Outline, box_mean, outline_regions
from thermo_fix.records import CorrectedFrame, DetectSettings, MaskArray, Region, Sense

_MARGIN_PX = 3
"""Width of the strip around a zone that belongs to neither side: optics mix the two there."""
_SMALL_REST_PX = 400
_RING_GAP_PX = 3
_RING_WIDTH_PX = 6
_EDGE_BLUR_PX = 1
_STAND_OUT = 0.7
"""Share of the smallest difference by which a region must differ from its ring: less than 1,
because the ring of a region on a slope is not level."""


class Found(NamedTuple):
    """What came of the search of one image."""

    regions: tuple[Region, ...]
    sigma_k: float
    """Pixel noise of the corrected image, K."""
    spikes: int
    """Defective pixels that were bridged."""
    unlike: int = 0
    """Regions left out because their zone's like zones show the same."""


def find_regions(corrected: CorrectedFrame) -> Found:
    """Find hot and cold regions of a corrected image.

    Each zone, and the rest of the image as one more, is searched against its own smooth
    background; then like zones are compared with each other.

    Parameters
    ----------
    corrected
        From the correct stage.

    Returns
    -------
    Found
        Regions in the order of their zones, highest first.

    """
    job = corrected.job
    detect = job.detect
    usable = np.isfinite(corrected.surface_k) & ~corrected.ignored
    if not usable.any():
        return Found((), 0.0, 0)
    sigma = noise_sigma(corrected.surface_k, usable)
    temperature, spikes = without_spikes(corrected.surface_k, usable, sigma)
    senses: list[Sense] = []
    if detect.warm:
        senses.append("hot")
    if detect.cold:
        senses.append("cold")
    regions: list[Region] = []
    for label in range(len(job.zones) + 1):
        inside = _searched(corrected, label, usable)
        if label == 0 and np.count_nonzero(inside) < _SMALL_REST_PX and job.zones:
            continue
        regions += _search(temperature, inside, label, senses, detect, sigma)
    referred = [_with_like(corrected, temperature, usable, region) for region in regions]
    local = [region for region in referred if region is not None]
    whole = _whole_zones(corrected, temperature, usable, senses, local)
    every = (*local, *whole)
    if spikes:
        bridged = usable & (temperature != corrected.surface_k)
        every = tuple(_with_defective(region, bridged) for region in every)
    return Found(every, sigma, spikes, len(referred) - len(local))


def _with_defective(region: Region, bridged: MaskArray) -> Region:
    """Name the bridged pixels beside the places where the region is measured."""
    places = [region.extreme_px]
    if region.reference_kind == "like component":
        places += region.reference_px
    found: dict[tuple[int, int], None] = {}
    for x, y in places:
        top, left = max(0, y - 1), max(0, x - 1)
        for row, column in np.argwhere(bridged[top : y + 2, left : x + 2]).tolist():
            found[(left + column, top + row)] = None
    return replace(region, defective_px=tuple(found))


def _searched(corrected: CorrectedFrame, label: int, usable: MaskArray) -> MaskArray:
    here: MaskArray = (corrected.labels == label) & usable
    if not corrected.job.zones:
        return here
    own = (corrected.labels == label).astype(np.uint8)
    # The rest of the image keeps well clear of the zones; a zone gives up only the blurred edge.
    margin = _MARGIN_PX if label == 0 else _EDGE_BLUR_PX
    kernel = np.ones((2 * margin + 1, 2 * margin + 1), np.uint8)
    clear: MaskArray = here & (cv2.erode(own, kernel, borderValue=1) > 0)
    return clear if np.count_nonzero(clear) >= 25 else here


def _search(
    temperature: NDArray[np.float32],
    inside: MaskArray,
    label: int,
    senses: list[Sense],
    detect: DetectSettings,
    sigma: float,
) -> list[Region]:
    if np.count_nonzero(inside) < 9:
        return []
    base = background(temperature, inside, detect.min_delta_k, sigma)
    regions: list[Region] = []
    for sense in senses:
        sign = 1.0 if sense == "hot" else -1.0
        excess = np.where(inside, sign * (temperature - base), np.nan).astype(np.float32)
        for outline in outline_regions(
            excess, inside, detect.min_delta_k, detect.min_area_px, sigma
        ):
            ring = _ring(outline.mask, inside)
            if not _stands_out(temperature, outline, ring, sign, detect.min_delta_k):
                continue
            region = _region(
                outline.mask,
                label=label,
                sense=sense,
                extreme_px=outline.peak_px,
                reference_px=ring,
                ring_delta_k=sign * outline.peak_k,
            )
            regions.append(region)
    return regions


def _region(
    mask: MaskArray,
    *,
    label: int,
    sense: Sense,
    extreme_px: tuple[int, int],
    reference_px: tuple[tuple[int, int], ...],
    ring_delta_k: float,
) -> Region:
    rows, columns = np.nonzero(mask)
    x0, x1 = int(columns.min()), int(columns.max()) + 1
    y0, y1 = int(rows.min()), int(rows.max()) + 1
    height, width = mask.shape
    return Region(
        label=label,
        sense=sense,
        mask=mask[y0:y1, x0:x1].copy(),
        bbox_px=(x0, y0, x1, y1),
        extreme_px=extreme_px,
        reference_kind="surroundings",
        reference_px=reference_px,
        cut_by_frame=x0 == 0 or y0 == 0 or x1 == width or y1 == height,
        ring_delta_k=ring_delta_k,
    )


def _stands_out(
    temperature: NDArray[np.float32],
    outline: Outline,
    ring: tuple[tuple[int, int], ...],
    sign: float,
    min_delta_k: float,
) -> bool:
    """Say whether a region differs from what lies around it, not only from the fitted background.

    Where a strong gradient bends, the background misses it, and the bend would be a region.
    """
    if not ring:
        return True
    columns, rows = np.array(ring).T
    around = float(np.median(temperature[rows, columns]))
    x, y = outline.peak_px
    window = temperature[max(0, y - 1) : y + 2, max(0, x - 1) : x + 2]
    return sign * (float(np.nanmean(window)) - around) >= _STAND_OUT * min_delta_k


def _ring(mask: MaskArray, inside: MaskArray) -> tuple[tuple[int, int], ...]:
    """Return the pixels (x, y) of the same zone in a ring around a region."""
    occupied = [np.flatnonzero(mask.any(axis=axis)) for axis in (1, 0)]
    rows = columns = np.empty(0, np.intp)
    top = left = 0
    for width in (_RING_WIDTH_PX, 4 * _RING_WIDTH_PX, max(mask.shape)):
        # Only as much of the image as the ring can reach.
        margin = _RING_GAP_PX + width
        top, left = (max(0, int(each[0]) - margin) for each in occupied)
        bottom, right = (int(each[-1]) + 1 + margin for each in occupied)
        part = mask[top:bottom, left:right].astype(np.uint8)
        inner = cv2.dilate(part, np.ones((2 * _RING_GAP_PX + 1,) * 2, np.uint8))
        outer = cv2.dilate(part, np.ones((2 * margin + 1,) * 2, np.uint8))
        rows, columns = np.nonzero((outer > 0) & (inner == 0) & inside[top:bottom, left:right])
        if len(rows) >= 25:
            break
    return tuple(zip((columns + left).tolist(), (rows + top).tolist(), strict=True))


# ---------------------------------------------------------------- like zones


def _inner(corrected: CorrectedFrame, label: int, usable: MaskArray) -> MaskArray:
    return _searched(corrected, label, usable)


def _others(corrected: CorrectedFrame, label: int) -> list[int]:
    zones = corrected.job.zones
    if label == 0 or zones[label - 1].like is None:
        return []
    word = zones[label - 1].like
    return [
        other
        for other, zone in enumerate(zones, start=1)
        if other != label and zone.like == word and not zone.ignore
    ]


def _extreme_px(
    temperature: NDArray[np.float32], inside: MaskArray, sense: Sense
) -> tuple[int, int]:
    smooth = box_mean(temperature, inside)
    if sense == "hot":
        flat = int(np.nanargmax(np.where(inside, smooth, -np.inf)))
    else:
        flat = int(np.nanargmin(np.where(inside, smooth, np.inf)))
    row, column = np.unravel_index(flat, smooth.shape)
    return int(column), int(row)


def _like_reference(levels: dict[int, float], sense: Sense) -> tuple[int, tuple[int, ...]]:
    """Choose the reference among like zones by a level of each.

    With at least three others the one at their median (the lower of the middle two for a hot
    finding); with fewer the coolest for a hot finding and the warmest for a cold one.
    """
    ordered = sorted(levels, key=lambda label: (levels[label], label))
    if sense == "cold":
        ordered.reverse()
    if len(ordered) >= 3:
        return ordered[(len(ordered) - 1) // 2], tuple(sorted(ordered))
    return ordered[0], (ordered[0],)


def _with_like(
    corrected: CorrectedFrame,
    temperature: NDArray[np.float32],
    usable: MaskArray,
    region: Region,
) -> Region | None:
    """Refer a region in a zone that has like zones to one of them, at the same statistic.

    None where the like zones show the same: then the region is only the sound part of a zone
    whose background was drawn away by a fault.
    """
    others = _others(corrected, region.label)
    spots: dict[int, tuple[int, int]] = {}
    levels: dict[int, float] = {}
    for other in others:
        inside = _inner(corrected, other, usable)
        if np.count_nonzero(inside) < 9:
            continue
        x, y = spots[other] = _extreme_px(temperature, inside, region.sense)
        levels[other] = float(box_mean(temperature, inside)[y, x])
    if not levels:
        return region
    sign = 1.0 if region.sense == "hot" else -1.0
    x, y = region.extreme_px
    own = float(box_mean(temperature, corrected.labels == region.label)[y, x])
    farthest = max(sign * (own - level) for level in levels.values())
    if farthest < corrected.job.detect.min_delta_k:
        return None
    chosen, used = _like_reference(levels, region.sense)
    return replace(
        region,
        reference_kind="like component",
        reference_label=chosen,
        reference_labels=used,
        reference_px=(spots[chosen],),
    )


def _whole_zones(
    corrected: CorrectedFrame,
    temperature: NDArray[np.float32],
    usable: MaskArray,
    senses: list[Sense],
    local: list[Region],
) -> list[Region]:
    """Find zones that differ as a whole from their like zones."""
    zones = corrected.job.zones
    insides: dict[int, MaskArray] = {}
    medians: dict[int, float] = {}
    for label, zone in enumerate(zones, start=1):
        if zone.like is None or zone.ignore:
            continue
        inside = _inner(corrected, label, usable)
        if np.count_nonzero(inside) >= 9:
            insides[label] = inside
            medians[label] = float(np.median(temperature[inside]))
    found: list[Region] = []
    for label, inside in insides.items():
        others = {other: medians[other] for other in _others(corrected, label) if other in medians}
        if not others:
            continue
        for sense in senses:
            if any(region.label == label and region.sense == sense for region in local):
                continue
            sign = 1.0 if sense == "hot" else -1.0
            chosen, used = _like_reference(others, sense)
            delta = sign * (medians[label] - medians[chosen])
            if delta <= corrected.job.detect.min_delta_k:
                continue
            if not _is_the_odd_one(medians[label], others, sense, senses, delta):
                continue
            region = _region(
                inside,
                label=label,
                sense=sense,
                extreme_px=_extreme_px(temperature, inside, sense),
                reference_px=(_extreme_px(temperature, insides[chosen], sense),),
                ring_delta_k=sign * delta,
            )
            found.append(
                replace(
                    region,
                    reference_kind="like component",
                    reference_label=chosen,
                    reference_labels=used,
                    whole_zone=True,
                )
            )
    return found


def _is_the_odd_one(
    own: float, others: dict[int, float], sense: Sense, senses: list[Sense], delta: float
) -> bool:
    """Say whether a zone is the one that differs, and not what it differs from.

    Of three zones with one warm, the other two are not cold: the odd one lies farther from the
    middle of the group. Of two nothing can be told; the warm one is then named, if warm findings
    are wanted.
    """
    if len(others) == 1:
        return sense == "hot" or "hot" not in senses
    sign = 1.0 if sense == "hot" else -1.0
    middle = float(np.median([own, *others.values()]))
    return sign * (own - middle) > 0.5 * delta
