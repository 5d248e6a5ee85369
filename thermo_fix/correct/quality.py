"""What of an image may be wrong though it has a number: blanks, ends of range, assumptions."""

from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_fix import cautions
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct.inputs import ASSUMED_BAND_UM
from thermo_fix.radiometry.blackbody import BAND_RANGE_K
from thermo_fix.records import (
    Camera,
    Encoding,
    Frame,
    ImageJob,
    MaskArray,
    RangeEnds,
    SceneInputs,
)
from thermo_fix.uncertainty.equation import MeasurementEquation

LEAST_PILE_PX = 9
"""Pixels at one end of the readings from which they may be piled up there; a block of 3 x 3."""
_PILE = 4.0
"""They are piled up where they outnumber those at the next reading by this factor: noise thins
readings out towards their ends. Judged."""
LONG_WAVE_UM = (7.0, 15.0)
"""Bands within this share the air formula and the table of surfaces; judged."""


class _End(NamedTuple):
    reading_k: float
    pixels: int


def range_ends_k(
    frame: Frame, reading_k: NDArray[np.float32], left_out: MaskArray | None = None
) -> RangeEnds:
    """Return the readings at which an image ends although its scene may go on.

    Parameters
    ----------
    frame
        The image as read.
    reading_k
        Its readings, (rows, columns), K; NaN where there is none.
    left_out
        (rows, columns): pixels that do not matter.

    Returns
    -------
    RangeEnds
        A greatest or least reading is such an end where at least ``LEAST_PILE_PX`` pixels share
        it and far fewer the next one; a greatest one also where the file's whole numbers end.

    """
    readings = reading_k if left_out is None else reading_k[~left_out]
    finite = readings[np.isfinite(readings)]
    if finite.size == 0:
        return RangeEnds()
    least, greatest = _pile(finite, "least"), _pile(finite, "greatest")
    if np.issubdtype(frame.values.dtype, np.integer) and frame.encoding.scale > 0.0:
        at_end = frame.values == np.iinfo(str(frame.values.dtype)).max
        if left_out is not None:
            at_end &= ~left_out
        if at_end.any():
            greatest = _End(float(finite.max()), int(np.count_nonzero(at_end)))
    return RangeEnds(
        None if least is None else least.reading_k,
        None if greatest is None else greatest.reading_k,
        0 if least is None else least.pixels,
        0 if greatest is None else greatest.pixels,
    )


def _pile(finite: NDArray[np.float32], end: Literal["least", "greatest"]) -> _End | None:
    extreme = finite.max() if end == "greatest" else finite.min()
    here = finite == extreme
    pixels = int(np.count_nonzero(here))
    # A scene that is level throughout ends nowhere.
    if pixels < LEAST_PILE_PX or pixels == finite.size:
        return None
    rest = finite[~here]
    after = rest.max() if end == "greatest" else rest.min()
    if pixels <= _PILE * np.count_nonzero(rest == after):
        return None
    return _End(float(extreme), pixels)


def image_cautions(
    frame: Frame,
    reading_k: NDArray[np.float32],
    surface_k: NDArray[np.float32],
    uncertainty_k: NDArray[np.float32],
    job: ImageJob,
    inputs: Sequence[SceneInputs],
    equations: Sequence[MeasurementEquation],
    camera: Camera,
    ends: RangeEnds,
) -> tuple[str, ...]:
    """Return the cautions of an image as a whole.

    Parameters
    ----------
    frame, reading_k, surface_k, uncertainty_k
        The image as read and as corrected, (rows, columns), K.
    job, camera
        What the sheet says of them.
    inputs, equations
        By label.
    ends
        From :func:`range_ends_k`.

    """
    found = []
    told = ~np.isnan(reading_k)
    blank = int(told.size - np.count_nonzero(told))
    solved = ~np.isnan(surface_k)
    unsolved = int(np.count_nonzero(told & ~solved))
    vague = int(np.count_nonzero(solved & np.isnan(uncertainty_k)))
    if blank:
        found.append(cautions.no_reading(blank))
    if unsolved:
        found.append(cautions.unsolved(unsolved))
    if vague:
        low, high = (edge - ZERO_CELSIUS_K for edge in BAND_RANGE_K)
        found.append(cautions.unknown_uncertainty(vague, low, high))
    for end, edge_k, pixels in (
        ("least", ends.least_k, ends.least_px),
        ("greatest", ends.greatest_k, ends.greatest_px),
    ):
        if edge_k is not None:
            found.append(cautions.saturated(pixels, end, edge_k - ZERO_CELSIUS_K))
    in_force = [
        (each, equation)
        for each, equation, ignored in zip(
            inputs, equations, [False, *(zone.ignore for zone in job.zones)], strict=True
        )
        if not ignored
    ]
    assumed = dict.fromkeys(
        key
        for each, equation in in_force
        for key in equation.variables
        if each.values[key].origin == "assumed"
    )
    if camera.recorded.origin == "assumed":
        assumed["camera.recorded"] = None
    by_band = any(equation.model.name == "band" for _, equation in in_force)
    band = camera.band_um
    if by_band and band is None and camera.response_file is None:
        assumed["camera.band_um"] = None
    if assumed:
        found.append(cautions.assumed_inputs(tuple(assumed)))
    if frame.encoding.origin == "inferred":
        found.append(cautions.inferred_encoding(_words(frame.encoding)))
    low, high = band or ASSUMED_BAND_UM
    of_long_wave = any(
        equation.uses_air_formula or each.values["emissivity"].origin == "surface table"
        for each, equation in in_force
    )
    if of_long_wave and not LONG_WAVE_UM[0] <= low < high <= LONG_WAVE_UM[1]:
        found.append(cautions.not_long_wave(low, high))
    return tuple(found)


def _words(encoding: Encoding) -> str:
    if encoding.unit == "linear":
        offset = f" + {encoding.offset:g}" if encoding.offset else ""
        return f"kelvin = {encoding.scale:g} x count{offset}"
    return "degC" if encoding.unit == "celsius" else "kelvins"
