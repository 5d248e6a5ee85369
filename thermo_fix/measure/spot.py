"""A spot: a place of an image whose surface temperature is estimated with its uncertainty."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.measure.extreme import extreme_value
from thermo_fix.records import CorrectedFrame, MaskArray
from thermo_fix.uncertainty.equation import (
    AIR_FORMULA,
    CALIBRATION,
    MODEL,
    NOISE,
    NONUNIFORMITY,
    MeasurementEquation,
)
from thermo_fix.uncertainty.estimate import Estimate

_MEDIAN_GAIN = math.sqrt(math.pi / 2.0)
"""Standard deviation of a median over that of a mean, for normal noise."""


@dataclass(frozen=True, slots=True)
class Spot:
    """The representative reading of a place, and which equation holds there."""

    name: str
    """Unique in the survey; names the errors that the place shares with no other."""
    label: int
    reading_k: float
    noise_gain: float
    """Standard deviation of the reading over that of one pixel."""
    emissivity: float | None = None
    """Of the plane, where the sheet gives one."""
    reflected_c: float | None = None

    def independent(self, equation: MeasurementEquation) -> dict[str, float]:
        """Return standard uncertainties of the reading that no other place shares, K."""
        return {
            f"{NOISE} of {self.name}": equation.noise_k * self.noise_gain,
            f"{NONUNIFORMITY} of {self.name}": equation.nonuniformity_k,
        }


def spot_at_extreme(
    corrected: CorrectedFrame,
    name: str,
    label: int,
    place: tuple[int, int],
    without: Sequence[tuple[int, int]] = (),
) -> Spot:
    """Return the spot at the extreme of a region (see the extreme module).

    Defective pixels (x, y) are left out, unless there is no other.
    """
    usable = np.isfinite(corrected.surface_k) & (corrected.labels == label)
    x, y = place
    if without:
        sound = usable.copy()
        columns, rows = np.array(without).T
        sound[rows, columns] = False
        if sound[max(0, y - 1) : y + 2, max(0, x - 1) : x + 2].any():
            usable = sound
    extreme = extreme_value(corrected.reading_k, usable, place)
    emissivity = corrected.emissivity_planes.get(label)
    reflected = corrected.reflected_planes.get(label)
    return Spot(
        name,
        label,
        extreme.value,
        extreme.noise_gain,
        None if emissivity is None else float(emissivity[y, x]),
        None if reflected is None else float(reflected[y, x]),
    )


def spot_of_median(corrected: CorrectedFrame, name: str, label: int, where: MaskArray) -> Spot:
    """Return the spot that stands for many pixels of one zone: their median."""
    usable = where & np.isfinite(corrected.surface_k)
    emissivity = corrected.emissivity_planes.get(label)
    reflected = corrected.reflected_planes.get(label)
    count = int(np.count_nonzero(usable))
    return Spot(
        name,
        label,
        float(np.median(corrected.reading_k[usable].astype(np.float64))),
        _MEDIAN_GAIN / math.sqrt(count),
        None if emissivity is None else float(np.median(emissivity[usable])),
        None if reflected is None else float(np.median(reflected[usable])),
    )


def temperature_of(spot: Spot, equation: MeasurementEquation) -> Estimate:
    """Surface temperature of a spot, degC, with contributions and draws.

    Parameters
    ----------
    spot
        The place.
    equation
        That of its zone.

    """
    emissivity, reflected_c = spot.emissivity, spot.reflected_c
    draws = equation.draw_k(
        spot.reading_k,
        independent=spot.independent(equation),
        emissivity=emissivity,
        reflected_c=reflected_c,
    )
    value, contributions = first_order(spot, equation)
    return Estimate(value, contributions, draws - ZERO_CELSIUS_K)


def first_order(spot: Spot, equation: MeasurementEquation) -> tuple[float, dict[str, float]]:
    """Surface temperature of a spot, degC, with its signed contributions and without draws."""
    emissivity, reflected_c = spot.emissivity, spot.reflected_c
    surface_k = float(
        equation.temperature_k(spot.reading_k, emissivity=emissivity, reflected_c=reflected_c)
    )
    contributions: dict[str, float] = {}
    parts = equation.contributions_k(spot.reading_k, emissivity=emissivity, reflected_c=reflected_c)
    for key, part in parts.items():
        if key == NOISE:
            contributions[f"{NOISE} of {spot.name}"] = float(part) * spot.noise_gain
        elif key == NONUNIFORMITY:
            contributions[f"{NONUNIFORMITY} of {spot.name}"] = float(part)
        else:
            contributions[variable_name(equation, key)] = float(part)
    return surface_k - ZERO_CELSIUS_K, contributions


def variable_name(equation: MeasurementEquation, key: str) -> str:
    """Return the identity of the variable behind a key of the equation's contributions."""
    if key in (CALIBRATION, AIR_FORMULA, MODEL):
        return key
    return equation.variables[key].name
