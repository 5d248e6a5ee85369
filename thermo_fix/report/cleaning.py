"""Text from outside, made fit for a page."""

import re
from typing import Final

from markupsafe import Markup

_UNSAFE: Final = re.compile(
    "[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff\ufdd0-\ufdef\ufffe\uffff"
    "\u202a-\u202e\u2066-\u2069]|[\U0001fffe\U0001ffff]"
)
"""Control characters, half surrogates (from odd file names), non-characters, and marks that turn
the direction of the text around them."""


def clean(value: object) -> object:
    """Replace characters that have no place in a page; markup of our own passes unchanged."""
    if isinstance(value, str) and not isinstance(value, Markup) and not value.isprintable():
        return clean_text(value)
    return value


def clean_text(text: str) -> str:
    """The same for what is known to be plain text."""
    return _UNSAFE.sub("\N{REPLACEMENT CHARACTER}", text)


def css_string(text: str) -> str:
    """A text as a string of a style sheet, every unusual character escaped.

    Source: CSS Syntax Module Level 3, 4.3.7 (escapes).
    """
    one_line = " ".join(clean_text(text).split())
    written = (
        character if character.isalnum() and character.isascii() else f"\\{ord(character):x} "
        for character in one_line
    )
    return '"' + "".join(written) + '"'
