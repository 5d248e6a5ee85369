"""The bytes of one regular file, read once."""

import os
import stat
from pathlib import Path
from typing import Final

from thermo_fix.errors import UnreadableImage
from thermo_fix.read.limits import ReadLimits

KINDS: Final = {
    stat.S_IFDIR: "a folder",
    stat.S_IFIFO: "a pipe",
    stat.S_IFSOCK: "a socket",
    stat.S_IFCHR: "a device",
    stat.S_IFBLK: "a device",
}


def read_bytes(path: Path, limits: ReadLimits) -> bytes:
    """Return the whole content of a regular file.

    Read in one go, so that hash and values agree even if the file is replaced meanwhile.

    Raises UnreadableImage for anything but a regular file (without waiting for the other end of
    a pipe), for an empty file and for one beyond ``limits.max_file_bytes``.
    """
    try:
        _refuse_irregular(path.stat().st_mode)
        # Between the two checks the file may have been replaced by a pipe: do not wait for it.
        descriptor = os.open(
            path,
            os.O_RDONLY | getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0),
        )
        with os.fdopen(descriptor, "rb") as file:
            status = os.fstat(file.fileno())
            _refuse_irregular(status.st_mode)
            _refuse_oversize(status.st_size, limits)
            content = file.read(limits.max_file_bytes + 1)
    except FileNotFoundError as error:
        if path.is_symlink():
            raise UnreadableImage("a link to a file that is not there") from error
        raise UnreadableImage("no such file") from error
    except MemoryError as error:
        raise UnreadableImage("too large for the memory of this computer") from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not a valid path"
        raise UnreadableImage(f"cannot be read ({reason.lower()})") from error
    _refuse_oversize(len(content), limits)
    if not content:
        raise UnreadableImage("an empty file; copy it from the camera again")
    return content


def _refuse_irregular(mode: int) -> None:
    if not stat.S_ISREG(mode):
        kind = KINDS.get(stat.S_IFMT(mode), "no regular file")
        raise UnreadableImage(f"{kind}, not an image file")


def _refuse_oversize(size: int, limits: ReadLimits) -> None:
    if size > limits.max_file_bytes:
        raise UnreadableImage(
            f"the file is larger than the limit of {limits.max_file_bytes / 1024**2:.0f} MiB"
        )
