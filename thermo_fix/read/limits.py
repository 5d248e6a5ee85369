"""How much of a file is believed before it is refused."""

from dataclasses import dataclass
from typing import Final


@dataclass(frozen=True, slots=True)
class ReadLimits:
    """Sizes beyond which a file is refused instead of read.

    They keep a damaged or hostile file from filling the memory; no radiometric image comes near.
    """

    max_file_bytes: int = 2 * 1024**3
    max_pixels: int = 100_000_000
    """Of the first page, and of its tiles with their padding."""
    max_pages: int = 10_000
    max_tags: int = 4096
    """Of one page."""
    max_segments: int = 1_000_000
    """Strips or tiles of the first page, and numbers that any other tag may list."""
    max_metadata_bytes: int = 1024**2
    """Of one metadata tag."""
    max_table_bytes: int = 50 * 1024**2
    """Of a weather log: one row a minute for two years."""
    max_text_bytes: int = 1024**2
    """Of a file of criteria or of a response curve."""


DEFAULT_LIMITS: Final = ReadLimits()
