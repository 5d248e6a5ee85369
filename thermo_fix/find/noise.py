"""Random noise and defective pixels of an image."""

import cv2
import numpy as np
from numpy.typing import NDArray

from thermo_fix.records import FloatArray, MaskArray

_MAD_TO_SIGMA = 1.4826
_LAPLACIAN_GAIN = 6.0
"""Root of the sum of squares of the 3 x 3 kernel below: what white noise is multiplied by."""
_KERNEL = np.array([[1, -2, 1], [-2, 4, -2], [1, -2, 1]], np.float32)


def noise_sigma(temperature: FloatArray, usable: MaskArray) -> float:
    """Standard deviation of the pixel noise of an image, K.

    Parameters
    ----------
    temperature
        (rows, columns), K or degC; any value where not usable.
    usable
        (rows, columns).

    Returns
    -------
    float
        From the median absolute response to a second difference in both directions, which a
        plane, a ramp and most edges do not excite (Immerkaer, Computer Vision and Image
        Understanding 64 (1996) 300, with the median instead of the mean); 0 for an image too
        small to tell.

    """
    whole = cv2.erode(usable.astype(np.uint8), np.ones((3, 3), np.uint8), borderValue=0) > 0
    if np.count_nonzero(whole) < 25:
        return 0.0
    filled = np.where(usable, temperature, 0.0).astype(np.float32)
    response = cv2.filter2D(filled, cv2.CV_32F, _KERNEL)
    spread = float(np.median(np.abs(response[whole])))
    return _MAD_TO_SIGMA * spread / _LAPLACIAN_GAIN


def without_spikes(
    temperature: NDArray[np.float32], usable: MaskArray, sigma: float
) -> tuple[NDArray[np.float32], int]:
    """Replace single pixels that stand out from all of their neighbours.

    Optics spread any real detail over more than one pixel; a lone extreme is a defective pixel.

    Parameters
    ----------
    temperature
        (rows, columns), K or degC.
    usable
        (rows, columns); other pixels are neither changed nor compared with.
    sigma
        Pixel noise, K.

    Returns
    -------
    ndarray, int
        The image with such pixels set to the median of their neighbourhood, and their number.

    """
    threshold = max(8.0 * sigma, 0.5)
    around = np.ones((3, 3), np.uint8)
    around[1, 1] = 0
    high = cv2.dilate(np.where(usable, temperature, -np.inf).astype(np.float32), around)
    low = cv2.erode(np.where(usable, temperature, np.inf).astype(np.float32), around)
    with np.errstate(invalid="ignore"):
        lone = usable & ((temperature > high + threshold) | (temperature < low - threshold))
    count = int(np.count_nonzero(lone))
    if count == 0:
        return temperature, 0
    filled = np.where(usable, temperature, np.float32(np.median(temperature[usable])))
    smooth = cv2.medianBlur(filled.astype(np.float32), 3)
    return np.where(lone, smooth, temperature), count
