"""How a reference zone (foil, tape) is measured: its inner pixels, as one reading."""

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import binary_erosion

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct.inputs import recorded_path
from thermo_fix.errors import ImageError
from thermo_fix.radiometry.blackbody import RadiationModel
from thermo_fix.radiometry.path import seen_map
from thermo_fix.records import Camera, Input, MaskArray

INSET_PX = 2
"""Pixels left out along the outline: the optics mix a zone with what lies beside it there."""
LEAST_INNER_PX = 25
"""The inset is given up, a pixel at a time, where fewer than these would be left."""
LEAST_PX = 9
"""Fewer usable pixels are no measurement."""
_PATCH_PX = 25
"""Neighbouring pixels are not independent (a crumple, the blur): this many count as one when the
spread of a zone becomes the uncertainty of its mean; judged."""
_FOIL_U_K = 0.5
"""Standard uncertainty of a foil's mean as the reflected temperature, K: foil is no perfect
mirror and mirrors another part of the surroundings than the target does; judged."""


@dataclass(frozen=True, slots=True)
class ZoneReading:
    """The representative reading of a zone."""

    reading_k: float
    """Reading of the zone's mean exitance, K: radiation is what mixes, not temperature."""
    u_spread_k: float
    """Standard uncertainty of that mean from the spread of the pixels, K."""
    pixels: int


def inner_part(zone: MaskArray) -> MaskArray:
    """Return the pixels of a zone that keep clear of its outline.

    Parameters
    ----------
    zone
        (rows, columns).

    Returns
    -------
    ndarray of bool
        The zone without ``INSET_PX`` pixels along its outline (the edge of the image is no
        outline), or with a smaller inset where fewer than ``LEAST_INNER_PX`` would be left.

    """
    for inset in range(INSET_PX, 0, -1):
        kernel = np.ones((2 * inset + 1, 2 * inset + 1), bool)
        inner = binary_erosion(zone, kernel, border_value=1)
        if np.count_nonzero(inner) >= LEAST_INNER_PX:
            return np.asarray(inner, bool)
    return zone


def zone_reading(
    reading_k: NDArray[np.float32], zone: MaskArray, model: RadiationModel, *, what: str
) -> ZoneReading:
    """Measure a zone.

    Parameters
    ----------
    reading_k
        (rows, columns), K.
    zone
        (rows, columns).
    model
        Radiation model.
    what
        Words for the message: ``IR_1.tif: the foil zone 'foil'``.

    Raises
    ------
    ImageError
        Too few usable pixels.

    """
    readings = reading_k[inner_part(zone)].astype(np.float64)
    readings = readings[np.isfinite(readings)]
    if len(readings) < LEAST_PX:
        raise ImageError(f"{what} has {len(readings)} usable pixels, too few; draw it larger")
    mean_k = float(model.temperature(float(np.mean(model.exitance(readings)))))
    patches = max(1.0, len(readings) / _PATCH_PX)
    return ZoneReading(mean_k, float(np.std(readings, ddof=1)) / math.sqrt(patches), len(readings))


@dataclass(frozen=True, slots=True)
class FoilReading:
    """The reflected apparent temperature that a foil zone shows."""

    temperature_c: float
    parts_k: Mapping[str, float]
    """Contributions to its standard uncertainty, K, by what they come from."""
    pixels: int

    @property
    def u_k(self) -> float:
        """Standard uncertainty (k = 1), K."""
        return math.hypot(*self.parts_k.values())


def foil_reading(
    reading_k: NDArray[np.float32],
    zone: MaskArray,
    name: str,
    file: str,
    camera: Camera,
    model: RadiationModel,
) -> FoilReading:
    """Measure the reflected apparent temperature on a zone of crumpled foil.

    Emissivity 1 and distance 0 (ASTM E1862, reflector method): what is seen is what is reflected.

    Parameters
    ----------
    reading_k, zone
        (rows, columns); K.
    name, file
        Of the zone and its image.
    camera, model
        Accuracy and recorded settings; radiation model.

    Raises
    ------
    ImageError
        Too few usable pixels, or no apparent temperature under the recorded settings.

    """
    measured = zone_reading(reading_k, zone, model, what=f"{file}: the foil zone {name!r}")
    seen = seen_map(recorded_path(camera.recorded), model)
    mean_k = float(model.temperature(seen(model.exitance(measured.reading_k))))
    if math.isnan(mean_k):
        raise ImageError(
            f"{file}: the foil zone {name!r} has no apparent temperature under the recorded "
            "settings; check [camera] recorded"
        )
    gain = float(seen.gain * model.slope(measured.reading_k) / model.slope(mean_k))
    half_width = max(
        camera.accuracy_k, camera.accuracy_fraction * abs(measured.reading_k - ZERO_CELSIUS_K)
    )
    parts = {
        "camera calibration": gain * half_width / math.sqrt(3.0),
        "camera non-uniformity": gain * camera.nonuniformity_k,
        "foil": _FOIL_U_K,
        "spread in the zone": gain * measured.u_spread_k,
    }
    return FoilReading(mean_k - ZERO_CELSIUS_K, parts, measured.pixels)


def foil_temperature(
    reading_k: NDArray[np.float32],
    zone: MaskArray,
    name: str,
    file: str,
    camera: Camera,
    model: RadiationModel,
) -> Input:
    """Return what :func:`foil_reading` finds as the input ``reflected_c``, degC."""
    foil = foil_reading(reading_k, zone, name, file, camera, model)
    return Input(
        "reflected_c",
        foil.temperature_c,
        foil.u_k,
        "measured",
        f"zone {name} of {file}",
        "measured",
        f"mean of {foil.pixels} inner pixels of the foil zone {name!r}",
    )
