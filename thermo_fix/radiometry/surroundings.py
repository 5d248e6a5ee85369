"""What an exterior surface mirrors: sky and ground."""

import math

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.humidity import dew_point_c

REFLECTED_U_K = 5.0
"""Standard uncertainty of a reflected temperature from sky and ground, K. Published clear-sky
models disagree by 3 to 11 K among themselves, and what a wall really sees is not half sky and
half ground."""


def clear_sky_emissivity(dew_point: float) -> float:
    """Emissivity of a clear sky (Berdahl and Martin, Solar Energy 32 (1984) 663).

    Parameters
    ----------
    dew_point
        degC; fitted between -13 and 24 degC, used down to -40.

    Returns
    -------
    float
        0.711 + 0.56 (t/100) + 0.73 (t/100)^2.

    Raises
    ------
    DomainError
        A dew point outside -40 to 40 degC.

    """
    if not -40.0 <= dew_point <= 40.0:
        raise DomainError(f"clear-sky emissivity: dew point {dew_point:.1f} degC is out of range")
    hundredth = dew_point / 100.0
    return 0.711 + 0.56 * hundredth + 0.73 * hundredth**2


def sky_temperature_c(air_c: float, humidity: float, cloud: float = 0.0) -> float:
    """Apparent temperature of the sky, degC.

    Parameters
    ----------
    air_c
        Air near the ground, degC.
    humidity
        Relative humidity, above 0 and at most 1.
    cloud
        Cloud fraction, 0 to 1; raises the emissivity linearly to 1 (low cloud at air temperature).

    Returns
    -------
    float
        T_sky = T_air emissivity^(1/4).

    Raises
    ------
    DomainError
        A cloud fraction outside 0 to 1, or air out of range.

    """
    if not 0.0 <= cloud <= 1.0:
        raise DomainError(f"cloud fraction {cloud:g} is not between 0 and 1")
    clear = clear_sky_emissivity(float(dew_point_c(air_c, humidity)))
    emissivity = clear + cloud * (1.0 - clear)
    return float((air_c + ZERO_CELSIUS_K) * emissivity**0.25 - ZERO_CELSIUS_K)


def sky_view_factor(tilt_deg: float) -> float:
    """Return the view factor of a tilted plane to the sky, (1 + cos tilt)/2.

    Parameters
    ----------
    tilt_deg
        0 for a surface that faces the sky, 90 for a wall, 180 for a soffit.

    Raises
    ------
    DomainError
        Outside 0 to 180.

    """
    if not 0.0 <= tilt_deg <= 180.0:
        raise DomainError(f"tilt_deg {tilt_deg:g} is not between 0 and 180")
    return (1.0 + math.cos(math.radians(tilt_deg))) / 2.0


def sky_and_ground_temperature_c(
    air_c: float, humidity: float, cloud: float, tilt_deg: float, ground_c: float
) -> float:
    """Reflected apparent temperature of an exterior surface, degC.

    Parameters
    ----------
    air_c, humidity, cloud
        As for :func:`sky_temperature_c`.
    tilt_deg
        0 to 180.
    ground_c
        Temperature of ground and opposite buildings, degC.

    Returns
    -------
    float
        From T^4 = F_sky T_sky^4 + (1 - F_sky) T_ground^4.

    Raises
    ------
    DomainError
        As for the parts.

    """
    sky = sky_temperature_c(air_c, humidity, cloud) + ZERO_CELSIUS_K
    ground = ground_c + ZERO_CELSIUS_K
    view = sky_view_factor(tilt_deg)
    return float((view * sky**4 + (1.0 - view) * ground**4) ** 0.25 - ZERO_CELSIUS_K)
