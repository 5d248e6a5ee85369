"""What a reader of one image can be told of each pixel."""

import math

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.radiometry.path import OpticalPath, seen_map
from thermo_fix.records import CorrectedFrame, PixelBudget, Planes
from thermo_fix.uncertainty.equation import (
    AIR_FORMULA,
    CALIBRATION,
    MODEL,
    NOISE,
    NONUNIFORMITY,
    MeasurementEquation,
)

_MOST_NODES = 33
_NODE_STEP_K = 2.0
"""Nodes of a budget stand this far apart, unless that takes more than the most."""
_OWN = (NOISE, NONUNIFORMITY)
_OF_SURVEY = (CALIBRATION, AIR_FORMULA, MODEL)


def planes_of(corrected: CorrectedFrame) -> Planes:
    """Return the arrays of a corrected image that the report and the written planes need.

    Parameters
    ----------
    corrected
        The image.

    Returns
    -------
    Planes
        In degC. The apparent temperature is left out where it is the reading: where the camera
        had recorded emissivity 1 and transmittance 1.

    """
    zero = np.float32(ZERO_CELSIUS_K)
    return Planes(
        recorded_c=corrected.reading_k - zero,
        corrected_c=corrected.surface_k - zero,
        uncertainty_k=corrected.uncertainty_k,
        apparent_c=_apparent_c(corrected),
        labels=corrected.labels if len(corrected.equations) > 1 else None,
        emissivity=_emissivity(corrected),
        budgets=tuple(_budget(corrected, label) for label in range(len(corrected.equations))),
    )


def _apparent_c(corrected: CorrectedFrame) -> NDArray[np.float32] | None:
    equation = corrected.equations[0]
    if _is_blackbody(equation.recorded):
        return None
    seen = seen_map(equation.recorded, equation.model)(equation.model.exitance(corrected.reading_k))
    apparent_k = np.asarray(equation.model.temperature(seen))
    return (apparent_k - ZERO_CELSIUS_K).astype(np.float32)


def _is_blackbody(recorded: OpticalPath) -> bool:
    return (
        recorded.window is None
        and bool(np.all(recorded.emissivity == 1.0))
        and bool(np.all(recorded.transmittance == 1.0))
    )


def _emissivity(corrected: CorrectedFrame) -> NDArray[np.float32] | None:
    if not corrected.emissivity_planes:
        return None
    plane = np.full(corrected.labels.shape, np.nan, np.float32)
    for label, equation in enumerate(corrected.equations):
        here = corrected.labels == label
        given = corrected.emissivity_planes.get(label)
        plane[here] = _used_emissivity(equation) if given is None else given[here]
    return plane


def _used_emissivity(equation: MeasurementEquation) -> float:
    # The reflected temperature does not touch it, but the path asks for its plane.
    return float(np.asarray(equation.path(reflected_c=0.0).emissivity))


def _budget(corrected: CorrectedFrame, label: int) -> PixelBudget:
    equation = corrected.equations[label]
    name = corrected.job.zones[label - 1].name if label else ""
    emissivity = None if equation.emissivity_is_plane else _used_emissivity(equation)
    readings = (
        corrected.reading_k
        if len(corrected.equations) == 1
        else corrected.reading_k[corrected.labels == label]
    )
    low = float(np.nanmin(readings)) if np.isfinite(readings).any() else math.nan
    if math.isnan(low) or equation.emissivity_is_plane or equation.reflected_is_plane:
        return PixelBudget(name, emissivity, np.empty(0), {}, ())
    high = float(np.nanmax(readings))
    count = min(2 + math.ceil((high - low) / _NODE_STEP_K), _MOST_NODES)
    nodes_k = np.linspace(low, max(high, low + 0.01), count)
    parts = {
        _name(equation, key): np.broadcast_to(np.asarray(part, np.float64), nodes_k.shape)
        for key, part in equation.contributions_k(nodes_k).items()
    }
    return PixelBudget(name, emissivity, nodes_k - ZERO_CELSIUS_K, parts, _OWN)


def _name(equation: MeasurementEquation, key: str) -> str:
    if key in _OWN or key in _OF_SURVEY:
        return key
    return equation.variables[key].name
