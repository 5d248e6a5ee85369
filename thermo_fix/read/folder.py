"""Which files of a folder are images."""

import re
from pathlib import Path
from typing import Final

from thermo_fix.errors import FolderError
from thermo_fix.read.wording import shown

SUFFIXES: Final = (".tif", ".tiff")
DIGITS: Final = re.compile(r"([0-9]+)")


def list_images(folder: Path) -> list[Path]:
    """Return every ``*.tif`` and ``*.tiff`` (any case) that lies directly in a folder.

    Relative to ``folder`` and in natural order: IR_2 before IR_10, upper and lower case alike,
    independent of the locale. Hidden files are left out. Entries with such a name that are no
    regular files are listed too, so that reading them reports them instead of losing them.

    Raises FolderError where the folder does not exist or cannot be listed.
    """
    try:
        names = [entry.name for entry in folder.iterdir()]
    except FileNotFoundError as error:
        raise FolderError(f"{shown(str(folder))}: no such folder") from error
    except NotADirectoryError as error:
        raise FolderError(f"{shown(str(folder))}: not a folder") from error
    except OSError as error:
        reason = error.strerror or "unknown reason"
        raise FolderError(f"{shown(str(folder))}: cannot be listed ({reason.lower()})") from error
    images = [
        name for name in names if not name.startswith(".") and name.lower().endswith(SUFFIXES)
    ]
    return [Path(name) for name in sorted(images, key=_natural)]


def _natural(name: str) -> tuple[tuple[tuple[str, int], ...], str]:
    """Sorting key: runs of digits compare as numbers, all else as case-folded text.

    The name itself comes last, so that names that differ only in case or in leading zeros keep
    one order.
    """
    parts = DIGITS.split(Path(name).stem.casefold())
    texts, numbers = parts[0::2], [int(part) for part in parts[1::2]]
    # A name that ends where another has a number sorts first.
    return tuple(zip(texts, [*numbers, -1], strict=True)), name
