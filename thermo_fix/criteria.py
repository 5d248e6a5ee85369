"""Criteria: published or house rules that turn a number into a grade. They are data.

The built-in ones are in ``data/criteria.toml``; a survey may bring a file of its own in the same
form. A criterion names a quantity, classes with their published wording, and our grade for each.
"""

import difflib
import sys
import tomllib
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from importlib import resources
from pathlib import Path
from typing import Any, Literal, cast, get_args

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import SheetError, one_line
from thermo_fix.records import GRADES, Grade, Purpose, Sense
from thermo_fix.text_file import read_text_file

QuantityName = Literal[
    "like_difference",
    "rise_over_air",
    "difference",
    "surface_c",
    "surface_factor",
    "dew_point_margin",
    "surface_humidity",
]
"""What a criterion can compare: difference to a like component (K), rise over the air (K),
difference to whatever the reference is (K), surface temperature (degC), temperature factor fRsi,
surface temperature minus dew point (K), relative humidity at the surface (0 to 1)."""

Comparison = Literal["at_least", "above", "at_most", "below"]

DEFAULT_USE: Mapping[Purpose, tuple[str, ...]] = {
    "building": (
        "iso13788-surface-factor",
        "dew-point",
        "surface-humidity",
        "house-difference",
    ),
    "electrical": ("neta-like-components", "neta-rise-over-air", "house-difference"),
}
"""Criteria of a survey whose sheet names none."""

LIMIT_CRITERION = "absolute-limit"
"""Joins those of an electrical survey whose sheet names no criteria and states a limit."""

_MOST_BYTES = 1024**2
"""Of a survey's own file of criteria."""

_LONGEST_QUOTE = 80

_CRITERION_KEYS = {
    "id",
    "title",
    "source",
    "quantity",
    "unit",
    "senses",
    "side",
    "gaps",
    "settings",
    "class",
}
_SETTING_KEYS = {"meaning", "default"}
_CLASS_KEYS = {"label", "text", "grade", "plus", *get_args(Comparison)}


@dataclass(frozen=True, slots=True)
class Setting:
    """A number that the sheet may set."""

    meaning: str
    default: float | None


@dataclass(frozen=True, slots=True)
class GradeClass:
    """One class of a criterion."""

    comparison: Comparison
    threshold: float | str
    """A number, or the name of a setting."""
    plus: str
    """Name of a setting to be added to the threshold, with a leading ``-`` to subtract it."""
    label: str
    text: str
    grade: Grade

    def limit(self, settings: Mapping[str, float]) -> float:
        """Return the threshold in numbers."""
        base = self.threshold if isinstance(self.threshold, float) else settings[self.threshold]
        if not self.plus:
            return base
        sign, name = (-1.0, self.plus[1:]) if self.plus.startswith("-") else (1.0, self.plus)
        return base + sign * settings[name]

    def holds(
        self, values: NDArray[np.float64], settings: Mapping[str, float]
    ) -> NDArray[np.bool_]:
        """Say for which values the class's condition holds; unrounded values are compared."""
        limit = self.limit(settings)
        if self.comparison == "at_least":
            return values >= limit
        if self.comparison == "above":
            return values > limit
        if self.comparison == "at_most":
            return values <= limit
        return values < limit


@dataclass(frozen=True, slots=True)
class Criterion:
    """A rule that turns a number into a grade."""

    id: str
    title: str
    source: str
    quantity: QuantityName
    unit: str
    senses: tuple[Sense, ...]
    gaps: str
    classes: tuple[GradeClass, ...]
    """From mildest to worst."""
    side: Literal["inside"] | None = None
    settings: Mapping[str, Setting] = field(default_factory=dict)

    def values_of_settings(
        self, given: Mapping[str, float]
    ) -> tuple[dict[str, float], tuple[str, ...]]:
        """Return the settings in force, and the names of those that must be given but are not."""
        values: dict[str, float] = {}
        missing = []
        for name, setting in self.settings.items():
            value = given.get(name, setting.default)
            if value is None:
                missing.append(name)
            else:
                values[name] = value
        return values, tuple(missing)

    def classify(
        self, values: NDArray[np.float64], settings: Mapping[str, float]
    ) -> NDArray[np.int8]:
        """Class of each value: index into ``classes``, -1 where none holds.

        Parameters
        ----------
        values
            Of the criterion's quantity, any shape; NaN belongs to no class.
        settings
            From :meth:`values_of_settings`.

        """
        result = np.full(np.shape(values), -1, np.int8)
        for index, every in enumerate(self.classes):
            result[every.holds(values, settings)] = index
        return result


