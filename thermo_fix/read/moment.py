"""When an image was taken, without decoding a pixel."""

import contextlib
from datetime import datetime
from io import BytesIO
from pathlib import Path

from tifffile import TiffFile

from thermo_fix.errors import ImageError
from thermo_fix.read import metadata
from thermo_fix.read.content import read_bytes
from thermo_fix.read.decode import untrusted
from thermo_fix.read.directory import walk_directories
from thermo_fix.read.limits import DEFAULT_LIMITS, ReadLimits


def image_moment(path: Path, *, limits: ReadLimits = DEFAULT_LIMITS) -> datetime | None:
    """Return when an image was taken, from its date tags (local time of the camera).

    Parameters
    ----------
    path
        A TIFF file; untrusted.
    limits
        As for ``read_frame``.

    Returns
    -------
    datetime or None
        None where it is not told, and where the file cannot be read: it fails later, as an image.

    """
    taken = None
    with contextlib.suppress(ImageError, MemoryError):
        content = read_bytes(path, limits)
        walk_directories(content, limits)
        with (
            untrusted(),
            TiffFile(BytesIO(content), is_lsm=False, is_scanimage=False, is_ndpi=False) as file,
        ):
            page = file.pages.first
            tags = metadata.raw_tags(page, content, limits)
            exif = None
            with contextlib.suppress(ImageError), untrusted():
                exif = metadata.exif_date(page, content)
            taken, _ = metadata.read_date(tags, exif)
    return taken
