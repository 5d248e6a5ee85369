"""Planck's law as a detector weighs it: in-band exitance and its inverse.

Everything here is integrated numerically from Planck's law with the constants of scipy.constants.
"""

from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import constants
from scipy.integrate import simpson

FloatArray = NDArray[np.float64]

COLDEST_C: Final = -120.0
HOTTEST_C: Final = 500.0
STEP_K: Final = 0.05
"""Linear interpolation between such steps is wrong by less than 0.01 mK (step^2/8 times M''/M')."""

SAMPLES_PER_SEGMENT: Final = 161


@dataclass(frozen=True)
class Response:
    """A detector's relative response, straight lines between knots.

    `band_um` is what a survey sheet would say of it: for the box the truth, for the sloping one
    only the wavelengths of half response.
    """

    name: str
    knots_um: tuple[float, ...]
    weights: tuple[float, ...]
    band_um: tuple[float, float]

    def at(self, wavelength_um: ArrayLike) -> FloatArray:
        """Relative response at wavelengths in um; zero outside the outer knots."""
        given = np.asarray(wavelength_um, dtype=float)
        weight = np.interp(given, self.knots_um, self.weights, left=0.0, right=0.0)
        return np.asarray(weight, dtype=float)


BOX: Final = Response("box", (8.0, 14.0), (1.0, 1.0), (8.0, 14.0))
SOFT: Final = Response(
    "soft", (7.2, 8.2, 9.0, 12.6, 13.1, 14.1), (0.0, 1.0, 0.96, 0.97, 1.0, 0.0), (7.7, 13.6)
)
RESPONSES: Final = {response.name: response for response in (BOX, SOFT)}


def spectral_exitance(wavelength_um: ArrayLike, temperature_k: ArrayLike) -> FloatArray:
    """Planck's spectral exitance of a blackbody, W m-2 um-1."""
    metres = np.asarray(wavelength_um, dtype=float) * constants.micro
    kelvin = np.asarray(temperature_k, dtype=float)
    first = 2.0 * constants.pi * constants.h * constants.c**2
    second = constants.h * constants.c / constants.k
    per_metre = first / metres**5 / np.expm1(second / (metres * kelvin))
    return np.asarray(per_metre * constants.micro, dtype=float)


def band_exitance(response: Response, temperature_k: ArrayLike) -> FloatArray:
    """In-band exitance by Simpson's rule on each straight piece of the response, W/m2."""
    kelvin = np.atleast_1d(np.asarray(temperature_k, dtype=float))
    total = np.zeros_like(kelvin)
    for low, high in zip(response.knots_um, response.knots_um[1:], strict=False):
        wavelength = np.linspace(low, high, SAMPLES_PER_SEGMENT)
        weighted = spectral_exitance(wavelength, kelvin[:, None]) * response.at(wavelength)
        total += simpson(weighted, x=wavelength, axis=-1)
    return total.reshape(np.shape(temperature_k))


class Detector:
    """In-band exitance and its inverse for one response, from a table in steps of 0.05 K."""

    def __init__(self, response: Response) -> None:
        self.response = response
        steps = round((HOTTEST_C - COLDEST_C) / STEP_K)
        self._celsius = np.asarray(COLDEST_C + STEP_K * np.arange(steps + 1), dtype=np.float64)
        self._exitance = band_exitance(response, self._celsius + constants.zero_Celsius)

    def exitance(self, celsius: ArrayLike) -> FloatArray:
        """Blackbody exitance in the band, W/m2, of temperatures between -120 and 500 degC."""
        given = np.asarray(celsius, dtype=float)
        if np.any(given < COLDEST_C) or np.any(given > HOTTEST_C):
            raise ValueError(f"temperature outside the table ({COLDEST_C} to {HOTTEST_C} degC)")
        return np.asarray(np.interp(given, self._celsius, self._exitance), dtype=float)

    def celsius(self, exitance: ArrayLike) -> FloatArray:
        """Blackbody-equivalent temperature, degC, of an in-band exitance; NaN outside the table."""
        given = np.asarray(exitance, dtype=float)
        return np.asarray(
            np.interp(given, self._exitance, self._celsius, left=np.nan, right=np.nan), dtype=float
        )


@lru_cache(maxsize=4)
def detector(name: str = "box") -> Detector:
    """The detector with the response of this name ("box" or "soft")."""
    return Detector(RESPONSES[name])
