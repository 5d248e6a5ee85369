"""Regions of whole images: what is found, where, in which zone, and against what."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from tests.find.frames import SHAPE, Box, Part, frame_of, level, noise, whole_mask, with_box
from thermo_fix.find import find_regions
from thermo_fix.find.regions import Found
from thermo_fix.records import Region

SIGMA = 0.05
Image = NDArray[np.float64]


def gradient(k_across: float, k_down: float, bend_k: float = 0.0) -> Image:
    rows, columns = SHAPE
    y, x = np.indices(SHAPE)
    u, v = x / columns - 0.5, y / rows - 0.5
    return np.asarray(20.0 + k_across * u + k_down * v + bend_k * u * v)


def noisy(image: Image, seed: int = 1, sigma: float = SIGMA) -> Image:
    return image + noise((image.shape[0], image.shape[1]), sigma, seed)


def only(found: Found) -> Region:
    (region,) = found.regions
    return region


# ---- nothing to find ---------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(8))
def test_noise_alone(seed: int) -> None:
    found = find_regions(frame_of(noisy(level(), seed, 0.5), min_delta_k=0.5))
    assert found.regions == ()
    # Within a tenth: the standard deviation that was drawn with.
    assert found.sigma_k == pytest.approx(0.5, rel=0.1)


@settings(max_examples=20, deadline=None)
@given(across=st.floats(-6, 6), down=st.floats(-6, 6), bend=st.floats(-4, 4))
def test_a_gentle_gradient_is_no_finding(across: float, down: float, bend: float) -> None:
    assert find_regions(frame_of(noisy(gradient(across, down, bend)))).regions == ()


@pytest.mark.parametrize("step_k", [0.6, 1.0, 1.3, -0.6, -1.0, -1.3])
@pytest.mark.parametrize("column", [40, 80, 110])
def test_a_step_below_the_threshold_is_no_finding(step_k: float, column: int) -> None:
    image = level()
    image[:, column:] += step_k
    assert find_regions(frame_of(noisy(image))).regions == ()


def test_an_image_without_a_value() -> None:
    assert find_regions(frame_of(np.full(SHAPE, np.nan))) == Found((), 0.0, 0)


def test_an_image_of_very_few_pixels() -> None:
    assert find_regions(frame_of(level((2, 3)))).regions == ()


# ---- one region --------------------------------------------------------------------------------


@settings(max_examples=25, deadline=None)
@given(
    x0=st.integers(0, 130),
    y0=st.integers(0, 90),
    width=st.integers(5, 30),
    height=st.integers(5, 30),
    by_k=st.floats(2.0, 40.0),
    sign=st.sampled_from([1, -1]),
)
def test_a_box_is_found_as_it_is(
    x0: int, y0: int, width: int, height: int, by_k: float, sign: int
) -> None:
    box = (x0, y0, x0 + width, y0 + height)
    image = noisy(with_box(gradient(2.0, -1.0), box, sign * by_k))
    region = only(find_regions(frame_of(image)))
    assert region.sense == ("hot" if sign > 0 else "cold")
    assert region.bbox_px == box
    assert region.mask.sum() == pytest.approx(width * height, rel=0.05)
    assert region.ring_delta_k == pytest.approx(sign * by_k, abs=0.35)
    assert x0 <= region.extreme_px[0] < x0 + width
    assert y0 <= region.extreme_px[1] < y0 + height
    assert region.reference_kind == "surroundings"
    assert region.cut_by_frame == (x0 == 0 or y0 == 0 or box[2] == 160 or box[3] == 120)


@pytest.mark.parametrize("by_k", [2.0, -2.5, 4.0, -12.0])
@pytest.mark.parametrize("corner", [(10, 8), (32, 25), (64, 49)])
@pytest.mark.parametrize("slope_k", [0.0, 1.0, 3.0])
def test_a_patch_of_a_third_of_the_image_is_one_finding(
    by_k: float, corner: tuple[int, int], slope_k: float
) -> None:
    box = (corner[0], corner[1], corner[0] + 96, corner[1] + 70)  # 35 % of the image
    image = noisy(with_box(gradient(slope_k, -0.5 * slope_k), box, by_k))
    region = only(find_regions(frame_of(image)))
    assert region.sense == ("hot" if by_k > 0 else "cold")
    assert region.bbox_px == (box[0], box[1], min(box[2], 160), min(box[3], 120))
    assert region.mask.all()


@pytest.mark.parametrize("edge", ["left", "right", "top", "bottom", None])
def test_cut_by_the_frame(edge: str | None) -> None:
    boxes: dict[str | None, Box] = {
        "left": (0, 50, 12, 62),
        "right": (148, 50, 160, 62),
        "top": (70, 0, 82, 12),
        "bottom": (70, 108, 82, 120),
        None: (1, 50, 13, 62),
    }
    region = only(find_regions(frame_of(noisy(with_box(level(), boxes[edge], 5.0)))))
    assert region.cut_by_frame is (edge is not None)


@pytest.mark.parametrize(("min_area_px", "count"), [(36, 1), (37, 0)])
def test_least_area_both_sides(min_area_px: int, count: int) -> None:
    image = with_box(level(), (70, 50, 76, 56), 5.0)
    assert len(find_regions(frame_of(image, min_area_px=min_area_px)).regions) == count


@pytest.mark.parametrize(("by_k", "count"), [(1.4, 0), (1.6, 1), (-1.4, 0), (-1.6, 1)])
def test_least_difference_both_sides(by_k: float, count: int) -> None:
    image = with_box(level(), (60, 40, 80, 60), by_k)
    assert len(find_regions(frame_of(image, min_delta_k=1.5)).regions) == count


@pytest.mark.parametrize(
    ("warm", "cold", "senses"),
    [
        (True, True, {"hot", "cold"}),
        (True, False, {"hot"}),
        (False, True, {"cold"}),
        (False, False, set()),
    ],
)
def test_only_the_senses_that_are_wanted(warm: bool, cold: bool, senses: set[str]) -> None:
    image = with_box(with_box(level(), (20, 30, 40, 50), 4.0), (100, 70, 120, 90), -4.0)
    found = find_regions(frame_of(noisy(image), warm=warm, cold=cold))
    assert {region.sense for region in found.regions} == senses


@settings(max_examples=20, deadline=None)
@given(seed=st.integers(0, 10_000), boxes=st.integers(0, 4))
def test_the_negative_has_the_mirrored_findings(seed: int, boxes: int) -> None:
    rng = np.random.default_rng(seed)
    image = noisy(gradient(*rng.uniform(-3, 3, 3)), seed)
    for _ in range(boxes):
        x, y, width, height = (int(n) for n in rng.integers(5, 60, 4))
        image = with_box(image, (x, y, x + width, y + height), float(rng.uniform(-6, 6)))
    there = find_regions(frame_of(image)).regions
    back = find_regions(frame_of(40.0 - image)).regions
    other = {"hot": "cold", "cold": "hot"}
    assert sorted((other[each.sense], each.bbox_px, each.extreme_px) for each in back) == sorted(
        (each.sense, each.bbox_px, each.extreme_px) for each in there
    )


def test_unusable_pixels_are_no_finding_and_belong_to_none() -> None:
    image = noisy(with_box(level(), (60, 40, 90, 70), 5.0))
    missing = np.zeros(SHAPE, bool)
    missing[44:66, 80:100] = True
    missing[5:20, 5:60] = True
    image[missing] = np.nan
    region = only(find_regions(frame_of(image)))
    mask = whole_mask(region, SHAPE)
    assert not (mask & missing).any()
    assert mask.sum() == 30 * 30 - 22 * 10
    columns, rows = np.array(region.reference_px).T
    assert not missing[rows, columns].any()


def test_defective_pixels_are_bridged_and_counted() -> None:
    image = noisy(level())
    for row, column in [(20, 30), (60, 80), (61, 100), (119, 0)]:
        image[row, column] += 12.0
    image[90, 90] -= 12.0
    found = find_regions(frame_of(image, min_delta_k=0.5))
    assert found.regions == ()
    assert found.spikes == 5


def test_reference_lies_around_a_region_and_clear_of_it() -> None:
    box = (60, 40, 80, 60)
    region = only(find_regions(frame_of(noisy(with_box(level(), box, 5.0)))))
    near = np.zeros(SHAPE, bool)
    near[box[1] - 3 : box[3] + 3, box[0] - 3 : box[2] + 3] = True
    around = np.zeros(SHAPE, bool)
    columns, rows = np.array(region.reference_px).T
    around[rows, columns] = True
    assert around.sum() >= 25
    assert not (around & near).any()
    assert rows.min() >= box[1] - 10
    assert columns.max() < box[2] + 10


# ---- zones -------------------------------------------------------------------------------------


def test_an_ignored_zone_is_not_searched() -> None:
    image = noisy(with_box(level(), (60, 40, 80, 60), 9.0))
    assert len(find_regions(frame_of(image)).regions) == 1
    glass = Part("glass", (58, 38, 82, 62), ignore=True)
    assert find_regions(frame_of(image, [glass])).regions == ()


def test_the_rest_of_the_image_is_searched_too() -> None:
    image = with_box(with_box(level(), (30, 30, 50, 50), 6.0), (110, 80, 130, 100), 6.0)
    found = find_regions(frame_of(noisy(image), [Part("panel", (15, 15, 75, 75))]))
    assert [region.label for region in found.regions] == [0, 1]
    assert [region.bbox_px for region in found.regions] == [
        (110, 80, 130, 100),
        (30, 30, 50, 50),
    ]


def test_a_warm_zone_without_like_is_no_finding() -> None:
    # A zone is another surface: it may be warmer than what is around it.
    image = noisy(with_box(level(), (30, 30, 90, 90), 10.0))
    assert find_regions(frame_of(image, [Part("motor", (30, 30, 90, 90))])).regions == ()


def test_a_spot_in_a_warm_zone_is_found_against_its_zone() -> None:
    image = with_box(with_box(level(), (30, 30, 90, 90), 10.0), (50, 50, 62, 62), 4.0)
    region = only(find_regions(frame_of(noisy(image), [Part("motor", (30, 30, 90, 90))])))
    assert region.label == 1
    assert region.bbox_px == (50, 50, 62, 62)
    columns, rows = np.array(region.reference_px).T
    assert columns.min() >= 30
    assert columns.max() < 90
    assert rows.min() >= 30
    assert rows.max() < 90


# ---- like zones --------------------------------------------------------------------------------


def row_of(levels: list[float], like: str | None = "lugs") -> tuple[Image, list[Part]]:
    """A row of like zones, each level, on a plate at 20 degC."""
    image = level()
    parts = []
    for number, celsius in enumerate(levels):
        box = (6 + 26 * number, 40, 24 + 26 * number, 80)
        image[box[1] : box[3], box[0] : box[2]] = celsius
        parts.append(Part(f"lug {number + 1}", box, like=like))
    return noisy(image, 3, 0.02), parts


def told(levels: list[float], **detect: bool) -> list[tuple[int, str, int | None, int]]:
    """Label, sense, reference label and number of reference zones of each finding."""
    image, parts = row_of(levels)
    found = find_regions(frame_of(image, parts, **detect))
    assert all(region.whole_zone for region in found.regions)
    assert all(region.reference_kind == "like component" for region in found.regions)
    return [
        (each.label, each.sense, each.reference_label, len(each.reference_labels))
        for each in found.regions
    ]


def test_the_coolest_of_two_others_is_the_reference() -> None:
    assert told([31.0, 30.0, 38.0]) == [(3, "hot", 2, 1)]
    assert told([30.0, 31.0, 38.0]) == [(3, "hot", 1, 1)]


def test_the_warmest_of_two_others_is_the_reference_of_a_cold_one() -> None:
    assert told([31.0, 22.0, 30.0]) == [(2, "cold", 1, 1)]


def test_the_median_of_three_others_is_the_reference() -> None:
    assert told([30.0, 31.0, 40.0, 30.4]) == [(3, "hot", 4, 3)]
    # Of four others the lower of the middle two.
    assert told([30.0, 30.8, 31.0, 40.0, 30.4]) == [(4, "hot", 5, 4)]


@pytest.mark.parametrize("odd", [0, 1, 2])
@pytest.mark.parametrize(("by_k", "sense"), [(6.0, "hot"), (-6.0, "cold")])
def test_the_odd_one_out_of_three(odd: int, by_k: float, sense: str) -> None:
    levels = [30.0, 30.0, 30.0]
    levels[odd] += by_k
    assert [(label, found) for label, found, _, _ in told(levels)] == [(odd + 1, sense)]


def test_a_cold_one_among_four() -> None:
    (finding,) = told([30.0, 30.2, 24.0, 30.1])
    assert finding[:2] == (3, "cold")


def test_two_zones_the_warm_one_is_named() -> None:
    # Of two nothing can be told; the warm one is named, if warm findings are wanted.
    assert told([30.0, 36.0]) == [(2, "hot", 1, 1)]
    assert told([30.0, 36.0], warm=False) == [(1, "cold", 2, 1)]
    assert told([30.0, 36.0], cold=False) == [(2, "hot", 1, 1)]


@pytest.mark.parametrize(("by_k", "count"), [(1.4, 0), (1.6, 1)])
def test_like_zones_that_hardly_differ(by_k: float, count: int) -> None:
    assert len(told([30.0, 30.0 + by_k, 30.0])) == count


def test_zones_of_another_like_word_are_not_compared() -> None:
    image, parts = row_of([30.0, 30.0, 40.0])
    apart = [*parts[:2], Part("fuse", parts[2].box, like="fuses")]
    assert find_regions(frame_of(image, apart)).regions == ()


def test_an_ignored_like_zone_is_no_reference() -> None:
    image, parts = row_of([30.0, 20.0, 36.0])
    ignoring = [parts[0], Part(parts[1].name, parts[1].box, like="lugs", ignore=True), parts[2]]
    (region,) = find_regions(frame_of(image, ignoring)).regions
    assert (region.label, region.reference_label) == (3, 1)


def test_a_hot_spot_in_a_like_zone_is_compared_with_the_like_zone() -> None:
    image, parts = row_of([30.0, 30.0, 30.0])
    image = with_box(image, (36, 52, 44, 60), 12.0)
    region = only(find_regions(frame_of(image, parts)))
    assert (region.label, region.sense, region.whole_zone) == (2, "hot", False)
    assert region.reference_kind == "like component"
    assert region.reference_label in (1, 3)
    assert region.bbox_px == (36, 52, 44, 60)
    # The place that stands for the reference lies in the reference zone.
    ((x, y),) = region.reference_px
    x0, y0, x1, y1 = parts[region.reference_label - 1].box
    assert x0 <= x < x1
    assert y0 <= y < y1


def test_what_the_like_zones_show_too_is_left_out() -> None:
    image, parts = row_of([30.0, 30.0, 30.0])
    for x0 in (10, 36, 62):
        image = with_box(image, (x0, 50, x0 + 8, 58), 8.0)
    found = find_regions(frame_of(image, parts))
    assert found.regions == ()
    assert found.unlike == 3


def test_the_sound_part_of_a_zone_that_is_mostly_hot_is_no_cold_finding() -> None:
    image, parts = row_of([30.0, 30.0, 30.0])
    image = with_box(image, (32, 40, 50, 68), 15.0)  # 70 % of the second zone
    found = find_regions(frame_of(image, parts))
    assert {(region.label, region.sense) for region in found.regions} == {(2, "hot")}
