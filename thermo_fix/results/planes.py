"""Corrected temperatures and uncertainties as TIFF planes.

Sources: TIFF revision 6.0 (Adobe, 1992); Adobe Photoshop TIFF technical notes 1 (deflate, code 8)
and 3 (floating-point predictor, code 3).
"""

import contextlib
import secrets
from collections.abc import Iterable
from io import BytesIO
from pathlib import Path
from typing import Final

import numpy as np
import tifffile
from numpy.typing import NDArray

from thermo_fix.errors import FolderError, UnreadableImage, reason_of
from thermo_fix.version import __version__

SOFTWARE: Final = f"thermo_fix {__version__}"
FLOAT_PREDICTOR: Final = 3
DEFLATE_LEVEL: Final = 6


def write_plane(
    path: Path,
    plane: NDArray[np.float32],
    *,
    carried_tags: Iterable[tuple[int, int, int, object]] = (),
    description: str = "",
) -> None:
    """Write one plane, (rows, columns) float32, atomically.

    Deflate with the floating-point predictor, little endian, without any time of writing, so
    that the same input gives the same bytes. ``carried_tags`` are those of the source's frame.
    ``description`` becomes the ImageDescription; TIFF text is 7-bit, so other characters are
    written as backslash escapes.

    Raises ValueError where ``plane`` is no float32 plane, FolderError where the file cannot be
    written; an earlier file of that name is then left as it was.
    """
    if plane.ndim != 2 or plane.dtype != np.float32 or plane.size == 0:
        raise ValueError(f"a plane is (rows, columns) float32, got {plane.shape} {plane.dtype}")
    buffer = BytesIO()
    tifffile.imwrite(
        buffer,
        np.ascontiguousarray(plane),
        byteorder="<",
        photometric="minisblack",
        compression="zlib",
        compressionargs={"level": DEFLATE_LEVEL},
        predictor=FLOAT_PREDICTOR,
        description=description.encode("ascii", "backslashreplace").decode("ascii") or None,
        software=SOFTWARE,
        metadata=None,
        maxworkers=1,
        extratags=[(*tag, True) for tag in sorted(carried_tags, key=lambda tag: tag[0])],
    )
    # A name of its own for each writer: one of a run that was killed may still be at work.
    partial = path.with_name(f".{path.name}.{secrets.token_hex(6)}.part")
    try:
        partial.write_bytes(buffer.getbuffer())
        partial.replace(path)
    except OSError as error:
        with contextlib.suppress(OSError):
            partial.unlink()
        raise FolderError(f"{path}: cannot be written ({reason_of(error)})") from error


def read_plane(path: Path) -> NDArray[np.float32]:
    """Return a plane written by ``write_plane``, (rows, columns) float32.

    Raises UnreadableImage where the file is missing, damaged or no such plane.
    """
    try:
        plane = tifffile.imread(path, maxworkers=1)
    except Exception as error:  # the library and its codecs raise nearly anything on damage
        raise UnreadableImage(f"{path.name}: a plane of results that cannot be read") from error
    if plane.ndim != 2 or plane.dtype != np.float32:
        raise UnreadableImage(f"{path.name}: not a float32 plane of results")
    return np.asarray(plane, dtype=np.float32)
