"""What the first page declares, checked before anything is decoded.

Sources: TIFF revision 6.0 (Adobe, 1992); Adobe Photoshop TIFF technical notes 1 (deflate) and 3
(floating-point predictor); the compression codes of the TIFF library for the rest.
"""

import math
from dataclasses import dataclass
from typing import Any, Final

from tifffile import TiffPage

from thermo_fix.errors import NotAMeasurement, UnreadableImage
from thermo_fix.read.directory import Chain
from thermo_fix.read.limits import ReadLimits
from thermo_fix.read.wording import counted

BITS, COMPRESSION, PHOTOMETRIC = 258, 259, 262
WIDTH, LENGTH, ORIENTATION, SAMPLES, ROWS_PER_STRIP = 256, 257, 274, 277, 278
STRIP_OFFSETS, STRIP_COUNTS = 273, 279
FILL_ORDER, PLANAR, PREDICTOR, TILE_WIDTH, TILE_LENGTH = 266, 284, 317, 322, 323
TILE_OFFSETS, TILE_COUNTS, SAMPLE_FORMAT, DEPTH = 324, 325, 339, 32997
NEEDED: Final = (
    *(WIDTH, LENGTH, BITS, COMPRESSION, PHOTOMETRIC, FILL_ORDER, STRIP_OFFSETS, ORIENTATION),
    *(SAMPLES, ROWS_PER_STRIP, STRIP_COUNTS, PLANAR, PREDICTOR, TILE_WIDTH, TILE_LENGTH),
    *(TILE_OFFSETS, TILE_COUNTS, SAMPLE_FORMAT, DEPTH),
)
"""Tags without which, or with a wrong value of which, the pixels would be misread."""

NO_COMPRESSION: Final = 1
LOSSLESS: Final = {
    NO_COMPRESSION: "none",
    5: "LZW",
    8: "deflate",
    32946: "deflate (old code)",
    32773: "PackBits",
    50000: "Zstandard",
    34926: "Zstandard (old code)",
}
WITH_PREDICTOR: Final = frozenset({5, 8, 32946, 50000, 34926})
"""Elsewhere readers disagree on whether a stated predictor applies."""
PICTURE_COMPRESSIONS: Final = {
    **{2: "fax", 3: "fax", 4: "fax", 6: "JPEG", 7: "JPEG", 34892: "JPEG", 34712: "JPEG 2000"},
    **{33003: "JPEG 2000", 33005: "JPEG 2000", 50001: "WebP", 34927: "WebP", 50002: "JPEG XL"},
}
GREY: Final = (0, 1)
PICTURE_PHOTOMETRICS: Final = {
    **{2: "an RGB picture", 3: "a picture with a colour palette", 4: "a transparency mask"},
    **{5: "a picture in printing inks", 6: "a YCbCr picture", 8: "a picture in Lab colours"},
    **{9: "a picture in Lab colours", 10: "a picture in Lab colours"},
    **{32803: "a visible-light sensor's raw picture", 34892: "a sensor's raw picture"},
}
SAMPLE_TYPES: Final = {
    (1, 16): "uint16",
    (2, 16): "int16",
    (3, 32): "float32",
    (3, 64): "float64",
}
"""(SampleFormat, BitsPerSample) of what can be a measurement."""

WHOLE_NUMBERS: Final = (3, 4, 16)
"""TIFF data types SHORT, LONG and (BigTIFF) LONG8."""

EXPORT: Final = "export the radiometric data (float or 16-bit TIFF) instead"


@dataclass(frozen=True, slots=True)
class Layout:
    """What is needed to decode the first page, and what is worth saying of it."""

    rows: int
    columns: int
    sample_type: str
    notes: tuple[str, ...]