@lru_cache(maxsize=1)
def built_in() -> Mapping[str, Criterion]:
    """Return the built-in criteria by id."""
    text = resources.files("thermo_fix").joinpath("data/criteria.toml").read_text("utf-8")
    return {each.id: each for each in parse_criteria(text, "criteria.toml")}


def all_criteria(file: Path | None = None) -> tuple[Criterion, ...]:
    """Return the built-in criteria and those of a survey's own file, whose ids win.

    Raises ``SheetError`` where the file is wrong.
    """
    known = dict(built_in())
    if file is not None:
        text = read_text_file(
            file, _MOST_BYTES, "a file of criteria", "leave out what the survey does not use"
        )
        known |= {each.id: each for each in parse_criteria(text, file.name)}
    return tuple(known.values())


def load_criteria(names: Sequence[str], file: Path | None = None) -> tuple[Criterion, ...]:
    """Return criteria by name, from the built-in ones and a file of the survey's own.

    Parameters
    ----------
    names
        Ids, in the order in which they are to be reported.
    file
        TOML in the form of ``data/criteria.toml``; its ids win over built-in ones.

    Raises
    ------
    SheetError
        An unknown name, or a file that is wrong.

    """
    known = {each.id: each for each in all_criteria(file)}
    chosen = []
    for name in names:
        if name not in known:
            near = difflib.get_close_matches(name[:80], known, 1, 0.4)
            hint = f'; nearest: "{near[0]}"' if near else ""
            raise SheetError(
                f'survey.toml: [criteria] use names "{name}", which is no criterion{hint}; '
                f"known are {', '.join(sorted(known))}"
            )
        chosen.append(known[name])
    return tuple(chosen)


def parse_criteria(text: str, file: str) -> tuple[Criterion, ...]:
    """Parse criteria from TOML.

    Parameters
    ----------
    text
        In the form of ``data/criteria.toml``.
    file
        Name for messages.

    Raises
    ------
    SheetError
        One line that says what is wrong where.

    """
    try:
        document = tomllib.loads(text)
    except RecursionError as error:
        raise SheetError(f"{file}: brackets are nested too deeply") from error
    except ValueError as error:  # also integers of thousands of digits
        raise SheetError(f"{file}: not valid TOML: {one_line(str(error))}") from error
    tables = document.get("criterion")
    if not isinstance(tables, list) or not tables or set(document) != {"criterion"}:
        raise SheetError(f"{file}: must hold [[criterion]] tables and nothing else")
    parsed = [_criterion(table, file, number) for number, table in enumerate(tables, 1)]
    ids = [each.id for each in parsed]
    for each, times in Counter(ids).items():
        if times > 1:
            raise SheetError(f'{file}: the id "{each}" stands twice; give each criterion its own')
    return tuple(parsed)


