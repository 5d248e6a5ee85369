"""What a weather log says at the time of an image, and of the survey as a whole.

The rule: ``outdoor_c`` is filled for every image, ``air_c``, ``humidity`` and ``wind_m_s`` for
surfaces outside alone, and each only where the sheet does not state it.
"""

import math
from bisect import bisect_left
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime, timedelta
from itertools import pairwise

from thermo_fix.defaults import default_for
from thermo_fix.records import (
    ImageJob,
    Input,
    SceneInputs,
    Survey,
    WeatherFacts,
    WeatherLog,
)

LONGEST_GAP = timedelta(hours=3)
"""Across a longer gap nothing is interpolated; common practice, no source."""
SPREAD_WITHIN = timedelta(hours=1)
"""Of an image: the rows from which the spread is taken; always the two nearest."""
BEFORE = timedelta(hours=24)
"""Before the survey, for which conditions are checked (EN 13187:1998, annex D, from memory)."""

SCOPE = "weather log"
_OUTSIDE_KEYS = ("air_c", "humidity", "wind_m_s")
_LISTED = 5
_SECONDS_PER_HOUR = 3600.0


@dataclass(frozen=True, slots=True)
class Reading:
    """A column of a log at one time."""

    value: float
    u: float
    """Standard uncertainty (k = 1): spread, resolution and sensor."""


class Columns:
    """The columns of a weather log, each without its empty cells."""

    def __init__(self, log: WeatherLog) -> None:
        self.log = log
        self.rows: dict[str, tuple[list[datetime], list[float]]] = {}
        for name, values in log.columns.items():
            pairs = [
                (time, value)
                for time, value in zip(log.times, values, strict=True)
                if not math.isnan(value)
            ]
            self.rows[name] = ([time for time, _ in pairs], [value for _, value in pairs])


def log_at(columns: Columns, column: str, moment: datetime) -> Reading | str:
    """Interpolate a column of a weather log.

    Parameters
    ----------
    columns
        Of a log in the local time of ``moment``.
    column
        ``air_c``, ``humidity`` or ``wind_m_s``.
    moment
        Local time.

    Returns
    -------
    Reading or str
        Or why there is none, in words that follow ``the weather log``.

    """
    if column not in columns.rows:
        return f"has no column {column}"
    times, values = columns.rows[column]
    if not times or not times[0] <= moment <= times[-1]:
        return "does not cover the time"
    above = bisect_left(times, moment)
    below = above if times[above] == moment else above - 1
    if times[above] - times[below] > LONGEST_GAP:
        hours = LONGEST_GAP.total_seconds() / _SECONDS_PER_HOUR
        return f"has a gap of more than {hours:g} hours there"
    share = 0.0
    if above != below:
        share = (moment - times[below]) / (times[above] - times[below])
    value = values[below] + share * (values[above] - values[below])
    # The nearest rows on both sides, and all within the hour.
    first = bisect_left(times, moment - SPREAD_WITHIN)
    last = bisect_left(times, moment + SPREAD_WITHIN + timedelta(microseconds=1))
    near = values[min(first, below) : max(last, above + 1)]
    mean = math.fsum(near) / len(near)
    spread = 0.0
    if len(near) > 1:
        spread = math.sqrt(math.fsum((each - mean) ** 2 for each in near) / (len(near) - 1))
    step = columns.log.resolution[column] / math.sqrt(12.0)
    sensor = default_for(f"weather.{column}").u_for(value)
    return Reading(value, math.hypot(spread, step, sensor))


def with_weather(survey: Survey, log: WeatherLog, moments: Mapping[str, datetime | None]) -> Survey:
    """Fill what the sheet does not state from a weather log.

    Parameters
    ----------
    survey
        As loaded.
    log
        As read.
    moments
        When each image was taken, by file.

    Returns
    -------
    Survey
        With filled inputs, what the log says of the whole survey, and a note for all that it
        could not fill.

    """
    columns = Columns(log)
    jobs = []
    failed: dict[str, list[str]] = {}
    for job in survey.images:
        moment = moments.get(job.file)
        if moment is None:
            failed.setdefault("cannot be used: it is not told when they were taken", []).append(
                job.file
            )
            jobs.append(job)
            continue
        reasons: dict[str, str] = {}
        jobs.append(_filled_job(job, columns, moment, reasons))
        for key, reason in reasons.items():
            failed.setdefault(f"{reason}, and {key} stays not told", []).append(
                f"{job.file} ({moment:%Y-%m-%d %H:%M})"
            )
    notes = [*survey.notes, *log.notes]
    for reason, files in failed.items():
        shown = ", ".join(files[:_LISTED])
        more = "" if len(files) <= _LISTED else f" and {len(files) - _LISTED} more"
        notes.append(f"{log.file}: the weather log {reason}: {shown}{more}.")
    known = sorted(moment for moment in moments.values() if moment is not None)
    facts = _facts(columns, known[0], known[-1]) if known else None
    return replace(survey, images=tuple(jobs), notes=tuple(notes), weather=facts)


