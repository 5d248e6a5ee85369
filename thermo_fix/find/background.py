"""The smooth, robust background of a zone: what its temperature would be without findings."""

import cv2
import numpy as np
from numpy.typing import NDArray

from thermo_fix.records import MaskArray

_SAMPLE = 6000
"""Pixels that the polynomial is fitted to: more change nothing that matters."""
_TUKEY = 4.685
"""Tuning constant of Tukey's biweight (95 % efficiency for normal noise; Huber and Ronchetti,
Robust Statistics, 2nd ed., table 4.4 - from memory)."""
_ROUNDS = 20
_STARTS = {3: 25, 6: 100}
"""Random starts of the trimmed fit by the number of terms: with 35 % of the pixels in a finding,
one start is clean with a chance of 99.96 %."""
_START_SAMPLE = 600
_KEPT = 0.55
"""Share of the pixels that the trimmed fit follows."""
_CONCENTRATIONS = 10
_TRIAL_STEPS = 2
_FOLLOWED = 8
_CLEARLY_TIGHTER = 0.7
_LARGE_ZONE_PX = 4000
_SMALL_ZONE_PX = 150
_GRID_PER_LENGTH = 4.0
_SMOOTHING_SHARE = 0.10
"""Smoothing length as a share of the zone's longer side: structure much wider than this is
background."""


