"""Zones on the pixel grid, checked against slow and independent code."""

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from matplotlib.path import Path as Outline
from skimage.draw import polygon2mask

from thermo_fix.errors import DomainError, ImageError
from thermo_fix.records import MaskArray, SceneInputs, Zone
from thermo_fix.sheet import check_polygon, label_zones, overlap_notes, zone_mask
from thermo_fix.sheet.zones import MAX_ZONES, Point, Polygon, clean_polygon, polygon_problem

SHAPE = (20, 30)


def zone(name: str, polygon: Polygon) -> Zone:
    return Zone(name=name, polygon=tuple(polygon), inputs=SceneInputs({}))


def box(x0: float, y0: float, x1: float, y1: float) -> tuple[Point, ...]:
    return ((x0, y0), (x1, y0), (x1, y1), (x0, y1))


def exact_state(polygon: Polygon, x: Fraction, y: Fraction) -> str:
    """Inside, outside or on the outline, by the crossing rule in exact fractions."""
    inside = False
    corners = [(Fraction(a), Fraction(b)) for a, b in polygon]
    for (x0, y0), (x1, y1) in zip(corners, [*corners[1:], corners[0]], strict=True):
        turn = (x1 - x0) * (y - y0) - (y1 - y0) * (x - x0)
        in_box = min(x0, x1) <= x <= max(x0, x1) and min(y0, y1) <= y <= max(y0, y1)
        if turn == 0 and in_box:
            return "on"
        if (y0 > y) != (y1 > y) and x < x0 + (y - y0) * (x1 - x0) / (y1 - y0):
            inside = not inside
    return "inside" if inside else "outside"


def assert_agrees_with_exact(mask: MaskArray, polygon: Polygon) -> None:
    half = Fraction(1, 2)
    for row in range(mask.shape[0]):
        for column in range(mask.shape[1]):
            state = exact_state(polygon, column + half, row + half)
            if state != "on":
                assert mask[row, column] == (state == "inside"), (row, column, polygon)


def star(count: int, inner: float, turn: float) -> tuple[Point, ...]:
    """A star around the middle of the image: a polygon that is simple but not convex."""
    points = []
    for i in range(2 * count):
        radius = 9.0 if i % 2 == 0 else inner
        angle = turn + math.pi * i / count
        points.append((15.2 + radius * math.cos(angle), 9.7 + radius * math.sin(angle)))
    return tuple(points)


def test_rectangle_covers_whole_pixels() -> None:
    # Corner-based coordinates: the rectangle from x 2 to 5 and y 3 to 7 holds columns 2, 3, 4 and
    # rows 3 to 6.
    mask = zone_mask([(2, 3), (5, 3), (5, 7), (2, 7)], (10, 8))
    expected = np.zeros((10, 8), dtype=bool)
    expected[3:7, 2:5] = True
    assert mask.dtype == np.bool_
    np.testing.assert_array_equal(mask, expected)


@pytest.mark.parametrize("reverse", [False, True])
@pytest.mark.parametrize("start", range(4))
def test_order_and_first_corner_do_not_matter(start: int, reverse: bool) -> None:
    corners = [(2.3, 1.1), (17.0, 4.5), (12.0, 18.2), (5.5, 11.0)]
    turned = corners[start:] + corners[:start]
    np.testing.assert_array_equal(
        zone_mask(turned[::-1] if reverse else turned, SHAPE), zone_mask(corners, SHAPE)
    )


def test_half_a_pixel_decides() -> None:
    assert zone_mask(box(0, 0, 0.49, 1), (1, 1)).sum() == 0
    assert zone_mask(box(0, 0, 0.51, 1), (1, 1)).sum() == 1
    # A centre on the left or upper side belongs to the zone, on the right or lower side not.
    assert zone_mask(box(0.5, 0.5, 2, 2), (2, 2)).sum() == 4
    assert zone_mask(box(0, 0, 1.5, 1.5), (2, 2)).sum() == 1


