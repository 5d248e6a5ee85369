"""Heat flow between a building surface and what stands before it, and what follows from it.

The surface exchanges radiation with its surroundings and heat with the air before it:

    q = eps_h sigma (Ts^4 - Tr^4) + h_c (Ts - Ta)                                          (1)

Positive is from the surface to its surroundings. With h_r = sigma (Ts^2 + Tr^2)(Ts + Tr) this is
exactly (eps_h h_r + h_c)(Ts - Tn), where

    Tn = (h_c Ta + eps_h h_r Tr) / (h_c + eps_h h_r)                                       (2)

is the environmental temperature. In steady state q passes through the wall, and the U-value is q
over the difference between Tn on the side that was seen and the air on the other side: the manner
of ISO 9869-2:2018 (from memory), which averages that over several nights.
"""

import math
from typing import NamedTuple

import numpy as np

from thermo_fix.constants import STEFAN_BOLTZMANN
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.blackbody import Real
from thermo_fix.radiometry.surface import DIELECTRIC_FROM, refractive_index

LEAST_DIFFERENCE_K = 5.0
"""Between indoors and outdoors; below it no U-value is given (EN 13187:1998, annex D, has this
as the floor of any survey; from memory)."""
GOOD_DIFFERENCE_K = 10.0
"""Below it a U-value is cautioned (common practice)."""
MOST_WIND_M_S = 2.0
"""Above it a heat flow seen from outside is cautioned; judged: there the wind law makes most of
the result."""
STEADY_HOURS = 24.0
"""For which conditions should have been steady; EN 13187:1998, annex D (from memory)."""

MOULD_RSI = 0.25
"""m2 K/W: internal surface resistance for the mould check (ISO 13788, from memory)."""
HEMISPHERICAL_RELATIVE_U = 0.03
"""Of the ratio of hemispherical to normal emissivity: real surfaces are rough; judged."""

HOURS_PER_DAY = 24.0
WATTS_PER_KILOWATT = 1000.0


class Exchange(NamedTuple):
    """Heat flow at a surface."""

    flux: Real
    """W/m2, positive from the surface to what stands before it."""
    radiative_coefficient: Real
    """eps_h h_r, W m-2 K-1."""
    environment_k: Real
    """Environmental temperature, eq. 2."""


def radiative_coefficient(first_k: Real, second_k: Real) -> Real:
    """Radiative coefficient of black surfaces, sigma (T1^2 + T2^2)(T1 + T2), W m-2 K-1.

    Parameters
    ----------
    first_k, second_k
        K. Equal temperatures give 4 sigma T^3 (ISO 6946:2017, annex C).

    """
    result: Real = STEFAN_BOLTZMANN * (first_k**2 + second_k**2) * (first_k + second_k)
    return result


def surface_exchange(
    surface_k: Real, reflected_k: Real, air_k: Real, emissivity: Real, convective: Real
) -> Exchange:
    """Heat flow at a surface and its environmental temperature, eq. 1 and 2.

    Parameters
    ----------
    surface_k, reflected_k, air_k
        K; the reflected apparent temperature stands for the whole hemisphere before the surface.
    emissivity
        Total hemispherical, 0 to 1.
    convective
        h_c, W m-2 K-1, above 0.

    """
    by_radiation = emissivity * radiative_coefficient(surface_k, reflected_k)
    both = by_radiation + convective
    environment = (convective * air_k + by_radiation * reflected_k) / both
    return Exchange(
        by_radiation * (surface_k - reflected_k) + convective * (surface_k - air_k),
        by_radiation,
        environment,
    )


def u_value(flux: Real, indoor_k: Real, outdoor_k: Real) -> Real:
    """U-value from the heat flow outwards, W m-2 K-1.

    Parameters
    ----------
    flux
        From inside to outside, W/m2.
    indoor_k, outdoor_k
        Environmental temperature of the side that was seen, air temperature of the other, K.

    Raises
    ------
    DomainError
        A difference below 5 K (scalars only: draws of it may come nearer).

    """
    difference = indoor_k - outdoor_k
    if np.ndim(difference) == 0 and not abs(float(difference)) >= LEAST_DIFFERENCE_K:
        raise DomainError(
            f"the difference between indoors and outdoors is {abs(float(difference)):.1f} K; a "
            f"U-value needs {LEAST_DIFFERENCE_K:g} K"
        )
    result: Real = flux / difference
    return result


def yearly_energy_kwh(loss_w_k: Real, degree_days_k: Real) -> Real:
    """Energy of a heating season, kWh.

    Parameters
    ----------
    loss_w_k
        W/K.
    degree_days_k
        Heating degree days, K day.

    """
    return loss_w_k * degree_days_k * HOURS_PER_DAY / WATTS_PER_KILOWATT


def hemispherical_ratio(normal_emissivity: float) -> float:
    """Hemispherical over normal emissivity of a smooth surface.

    Parameters
    ----------
    normal_emissivity
        0 < eps <= 1.

    Returns
    -------
    float
        For a dielectric the integral of Fresnel's equations over the hemisphere in closed form
        (Dunkle 1963, as in Siegel and Howell, Thermal Radiation Heat Transfer; from memory,
        checked by quadrature); 1 for a surface below 0.7, of which nothing is known here.

    """
    if normal_emissivity < DIELECTRIC_FROM or normal_emissivity >= 1.0 - 1e-6:
        return 1.0
    n = refractive_index(normal_emissivity)
    square = n * n
    terms = (
        0.5,
        -(3.0 * n + 1.0) * (n - 1.0) / (6.0 * (n + 1.0) ** 2),
        -square * (square - 1.0) ** 2 / (square + 1.0) ** 3 * math.log((n - 1.0) / (n + 1.0)),
        2.0 * n**3 * (square + 2.0 * n - 1.0) / ((square + 1.0) * (n**4 - 1.0)),
        -8.0 * n**4 * (n**4 + 1.0) / ((square + 1.0) * (n**4 - 1.0) ** 2) * math.log(n),
    )
    return math.fsum(terms) / normal_emissivity


def factor_at_resistance(factor: Real, seen_rsi: Real, other_rsi: Real) -> Real:
    """Temperature factor under another internal surface resistance, for a plane wall.

    Parameters
    ----------
    factor
        fRsi as measured, 0 to below 1.
    seen_rsi
        Surface resistance under which it was measured, m2 K/W.
    other_rsi
        Surface resistance for which it is asked, such as 0.25 (ISO 13788).

    Returns
    -------
    float or ndarray
        The rest of the wall has the resistance R = Rsi f/(1 - f), and f = R/(R + Rsi)
        (one-dimensional, ISO 13788:2012, 3.1). A thermal bridge follows this only roughly.

    """
    rest = factor * seen_rsi
    result: Real = rest / (rest + other_rsi * (1.0 - factor))
    return result
