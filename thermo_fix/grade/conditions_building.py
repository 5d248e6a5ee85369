"""Conditions of a survey of a building, each with its rule and source."""

import math
from collections.abc import Sequence

from thermo_fix.grade.stated import every_input, told
from thermo_fix.radiometry.surface import MEASURABLE_FOOTPRINTS, pixel_footprint_m
from thermo_fix.records import Condition, Finding, Survey

EN13187 = "EN 13187:1998, annex D (from memory, to be confirmed)"
PRACTICE = "Common practice; {0}"
DIFFERENCE_BY_U_K = 3.0
"""Least difference times U, W/m2: 3/U kelvins (EN 13187:1998, annex D, from memory)."""
LEAST_DIFFERENCE_K = 5.0
PRACTICE_DIFFERENCE_K = 10.0
PRACTICE_HOURS = 3.0
STEADY_HOURS = 24.0
STEADY_BEFORE_K = 10.0
STEADY_DURING_K = 5.0
SUNLESS_HOURS = 12.0
RAINLESS_HOURS = 24.0
MOST_WIND_M_S = 5.0
MOST_WIND_US_M_S = 6.7
LEAST_PRESSURE_PA = 5.0

_REVERSED = (
    "indoors colder than outdoors: heat flows inwards, and the senses of a loss are reversed"
)


def building_conditions(survey: Survey, findings: Sequence[Finding] = ()) -> tuple[Condition, ...]:
    """Check the conditions of a building survey as far as sheet and weather log tell them.

    Parameters
    ----------
    survey
        With its weather log read.
    findings
        Of the survey, for the size of what was measured.

    Returns
    -------
    tuple of Condition
        Met, not met or not told; the sheet comes before the log.

    """
    return (
        *_differences(survey),
        *_durations(survey),
        *_steadiness(survey),
        *_winds(survey),
        _rain(survey),
        _sun(survey),
        _pressure(survey),
        _size(survey, findings),
    )


def least_difference_k(u_value: float) -> float:
    """Least difference between indoors and outdoors, max(3/U, 5), K.

    Parameters
    ----------
    u_value
        W m-2 K-1, above 0 (EN 13187:1998, annex D, from memory).

    """
    return max(DIFFERENCE_BY_U_K / u_value, LEAST_DIFFERENCE_K)


def _judged(name: str, met: bool, value: str, rule: str, source: str) -> Condition:
    return Condition(name, "met" if met else "not met", value, rule, source)


def _not_told(name: str, rule: str, source: str) -> Condition:
    return Condition(name, "not told", "", rule, source)


def _gaps(survey: Survey) -> list[float]:
    """Indoor minus outdoor air, K, wherever both are told."""
    gaps = []
    for every in every_input(survey):
        indoor, outdoor = every.told("indoor_c"), every.told("outdoor_c")
        if indoor is not None and outdoor is not None:
            gaps.append(indoor.value - outdoor.value)
    return gaps


def _differences(survey: Survey) -> tuple[Condition, Condition]:
    name = "Indoor-outdoor difference"
    wall = survey.conditions.u_value
    asked = LEAST_DIFFERENCE_K if wall is None else least_difference_k(wall.value)
    rule = f"At least 3/U kelvins and at least {LEAST_DIFFERENCE_K:g} K"
    if wall is not None:
        rule += f", here {asked:.3g} K (U = {wall.value:g} W m-2 K-1)"
    practice_rule = f"At least {PRACTICE_DIFFERENCE_K:g} K"
    practice = PRACTICE.format("ASTM C1060 lineage")
    gaps = _gaps(survey)
    if not gaps:
        return _not_told(name, rule, EN13187), _not_told(name, practice_rule, practice)
    least = min(gaps, key=abs)
    value = f"{abs(least):.1f} K"
    if min(gaps) < 0.0:
        value += f"; {_REVERSED}"
    by_practice = _judged(name, abs(least) >= PRACTICE_DIFFERENCE_K, value, practice_rule, practice)
    if wall is None and abs(least) >= asked:
        # Above the floor it depends on a U-value that nobody told.
        return (
            Condition(name, "not told", f"{value}; u_value not told", rule, EN13187),
            by_practice,
        )
    return _judged(name, abs(least) >= asked, value, rule, EN13187), by_practice


def _durations(survey: Survey) -> tuple[Condition, Condition]:
    name = "Duration of the difference"
    rule = f"Indoor and outdoor air steady for {STEADY_HOURS:g} h before"
    practice_rule = f"The difference held for {PRACTICE_HOURS:g} h before"
    practice = PRACTICE.format("ASTM C1060 lineage")
    hours = survey.conditions.steady_hours
    if hours is None:
        return _not_told(name, rule, EN13187), _not_told(name, practice_rule, practice)
    value = f"{hours:g} h"
    return (
        _judged(name, hours >= STEADY_HOURS, value, rule, EN13187),
        _judged(name, hours >= PRACTICE_HOURS, value, practice_rule, practice),
    )


def _steadiness(survey: Survey) -> tuple[Condition, ...]:
    name = "Outdoor air before and during"
    rules = (
        f"Within {STEADY_BEFORE_K:g} K of its value at the start, {STEADY_HOURS:g} h before",
        f"Within {STEADY_DURING_K:g} K of its value at the start, during the survey",
    )
    weather = survey.weather
    seen = (None, None) if weather is None else (weather.outdoor_before_k, weather.outdoor_during_k)
    found = []
    for rule, departure, limit in zip(rules, seen, (STEADY_BEFORE_K, STEADY_DURING_K), strict=True):
        if departure is None:
            found.append(_not_told(name, rule, EN13187))
        else:
            value = f"{departure:.1f} K (weather log)"
            found.append(_judged(name, departure <= limit, value, rule, EN13187))
    return tuple(found)


