"""Open metadata tags of the first page: date, scale and offset, missing-value mark, georeference.

Sources: TIFF revision 6.0 (tag 306); Exif 2.32, CIPA DC-008 (tag 36867); OGC 19-008r4 GeoTIFF 1.1
(tags 33550, 33922, 34264, 34735 to 34737); the GDAL documentation of its GeoTIFF driver (tags
42112 and 42113). Nothing here loses an image: what cannot be used becomes a note.
"""

import math
import re
import struct
from dataclasses import dataclass
from datetime import datetime
from typing import Final
from xml.parsers import expat

from tifffile import TiffPage

from thermo_fix.read.limits import ReadLimits
from thermo_fix.read.wording import quoted

DATE_TIME, EXIF_DIRECTORY, DATE_TIME_ORIGINAL = 306, 34665, 36867
GDAL_METADATA, GDAL_NODATA = 42112, 42113
ASCII, SHORT, DOUBLE = 2, 3, 12
GEOREFERENCE: Final = {
    33550: DOUBLE,  # ModelPixelScale
    33922: DOUBLE,  # ModelTiepoint
    34264: DOUBLE,  # ModelTransformation
    34735: SHORT,  # GeoKeyDirectory
    34736: DOUBLE,  # GeoDoubleParams
    34737: ASCII,  # GeoAsciiParams
}
WANTED: Final = (DATE_TIME, DATE_TIME_ORIGINAL, GDAL_METADATA, GDAL_NODATA, *GEOREFERENCE)
FORMATS: Final = {SHORT: "H", DOUBLE: "d"}

DATE_PATTERN: Final = re.compile(
    r"([0-9]{4}):([0-9]{2}):([0-9]{2}) ([0-9]{2}):([0-9]{2}):([0-9]{2})"
)
UNITS: Final = {
    **dict.fromkeys(("k", "kelvin", "kelvins"), "kelvin"),
    **dict.fromkeys(("degc", "deg c", "°c", "℃", "c", "celsius"), "celsius"),
    **dict.fromkeys(("degree celsius", "degrees celsius", "degree_celsius"), "celsius"),
}

_MOST_EXIF_TAGS: Final = 1000
_LONGEST_DATE: Final = 100

CarriedTag = tuple[int, int, int, object]


@dataclass(frozen=True, slots=True)
class RawTag:
    """One tag as the bytes of the file, not yet believed."""

    data_type: int
    content: bytes
    oversized: bool = False
    """Larger than the limit; the content is then left out."""


@dataclass(frozen=True, slots=True)
class Scaling:
    """What the file's own metadata says of how its values turn into temperature."""

    scale: float | None = None
    offset: float | None = None
    unit: str | None = None
    """``kelvin``, ``celsius``, or None where it says nothing."""
    problem: str | None = None
    """Why the metadata cannot be used."""

    @property
    def silent(self) -> bool:
        """Whether nothing was found that would change or explain a value."""
        return self.unit is None and self.scale in (None, 1.0) and self.offset in (None, 0.0)


def raw_tags(page: TiffPage, content: bytes, limits: ReadLimits) -> dict[int, RawTag]:
    """Return the wanted tags of a page, those beyond the limit without their content."""
    found = {}
    for code in WANTED:
        tag = page.tags.get(code)
        if tag is None:
            continue
        size = int(tag.valuebytecount)
        oversized = size > limits.max_metadata_bytes
        piece = b"" if oversized else content[tag.valueoffset : tag.valueoffset + size]
        found[code] = RawTag(int(tag.dtype), piece, oversized)
    return found


def exif_date(page: TiffPage, content: bytes) -> str | None:
    """Return the original date in the page's Exif directory, as its text.

    Only this one tag is looked at: a reader of the whole directory would take each of its tags
    into memory, whatever they claim to hold.

    Raises struct.error where the directory lies beyond the file.
    """
    tag = page.tags.get(EXIF_DIRECTORY)
    if tag is None:
        return None
    tiff = page.parent.tiff
    start = tag.valueoffset
    # Code and type, then count and value, in the byte order that both begin with.
    entry_format = tiff.tagformat1 + tiff.tagformat2[1:]
    entries = struct.unpack_from(tiff.tagnoformat, content, start)[0]
    for index in range(min(int(entries), _MOST_EXIF_TAGS)):
        place = start + tiff.tagnosize + index * tiff.tagsize
        code, kind, count, inline = struct.unpack_from(entry_format, content, place)
        if code != DATE_TIME_ORIGINAL or kind != ASCII or count > _LONGEST_DATE:
            continue
        if count <= tiff.tagoffsetthreshold:
            return _plain(inline[:count])
        offset = struct.unpack(tiff.offsetformat, inline)[0]
        return _plain(content[offset : offset + count])
    return None


def _plain(content: bytes) -> str:
    return content.split(b"\0")[0].decode("utf-8", "replace").strip()


