"""One image file to one frame."""

import contextlib
import hashlib
from io import BytesIO
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from tifffile import TiffFile

from thermo_fix.errors import ImageError, UnreadableImage
from thermo_fix.read import metadata
from thermo_fix.read.content import read_bytes
from thermo_fix.read.decode import decode_values, untrusted
from thermo_fix.read.directory import Chain, walk_directories
from thermo_fix.read.encoding import settle_encoding
from thermo_fix.read.layout import Layout, check_layout
from thermo_fix.read.limits import DEFAULT_LIMITS, ReadLimits
from thermo_fix.read.metadata import RawTag
from thermo_fix.read.wording import counted, quoted, shown
from thermo_fix.records import Camera, Frame


def read_frame(path: Path, camera: Camera, *, limits: ReadLimits = DEFAULT_LIMITS) -> Frame:
    """Return the first page of a TIFF file as a radiometric image.

    float32 and float64 (degC or K) and 16-bit integers (linear counts) are read; strips or tiles,
    either byte order, classic or BigTIFF, uncompressed or packed without loss. Values come as
    stored, read-only, (rows, columns); infinite values and pixels that the file marks as missing
    are NaN, for which integers become float32.

    Raises UnreadableImage (no TIFF, damaged, not supported), NotAMeasurement (a picture) or
    UnclearEncoding (more than one meaning), each with one line that names the file.
    """
    try:
        return _read(path, camera, limits)
    except ImageError as error:
        raise type(error)(f"{shown(path)}: {error}") from error.__cause__
    except MemoryError as error:
        raise UnreadableImage(
            f"{shown(path)}: too large for the memory of this computer"
        ) from error


def _read(path: Path, camera: Camera, limits: ReadLimits) -> Frame:
    content = read_bytes(path, limits)
    chain = walk_directories(content, limits)
    layout, stored, tags, exif = _decode(content, chain, limits)
    scaling = metadata.read_scaling(tags)
    taken, date_notes = metadata.read_date(tags, exif)
    nodata, nodata_notes = metadata.read_nodata(tags)
    carried, carried_notes = metadata.carried_tags(tags, chain.byte_order)
    values, missing_notes = _without_missing(stored, nodata)
    encoding, encoding_notes = settle_encoding(values, layout.sample_type, camera, scaling)
    values.setflags(write=False)
    return Frame(
        path=path,
        values=values,
        encoding=encoding,
        sha256=hashlib.sha256(content).hexdigest(),
        taken=taken,
        notes=(
            *layout.notes,
            *date_notes,
            *nodata_notes,
            *missing_notes,
            *encoding_notes,
            *carried_notes,
        ),
        carried_tags=carried,
    )


def _decode(
    content: bytes, chain: Chain, limits: ReadLimits
) -> tuple[Layout, NDArray[Any], dict[int, RawTag], str | None]:
    """Return layout, pixel values, wanted tags and Exif date of the first page."""
    with untrusted():
        # Flags of private formats would send the library along their own ways of finding pixels.
        file = TiffFile(BytesIO(content), is_lsm=False, is_scanimage=False, is_ndpi=False)
        with file:
            page = file.pages.first
            layout = check_layout(page, chain, len(content), limits)
            values = decode_values(page, layout)
            tags = metadata.raw_tags(page, content, limits)
            exif = None
            with contextlib.suppress(UnreadableImage), untrusted():
                exif = metadata.exif_date(page, content)  # a damaged date does not cost the image
    return layout, values, tags, exif


def _without_missing(values: NDArray[Any], nodata: float | None) -> tuple[NDArray[Any], list[str]]:
    """Return the values with NaN where there is no reading, and notes.

    Raises UnreadableImage where no finite value is left.
    """
    notes = []
    floating = np.issubdtype(values.dtype, np.floating)
    if nodata is not None and np.isfinite(nodata):
        with np.errstate(all="ignore"):
            # A float32 image holds the mark rounded to float32.
            mark = values.dtype.type(nodata) if floating else nodata
        missing = values == mark
        number = int(np.count_nonzero(missing))
        if number:
            if not floating:
                values = values.astype(np.float32)  # holds every 16-bit integer exactly
            values[missing] = np.nan
            notes.append(
                f"{counted(number, 'pixel')} marked as missing (value {quoted(f'{nodata:g}')}) "
                f"{'is' if number == 1 else 'are'} left out."
            )
    if np.issubdtype(values.dtype, np.floating):
        infinite = np.isinf(values)
        number = int(np.count_nonzero(infinite))
        if number:
            values[infinite] = np.nan
            notes.append(
                f"{counted(number, 'pixel')} with an infinite value "
                f"{'is' if number == 1 else 'are'} left out."
            )
        if np.isnan(values).all():
            raise UnreadableImage("holds no finite value")
    return values, notes
