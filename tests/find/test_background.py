"""The background of a zone against backgrounds that were put in."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from tests.find.frames import SHAPE, level, noise, with_box
from thermo_fix.find.background import background

EVERYWHERE = np.ones(SHAPE, bool)
SIGMA = 0.05
SCALE_K = 1.5


def fitted(
    image: NDArray[np.float64], inside: NDArray[np.bool_] = EVERYWHERE, sigma: float = SIGMA
) -> NDArray[np.float32]:
    return background(image.astype(np.float32), inside, SCALE_K, sigma)


def slope(kx: float, ky: float, bend: float) -> NDArray[np.float64]:
    """A quadratic surface; the coefficients are K over the whole image."""
    rows, columns = SHAPE
    y, x = np.indices(SHAPE)
    u, v = x / columns - 0.5, y / rows - 0.5
    return np.asarray(20.0 + kx * u + ky * v + bend * (u * u + u * v - v * v))


@settings(max_examples=15, deadline=None)
@given(kx=st.floats(-6, 6), ky=st.floats(-6, 6), bend=st.floats(-3, 3), seed=st.integers(0, 99))
def test_a_gentle_gradient_is_background(kx: float, ky: float, bend: float, seed: int) -> None:
    truth = slope(kx, ky, bend)
    found = fitted(truth + noise(SHAPE, SIGMA, seed))
    assert np.abs(found - truth).max() < 3 * SIGMA


@pytest.mark.parametrize("by_k", [12.0, 2.5, -2.5, -12.0])
def test_a_patch_of_a_third_of_the_image_does_not_draw_it(by_k: float) -> None:
    truth = slope(1.0, -0.5, 0.0)
    rows, columns = SHAPE
    box = (20, 15, 20 + round(0.6 * columns), 15 + round(0.584 * rows))
    assert (box[2] - box[0]) * (box[3] - box[1]) / (rows * columns) == pytest.approx(0.35, abs=0.01)
    found = fitted(with_box(truth, box, by_k) + noise(SHAPE, SIGMA, 7))
    assert np.abs(found - truth).max() < 0.35 * abs(by_k)
    outside = np.ones(SHAPE, bool)
    outside[box[1] - 3 : box[3] + 3, box[0] - 3 : box[2] + 3] = False
    assert np.abs(found - truth)[outside].max() < 0.25


def test_senses_are_symmetric() -> None:
    image = with_box(slope(3.0, 1.0, 1.0), (60, 40, 80, 60), 4.0) + noise(SHAPE, SIGMA, 8)
    assert np.allclose(fitted(40.0 - image), 40.0 - fitted(image), atol=2e-3)


def test_a_constant_added_comes_out_again() -> None:
    image = with_box(slope(3.0, 1.0, 1.0), (60, 40, 80, 60), 4.0) + noise(SHAPE, SIGMA, 9)
    assert np.allclose(fitted(image + 100.0), fitted(image) + 100.0, atol=2e-3)


def test_pixels_outside_are_nan_and_have_no_part() -> None:
    inside = np.zeros(SHAPE, bool)
    inside[10:110, 10:80] = True
    image = np.where(inside, slope(2.0, 2.0, 0.0), 500.0)
    found = fitted(image, inside)
    assert np.isnan(found[~inside]).all()
    assert np.abs(found - image)[inside].max() < 0.05


def test_nothing_inside() -> None:
    assert np.isnan(fitted(level(), np.zeros(SHAPE, bool))).all()


@pytest.mark.parametrize("share", [0.1, 0.3, 0.45])
def test_a_small_zone_has_the_level_of_its_majority(share: float) -> None:
    # 10 x 14 = 140 pixels: too few to fit a slope to.
    inside = np.zeros(SHAPE, bool)
    inside[50:60, 70:84] = True
    image = level()
    warm = round(share * 10)
    image[50 : 50 + warm, 70:84] += 9.0
    found = fitted(image, inside, 0.02)
    values = found[inside]
    assert np.ptp(values) == 0.0
    assert values[0] == pytest.approx(20.0, abs=0.05)


def test_a_middling_zone_has_a_slope() -> None:
    inside = np.zeros(SHAPE, bool)
    inside[30:80, 40:100] = True
    truth = slope(20.0, -10.0, 0.0)
    found = fitted(truth + noise(SHAPE, SIGMA, 10), inside)
    assert np.abs(found - truth)[inside].max() < 0.1


def test_broad_structure_of_a_large_zone_is_followed() -> None:
    # Long waves that no quadratic can follow, of 0.4 K: less than a finding.
    y, x = np.indices((240, 320))
    truth = 20.0 + 0.4 * np.cos(2 * np.pi * x / 320) * np.cos(2 * np.pi * y / 240)
    image = (truth + noise((240, 320), SIGMA, 11)).astype(np.float32)
    found = background(image, np.ones((240, 320), bool), SCALE_K, SIGMA)
    assert np.abs(found - truth).max() < 0.25
