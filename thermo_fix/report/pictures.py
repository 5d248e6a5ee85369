"""Pictures of one image: false colours for the eye, and the numbers themselves as 16-bit PNG.

What the page's reader needs besides the planes (which zone a pixel belongs to, where its
uncertainty comes from) travels as ``budgets``, so that a difference between two pixels is stated
with the correlation between them.

The only module of the report that uses OpenCV and matplotlib's colour maps.
"""

import json
import math
import os
import struct
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import cv2
import numpy as np
from matplotlib import colormaps
from numpy.typing import NDArray

from thermo_fix.records import FloatArray, ImageResult, Planes

COLOUR_MAPS: Final = ("inferno", "magma", "plasma", "viridis", "cividis")
"""Perceptually uniform maps, by their matplotlib names. All rise in lightness, so that a grey
print keeps the order of temperatures."""

DATA_STEP_K: Final = 0.01
"""Step of the 16-bit pictures, K, for spans up to 655 K."""

SPAN_PERCENTILES: Final = (0.5, 99.5)
"""Share of the pixels that the colour scale holds, in per cent. Common practice, no source."""

EMISSIVITY_STEP: Final = 1e-4

HISTOGRAM_BINS: Final = 64

_SAMPLE_PX: Final = 65_536
"""Pixels that the percentiles are taken from: more do not move them visibly."""

_HATCH_GREYS: Final = ((150, 150, 150), (96, 96, 96))
"""Entries 0 and 1 of every palette: pixels without a temperature."""

_COLOURS: Final = 256 - len(_HATCH_GREYS)
_COUNTS: Final = 65_535

_FAST_PNG: Final = (
    int(cv2.IMWRITE_PNG_COMPRESSION),
    3,
    int(cv2.IMWRITE_PNG_STRATEGY),
    int(cv2.IMWRITE_PNG_STRATEGY_RLE),
)
"""Run lengths after the row filter: for thermal noise as small as a full search, and ten times
as fast."""


@dataclass(frozen=True, slots=True)
class DataPlane:
    """A plane of numbers as a 16-bit grey PNG: ``value = offset + step * (count - 1)``.

    Count 0 is a pixel without a value.
    """

    png: bytes
    offset: float
    step: float
    """0.01, or a whole multiple of it where the plane spans more than 655 K."""


@dataclass(frozen=True, slots=True)
class Pictures:
    """The pictures of one image."""

    recorded_png: bytes
    corrected_png: bytes
    low_c: float
    """Lower end of the colour scale that both pictures share, degC."""
    high_c: float
    colour_map: str
    width: int
    height: int
    data: DataPlane
    """Surface temperature, degC."""
    uncertainty_data: DataPlane
    """Standard uncertainty (k = 1), K."""
    recorded_data: DataPlane
    """Readings as recorded, degC."""
    photo_jpeg: bytes | None = None
    photo_png: bytes | None = None
    """Visible photograph, already reduced; JPEG wins where both are there."""
    apparent_data: DataPlane | None = None
    """Apparent temperature, degC; None where it is the reading."""
    emissivity_data: DataPlane | None = None
    """None where each label has one emissivity."""
    labels_png: bytes | None = None
    """Which zone a pixel belongs to, 8 bit (16 bit from 256 zones on); None without zones."""
    budgets: bytes = b"[]"
    """JSON: by label, what ``PixelBudget`` says, with contributions to four digits."""
    by_pixel: bool = True
    """Whether the uncertainty of some pixels is known from its plane alone."""
    histogram: tuple[int, ...] = ()
    """Pixels outside ignored zones by surface temperature, in equal steps of the colour scale."""

    @property
    def data_png(self) -> bytes:
        """The surface temperatures as 16-bit PNG."""
        return self.data.png


def encode_pictures(planes: Planes, image: ImageResult, *, colour_map: str = "inferno") -> Pictures:
    """Encode the planes of one image, without marks: those are drawn over them by the page.

    Both colour pictures share one scale, which holds 99 % of all pixels and every finding's
    extreme. Raises ValueError for a colour map that is not one of ``COLOUR_MAPS``.
    """
    rows, columns = planes.corrected_c.shape
    low, high = shared_span(planes, image)
    return Pictures(
        recorded_png=_colour_png(planes.recorded_c, low, high, colour_map),
        corrected_png=_colour_png(planes.corrected_c, low, high, colour_map),
        low_c=low,
        high_c=high,
        colour_map=colour_map,
        width=int(columns),
        height=int(rows),
        data=encode_data(planes.corrected_c),
        uncertainty_data=encode_data(planes.uncertainty_k),
        recorded_data=encode_data(planes.recorded_c),
        apparent_data=None if planes.apparent_c is None else encode_data(planes.apparent_c),
        emissivity_data=(
            None
            if planes.emissivity is None
            else encode_data(planes.emissivity, step=EMISSIVITY_STEP)
        ),
        labels_png=_labels_png(planes),
        budgets=_budgets(planes),
        by_pixel=not all(budget.parts_k for budget in planes.budgets) or not planes.budgets,
        histogram=_histogram(planes, image, low, high),
    )


