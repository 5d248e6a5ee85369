"""What the report says of an image as a whole."""

import math
from dataclasses import replace

import numpy as np

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.measure.spot import spot_of_median, temperature_of
from thermo_fix.measure.words import UNITS
from thermo_fix.radiometry.surface import pixel_footprint_m
from thermo_fix.records import (
    Camera,
    CorrectedFrame,
    ImageResult,
    InputLine,
    Limit,
    SceneInputs,
)
from thermo_fix.uncertainty.equation import MeasurementEquation


def measure_image(
    corrected: CorrectedFrame, notes: tuple[str, ...], camera: Camera | None = None
) -> ImageResult:
    """Sum up a corrected image, without its findings.

    Parameters
    ----------
    corrected
        The image.
    notes
        What was said when it was read.
    camera
        For the footprint.

    Returns
    -------
    ImageResult
        Least, median and greatest surface temperature leave out ignored zones; the uncertainty
        of the median is that of the zone, or the rest of the image, with the most pixels.

    """
    job, frame = corrected.job, corrected.frame
    rows, columns = frame.shape
    usable = np.isfinite(corrected.surface_k) & ~corrected.ignored
    result = ImageResult(
        file=job.file,
        status="done",
        sha256=frame.sha256,
        asset=job.asset,
        note=job.note,
        taken=job.taken or frame.taken,
        width=columns,
        height=rows,
        inputs=_input_lines(corrected),
        unsolved_px=corrected.unsolved_px,
        notes=(*notes, *corrected.notes),
        cautions=corrected.cautions,
        zones=job.zones,
        pixel_m=_pixel_m(corrected, camera),
    )
    if not usable.any():
        return result
    surface = corrected.surface_k[usable].astype(np.float64) - ZERO_CELSIUS_K
    label = int(np.argmax(np.bincount(corrected.labels[usable])))
    where = usable & (corrected.labels == label)
    median = temperature_of(
        spot_of_median(corrected, f"median of {job.file}", label, where),
        corrected.equations[label],
    )
    u = median.u
    reading = float(np.median(corrected.reading_k[usable].astype(np.float64)))
    return replace(
        result,
        min_c=float(surface.min()),
        median_c=float(np.median(surface)),
        max_c=float(surface.max()),
        u_median_k=u if math.isfinite(u) else None,
        recorded_median_c=reading - ZERO_CELSIUS_K,
    )


def _pixel_m(corrected: CorrectedFrame, camera: Camera | None) -> float | None:
    distance = corrected.inputs[0].values.get("distance_m")
    if (
        camera is None
        or camera.ifov_mrad is None
        or distance is None
        or distance.value <= 0.0
        or distance.origin == "assumed"
    ):
        return None
    return pixel_footprint_m(camera.ifov_mrad, distance.value)


def _input_lines(corrected: CorrectedFrame) -> tuple[InputLine, ...]:
    lines: list[InputLine] = []
    wheres = ["whole image", *(f"zone {zone.name}" for zone in corrected.job.zones)]
    for label, (where, inputs) in enumerate(zip(wheres, corrected.inputs, strict=True)):
        if label and corrected.job.zones[label - 1].ignore:
            continue
        for key, given in inputs.values.items():
            # A zone lists only what differs from the rest of the image.
            if label and corrected.inputs[0].values.get(key) == given:
                continue
            lines.append(
                InputLine(
                    key=key,
                    where=where,
                    value=None if math.isnan(given.value) else given.value,
                    text=_text(key, inputs),
                    u=given.u,
                    unit=UNITS.get(key, ""),
                    origin=given.origin,
                    note=given.note,
                )
            )
        lines += _fact_lines(inputs, corrected.inputs[0] if label else None, where)
        if label == 0:
            lines += _computed_lines(corrected.equations[0])
    encoding = corrected.frame.encoding
    lines.append(
        InputLine(
            key="pixel",
            where="whole image",
            value=None,
            text=encoding.unit
            if encoding.unit != "linear"
            else f"kelvin = {encoding.scale:g} x count + {encoding.offset:g}",
            u=None,
            unit="",
            origin=encoding.origin,
            note=encoding.note,
        )
    )
    return tuple(lines)


def _fact_lines(inputs: SceneInputs, outer: SceneInputs | None, where: str) -> list[InputLine]:
    """Return what was stated and is no measured quantity; a zone lists what differs."""
    lines = []
    for key in ("outdoors", "limit", "target_load_a", "design_air_c"):
        stated = getattr(inputs, key)
        if stated is None or (outer is not None and getattr(outer, key) == stated):
            continue
        unit, number, text = UNITS.get(key, ""), None, ""
        if isinstance(stated, bool):
            text = "yes" if stated else "no"
        elif isinstance(stated, Limit):
            rise = stated.temperature_c is None
            unit, text = "K" if rise else "degC", stated.name
            number = stated.rise_k if rise else stated.temperature_c
        else:
            number = stated
        lines.append(InputLine(key, where, number, text, None, unit, "given"))
    return lines


def _text(key: str, inputs: SceneInputs) -> str:
    if key == "emissivity" and inputs.emissivity_file is not None:
        return f"per pixel, from {inputs.emissivity_file.name}"
    if key == "reflected_c" and inputs.reflected_file is not None:
        return f"per pixel, from {inputs.reflected_file.name}"
    if key == "emissivity" and inputs.surface:
        return inputs.surface
    return ""


def _computed_lines(equation: MeasurementEquation) -> list[InputLine]:
    if not equation.uses_air_formula:
        return []
    return [
        InputLine(
            key="transmittance",
            where="whole image",
            value=equation.transmittance,
            text="",
            u=equation.air_formula_u,
            unit="1",
            origin="computed",
            note="from air temperature, humidity and distance; uncertainty of the formula alone",
        )
    ]
