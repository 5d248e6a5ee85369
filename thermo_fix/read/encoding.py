"""How pixel values turn into temperature: as stated, as the file says, or as only one reading fits.

Nothing is guessed. An encoding that nobody stated is taken only where the values leave a single
plausible meaning, and the report says so; in every other case the sheet has to state it.
"""

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import UnclearEncoding
from thermo_fix.read.metadata import Scaling
from thermo_fix.read.wording import counted
from thermo_fix.records import Camera, Encoding, Frame, Origin, PixelUnit

CELSIUS_MEDIANS_C: Final = (-60.0, 250.0)
"""degC. Median of a float image that is taken as degC. -60 is colder than inhabited places get;
above 250 the median of a building or a switchboard does not rise."""

KELVIN_MEDIANS_K: Final = (200.0, 623.15)
"""K, that is -73 to 350 degC. Median of a float image that is taken as kelvins. A median of 200 to
250 lies in both ranges and stays unclear."""

HOTTEST_K: Final = 3000.0 + ZERO_CELSIUS_K
"""K. Above it no reading is taken for one, as no temperature in the sheet is: no camera reaches it,
and damaged values do. Common practice, no source."""

COUNT_SPREAD_C: Final = (-60.0, 350.0)
"""degC. Range in which a linear encoding must put the 5th and the 95th percentile. All bounds are
common practice without a source."""


@dataclass(frozen=True, slots=True)
class Linear:
    """A linear encoding in common use: ``kelvin = scale * count + offset``."""

    scale: float
    offset: float
    signed_only: bool
    reason: str

    def __str__(self) -> str:
        offset = f" + {self.offset:g}" if self.offset else ""
        return f"kelvin = {self.scale:g} x count{offset}"


CANDIDATES: Final = (
    Linear(0.01, 0.0, False, "hundredths of a kelvin, 16 bits reach 382 degC"),
    Linear(0.04, 0.0, False, "twenty-fifths of a kelvin, 16 bits reach 2348 degC"),
    Linear(0.1, 0.0, False, "tenths of a kelvin, for hot targets"),
    # Unsigned counts of degC would lose all below zero, so only signed ones are in use.
    Linear(0.01, ZERO_CELSIUS_K, True, "hundredths of a degC"),
    Linear(0.1, ZERO_CELSIUS_K, True, "tenths of a degC"),
)
"""What counts may mean if nobody says. Common practice, no source. Counts that the camera has not
calibrated look like these too, which is why the report names the encoding taken."""

IN_THE_SHEET: Final = "in [camera] of the survey sheet"
LINEAR_HINT: Final = f'state pixel = "linear" with scale and offset {IN_THE_SHEET}'


def settle_encoding(
    values: NDArray[Any], sample_type: str, camera: Camera, scaling: Scaling
) -> tuple[Encoding, list[str]]:
    """Return how ``values`` turn into temperature, and notes.

    ``values`` (rows, columns) holds at least one finite value; ``sample_type`` is the type in the
    file, such as ``uint16``, also where pixels without a reading have made floats of ``values``.
    What the sheet states is used as it is; else what the file's metadata say; else the one
    meaning that the values leave.

    Raises UnclearEncoding, naming the key to state, where there is none or more than one, and
    where the encoding puts every pixel at or below absolute zero.
    """
    finite = values[np.isfinite(values)]
    notes = []
    stated = camera.pixel
    if stated is None and camera.scale is not None:
        stated = "linear"
    if scaling.problem is not None:
        notes.append(f"The metadata on scale and unit is not used: {scaling.problem}.")

    if stated in ("celsius", "kelvin"):
        encoding = Encoding(stated, 1.0, 0.0, "given")
    elif stated == "linear" and camera.scale is not None:
        encoding = Encoding("linear", camera.scale, camera.offset or 0.0, "given")
    elif scaling.problem is not None:
        raise UnclearEncoding(
            f"the metadata on scale and unit cannot be used ({scaling.problem}); "
            f"state camera.pixel {IN_THE_SHEET}"
        )
    elif not scaling.silent:
        encoding = _from_file(finite, scaling)
    elif not sample_type.startswith("float"):
        encoding = _from_counts(finite, signed=sample_type.startswith("int"))
    elif stated == "linear":
        raise UnclearEncoding(
            f"camera.scale is not stated and the file does not say it either; {LINEAR_HINT}"
        )
    else:
        encoding = _from_floats(finite)

    if encoding.origin == "given" and not _agrees(encoding, scaling):
        notes.append(
            f"The file's own metadata say {_said(scaling)}; the encoding in the sheet is used."
        )
    notes += _check_possible(finite, encoding)
    return encoding, notes


