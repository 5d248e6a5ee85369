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
    rows, columns = np.nonzero(inside)
    if len(rows) == 0:
        return result
    values = temperature[rows, columns].astype(np.float64)
    extent = int(max(np.ptp(rows), np.ptp(columns))) + 1
    x = (columns - columns.mean()) / extent * 2.0
    y = (rows - rows.mean()) / extent * 2.0
    terms = _terms(x, y, len(rows))
    step = max(1, len(rows) // _SAMPLE)
    fitted: NDArray[np.float64] = terms @ _robust_fit(terms[::step], values[::step], sigma_k)
    if len(rows) >= _LARGE_ZONE_PX:
        for _ in range(2):
            fitted += _broad_structure(
                values - fitted, rows, columns, temperature.shape, extent, scale_k, sigma_k
            )
    result[rows, columns] = fitted
    return result


def _terms(x: NDArray[np.float64], y: NDArray[np.float64], count: int) -> NDArray[np.float64]:
    one = np.ones_like(x)
    if count < _SMALL_ZONE_PX:
        return np.stack([one], axis=1)
    if count < _LARGE_ZONE_PX:
        return np.stack([one, x, y], axis=1)
    return np.stack([one, x, y, x * x, x * y, y * y], axis=1)


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
    residual: NDArray[np.float64],
    rows: NDArray[np.intp],
    columns: NDArray[np.intp],
    shape: tuple[int, ...],
    extent: int,
    scale_k: float,
    sigma_k: float,
) -> NDArray[np.float64]:
    """Normalised smoothing of the residual without the candidates, at the zone's pixels."""
    field = np.zeros(shape, np.float32)
    field[rows, columns] = residual
    weight = np.zeros(shape, np.float32)
    weight[rows, columns] = 1.0
    limit = max(0.5 * scale_k, 3.0 * sigma_k)
    candidate = (np.abs(cv2.blur(field, (3, 3))) > limit).astype(np.uint8)
    weight[cv2.dilate(candidate, np.ones((7, 7), np.uint8)) > 0] = 0.0
    length = max(2.0, _SMOOTHING_SHARE * extent)
    weighted = _smoothed(field * weight, length)
    total = _smoothed(weight, length)
    # Where hardly any background is near, the polynomial alone has to do.
    smooth = weighted / np.maximum(total, 1e-6) * np.clip(total / 0.05, 0.0, 1.0)
    return np.asarray(smooth[rows, columns], np.float64)


def _smoothed(field: NDArray[np.float32], length: float) -> NDArray[np.float32]:
    """Smooth over a length, on a coarser grid where that is fine enough for it."""
    step = max(1, int(length / _GRID_PER_LENGTH))
    height, width = field.shape
    size = (max(1, width // step), max(1, height // step))
    coarse = field if step == 1 else cv2.resize(field, size, interpolation=cv2.INTER_AREA)
    smooth = cv2.GaussianBlur(coarse, (0, 0), length / step, borderType=cv2.BORDER_CONSTANT)
    if step > 1:
        smooth = cv2.resize(smooth, (width, height), interpolation=cv2.INTER_LINEAR)
    return np.asarray(smooth, np.float32)
