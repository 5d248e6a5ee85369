"""A visible photograph beside an image: its bytes, and its size before anybody decodes it.

Sources: PNG specification (W3C, third edition), 5.2 and 11.2.1; ITU-T T.81 (JPEG), annex B.
"""

import struct
from pathlib import Path
from typing import Final

from thermo_fix.errors import UnreadableImage
from thermo_fix.read.content import read_bytes
from thermo_fix.read.limits import DEFAULT_LIMITS, ReadLimits

_PNG: Final = b"\x89PNG\r\n\x1a\n\x00\x00\x00\x0dIHDR"
_JPEG: Final = b"\xff\xd8"
_FRAMES: Final = frozenset(range(0xC0, 0xD0)) - {0xC4, 0xC8, 0xCC}
"""Markers of JPEG frame headers."""
_BARE: Final = frozenset({0x01, *range(0xD0, 0xD8)})
"""Markers without content."""


def read_photo(path: Path, *, limits: ReadLimits = DEFAULT_LIMITS) -> bytes:
    """Return the bytes of a JPEG or PNG photograph whose size is within the limits.

    Raises UnreadableImage, without the file's name, for anything else.
    """
    content = read_bytes(path, limits)
    if content.startswith(_PNG):
        size = _png_size(content)
    elif content.startswith(_JPEG):
        size = _jpeg_size(content)
    else:
        raise UnreadableImage("it is neither JPEG nor PNG")
    if size is None or min(size) < 1:
        raise UnreadableImage("it is damaged")
    width, height = size
    if width * height > limits.max_pixels:
        raise UnreadableImage(
            f"it states {width} x {height} pixels, more than the limit of {limits.max_pixels}"
        )
    return content


def _png_size(content: bytes) -> tuple[int, int] | None:
    if len(content) < len(_PNG) + 8:
        return None
    width, height = struct.unpack_from(">II", content, len(_PNG))
    return int(width), int(height)


def _jpeg_size(content: bytes) -> tuple[int, int] | None:
    """Walk along the markers to the frame header."""
    place = 2
    while place + 4 <= len(content):
        if content[place] != 0xFF:
            return None
        marker = content[place + 1]
        if marker == 0xFF:  # filling
            place += 1
        elif marker in _BARE:
            place += 2
        elif marker in _FRAMES:
            if place + 9 > len(content):
                return None
            height, width = struct.unpack_from(">HH", content, place + 5)
            return int(width), int(height)
        else:
            place += 2 + max(2, int(struct.unpack_from(">H", content, place + 2)[0]))
    return None