def read_date(tags: dict[int, RawTag], exif: str | None) -> tuple[datetime | None, list[str]]:
    """Return when the image was taken (local time of the camera) and notes.

    The Exif original date comes before the DateTime tag, which is that of the last change.
    """
    notes: list[str] = []
    original = tags.get(DATE_TIME_ORIGINAL)
    changed = tags.get(DATE_TIME)
    for text in (
        exif,
        None if original is None else _text(original),
        None if changed is None else _text(changed),
    ):
        if text is None or not text.strip(" :"):  # Exif: blanks between the colons are unknown
            continue
        date = _date(text)
        if date is not None:
            return date, notes
        notes.append(f"Its date {quoted(text)} is not used: not of the form 2026:01:31 23:59:59.")
    return None, notes


def _date(text: str) -> datetime | None:
    match = DATE_PATTERN.fullmatch(text.strip())
    if match is None:
        return None
    try:
        return datetime(*(int(part) for part in match.groups()))  # type: ignore[arg-type]
    except ValueError:
        return None


def read_nodata(tags: dict[int, RawTag]) -> tuple[float | None, list[str]]:
    """Return the value that marks a pixel without a reading, and notes."""
    tag = tags.get(GDAL_NODATA)
    if tag is None:
        return None, []
    text = _text(tag)
    try:
        return float(text), []
    except ValueError:
        return None, [f"Its mark for missing pixels {quoted(text)} is not used: no number."]


def read_scaling(tags: dict[int, RawTag]) -> Scaling:
    """Return scale, offset and unit from the metadata items of the first sample.

    The XML is untrusted: a document type declaration (and with it every entity) is refused.
    """
    tag = tags.get(GDAL_METADATA)
    if tag is None:
        return Scaling()
    if tag.oversized:
        return Scaling(problem="they are larger than the limit")
    reader = _ItemReader()
    try:
        reader.read(tag.content.rstrip(b"\0"))
        scale, offset = reader.number("scale"), reader.number("offset")
    except (expat.ExpatError, ValueError) as error:
        return Scaling(problem=str(error))
    if scale == 0.0:
        return Scaling(problem="its scale is 0")
    unit_text = reader.items.get("unittype", "").strip()
    unit = UNITS.get(unit_text.casefold())
    if unit_text and unit is None:
        return Scaling(problem=f"its unit {quoted(unit_text)} is neither K nor degC")
    return Scaling(scale, offset, unit)


class _ItemReader:
    """Collects the text of ``<Item role="...">`` elements that speak of the first sample."""

    def __init__(self) -> None:
        self.items: dict[str, str] = {}
        self._role: str | None = None

    def read(self, document: bytes) -> None:
        parser = expat.ParserCreate("utf-8")
        parser.StartDoctypeDeclHandler = self._refuse
        parser.StartElementHandler = self._start
        parser.EndElementHandler = self._end
        parser.CharacterDataHandler = self._text
        parser.Parse(document, True)

    def number(self, role: str) -> float | None:
        text = self.items.get(role)
        if text is None:
            return None
        try:
            value = float(text)
        except ValueError:
            value = math.nan
        if not math.isfinite(value):
            raise ValueError(f"its {role} {quoted(text.strip())} is no number")
        return value

    def _refuse(self, *_arguments: object) -> None:
        raise ValueError("it holds a document type declaration")

    def _start(self, element: str, attributes: dict[str, str]) -> None:
        role = attributes.get("role", attributes.get("name", "")).casefold()
        first = attributes.get("sample", "0").strip() == "0"
        wanted = element == "Item" and first and role in ("scale", "offset", "unittype")
        self._role = role if wanted and role not in self.items else None
        if self._role:
            self.items[self._role] = ""

    def _end(self, _element: str) -> None:
        self._role = None

    def _text(self, text: str) -> None:
        if self._role:
            self.items[self._role] += text


def carried_tags(
    tags: dict[int, RawTag], byte_order: str
) -> tuple[tuple[CarriedTag, ...], list[str]]:
    """Return georeference and date tags as (code, TIFF data type, count, value), and notes.

    The count of a text is that of its bytes with the closing NUL. The value is a str or a tuple.
    """
    carried: list[CarriedTag] = []
    notes = []
    for code, data_type in {DATE_TIME: ASCII, **GEOREFERENCE}.items():
        tag = tags.get(code)
        if tag is None:
            continue
        value = _carried_value(tag, data_type, byte_order)
        if code == DATE_TIME and (not isinstance(value, str) or _date(value) is None):
            continue  # a wrong date has its note already
        if value is None:
            notes.append(f"Its georeference tag {code} is damaged and not kept in the results.")
            continue
        count = len(value) + 1 if isinstance(value, str) else len(value)
        carried.append((code, data_type, count, value))
    return tuple(carried), notes


def _carried_value(
    tag: RawTag, data_type: int, byte_order: str
) -> str | tuple[int | float, ...] | None:
    if tag.data_type != data_type or not tag.content:
        return None
    if data_type == ASCII:
        text = tag.content.split(b"\0")[0]
        return text.decode("ascii") if text.isascii() and text else None
    number = FORMATS[data_type]
    size = struct.calcsize(number)
    if len(tag.content) % size:
        return None
    return struct.unpack(f"{byte_order}{len(tag.content) // size}{number}", tag.content)


def _text(tag: RawTag) -> str:
    return _plain(tag.content)
