"""Pictures of the report: one shared scale, and numbers that survive the way into a PNG."""

import struct
import zlib
from dataclasses import replace
from pathlib import Path

import cv2
import matplotlib
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from numpy.typing import NDArray

from tests import make_fake_result as fake
from thermo_fix.records import ImageResult, Planes
from thermo_fix.report import COLOUR_MAPS, decode_data, encode_photo, encode_pictures
from thermo_fix.report.pictures import colour_stops, encode_data, shared_span

HATCH = {(150, 150, 150), (96, 96, 96)}


def colours(png: bytes) -> NDArray[np.uint8]:
    """(rows, columns, 3) red, green, blue."""
    decoded = cv2.imdecode(np.frombuffer(png, np.uint8), cv2.IMREAD_COLOR)
    assert decoded is not None
    return np.asarray(decoded[:, :, ::-1], np.uint8)


def flat_planes(recorded: NDArray[np.float64], corrected: NDArray[np.float64]) -> Planes:
    return Planes(
        recorded.astype(np.float32),
        corrected.astype(np.float32),
        np.ones(corrected.shape, np.float32),
    )


def test_recorded_and_corrected_share_one_scale() -> None:
    ramp = np.tile(np.linspace(10.0, 30.0, 64), (8, 1))
    pictures = encode_pictures(flat_planes(ramp[:, ::-1], ramp), ImageResult("a.tif", "done"))
    recorded, corrected = colours(pictures.recorded_png), colours(pictures.corrected_png)
    assert (recorded[:, ::-1] == corrected).all()
    assert (pictures.width, pictures.height) == (64, 8)


def test_a_shift_between_the_planes_shows_as_a_shift_of_colour() -> None:
    warm = np.full((6, 6), 25.0)
    warm[0, 0] = 5.0
    pictures = encode_pictures(flat_planes(warm - 10.0, warm), ImageResult("a.tif", "done"))
    recorded, corrected = colours(pictures.recorded_png), colours(pictures.corrected_png)
    assert recorded[3, 3].sum() < corrected[3, 3].sum()  # all maps rise in lightness


@pytest.mark.parametrize("colour_map", COLOUR_MAPS)
def test_ends_of_the_scale_have_the_ends_of_the_map(colour_map: str) -> None:
    ramp = np.tile(np.linspace(0.0, 50.0, 200), (4, 1))
    pictures = encode_pictures(
        flat_planes(ramp, ramp), ImageResult("a.tif", "done"), colour_map=colour_map
    )
    picture = colours(pictures.corrected_png)
    # Source of the colours: matplotlib's own map.
    ends = matplotlib.colormaps[colour_map](np.array([0.0, 1.0]))[:, :3] * 255.0
    assert np.abs(picture[0, 0].astype(float) - ends[0]).max() <= 0.5
    assert np.abs(picture[0, -1].astype(float) - ends[1]).max() <= 0.5
    stops = colour_stops(colour_map, 2)
    assert stops == tuple("#" + bytes(np.rint(end).astype(np.uint8)).hex() for end in ends)


def test_the_scale_holds_every_extreme() -> None:
    result, planes = fake.electrical()
    for image in result.images[:2]:
        low, high = shared_span(planes[image.file], image)
        for finding in image.findings:
            assert low <= finding.extreme_c <= high


def test_a_few_wild_pixels_do_not_stretch_the_scale() -> None:
    plane = np.random.default_rng(7).normal(20.0, 0.5, (100, 100))
    plane[0, :5] = 900.0
    low, high = shared_span(flat_planes(plane, plane), ImageResult("a.tif", "done"))
    assert high < 23.0
    assert low > 17.0


def test_an_even_plane_still_has_a_scale() -> None:
    plane = np.full((5, 5), 20.0)
    low, high = shared_span(flat_planes(plane, plane), ImageResult("a.tif", "done"))
    assert low < 20.0 < high


def test_pixels_without_a_temperature_are_hatched_in_greys() -> None:
    plane = np.full((20, 20), 20.0)
    plane[10:] = np.nan
    plane[0, 0] = 30.0
    picture = colours(
        encode_pictures(flat_planes(plane, plane), ImageResult("a.tif", "done")).corrected_png
    )
    assert {tuple(int(v) for v in pixel) for pixel in picture[10:].reshape(-1, 3)} == HATCH
    seen = {tuple(int(v) for v in pixel) for pixel in picture[:10].reshape(-1, 3)}
    assert not seen & HATCH


