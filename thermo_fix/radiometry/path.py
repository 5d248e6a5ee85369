"""The optical path between surface and detector, as affine steps on exitance.

Each step turns the exitance M that comes into it into ``gain * M + offset``; a chain of steps is
again one affine map, and so is its inverse. Quantities are in kelvins and W m-2; every argument
may be a number or an array, broadcast against the others.
"""

from dataclasses import dataclass
from typing import cast

import numpy as np

from thermo_fix.radiometry.blackbody import RadiationModel, Real


@dataclass(frozen=True, slots=True)
class Affine:
    """The map M -> gain * M + offset."""

    gain: Real
    offset: Real

    def __call__(self, exitance: Real) -> Real:
        """Apply the map to an exitance, W m-2."""
        return self.gain * exitance + self.offset

    def inverse(self, exitance: Real) -> Real:
        """Return the exitance that the map turns into ``exitance``, W m-2."""
        return (exitance - self.offset) / self.gain

    def then(self, later: "Affine") -> "Affine":
        """Return this map followed by ``later``."""
        return Affine(later.gain * self.gain, later.gain * self.offset + later.offset)


@dataclass(frozen=True, slots=True)
class Window:
    """An infrared window in the path.

    ``transmittance + reflectance <= 1``; what is missing to 1 is its own emission.
    """

    transmittance: Real
    reflectance: Real
    temperature_k: Real
    reflected_k: Real
    """Apparent temperature of what the window mirrors into the camera, K."""


@dataclass(frozen=True, slots=True)
class OpticalPath:
    """Everything between the surface and the detector."""

    emissivity: Real
    """0 < emissivity <= 1."""
    reflected_k: Real
    """Reflected apparent temperature, K."""
    air_k: Real
    transmittance: Real
    """Of the air, 0 < transmittance <= 1."""
    window: Window | None = None


IDENTITY_PATH = OpticalPath(emissivity=1.0, reflected_k=293.15, air_k=293.15, transmittance=1.0)
"""A blackbody seen through nothing."""


def surface_step(emissivity: Real, reflected_exitance: Real) -> Affine:
    """Opaque surface: M -> eps M + (1 - eps) M(T_reflected).

    Source: ISO 18434-1 (measurement equation), Kirchhoff's law for an opaque grey surface.
    """
    return Affine(emissivity, (1.0 - emissivity) * reflected_exitance)


def air_step(transmittance: Real, air_exitance: Real) -> Affine:
    """Air that absorbs and emits: M -> tau M + (1 - tau) M(T_air). Source: ISO 18434-1."""
    return Affine(transmittance, (1.0 - transmittance) * air_exitance)


def window_step(
    transmittance: Real,
    reflectance: Real,
    reflected_exitance: Real,
    window_exitance: Real,
) -> Affine:
    """Infrared window: M -> tau M + rho M(T_reflected) + (1 - tau - rho) M(T_window).

    Source: energy balance of a plane parallel plate; the procedure is that of ASTM E1897.
    """
    emittance = 1.0 - transmittance - reflectance
    return Affine(transmittance, reflectance * reflected_exitance + emittance * window_exitance)


def seen_map(path: OpticalPath, model: RadiationModel) -> Affine:
    """Return the map from the exitance of the surface to the exitance that is seen.

    Parameters
    ----------
    path
        Emissivity, temperatures (K) and transmittances.
    model
        Radiation model.

    Returns
    -------
    Affine
        Its gain is positive for a path within its valid ranges.

    """
    chain = surface_step(path.emissivity, model.exitance(path.reflected_k)).then(
        air_step(path.transmittance, model.exitance(path.air_k))
    )
    if path.window is None:
        return chain
    window = path.window
    return chain.then(
        window_step(
            window.transmittance,
            window.reflectance,
            model.exitance(window.reflected_k),
            model.exitance(window.temperature_k),
        )
    )


def correction_map(path: OpticalPath, recorded: OpticalPath, model: RadiationModel) -> Affine:
    """Return the map from M(reading) to the exitance of the surface.

    The reading is first turned back into the exitance that was seen, with the settings that the
    camera had applied; then the true path is undone.

    Parameters
    ----------
    path
        The true optical path.
    recorded
        The path that the camera assumed when it wrote the reading.
    model
        Radiation model.

    Returns
    -------
    Affine
        From the exitance at the temperature of the reading to that of the surface, W m-2.

    """
    undone = seen_map(recorded, model)
    true = seen_map(path, model)
    return Affine(undone.gain / true.gain, (undone.offset - true.offset) / true.gain)