def background(
    temperature: NDArray[np.float32],
    inside: MaskArray,
    scale_k: float,
    sigma_k: float,
) -> NDArray[np.float32]:
    """Return the smooth background of one zone.

    A low-order polynomial is fitted robustly, so that regions of either sense do not pull it
    towards themselves; then it follows the zone's own broad structure by smoothing what is left
    over, with everything that might be a finding left out and bridged.

    Parameters
    ----------
    temperature
        (rows, columns), K or degC.
    inside
        (rows, columns), pixels of the zone that may be used.
    scale_k
        Smallest difference that counts as a finding, K.
    sigma_k
        Pixel noise, K.

    Returns
    -------
    ndarray
        (rows, columns), NaN outside.

    """
    result = np.full(temperature.shape, np.nan, np.float32)
    places = np.flatnonzero(inside)
    if len(places) == 0:
        return result
    box = _box(inside)
    here, field = inside[box], temperature[box]
    extent = max(here.shape)
    # Centred and scaled to about -1 to 1, and temperatures near zero, so that float32 is enough
    # where it is quick.
    y = (np.arange(here.shape[0]) / extent * 2.0 - here.shape[0] / extent)[:, None]
    x = (np.arange(here.shape[1]) / extent * 2.0 - here.shape[1] / extent)[None, :]
    rows, columns = np.divmod(places[:: max(1, len(places) // _SAMPLE)], inside.shape[1])
    level = float(np.median(temperature[rows, columns]))
    values = temperature[rows, columns].astype(np.float64) - level
    terms = _terms(x[0, columns - box[1].start], y[rows - box[0].start, 0], len(places))
    fitted = _surface(_robust_fit(terms, values, sigma_k), x, y)
    if len(places) >= _LARGE_ZONE_PX:
        for _ in range(2):
            residual = np.where(here, field - np.float32(level) - fitted, np.float32(0.0))
            fitted += _broad_structure(residual, here, extent, scale_k, sigma_k)
    fitted += np.float32(level)
    result[box] = np.where(here, fitted, np.float32(np.nan))
    return result


def _box(inside: MaskArray) -> tuple[slice, slice]:
    """Return the rows and columns that a zone spans."""
    rows = np.flatnonzero(inside.any(axis=1))
    columns = np.flatnonzero(inside.any(axis=0))
    return (
        slice(int(rows[0]), int(rows[-1]) + 1),
        slice(int(columns[0]), int(columns[-1]) + 1),
    )


def _terms(x: NDArray[np.float64], y: NDArray[np.float64], count: int) -> NDArray[np.float64]:
    one = np.ones_like(x)
    if count < _SMALL_ZONE_PX:
        return np.stack([one], axis=1)
    if count < _LARGE_ZONE_PX:
        return np.stack([one, x, y], axis=1)
    return np.stack([one, x, y, x * x, x * y, y * y], axis=1)


def _surface(
    coefficients: NDArray[np.float64], x: NDArray[np.float64], y: NDArray[np.float64]
) -> NDArray[np.float32]:
    """Evaluate the polynomial on a grid: a column vector, a row vector, and their product."""
    c = [*coefficients, *np.zeros(6 - len(coefficients))]
    along_y = (c[0] + y * (c[2] + y * c[5])).astype(np.float32)
    along_x = (x * (c[1] + x * c[3])).astype(np.float32)
    surface = along_y + along_x
    if c[4] != 0.0:
        surface += (c[4] * y).astype(np.float32) * x.astype(np.float32)
    return np.asarray(surface, np.float32)


def _robust_fit(
    terms: NDArray[np.float64], values: NDArray[np.float64], sigma_k: float
) -> NDArray[np.float64]:
    """Fit robustly, so that a finding of a third of the zone draws nothing towards itself.

    From the median, a broad and weak finding is taken for curvature of the background; from a
    trimmed fit it is not. The latter is used where it leaves the half of the pixels that fits
    best clearly tighter.
    """
    level: NDArray[np.float64] = np.zeros(terms.shape[1])
    level[0] = np.median(values)
    plain = _reweighted(terms, values, sigma_k, level)
    spread = _spread(values - terms @ plain)
    if terms.shape[1] == 1 or _CLEARLY_TIGHTER * spread <= sigma_k:
        return plain
    trimmed = _reweighted(terms, values, sigma_k, _trimmed_fit(terms, values))
    return trimmed if _spread(values - terms @ trimmed) < _CLEARLY_TIGHTER * spread else plain


def _spread(residual: NDArray[np.float64]) -> float:
    """Half of the pixels may belong to findings; the half that fits best tells the spread."""
    return 1.4826 * float(np.median(np.abs(residual)))


def _trimmed_fit(terms: NDArray[np.float64], values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Least trimmed squares by concentration from random starts.

    Rousseeuw and Van Driessen, Data Mining and Knowledge Discovery 12 (2006) 29. The random
    numbers are the same in each run.
    """
    rng = np.random.default_rng(0)
    sample = rng.permutation(len(values))[:_START_SAMPLE]
    terms, values = terms[sample], values[sample]
    count, width = terms.shape
    products = (terms[:, :, None] * terms[:, None, :]).reshape(count, width * width)
    sides = terms * values[:, None]
    ridge = 1e-9 * count * np.eye(width)
    starts = _STARTS[width]
    chosen = np.argpartition(rng.random((starts, count)), width, axis=1)[:, :width]
    kept = round(_KEPT * count)
    for step in range(_CONCENTRATIONS):
        starts = len(chosen)
        weight = np.zeros((starts, count))
        np.put_along_axis(weight, chosen, 1.0, axis=1)
        normal = (weight @ products).reshape(starts, width, width) + ridge
        coefficients = np.linalg.solve(normal, (weight @ sides)[:, :, None])[:, :, 0]
        squares = np.square(values - coefficients @ terms.T)
        chosen = np.argpartition(squares, kept, axis=1)[:, :kept]
        cost = np.take_along_axis(squares, chosen, axis=1).sum(axis=1)
        if step == _TRIAL_STEPS - 1:
            # Only the most promising starts are worth following to their end.
            best = np.argsort(cost, kind="stable")[:_FOLLOWED]
            chosen, coefficients, cost = chosen[best], coefficients[best], cost[best]
    return np.asarray(coefficients[np.argmin(cost)], np.float64)


def _reweighted(
    terms: NDArray[np.float64],
    values: NDArray[np.float64],
    sigma_k: float,
    start: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Iteratively reweighted least squares with Tukey's biweight."""
    coefficients = start
    for _ in range(_ROUNDS):
        residual = values - terms @ coefficients
        spread = max(_spread(residual), sigma_k, 1e-3)
        weight = np.square(np.clip(1.0 - np.square(residual / (_TUKEY * spread)), 0.0, None))
        weighted = terms * weight[:, None]
        normal = weighted.T @ terms + 1e-9 * len(values) * np.eye(terms.shape[1])
        new = np.asarray(np.linalg.solve(normal, weighted.T @ values), np.float64)
        settled = np.max(np.abs(new - coefficients)) < 1e-4
        coefficients = new
        if settled:
            break
    return coefficients


def _broad_structure(
    residual: NDArray[np.float32],
    inside: MaskArray,
    extent: int,
    scale_k: float,
    sigma_k: float,
) -> NDArray[np.float32]:
    """Normalised smoothing of the residual without the candidates.

    Done on a grid as coarse as the smoothing length allows.
    """
    limit = max(0.5 * scale_k, 3.0 * sigma_k)
    candidate = cv2.dilate(
        (np.abs(cv2.blur(residual, (3, 3))) > limit).astype(np.uint8), np.ones((7, 7), np.uint8)
    )
    weight = (inside & (candidate == 0)).astype(np.float32)
    length = max(2.0, _SMOOTHING_SHARE * extent)
    step = max(1, int(length / _GRID_PER_LENGTH))
    height, width = residual.shape
    size = (max(1, width // step), max(1, height // step))

    def smoothed(field: NDArray[np.float32]) -> NDArray[np.float32]:
        coarse = field if step == 1 else cv2.resize(field, size, interpolation=cv2.INTER_AREA)
        blurred = cv2.GaussianBlur(coarse, (0, 0), length / step, borderType=cv2.BORDER_CONSTANT)
        return np.asarray(blurred, np.float32)

    weighted, total = smoothed(residual * weight), smoothed(weight)
    # Where hardly any background is near, the polynomial alone has to do.
    smooth = weighted / np.maximum(total, 1e-6) * np.clip(total / 0.05, 0.0, 1.0)
    if step > 1:
        smooth = cv2.resize(smooth, (width, height), interpolation=cv2.INTER_LINEAR)
    return np.asarray(smooth, np.float32)
