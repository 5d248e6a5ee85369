"""Findings of known type, drawn from the words of EN 13187 and ISO 6781; nothing of the package.

Missing insulation: regular, well defined, even. Air leakage: irregular edges, strong variation,
streaks and fans from a joint. Moisture: mottled, diffuse edge. Thermal bridge: narrow and straight,
or where structural lines meet in a corner.
"""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter

Array = NDArray[np.float64]
SHAPE = (180, 240)


def draw(kind: str, seed: int) -> Array:
    """An image, degC, with one finding of a kind; size, place, turn, sense and blur are drawn."""
    rng = np.random.default_rng([seed, sorted(KINDS).index(kind)])
    profile = KINDS[kind](rng)
    profile = profile / profile.max()
    height_k = float(rng.uniform(2.2, 6.0)) * float(rng.choice([-1.0, 1.0]))
    image = 19.0 + _cloud(rng, 60.0) * float(rng.uniform(0.05, 0.15)) + height_k * profile
    image = gaussian_filter(image, float(rng.uniform(0.6, 1.2)), mode="nearest")
    return np.asarray(image + rng.normal(0.0, float(rng.uniform(0.03, 0.1)), SHAPE))


def missing_insulation(rng: np.random.Generator) -> Array:
    """A bay, an L of bays, or a slanted bay: straight sides, even inside, softened by the wall."""
    along, across = _turned(rng, *_middle(rng, 60))
    height = float(rng.uniform(24.0, 60.0))
    width = height * float(rng.uniform(0.45, 1.0))
    a, b = along / height, across / width
    match int(rng.integers(4)):
        case 0 | 1:
            inside = (abs(a) < 0.5) & (abs(b) < 0.5)
        case 2:
            inside = (abs(a) < 0.5) & (abs(b) < 0.5)
            inside &= (a < float(rng.uniform(-0.1, 0.1))) | (b < float(rng.uniform(-0.1, 0.1)))
        case _:
            inside = (abs(a) < 0.5) & (b > -0.5) & (b < 0.3 + float(rng.uniform(-0.4, 0.4)) * a)
    soft = gaussian_filter(inside.astype(float), float(rng.uniform(0.8, 2.5)))
    return np.asarray(soft * (1.0 + 0.03 * _cloud(rng, 0.3 * width)))


def air_leakage(rng: np.random.Generator) -> Array:
    """One to four jets from a joint; each wavers, widens and fades, with torn edges."""
    along, across = _turned(rng, *_middle(rng, 50))
    total = np.zeros(SHAPE)
    reach = float(rng.uniform(22.0, 55.0))
    for _ in range(int(rng.integers(1, 5))):
        start = float(rng.normal(0.0, 0.25 * reach))
        lean = float(rng.normal(0.0, 0.25))
        length = reach * float(rng.uniform(0.6, 1.1))
        spread = float(rng.uniform(0.08, 0.30))
        waver = sum(
            float(rng.normal(0.0, 1.2)) * np.sin(along / float(rng.uniform(4.0, 12.0)) + phase)
            for phase in rng.uniform(0.0, 6.3, 3)
        )
        half = float(rng.uniform(2.5, 5.0)) + spread * np.maximum(along, 0.0)
        off = across - start - lean * along - waver * np.clip(along / 10.0, 0.0, 1.0)
        jet = np.exp(-0.5 * (off / half) ** 2) * np.exp(-np.maximum(along, 0.0) / length)
        total = np.maximum(total, jet * float(rng.uniform(0.6, 1.0)) * (along > 0.0))
    torn = np.clip(1.0 + float(rng.uniform(0.2, 0.4)) * _cloud(rng, 3.5), 0.1, None)
    return np.asarray(gaussian_filter(total * torn, 0.8))


def moisture(rng: np.random.Generator) -> Array:
    """A stain of one to three merging blots: wandering outline, diffuse edge, mottled inside."""
    y, x = _middle(rng, 60)
    radius = float(rng.uniform(13.0, 34.0))
    inside = np.zeros(SHAPE, bool)
    for _ in range(int(rng.integers(1, 4))):
        dy, dx = y - rng.normal(0.0, 0.5 * radius), x - rng.normal(0.0, 0.5 * radius)
        angle = np.arctan2(dy, dx)
        reach = np.ones(SHAPE)
        for order in range(2, 6):
            wave = np.cos(order * angle + float(rng.uniform(0.0, 6.3)))
            reach += float(rng.normal(0.0, 0.18 / np.sqrt(order))) * wave
        inside |= np.hypot(dy, dx) < radius * float(rng.uniform(0.6, 1.0)) * np.maximum(reach, 0.4)
    soft = gaussian_filter(inside.astype(float), radius * float(rng.uniform(0.18, 0.32)))
    mottled = 1.0 + float(rng.uniform(0.08, 0.2)) * _cloud(
        rng, radius * float(rng.uniform(0.12, 0.25))
    )
    return np.asarray(soft * np.clip(mottled, 0.2, None))


def thermal_bridge(rng: np.random.Generator) -> Array:
    """A stud or slab edge: a narrow straight strip; or a corner where two or three edges meet."""
    if rng.random() < 0.65:
        along, across = _turned(rng, *_middle(rng, 70))
        thick = float(rng.uniform(4.0, 10.0))
        length = thick * float(rng.uniform(6.0, 20.0))
        strip = (abs(across) < 0.5 * thick) & (abs(along) < 0.5 * length)
        soft = gaussian_filter(strip.astype(float), float(rng.uniform(0.8, 2.0)))
        return np.asarray(soft * (1.0 + 0.04 * _cloud(rng, thick)))
    y, x = _middle(rng, 60)
    first = float(rng.uniform(0.0, 2.0 * np.pi))
    turns = [0.0, float(rng.uniform(1.2, 2.4)), float(rng.uniform(3.4, 5.0))]
    decay = float(rng.uniform(4.0, 8.0))
    far = float(rng.uniform(0.25, 0.4))
    total = np.zeros(SHAPE)
    for turn in turns[: int(rng.integers(2, 4))]:
        along = x * np.cos(first + turn) + y * np.sin(first + turn)
        across = -x * np.sin(first + turn) + y * np.cos(first + turn)
        distance = np.where(along > 0.0, abs(across), np.hypot(along, across))
        fall = far + (1.0 - far) * np.exp(-np.hypot(x, y) / (2.5 * decay))
        total += fall * np.exp(-distance / decay)
    return total


KINDS: dict[str, Callable[[np.random.Generator], Array]] = {
    "missing insulation": missing_insulation,
    "air leakage": air_leakage,
    "moisture": moisture,
    "thermal bridge": thermal_bridge,
}


def _middle(rng: np.random.Generator, margin: float) -> tuple[Array, Array]:
    """Pixel coordinates y and x from a random place at least a margin inside the image."""
    rows, columns = SHAPE
    y, x = np.mgrid[0:rows, 0:columns].astype(float)
    return (
        y - float(rng.uniform(margin, rows - margin)),
        x - float(rng.uniform(margin, columns - margin)),
    )


def _turned(rng: np.random.Generator, y: Array, x: Array) -> tuple[Array, Array]:
    turn = float(rng.uniform(0.0, 2.0 * np.pi))
    return x * np.cos(turn) + y * np.sin(turn), -x * np.sin(turn) + y * np.cos(turn)


def _cloud(rng: np.random.Generator, length_px: float) -> Array:
    """Random field of standard deviation 1 with structure of about this length."""
    field = gaussian_filter(rng.normal(0.0, 1.0, SHAPE), max(length_px, 1.0), mode="wrap")
    return np.asarray((field - field.mean()) / field.std())
