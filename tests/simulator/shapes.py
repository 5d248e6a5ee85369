"""Profiles between 0 and 1, slow backgrounds, and the planting of anomalies."""

import numpy as np
from scipy.ndimage import binary_dilation, gaussian_filter

from tests.simulator.records import BoolArray, Box, Planted, Shape
from tests.simulator.spectral import FloatArray


def grid(shape: Shape) -> tuple[FloatArray, FloatArray]:
    """Pixel-centre coordinates y (rows, 1) and x (1, columns), corner-based."""
    rows, columns = shape
    y = np.asarray(np.arange(rows)[:, None] + 0.5, dtype=np.float64)
    x = np.asarray(np.arange(columns)[None, :] + 0.5, dtype=np.float64)
    return y, x


def rectangle(shape: Shape, x0: float, y0: float, x1: float, y1: float) -> BoolArray:
    """Pixels whose centre lies in the rectangle."""
    y, x = grid(shape)
    return np.asarray((x >= x0) & (x < x1) & (y >= y0) & (y < y1), dtype=bool)


def ellipse(
    shape: Shape, x: float, y: float, half_x: float, half_y: float, turn_rad: float = 0.0
) -> BoolArray:
    """Pixels whose centre lies in a turned ellipse."""
    rows, columns = grid(shape)
    dx, dy = columns - x, rows - y
    along = dx * np.cos(turn_rad) + dy * np.sin(turn_rad)
    across = -dx * np.sin(turn_rad) + dy * np.cos(turn_rad)
    return np.asarray((along / half_x) ** 2 + (across / half_y) ** 2 <= 1.0, dtype=bool)


def l_shape(shape: Shape, x0: float, y0: float, width: float, height: float) -> BoolArray:
    """An upright L: a leg of a third of the width, and a foot of a third of the height."""
    leg = rectangle(shape, x0, y0, x0 + width / 3.0, y0 + height)
    foot = rectangle(shape, x0, y0 + 2.0 * height / 3.0, x0 + width, y0 + height)
    return leg | foot


def ragged(shape: Shape, x: float, y: float, radius: float, rng: np.random.Generator) -> BoolArray:
    """A blob whose outline wanders by about a quarter of its radius."""
    rows, columns = grid(shape)
    dx, dy = columns - x, (rows - y) * rng.uniform(0.8, 1.5)
    angle = np.arctan2(dy, dx)
    outline = np.ones_like(angle)
    for order in range(2, 8):
        outline += rng.normal(0.0, 0.22 / np.sqrt(order)) * np.cos(
            order * angle + rng.uniform(0.0, 2.0 * np.pi)
        )
    return np.asarray(np.hypot(dx, dy) <= radius * np.maximum(outline, 0.35), dtype=bool)


def soften(mask: BoolArray, edge_px: float) -> FloatArray:
    """A profile with its greatest value 1 from a mask, with edges about 2.5 edge_px wide."""
    profile = mask.astype(float)
    if edge_px > 0.0:
        profile = np.asarray(gaussian_filter(profile, edge_px, mode="nearest"), dtype=float)
    return np.asarray(profile / profile.max(), dtype=float)


def slow_field(shape: Shape, rng: np.random.Generator, spread_k: float) -> FloatArray:
    """A gentle background of a few long waves, zero mean, about +/- spread_k."""
    y, x = grid(shape)
    longest = float(max(shape))
    total = np.zeros(shape)
    for _ in range(5):
        waves_y, waves_x = rng.uniform(-0.9, 0.9, 2)
        phase = rng.uniform(0.0, 2.0 * np.pi)
        total += rng.normal() * np.cos(2 * np.pi * (waves_y * y + waves_x * x) / longest + phase)
    total -= total.mean()
    return np.asarray(total * (spread_k / np.abs(total).max()), dtype=float)


def half_height_box(profile: FloatArray) -> tuple[int, Box]:
    """Count of the pixels above half height and the box (x0, y0, x1, y1) around them."""
    above = profile > 0.5
    ys, xs = np.nonzero(above)
    box = (int(xs.min()), int(ys.min()), int(xs.max()) + 1, int(ys.max()) + 1)
    return int(above.sum()), box


class Canvas:
    """A temperature image that remembers what was planted and which pixels are taken."""

    def __init__(self, temperature_c: FloatArray) -> None:
        self.temperature_c = temperature_c.copy()
        self.taken: BoolArray = np.zeros(temperature_c.shape, dtype=bool)
        self._profiles: list[tuple[str, float, FloatArray]] = []

    @property
    def shape(self) -> Shape:
        """Rows and columns."""
        rows, columns = self.temperature_c.shape
        return rows, columns

    def is_free(self, mask: BoolArray, margin_px: int) -> bool:
        """Whether the mask, with a margin, keeps clear of everything taken before."""
        return bool(mask.any()) and not bool(np.any(self.taken & _widen(mask, margin_px)))

    def take(self, mask: BoolArray) -> None:
        """Keep later anomalies away from these pixels."""
        self.taken |= mask

    def plant(self, label: str, profile: FloatArray, delta_k: float) -> None:
        """Add an anomaly of this height (negative: cold) and mark its pixels as taken."""
        self.temperature_c += delta_k * profile
        self.taken |= profile > 0.05
        self._profiles.append((label, delta_k, profile))

    def planted(self) -> list[Planted]:
        """The anomalies, with extremes read from the finished temperature image."""
        found = []
        for label, delta_k, profile in self._profiles:
            area, box = half_height_box(profile)
            inside = self.temperature_c[profile > 0.5]
            extreme = float(inside.max() if delta_k > 0 else inside.min())
            sense = "hot" if delta_k > 0 else "cold"
            found.append(Planted(label, sense, float(delta_k), area, box, extreme))
        return found


def _widen(mask: BoolArray, margin_px: int) -> BoolArray:
    if margin_px <= 0:
        return mask
    return np.asarray(binary_dilation(mask, iterations=margin_px), dtype=bool)
