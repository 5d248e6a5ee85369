"""Corrected frames made from plain arrays, for the tests of the find stage."""

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.records import (
    CorrectedFrame,
    DetectSettings,
    Encoding,
    Frame,
    ImageJob,
    MaskArray,
    Region,
    SceneInputs,
    Zone,
)
from thermo_fix.sheet import label_zones

SHAPE = (120, 160)
Box = tuple[int, int, int, int]


@dataclass(frozen=True)
class Part:
    """A rectangular zone [x0, y0, x1, y1)."""

    name: str
    box: Box
    like: str | None = None
    ignore: bool = False


def level(shape: tuple[int, int] = SHAPE, celsius: float = 20.0) -> NDArray[np.float64]:
    return np.full(shape, celsius)


def noise(shape: tuple[int, int], sigma: float, seed: int) -> NDArray[np.float64]:
    return np.asarray(np.random.default_rng(seed).normal(0.0, sigma, shape))


def with_box(image: NDArray[np.float64], box: Box, by_k: float) -> NDArray[np.float64]:
    changed = image.copy()
    changed[box[1] : box[3], box[0] : box[2]] += by_k
    return changed


def frame_of(
    celsius: NDArray[np.floating[Any]],
    parts: Sequence[Part] = (),
    *,
    warm: bool = True,
    cold: bool = True,
    min_delta_k: float = 1.5,
    min_area_px: int = 9,
) -> CorrectedFrame:
    zones = tuple(
        Zone(
            part.name,
            tuple((float(part.box[i]), float(part.box[j])) for i, j in _CORNERS),
            SceneInputs({}),
            like=part.like,
            ignore=part.ignore,
        )
        for part in parts
    )
    kelvin = (celsius + ZERO_CELSIUS_K).astype(np.float32)
    job = ImageJob(
        "a.tif",
        Path("a.tif"),
        SceneInputs({}),
        zones,
        DetectSettings(warm, cold, min_delta_k, min_area_px),
    )
    rows, columns = celsius.shape
    return CorrectedFrame(
        job=job,
        frame=Frame(Path("a.tif"), kelvin, Encoding("kelvin", 1.0, 0.0, "given"), "0" * 64),
        labels=label_zones(zones, (rows, columns)),
        reading_k=kelvin,
        surface_k=kelvin,
        uncertainty_k=np.zeros_like(kelvin),
        equations=(),
        inputs=(),
    )


_CORNERS = ((0, 1), (2, 1), (2, 3), (0, 3))


def whole_mask(region: Region, shape: tuple[int, int]) -> MaskArray:
    """The mask of a region in the whole image."""
    mask = np.zeros(shape, bool)
    x0, y0, x1, y1 = region.bbox_px
    mask[y0:y1, x0:x1] = region.mask
    return mask