def _labels_png(planes: Planes) -> bytes | None:
    if planes.labels is None:
        return None
    if int(planes.labels.max(initial=0)) > 255:
        return _png(planes.labels.astype(np.uint16))
    return _png(planes.labels.astype(np.uint8))


def _budgets(planes: Planes) -> bytes:
    found = [
        {
            "name": budget.name,
            "emissivity": _short(budget.emissivity),
            "low": float(budget.reading_c[0]) if budget.reading_c.size else 0.0,
            "step": float(budget.reading_c[1] - budget.reading_c[0])
            if budget.reading_c.size > 1
            else 1.0,
            "parts": {
                name: [_short(float(part)) for part in parts]
                for name, parts in budget.parts_k.items()
            },
            "own": list(budget.own),
        }
        for budget in planes.budgets
    ]
    return json.dumps(found, separators=(",", ":"), allow_nan=False).encode()


def _short(value: float | None) -> float | None:
    """A number to four digits; JSON has no NaN."""
    return None if value is None or not math.isfinite(value) else float(f"{value:.4g}")


def _histogram(planes: Planes, image: ImageResult, low: float, high: float) -> tuple[int, ...]:
    plane = planes.corrected_c
    usable = np.isfinite(plane)
    if planes.labels is not None and len(image.zones) == len(planes.budgets) - 1:
        ignored = np.array([False, *(zone.ignore for zone in image.zones)])
        usable &= ~ignored[planes.labels]
    counts, _ = np.histogram(plane[usable], HISTOGRAM_BINS, (low, high))
    return tuple(int(count) for count in counts)