def surface_temperature(
    reading_k: Real, path: OpticalPath, recorded: OpticalPath, model: RadiationModel
) -> Real:
    """Surface temperature, K, from the reading of a pixel.

    T = M^-1((M_seen - B) / A), where M_seen = A M_surface + B.

    Parameters
    ----------
    reading_k
        K, any shape.
    path, recorded
        The true path and the one that the camera assumed; numbers or arrays that broadcast
        against ``reading_k``.
    model
        Radiation model.

    Returns
    -------
    float or ndarray
        K; NaN where (M_seen - B) <= 0, because no surface temperature explains the reading.

    """
    return model.temperature(
        correction_map(path, recorded, model)(model.exitance(reading_k)),
    )


def apparent_temperature(surface_k: Real, path: OpticalPath, model: RadiationModel) -> Real:
    """Apparent temperature, K, of a surface seen through a path: the forward problem.

    Parameters
    ----------
    surface_k
        Surface temperature, K, any shape.
    path
        The optical path.
    model
        Radiation model.

    Returns
    -------
    float or ndarray
        K.

    """
    return model.temperature(seen_map(path, model)(model.exitance(surface_k)))


def sensitivities(
    reading_k: Real,
    surface_k: Real,
    path: OpticalPath,
    recorded: OpticalPath,
    model: RadiationModel,
) -> dict[str, Real]:
    """Return the derivatives of the surface temperature with respect to each term of the path.

    Parameters
    ----------
    reading_k, surface_k
        The reading and the surface temperature that :func:`surface_temperature` gives, K.
    path, recorded, model
        As there.

    Returns
    -------
    dict
        K per unit: ``reading``, ``emissivity``, ``reflected``, ``air``, ``transmittance`` and,
        with a window, ``window.transmittance``, ``window.reflectance``, ``window.temperature``,
        ``window.reflected``.

    Notes
    -----
    From M_seen = A M(T) + B with M_seen held: dT/dx = -(M dA/dx + dB/dx) / (A dM/dT)
    (JCGM 100:2008, 5.1.3, by implicit differentiation).

    """
    surface = model.exitance(surface_k)
    reflected = model.exitance(path.reflected_k)
    air = model.exitance(path.air_k)
    at_surface = surface_step(path.emissivity, reflected)(surface)
    window = path.window
    outer = 1.0 if window is None else window.transmittance
    per_exitance = -1.0 / (outer * path.transmittance * path.emissivity * model.slope(surface_k))
    tau = path.transmittance
    undone = seen_map(recorded, model)
    result: dict[str, Real] = {
        "reading": -per_exitance * undone.gain * model.slope(reading_k),
        "emissivity": per_exitance * outer * tau * (surface - reflected),
        "reflected": per_exitance
        * outer
        * tau
        * (1.0 - path.emissivity)
        * model.slope(path.reflected_k),
        "air": per_exitance * outer * (1.0 - tau) * model.slope(path.air_k),
        "transmittance": per_exitance * outer * (at_surface - air),
    }
    if window is not None:
        before = air_step(tau, air)(at_surface)
        mirrored = model.exitance(window.reflected_k)
        own = model.exitance(window.temperature_k)
        emittance = 1.0 - window.transmittance - window.reflectance
        result |= {
            "window.transmittance": per_exitance * (before - own),
            "window.reflectance": per_exitance * (mirrored - own),
            "window.temperature": per_exitance * emittance * model.slope(window.temperature_k),
            "window.reflected": per_exitance * window.reflectance * model.slope(window.reflected_k),
        }
    return result


def is_unsolved(
    surface_k: Real, reading_k: Real
) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
    """Say where a finite reading has no surface temperature.

    Parameters
    ----------
    surface_k, reading_k
        K, of one shape.

    Returns
    -------
    ndarray of bool
        Of the same shape.

    """
    return cast(
        "np.ndarray[tuple[int, ...], np.dtype[np.bool_]]",
        np.isnan(surface_k) & np.isfinite(reading_k),
    )
