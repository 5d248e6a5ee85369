"""Directional emissivity and the footprint of a pixel."""

import math

from thermo_fix.errors import DomainError

STEEP_VIEW_DEG = 60.0
"""Above this view angle a caution is printed."""

DIELECTRIC_FROM = 0.7
"""Normal emissivity from which a surface is treated as a dielectric. Metals lie below, and their
emissivity rises with the angle instead; common practice, no source."""

MEASURABLE_FOOTPRINTS = 3
"""A target must span this many footprints each way to be measured; common practice (size of
source: Budzier and Gerlach, J. Sens. Sens. Syst. 10 (2021) 179)."""


def refractive_index(normal_emissivity: float) -> float:
    """Refractive index of a dielectric with a given normal emissivity.

    Parameters
    ----------
    normal_emissivity
        0 < eps <= 1.

    Returns
    -------
    float
        n from 1 - eps = ((n - 1)/(n + 1))^2 (Fresnel at normal incidence).

    Raises
    ------
    DomainError
        Emissivity out of range.

    """
    if not 0.0 < normal_emissivity <= 1.0:
        raise DomainError(f"emissivity {normal_emissivity:g} is not above 0 and at most 1")
    root = math.sqrt(1.0 - normal_emissivity)
    return (1.0 + root) / (1.0 - root)


def fresnel_emissivity(index: float, angle_deg: float) -> float:
    """Emissivity of a smooth dielectric at an angle, from Fresnel's equations.

    Parameters
    ----------
    index
        Refractive index, 1 or more.
    angle_deg
        From the normal, 0 to below 90.

    Returns
    -------
    float
        1 - (r_s^2 + r_p^2)/2, the mean of both polarisations.

    Raises
    ------
    DomainError
        Index or angle out of range.

    """
    if not index >= 1.0 or not 0.0 <= angle_deg < 90.0:
        raise DomainError("refractive index must be >= 1 and the view angle 0 to below 90 degrees")
    cosine = math.cos(math.radians(angle_deg))
    inside = math.sqrt(1.0 - (math.sin(math.radians(angle_deg)) / index) ** 2)
    parallel = (index * cosine - inside) / (index * cosine + inside)
    crossed = (cosine - index * inside) / (cosine + index * inside)
    return 1.0 - (parallel**2 + crossed**2) / 2.0


def directional_factor(normal_emissivity: float, angle_deg: float) -> float:
    """Emissivity at an angle over the normal emissivity.

    Parameters
    ----------
    normal_emissivity
        0 < eps <= 1.
    angle_deg
        From the normal, 0 to below 90.

    Returns
    -------
    float
        1 at the normal, falling for a dielectric; 1 at any angle for a surface below
        ``DIELECTRIC_FROM``, of which nothing is known here.

    """
    if normal_emissivity < DIELECTRIC_FROM:
        return 1.0
    index = refractive_index(normal_emissivity)
    return fresnel_emissivity(index, angle_deg) / fresnel_emissivity(index, 0.0)


def pixel_footprint_m2(ifov_mrad: float, distance_m: float, angle_deg: float = 0.0) -> float:
    """Area on the target that one pixel sees.

    Parameters
    ----------
    ifov_mrad
        Instantaneous field of view of one pixel, mrad, above zero (small angles).
    distance_m
        m, above zero.
    angle_deg
        View angle; the footprint is longer by 1/cos along the tilt. 0 to below 90.

    Returns
    -------
    float
        m2.

    Raises
    ------
    DomainError
        Out of those ranges.

    """
    if not (ifov_mrad > 0.0 and distance_m > 0.0 and 0.0 <= angle_deg < 90.0):
        raise DomainError("a footprint needs ifov_mrad > 0, distance_m > 0 and an angle below 90")
    side = pixel_footprint_m(ifov_mrad, distance_m)
    return side * side / math.cos(math.radians(angle_deg))


def pixel_footprint_m(ifov_mrad: float, distance_m: float) -> float:
    """Side of the footprint across the view, m: IFOV x distance (small angles).

    Parameters
    ----------
    ifov_mrad
        mrad.
    distance_m
        m.

    """
    return ifov_mrad * 1e-3 * distance_m