def shared_span(planes: Planes, image: ImageResult) -> tuple[float, float]:
    """Ends of the colour scale, degC, widened outwards to tenths of a kelvin.

    0 and 1 where no pixel has a temperature.
    """
    ends: list[float] = []
    for plane in (planes.recorded_c, planes.corrected_c):
        sample = plane.ravel()[:: max(1, plane.size // _SAMPLE_PX)]
        finite = sample[np.isfinite(sample)]
        if finite.size:
            ends.extend(float(end) for end in np.percentile(finite, SPAN_PERCENTILES))
    for finding in image.findings:
        ends.extend(
            value
            for value in (finding.extreme_c, finding.apparent_c)
            if value is not None and math.isfinite(value)
        )
    if not ends:
        return 0.0, 1.0
    low, high = math.floor(min(ends) * 10.0) / 10.0, math.ceil(max(ends) * 10.0) / 10.0
    return (low, high) if high - low >= 0.2 else (low - 0.5, high + 0.5)


def encode_data(plane: FloatArray, *, step: float = DATA_STEP_K) -> DataPlane:
    """Encode a plane of numbers without loss beyond half a step; NaN and infinities become 0.

    ``step`` is the least step; planes of more than 65,534 of them take a whole multiple of it.
    """
    finite = np.isfinite(plane)
    values = np.where(finite, plane, 0.0).astype(np.float64)
    if not finite.any():
        return DataPlane(_png(np.zeros(plane.shape, np.uint16)), 0.0, step)
    offset = math.floor(float(values[finite].min()))
    span = float(values[finite].max()) - offset
    step *= max(1, math.ceil(span / (step * (_COUNTS - 1))))
    counts = np.where(finite, np.rint((values - offset) / step) + 1.0, 0.0)
    return DataPlane(_png(counts.astype(np.uint16)), float(offset), step)


def decode_data(data: DataPlane) -> NDArray[np.float64]:
    """The numbers of a plane again; NaN where there were none."""
    counts = cv2.imdecode(np.frombuffer(data.png, np.uint8), cv2.IMREAD_UNCHANGED)
    if counts is None:
        raise ValueError("the bytes are no PNG")
    values = data.offset + data.step * (counts.astype(np.float64) - 1.0)
    return np.where(counts == 0, np.nan, values)


def encode_photo(content: bytes, *, longest_px: int = 1200) -> bytes | None:
    """A visible photograph, reduced and as JPEG without the camera's tags.

    None if the bytes are no picture.
    """
    raw = np.frombuffer(content, np.uint8)
    if raw.size == 0:
        return None
    try:
        with _hushed():
            photo = cv2.imdecode(raw, cv2.IMREAD_COLOR)
    except cv2.error:  # a size beyond the library's limits
        return None
    if photo is None:
        return None
    reduction = longest_px / max(photo.shape[:2])
    if reduction < 1.0:
        photo = cv2.resize(photo, None, fx=reduction, fy=reduction, interpolation=cv2.INTER_AREA)
    done, jpeg = cv2.imencode(".jpg", photo, [int(cv2.IMWRITE_JPEG_QUALITY), 82])
    return jpeg.tobytes() if done else None


@contextmanager
def _hushed() -> Iterator[None]:
    """Keep libraries in C from printing what a damaged picture makes them say.

    They write past Python to the standard error of the process, so that is where to stop them.
    """
    try:
        usual = os.dup(2)
    except OSError:  # it is closed already
        yield
        return
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, 2)
        os.close(nowhere)
        yield
    finally:
        os.dup2(usual, 2)
        os.close(usual)


def colour_stops(colour_map: str, number: int = 17) -> tuple[str, ...]:
    """Evenly spaced colours of a map from its cold to its hot end, as ``#rrggbb``."""
    places = np.rint(np.linspace(0, _COLOURS - 1, number)).astype(int) + len(_HATCH_GREYS)
    return tuple("#" + bytes(_palette(colour_map)[place]).hex() for place in places)


def palette_bytes(colour_map: str) -> bytes:
    """Red, green and blue of each colour of a map, from cold to hot, then of the two greys."""
    palette = _palette(colour_map)
    return bytes(np.roll(palette, -len(_HATCH_GREYS), axis=0))


def crop_png(png: bytes, x: float, y: float, width: float, height: float) -> bytes:
    """A part of a colour picture, for pages that do not hold the whole."""
    picture = cv2.imdecode(np.frombuffer(png, np.uint8), cv2.IMREAD_COLOR)
    if picture is None:
        raise ValueError("the bytes are no PNG")
    rows = slice(max(0, math.floor(y)), math.ceil(y + height))
    columns = slice(max(0, math.floor(x)), math.ceil(x + width))
    done, encoded = cv2.imencode(".png", picture[rows, columns], list(_FAST_PNG))
    if not done:
        raise ValueError("the part cannot be written as PNG")
    return encoded.tobytes()


@lru_cache(maxsize=len(COLOUR_MAPS))
def _palette(colour_map: str) -> NDArray[np.uint8]:
    """(256, 3) red, green, blue: two greys, then the map from cold to hot."""
    if colour_map not in COLOUR_MAPS:
        known = ", ".join(COLOUR_MAPS)
        raise ValueError(f"colour map {colour_map!r} is not known; use one of: {known}")
    colours = np.asarray(colormaps[colour_map](np.linspace(0.0, 1.0, _COLOURS)))[:, :3]
    return np.vstack([np.array(_HATCH_GREYS, np.uint8), np.rint(colours * 255.0).astype(np.uint8)])


def _colour_png(plane: FloatArray, low: float, high: float, colour_map: str) -> bytes:
    position = (np.asarray(plane, np.float32) - np.float32(low)) * np.float32(
        (_COLOURS - 1) / (high - low)
    )
    unsolved = ~np.isfinite(position)
    position[unsolved] = 0.0
    index = (np.clip(np.rint(position), 0, _COLOURS - 1) + len(_HATCH_GREYS)).astype(np.uint8)
    if unsolved.any():
        rows, columns = np.nonzero(unsolved)
        index[rows, columns] = ((rows + columns) % 6 < 2).astype(np.uint8)
    return _with_palette(_png(index), _palette(colour_map))


def _png(plane: NDArray[np.uint8] | NDArray[np.uint16]) -> bytes:
    done, encoded = cv2.imencode(".png", plane, list(_FAST_PNG))
    if not done:
        raise ValueError(f"an image of shape {plane.shape} cannot be written as PNG")
    return encoded.tobytes()


def _with_palette(grey_png: bytes, palette: NDArray[np.uint8]) -> bytes:
    """Turn an 8-bit grey PNG into one of indexed colours, a third of the size of full colour.

    The pixel data are the same for both; only the colour type in the header changes and a
    palette follows it (PNG specification, 11.2.1 and 11.2.2).
    """
    header_end = 8 + 4 + 4 + 13 + 4
    header = bytearray(grey_png[12 : header_end - 4])
    header[4 + 9] = 3
    colours = b"PLTE" + palette.tobytes()
    return b"".join(
        (
            grey_png[:12],
            header,
            struct.pack(">I", zlib.crc32(header)),
            struct.pack(">I", palette.size),
            colours,
            struct.pack(">I", zlib.crc32(colours)),
            grey_png[header_end:],
        )
    )
