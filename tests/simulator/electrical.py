"""Electrical scenes: panels of like poles, busbars of low emissivity, crowded boards."""

from typing import Final

import numpy as np

from tests.simulator.records import Scene, Shape, Zone
from tests.simulator.shapes import Canvas, ellipse, grid, rectangle, slow_field, soften
from tests.simulator.surroundings import Surroundings, switch_room

MIN_DELTA_K: Final = 3.0
"""The threshold that the sheets of electrical surveys state."""

CLEARLY: Final = 1.6
PAINTED: Final = 0.93
Bounds = tuple[float, float, float, float]


def _scale(shape: Shape) -> float:
    return shape[0] / 240.0


def _polygon(x0: float, y0: float, x1: float, y1: float) -> tuple[tuple[float, float], ...]:
    return ((x0, y0), (x1, y0), (x1, y1), (x0, y1))


def _finish(name: str, canvas: Canvas, around: Surroundings, zones: list[Zone]) -> Scene:
    return Scene(
        name=name,
        temperature_c=canvas.temperature_c,
        emissivity_map=np.full(canvas.shape, PAINTED),
        emissivity=PAINTED,
        reflected_map_c=np.full(canvas.shape, around.reflected_c),
        reflected_c=around.reflected_c,
        air_c=around.air_c,
        humidity=around.humidity,
        distance_m=around.distance_m,
        transmittance=around.transmittance,
        warm=True,
        cold=False,
        planted=canvas.planted(),
        zones=zones,
    )


def _plant_joint(
    rng: np.random.Generator, canvas: Canvas, bounds: Bounds, label: str, delta_k: float
) -> None:
    """A hot joint inside a part: an ellipse with edges softened by conduction."""
    x0, y0, x1, y1 = bounds
    width, height = x1 - x0, y1 - y0
    half_x = width * float(rng.uniform(0.28, 0.42)) if width < height else height * 0.5
    half_y = min(width, height) * float(rng.uniform(0.3, 0.42))
    half_x = max(half_x, 2.8)
    half_y = max(half_y, 2.8)
    x = float(rng.uniform(x0 + half_x, max(x0 + half_x + 0.1, x1 - half_x)))
    y = float(rng.uniform(y0 + half_y, max(y0 + half_y + 0.1, y1 - half_y)))
    mask = ellipse(canvas.shape, x, y, half_x, half_y)
    canvas.plant(label, soften(mask, 0.9 * _scale(canvas.shape)), delta_k)


def _some_heat(rng: np.random.Generator) -> float:
    """A joint's rise: from just clear of the threshold to a bad one, log-uniform."""
    return float(np.exp(rng.uniform(np.log(CLEARLY * MIN_DELTA_K), np.log(60.0))))


def panel(rng: np.random.Generator, shape: Shape) -> Scene:
    """Three like poles on a painted plate; one may have a hot connection."""
    around = switch_room(rng)
    scale = _scale(shape)
    plate_c = around.air_c + float(rng.uniform(3.0, 8.0))
    canvas = Canvas(plate_c + slow_field(shape, rng, 0.3))
    warmth = float(rng.uniform(5.0, 12.0))
    left, top = float(rng.uniform(30.0, 80.0)) * scale, float(rng.uniform(40.0, 110.0)) * scale
    pitch, wide, tall = float(rng.uniform(52.0, 75.0)) * scale, 20.0 * scale, 58.0 * scale
    bounds: list[Bounds] = []
    zones = []
    for number, name in enumerate("ABC"):
        x0, y0 = round(left + number * pitch), round(top)
        box = (x0, y0, x0 + round(wide), y0 + round(tall))
        pole = soften(rectangle(shape, *box), 0.8 * scale)
        canvas.temperature_c += (warmth + float(rng.normal(0.0, 0.15))) * pole
        bounds.append(box)
        zones.append(Zone(f"pole {name}", _polygon(*box), like="poles"))
    if rng.random() < 0.65:
        hot = bounds[int(rng.integers(3))]
        _plant_joint(rng, canvas, hot, "loose connection", _some_heat(rng))
    return _finish("panel", canvas, around, zones)


