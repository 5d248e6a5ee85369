"""Outlines of regions against slow independent code and against shapes that were put in."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from thermo_fix.find.segment import box_mean, outline_regions

SHAPE = (16, 18)
Pixel = tuple[int, int]
Bools = NDArray[np.bool_]


# ---- slow code, pure Python --------------------------------------------------------------------


def neighbours(pixel: Pixel, shape: Pixel) -> list[Pixel]:
    """The pixel and its eight neighbours, as far as they lie in the image."""
    row, column = pixel
    return [
        (r, c)
        for r in (row - 1, row, row + 1)
        for c in (column - 1, column, column + 1)
        if 0 <= r < shape[0] and 0 <= c < shape[1]
    ]


def slow_mean(values: list[list[float]], inside: set[Pixel], shape: Pixel) -> dict[Pixel, float]:
    found = {}
    for pixel in inside:
        near = [values[r][c] for r, c in neighbours(pixel, shape) if (r, c) in inside]
        found[pixel] = sum(near) / len(near)
    return found


def flood(start: Pixel, allowed: set[Pixel], shape: Pixel) -> set[Pixel]:
    reached, waiting = {start}, [start]
    while waiting:
        for pixel in neighbours(waiting.pop(), shape):
            if pixel in allowed and pixel not in reached:
                reached.add(pixel)
                waiting.append(pixel)
    return reached


def grown_by_one(pixels: set[Pixel], shape: Pixel) -> set[Pixel]:
    return {near for pixel in pixels for near in neighbours(pixel, shape)}


def core_of(pixels: set[Pixel], shape: Pixel) -> set[Pixel]:
    """Pixels with eight neighbours that belong too."""
    return {p for p in pixels if sum(near in pixels for near in neighbours(p, shape)) == 9}


def closed(pixels: set[Pixel]) -> set[Pixel]:
    """Fill gaps of one or two pixels, on a plane without an edge."""

    def around(pixel: Pixel) -> list[Pixel]:
        return [(pixel[0] + i, pixel[1] + j) for i in (-1, 0, 1) for j in (-1, 0, 1)]

    wide = {near for pixel in pixels for near in around(pixel)}
    return {pixel for pixel in wide if all(near in wide for near in around(pixel))}


def slow_plateaus(
    values: list[list[float]], height: float, shape: Pixel, min_area: int
) -> list[set[Pixel]]:
    """Regions of an image of level plateaus of one height, by flood fill from each pixel."""
    everywhere = {(r, c) for r in range(shape[0]) for c in range(shape[1])}
    mean = slow_mean(values, everywhere, shape)
    allowed = {pixel for pixel in everywhere if mean[pixel] > height / 2}
    left, found = set(allowed), []
    while left:
        grown = flood(next(iter(left)), allowed, shape)
        left -= grown
        above = {(r, c) for r, c in grown_by_one(grown, shape) if values[r][c] > height / 2}
        outline = above | core_of(grown, shape)
        outline = closed(outline)
        has_block = any(
            all((r + i, c + j) in outline for i in range(3) for j in range(3)) for r, c in outline
        )
        if len(outline) >= min_area and has_block:
            found.append(outline)
    return found


def pixels_of(mask: Bools) -> frozenset[Pixel]:
    return frozenset((int(r), int(c)) for r, c in np.argwhere(mask))


blocks = st.lists(
    st.tuples(st.integers(0, 12), st.integers(0, 14), st.integers(3, 6), st.integers(3, 6)),
    min_size=0,
    max_size=4,
)


def plateaus(boxes: list[tuple[int, int, int, int]], height: float) -> NDArray[np.float32]:
    image = np.zeros(SHAPE, np.float32)
    for row, column, rows, columns in boxes:
        image[row : row + rows, column : column + columns] = height
    return image


@settings(max_examples=150, deadline=None)
@given(boxes=blocks, min_area=st.integers(9, 30))
def test_plateaus_against_flood_fill(boxes: list[tuple[int, int, int, int]], min_area: int) -> None:
    image = plateaus(boxes, 4.0)
    found = outline_regions(image, np.ones(SHAPE, bool), 1.0, min_area, 0.0)
    expected = slow_plateaus(image.tolist(), 4.0, SHAPE, min_area)
    assert {pixels_of(each.mask) for each in found} == {frozenset(each) for each in expected}


@settings(max_examples=60, deadline=None)
@given(
    values=st.lists(st.floats(-5, 5, width=32), min_size=30, max_size=30),
    open_=st.lists(st.booleans(), min_size=30, max_size=30),
)
def test_mean_of_neighbours_against_a_loop(values: list[float], open_: list[bool]) -> None:
    image = np.array(values, np.float32).reshape(5, 6)
    inside = np.array(open_).reshape(5, 6)
    expected = slow_mean(image.tolist(), set(pixels_of(inside)), (5, 6))
    found = box_mean(np.where(inside, image, np.nan).astype(np.float32), inside)
    assert np.array_equal(np.isfinite(found), inside)
    for pixel, mean in expected.items():
        assert found[pixel] == pytest.approx(mean, abs=1e-5)


@settings(max_examples=40, deadline=None)
@given(seed=st.integers(0, 10_000), sigma=st.floats(0.05, 1.0))
def test_what_every_outline_must_be(seed: int, sigma: float) -> None:
    rng = np.random.default_rng(seed)
    image = rng.normal(0.0, sigma, (40, 50)).astype(np.float32)
    for _ in range(3):
        r, c, size = (int(n) for n in rng.integers(0, 30, 3))
        image[r : r + size, c : c + size] += float(rng.uniform(0.5, 4.0))
    inside = rng.random((40, 50)) > 0.05
    found = outline_regions(image, inside, 1.0, 12, sigma)
    together = np.zeros((40, 50), int)
    for each in found:
        together += each.mask
        assert each.mask.sum() >= 12
        x, y = each.peak_px
        assert inside[y, x]
        assert each.peak_k == box_mean(image, inside)[y, x]
        assert each.peak_k >= max(1.0, 5.0 * sigma / 3.0)
        whole = flood(next(iter(pixels_of(each.mask))), set(pixels_of(each.mask)), (40, 50))
        assert len(whole) == each.mask.sum()  # in one piece
    assert together.max(initial=0) <= 1  # no pixel twice
    heights = [each.peak_k for each in found]
    assert heights == sorted(heights, reverse=True)


# ---- shapes ------------------------------------------------------------------------------------


def cone(shape: Pixel, centre: Pixel, height: float, fall: float) -> NDArray[np.float32]:
    """A peak that falls off by `fall` K per pixel."""
    y, x = np.indices(shape)
    distance = np.hypot(y - centre[0], x - centre[1])
    return np.maximum(0.0, height - fall * distance).astype(np.float32)


def outlines(
    image: NDArray[np.float32], min_delta_k: float = 1.0, min_area_px: int = 9, sigma: float = 0.0
) -> list[Bools]:
    inside = np.ones(image.shape, bool)
    return [each.mask for each in outline_regions(image, inside, min_delta_k, min_area_px, sigma)]


def test_outline_reaches_down_to_half_of_the_peak() -> None:
    (mask,) = outlines(cone((60, 60), (30, 30), 12.0, 0.5))
    # Half of 12 K, less what the 3 x 3 mean takes off the tip, is reached 12 pixels out.
    radius = np.sqrt(mask.sum() / np.pi)
    assert radius == pytest.approx(12.0, abs=0.6)


def test_hysteresis_seed_and_growth() -> None:
    # A plateau below the threshold is no region of its own, and belongs to one with a seed.
    low = np.zeros((30, 40), np.float32)
    low[10:20, 5:25] = 0.9
    assert outlines(low) == []
    seeded = low.copy()
    seeded[10:20, 5:9] = 1.5
    (mask,) = outlines(seeded)
    assert mask[12:18, 6:24].all()


@pytest.mark.parametrize(("by_k", "count"), [(0.99, 0), (1.01, 1)])
def test_threshold_both_sides(by_k: float, count: int) -> None:
    image = np.zeros((30, 30), np.float32)
    image[10:16, 10:16] = by_k
    assert len(outlines(image)) == count


@pytest.mark.parametrize(("sigma", "count"), [(0.5, 1), (0.7, 0)])
def test_noise_raises_the_threshold(sigma: float, count: int) -> None:
    # Five standard deviations of a mean over 9 pixels: 5/3 of the noise against a height of 1.1.
    image = np.zeros((30, 30), np.float32)
    image[10:16, 10:16] = 1.1
    assert len(outlines(image, sigma=sigma)) == count


@pytest.mark.parametrize(
    ("rows", "columns", "min_area", "count"),
    [
        (3, 3, 9, 1),
        (3, 3, 10, 0),
        (4, 5, 20, 1),
        (4, 5, 21, 0),
        (2, 12, 9, 0),  # 24 pixels, but no block of 3 x 3
        (1, 20, 9, 0),
        (3, 8, 9, 1),
    ],
)
def test_least_area_and_the_block_rule(rows: int, columns: int, min_area: int, count: int) -> None:
    image = np.zeros((30, 30), np.float32)
    image[10 : 10 + rows, 5 : 5 + columns] = 8.0
    assert len(outlines(image, min_area_px=min_area)) == count


def test_touching_parts_are_one() -> None:
    image = np.zeros((30, 40), np.float32)
    image[5:12, 5:15] = 4.0
    image[12:20, 12:22] = 3.5
    (mask,) = outlines(image)
    assert mask.sum() == pytest.approx(7 * 10 + 8 * 10, abs=8)


@pytest.mark.parametrize(
    ("saddle", "count"),
    [
        (0.0, 2),  # not connected
        (1.0, 2),  # below half of the lesser peak
        (2.9, 2),  # lower than the lesser peak by more than the threshold of 1 K
        (3.1, 1),
        (3.9, 1),
    ],
)
@pytest.mark.parametrize("sigma", [0.0, 0.05])
def test_two_peaks_with_a_saddle(saddle: float, count: int, sigma: float) -> None:
    # Columns: a peak of 8 K, a bridge, a peak of 4 K. Half of 8 K is above the bridge, so the two
    # never grow together; what decides is how far the bridge lies below the lesser peak.
    image = np.zeros((30, 50), np.float32)
    image[10:20, 5:15] = 8.0
    image[10:20, 15:30] = saddle
    image[10:20, 30:40] = 4.0
    image += np.random.default_rng(6).normal(0.0, sigma, image.shape).astype(np.float32)
    masks = outlines(image, sigma=sigma)
    assert len(masks) == count
    assert masks[0][11:19, 6:14].all()
    if count == 2:
        assert masks[1][11:19, 31:39].all()


def test_a_hole_of_one_pixel_is_filled() -> None:
    image = np.zeros((30, 30), np.float32)
    image[10:20, 10:20] = 4.0
    image[14, 14] = 0.0
    (mask,) = outlines(image)
    assert mask[14, 14]
    assert mask.sum() == 100


def test_pixels_outside_bound_a_region() -> None:
    image = np.full((30, 30), 3.0, np.float32)
    inside = np.zeros((30, 30), bool)
    inside[5:15, 8:20] = True
    (outline,) = outline_regions(image, inside, 1.0, 9, 0.0)
    assert np.array_equal(outline.mask, inside)


def test_missing_values_are_not_outlined() -> None:
    image = np.zeros((30, 30), np.float32)
    image[10:20, 10:20] = 4.0
    image[10:20, 14:16] = np.nan
    inside = np.isfinite(image)
    found = outline_regions(image, inside, 1.0, 9, 0.0)
    assert found
    assert not any(outline.mask[~inside].any() for outline in found)
    assert sum(int(outline.mask.sum()) for outline in found) == 80


def test_a_hole_without_value_is_not_filled() -> None:
    image = np.zeros((30, 30), np.float32)
    image[10:20, 10:20] = 4.0
    image[14, 14] = np.nan
    (outline,) = outline_regions(image, np.isfinite(image), 1.0, 9, 0.0)
    assert not outline.mask[14, 14]
    assert outline.mask.sum() == 99


def test_nothing() -> None:
    nothing = np.zeros((10, 10), np.float32)
    assert outline_regions(nothing, np.ones((10, 10), bool), 1.0, 9, 0.0) == []
    assert outline_regions(nothing, np.zeros((10, 10), bool), 1.0, 9, 0.0) == []
