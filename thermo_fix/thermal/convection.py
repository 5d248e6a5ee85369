"""Convection at a vertical surface: natural in a room, forced by wind outdoors.

Air is dry and at standard pressure. Viscosity and conductivity follow Sutherland's form; its
constants were fitted to the reference equations of Lemmon and Jacobsen (Int. J. Thermophys. 25
(2004) 21), as CoolProp 8.0.0 evaluates them, and keep within 0.4 % of them from -50 to 150 degC.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import STANDARD_GRAVITY, STANDARD_PRESSURE
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.blackbody import Real

AIR_RANGE_K = (220.0, 430.0)
"""Film temperatures for which the properties of air are given."""

NATURAL_RELATIVE_U = 0.2
"""Standard uncertainty of the natural law as a share of its value: rooms are no still air before
an isolated plate, and ISO 6946 takes 2.5 W m-2 K-1 where the law gives 2.1; judged."""
WIND_RELATIVE_U = 0.25
"""Standard uncertainty of the wind law as a share of its value. Published laws differ by a third
(Watmuff, Charters and Proctor (1977) give 2.8 + 3.0 v, from memory), and what the wind is at the
wall is not what it is at the mast; judged."""

WIND_JOIN_M_S = 5.0
"""Up to this wind the linear law, above it the power law. At the join the power law lies 0.47
W m-2 K-1 (1.9 %) above the linear one."""

_GAS_CONSTANT_AIR = 287.055
"""J kg-1 K-1: 8.314462618 J/(mol K) over 28.9647 g/mol (Lemmon and Jacobsen)."""
_HEAT_CAPACITY_AIR = 1007.0
"""J kg-1 K-1; within 1.1 % from -50 to 150 degC, within 0.2 % from -50 to 70 degC."""


class Air(NamedTuple):
    """Properties of dry air at standard pressure."""

    conductivity: Real
    """W m-1 K-1."""
    kinematic_viscosity: Real
    """m2/s."""
    diffusivity: Real
    """Of heat, m2/s."""

    @property
    def prandtl(self) -> Real:
        """Prandtl number."""
        return self.kinematic_viscosity / self.diffusivity


def air_properties(film_k: Real) -> Air:
    """Properties of dry air at standard pressure (see the head of this module).

    Parameters
    ----------
    film_k
        K, 220 to 430, any shape. Draws beyond that range are taken at its ends.

    """
    kelvin = np.clip(film_k, *AIR_RANGE_K)
    viscosity = 1.49043e-6 * kelvin**1.5 / (kelvin + 117.446)
    conductivity = 2.34046e-3 * kelvin**1.5 / (kelvin + 160.255)
    density = STANDARD_PRESSURE / (_GAS_CONSTANT_AIR * kelvin)
    return Air(
        conductivity,
        viscosity / density,
        conductivity / (density * _HEAT_CAPACITY_AIR),
    )


def rayleigh(difference_k: Real, film_k: Real, height_m: Real) -> Real:
    """Rayleigh number of a vertical surface, g beta |dT| H^3 / (nu alpha), beta = 1/T_film.

    Parameters
    ----------
    difference_k
        Surface minus air, K; its sign does not matter.
    film_k
        Mean of surface and air, K.
    height_m
        m, above 0.

    """
    air = air_properties(film_k)
    lift = STANDARD_GRAVITY / film_k * np.abs(difference_k) * height_m**3
    result: Real = lift / (air.kinematic_viscosity * air.diffusivity)
    return result


def nusselt_vertical(rayleigh_number: Real, prandtl: Real) -> Real:
    """Mean Nusselt number of a vertical plate, natural convection, any Rayleigh number.

    Parameters
    ----------
    rayleigh_number
        0 to 1e12.
    prandtl
        Above 0.

    Returns
    -------
    float or ndarray
        Churchill and Chu, Int. J. Heat Mass Transfer 18 (1975) 1323, eq. 9: laminar and
        turbulent in one formula.

    """
    spread = (1.0 + (0.492 / prandtl) ** (9.0 / 16.0)) ** (8.0 / 27.0)
    result: Real = (0.825 + 0.387 * rayleigh_number ** (1.0 / 6.0) / spread) ** 2
    return result


def natural_coefficient(surface_k: Real, air_k: Real, height_m: Real) -> Real:
    """Convective coefficient of a vertical surface in still air, W m-2 K-1.

    Parameters
    ----------
    surface_k, air_k
        K.
    height_m
        Over which the air flows along the surface, m, above 0; from about 1 m on it hardly
        matters.

    Raises
    ------
    DomainError
        A height that is not above 0.

    """
    if not np.all(np.asarray(height_m) > 0.0):
        raise DomainError("the height for natural convection must be above 0 m")
    film_k = 0.5 * (surface_k + air_k)
    air = air_properties(film_k)
    number = nusselt_vertical(rayleigh(surface_k - air_k, film_k, height_m), air.prandtl)
    result: Real = number * air.conductivity / height_m
    return result


def wind_coefficient(wind_m_s: Real) -> Real:
    """Convective coefficient of an outside wall in wind, W m-2 K-1.

    Parameters
    ----------
    wind_m_s
        Near the wall, m/s, 0 or more.

    Returns
    -------
    float or ndarray
        5.7 + 3.8 v up to 5 m/s, 5.678 x 0.50 (v / 0.3048)^0.78 above: Juerges (1924), as McAdams,
        Heat Transmission, 3rd ed. (1954) gives it (coefficients of the power law from memory).
        Taken as convection alone; some read the linear form as including radiation, which is one
        reason for ``WIND_RELATIVE_U``.

    Raises
    ------
    DomainError
        A wind below 0.

    """
    wind: NDArray[np.float64] = np.asarray(wind_m_s, dtype=np.float64)
    if not np.all(wind >= 0.0):
        raise DomainError("a wind speed cannot be below 0 m/s")
    power = 5.678 * 0.50 * (wind / 0.3048) ** 0.78
    result = np.where(wind <= WIND_JOIN_M_S, 5.7 + 3.8 * wind, power)
    return float(result) if result.ndim == 0 else result
