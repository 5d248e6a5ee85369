"""Simulated images through the program's own stages, without a file.

The simulator says what a survey sheet would say; here that becomes the program's records, with the
standard uncertainties that the simulator states (and that it drew the inputs with).
"""

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tests.simulator import SheetInputs, Simulated, Zone
from tests.simulator.scenes import KINDS
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct import correct_frame, radiation_models
from thermo_fix.defaults import default_for
from thermo_fix.records import (
    Camera,
    CorrectedFrame,
    DetectSettings,
    Encoding,
    Frame,
    ImageJob,
    Input,
    ModelName,
    Recorded,
    SceneInputs,
)
from thermo_fix.records import Zone as SheetZone
from thermo_fix.sheet.zones import label_zones

Kelvins = NDArray[np.float32]


def given(key: str, value: float, u: float, scope: str = "image") -> Input:
    """An input that the sheet states with its uncertainty."""
    return Input(key, value, u, "given", scope, "given")


def scene_inputs(**values: tuple[float, float]) -> SceneInputs:
    """Inputs as (value, u) by sheet key; what is absent is exact and harmless."""
    harmless = {
        "emissivity": (0.95, 0.0),
        "reflected_c": (20.0, 0.0),
        "air_c": (20.0, 0.0),
        "transmittance": (1.0, 0.0),
    }
    if "distance_m" in values:
        del harmless["transmittance"]
    return SceneInputs(
        {key: given(key, *pair, scope="scene") for key, pair in (harmless | values).items()}
    )


def with_emissivity(inputs: SceneInputs, value: float, u: float, scope: str) -> SceneInputs:
    """The same inputs with another judgement of the emissivity."""
    changed: Mapping[str, Input] = {
        **inputs.values,
        "emissivity": given("emissivity", value, u, scope),
    }
    return replace(inputs, values=changed)


def corrected_image(
    reading_c: NDArray[np.floating],
    inputs: SceneInputs,
    camera: Camera,
    model: ModelName = "band",
    zones: tuple[SheetZone, ...] = (),
    detect: DetectSettings | None = None,
) -> CorrectedFrame:
    """Correct readings in degC, (rows, columns), as the correct stage does."""
    path = Path("simulated.tif")
    job = ImageJob(path.name, path, inputs, zones, detect or DetectSettings())
    reading_k: Kelvins = (np.asarray(reading_c) + ZERO_CELSIUS_K).astype(np.float32)
    frame = Frame(path, reading_k, Encoding("kelvin", 1.0, 0.0, "given"), sha256="0" * 64)
    shape = frame.shape
    return correct_frame(
        frame,
        reading_k,
        job,
        label_zones(zones, shape),
        camera,
        radiation_models(model, camera),
    )


def sheet_of(image: Simulated, sheet: SheetInputs, name: str) -> SceneInputs:
    """What the loader would make of the simulator's sheet of one image."""
    scope = f"image {name}"
    stated = {
        "emissivity": (sheet.emissivity, sheet.u_emissivity),
        "reflected_c": (sheet.reflected_c, sheet.u_reflected_k),
        "air_c": (sheet.air_c, sheet.u_air_k),
        "humidity": (sheet.humidity, default_for("humidity").u_for(sheet.humidity)),
        "distance_m": (sheet.distance_m, default_for("distance_m").u_for(sheet.distance_m)),
    }
    assert image.scene.window is None  # no kind of simulated survey has one
    return SceneInputs({key: given(key, *pair, scope=scope) for key, pair in stated.items()})


def camera_of(kind: str, u_offset_k: float, recorded: Recorded | None = None) -> Camera:
    """A camera that states what the simulated one does: no more and no less."""
    rule = KINDS[kind]
    return Camera(
        pixel="celsius",
        band_um=(8.0, 14.0),
        ifov_mrad=1.3,
        noise_k=rule.noise_k,
        # Half-width of the rectangular distribution of that standard deviation (JCGM 100, 4.3.7).
        accuracy_k=u_offset_k * 3.0**0.5,
        accuracy_fraction=0.0,
        nonuniformity_k=rule.column_noise_k,
        recorded=recorded or Recorded(),
    )


def simulated_frame(
    kind: str,
    reading_c: NDArray[np.floating],
    image: Simulated,
    sheet: SheetInputs,
    name: str,
    model: ModelName = "band",
) -> tuple[CorrectedFrame, Camera]:
    """Correct one simulated image with the inputs that its sheet states."""
    rule = KINDS[kind]
    inputs = sheet_of(image, sheet, name)
    zones = tuple(
        _zone(zone, inputs, emissivity, sheet.u_emissivity, name)
        for zone, emissivity in zip(image.scene.zones, sheet.zone_emissivity, strict=True)
    )
    detect = DetectSettings(rule.warm, rule.cold, rule.min_delta_k, 9)
    camera = camera_of(kind, sheet.u_offset_k)
    return corrected_image(reading_c, inputs, camera, model, zones, detect), camera


def _zone(
    zone: Zone, inputs: SceneInputs, emissivity: float | None, u: float, name: str
) -> SheetZone:
    own = inputs
    if emissivity is not None:
        own = with_emissivity(inputs, emissivity, u, f"zone {zone.name} of {name}")
    return SheetZone(zone.name, zone.polygon, own, like=zone.like, ignore=zone.ignore)