def check_layout(page: TiffPage, chain: Chain, file_size: int, limits: ReadLimits) -> Layout:
    """Return the layout of the first page.

    Raises NotAMeasurement for a picture, and UnreadableImage where the page is damaged, reaches
    beyond the file, exceeds ``limits`` or is packed in a way that is not supported.
    """
    for code in NEEDED:
        if code in chain.first_codes and page.tags.get(code) is None:
            raise UnreadableImage(f"damaged: its tag {code} cannot be read")
    rows, columns = _integer(page, LENGTH), _integer(page, WIDTH)
    if rows < 1 or columns < 1:
        raise UnreadableImage("damaged: it states no width or no height")
    which = "" if chain.pages == 1 else f"page 1 of {chain.pages} is "
    sample_type = _sample_type(page, which)
    if rows * columns > limits.max_pixels:
        raise UnreadableImage(
            f"states {columns} x {rows} pixels, more than the limit of {limits.max_pixels}"
        )
    if _integer(page, DEPTH, 1) != 1 or page.shape != (rows, columns):
        raise UnreadableImage("not a plane of one reading per pixel")
    compression = _integer(page, COMPRESSION, NO_COMPRESSION)
    if compression not in LOSSLESS:
        known = ", ".join(dict.fromkeys(name.split(" (")[0] for name in LOSSLESS.values()))
        raise UnreadableImage(
            f"its compression (code {compression}) is not supported; use one of: {known}"
        )
    _check_predictor(page, compression, sample_type)
    _check_segments(page, rows, columns, sample_type, chain, file_size, limits)
    return Layout(rows, columns, sample_type, tuple(_notes(page, chain)))


def _sample_type(page: TiffPage, which: str) -> str:
    """Return the type of the readings; refuse what is made for the eye."""
    photometric = _integer(page, PHOTOMETRIC, 1)
    if photometric in PICTURE_PHOTOMETRICS:
        what = PICTURE_PHOTOMETRICS[photometric]
        raise NotAMeasurement(f"{which}{what}, not a measurement; {EXPORT}")
    compression = _integer(page, COMPRESSION, NO_COMPRESSION)
    if compression in PICTURE_COMPRESSIONS:
        what = PICTURE_COMPRESSIONS[compression]
        raise NotAMeasurement(f"{which}a {what}-compressed picture, not a measurement; {EXPORT}")
    samples = _integer(page, SAMPLES, 1)
    if samples != 1:
        raise NotAMeasurement(
            f"{which}a picture of {samples} samples per pixel, not a measurement; {EXPORT}"
        )
    bits, sample_format = _integer(page, BITS, 1), _integer(page, SAMPLE_FORMAT, 1)
    if bits < 1:
        raise UnreadableImage("damaged: it states no bits per pixel")
    if bits == 1:
        raise NotAMeasurement(f"{which}a black-and-white picture, not a measurement; {EXPORT}")
    if bits <= 8:
        # 256 steps over a usual span of 100 K are 0.4 K each, above any camera's noise; and in
        # practice such a file is a grey rendering whose scale is lost.
        raise NotAMeasurement(
            f"{which}a picture of {counted(bits, 'bit')} per pixel, too coarse for a measurement; "
            f"{EXPORT}"
        )
    if photometric not in GREY:
        raise NotAMeasurement(
            f"{which}a picture (photometric code {photometric}), not a measurement; {EXPORT}"
        )
    found = SAMPLE_TYPES.get((sample_format, bits))
    if found is None:
        kinds = {1: "unsigned integers", 2: "signed integers", 3: "floating-point numbers"}
        kind = kinds.get(sample_format, f"samples of format {sample_format}")
        raise UnreadableImage(
            f"holds {bits}-bit {kind}, which are not supported; "
            "export float32, float64 or 16-bit integers"
        )
    return found


def _check_predictor(page: TiffPage, compression: int, sample_type: str) -> None:
    predictor = _integer(page, PREDICTOR, 1)
    # Horizontal differencing (2) of floats differences their bits as integers.
    known = (2, 3) if sample_type.startswith("float") else (2,)
    fits = predictor == 1 or (compression in WITH_PREDICTOR and predictor in known)
    if not fits:
        raise UnreadableImage(
            f"its predictor (code {predictor}) does not go with {sample_type} samples and "
            f"compression {LOSSLESS[compression]}; export without a predictor"
        )