@pytest.mark.parametrize("polygon", [star(5, 4.0, 0.1), star(3, 2.0, 1.0), star(9, 7.5, 0.0)])
def test_agrees_with_slow_and_foreign_code(polygon: tuple[Point, ...]) -> None:
    mask = zone_mask(polygon, SHAPE)
    assert mask.any()
    assert_agrees_with_exact(mask, polygon)
    rows, columns = np.indices(SHAPE)
    centres = np.column_stack((columns.ravel() + 0.5, rows.ravel() + 0.5))
    inside = Outline([*polygon, polygon[0]], closed=True).contains_points(centres)
    np.testing.assert_array_equal(mask, inside.reshape(SHAPE))
    # scikit-image counts (row, column) from pixel centres.
    shifted = np.array([(y - 0.5, x - 0.5) for x, y in polygon])
    np.testing.assert_array_equal(mask, polygon2mask(SHAPE, shifted))


quarters = st.integers(-20, 140).map(lambda number: number / 4)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(st.lists(st.tuples(quarters, quarters), min_size=3, max_size=7))
def test_any_polygon_agrees_with_exact_fractions(polygon: list[Point]) -> None:
    shape = (12, 14)
    assert_agrees_with_exact(zone_mask(polygon, shape), polygon)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(
    middle=st.tuples(st.floats(2, 28), st.floats(2, 18)),
    rim=st.lists(st.floats(-40, 70), min_size=1, max_size=6),
)
def test_a_fan_of_triangles_neither_overlaps_nor_leaves_a_gap(
    middle: Point, rim: list[float]
) -> None:
    # Triangles from one point to a subdivided frame around the image: each side but the outer
    # ones has two owners, so that every pixel must have exactly one.
    left, right, top, bottom = -50.0, 80.0, -50.0, 80.0
    along = sorted(set(rim))
    frame = [(left, top), *((x, top) for x in along), (right, top)]
    frame += [(right, bottom), *((x, bottom) for x in reversed(along)), (left, bottom)]
    owners = np.zeros(SHAPE, dtype=int)
    for first, second in zip(frame, [*frame[1:], frame[0]], strict=True):
        owners += zone_mask([middle, first, second], SHAPE)
    np.testing.assert_array_equal(owners, np.ones(SHAPE, dtype=int))


def test_neighbours_with_a_slanted_side_between_pixel_centres() -> None:
    # The common side passes exactly through pixel centres.
    left = zone_mask([(0, 0), (0.5, 0), (19.5, 19), (19.5, 20), (0, 20)], (20, 20))
    right = zone_mask([(0.5, 0), (20, 0), (20, 20), (19.5, 20), (19.5, 19)], (20, 20))
    assert not (left & right).any()
    assert (left | right).all()


def test_what_lies_off_the_image_is_cut_off() -> None:
    mask = zone_mask(box(-5, -7, 3, 2), (4, 6))
    expected = np.zeros((4, 6), dtype=bool)
    expected[:2, :3] = True
    np.testing.assert_array_equal(mask, expected)
    assert zone_mask(box(-1e6, -1e6, 1e6, 1e6), (4, 6)).all()
    assert not zone_mask(box(6, 0, 9, 4), (4, 6)).any()
    assert not zone_mask(box(-9, 0, 0, 4), (4, 6)).any()


def test_labels_and_overlap() -> None:
    zones = [
        zone("a", box(0, 0, 4, 4)),
        zone("b", box(2, 2, 6, 6)),
        zone("c", box(8, 0, 9, 1)),
    ]
    labels = label_zones(zones, (8, 10))
    assert labels.dtype == np.int16
    expected = np.zeros((8, 10), dtype=np.int16)
    expected[:4, :4] = 1
    expected[2:6, 2:6] = 2
    expected[0, 8] = 3
    np.testing.assert_array_equal(labels, expected)
    assert overlap_notes(zones, (8, 10)) == (
        'Zones "a" and "b" overlap: 4 pixels belong to "b", which stands later in the sheet.',
    )
    assert overlap_notes(zones[1:], (8, 10)) == ()
    assert label_zones([], (2, 3)).tolist() == [[0, 0, 0], [0, 0, 0]]


def test_too_many_zones_for_the_labels() -> None:
    with pytest.raises(DomainError, match="too many"):
        label_zones([zone("a", box(0, 0, 1, 1))] * (MAX_ZONES + 1), (1, 1))
    assert np.iinfo(np.int16).max >= MAX_ZONES


