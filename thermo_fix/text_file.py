"""Text files of a survey: read whole, up to a size, as UTF-8; written whole or not at all."""

import contextlib
import os
import shutil
import stat
import tempfile
from pathlib import Path

from thermo_fix.errors import SheetError, one_line, reason_of


def read_text_file(path: Path, most_bytes: int, what: str, advice: str) -> str:
    """Return the text of a file, without a byte order mark.

    Parameters
    ----------
    path
        The file.
    most_bytes
        Size beyond which it is refused, before memory is taken.
    what
        What the file is, with its article, for messages.
    advice
        What to do where it is too large.

    Raises
    ------
    SheetError
        One line: it cannot be read, is no ordinary file, is too large or is not UTF-8.

    """
    name = one_line(path.name)
    try:
        # A pipe of this name must not keep us waiting for its other end.
        flags = os.O_RDONLY | getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0)
        with os.fdopen(os.open(path, flags), "rb") as stream:
            facts = os.fstat(stream.fileno())
            if not stat.S_ISREG(facts.st_mode):
                raise SheetError(f"{name}: this is no ordinary file; {what} is a text file")
            data = stream.read(most_bytes + 1) if facts.st_size <= most_bytes else b""
    except IsADirectoryError as error:
        raise SheetError(f"{name}: this is no ordinary file; {what} is a text file") from error
    except OSError as error:
        raise SheetError(
            f"{name}: cannot be read ({reason_of(error)}); check its permissions"
        ) from error
    if max(facts.st_size, len(data)) > most_bytes:
        raise SheetError(
            f"{name}: {max(facts.st_size, len(data)) / 1e6:.0f} MB is too large for {what} (at "
            f"most {most_bytes / 1e6:.0f} MB); {advice}"
        )
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise SheetError(f"{name}: the text is UTF-16; save it as UTF-8")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise SheetError(
            f"{name}, line {line}: the byte 0x{data[error.start]:02X} is not UTF-8 text; "
            "save the file as UTF-8"
        ) from error


def write_text_file(path: Path, text: str, *, mark: bytes = b"") -> None:
    """Write a text as UTF-8; the file is the old one until the new one is on the disk.

    Parameters
    ----------
    path
        The file; its permissions are kept.
    text
        Written as it is, without translating line ends.
    mark
        Bytes to stand before it.

    Raises
    ------
    OSError
        It cannot be written; an older file is then as it was.

    """
    # A new name that nobody can have laid a link under.
    handle, name = tempfile.mkstemp(".partial", f".{path.name}.", path.parent)
    partial = Path(name)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(mark + text.encode("utf-8"))
            stream.flush()
            os.fsync(stream.fileno())
        if path.exists():
            shutil.copymode(path, partial)
        else:
            mask = os.umask(0)
            os.umask(mask)
            partial.chmod(0o666 & ~mask)
        partial.replace(path)
    except OSError:
        with contextlib.suppress(OSError):
            partial.unlink()
        raise