def test_a_plane_without_any_temperature_is_all_hatch() -> None:
    plane = np.full((9, 9), np.nan)
    pictures = encode_pictures(flat_planes(plane, plane), ImageResult("a.tif", "done"))
    seen = colours(pictures.corrected_png).reshape(-1, 3)
    assert {tuple(int(v) for v in pixel) for pixel in seen} == HATCH
    assert np.isnan(decode_data(pictures.data)).all()


def test_colour_pictures_are_sound_indexed_png_files() -> None:
    result, planes = fake.electrical()
    image = result.images[0]
    png = encode_pictures(planes[image.file], image).corrected_png
    kinds: list[bytes] = []
    place = 8
    while place < len(png):
        (length,) = struct.unpack(">I", png[place : place + 4])
        body = png[place + 4 : place + 8 + length]
        (check,) = struct.unpack(">I", png[place + 8 + length : place + 12 + length])
        assert zlib.crc32(body) == check
        kinds.append(body[:4])
        place += 12 + length
    # PNG specification (third edition), 5.6 and 11.2: order of chunks, colour type 3.
    assert kinds[:2] == [b"IHDR", b"PLTE"]
    assert kinds[-1] == b"IEND"
    assert png[24:26] == bytes([8, 3])


def test_numbers_come_back_within_half_a_step() -> None:
    result, planes = fake.electrical()
    image = result.images[0]
    given_planes = planes[image.file]
    pictures = encode_pictures(given_planes, image)
    for data, plane in (
        (pictures.data, given_planes.corrected_c),
        (pictures.recorded_data, given_planes.recorded_c),
        (pictures.uncertainty_data, given_planes.uncertainty_k),
    ):
        assert data.step == 0.01
        back = decode_data(data)
        assert (np.isnan(back) == np.isnan(plane)).all()
        assert np.nanmax(np.abs(back - plane)) <= 0.005 + 1e-9
    assert pictures.data_png == pictures.data.png


@settings(max_examples=40, deadline=None)
@given(
    arrays(
        np.float32,
        (3, 4),
        elements=st.one_of(
            st.floats(-273.0, 3000.0, width=32), st.just(float("nan")), st.just(float("inf"))
        ),
    )
)
def test_any_plane_survives(plane: NDArray[np.float32]) -> None:
    data = encode_data(plane)
    back = decode_data(data)
    finite = np.isfinite(plane)
    assert (np.isfinite(back) == finite).all()
    if finite.any():
        span = float(plane[finite].max() - plane[finite].min())
        assert data.step == pytest.approx(0.01) or span > 650.0
        assert np.abs(back - plane)[finite].max() <= data.step / 2.0 + 1e-6


def test_a_wide_span_takes_whole_multiples_of_the_step() -> None:
    data = encode_data(np.array([[-40.0, 1500.0]], np.float32))
    assert data.step == pytest.approx(0.03)  # 1540 K over 65 534 steps, rounded up to 0.01
    assert decode_data(data)[0] == pytest.approx([-40.0, 1500.0], abs=0.015)


def test_the_same_planes_give_the_same_bytes() -> None:
    result, planes = fake.electrical()
    image = result.images[0]
    assert encode_pictures(planes[image.file], image) == encode_pictures(planes[image.file], image)


def test_an_unknown_colour_map_is_refused_with_the_known_ones() -> None:
    plane = np.full((4, 4), 20.0)
    with pytest.raises(ValueError, match=r"'jet' is not known; use one of: inferno"):
        encode_pictures(flat_planes(plane, plane), ImageResult("a.tif", "done"), colour_map="jet")


def test_a_photograph_is_reduced(tmp_path: Path) -> None:
    path = tmp_path / "photo.png"
    assert cv2.imwrite(str(path), fake.hatched_photo(400, 300))
    jpeg = encode_photo(path.read_bytes(), longest_px=100)
    assert jpeg is not None
    assert colours(jpeg).shape == (75, 100, 3)
    assert jpeg[:2] == b"\xff\xd8"


@pytest.mark.parametrize("content", [b"no picture", b""])
def test_what_is_no_photograph_is_left_out(content: bytes) -> None:
    assert encode_photo(content) is None


def test_extremes_of_findings_widen_the_scale() -> None:
    result, planes = fake.electrical()
    image = result.images[0]
    far = replace(image.findings[0], extreme_c=400.0)
    low, high = shared_span(planes[image.file], replace(image, findings=(far,)))
    assert high >= 400.0
    assert low < 30.0
