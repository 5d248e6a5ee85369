"""Correct readings from numbers: the public call for scripts and the ``point`` command."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.defaults import default_for
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.blackbody import RadiationModel, Real, TotalModel, band_model
from thermo_fix.radiometry.path import IDENTITY_PATH, OpticalPath
from thermo_fix.records import ModelName
from thermo_fix.surfaces import find_surface
from thermo_fix.uncertainty.equation import MeasurementEquation
from thermo_fix.uncertainty.variables import Variable

Quantity = float | tuple[float, float]
"""A number, or a number and its standard uncertainty (k = 1)."""

_DEFAULT_ACCURACY_K = 2.0
_DEFAULT_ACCURACY_FRACTION = 0.02
_RANGES = {
    "emissivity": (0.0, 1.0, "above 0 and at most 1"),
    "transmittance": (0.0, 1.0, "above 0 and at most 1"),
    "window.transmittance": (0.0, 1.0, "above 0 and at most 1"),
}


@dataclass(frozen=True)
class Corrected:
    """A surface temperature together with its standard uncertainty.

    Works as a number or an array where one is expected (``float(result)``,
    ``numpy.asarray(result)``), and unpacks into temperature and uncertainty.
    """

    temperature_c: Real
    """degC; NaN where no surface temperature explains the reading."""
    u_k: Real
    """Standard uncertainty (k = 1), K, of the same shape."""

    def __iter__(self) -> Iterator[Real]:
        return iter((self.temperature_c, self.u_k))

    def __float__(self) -> float:
        return float(self.temperature_c)

    def __array__(self, dtype: Any = None, copy: bool | None = None) -> NDArray[Any]:
        return np.array(self.temperature_c, dtype=dtype)


def correct(
    reading_c: ArrayLike,
    *,
    emissivity: Quantity | str | NDArray[Any],
    reflected_c: Quantity | NDArray[Any] | None = None,
    air_c: Quantity | None = None,
    humidity: Quantity | None = None,
    distance_m: Quantity | None = None,
    transmittance: Quantity | None = None,
    window_transmittance: Quantity | None = None,
    window_reflectance: Quantity | None = None,
    window_c: Quantity | None = None,
    window_reflected_c: Quantity | None = None,
    model: ModelName = "total",
    band_um: tuple[float, float] = (8.0, 14.0),
    response: Sequence[tuple[float, float]] | None = None,
    recorded_emissivity: float = 1.0,
    recorded_reflected_c: float = 20.0,
    recorded_air_c: float = 20.0,
    recorded_transmittance: float = 1.0,
    accuracy_k: float = _DEFAULT_ACCURACY_K,
    accuracy_fraction: float = _DEFAULT_ACCURACY_FRACTION,
    noise_k: float = 0.1,
) -> Corrected:
    """Correct readings for emissivity, reflected temperature, air path and window.

    Parameters
    ----------
    reading_c
        What the pixels say, degC: a number or an array of any shape, above -273.15.
    emissivity
        Above 0 and at most 1: a number, a pair (value, standard uncertainty), the name of a
        surface in the table, or an array of the shape of the reading.
    reflected_c
        Reflected apparent temperature, degC: a number, a pair, or an array; the air temperature
        where not given.
    air_c
        Air temperature, degC; 20 where not given.
    humidity, distance_m
        For the air transmittance formula: 0 to 1, and m. Without a distance (and without
        ``transmittance``) no air is corrected for.
    transmittance
        Of the air, instead of the formula.
    window_transmittance, window_reflectance, window_c, window_reflected_c
        An infrared window in the path; its temperatures are 20 degC where not given.
    model, band_um, response
        ``total`` (Stefan-Boltzmann) or ``band`` (Planck over a box or a response curve).
    recorded_emissivity, recorded_reflected_c, recorded_air_c, recorded_transmittance
        The settings that the camera had applied to the reading.
    accuracy_k, accuracy_fraction
        Stated accuracy: the larger of the two (fraction of the reading in degC) is the half-width
        of a rectangular distribution.
    noise_k
        Noise-equivalent temperature difference of one pixel, K.

    Returns
    -------
    Corrected
        Temperature and standard uncertainty, of the shape of the reading; floats for a number.

    Raises
    ------
    DomainError
        A quantity out of its range, named in the message.
    UnknownSurface
        A surface name that the table lacks; the message names the nearest.

    Examples
    --------
    >>> result = correct(60.0, emissivity=0.6, reflected_c=20.0, transmittance=0.99, air_c=20.0)
    >>> round(float(result), 1)
    80.8

    """
    values = np.asarray(reading_c, dtype=np.float64)
    if np.any(values <= -ZERO_CELSIUS_K):
        raise DomainError("reading_c must be above -273.15 degC")
    variables: dict[str, Variable] = {}
    planes: dict[str, NDArray[np.float64]] = {}
    if isinstance(emissivity, str):
        surface = find_surface(emissivity)
        emissivity = (surface.emissivity, surface.u)
    air = _pair("air_c", 20.0 if air_c is None else air_c)
    _put(variables, planes, "emissivity", emissivity)
    _put(variables, planes, "reflected_c", air if reflected_c is None else reflected_c)
    _put(variables, planes, "air_c", air)
    if transmittance is None and distance_m is None:
        transmittance = (1.0, 0.0)
    if transmittance is not None:
        _put(variables, planes, "transmittance", transmittance)
    else:
        _put(variables, planes, "humidity", _default("humidity") if humidity is None else humidity)
        _put(variables, planes, "distance_m", distance_m)
    if window_transmittance is not None:
        _put(variables, planes, "window.transmittance", window_transmittance)
        for key, value in (
            ("window.reflectance", window_reflectance),
            ("window.temperature_c", window_c),
            ("window.reflected_c", window_reflected_c),
        ):
            _put(variables, planes, key, _default(key) if value is None else value)
    chosen: RadiationModel = TotalModel()
    band = band_model(band_um, None if response is None else tuple(response))
    equation = MeasurementEquation(
        model=band if model == "band" else chosen,
        recorded=OpticalPath(
            emissivity=recorded_emissivity,
            reflected_k=recorded_reflected_c + ZERO_CELSIUS_K,
            air_k=recorded_air_c + ZERO_CELSIUS_K,
            transmittance=recorded_transmittance,
        )
        if recorded_emissivity != 1.0 or recorded_transmittance != 1.0
        else IDENTITY_PATH,
        variables=variables,
        accuracy_k=accuracy_k,
        accuracy_fraction=accuracy_fraction,
        noise_k=noise_k,
        alternative=None if model == "band" else band,
        emissivity_is_plane="emissivity" in planes,
        reflected_is_plane="reflected_c" in planes,
    )
    reading_k = values + ZERO_CELSIUS_K
    emissivity_plane = planes.get("emissivity")
    reflected_plane = planes.get("reflected_c")
    surface_k = equation.temperature_k(
        reading_k, emissivity=emissivity_plane, reflected_c=reflected_plane
    )
    u_k = equation.u_k(reading_k, emissivity=emissivity_plane, reflected_c=reflected_plane)
    temperature_c = surface_k - ZERO_CELSIUS_K
    if values.ndim == 0:
        return Corrected(float(temperature_c), float(u_k))
    return Corrected(temperature_c, u_k)


def _pair(key: str, given: Any) -> tuple[float, float]:
    if isinstance(given, tuple):
        value, u = (float(each) for each in given)
        if u < 0.0 or math.isnan(u):
            raise DomainError(f"{key}: a standard uncertainty must be zero or more, not {u:g}")
        return value, u
    value = float(given)
    entry = default_for(key)
    u = entry.u_given if entry.u_given is not None else 0.0
    if entry.u_given_relative is not None:
        u = entry.u_given_relative * abs(value)
    return value, u


def _default(key: str) -> tuple[float, float]:
    entry = default_for(key)
    return (
        20.0 if entry.value is None else entry.value,
        0.0 if entry.u is None else entry.u,
    )


def _put(
    variables: dict[str, Variable],
    planes: dict[str, NDArray[np.float64]],
    key: str,
    given: Any,
) -> None:
    if isinstance(given, np.ndarray) and given.ndim > 0:
        planes[key] = given.astype(np.float64)
        _check(key, planes[key])
        variables[key] = Variable(key, 0.0, _pair(key, 0.0)[1])
        return
    value, u = _pair(key, given)
    _check(key, np.asarray(value))
    lower, upper = (1e-3, 1.0) if key in _RANGES else (-math.inf, math.inf)
    if key in ("humidity", "window.reflectance"):
        lower, upper = 0.0, 1.0
    variables[key] = Variable(key, value, u, lower=lower, upper=upper)


def _check(key: str, values: NDArray[np.float64]) -> None:
    if key in _RANGES:
        low, high, words = _RANGES[key]
        if np.any(~((values > low) & (values <= high))):
            shown = f" = {float(values):g}" if values.ndim == 0 else ""
            raise DomainError(f"{key}{shown} must lie {words}")
    elif np.any(~np.isfinite(values)):
        raise DomainError(f"{key} must be a finite number")
