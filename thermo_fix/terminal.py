"""How the commands speak: everything that they print goes through here.

What is printed may come from a sheet, a file name or a file. Shown as it is, it could forge lines,
colours or whole screens; here each call prints one line in which nothing is hidden.
"""

import sys
import traceback
from typing import TextIO

from thermo_fix.errors import one_line

PROGRAM = "thermo-fix"


def say(line: str) -> None:
    """Print one line on standard output."""
    _write(sys.stdout, line)


def problem(line: str) -> None:
    """Print one line about a trouble on standard error."""
    _write(sys.stderr, f"{PROGRAM}: {line}")


def several_lines(text: str) -> None:
    """Print a text of the program's own, line by line, on standard error."""
    for line in text.splitlines():
        _write(sys.stderr, line)


def trace(error: BaseException) -> None:
    """Print where an error arose and what caused it, on standard error."""
    for part in traceback.format_exception(error):
        several_lines(part)


def _write(stream: TextIO, line: str) -> None:
    # A terminal that lacks a character gets its escape rather than no line at all.
    encoding = stream.encoding or "utf-8"
    stream.write(one_line(line).encode(encoding, "backslashreplace").decode(encoding) + "\n")
