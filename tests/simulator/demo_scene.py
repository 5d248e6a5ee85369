"""What the two demo surveys share: how one demo image is described and put together."""

from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np

from tests.simulator.air import air_transmittance, water_vapour_g_m3
from tests.simulator.camera import Camera, Window
from tests.simulator.records import Scene, Shape, Zone
from tests.simulator.shapes import Canvas
from tests.simulator.spectral import FloatArray
from tests.simulator.survey import simulate, stored, write_tiff

LARGE: Shape = (240, 320)
SMALL: Shape = (180, 240)


@dataclass(frozen=True)
class Air:
    """The air of a demo scene, and how far the camera stood."""

    air_c: float
    humidity: float
    distance_m: float


@dataclass(frozen=True)
class DemoImage:
    """One demo image: its file name, when it was taken, and the truth."""

    file: str
    taken: datetime
    scene: Scene


def demo_scene(
    name: str,
    canvas: Canvas,
    emissivity: float,
    reflected_c: float,
    air: Air,
    zones: list[Zone] | None = None,
    window: Window | None = None,
) -> Scene:
    """A scene of one surface; callers then overwrite parts of its emissivity and reflected maps."""
    vapour = water_vapour_g_m3(air.air_c, air.humidity)
    return Scene(
        name=name,
        temperature_c=canvas.temperature_c,
        emissivity_map=np.full(canvas.shape, emissivity),
        emissivity=emissivity,
        reflected_map_c=np.full(canvas.shape, reflected_c),
        reflected_c=reflected_c,
        air_c=air.air_c,
        humidity=air.humidity,
        distance_m=air.distance_m,
        transmittance=air_transmittance(vapour, air.distance_m),
        warm=True,
        cold=True,
        planted=canvas.planted(),
        zones=zones or [],
        window=window,
    )


def box_polygon(x0: float, y0: float, x1: float, y1: float) -> tuple[tuple[float, float], ...]:
    """The corners of an upright box, clockwise from the upper left."""
    return ((x0, y0), (x1, y0), (x1, y1), (x0, y1))


def write_images(
    folder: Path, images: list[DemoImage], camera: Camera, seed: int, pixel: str
) -> list[dict[str, Any]]:
    """Write the TIFFs of a demo survey and return the entries of the truth file."""
    truths = []
    for number, image in enumerate(images):
        simulated = simulate(image.scene, np.random.default_rng([seed, number]), camera=camera)
        write_tiff(
            folder / image.file,
            stored(_hundredths(simulated.reading_c), pixel),
            compression="zlib",
            taken=image.taken,
            predictor=True,
        )
        truths.append(simulated.truth(image.file))
    return truths


def _hundredths(reading_c: FloatArray) -> FloatArray:
    """Readings rounded to 0.01 K, far below the noise: the files become a quarter of the size."""
    return np.asarray(np.round(reading_c, 2), dtype=float)
