"""Everything that is wrong with one sheet, each with its line and in the user's words."""

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date
from difflib import get_close_matches

from pydantic import ValidationError

from thermo_fix.errors import SheetError
from thermo_fix.sheet.lines import KeyPath, line_numbers, line_of
from thermo_fix.sheet.schema import SHEET_NAME, homes_of, known_keys

MOST_SHOWN = 200
"""Lines of one error; a sheet with more mistakes has one mistake many times over."""

_LONGEST_VALUE = 60


@dataclass(frozen=True, slots=True)
class _Problem:
    path: KeyPath
    words: str
    show_value: bool = True
    see: KeyPath | None = None
    """Another place of the sheet, whose line is added."""


@dataclass(slots=True)
class Problems:
    """The mistakes found so far in one sheet."""

    text: str
    """The sheet as read."""
    raw: Mapping[str, object]
    """The sheet as parsed, before any check."""
    old_keys: Mapping[KeyPath, str] = field(default_factory=dict)
    """By path with the new name of a key that was renamed: the old one, which stands there."""
    found: list[_Problem] = field(default_factory=list)

    def add(self, path: KeyPath, words: str, see: KeyPath | None = None) -> None:
        """Add a mistake in the value at a path."""
        self.found.append(_Problem(path, words, see=see))

    def add_about_table(self, path: KeyPath, words: str) -> None:
        """Add a mistake of which no single value is the cause."""
        self.found.append(_Problem(path, words, show_value=False))

    def add_from(self, error: ValidationError, path: KeyPath) -> None:
        """Add what the models found in the table at ``path``."""
        for detail in error.errors(include_url=False):
            inside = (*path, *detail["loc"])
            kind = detail["type"]
            if kind == "extra_forbidden":
                self.unknown_key(inside)
            elif kind == "missing":
                self.add_about_table(inside[:-1], f'"{inside[-1]}" is missing; add it here')
            elif kind == "sheet":
                self.add((*inside, *detail["ctx"]["inner"]), detail["ctx"]["words"])
            elif kind in ("model_type", "model_attributes_type", "dict_type"):
                self.add(inside, f"write a table: {_table_form(inside)}")
            else:
                self.add(inside, detail["msg"])

    def unknown_key(self, path: KeyPath) -> None:
        """Add a key that the table around it does not have."""
        key, table = str(path[-1]), path[:-1]
        homes = homes_of(key)
        near = f'"{key}" of {", ".join(homes)}' if homes else f'"{nearest(key, known_keys(table))}"'
        self.found.append(
            _Problem(
                path,
                f"unknown key {_shown(key)} in {where(table)}; nearest known key: {near}",
                show_value=False,
            )
        )

    def raise_any(self) -> None:
        """Raise ``SheetError`` with one line for each mistake, if there are any."""
        if not self.found:
            return
        lines = line_numbers(self.text)
        ordered = sorted(self.found, key=lambda problem: line_of(lines, problem.path))
        written = list(dict.fromkeys(self._sentence(problem, lines) for problem in ordered))
        if len(written) > MOST_SHOWN:
            more = len(written) - MOST_SHOWN
            written = [*written[:MOST_SHOWN], f"{SHEET_NAME}: and {more} more mistakes"]
        raise SheetError(written)

    def _sentence(self, problem: _Problem, lines: Mapping[KeyPath, int]) -> str:
        path, value = self._existing(problem.path)
        start = f"{SHEET_NAME}, line {line_of(lines, path)}: "
        words = problem.words
        if problem.see is not None:
            words += f" (the other is on line {line_of(lines, problem.see)})"
        if words.startswith("unknown key"):
            return start + words
        shown = _value_words(value) if problem.show_value else None
        return f"{start}{where(path)}{'' if shown is None else f' = {shown}'}: {words}"

    def _existing(self, path: KeyPath) -> tuple[KeyPath, object]:
        """Cut a path to what stands in the sheet: a bare number has no ``value`` inside."""
        value: object = self.raw
        written: KeyPath = ()
        for length, named in enumerate(path, 1):
            step = self.old_keys.get(path[:length], named)
            if isinstance(value, dict) and step in value:
                value = value[step]
            elif isinstance(value, list) and isinstance(step, int) and step < len(value):
                value = list(value)[step]
            else:
                return written, value
            written = (*written, step)
        return written, value


def nearest(word: str, known: tuple[str, ...] | list[str]) -> str:
    """Return the known word most like another one; case and hyphens weigh nothing."""
    by_form = {name.lower().replace("-", "_"): name for name in known}
    asked = word[:80].lower().replace("-", "_").replace(" ", "_")
    return by_form[get_close_matches(asked, by_form, n=1, cutoff=0.0)[0]]


def where(path: KeyPath) -> str:
    """Write a path as a person would: ``[image 3, zone 2].emissivity``."""
    heading: list[str] = []
    place = 0
    while place < len(path) and (
        not heading or isinstance(path[place], int) or _is_zone(path, place)
    ):
        step = path[place]
        if isinstance(step, int):
            heading[-1] = f"{heading[-1]} {step + 1}"
        else:
            heading.append(_plain(step))
        place += 1
    if not heading:
        return "the sheet, outside any table"
    if len(path) == 1 and path[0] == "sheet_version":
        return "sheet_version"
    written = f"[{', '.join(heading)}]"
    for step in path[place:]:
        if isinstance(step, int):
            written += f", entry {step + 1}"
        else:
            written += f".{_plain(step)}"
    return written


def _is_zone(path: KeyPath, place: int) -> bool:
    return path[place] == "zone" and place == 2 and path[0] == "image"


def _plain(step: str | int) -> str:
    text = str(step)
    return text if text.replace("_", "").replace("-", "").isalnum() else _shown(text)


def _shown(text: str) -> str:
    cut = text if len(text) <= _LONGEST_VALUE else text[: _LONGEST_VALUE - 3] + "..."
    return json.dumps(cut, ensure_ascii=False)


def _value_words(value: object) -> str | None:
    """Write a value as in TOML, on one line; None for what is better looked up."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return str(value) if abs(value) < 10**20 else "a very large number"
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, str):
        return _shown(value)
    if isinstance(value, date):
        return value.isoformat()
    if (
        isinstance(value, list)
        and len(value) <= 4
        and all(isinstance(entry, int | float | str) for entry in value)
    ):
        return f"[{', '.join(_value_words(entry) or '' for entry in value)}]"
    return None


def _table_form(path: KeyPath) -> str:
    if len(path) == 1 or path[-1] == "detect":
        name = ".".join(str(step) for step in path if isinstance(step, str))
        return f"[{name}] on a line of its own, its keys below"
    return "{ key = value, .. }"
