"""Simulated surveys: image after image in memory, or a folder with sheet, images and truth."""

import json
from collections.abc import Iterator
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any, Final

import numpy as np
import tifffile
from numpy.typing import NDArray
from scipy import constants

from tests.simulator.camera import Camera, RecordedSettings, exitance_at_camera, record
from tests.simulator.records import Scene, Shape, SheetInputs, Simulated
from tests.simulator.scenes import KINDS, SIZES, Kind, build_scene
from tests.simulator.spectral import RESPONSES, FloatArray, detector

U_EMISSIVITY: Final = 0.02
U_REFLECTED_K: Final = 1.0
U_AIR_K: Final = 0.5
U_OFFSET_K: Final = 0.5
ACCURACY_K: Final = U_OFFSET_K * 3.0**0.5
"""Half width of the rectangular distribution with this standard deviation (JCGM 100, 4.3.7)."""

PIXELS: Final = ("celsius", "kelvin", "linear")
TAKEN: Final = datetime(2026, 2, 3, 7, 30)


def simulate(
    scene: Scene,
    rng: np.random.Generator,
    *,
    camera: Camera,
    perturb: bool = False,
) -> Simulated:
    """One image of a scene. `perturb` draws sheet inputs and camera offset around the truth."""
    sheet = _drawn_sheet(scene, rng) if perturb else _true_sheet(scene)
    offset = float(rng.normal(0.0, U_OFFSET_K)) if perturb else camera.offset_k
    used = Camera(
        camera.response,
        camera.blur_px,
        camera.noise_k,
        camera.column_noise_k,
        camera.dead_pixels,
        offset,
        camera.recorded,
    )
    exitance = exitance_at_camera(
        detector(camera.response),
        scene.temperature_c,
        scene.emissivity_map,
        scene.reflected_map_c,
        scene.air_c,
        scene.transmittance,
        scene.window,
    )
    return Simulated(record(exitance, used, rng), scene, sheet, offset, camera.noise_k)


def _true_sheet(scene: Scene) -> SheetInputs:
    return SheetInputs(
        scene.emissivity,
        scene.reflected_c,
        scene.air_c,
        scene.humidity,
        scene.distance_m,
        tuple(zone.emissivity for zone in scene.zones),
    )


def _drawn_sheet(scene: Scene, rng: np.random.Generator) -> SheetInputs:
    """Inputs around the truth; each zone with an emissivity of its own is a draw of its own."""

    def emissivity(true: float) -> float:
        return float(np.clip(true + rng.normal(0.0, U_EMISSIVITY), 0.02, 1.0))

    return SheetInputs(
        emissivity(scene.emissivity),
        scene.reflected_c + float(rng.normal(0.0, U_REFLECTED_K)),
        scene.air_c + float(rng.normal(0.0, U_AIR_K)),
        scene.humidity,
        scene.distance_m,
        tuple(None if z.emissivity is None else emissivity(z.emissivity) for z in scene.zones),
        U_EMISSIVITY,
        U_REFLECTED_K,
        U_AIR_K,
        U_OFFSET_K,
    )


def simulated_images(
    kind: str,
    seed: int,
    count: int,
    *,
    perturb: bool = True,
    response: str = "box",
    shape: Shape | None = None,
    recorded: RecordedSettings | None = None,
) -> Iterator[tuple[FloatArray, Simulated, SheetInputs]]:
    """Yield (readings in degC, truth, sheet inputs) for `count` images, without any file.

    Every image has a stream of random numbers of its own, so a long run begins with the images of
    a short one. `shape` None draws one of three sizes for the whole run.
    """
    rule = KINDS[kind]
    size = shape or SIZES[int(np.random.default_rng([seed, 0]).integers(len(SIZES)))]
    camera = Camera(
        response,
        noise_k=rule.noise_k,
        column_noise_k=rule.column_noise_k,
        dead_pixels=rule.dead_pixels,
        recorded=recorded or RecordedSettings(),
    )
    for index in range(count):
        rng = np.random.default_rng([seed, index + 1])
        scene = build_scene(kind, index, rng, size)
        image = simulate(scene, rng, camera=camera, perturb=perturb)
        yield image.reading_c, image, image.sheet


