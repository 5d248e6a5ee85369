"""Put one key into a survey sheet that somebody wrote, and leave all else as it stands."""

import codecs
import copy
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import tomlkit

from thermo_fix.errors import FolderError, SheetError, reason_of
from thermo_fix.sheet import files, toml_text
from thermo_fix.sheet.lines import KeyPath, line_numbers
from thermo_fix.sheet.schema import SHEET_NAME
from thermo_fix.text_file import write_text_file

_NEW = "new"


def put_key(
    folder: Path, file: str, zone: str | None, key: str, value: str, *, force: bool = False
) -> str:
    """Write ``key = value`` into the table of an image or of one of its zones.

    Comments, order and layout are kept: a new key gets a line of its own behind the last key of
    its table, an old one changes its value alone. The sheet is replaced as a whole or not at all.

    Parameters
    ----------
    folder
        The survey.
    file, zone
        The image, as the sheet names it, and the zone; None for the image itself.
    key
        Key of that table; with a dot for a key of an inline table that stands there already.
    value
        TOML text of the value.
    force
        Overwrite a key that is there.

    Returns
    -------
    str
        Where it was written, in words.

    Raises
    ------
    SheetError
        No such image or zone in the sheet, the key is there already, or the sheet cannot be
        edited safely.
    FolderError
        No sheet, or it cannot be written.

    """
    path = folder / SHEET_NAME
    if not path.is_file():
        raise FolderError(
            f"{path}: there is no survey sheet to write to; thermo-fix draft writes one"
        )
    text = toml_text.read_text(path)
    raw = toml_text.parse(text, SHEET_NAME)
    place = _place(raw, file, zone)
    where = f"image {file}" if zone is None else f"zone {zone} of {file}"
    wanted = copy.deepcopy(raw)
    table = _at(wanted, place)
    names = key.split(".")
    if not _has(table, names[:-1]):
        raise SheetError(f"{SHEET_NAME}: {where} has no {names[0]} of its own to write to")
    there = _has(table, names)
    if there and not force:
        line = line_numbers(text).get((*place, *names), line_numbers(text).get(place, 1))
        raise SheetError(
            f"{SHEET_NAME}, line {line}: {where} has its {key} already; use --force to overwrite it"
        )
    _set(table, names, tomllib.loads(f"{_NEW} = {value}")[_NEW])
    edited = _replaced(text, place, names, value) if there else None
    if not there and len(names) == 1:
        edited = _inserted(text, place, key, value, wanted)
    if edited is None or not _means(edited, wanted):
        edited = _replaced(text, place, names, value)
    if edited is None or not _means(edited, wanted):
        raise SheetError(
            f"{SHEET_NAME}: the line cannot be put in without changing other things; write "
            f"{key} = {value} by hand, at {where}"
        )
    _write(path, edited)
    return f"{SHEET_NAME}, {where}"


def _place(raw: Mapping[str, Any], file: str, zone: str | None) -> KeyPath:
    images = raw.get("image", [])
    for number, image in enumerate(images):
        if files.normal_name(str(image.get("file", ""))) != file:
            continue
        if zone is None:
            return "image", number
        for place, each in enumerate(image.get("zone", [])):
            if str(each.get("name", "")).strip() == zone:
                return "image", number, "zone", place
        raise SheetError(f'{SHEET_NAME}: image {file} has no zone "{zone}"')
    raise SheetError(f'{SHEET_NAME}: has no [[image]] with file = "{file}"; add one to write to')


def _at(tables: Any, place: KeyPath) -> Any:
    for step in place:
        tables = tables[step]
    return tables


def _has(table: Any, names: list[str]) -> bool:
    for name in names:
        if not isinstance(table, Mapping) or name not in table:
            return False
        table = table[name]
    return True


def _set(table: Any, names: list[str], value: Any) -> None:
    for name in names[:-1]:
        table = table[name]
    table[names[-1]] = value


def _inserted(
    text: str, place: KeyPath, key: str, value: str, wanted: Mapping[str, Any]
) -> str | None:
    """Insert a line behind the last key of a table whose value ends on its own line."""
    newline = "\r\n" if "\r\n" in text else "\n"
    lines = [f"{line}\n" for line in text.split("\n")]
    lines[-1] = lines[-1][:-1]
    own = {
        number
        for path, number in line_numbers(text).items()
        if len(path) == len(place) + 1 and path[:-1] == place and path[-1] not in ("zone", "detect")
    }
    for number in sorted(own, reverse=True):
        before = lines[:number]
        if not before[-1].endswith("\n"):
            before[-1] += newline
        indent = before[-1][: len(before[-1]) - len(before[-1].lstrip(" \t"))]
        edited = "".join([*before, f"{indent}{key} = {value}{newline}", *lines[number:]])
        # Behind the first line of a longer value the text would not parse, or mean another thing.
        if _means(edited, wanted):
            return edited
    return None


def _replaced(text: str, place: KeyPath, names: list[str], value: str) -> str | None:
    document = tomlkit.parse(text)
    try:
        _set(_at(document, place), names, tomlkit.parse(f"{_NEW} = {value}")[_NEW])
    except (KeyError, TypeError, tomlkit.exceptions.TOMLKitError):
        return None
    return tomlkit.dumps(document)


def _means(text: str, wanted: Mapping[str, Any]) -> bool:
    try:
        return tomllib.loads(text) == wanted
    except tomllib.TOMLDecodeError:
        return False


def _write(path: Path, text: str) -> None:
    path = path.resolve()
    try:
        mark = codecs.BOM_UTF8 if path.read_bytes().startswith(codecs.BOM_UTF8) else b""
        write_text_file(path, text, mark=mark)
    except OSError as error:
        raise FolderError(
            f"{path}: cannot be written ({reason_of(error)}); check its permissions"
        ) from error
