"""Blackbody exitance as a detector weighs it, and its inverse, for two radiation models.

``TotalModel`` is the Stefan-Boltzmann law. ``BandModel`` integrates Planck's law over the
camera's spectral band, because a camera sees only a band: with low emissivity the fourth power
is wrong by kelvins.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import BOLTZMANN, LIGHT_SPEED, PLANCK, STEFAN_BOLTZMANN, ZERO_CELSIUS_K
from thermo_fix.errors import DomainError

Real = float | NDArray[np.floating[Any]]
"""A number or an array of numbers; a function of an array returns an array of its shape."""

SECOND_RADIATION_CONSTANT_UM_K = PLANCK * LIGHT_SPEED / BOLTZMANN * 1e6
"""um K. hc/k (CODATA 2022: 1.438776877e-2 m K)."""

BAND_RANGE_K = (90.0, ZERO_CELSIUS_K + 1700.0)
"""Temperatures that the band tables cover; wider than the promised -60 to 1500 degC, because a
clear sky reflects colder and a hot part behind a lossy path corrects hotter."""

_TABLE_SIZE = 1 << 16
_NODE_COUNT = 8192


class RadiationModel(Protocol):
    """What the optical path needs to know of a radiation model."""

    @property
    def name(self) -> str:
        """``total`` or ``band``."""
        ...

    def exitance(self, temperature_k: Real) -> Real:
        """Exitance M(T), W m-2, of a blackbody at ``temperature_k`` (K, any shape)."""
        ...

    def slope(self, temperature_k: Real) -> Real:
        """Return dM/dT, W m-2 K-1, at ``temperature_k`` (K, any shape)."""
        ...

    def temperature(self, exitance: Real) -> Real:
        """Temperature, K, whose exitance is ``exitance`` (W m-2, any shape); else NaN."""
        ...


@dataclass(frozen=True)
class TotalModel:
    """Stefan-Boltzmann law, M = sigma T^4 (CODATA value of sigma), for T > 0 K."""

    name: str = "total"

    def exitance(self, temperature_k: Real) -> Real:
        """Exitance, W m-2, of a blackbody at ``temperature_k`` (K, any shape)."""
        squared = temperature_k * temperature_k
        return STEFAN_BOLTZMANN * squared * squared

    def slope(self, temperature_k: Real) -> Real:
        """Return dM/dT = 4 sigma T^3, W m-2 K-1, at ``temperature_k`` (K, any shape)."""
        return 4.0 * STEFAN_BOLTZMANN * temperature_k * temperature_k * temperature_k

    def temperature(self, exitance: Real) -> Real:
        """Temperature, K, of a blackbody of ``exitance`` (W m-2, any shape).

        NaN where the exitance is not positive: no temperature gives it.
        """
        if isinstance(exitance, np.ndarray):
            with np.errstate(invalid="ignore"):
                root = np.sqrt(np.sqrt(exitance * (1.0 / STEFAN_BOLTZMANN)))
                return np.where(exitance > 0.0, root, np.asarray(np.nan, root.dtype))
        return float((exitance / STEFAN_BOLTZMANN) ** 0.25) if exitance > 0.0 else float("nan")


class BandModel:
    """Planck exitance integrated over a spectral band, tabulated once and inverted.

    The tables are equidistant, in T for M(T) and in M^(1/4) for T(M), and read with linear
    interpolation; both ways together stay within 1 mK of the integral between -60 and 1500 degC
    (tested against quadrature). Outside ``BAND_RANGE_K`` the result is NaN.

    Parameters
    ----------
    band_um
        Lower and upper wavelength, um, of a box response of height 1.
    response
        Instead of a box: pairs (wavelength in um, relative response), rising in wavelength;
        linear between the points, zero outside. Scaled to a greatest value of 1.

    Raises
    ------
    DomainError
        Wavelengths not positive and rising, or a response that is negative or zero everywhere.

    """

    name = "band"

    def __init__(
        self,
        band_um: tuple[float, float] = (8.0, 14.0),
        response: Sequence[tuple[float, float]] | None = None,
    ) -> None:
        nodes_k = np.geomspace(*BAND_RANGE_K, _NODE_COUNT)
        if response is None:
            low_um, high_um = (float(edge) for edge in band_um)
            if not 0.0 < low_um < high_um:
                raise DomainError(
                    f"band_um = [{low_um}, {high_um}]: the two wavelengths must be above zero "
                    "and rising, in micrometres"
                )
            self.description = f"box {low_um:g} to {high_um:g} um"
            exitance = box_band_exitance(nodes_k, low_um, high_um)
        else:
            wavelengths, weights = _response_points(response)
            self.description = (
                f"response curve, {wavelengths[0]:g} to {wavelengths[-1]:g} um, "
                f"{len(response)} points"
            )
            exitance = _response_exitance(nodes_k, wavelengths, weights)
        # Between nodes this near, straight lines in the logarithms err by less than 1e-7; they are
        # filled into equidistant tables, which are quick to read.
        log_k, log_m = np.log(nodes_k), np.log(exitance)
        self._low_k, self._high_k = BAND_RANGE_K
        grid_k = np.linspace(self._low_k, self._high_k, _TABLE_SIZE)
        grid_m = np.exp(np.interp(np.log(grid_k), log_k, log_m))
        exponent = np.interp(grid_k, nodes_k, np.gradient(log_m, log_k))
        self._exitance_table = _Table(self._low_k, self._high_k, grid_m)
        self._slope_table = _Table(self._low_k, self._high_k, grid_m * exponent / grid_k)
        root_nodes = exitance**0.25
        root_grid = np.linspace(root_nodes[0], root_nodes[-1], _TABLE_SIZE)
        self._temperature_table = _Table(
            float(root_nodes[0]), float(root_nodes[-1]), np.interp(root_grid, root_nodes, nodes_k)
        )

    def exitance(self, temperature_k: Real) -> Real:
        """In-band exitance, W m-2, of a blackbody at ``temperature_k`` (K, any shape)."""
        return self._exitance_table(temperature_k)

    def slope(self, temperature_k: Real) -> Real:
        """Return dM/dT, W m-2 K-1, at ``temperature_k`` (K, any shape)."""
        return self._slope_table(temperature_k)

    def temperature(self, exitance: Real) -> Real:
        """Temperature, K, of a blackbody of in-band ``exitance`` (W m-2, any shape).

        NaN where no temperature in ``BAND_RANGE_K`` gives it.
        """
        if isinstance(exitance, np.ndarray):
            with np.errstate(invalid="ignore"):
                return self._temperature_table(np.sqrt(np.sqrt(exitance)))
        return self._temperature_table(exitance**0.25) if exitance > 0.0 else float("nan")


class _Table:
    """Equidistant table with linear interpolation; NaN outside; keeps float32 as float32."""

    def __init__(self, start: float, stop: float, values: NDArray[np.float64]) -> None:
        self._start = start
        self._per_step = (len(values) - 1) / (stop - start)
        self._last = len(values) - 2
        rises = np.append(np.diff(values), 0.0)
        self._double = (values, rises)
        self._single = (values.astype(np.float32), rises.astype(np.float32))

    def __call__(self, x: Real) -> Real:
        if not isinstance(x, np.ndarray):
            return self._of_number(float(x))
        values: NDArray[np.floating[Any]]
        rises: NDArray[np.floating[Any]]
        values, rises = self._single if x.dtype == np.float32 else self._double
        position = (x - self._start) * self._per_step
        with np.errstate(invalid="ignore"):
            inside = (position >= 0.0) & (position <= self._last + 1)
            if inside.all():
                index = np.minimum(position.astype(np.intp), self._last)
                return _between(values, rises, position, index)
            index = np.where(inside, position, 0.0).astype(np.intp)
            np.minimum(index, self._last, out=index)
            result = _between(values, rises, position, index)
        return np.where(inside, result, np.asarray(np.nan, values.dtype))

    def _of_number(self, x: float) -> float:
        # A number costs twenty times less without numpy, and findings take thousands of them.
        position = (x - self._start) * self._per_step
        if not 0.0 <= position <= self._last + 1:
            return float("nan")
        index = min(int(position), self._last)
        values, rises = self._double
        return float(values[index] + (position - index) * rises[index])


def _between(
    values: NDArray[np.floating[Any]],
    rises: NDArray[np.floating[Any]],
    position: NDArray[np.floating[Any]],
    index: NDArray[np.intp],
) -> NDArray[np.floating[Any]]:
    share = np.asarray(position - index, values.dtype)
    return np.asarray(values[index] + share * rises[index])


def blackbody_fraction(wavelength_temperature_um_k: Real) -> NDArray[np.float64]:
    """Fraction of blackbody exitance at wavelengths from zero to lambda, F(0 -> lambda T).

    Parameters
    ----------
    wavelength_temperature_um_k
        lambda T, um K, any shape; above zero and at most 2e5.

    Returns
    -------
    ndarray
        Dimensionless, 0 to 1, of the same shape.

    Notes
    -----
    Series F = 15/pi^4 sum_n exp(-n z)/n (z^3 + 3 z^2/n + 6 z/n^2 + 6/n^3), z = c2/(lambda T)
    (Chang and Rhee, Int. Comm. Heat Mass Transfer 11 (1984) 451; reference from memory), summed
    until the terms fall below 1e-17.

    Raises
    ------
    DomainError
        lambda T not in (0, 2e5] um K.

    """
    product = np.asarray(wavelength_temperature_um_k, dtype=np.float64)
    if np.any(~(product > 0.0)) or np.any(product > 2e5):
        raise DomainError("lambda T must lie above 0 and be at most 200000 um K")
    z = SECOND_RADIATION_CONSTANT_UM_K / product
    terms = int(np.ceil(40.0 / float(z.min())))
    total = np.zeros_like(z)
    for n in range(1, terms + 1):
        total += np.exp(-n * z) / n * (((z + 3.0 / n) * z + 6.0 / n**2) * z + 6.0 / n**3)
    return np.asarray(total * (15.0 / np.pi**4))


def box_band_exitance(temperature_k: Real, low_um: float, high_um: float) -> NDArray[np.float64]:
    """Blackbody exitance between two wavelengths, W m-2.

    Parameters
    ----------
    temperature_k
        K, any shape, above zero; ``high_um`` times it at most 2e5 um K.
    low_um, high_um
        Wavelengths, um.

    Returns
    -------
    ndarray
        W m-2, of the shape of ``temperature_k``: sigma T^4 [F(high T) - F(low T)].

    """
    kelvin = np.asarray(temperature_k, dtype=np.float64)
    fraction = blackbody_fraction(high_um * kelvin) - blackbody_fraction(low_um * kelvin)
    return STEFAN_BOLTZMANN * kelvin**4 * fraction


def spectral_exitance(wavelength_um: Real, temperature_k: Real) -> NDArray[np.float64]:
    """Planck's law: spectral exitance of a blackbody, W m-2 um-1.

    Parameters
    ----------
    wavelength_um
        um, above zero; broadcast against ``temperature_k``.
    temperature_k
        K, above zero.

    Returns
    -------
    ndarray
        2 pi h c^2 / (lambda^5 (exp(c2 / lambda T) - 1)) (CODATA 2022 constants).

    """
    metres = np.asarray(wavelength_um, dtype=np.float64) * 1e-6
    exponent = PLANCK * LIGHT_SPEED / (metres * BOLTZMANN * np.asarray(temperature_k, np.float64))
    return np.asarray(2.0 * np.pi * PLANCK * LIGHT_SPEED**2 / metres**5 / np.expm1(exponent) * 1e-6)


def _response_points(
    response: Sequence[tuple[float, float]],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    points = np.asarray(response, dtype=np.float64)
    if points.ndim != 2 or points.shape[0] < 2 or points.shape[1] != 2:
        raise DomainError("a response curve needs at least two points (wavelength, response)")
    wavelengths, weights = points[:, 0], points[:, 1]
    if not np.all(np.isfinite(points)) or wavelengths[0] <= 0 or np.any(np.diff(wavelengths) <= 0):
        raise DomainError("the wavelengths of a response curve must be above zero and rising")
    if np.any(weights < 0) or not np.any(weights > 0):
        raise DomainError("a response must be zero or above, and above zero somewhere")
    return wavelengths, weights / weights.max()


def _response_exitance(
    temperature_k: NDArray[np.float64],
    wavelengths: NDArray[np.float64],
    weights: NDArray[np.float64],
) -> NDArray[np.float64]:
    # The curve is linear between its points, so Gauss-Legendre on each piece is exact for the
    # curve and, with pieces of at most 0.25 um and 5 nodes, good to 1e-9 for Planck's law.
    edges = [wavelengths[:1]]
    for start, stop in pairwise(wavelengths):
        pieces = max(1, int(np.ceil((stop - start) / 0.25)))
        edges.append(np.linspace(start, stop, pieces + 1)[1:])
    edge = np.concatenate(edges)
    nodes, node_weights = np.polynomial.legendre.leggauss(5)
    half = np.diff(edge) / 2.0
    middle = (edge[:-1] + edge[1:]) / 2.0
    points = (middle[:, None] + half[:, None] * nodes).ravel()
    factors = (half[:, None] * node_weights).ravel() * np.interp(points, wavelengths, weights)
    total = np.zeros_like(temperature_k)
    for point, factor in zip(points, factors, strict=True):
        if factor > 0.0:
            total += factor * spectral_exitance(point, temperature_k)
    return total


@lru_cache(maxsize=8)
def band_model(
    band_um: tuple[float, float] = (8.0, 14.0),
    response: tuple[tuple[float, float], ...] | None = None,
) -> BandModel:
    """Return the band model of a box or a response curve, tabulated once and then kept.

    Parameters and errors as for :class:`BandModel`.
    """
    return BandModel(band_um, response)