def write_survey(
    folder: Path,
    kind: str,
    seed: int,
    images: int = 4,
    perturb: bool = False,
    response: str = "box",
    shape: Shape | None = None,
    recorded: RecordedSettings | None = None,
) -> list[dict[str, Any]]:
    """Write survey.toml, IR_0001.tif .., truth_0001.npz .. and truth.json; return the truth.

    The pixel type goes by the seed (degC, K, centikelvin), the compression by the image.
    """
    folder.mkdir(parents=True, exist_ok=True)
    settings = recorded or RecordedSettings()
    pixel = PIXELS[seed % len(PIXELS)]
    sections = [_survey_head(kind, seed, pixel, response, settings)]
    truths = []
    simulated = simulated_images(
        kind, seed, images, perturb=perturb, response=response, shape=shape, recorded=settings
    )
    for number, (reading_c, image, sheet) in enumerate(simulated, start=1):
        file = f"IR_{number:04d}.tif"
        write_tiff(
            folder / file,
            stored(reading_c, pixel),
            compression=(None, "zlib", "lzw")[(seed + number) % 3],
            taken=TAKEN + timedelta(minutes=4 * number),
        )
        np.savez_compressed(
            folder / f"truth_{number:04d}.npz",
            centikelvin=np.round(
                (image.scene.temperature_c + constants.zero_Celsius) * 100.0
            ).astype(np.uint16),
            emissivity=image.scene.emissivity_map.astype(np.float32),
        )
        truths.append(image.truth(file))
        sections.append(_survey_image(number, file, image, sheet))
    (folder / "survey.toml").write_text("\n".join(sections), encoding="utf-8")
    (folder / "truth.json").write_text(json.dumps(truths, indent=1) + "\n", encoding="utf-8")
    return truths


def stored(reading_c: FloatArray, pixel: str) -> NDArray[np.float32] | NDArray[np.uint16]:
    """Readings as the file holds them: float32 degC or K, or uint16 hundredths of a kelvin."""
    if pixel == "celsius":
        return reading_c.astype(np.float32)
    kelvin: FloatArray = reading_c + constants.zero_Celsius
    if pixel == "kelvin":
        return kelvin.astype(np.float32)
    return np.round(kelvin * 100.0).astype(np.uint16)


def write_tiff(
    path: Path,
    values: NDArray[Any],
    *,
    compression: str | None,
    taken: datetime,
    predictor: bool = False,
) -> None:
    """Write one plane with a DateTime tag and nothing that differs from run to run."""
    tifffile.imwrite(
        path,
        values,
        photometric="rgb" if values.ndim == 3 else "minisblack",
        compression=compression,
        predictor=predictor if compression else None,
        datetime=taken,
        software="simulated image",
        metadata=None,
    )


def _survey_head(
    kind: str, seed: int, pixel: str, response: str, recorded: RecordedSettings
) -> str:
    rule: Kind = KINDS[kind]
    low, high = RESPONSES[response].band_um
    linear = "scale = 0.01\noffset = 0.0\n" if pixel == "linear" else ""
    return (
        "[survey]\n"
        f'title = "Simulated {kind} survey {seed}"\n'
        f'purpose = "{rule.purpose}"\n'
        f"date = {TAKEN:%Y-%m-%d}\n\n"
        "[camera]\n"
        f'pixel = "{pixel}"\n'
        f"{linear}"
        f"band_um = [{low}, {high}]\n"
        "ifov_mrad = 1.3\n"
        f"noise_k = {rule.noise_k}\n"
        f"accuracy_k = {ACCURACY_K:.4f}\n"
        "accuracy_fraction = 0.0\n"
        f"recorded = {{ emissivity = {recorded.emissivity}, reflected_c = {recorded.reflected_c}, "
        f"air_c = {recorded.air_c}, transmittance = {recorded.transmittance} }}\n\n"
        "[radiation]\n"
        'model = "band"\n\n'
        "[scene]\n"
        "view_angle_deg = 0.0\n\n"
        "[detect]\n"
        f"warm = {str(rule.warm).lower()}\n"
        f"cold = {str(rule.cold).lower()}\n"
        f"min_delta_k = {rule.min_delta_k}\n"
        "min_area_px = 9\n"
    )


def _survey_image(number: int, file: str, image: Simulated, sheet: SheetInputs) -> str:
    lines = [
        "[[image]]",
        f'file = "{file}"',
        f'asset = "{image.scene.name} {number}"',
        f"emissivity = {{ value = {sheet.emissivity:.4f}, u = {sheet.u_emissivity} }}",
        f"reflected_c = {{ value = {sheet.reflected_c:.3f}, u = {sheet.u_reflected_k} }}",
        f"air_c = {{ value = {sheet.air_c:.3f}, u = {sheet.u_air_k} }}",
        f"humidity = {sheet.humidity:.3f}",
        f"distance_m = {sheet.distance_m:.3f}",
    ]
    for zone, emissivity in zip(image.scene.zones, sheet.zone_emissivity, strict=True):
        corners = ", ".join(f"[{x:g}, {y:g}]" for x, y in zone.polygon)
        lines += ["[[image.zone]]", f'name = "{zone.name}"', f"polygon = [{corners}]"]
        if zone.like is not None:
            lines.append(f'like = "{zone.like}"')
        if emissivity is not None:
            lines.append(f"emissivity = {{ value = {emissivity:.4f}, u = {sheet.u_emissivity} }}")
        if zone.ignore:
            lines.append("ignore = true")
    return "\n".join(lines) + "\n"
