"""Correct one image."""

from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from thermo_fix import cautions
from thermo_fix.correct.inputs import Models, equation_of, fill_sky, with_input
from thermo_fix.correct.kernel import planes_of
from thermo_fix.correct.quality import image_cautions, range_ends_k
from thermo_fix.correct.reference_zone import foil_temperature
from thermo_fix.errors import ImageError
from thermo_fix.radiometry.air import STRETCHED_BEYOND_M
from thermo_fix.radiometry.surface import STEEP_VIEW_DEG
from thermo_fix.records import (
    Camera,
    CorrectedFrame,
    Frame,
    ImageJob,
    LabelArray,
    MaskArray,
    SceneInputs,
)
from thermo_fix.uncertainty.equation import MeasurementEquation

_LOW_EMISSIVITY = 0.6


def correct_frame(
    frame: Frame,
    reading_k: NDArray[np.float32],
    job: ImageJob,
    labels: LabelArray,
    camera: Camera,
    models: Models,
    planes: Mapping[Path, NDArray[np.float32]] | None = None,
) -> CorrectedFrame:
    """Correct an image pixel by pixel for emissivity, reflected temperature, air and window.

    Parameters
    ----------
    frame
        The image as read.
    reading_k
        Its readings, (rows, columns), K.
    job
        What the sheet says of it.
    labels
        (rows, columns): 0 for the rest of the image, i + 1 for zone i.
    camera, models
        Camera and radiation models.
    planes
        Emissivity and reflected-temperature planes by path, each (rows, columns).

    Returns
    -------
    CorrectedFrame
        Surface temperature and standard uncertainty in float32; within 5 mK of the float64
        formula (tested). Pixels without a solution are NaN.

    Raises
    ------
    ImageError
        A plane of another shape, or a foil zone without pixels.

    """
    planes = planes or {}
    inputs = [
        _complete(every, job, reading_k, labels, camera, models)
        for every in (job.inputs, *(zone.inputs for zone in job.zones))
    ]
    equations = [equation_of(every, camera, models) for every in inputs]
    emissivity_planes = _planes_by_label(
        [every.emissivity_file for every in inputs], planes, frame.shape, "emissivity"
    )
    reflected_planes = _planes_by_label(
        [every.reflected_file for every in inputs], planes, frame.shape, "reflected_c"
    )
    for plane in emissivity_planes.values():
        if np.any(~((plane > 0.0) & (plane <= 1.0))):
            raise ImageError(
                f"{job.file}: its emissivity file has values that are not above 0 and at most 1; "
                "correct the file or give one number"
            )
    surface_k, uncertainty_k = _corrected_planes(
        reading_k, labels, equations, emissivity_planes, reflected_planes
    )
    uncertainty_k[np.isnan(surface_k)] = np.nan
    ends = range_ends_k(frame, reading_k, _left_out(job, labels))
    return CorrectedFrame(
        job=job,
        frame=frame,
        labels=labels,
        reading_k=reading_k,
        surface_k=surface_k,
        uncertainty_k=uncertainty_k,
        equations=tuple(equations),
        inputs=tuple(inputs),
        emissivity_planes=emissivity_planes,
        reflected_planes=reflected_planes,
        range_ends_k=ends,
        cautions=(
            *_cautions(job, inputs, equations),
            *image_cautions(
                frame, reading_k, surface_k, uncertainty_k, job, inputs, equations, camera, ends
            ),
        ),
    )


def _complete(
    inputs: SceneInputs,
    job: ImageJob,
    reading_k: NDArray[np.float32],
    labels: LabelArray,
    camera: Camera,
    models: Models,
) -> SceneInputs:
    if inputs.reflected_zone is None:
        return fill_sky(inputs)
    names = [zone.name for zone in job.zones]
    label = names.index(inputs.reflected_zone) + 1
    name = inputs.reflected_zone
    foil = foil_temperature(reading_k, labels == label, name, job.file, camera, models.model)
    return with_input(inputs, foil)