def busbar(rng: np.random.Generator, shape: Shape) -> Scene:
    """Three level bars of emissivity 0.35 to 0.7; one may have a bad joint."""
    around = switch_room(rng)
    scale = _scale(shape)
    plate_c = around.air_c + float(rng.uniform(2.0, 6.0))
    canvas = Canvas(plate_c + slow_field(shape, rng, 0.3))
    bar_emissivity = float(rng.uniform(0.35, 0.7))
    bar_c = plate_c + float(rng.uniform(8.0, 16.0))
    left, top = float(rng.uniform(40.0, 110.0)) * scale, float(rng.uniform(30.0, 60.0)) * scale
    inset = round(2 * scale)
    zones = []
    bounds: list[Bounds] = []
    bars = np.zeros(shape, dtype=bool)
    for number in range(3):
        x0, y0 = round(left), round(top + number * 55.0 * scale)
        box = (x0, y0, x0 + round(150 * scale), y0 + round(26 * scale))
        bar = rectangle(shape, *box)
        bars |= bar
        canvas.temperature_c[bar] = bar_c
        inner = (box[0] + inset, box[1] + inset, box[2] - inset, box[3] - inset)
        bounds.append(inner)
        zones.append(
            Zone(f"bar {number + 1}", _polygon(*inner), like="bars", emissivity=bar_emissivity)
        )
    if rng.random() < 0.65:
        hot = bounds[int(rng.integers(3))]
        _plant_joint(rng, canvas, hot, "bad joint", _some_heat(rng))
    scene = _finish("busbar", canvas, around, zones)
    scene.emissivity_map[bars] = bar_emissivity
    return scene


def board(rng: np.random.Generator, shape: Shape) -> Scene:
    """A hard board: two rows of six like parts, unequally warm by nature, cables to leave out."""
    around = switch_room(rng)
    scale = _scale(shape)
    plate_c = around.air_c + float(rng.uniform(2.0, 7.0))
    canvas = Canvas(plate_c + slow_field(shape, rng, 0.5))
    y, _ = grid(shape)
    zones = []
    bounds: list[Bounds] = []
    for row_name, top in (("upper", 40.0), ("lower", 145.0)):
        warmth = float(rng.uniform(4.0, 7.0))
        for number in range(6):
            x0, y0 = round((24.0 + 46.0 * number) * scale), round(top * scale)
            box = (x0, y0, x0 + round(22 * scale), y0 + round(48 * scale))
            own = warmth + float(rng.normal(0.0, 0.2 * MIN_DELTA_K))
            canvas.temperature_c += own * soften(rectangle(shape, *box), 1.0 * scale)
            wire = (x0 + 7.5 * scale, box[3], x0 + 14.5 * scale, box[3] + 24.0 * scale)
            fade = np.exp(-np.maximum(y - box[3], 0.0) / (40.0 * scale))
            canvas.temperature_c += 0.5 * own * fade * soften(rectangle(shape, *wire), 1.0 * scale)
            bounds.append(box)
            zones.append(Zone(f"{row_name} {number + 1}", _polygon(*box), like=row_name))
            clear = 3.0 * scale
            cable = (wire[0] - clear, wire[1] + 1.0, wire[2] + clear, wire[3] + clear)
            zones.append(
                Zone(
                    f"{row_name} cable {number + 1}",
                    _polygon(*(float(round(edge)) for edge in cable)),
                    ignore=True,
                )
            )
    chosen = rng.permutation(len(bounds))[: int(rng.integers(0, 4))]
    for index in chosen:
        _plant_joint(rng, canvas, bounds[int(index)], "hot joint", 1.2 * _some_heat(rng))
    return _finish("board", canvas, around, zones)
