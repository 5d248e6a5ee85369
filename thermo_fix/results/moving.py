"""Files and folders that outlive a power cut, and folders that change places in one step."""

import contextlib
import ctypes
import os
from functools import cache
from pathlib import Path
from typing import Any

_HERE = -100
"""AT_FDCWD of Linux: paths are relative to the working folder."""
_SWAP = 2
"""RENAME_EXCHANGE of Linux, renameat2(2)."""


def flush_tree(folder: Path) -> None:
    """Wait until everything in a folder has reached the disk.

    Raises OSError, for instance where the disk turns out to be full only now.
    """
    for place, _, names in os.walk(folder, topdown=False):
        for name in names:
            descriptor = os.open(Path(place, name), os.O_RDONLY)
            try:
                os.fsync(descriptor)
            finally:
                os.close(descriptor)
        flush_folder(Path(place))


def flush_folder(folder: Path) -> None:
    """Wait until the names in a folder have reached the disk, where the system knows of that."""
    with contextlib.suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)


def swap(first: Path, second: Path) -> bool:
    """Let two folders change places in one step.

    Returns
    -------
    bool
        False where the system or the file system cannot; then nothing has happened.

    """
    call = _renameat2()
    if call is None:
        return False
    return bool(call(_HERE, os.fsencode(first), _HERE, os.fsencode(second), _SWAP) == 0)


@cache
def _renameat2() -> Any:
    try:
        call = ctypes.CDLL(None).renameat2
    except (AttributeError, OSError, TypeError):  # another system, or an older one
        return None
    call.argtypes = (ctypes.c_int, ctypes.c_char_p, ctypes.c_int, ctypes.c_char_p, ctypes.c_uint)
    call.restype = ctypes.c_int
    return call
