"""Correct readings from numbers: the public call for scripts and the ``point`` command."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any, get_args

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
_SMALLEST = 1e-3
"""Emissivities and transmittances below it leave nothing to measure."""
_ARGUMENTS = {
    "window.transmittance": "window_transmittance",
    "window.reflectance": "window_reflectance",
    "window.temperature_c": "window_c",
    "window.reflected_c": "window_reflected_c",
}
"""Arguments whose sheet key is spelt differently."""


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
        0.001 to 1: a number, a pair (value, standard uncertainty), the name of a
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
        An infrared window in the path, whose transmittance and reflectance add up to at most 1.
        Where not given, it is as warm as the air and reflects a room of 20 degC.
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
        A quantity out of its range or of another shape than the reading, named in the message.
    UnknownSurface
        A surface name that the table lacks; the message names the nearest.

    Examples
    --------
    >>> result = correct(60.0, emissivity=0.6, reflected_c=20.0, transmittance=0.99, air_c=20.0)
    >>> round(float(result), 1)
    80.8

    """
    values = np.asarray(reading_c, dtype=np.float64)
    if np.any((values <= -ZERO_CELSIUS_K) | np.isinf(values)):
        raise DomainError("reading_c must be finite and above -273.15 degC (or NaN: no reading)")
    if model not in get_args(ModelName):
        raise DomainError(f'model = {model!r} must be "total" or "band"')
    for name, setting in (
        ("recorded_emissivity", recorded_emissivity),
        ("recorded_transmittance", recorded_transmittance),
        ("recorded_reflected_c", recorded_reflected_c),
        ("recorded_air_c", recorded_air_c),
        ("accuracy_k", accuracy_k),
        ("accuracy_fraction", accuracy_fraction),
        ("noise_k", noise_k),
    ):
        _check(name, np.asarray(setting))
    variables: dict[str, Variable] = {}
    planes: dict[str, NDArray[np.float64]] = {}

    def put(key: str, given: Any) -> None:
        _put(variables, planes, values.shape, key, given)

    if isinstance(emissivity, str):
        surface = find_surface(emissivity)
        emissivity = (surface.emissivity, surface.u)
    put("emissivity", emissivity)
    put("air_c", _default("air_c") if air_c is None else air_c)
    air = variables["air_c"]
    if reflected_c is None:
        assumed = "reflected_c" if air_c is None else "reflected_c.from_air"
        reflected_c = (air.value, default_for(assumed).u or 0.0)
    put("reflected_c", reflected_c)
    if transmittance is None and distance_m is None:
        transmittance = (1.0, 0.0)
    put("humidity", _default("humidity") if humidity is None else humidity)
    put("distance_m", (0.0, 0.0) if distance_m is None else distance_m)
    if transmittance is not None:
        put("transmittance", transmittance)
        del variables["humidity"], variables["distance_m"]
    window = {
        "window.reflectance": window_reflectance,
        "window.temperature_c": window_c,
        "window.reflected_c": window_reflected_c,
    }
    if window_transmittance is not None:
        put("window.transmittance", window_transmittance)
        window["window.temperature_c"] = (
            (air.value, default_for("window.temperature_c").u or 0.0)
            if window_c is None
            else window_c
        )
        for key, value in window.items():
            put(key, _default(key) if value is None else value)
        total = variables["window.transmittance"].value + variables["window.reflectance"].value
        if window_reflectance is not None and total > 1.0 + 1e-12:
            raise DomainError(
                f"window_transmittance and window_reflectance add up to {total:g}, more than 1"
            )
    else:
        for key, value in window.items():
            if value is not None:
                raise DomainError(f"{_ARGUMENTS[key]} needs window_transmittance beside it")
    chosen: RadiationModel = TotalModel()
    band = band_model(
        band_um,
        None if response is None else tuple((float(um), float(height)) for um, height in response),
    )
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
        if len(given) != 2:
            raise DomainError(f"{_shown(key)}: give a number, or (value, standard uncertainty)")
        value, u = (float(each) for each in given)
        if not 0.0 <= u < math.inf:
            raise DomainError(
                f"{_shown(key)}: a standard uncertainty must be zero or more, not {u:g}"
            )
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
    shape: tuple[int, ...],
    key: str,
    given: Any,
) -> None:
    if isinstance(given, list) or (isinstance(given, np.ndarray) and given.ndim > 0):
        plane = np.asarray(given, dtype=np.float64)
        if key not in ("emissivity", "reflected_c"):
            raise DomainError(f"{_shown(key)} must be one number for the whole reading")
        if plane.shape != shape:
            raise DomainError(
                f"{_shown(key)} has the shape {plane.shape}, the reading {shape}; "
                "they must be the same"
            )
        _check(key, plane)
        planes[key] = plane
        variables[key] = Variable(key, 0.0, _pair(key, 0.0)[1])
        return
    value, u = _pair(key, given)
    _check(key, np.asarray(value))
    lower, upper = -math.inf, math.inf
    if key.endswith(("emissivity", "transmittance")):
        lower, upper = _SMALLEST, 1.0
    elif key in ("humidity", "window.reflectance"):
        lower, upper = 0.0, 1.0
    variables[key] = Variable(key, value, u, lower=lower, upper=upper)


def _shown(key: str) -> str:
    return _ARGUMENTS.get(key, key)


def _check(key: str, values: NDArray[np.float64]) -> None:
    """Refuse a quantity out of its range; what range that is follows from the name."""
    if key.endswith(("emissivity", "transmittance")):
        good, words = (values >= _SMALLEST) & (values <= 1.0), "between 0.001 and 1"
    elif key.endswith(("humidity", "reflectance")):
        good, words = (values >= 0.0) & (values <= 1.0), "between 0 and 1"
    elif key.endswith("_c"):
        good = np.isfinite(values) & (values >= -ZERO_CELSIUS_K)
        words = "at or above -273.15 degC"
    else:
        good, words = np.isfinite(values) & (values >= 0.0), "at or above zero"
    if not np.all(good):
        shown = f" = {float(values):g}" if values.ndim == 0 else ""
        raise DomainError(f"{_shown(key)}{shown} must lie {words}")