def _agrees(encoding: Encoding, scaling: Scaling) -> bool:
    if scaling.silent:
        return True
    units = ("kelvin", "celsius") if scaling.unit is None else (scaling.unit,)
    found = [_from_metadata(scaling, unit) for unit in units]
    return any(
        (own.unit, own.scale, own.offset) == (encoding.unit, encoding.scale, encoding.offset)
        for own in found
    )


def _from_file(finite: NDArray[Any], scaling: Scaling) -> Encoding:
    """Encoding from the file's metadata; the unit, where missing, by the values it gives."""
    if scaling.unit is not None:
        encoding = _from_metadata(scaling, scaling.unit)
        return _noted(encoding, f"Found in the file's metadata: {_said(scaling)}.")
    median = float(np.median(_linear(finite, scaling.scale or 1.0, scaling.offset or 0.0)))
    unit = _unit_of_median(median)
    if unit is None:
        raise UnclearEncoding(
            f"the file's metadata say {_said(scaling)} but no unit, and a median of {median:.6g} "
            f"{_why_not(median)}; {LINEAR_HINT}"
        )
    word = "degC" if unit == "celsius" else "K"
    return _noted(
        _from_metadata(scaling, unit),
        f"Found in the file's metadata: {_said(scaling)}. The unit is not stated there; a median "
        f"of {median:.6g} makes sense in {word} only.",
    )


def _from_metadata(scaling: Scaling, unit: str) -> Encoding:
    scale, offset = scaling.scale or 1.0, scaling.offset or 0.0
    plain: PixelUnit = "kelvin" if unit == "kelvin" else "celsius"
    if scale == 1.0 and offset == 0.0:
        return Encoding(plain, 1.0, 0.0, "inferred")
    return Encoding(
        "linear", scale, offset + (0.0 if plain == "kelvin" else ZERO_CELSIUS_K), "inferred"
    )


def _from_floats(finite: NDArray[Any]) -> Encoding:
    median = float(np.median(finite))
    unit = _unit_of_median(median)
    if unit is None:
        raise UnclearEncoding(
            f"its values (median {median:.6g}) {_why_not(median)}; "
            f'state camera.pixel ("celsius", "kelvin" or "linear") {IN_THE_SHEET}'
        )
    word = "degC" if unit == "celsius" else "kelvins"
    return Encoding(
        unit,
        1.0,
        0.0,
        "inferred",
        f"Not stated: the values (median {median:.6g}) make sense as {word} only.",
    )


def _unit_of_median(median: float) -> PixelUnit | None:
    celsius = CELSIUS_MEDIANS_C[0] <= median <= CELSIUS_MEDIANS_C[1]
    kelvin = KELVIN_MEDIANS_K[0] <= median <= KELVIN_MEDIANS_K[1]
    if celsius == kelvin:
        return None
    return "celsius" if celsius else "kelvin"


def _why_not(median: float) -> str:
    if KELVIN_MEDIANS_K[0] <= median <= CELSIUS_MEDIANS_C[1]:
        return "may be hot degC or cold kelvins"
    return "would be plausible neither as degC nor as kelvins"