def _filled_job(
    job: ImageJob, columns: Columns, moment: datetime, reasons: dict[str, str]
) -> ImageJob:
    def filled(inputs: SceneInputs) -> SceneInputs:
        if inputs.told("outdoor_c") is None:
            inputs = _with(inputs, "outdoor_c", columns, moment, reasons)
        if inputs.inside is False:
            for key in _OUTSIDE_KEYS:
                # A column that the log does not have is no failure.
                if inputs.told(key) is None and key in columns.rows:
                    inputs = _with(inputs, key, columns, moment, reasons)
        return inputs

    return replace(
        job,
        inputs=filled(job.inputs),
        zones=tuple(replace(zone, inputs=filled(zone.inputs)) for zone in job.zones),
    )


def _with(
    inputs: SceneInputs, key: str, columns: Columns, moment: datetime, reasons: dict[str, str]
) -> SceneInputs:
    column = "air_c" if key == "outdoor_c" else key
    found = log_at(columns, column, moment)
    if isinstance(found, str):
        reasons[key] = found
        return inputs
    note = f"{columns.log.file}, interpolated to {moment:%Y-%m-%d %H:%M}"
    new = Input(key, found.value, found.u, "measured", SCOPE, "measured", note)
    values = {**inputs.values, key: new}
    if key == "air_c":
        values |= _following_air(inputs, new)
    return replace(inputs, values=values)


def _following_air(inputs: SceneInputs, air: Input) -> dict[str, Input]:
    """Let defaults that are taken from the air follow it (see the defaults of the sheet)."""
    followers = {}
    for key, default in (
        ("reflected_c", "reflected_c.from_air"),
        ("window.temperature_c", "window.temperature_c"),
    ):
        old = inputs.values.get(key)
        if old is None or old.origin != "assumed":
            continue
        entry = default_for(default)
        scope = f"default, from air_c of {air.scope}"
        followers[key] = Input(
            key, air.value, entry.u or old.u, "assumed", scope, "assumed", entry.reason
        )
    return followers


# ---------------------------------------------------------------- the survey as a whole


def _facts(columns: Columns, first: datetime, last: datetime) -> WeatherFacts:
    before, during = _departures(columns, first, last)
    dry, rain_seen = _hours_without(columns, "rain", first, last)
    sunless, sun_seen = _hours_without(columns, "sun", first, last)
    return WeatherFacts(
        file=columns.log.file,
        first=first,
        last=last,
        outdoor_before_k=before,
        outdoor_during_k=during,
        wind_max_m_s=_greatest_wind(columns, first, last),
        dry_hours=dry,
        rain_seen=rain_seen,
        sunless_hours=sunless,
        sun_seen=sun_seen,
    )


def _departures(
    columns: Columns, first: datetime, last: datetime
) -> tuple[float | None, float | None]:
    """Greatest departure of the outdoor air from its value at the first image, before and during.

    None where the log leaves out a part of that time.
    """
    start = log_at(columns, "air_c", first)
    if isinstance(start, str):
        return None, None
    times, values = columns.rows["air_c"]

    def greatest(begin: datetime, end: datetime) -> float | None:
        rows = [
            (time, value) for time, value in zip(times, values, strict=True) if begin <= time <= end
        ]
        if not _covered([time for time, _ in rows], begin, end):
            return None
        ends = [log_at(columns, "air_c", moment) for moment in (begin, end)]
        seen = [value for _, value in rows]
        seen += [each.value for each in ends if isinstance(each, Reading)]
        return max((abs(value - start.value) for value in seen), default=0.0)

    return greatest(first - BEFORE, first), greatest(first, last)


def _covered(times: Sequence[datetime], begin: datetime, end: datetime) -> bool:
    marks = [begin, *times, end]
    return all(later - earlier <= LONGEST_GAP for earlier, later in pairwise(marks))


def _greatest_wind(columns: Columns, first: datetime, last: datetime) -> float | None:
    if "wind_m_s" not in columns.rows:
        return None
    times, values = columns.rows["wind_m_s"]
    seen = [value for time, value in zip(times, values, strict=True) if first <= time <= last]
    ends = [log_at(columns, "wind_m_s", moment) for moment in (first, last)]
    if any(isinstance(each, str) for each in ends):
        return None
    seen += [each.value for each in ends if isinstance(each, Reading)]
    return max(seen)


def _hours_without(
    columns: Columns, column: str, first: datetime, last: datetime
) -> tuple[float | None, bool]:
    """Hours up to the first image in which a column was 0, and whether it was not 0 before them.

    A row tells of the time since the row before. None where the log does not reach the survey.
    """
    if column not in columns.rows:
        return None, False
    times, values = columns.rows[column]
    if not times or not _covered([time for time in times if first <= time <= last], first, last):
        return None, False
    # A row belongs to the survey when the time it tells of touches it.
    touching = [
        value
        for place, (time, value) in enumerate(zip(times, values, strict=True))
        if time >= first and (place == 0 or times[place - 1] < last)
    ]
    if any(value > 0.0 for value in touching):
        return 0.0, True
    earlier = [pair for pair in zip(times, values, strict=True) if pair[0] < first]
    reach = first
    for time, value in reversed(earlier):
        if reach - time > LONGEST_GAP:
            break
        if value > 0.0:
            return (first - time).total_seconds() / _SECONDS_PER_HOUR, True
        reach = time
    return (first - reach).total_seconds() / _SECONDS_PER_HOUR, False