def _check_segments(
    page: TiffPage,
    rows: int,
    columns: int,
    sample_type: str,
    chain: Chain,
    file_size: int,
    limits: ReadLimits,
) -> None:
    """Refuse strips or tiles that are missing, too few, beyond the file or where the tags are.

    The decoder would fill what is missing with zeros or leave it as it finds the memory.
    """
    tiled = any(page.tags.get(code) is not None for code in (TILE_WIDTH, TILE_LENGTH))
    if tiled:
        high, wide = _integer(page, TILE_LENGTH), _integer(page, TILE_WIDTH)
        if high < 1 or wide < 1:
            raise UnreadableImage("damaged: it states no tile size")
        across = math.ceil(columns / wide)
        expected = across * math.ceil(rows / high)
        if expected * high * wide > 2 * limits.max_pixels:
            raise UnreadableImage(
                f"states tiles of {wide} x {high} pixels, more than the limit allows"
            )
        offsets_code, counts_code = TILE_OFFSETS, TILE_COUNTS
    else:
        high, wide = min(rows, _integer(page, ROWS_PER_STRIP, rows)), columns
        if high < 1:
            raise UnreadableImage("damaged: it states no rows per strip")
        expected = math.ceil(rows / high)
        offsets_code, counts_code = STRIP_OFFSETS, STRIP_COUNTS
    name = "tile" if tiled else "strip"
    offsets, counts = _integers(page, offsets_code), _integers(page, counts_code)
    if len(offsets) != expected or len(counts) != expected:
        raise UnreadableImage(
            f"damaged: {counted(expected, name)} needed, but it lists {len(offsets)} offsets "
            f"and {len(counts)} sizes"
        )
    # The decoder must see the same list that was checked.
    if tuple(page.dataoffsets) != offsets or tuple(page.databytecounts) != counts:
        raise UnreadableImage(f"damaged: its list of {name}s is contradictory")
    plain = _integer(page, COMPRESSION, NO_COMPRESSION) == NO_COMPRESSION
    item_size = 8 if sample_type == "float64" else int(sample_type[-2:]) // 8
    for index, (offset, count) in enumerate(zip(offsets, counts, strict=True)):
        if offset < 8 or count < 1:
            raise UnreadableImage(f"incomplete: {name} {index + 1} of {expected} holds no data")
        if offset + count > file_size:
            raise UnreadableImage(
                f"truncated: {name} {index + 1} of {expected} ends at byte {offset + count}, "
                f"the file at byte {file_size}"
            )
        if offset < chain.first_end and offset + count > chain.first_start:
            raise UnreadableImage(f"damaged: {name} {index + 1} of {expected} overlaps the tags")
        if plain:
            height = high if tiled else min(high, rows - index * high)
            if count < height * wide * item_size:
                raise UnreadableImage(f"damaged: {name} {index + 1} of {expected} is too short")


def _notes(page: TiffPage, chain: Chain) -> list[str]:
    notes = []
    if chain.pages > 1:
        notes.append(f"The file holds {chain.pages} pages; only the first is used.")
    orientation = _integer(page, ORIENTATION, 1)
    if orientation != 1:
        notes.append(
            f"The file asks to be shown turned or mirrored (orientation {orientation}); "
            "it is used, and zones are placed, as stored."
        )
    return notes


def _integers(page: TiffPage, code: int) -> tuple[int, ...]:
    tag = page.tags.get(code)
    if tag is None:
        return ()
    value: Any = tag.value
    if hasattr(value, "tolist"):
        value = value.tolist()
    values = tuple(value) if isinstance(value, (tuple, list)) else (value,)
    if tag.dtype not in WHOLE_NUMBERS or not all(isinstance(item, int) for item in values):
        raise UnreadableImage(f"damaged: its tag {code} is no whole number")
    return tuple(int(item) for item in values)


def _integer(page: TiffPage, code: int, default: int = 0) -> int:
    """Return the single value of a tag, or the first where one a sample is listed."""
    values = _integers(page, code)
    return values[0] if values else default