def _winds(survey: Survey) -> tuple[Condition, Condition]:
    rules = (
        (MOST_WIND_M_S, "Survey practice citing EN 13187"),
        (MOST_WIND_US_M_S, "ASTM C1060 and RESNET, 15 mph (from memory, to be confirmed)"),
    )
    winds = told(survey, "wind_m_s")
    value = "" if not winds else f"{max(winds):.1f} m/s"
    if survey.weather is not None and survey.weather.wind_max_m_s is not None:
        logged = survey.weather.wind_max_m_s
        if not winds or logged > max(winds):
            value = f"{logged:.1f} m/s (weather log)"
        winds = [*winds, logged]
    first, second = (
        _judged("Wind", max(winds) <= limit, value, f"At most {limit:g} m/s outdoors", source)
        if winds
        else _not_told("Wind", f"At most {limit:g} m/s outdoors", source)
        for limit, source in rules
    )
    return first, second


def _rain(survey: Survey) -> Condition:
    name = "Rain"
    rule = f"No rain on the surface in the {RAINLESS_HOURS:g} h before, nor during the survey"
    source = PRACTICE.format("wet masonry evaporates and hides what is behind it")
    if survey.conditions.rain is not None:
        rained = survey.conditions.rain
        return _judged(name, not rained, "rain" if rained else "no rain", rule, source)
    weather = survey.weather
    hours, seen = (None, False) if weather is None else (weather.dry_hours, weather.rain_seen)
    return _hours_since(name, rule, source, hours, seen, RAINLESS_HOURS, "dry")


def _sun(survey: Survey) -> Condition:
    name = "Sun"
    rule = f"No direct sun on the surface for {SUNLESS_HOURS:g} h before"
    told_hours = survey.conditions.sun_hours_since
    if told_hours is not None:
        value = f"{told_hours:g} h since"
        return _judged(name, told_hours >= SUNLESS_HOURS, value, rule, EN13187)
    weather = survey.weather
    hours, seen = (None, False) if weather is None else (weather.sunless_hours, weather.sun_seen)
    return _hours_since(name, rule, EN13187, hours, seen, SUNLESS_HOURS, "without sun")


def _hours_since(
    name: str,
    rule: str,
    source: str,
    hours: float | None,
    seen: bool,
    asked: float,
    words: str,
) -> Condition:
    """Judge hours from a log; a log that begins too late tells only that far."""
    if hours is None:
        return _not_told(name, rule, source)
    value = f"{hours:.1f} h {words} (weather log)"
    if hours < asked and not seen:
        return Condition(name, "not told", f"{value}, then the log begins", rule, source)
    return _judged(name, hours >= asked, value, rule, source)


def _pressure(survey: Survey) -> Condition:
    name = "Pressure difference"
    rule = (
        f"For work on air leakage: at least {LEAST_PRESSURE_PA:g} Pa across the envelope, higher "
        "on the side that is not seen; with a fan 20 to 50 Pa are usual"
    )
    source = "EN 13187 and survey practice (from memory, to be confirmed)"
    pressure = survey.conditions.pressure_difference_pa
    if pressure is None:
        return _not_told(name, rule, source)
    met = abs(pressure) >= LEAST_PRESSURE_PA
    sides = {every.inside for every in every_input(survey)}
    value = f"{pressure:g} Pa, outside minus inside"
    if met and sides == {True} and pressure < 0.0:
        return _judged(name, False, f"{value}: indoor air is pressed out", rule, source)
    if met and sides == {False} and pressure > 0.0:
        return _judged(name, False, f"{value}: outdoor air is drawn in", rule, source)
    return _judged(name, met, value, rule, source)


def _size(survey: Survey, findings: Sequence[Finding]) -> Condition:
    name = "Distance against target size"
    rule = (
        f"What is measured spans at least {MEASURABLE_FOOTPRINTS} x {MEASURABLE_FOOTPRINTS} "
        "footprints"
    )
    source = PRACTICE.format("Budzier and Gerlach, J. Sens. Sens. Syst. 10 (2021) 179")
    distances = told(survey, "distance_m")
    ifov = survey.camera.ifov_mrad
    if ifov is None or not distances:
        return _not_told(name, rule, source)
    low, high = (1e3 * pixel_footprint_m(ifov, each) for each in (min(distances), max(distances)))
    footprint = (
        f"footprint {low:.2g} mm" if low == high else f"footprint {low:.2g} to {high:.2g} mm"
    )
    if findings:
        least = min(_narrow_px(each) for each in findings)
        value = f"{footprint}; smallest finding {least:.0f} footprints across"
    else:
        least = min(math.sqrt(job.detect.min_area_px) for job in survey.images)
        value = f"{footprint}; no finding, {least:.1f} footprints across looked for"
    return _judged(name, least >= MEASURABLE_FOOTPRINTS, value, rule, source)


def _narrow_px(finding: Finding) -> float:
    """Return the narrow side of the box around a finding, pixels."""
    x0, y0, x1, y1 = finding.bbox_px
    return float(min(x1 - x0, y1 - y0))
