"""Saturation pressure, dew point and surface humidity.

Below 0 degC saturation is taken over ice, so that the 'dew point' there is the frost point, and
a relative humidity is referred to ice. ISO 13788 and the ASHRAE handbook do the same; a
meteorological dew point (over supercooled water) lies 0.1 to 0.9 K lower.
"""

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.blackbody import Real

RANGE_C = (-60.0, 100.0)
"""Where the formulae here are used, degC."""

# Hyland and Wexler (1983), as given in ASHRAE Handbook - Fundamentals (2017), ch. 1, eq. 5
# (over ice) and 6 (over water); coefficients from memory, checked against that handbook's table
# and against psychrolib and CoolProp.
_ICE = (
    -5.6745359e3,
    6.3925247,
    -9.677843e-3,
    6.2215701e-7,
    2.0747825e-9,
    -9.484024e-13,
    4.1635019,
)
_WATER = (-5.8002206e3, 1.3914993, -4.8640239e-2, 4.1764768e-5, -1.4452093e-8, 0.0, 6.5459673)


def saturation_pressure_pa(temperature_c: Real) -> NDArray[np.float64]:
    """Saturation pressure of water vapour, Pa; over ice below 0 degC, over water above.

    Parameters
    ----------
    temperature_c
        degC, -60 to 100, any shape.

    Returns
    -------
    ndarray
        Pa, same shape (zero-dimensional for a number).

    Raises
    ------
    DomainError
        Outside -60 to 100 degC.

    """
    celsius = np.asarray(temperature_c, dtype=np.float64)
    low, high = RANGE_C
    if np.any((celsius < low) | (celsius > high)):
        raise DomainError(f"saturation pressure is given between {low:g} and {high:g} degC")
    return np.asarray(np.exp(_log_saturation(celsius + ZERO_CELSIUS_K)))


def dew_point_c(air_c: Real, humidity: Real) -> NDArray[np.float64]:
    """Dew point (frost point below 0 degC) of air, degC.

    Parameters
    ----------
    air_c
        degC, -60 to 100.
    humidity
        Relative humidity, above 0 and at most 1.

    Returns
    -------
    ndarray
        degC, of the broadcast shape; NaN where it lies below -60 degC.

    Raises
    ------
    DomainError
        Out of those ranges.

    Notes
    -----
    Newton's method on the logarithm of :func:`saturation_pressure_pa`, from a Magnus first guess.

    """
    fraction = np.asarray(humidity, dtype=np.float64)
    if np.any(~((fraction > 0.0) & (fraction <= 1.0))):
        raise DomainError("humidity must lie above 0 and be at most 1 for a dew point")
    target = np.log(saturation_pressure_pa(air_c)) + np.log(fraction)
    # Magnus (WMO-No. 8, 6.112 hPa, 17.62, 243.12) is within 2 K everywhere: a safe start.
    ratio = (target - np.log(611.2)) / 17.62
    kelvin = 243.12 * ratio / (1.0 - ratio) + ZERO_CELSIUS_K
    for _ in range(8):
        step = 1e-3
        slope = (_log_saturation(kelvin + step) - _log_saturation(kelvin - step)) / (2.0 * step)
        kelvin = kelvin - (_log_saturation(kelvin) - target) / slope
    celsius = kelvin - ZERO_CELSIUS_K
    return np.asarray(np.where(celsius < RANGE_C[0], np.nan, celsius))


def surface_humidity(surface_c: Real, air_c: Real, humidity: Real) -> NDArray[np.float64]:
    """Relative humidity of the air where it touches a surface.

    Parameters
    ----------
    surface_c, air_c
        degC, -60 to 100.
    humidity
        Relative humidity of the air away from the surface, 0 to 1.

    Returns
    -------
    ndarray
        Vapour pressure of the air over the saturation pressure at the surface (ISO 13788:2012,
        5.3); above 1 means condensation.

    Raises
    ------
    DomainError
        Out of those ranges.

    """
    fraction = np.asarray(humidity, dtype=np.float64)
    if np.any(~((fraction >= 0.0) & (fraction <= 1.0))):
        raise DomainError("humidity is a fraction between 0 and 1")
    return np.asarray(fraction * saturation_pressure_pa(air_c) / saturation_pressure_pa(surface_c))


def surface_at_humidity_c(limit: float, air_c: float, humidity: float) -> float:
    """Surface temperature at which the surface humidity reaches a limit, degC.

    Parameters
    ----------
    limit
        Surface humidity, ``humidity`` < limit <= 1, such as 0.8 for mould (ISO 13788:2012, 5.3).
    air_c, humidity
        State of the air, degC and 0 to 1.

    Returns
    -------
    float
        degC; the dew point for a limit of 1.

    Raises
    ------
    DomainError
        A limit not above the humidity of the air, or out of range.

    """
    if not humidity < limit <= 1.0:
        raise DomainError(f"limit {limit:g} must lie above the humidity {humidity:g} and be <= 1")
    return float(dew_point_c(air_c, humidity / limit))


def _log_saturation(kelvin: NDArray[np.float64]) -> NDArray[np.float64]:
    def series(c: tuple[float, ...]) -> NDArray[np.float64]:
        polynomial = c[1] + kelvin * (c[2] + kelvin * (c[3] + kelvin * (c[4] + kelvin * c[5])))
        return np.asarray(c[0] / kelvin + polynomial + c[6] * np.log(kelvin))

    frozen = kelvin < ZERO_CELSIUS_K
    # Mostly all values lie on one side, and a series is costly for many draws.
    if not np.any(frozen):
        return series(_WATER)
    if np.all(frozen):
        return series(_ICE)
    return np.asarray(np.where(frozen, series(_ICE), series(_WATER)))