def _criterion(table: Any, file: str, number: int) -> Criterion:
    where = f"{file}: criterion {number}"
    if not isinstance(table, dict):
        raise SheetError(f"{where}: must be a [[criterion]] table")
    name = table.get("id")
    if isinstance(name, str):
        where = f'{file}: criterion "{name}"'
    _no_unknown(table, _CRITERION_KEYS, where)
    texts = {key: _text(table, key, where) for key in ("id", "title", "source", "unit", "gaps")}
    quantity = table.get("quantity")
    if quantity not in get_args(QuantityName):
        raise SheetError(
            f"{where}: quantity = {_quoted(quantity)} is not one of "
            f"{', '.join(get_args(QuantityName))}"
        )
    senses = table.get("senses")
    if (
        not isinstance(senses, list)
        or not senses
        or not all(each in get_args(Sense) for each in senses)
    ):
        raise SheetError(f'{where}: senses must be a list of "hot" and "cold"')
    side = table.get("side")
    if side not in (None, "inside"):
        raise SheetError(f'{where}: side = {_quoted(side)}; leave it out or write "inside"')
    given = table.get("settings", {})
    if not isinstance(given, dict):
        raise SheetError(f"{where}: settings must be a table")
    settings = {key: _setting(value, f"{where}, setting {key}") for key, value in given.items()}
    classes = table.get("class")
    if not isinstance(classes, list) or not classes:
        raise SheetError(f"{where}: needs at least one [[criterion.class]]")
    return Criterion(
        id=texts["id"],
        title=texts["title"],
        source=texts["source"],
        unit=texts["unit"],
        gaps=texts["gaps"],
        quantity=cast("QuantityName", quantity),
        senses=tuple(senses),
        side=side,
        settings=settings,
        classes=tuple(_grade_class(each, settings, where) for each in classes),
    )


def _setting(table: Any, where: str) -> Setting:
    if not isinstance(table, dict):
        raise SheetError(f"{where}: must be a table with a meaning and perhaps a default")
    _no_unknown(table, _SETTING_KEYS, where)
    default = table.get("default")
    if default is not None and not _is_number(default):
        raise SheetError(f"{where}: default = {_quoted(default)} must be a number")
    return Setting(_text(table, "meaning", where), default if default is None else float(default))


def _quoted(value: Any) -> str:
    """Write a value of the file, cut to what a message can hold."""
    text = repr(value) if not isinstance(value, int) or abs(value) < 10**20 else "a huge number"
    return text if len(text) <= _LONGEST_QUOTE else f"{text[:_LONGEST_QUOTE]}..."


def _is_number(value: Any) -> bool:
    if isinstance(value, bool) or not isinstance(value, int | float):
        return False
    return abs(value) <= sys.float_info.max


def _grade_class(table: Any, settings: Mapping[str, Setting], where: str) -> GradeClass:
    if not isinstance(table, dict):
        raise SheetError(f"{where}: class must be a table")
    _no_unknown(table, _CLASS_KEYS, f"{where}, class")
    conditions = [key for key in get_args(Comparison) if key in table]
    if len(conditions) != 1:
        raise SheetError(f"{where}: each class needs one of {', '.join(get_args(Comparison))}")
    threshold = table[conditions[0]]
    if isinstance(threshold, str):
        if threshold not in settings:
            raise SheetError(f'{where}: class refers to the setting "{threshold}", not defined')
    elif not _is_number(threshold):
        raise SheetError(
            f"{where}: {conditions[0]} = {_quoted(threshold)} must be a number or a setting"
        )
    else:
        threshold = float(threshold)
    plus = table.get("plus", "")
    if not isinstance(plus, str):
        raise SheetError(f"{where}: plus = {_quoted(plus)} must be the name of a setting")
    if plus and plus.removeprefix("-") not in settings:
        raise SheetError(f'{where}: plus refers to the setting "{plus}", not defined')
    grade = table.get("grade")
    if grade not in GRADES:
        raise SheetError(f"{where}: grade = {_quoted(grade)} is not one of {', '.join(GRADES)}")
    return GradeClass(
        comparison=conditions[0],
        threshold=threshold,
        plus=plus,
        label=_text(table, "label", where),
        text=_text(table, "text", where),
        grade=grade,
    )


def _no_unknown(table: Mapping[str, Any], known: set[str], where: str) -> None:
    for key in table:
        if key not in known:
            near = difflib.get_close_matches(key[:80], known, 1)
            hint = f'; nearest known key: "{near[0]}"' if near else ""
            raise SheetError(f'{where}: unknown key "{key}"{hint}')


def _text(table: Mapping[str, Any], key: str, where: str) -> str:
    value = table.get(key)
    if not isinstance(value, str) or not value.strip():
        raise SheetError(f"{where}: {key} must be a text")
    return value