def test_zone_within_across_and_off_an_image() -> None:
    assert check_polygon(zone("a", box(0, 0, 320, 240)), 320, 240) is None
    note = check_polygon(zone("a", box(300, 10, 330, 20)), 320, 240)
    assert note is not None
    assert note.startswith('Zone "a" reaches beyond the image (320 x 240 pixels)')
    # The case of a sheet drawn for a larger image.
    with pytest.raises(ImageError, match=r'zone "lug" lies wholly off .* x 400 to 420'):
        check_polygon(zone("lug", box(400, 10, 420, 20)), 320, 240)
    with pytest.raises(ImageError, match="covers no pixel"):
        check_polygon(zone("lug", box(3.1, 3.1, 3.2, 3.2)), 320, 240)


def test_repeated_corners_are_left_out() -> None:
    corners = box(0, 0, 2, 2)
    assert clean_polygon([corners[0], *corners, corners[3], corners[0]]) == corners


@pytest.mark.parametrize(
    ("polygon", "words"),
    [
        (box(0, 0, 2, 2), None),
        (star(7, 3.0, 0.0), None),
        ([(0, 0), (2, 0), (4, 0), (4, 4)], None),  # a corner in the middle of a side
        ([(0, 0), (4, 0), (4, 4), (2, 1), (0, 4)], None),
        ([(0, 0), (4, 4), (4, 0), (0, 4)], "crosses or touches itself"),
        ([(0, 0), (4, 0), (4, 4), (2, 0), (0, 4)], "crosses or touches itself"),
        ([(0, 0), (4, 0), (2, 0), (2, 3)], "crosses or touches itself"),  # runs back
        ([(0, 0), (6, 0), (6, 4), (3, 4), (3, 6), (5, 6), (5, 2), (0, 2)], "from point 3 meets"),
        ([(0, 0), (1, 1), (3, 3)], "on one line"),
        ([(0, 0), (1, 1)], "at least 3"),
        ([(float(i), float(i * i)) for i in range(3000)], "too many"),
        ([(0, 0), (math.nan, 1), (3, 0)], "no place"),
        ([(0, 0), (math.inf, 1), (3, 0)], "no place"),
    ],
)
def test_polygons_sound_and_unsound(polygon: list[Point], words: str | None) -> None:
    problem = polygon_problem(polygon)
    if words is None:
        assert problem is None
    else:
        assert problem is not None
        assert words in problem


def crosses_slowly(polygon: Polygon) -> bool:
    """Whether two sides that are no neighbours share a point, in exact fractions."""
    count = len(polygon)
    corners = [(Fraction(x), Fraction(y)) for x, y in polygon]

    def turn(a: int, b: int, c: int) -> Fraction:
        (ax, ay), (bx, by), (cx, cy) = corners[a], corners[b], corners[c]
        return (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)

    def on(a: int, b: int, c: int) -> bool:
        low = [min(corners[a][k], corners[b][k]) for k in (0, 1)]
        high = [max(corners[a][k], corners[b][k]) for k in (0, 1)]
        inside = all(low[k] <= corners[c][k] <= high[k] for k in (0, 1))
        return turn(a, b, c) == 0 and inside

    for i in range(count):
        j = (i + 1) % count
        k = (i + 2) % count
        if turn(i, j, k) == 0 and (on(i, j, k) or on(j, k, i)):
            return True
        for m in range(i + 2, count):
            n = (m + 1) % count
            if n == i:
                continue
            if turn(i, j, m) * turn(i, j, n) < 0 and turn(m, n, i) * turn(m, n, j) < 0:
                return True
            if on(i, j, m) or on(i, j, n) or on(m, n, i) or on(m, n, j):
                return True
    return False


small = st.integers(0, 6).map(float)


@settings(max_examples=300, deadline=None, derandomize=True)
@given(st.lists(st.tuples(small, small), min_size=3, max_size=7))
def test_crossing_sides_are_found(points: list[Point]) -> None:
    polygon = clean_polygon(points)
    if len(polygon) >= 3:
        assert (polygon_problem(polygon) is not None) == crosses_slowly(polygon)
