"""The chain of directories of a TIFF file, walked without trust.

Sources: TIFF revision 6.0 (Adobe, 1992), section 2; BigTIFF as in the TIFF library's design note.
"""

import struct
from dataclasses import dataclass
from typing import Final

from tifffile import TIFF

from thermo_fix.errors import UnreadableImage
from thermo_fix.read.limits import ReadLimits

CLASSIC: Final = 42
BIG: Final = 43

_LOADED: Final = frozenset(TIFF.TAG_LOAD) | frozenset(TIFF.TAG_READERS)
"""Tags whose values the TIFF library takes into memory as lists of numbers."""
_BYTES: Final = frozenset({1, 2, 6, 7})
"""TIFF data types BYTE, ASCII, SBYTE and UNDEFINED: one byte in memory too."""


@dataclass(frozen=True, slots=True)
class Chain:
    """What the walk along the directories found."""

    byte_order: str
    """``<`` or ``>``, as in the struct module."""
    pages: int
    first_codes: frozenset[int]
    """Codes of all tags that the first directory claims to hold."""
    first_start: int
    first_end: int
    """Bytes of the file that the first directory takes, half open."""


def walk_directories(content: bytes, limits: ReadLimits) -> Chain:
    """Follow the chain of directories to its end.

    Raises UnreadableImage where the content is no TIFF, where the chain leaves the file or
    returns on itself, and where it is longer than ``limits.max_pages``.
    """
    order = {b"II": "<", b"MM": ">"}.get(content[:2])
    version = struct.unpack(f"{order}H", content[2:4])[0] if order and len(content) >= 4 else 0
    if order is None or version not in (CLASSIC, BIG):
        raise UnreadableImage("not a TIFF file; export the radiometric data as TIFF")
    big = version == BIG
    count_format, offset_format = (f"{order}Q", f"{order}Q") if big else (f"{order}H", f"{order}I")
    entry_size = 20 if big else 12
    if big and content[4:8] != struct.pack(f"{order}HH", 8, 0):
        raise UnreadableImage("damaged: its BigTIFF header is wrong")

    offset = _unpack(offset_format, content, 8 if big else 4)
    if offset == 0:
        raise UnreadableImage("damaged: a TIFF file without any page")
    seen: set[int] = set()
    codes: frozenset[int] = frozenset()
    first_start, first_end = offset, offset
    while offset:
        if offset in seen:
            raise UnreadableImage("damaged: its chain of pages returns on itself")
        if len(seen) == limits.max_pages:
            raise UnreadableImage(f"holds more than the limit of {limits.max_pages} pages")
        seen.add(offset)
        entries = _unpack(count_format, content, offset)
        start = offset + struct.calcsize(count_format)
        end = start + entries * entry_size
        if entries == 0:
            raise UnreadableImage("damaged: a page without any tag")
        if entries > limits.max_tags:
            raise UnreadableImage(
                f"states {entries} tags, more than the limit of {limits.max_tags}"
            )
        if len(seen) == 1 and end <= len(content):
            first_end = end
            head = f"{order}HH{'Q' if big else 'I'}"
            found = [
                struct.unpack_from(head, content, entry) for entry in range(start, end, entry_size)
            ]
            _refuse_long_lists(found, limits)
            codes = frozenset(code for code, _, _ in found)
        offset = _unpack(offset_format, content, end)
    return Chain(order, len(seen), codes, first_start, first_end)


def _refuse_long_lists(found: list[tuple[int, int, int]], limits: ReadLimits) -> None:
    """Refuse a tag that would be turned into millions of numbers before anybody looks at it."""
    for code, kind, count in found:
        if code in _LOADED and kind not in _BYTES and count > limits.max_segments:
            raise UnreadableImage(
                f"its tag {code} lists {count} numbers, more than the limit of "
                f"{limits.max_segments}"
            )


def _unpack(number: str, content: bytes, offset: int) -> int:
    if offset + struct.calcsize(number) > len(content):
        raise UnreadableImage("truncated or damaged: a page lies beyond the end of the file")
    return int(struct.unpack_from(number, content, offset)[0])
