"""Building scenes: walls seen from outside and rooms seen from inside, easy and hard."""

from typing import Final

import numpy as np
from scipy.ndimage import gaussian_filter

from tests.simulator.records import BoolArray, Scene, Shape, Zone
from tests.simulator.shapes import (
    Canvas,
    ellipse,
    grid,
    l_shape,
    ragged,
    rectangle,
    slow_field,
    soften,
)
from tests.simulator.spectral import FloatArray
from tests.simulator.surroundings import Surroundings, indoors, outdoors

MIN_DELTA_K: Final = 1.2
"""The threshold that the sheets of building surveys state."""

CLEARLY: Final = 1.6
"""Planted anomalies stand at least this many thresholds above what is around them."""

SMALLEST_AREA_PX: Final = 24
TRIES: Final = 200


def _scale(shape: Shape) -> float:
    """Size of features relative to an image of 240 rows."""
    return shape[0] / 240.0


def _any_shape(rng: np.random.Generator, shape: Shape, size_px: float) -> BoolArray:
    """A patch of about this size, somewhere, of one of four outlines."""
    rows, columns = shape
    margin = 0.35 * size_px
    x = float(rng.uniform(margin, columns - margin))
    y = float(rng.uniform(margin, rows - margin))
    width = size_px * float(rng.uniform(0.8, 1.4))
    height = size_px * float(rng.uniform(0.6, 1.1))
    match int(rng.integers(4)):
        case 0:
            return rectangle(shape, x - width / 2, y - height / 2, x + width / 2, y + height / 2)
        case 1:
            return ellipse(shape, x, y, width / 2, height / 2, float(rng.uniform(0, np.pi)))
        case 2:
            return l_shape(shape, x - width / 2, y - height / 2, width, height)
        case _:
            return ragged(shape, x, y, size_px / 2, rng)


def _plant_some(
    rng: np.random.Generator,
    canvas: Canvas,
    label: str,
    count: int,
    size_px: tuple[float, float],
    delta_k: tuple[float, float],
) -> None:
    """Plant up to `count` patches clear of each other; sizes are log-uniform."""
    scale = _scale(canvas.shape)
    for _ in range(count):
        for _ in range(TRIES):
            size = scale * float(np.exp(rng.uniform(*np.log(size_px))))
            mask = _any_shape(rng, canvas.shape, max(size, 7.0))
            edge = float(rng.choice([0.0, 0.8, 0.08 * size]))
            if not canvas.is_free(mask, round(8 * scale) + 3):
                continue
            profile = soften(mask, edge)
            if int((profile > 0.5).sum()) >= SMALLEST_AREA_PX:
                canvas.plant(label, profile, float(rng.uniform(*delta_k)))
                break


def _finish(
    name: str,
    rng: np.random.Generator,
    canvas: Canvas,
    around: Surroundings,
    warm: bool,
    cold: bool,
) -> Scene:
    emissivity = float(rng.uniform(0.9, 0.95))
    return Scene(
        name=name,
        temperature_c=canvas.temperature_c,
        emissivity_map=np.full(canvas.shape, emissivity),
        emissivity=emissivity,
        reflected_map_c=np.full(canvas.shape, around.reflected_c),
        reflected_c=around.reflected_c,
        air_c=around.air_c,
        humidity=around.humidity,
        distance_m=around.distance_m,
        transmittance=around.transmittance,
        warm=warm,
        cold=cold,
        planted=canvas.planted(),
    )


def wall_outside(rng: np.random.Generator, shape: Shape) -> Scene:
    """A heated building's wall on a cold morning: patches without insulation, slab edges."""
    around = outdoors(rng)
    wall_c = around.air_c + float(rng.uniform(0.5, 2.5))
    canvas = Canvas(wall_c + slow_field(shape, rng, float(rng.uniform(0.2, 0.6))))
    patches = int(rng.integers(0, 4))
    _plant_some(rng, canvas, "missing insulation", patches, (22.0, 60.0), (2.2, 6.0))
    if rng.random() < 0.5:
        _plant_slab_edge(rng, canvas)
    return _finish("wall_outside", rng, canvas, around, warm=True, cold=False)


def _plant_slab_edge(rng: np.random.Generator, canvas: Canvas) -> None:
    """A long thin warm strip, level, where a floor slab meets the wall."""
    rows, columns = canvas.shape
    scale = _scale(canvas.shape)
    for _ in range(TRIES):
        length = float(rng.uniform(40.0, 120.0)) * scale
        x0 = float(rng.uniform(0.0, columns - length))
        y0 = float(rng.uniform(0.1, 0.9)) * rows
        thick = max(3.0, float(rng.uniform(4.0, 7.0)) * scale)
        mask = rectangle(canvas.shape, x0, y0, x0 + length, y0 + thick)
        if canvas.is_free(mask, round(8 * scale) + 3):
            canvas.plant("slab edge", soften(mask, 0.6), float(rng.uniform(2.2, 4.5)))
            return


def room_inside(rng: np.random.Generator, shape: Shape) -> Scene:
    """A room's outer wall, colder towards the floor, with damp or leaking patches."""
    around = indoors(rng)
    y, _ = grid(shape)
    towards_floor = -float(rng.uniform(0.3, 1.2)) * (y / shape[0]) ** 2
    wall_c = around.air_c - float(rng.uniform(0.8, 2.2))
    canvas = Canvas(wall_c + towards_floor + slow_field(shape, rng, float(rng.uniform(0.1, 0.4))))
    patches = int(rng.integers(0, 4))
    _plant_some(rng, canvas, "damp or leak", patches, (16.0, 50.0), (-5.5, -2.2))
    return _finish("room_inside", rng, canvas, around, warm=False, cold=True)


