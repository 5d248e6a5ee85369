"""The extreme of a region: a statistic with known behaviour.

The largest of many noisy pixels is biased upward, and a mean over neighbours understates a peak.
Here the place is chosen by the 3 x 3 mean (in the find stage), and the value is that of a
quadratic surface fitted to the 3 x 3 pixels around that place, at its centre: unbiased for any
quadratic shape, with a known gain on noise (0.745). Because the place is chosen by another
weighting of the same pixels, most of the noise of the value had no part in the choice; what
bias is left is that of a greatest 3 x 3 mean, about a third of a greatest pixel's.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_fix.records import MaskArray

FACET_WEIGHTS = np.array([[-1.0, 2.0, -1.0], [2.0, 5.0, 2.0], [-1.0, 2.0, -1.0]]) / 9.0
"""Weights of a least-squares quadratic surface at the centre of 3 x 3 pixels (Haralick's facet
model; the two-dimensional Savitzky-Golay smoother of order 2)."""

FACET_NOISE_GAIN = float(np.sqrt(np.sum(FACET_WEIGHTS**2)))


class Extreme(NamedTuple):
    """Value of a plane at a place, and how it was obtained."""

    value: float
    noise_gain: float
    """Standard deviation of the value over that of one pixel."""


def extreme_value(plane: NDArray[np.float32], usable: MaskArray, place: tuple[int, int]) -> Extreme:
    """Value of a plane at a place.

    Parameters
    ----------
    plane
        (rows, columns), any unit.
    usable
        (rows, columns): pixels that hold a value and belong to the same zone.
    place
        (x, y), a usable pixel.

    Returns
    -------
    Extreme
        The fitted value; the mean of the usable neighbours where one of the 3 x 3 pixels is not
        usable.

    """
    x, y = place
    height, width = plane.shape
    if 0 < x < width - 1 and 0 < y < height - 1:
        window = (slice(y - 1, y + 2), slice(x - 1, x + 2))
        if usable[window].all():
            value = float(np.sum(plane[window].astype(np.float64) * FACET_WEIGHTS))
            return Extreme(value, FACET_NOISE_GAIN)
    x, y = place
    rows = slice(max(0, y - 1), y + 2)
    columns = slice(max(0, x - 1), x + 2)
    values = plane[rows, columns][usable[rows, columns]].astype(np.float64)
    return Extreme(float(values.mean()), float(1.0 / np.sqrt(len(values))))