def _planes_by_label(
    paths: list[Path | None],
    planes: Mapping[Path, NDArray[np.float32]],
    shape: tuple[int, int],
    key: str,
) -> dict[int, NDArray[np.float32]]:
    found = {}
    for label, path in enumerate(paths):
        if path is None:
            continue
        plane = planes[path]
        if plane.shape != shape:
            raise ImageError(
                f"{path.name}: {key} plane is {plane.shape[1]} x {plane.shape[0]} pixels, the "
                f"image is {shape[1]} x {shape[0]}; they must be the same"
            )
        found[label] = plane
    return found


def _corrected_planes(
    reading_k: NDArray[np.float32],
    labels: LabelArray,
    equations: list[MeasurementEquation],
    emissivity_planes: Mapping[int, NDArray[np.float32]],
    reflected_planes: Mapping[int, NDArray[np.float32]],
) -> tuple[NDArray[np.float32], NDArray[np.float32]]:
    surface = np.full(reading_k.shape, np.nan, np.float32)
    u = np.full(reading_k.shape, np.nan, np.float32)
    for label, equation in enumerate(equations):
        # The rest of the image is done whole; a zone only within the rows and columns it spans.
        box = (slice(None), slice(None)) if label == 0 else _span(labels, label)
        if box is None:
            continue
        readings = reading_k[box]
        if label in emissivity_planes or label in reflected_planes:
            emissivity = _part(emissivity_planes.get(label), box)
            reflected_c = _part(reflected_planes.get(label), box)
            new = np.asarray(
                equation.temperature_k(readings, emissivity=emissivity, reflected_c=reflected_c),
                np.float32,
            )
            new_u = np.asarray(
                equation.u_k(readings, emissivity=emissivity, reflected_c=reflected_c), np.float32
            )
        else:
            new, new_u = planes_of(readings, equation)
        if len(equations) == 1:
            return new, new_u
        here = labels[box] == label
        np.copyto(surface[box], new, where=here)
        np.copyto(u[box], new_u, where=here)
    return surface, u


def _span(labels: LabelArray, label: int) -> tuple[slice, slice] | None:
    """Return the rows and columns that a label spans."""
    here = labels == label
    rows, columns = np.flatnonzero(here.any(axis=1)), np.flatnonzero(here.any(axis=0))
    if len(rows) == 0:
        return None
    return slice(rows[0], rows[-1] + 1), slice(columns[0], columns[-1] + 1)


def _part(
    plane: NDArray[np.float32] | None, box: tuple[slice, slice]
) -> NDArray[np.float32] | None:
    return None if plane is None else plane[box]


def _cautions(
    job: ImageJob,
    inputs: list[SceneInputs],
    equations: list[MeasurementEquation],
) -> tuple[str, ...]:
    found: list[str] = []
    wheres = ["the image", *(f"zone {zone.name}" for zone in job.zones)]
    for where, every, equation, ignored in zip(
        wheres, inputs, equations, [False, *(zone.ignore for zone in job.zones)], strict=True
    ):
        if ignored:
            continue
        emissivity = every.values["emissivity"]
        if every.emissivity_file is None and emissivity.value < _LOW_EMISSIVITY:
            found.append(cautions.low_emissivity(where, emissivity.value))
        if equation.variables["emissivity"].is_cut and every.emissivity_file is None:
            found.append(cautions.bounded(where, emissivity.value, emissivity.u))
        angle = every.value("view_angle_deg")
        if angle is not None and angle > STEEP_VIEW_DEG:
            found.append(cautions.steep_view(where, angle))
        distance = every.value("distance_m")
        if equation.uses_air_formula and distance is not None and distance > STRETCHED_BEYOND_M:
            found.append(cautions.stretched_air(distance))
        if every.values["reflected_c"].origin == "computed":
            found.append(cautions.computed_reflected(where))
    return tuple(dict.fromkeys(found))


def _left_out(job: ImageJob, labels: LabelArray) -> MaskArray | None:
    """Return the pixels of zones that the sheet leaves out; None where there are none."""
    if not any(zone.ignore for zone in job.zones):
        return None
    return np.asarray(np.array([False, *(zone.ignore for zone in job.zones)])[labels])