def _from_counts(finite: NDArray[Any], *, signed: bool) -> Encoding:
    low, median, high = (float(value) for value in np.percentile(finite, (5, 50, 95)))
    plausible = []
    for candidate in CANDIDATES:
        if candidate.signed_only and not signed:
            continue
        low_c, median_c, high_c = (
            candidate.scale * count + candidate.offset - ZERO_CELSIUS_K
            for count in (low, median, high)
        )
        # Rounding of the products must not decide on a bound.
        if low_c >= COUNT_SPREAD_C[0] - 1e-9 and high_c <= COUNT_SPREAD_C[1] + 1e-9:
            plausible.append((candidate, low_c, median_c, high_c))
    if not plausible:
        raise UnclearEncoding(
            f"its counts (median {median:.6g}) give plausible temperatures in none of the usual "
            f"linear encodings; {LINEAR_HINT}"
        )
    if len(plausible) > 1:
        choices = " or ".join(
            f"{candidate} (median {median_c:.1f} degC)" for candidate, _, median_c, _ in plausible
        )
        raise UnclearEncoding(f"its counts may mean {choices}; {LINEAR_HINT}")
    candidate, low_c, median_c, high_c = plausible[0]
    return Encoding(
        "linear",
        candidate.scale,
        candidate.offset,
        "inferred",
        f"Not stated: of the usual linear encodings only {candidate} ({candidate.reason}) gives "
        f"plausible temperatures (median {median_c:.1f} degC, middle 90 % from {low_c:.1f} to "
        f"{high_c:.1f} degC). State it in the sheet: counts that the camera has not calibrated "
        "can look the same.",
    )


def _check_possible(finite: NDArray[Any], encoding: Encoding) -> list[str]:
    """Notes on implausible values; refuse an encoding that is impossible throughout."""
    kelvin = _kelvin(finite, encoding)
    low = int(np.count_nonzero(~(kelvin > 0.0)))
    high = int(np.count_nonzero(kelvin > HOTTEST_K))
    hottest = f"above {HOTTEST_K - ZERO_CELSIUS_K:.0f} degC"
    if low + high == kelvin.size:
        where = "at or below absolute zero" if low else hottest
        where = f"{where} or {hottest}" if low and high else where
        raise UnclearEncoding(
            f"read as {_words(encoding)}, every pixel lies {where}; "
            f"correct camera.pixel, camera.scale and camera.offset {IN_THE_SHEET}"
        )
    notes = [
        f"{counted(number, 'pixel')} {where} {'is' if number == 1 else 'are'} left out."
        for number, where in ((low, "at or below absolute zero"), (high, hottest))
        if number
    ]
    median_c = float(np.median(kelvin)) - ZERO_CELSIUS_K
    if not CELSIUS_MEDIANS_C[0] <= median_c <= CELSIUS_MEDIANS_C[1]:
        notes.append(
            f"Read as {_words(encoding)}, the median is {median_c:.6g} degC: implausible for a "
            "survey; check camera.pixel in the survey sheet."
        )
    return notes


def reading_k(frame: Frame) -> NDArray[np.float32]:
    """Return the readings of a frame in kelvins, (rows, columns), float32.

    NaN where the file holds no finite value and where a value lies at or below absolute zero or
    above ``HOTTEST_K``.
    """
    with np.errstate(all="ignore"):
        kelvin: NDArray[np.float32] = _kelvin(frame.values, frame.encoding).astype(np.float32)
        kelvin[~((kelvin > 0.0) & (kelvin <= HOTTEST_K))] = np.nan
    return kelvin


def _kelvin(values: NDArray[Any], encoding: Encoding) -> NDArray[np.float64]:
    if encoding.unit == "linear":
        return _linear(values, encoding.scale, encoding.offset)
    return _linear(values, 1.0, ZERO_CELSIUS_K if encoding.unit == "celsius" else 0.0)


def _linear(values: NDArray[Any], scale: float, offset: float) -> NDArray[np.float64]:
    with np.errstate(all="ignore"):
        return np.asarray(values.astype(np.float64) * scale + offset, dtype=np.float64)


def _noted(encoding: Encoding, note: str) -> Encoding:
    origin: Origin = "inferred"
    return Encoding(encoding.unit, encoding.scale, encoding.offset, origin, note)


def _words(encoding: Encoding) -> str:
    if encoding.unit == "linear":
        return f"kelvin = {encoding.scale:g} x value + {encoding.offset:g}"
    return "degC" if encoding.unit == "celsius" else "kelvins"


def _said(scaling: Scaling) -> str:
    parts = []
    if scaling.scale is not None:
        parts.append(f"scale {scaling.scale:g}")
    if scaling.offset is not None:
        parts.append(f"offset {scaling.offset:g}")
    if scaling.unit is not None:
        parts.append("unit " + ("K" if scaling.unit == "kelvin" else "degC"))
    return ", ".join(parts)
