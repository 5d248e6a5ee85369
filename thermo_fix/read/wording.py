"""Text from outside made fit for a one-line message."""

from pathlib import Path

from thermo_fix.errors import one_line

LONGEST_QUOTE = 60


def shown(name: str | Path) -> str:
    """Return the last part of a path, printable on any terminal.

    A file name may hold a line break, a control character or bytes that are no text; those are
    shown as escapes.
    """
    return one_line(name.name if isinstance(name, Path) else name)


def quoted(value: object) -> str:
    """Return a value found in a file, shortened and printable, in quotation marks."""
    text = shown(str(value))
    return f"'{text[:LONGEST_QUOTE]}...'" if len(text) > LONGEST_QUOTE else f"'{text}'"


def counted(number: int, noun: str) -> str:
    """Return ``1 pixel`` or ``2 pixels``."""
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