def facade(rng: np.random.Generator, shape: Shape) -> Scene:
    """A hard outside: masonry courses, panes that mirror the sky, a sunned strip, weak patches."""
    around = outdoors(rng)
    scale = _scale(shape)
    wall_c = around.air_c + float(rng.uniform(0.5, 2.0))
    background = wall_c + slow_field(shape, rng, float(rng.uniform(0.4, 0.8)))
    background += courses(rng, shape, float(rng.uniform(0.06, 0.18)))
    background += _sunned_strip(rng, shape, 0.75 * MIN_DELTA_K)
    canvas = Canvas(background)
    panes = _panes(rng, shape)
    zones = []
    for number, (x0, y0, x1, y1) in enumerate(panes, start=1):
        mask = rectangle(shape, x0, y0, x1, y1)
        canvas.temperature_c[mask] += float(rng.uniform(1.0, 6.0))
        canvas.take(mask)
        out = round(3 * scale) + 1
        polygon = (
            (x0 - out, y0 - out),
            (x1 + out, y0 - out),
            (x1 + out, y1 + out),
            (x0 - out, y1 + out),
        )
        canvas.take(rectangle(shape, x0 - out, y0 - out, x1 + out, y1 + out))
        zones.append(Zone(f"glazing {number}", polygon, ignore=True))
    weakest = CLEARLY * MIN_DELTA_K
    count = int(rng.integers(1, 5))
    _plant_some(rng, canvas, "defect", count, (8.0, 42.0), (weakest, 2.6 * MIN_DELTA_K))
    scene = _finish("facade", rng, canvas, around, warm=True, cold=False)
    scene.zones = zones
    sky_c = around.air_c - float(rng.uniform(18.0, 32.0))
    for x0, y0, x1, y1 in panes:
        glass = rectangle(shape, x0, y0, x1, y1)
        scene.emissivity_map[glass] = 0.84
        scene.reflected_map_c[glass] = sky_c
    return scene


def courses(rng: np.random.Generator, shape: Shape, height_k: float) -> FloatArray:
    """Mortar joints, a little warmer: level courses, upright joints staggered by half a brick."""
    scale = _scale(shape)
    course = max(4, round(8 * scale))
    brick = max(8, round(22 * scale))
    rows, columns = np.indices(shape)
    rows = rows + int(rng.integers(course))
    number = rows // course
    level = (rows % course) == 0
    upright = ((columns + (number % 2) * (brick // 2)) % brick) == 0
    return np.asarray(height_k * (level | upright), dtype=float)


def _sunned_strip(rng: np.random.Generator, shape: Shape, height_k: float) -> FloatArray:
    """A broad upright strip that the low sun still reaches: soft edges, below the threshold."""
    _, x = grid(shape)
    columns = shape[1]
    middle = float(rng.uniform(0.0, 1.0)) * columns
    half = float(rng.uniform(0.12, 0.3)) * columns
    edge = 0.04 * columns
    inside = 0.5 * (np.tanh((x - middle + half) / edge) - np.tanh((x - middle - half) / edge))
    return np.asarray(height_k * inside + np.zeros(shape), dtype=float)


def _panes(rng: np.random.Generator, shape: Shape) -> list[tuple[int, int, int, int]]:
    """One to three panes, one in each third of the width."""
    rows, columns = shape
    scale = _scale(shape)
    panes = []
    for third in range(int(rng.integers(1, 4))):
        width = round(float(rng.uniform(30.0, 48.0)) * scale)
        height = round(float(rng.uniform(40.0, 60.0)) * scale)
        low = third * columns // 3 + round(10 * scale)
        x0 = low + int(rng.integers(0, max(1, round(18 * scale))))
        y0 = round(20 * scale) + int(rng.integers(0, max(1, rows - height - round(40 * scale))))
        panes.append((x0, y0, x0 + width, y0 + height))
    return panes


def corner(rng: np.random.Generator, shape: Shape) -> Scene:
    """A hard inside: ceiling and two walls with small steps, studs, weak and ragged patches.

    Steps and studs stay below the threshold; the steps are natural places for a false finding.
    """
    around = indoors(rng)
    scale = _scale(shape)
    y, x = grid(shape)
    rows, columns = shape
    edge_x = float(rng.uniform(0.3, 0.7)) * columns
    ceiling_y = float(rng.uniform(0.15, 0.3)) * rows
    wall_c = around.air_c - float(rng.uniform(0.8, 1.8))
    step_wall = -float(rng.uniform(0.15, 0.45)) * MIN_DELTA_K
    step_ceiling = float(rng.uniform(0.15, 0.45)) * MIN_DELTA_K
    background = wall_c + slow_field(shape, rng, 0.25)
    background += np.where(x > edge_x, step_wall, 0.0) + np.where(y < ceiling_y, step_ceiling, 0.0)
    reach = 10.0 * scale
    drop = 0.35 * MIN_DELTA_K
    background -= drop * np.exp(-np.abs(x - edge_x) / reach)
    background -= 0.5 * drop * np.exp(-np.abs(y - ceiling_y) / reach)
    spacing = float(rng.uniform(52.0, 68.0)) * scale
    stud = ((x - edge_x - 0.5 * spacing) % spacing) < max(2.0, 4.0 * scale)
    background -= np.where(stud & (y > ceiling_y), 0.35 * MIN_DELTA_K, 0.0)
    canvas = Canvas(np.asarray(gaussian_filter(background, 1.2, mode="nearest"), dtype=float))
    weakest = CLEARLY * MIN_DELTA_K
    _plant_some(
        rng,
        canvas,
        "leak or damp",
        int(rng.integers(0, 4)),
        (9.0, 40.0),
        (-2.8 * MIN_DELTA_K, -weakest),
    )
    return _finish("corner", rng, canvas, around, warm=False, cold=True)
