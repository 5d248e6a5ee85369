"""What passes between the parts of the simulator."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tests.simulator.camera import Window
from tests.simulator.spectral import FloatArray

Shape = tuple[int, int]
Box = tuple[int, int, int, int]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True)
class Planted:
    """One planted anomaly: its height, and where its profile is above half of that height."""

    label: str
    sense: str
    delta_k: float
    area_px: int
    bbox_px: Box
    true_extreme_c: float

    def as_dict(self) -> dict[str, Any]:
        """The keys of truth.json."""
        return {
            "label": self.label,
            "sense": self.sense,
            "delta_k": self.delta_k,
            "area_px": self.area_px,
            "bbox_px": list(self.bbox_px),
            "true_extreme_c": self.true_extreme_c,
        }


@dataclass(frozen=True)
class Zone:
    """A zone of the sheet; `emissivity` is the true one, None where the image's own holds."""

    name: str
    polygon: tuple[tuple[float, float], ...]
    like: str | None = None
    ignore: bool = False
    emissivity: float | None = None
    load_a: float | None = None
    rated_a: float | None = None
    role: str | None = None


@dataclass
class Scene:
    """The truth of one image: per-pixel temperature and emissivity, and the path to the camera."""

    name: str
    temperature_c: FloatArray
    emissivity_map: FloatArray
    emissivity: float
    reflected_map_c: FloatArray
    reflected_c: float
    air_c: float
    humidity: float
    distance_m: float
    transmittance: float
    warm: bool
    cold: bool
    planted: list[Planted] = field(default_factory=list)
    zones: list[Zone] = field(default_factory=list)
    window: Window | None = None

    @property
    def shape(self) -> Shape:
        """Rows and columns."""
        rows, columns = self.temperature_c.shape
        return rows, columns


@dataclass(frozen=True)
class SheetInputs:
    """What the survey sheet says of one image, with the standard uncertainties that it states."""

    emissivity: float
    reflected_c: float
    air_c: float
    humidity: float
    distance_m: float
    zone_emissivity: tuple[float | None, ...] = ()
    u_emissivity: float = 0.02
    u_reflected_k: float = 1.0
    u_air_k: float = 0.5
    u_offset_k: float = 0.5


@dataclass
class Simulated:
    """One simulated image: the readings (degC), the truth behind them and what the sheet says."""

    reading_c: FloatArray
    scene: Scene
    sheet: SheetInputs
    offset_k: float
    noise_k: float

    def truth(self, file: str) -> dict[str, Any]:
        """The entry of truth.json."""
        scene = self.scene
        return {
            "file": file,
            "scene": scene.name,
            "inputs": {
                "emissivity": scene.emissivity,
                "reflected_c": scene.reflected_c,
                "air_c": scene.air_c,
                "humidity": scene.humidity,
                "distance_m": scene.distance_m,
                "transmittance": scene.transmittance,
            },
            "planted": [planted.as_dict() for planted in scene.planted],
            "sense": [scene.warm, scene.cold],
            "true_median_c": float(np.median(scene.temperature_c)),
            "offset_k": self.offset_k,
        }
