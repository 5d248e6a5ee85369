"""From surface temperatures to what a camera stores."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.ndimage import gaussian_filter

from tests.simulator.spectral import Detector, FloatArray, detector


@dataclass(frozen=True)
class Window:
    """An infrared window in front of the camera; what it neither passes nor mirrors it emits."""

    transmittance: float
    reflectance: float
    temperature_c: float
    reflected_c: float


@dataclass(frozen=True)
class RecordedSettings:
    """The settings under which the camera turned radiation into the readings that it stored."""

    emissivity: float = 1.0
    reflected_c: float = 20.0
    air_c: float = 20.0
    transmittance: float = 1.0


@dataclass(frozen=True)
class Camera:
    """The camera's faults and settings: blur in pixels, noise in K at the apparent temperature."""

    response: str = "box"
    blur_px: float = 0.6
    noise_k: float = 0.05
    column_noise_k: float = 0.0
    dead_pixels: int = 0
    offset_k: float = 0.0
    recorded: RecordedSettings = RecordedSettings()


def exitance_at_camera(
    seen_by: Detector,
    temperature_c: ArrayLike,
    emissivity: ArrayLike,
    reflected_c: ArrayLike,
    air_c: float,
    transmittance: float,
    window: Window | None = None,
) -> FloatArray:
    """In-band exitance that reaches the camera, W/m2: surface, then air, then window."""
    grey = np.asarray(emissivity, dtype=float)
    own = grey * seen_by.exitance(temperature_c)
    seen = own + (1.0 - grey) * seen_by.exitance(reflected_c)
    seen = transmittance * seen + (1.0 - transmittance) * seen_by.exitance(air_c)
    if window is None:
        return np.asarray(seen, dtype=float)
    absorbed = 1.0 - window.transmittance - window.reflectance
    return np.asarray(
        window.transmittance * seen
        + window.reflectance * seen_by.exitance(window.reflected_c)
        + absorbed * seen_by.exitance(window.temperature_c),
        dtype=float,
    )


def record(exitance: FloatArray, camera: Camera, rng: np.random.Generator) -> FloatArray:
    """What the camera stores, degC, for an image of in-band exitance (rows, columns) in W/m2.

    Blur acts on radiation; noise, column noise, dead pixels and the calibration offset act on the
    apparent temperature, which is then read with the camera's own settings.
    """
    seen_by = detector(camera.response)
    blurred = gaussian_filter(exitance, camera.blur_px, mode="nearest", truncate=5.0)
    apparent = seen_by.celsius(blurred)
    rows, columns = apparent.shape
    apparent = apparent + rng.normal(0.0, camera.noise_k, apparent.shape)
    if camera.column_noise_k > 0.0:
        apparent += rng.normal(0.0, camera.column_noise_k, columns)
    for _ in range(camera.dead_pixels):
        row, column = int(rng.integers(rows)), int(rng.integers(columns))
        apparent[row, column] += rng.choice([-1.0, 1.0]) * rng.uniform(6.0, 12.0)
    return read_with_settings(apparent + camera.offset_k, camera.recorded, seen_by)


def read_with_settings(
    apparent_c: FloatArray, settings: RecordedSettings, seen_by: Detector
) -> FloatArray:
    """The temperature, degC, that a camera with these settings makes of an apparent temperature."""
    if settings.emissivity == 1.0 and settings.transmittance == 1.0:
        return apparent_c
    without_air = (
        seen_by.exitance(apparent_c)
        - (1.0 - settings.transmittance) * seen_by.exitance(settings.air_c)
    ) / settings.transmittance
    without_reflection = (
        without_air - (1.0 - settings.emissivity) * seen_by.exitance(settings.reflected_c)
    ) / settings.emissivity
    return seen_by.celsius(without_reflection)
