"""Long-wave transmittance of the air between surface and camera, and how far to trust it."""

import math

import numpy as np

from thermo_fix.errors import DomainError
from thermo_fix.radiometry.blackbody import Real

# Coefficients of the exponential long-wave formula attributed to Minkina and Dudzik, Infrared
# Thermography: Errors and Uncertainties (2009), and Usamentiaga et al., Sensors 14 (2014) 12305.
# From memory; what vouches for them is the comparison with LOWTRAN7 in the tests.
_X = 1.9
_A1, _A2 = 0.006569, 0.01262
_B1, _B2 = -0.002276, -0.00667
_HUMIDITY_POLYNOMIAL = (1.5587, 6.939e-2, -2.7816e-4, 6.8455e-7)

STRETCHED_BEYOND_M = 200.0
"""Beyond this distance the report says that the air model is being stretched."""

HUMIDITY_RANGE_C = (-40.0, 60.0)
"""Where the polynomial of absolute humidity stays within 3 % of the saturated value over water."""


def absolute_humidity_g_m3(air_c: Real, humidity: Real) -> Real:
    """Absolute humidity of the air as the transmittance formula takes it, g/m3.

    Parameters
    ----------
    air_c
        degC, -40 to 60.
    humidity
        Relative humidity over liquid water, 0 to 1.

    Returns
    -------
    float or ndarray
        w = rh exp(h0 + h1 t + h2 t^2 + h3 t^3), g/m3.

    """
    h0, h1, h2, h3 = _HUMIDITY_POLYNOMIAL
    return humidity * np.exp(h0 + air_c * (h1 + air_c * (h2 + air_c * h3)))


def air_transmittance(air_c: Real, humidity: Real, distance_m: Real) -> Real:
    """Long-wave transmittance of a horizontal path through clear air at sea level.

    Parameters
    ----------
    air_c
        degC, -40 to 60.
    humidity
        Relative humidity, 0 to 1.
    distance_m
        m, zero or more.

    Returns
    -------
    float or ndarray
        0 < tau <= 1.

    Raises
    ------
    DomainError
        Out of those ranges, or so long and humid a path that the formula turns zero or negative.

    """
    _check_air(air_c, humidity, distance_m)
    tau = _formula(absolute_humidity_g_m3(air_c, humidity), distance_m)
    if np.any(np.asarray(tau) <= 0.0):
        raise DomainError(
            "the air transmittance formula has no answer for so long and humid a path; "
            "measure the transmittance and state it as transmittance"
        )
    return tau


def air_transmittance_slopes(
    air_c: float, humidity: float, distance_m: float
) -> tuple[float, float, float]:
    """Return the derivatives of :func:`air_transmittance`.

    Parameters
    ----------
    air_c, humidity, distance_m
        As there; at distance 0 the derivative by distance is taken as 0 (it is infinite).

    Returns
    -------
    tuple of float
        d tau/d air_c (1/K), d tau/d humidity (1), d tau/d distance_m (1/m).

    """
    if distance_m == 0.0:
        return 0.0, 0.0, 0.0
    h0, h1, h2, h3 = _HUMIDITY_POLYNOMIAL
    per_humidity = float(np.exp(h0 + air_c * (h1 + air_c * (h2 + air_c * h3))))
    w = humidity * per_humidity
    root_d, root_w = distance_m**0.5, w**0.5
    first = _X * np.exp(-root_d * (_A1 + _B1 * root_w))
    second = (1.0 - _X) * np.exp(-root_d * (_A2 + _B2 * root_w))
    # d tau/dw has 1/sqrt(w); times dw/dx = w * (...) it stays finite at zero humidity.
    by_root_w = -root_d * (_B1 * first + _B2 * second)
    by_air = float(by_root_w * root_w / 2.0 * (h1 + air_c * (2.0 * h2 + air_c * 3.0 * h3)))
    by_humidity = float(by_root_w * per_humidity / (2.0 * root_w)) if w > 0.0 else 0.0
    by_distance = float(
        -((_A1 + _B1 * root_w) * first + (_A2 + _B2 * root_w) * second) / (2.0 * root_d)
    )
    return by_air, by_humidity, by_distance


def air_transmittance_u(air_c: float, humidity: float, distance_m: float) -> float:
    """Return the standard uncertainty of the transmittance formula itself.

    Parameters
    ----------
    air_c, humidity, distance_m
        As for :func:`air_transmittance`.

    Returns
    -------
    float
        Dimensionless, k = 1. Grows with distance and water vapour.

    Notes
    -----
    Chosen as an envelope of the difference to LOWTRAN7 (8-14 um, six standard atmospheres, 2 m
    to 1 km): no difference exceeds two of these standard uncertainties, which the tests check.
    The first part is the scatter at short range, the second the drift on long humid paths.

    """
    w = float(absolute_humidity_g_m3(air_c, humidity))
    short = (0.0019 + 5.0e-5 * w) * -math.expm1(-distance_m)
    long = 4.0e-6 * (1.0 + 0.75 * w) * distance_m
    return math.hypot(short, long)


def _formula(w_g_m3: Real, distance_m: Real) -> Real:
    root_w, root_d = np.sqrt(w_g_m3), np.sqrt(distance_m)
    return _X * np.exp(-root_d * (_A1 + _B1 * root_w)) + (1.0 - _X) * np.exp(
        -root_d * (_A2 + _B2 * root_w)
    )


def _check_air(air_c: Real, humidity: Real, distance_m: Real) -> None:
    low, high = HUMIDITY_RANGE_C
    if np.any(~((np.asarray(air_c) >= low) & (np.asarray(air_c) <= high))):
        raise DomainError(
            f"air_c must lie between {low:g} and {high:g} degC for the air transmittance formula; "
            "outside it, state the transmittance"
        )
    if np.any(~((np.asarray(humidity) >= 0.0) & (np.asarray(humidity) <= 1.0))):
        raise DomainError("humidity is a fraction between 0 and 1")
    if np.any(~(np.asarray(distance_m) >= 0.0)):
        raise DomainError("distance_m must be zero or more")
