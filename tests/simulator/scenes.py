"""The kinds of survey that can be simulated, and the scenes that each of them is made of."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from tests.simulator import buildings, electrical
from tests.simulator.records import Scene, Shape

Builder = Callable[[np.random.Generator, Shape], Scene]

SIZES: Final[tuple[Shape, ...]] = ((120, 160), (240, 320), (480, 640))


@dataclass(frozen=True)
class Kind:
    """A kind of survey: what its sheet says and the scene builders that take turns."""

    purpose: str
    builders: tuple[Builder, ...]
    warm: bool
    cold: bool
    min_delta_k: float
    noise_k: float = 0.05
    column_noise_k: float = 0.0
    dead_pixels: int = 0


KINDS: Final[dict[str, Kind]] = {
    "building": Kind(
        "building",
        (buildings.wall_outside, buildings.room_inside),
        warm=True,
        cold=True,
        min_delta_k=buildings.MIN_DELTA_K,
    ),
    "electrical": Kind(
        "electrical",
        (electrical.panel, electrical.busbar),
        warm=True,
        cold=False,
        min_delta_k=electrical.MIN_DELTA_K,
    ),
    "hard-outside": Kind(
        "building",
        (buildings.facade,),
        warm=True,
        cold=False,
        min_delta_k=buildings.MIN_DELTA_K,
        noise_k=0.07,
        column_noise_k=0.025,
        dead_pixels=4,
    ),
    "hard-inside": Kind(
        "building",
        (buildings.corner,),
        warm=False,
        cold=True,
        min_delta_k=buildings.MIN_DELTA_K,
        noise_k=0.07,
        column_noise_k=0.025,
        dead_pixels=4,
    ),
    "hard-electrical": Kind(
        "electrical",
        (electrical.board,),
        warm=True,
        cold=False,
        min_delta_k=electrical.MIN_DELTA_K,
        noise_k=0.07,
        column_noise_k=0.025,
        dead_pixels=4,
    ),
}


def build_scene(kind: str, index: int, rng: np.random.Generator, shape: Shape) -> Scene:
    """The scene of image number `index` (from 0) of a survey of this kind."""
    if kind not in KINDS:
        raise ValueError(f"unknown kind {kind!r}; there are {', '.join(KINDS)}")
    builders = KINDS[kind].builders
    return builders[index % len(builders)](rng, shape)
