"""Inputs of the optical path from references: foil, patch or contact reading, and a pair of views.

The procedures of ASTM E1862 (reflected temperature), E1933 (emissivity) and E1897 (transmittance)
as algebra on exitance. Temperatures in kelvins, exitances in W m-2; every argument may be a number
or an array, broadcast against the others.
"""

from dataclasses import replace

import numpy as np
from scipy.optimize import brentq

from thermo_fix.radiometry.blackbody import RadiationModel, Real
from thermo_fix.radiometry.path import OpticalPath, correction_map
from thermo_fix.radiometry.surface import directional_factor

LEAST_SEPARATION_K = 10.0
"""Least difference between the target and what it is measured against (reflected temperature,
window), K. With 0.5 K of doubt in the target's temperature an emissivity of 0.90 is then known to
0.05; at 2 K it is known to 0.25 (ASTM E1933 and ISO 18434-1; the figure of 10 K from memory)."""

PREFERRED_SEPARATION_K = 20.0
"""From here the result is as good as the procedure allows (same sources, from memory)."""


def leaving_exitance(
    reading_k: Real, path: OpticalPath, recorded: OpticalPath, model: RadiationModel
) -> Real:
    """Exitance that leaves a surface towards the camera, W m-2: emitted and reflected together.

    Parameters
    ----------
    reading_k
        Reading, K.
    path
        The true path; its emissivity and reflected temperature play no part.
    recorded
        The path that the camera had assumed.
    model
        Radiation model.

    Returns
    -------
    float or ndarray
        With the recorded settings, the window and the air undone; may be negative where the path
        cannot be right.

    """
    black = replace(path, emissivity=1.0)
    return correction_map(black, recorded, model)(model.exitance(reading_k))


def emitted_exitance(leaving: Real, emissivity: Real, reflected: Real) -> Real:
    """Blackbody exitance at a surface's temperature, W m-2: the reference patch of ASTM E1933.

    Parameters
    ----------
    leaving
        What leaves the patch, W m-2.
    emissivity
        Of the patch, above 0 and at most 1.
    reflected
        Blackbody exitance at the reflected apparent temperature, W m-2.

    """
    return (leaving - (1.0 - emissivity) * reflected) / emissivity


def emissivity_of(leaving: Real, surface: Real, reflected: Real) -> Real:
    """Emissivity of an opaque surface of known temperature (ASTM E1933, both procedures).

    Parameters
    ----------
    leaving
        What leaves the surface, W m-2.
    surface
        Blackbody exitance at its temperature, W m-2.
    reflected
        Blackbody exitance at the reflected apparent temperature, W m-2.

    Returns
    -------
    float or ndarray
        (leaving - reflected) / (surface - reflected): not limited to 0 to 1, so that the caller
        sees when the readings contradict each other; NaN where nothing separates the two.

    """
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.divide(leaving - reflected, surface - reflected)
    return _finite(ratio)


def transmittance_of(
    through: Real, direct: Real, own: Real, reflectance: Real = 0.0, mirrored: Real = 0.0
) -> Real:
    """Transmittance of a window from two views of one target (ASTM E1897).

    Parameters
    ----------
    through
        What is seen through the window, W m-2.
    direct
        What reaches the window from the target, W m-2.
    own
        Blackbody exitance at the window's temperature, W m-2.
    reflectance
        Of the window, 0 to 1.
    mirrored
        Blackbody exitance of what the window mirrors into the camera, W m-2.

    Returns
    -------
    float or ndarray
        tau from through = tau direct + rho mirrored + (1 - tau - rho) own; NaN where nothing
        separates target and window.

    """
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.divide(through - own - reflectance * (mirrored - own), direct - own)
    return _finite(ratio)


def normal_emissivity(emissivity: float, angle_deg: float) -> float:
    """Emissivity at the normal of a surface whose emissivity at an angle is known.

    Parameters
    ----------
    emissivity
        As measured at the angle, above 0 and at most 1.
    angle_deg
        View angle, 0 to below 90.

    Returns
    -------
    float
        Such that times ``directional_factor`` it gives ``emissivity`` again; unchanged below
        ``DIELECTRIC_FROM``, where no angle is corrected for.

    """

    def excess(normal: float) -> float:
        return normal * directional_factor(normal, angle_deg) - emissivity

    # An emissivity of 1 is 1 at any angle, and any other dielectric's falls with the angle.
    if excess(emissivity) >= 0.0 or excess(1.0) <= 0.0:
        return emissivity
    return float(brentq(excess, emissivity, 1.0, xtol=1e-12))


def _finite(ratio: Real) -> Real:
    result = np.where(np.isfinite(ratio), ratio, np.nan)
    return float(result) if result.ndim == 0 else result
