"""A weather log: a CSV of time and weather, brought to the local time of the images' clock."""

import csv
import io
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from datetime import datetime, timedelta, timezone
from pathlib import Path

from thermo_fix.errors import SheetError
from thermo_fix.read.limits import DEFAULT_LIMITS
from thermo_fix.records import WeatherLog
from thermo_fix.text_file import read_text_file

COLUMNS = ("air_c", "humidity", "wind_m_s", "rain", "sun")
"""Columns that are read, besides ``time``."""

_RANGES = {
    "air_c": (-90.0, 70.0, "degC"),
    "humidity": (0.0, 1.0, "a fraction, not percent"),
    "wind_m_s": (0.0, 150.0, "m/s"),
    "rain": (0.0, 1000.0, "mm, or true or false"),
    "sun": (0.0, 1.0, "a share of the time, or true or false"),
}
_WORDS = {"true": 1.0, "yes": 1.0, "false": 0.0, "no": 0.0}


@dataclass(slots=True)
class _Rows:
    times: list[datetime] = field(default_factory=list)
    values: list[list[float]] = field(default_factory=list)
    """By row, in the order of the columns."""
    decimals: list[int] = field(default_factory=list)
    """Most decimals that a column was written with."""


def read_weather(path: Path, utc_offset_hours: float | None) -> WeatherLog:
    """Read a weather log.

    Parameters
    ----------
    path
        CSV with a heading; ``docs/survey_sheet.md`` describes it.
    utc_offset_hours
        Of the images' clock; needed where the log's times carry an offset from UTC.

    Returns
    -------
    WeatherLog
        In order of time, in the images' local time, one row for each time.

    Raises
    ------
    SheetError
        One line: a file that cannot be read, a heading without what is needed, a cell that is no
        time or number or is out of range, or times in another zone than the images.

    """
    name = path.name
    text = read_text_file(
        path, DEFAULT_LIMITS.max_table_bytes, "a weather log", "cut it to the time of the survey"
    )
    heading_line = next((line for line in text.splitlines() if line.strip()), "")
    delimiter = next((mark for mark in (";", "\t") if mark in heading_line), ",")
    lines = enumerate(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter), 1)
    try:
        rows = ((number, row) for number, row in lines if any(cell.strip() for cell in row))
        heading = [cell.strip().lower() for cell in next(rows, (0, []))[1]]
        columns = _check_heading(heading, name)
        found = _read_rows(rows, heading, columns, utc_offset_hours, name)
    except csv.Error as error:
        raise SheetError(f"{name}: the weather log is no CSV file ({error})") from error
    if not found.times:
        raise SheetError(f"{name}: the weather log has a heading and no rows")
    notes = []
    other = [cell for cell in heading if cell and cell != "time" and cell not in COLUMNS]
    if other:
        notes.append(
            f"{name}: columns that are not read: {', '.join(other)}; known are time, "
            f"{', '.join(COLUMNS)}."
        )
    return _in_order(found, columns, name, notes)


def _check_heading(heading: Sequence[str], name: str) -> list[str]:
    columns = [column for column in COLUMNS if column in heading]
    known = f"time and at least one of {', '.join(COLUMNS)}"
    if "time" not in heading or not columns:
        raise SheetError(f"{name}: the first line must name the columns: {known}")
    for column in ("time", *columns):
        if heading.count(column) > 1:
            raise SheetError(f"{name}: the column {column} stands twice; keep one")
    return columns


def _read_rows(
    rows: Iterator[tuple[int, list[str]]],
    heading: Sequence[str],
    columns: Sequence[str],
    utc_offset_hours: float | None,
    name: str,
) -> _Rows:
    found = _Rows(decimals=[0] * len(columns))
    clock = heading.index("time")
    places = [heading.index(column) for column in columns]
    aware: bool | None = None
    for number, row in rows:
        where = f"{name}, line {number}"
        cell = row[clock].strip() if clock < len(row) else ""
        try:
            moment = datetime.fromisoformat(cell)
        except ValueError as error:
            raise SheetError(
                f"{where}: time = {cell[:40]!r} is no ISO 8601 time; write such as 2026-01-20T06:00"
            ) from error
        if aware is None:
            aware = moment.tzinfo is not None
        elif aware != (moment.tzinfo is not None):
            raise SheetError(
                f"{where}: some times carry an offset from UTC and others do not; write all alike"
            )
        found.times.append(_local(moment, utc_offset_hours, name))
        values = []
        for index, (column, place) in enumerate(zip(columns, places, strict=True)):
            written = row[place].strip() if place < len(row) else ""
            values.append(_cell(written, column, where))
            digits = written.replace(",", ".").partition(".")[2]
            found.decimals[index] = max(found.decimals[index], len(digits))
        found.values.append(values)
    return found


def _local(moment: datetime, utc_offset_hours: float | None, name: str) -> datetime:
    if moment.tzinfo is None:
        return moment
    if utc_offset_hours is None:
        raise SheetError(
            f"{name}: its times carry an offset from UTC and those of the images do not; add "
            "utc_offset_hours of the images' clock to [survey], such as utc_offset_hours = 1"
        )
    zone = timezone(timedelta(hours=utc_offset_hours))
    try:
        return moment.astimezone(zone).replace(tzinfo=None)
    except OverflowError as error:  # at the ends of the calendar
        raise SheetError(f"{name}: a time of the year {moment.year} is no time of a log") from error


def _cell(written: str, column: str, where: str) -> float:
    if not written:
        return math.nan
    low, high, unit = _RANGES[column]
    if column in ("rain", "sun") and written.lower() in _WORDS:
        return _WORDS[written.lower()]
    try:
        value = float(written.replace(",", "."))
    except ValueError as error:
        raise SheetError(f"{where}: {column} = {written[:40]!r} is no number ({unit})") from error
    if math.isnan(value):
        return value
    if not low <= value <= high:
        hint = f"; write {value / 100:g}" if column == "humidity" and 1.0 < value <= 100.0 else ""
        raise SheetError(
            f"{where}: {column} = {written[:40]} is not between {low:g} and {high:g} ({unit}){hint}"
        )
    return value


def _in_order(found: _Rows, columns: Sequence[str], name: str, notes: Sequence[str]) -> WeatherLog:
    said = list(notes)
    order = sorted(range(len(found.times)), key=lambda index: found.times[index])
    if order != list(range(len(order))):
        said.append(f"{name}: its rows are not in order of time; they were sorted.")
    grouped: dict[datetime, list[list[float]]] = {}
    for index in order:
        grouped.setdefault(found.times[index], []).append(found.values[index])
    repeated = len(order) - len(grouped)
    if repeated:
        said.append(
            f"{name}: {repeated} {'row repeats' if repeated == 1 else 'rows repeat'} a time that "
            "stands already (a clock that was set back?); their mean is taken."
        )
    return WeatherLog(
        file=name,
        times=tuple(grouped),
        columns={
            column: tuple(
                _mean([row[place] for row in rows]) if len(rows) > 1 else rows[0][place]
                for rows in grouped.values()
            )
            for place, column in enumerate(columns)
        },
        resolution={column: 10.0 ** -found.decimals[place] for place, column in enumerate(columns)},
        notes=tuple(said),
    )


def _mean(values: Sequence[float]) -> float:
    there = [value for value in values if not math.isnan(value)]
    return math.fsum(there) / len(there) if there else math.nan
