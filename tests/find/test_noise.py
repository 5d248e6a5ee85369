"""The noise estimate and the bridging of defective pixels, against noise that was put in."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.find.frames import level, noise, with_box
from thermo_fix.find.noise import noise_sigma, without_spikes

SHAPE = (120, 160)
EVERYWHERE = np.ones(SHAPE, bool)


@settings(max_examples=25, deadline=None)
@given(
    sigma=st.floats(0.02, 2.0),
    slope_x=st.floats(-0.2, 0.2),
    slope_y=st.floats(-0.2, 0.2),
    bend=st.floats(-1e-3, 1e-3),
    seed=st.integers(0, 1000),
)
def test_white_noise_on_gradients_within_a_tenth(
    sigma: float, slope_x: float, slope_y: float, bend: float, seed: int
) -> None:
    # The truth is the standard deviation that was drawn with; slopes are in K per pixel.
    y, x = np.indices(SHAPE)
    image = 20.0 + slope_x * x + slope_y * y + bend * (x * y) + noise(SHAPE, sigma, seed)
    estimate = noise_sigma(image, EVERYWHERE)
    assert estimate == pytest.approx(sigma, rel=0.10)


def test_edges_hardly_matter() -> None:
    image = noise(SHAPE, 0.05, 1) + 20.0
    for number in range(6):
        image = with_box(image, (10 + 24 * number, 30, 22 + 24 * number, 90), 15.0)
    assert noise_sigma(image, EVERYWHERE) == pytest.approx(0.05, rel=0.10)


def test_no_noise_is_zero() -> None:
    y, x = np.indices(SHAPE)
    assert noise_sigma(0.25 * x - 0.5 * y, EVERYWHERE) == 0.0


@pytest.mark.parametrize(("side", "told"), [(6, False), (7, True)])
def test_too_small_to_tell(side: int, told: bool) -> None:
    # 25 whole 3 x 3 neighbourhoods are the least: a square of 7 pixels has them, one of 6 has 16.
    image = noise((side, side), 1.0, 3)
    assert (noise_sigma(image, np.ones((side, side), bool)) > 0.0) is told


def test_unusable_pixels_have_no_part() -> None:
    image = noise(SHAPE, 0.05, 4)
    usable = EVERYWHERE.copy()
    usable[:60] = False
    image[:60] = np.nan
    assert noise_sigma(image, usable) == pytest.approx(0.05, rel=0.10)
    filled = np.where(usable, image, 1e4)
    assert noise_sigma(filled, usable) == noise_sigma(image, usable)


# ---- defective pixels --------------------------------------------------------------------------


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_lone_pixels_are_bridged(sign: float) -> None:
    image = (level() + noise(SHAPE, 0.05, 5)).astype(np.float32)
    places = [(0, 0), (40, 70), (119, 159), (60, 0)]
    spoiled = image.copy()
    for row, column in places:
        spoiled[row, column] += sign * 8.0
    bridged, count = without_spikes(spoiled, EVERYWHERE, 0.05)
    assert count == len(places)
    changed = np.argwhere(bridged != spoiled)
    assert [tuple(place) for place in changed.tolist()] == sorted(places)
    # A median of nine pixels lies within a few standard deviations of the level.
    assert np.abs(bridged - 20.0).max() < 0.3


def test_two_neighbours_are_no_defect() -> None:
    # Optics spread real detail over more than one pixel.
    image = level().astype(np.float32)
    image[50, 60] = image[50, 61] = 28.0
    same, count = without_spikes(image, EVERYWHERE, 0.05)
    assert count == 0
    assert np.array_equal(same, image)


@pytest.mark.parametrize(
    ("height", "sigma", "bridged"),
    [
        (0.49, 0.0, 0),  # half a kelvin is the least
        (0.51, 0.0, 1),
        (0.79, 0.1, 0),  # eight standard deviations of the noise
        (0.81, 0.1, 1),
    ],
)
def test_height_from_which_a_pixel_is_defective(height: float, sigma: float, bridged: int) -> None:
    # Regression values: the two limits are the module's own.
    image = level().astype(np.float32)
    image[50, 60] += height
    assert without_spikes(image, EVERYWHERE, sigma)[1] == bridged


def test_pixels_beside_missing_ones() -> None:
    image = level().astype(np.float32)
    usable = EVERYWHERE.copy()
    image[49:52, 58:60] = np.nan
    usable[49:52, 58:60] = False
    image[50, 60] += 9.0
    bridged, count = without_spikes(image, usable, 0.05)
    assert count == 1
    assert bridged[50, 60] == pytest.approx(20.0)
    assert np.isnan(bridged[49:52, 58:60]).all()


def test_the_input_is_left_as_it_was() -> None:
    image = level().astype(np.float32)
    image[50, 60] += 9.0
    before = image.copy()
    without_spikes(image, EVERYWHERE, 0.05)
    assert np.array_equal(image, before)
