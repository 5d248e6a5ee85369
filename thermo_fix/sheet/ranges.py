"""Which values the quantities of a survey sheet may take, and what to say of others.

Each function returns None for a good value, else the words that go behind ``key = value:``.
"""

from collections.abc import Callable

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.thermal.load import EXPONENT_RANGE

HOTTEST_C = 3000.0
"""degC. Beyond any surface that a long-wave camera is pointed at."""

_NOT_ABOVE_VALUE = {
    "emissivity",
    "transmittance",
    "window.transmittance",
    "humidity",
    "distance_m",
    "load_a",
    "height_m",
    "design.humidity",
    "design.degree_days_k",
    "conditions.u_value",
}
"""Positive quantities: a standard uncertainty above the value would say nothing is known."""

_FRACTIONS = {
    "emissivity",
    "transmittance",
    "window.transmittance",
    "window.reflectance",
    "humidity",
    "design.humidity",
}


def range_problem(key: str, value: float) -> str | None:
    """Say what is wrong with a finite value of a quantity."""
    check = _CHECKS.get(key, _temperature)
    return check(value)


def spread_problem(key: str, value: float | None, u: float) -> str | None:
    """Say what is wrong with a finite standard uncertainty (``value`` None: not known)."""
    if u <= 0.0:
        return "a standard uncertainty must be above zero; leave it out to take the default"
    if key in _NOT_ABOVE_VALUE and value and u > abs(value):
        return (
            f"the standard uncertainty is larger than the value {value:g} itself; "
            "it is stated in the same unit as the value, not in percent"
        )
    if key in _FRACTIONS and u > 1.0:
        return "the standard uncertainty of a fraction is below 1; write 0.02 for 2 %"
    return None


def assumed_spread(key: str, value: float, u: float) -> float:
    """Limit an assumed standard uncertainty to what could also be stated: at most the value."""
    return min(u, abs(value)) if key in _NOT_ABOVE_VALUE and value else u


def plausibility_note(key: str, value: float) -> str | None:
    """Say that a temperature of air, though possible, looks like kelvins."""
    if key in ("air_c", "indoor_c", "outdoor_c") and not -90.0 <= value <= 200.0:
        return (
            f"{key} = {value:g} is an unusual temperature of air; temperatures are in degC "
            f"({value:g} K would be {value - ZERO_CELSIUS_K:.2f} degC)."
        )
    return None


def _percent_hint(value: float) -> str:
    return f"; did you mean {value / 100:g}?" if 2.0 <= value <= 100.0 else ""


def _emissivity(value: float) -> str | None:
    if 0.0 < value <= 1.0:
        return None
    words = "an emissivity lies above 0 and is at most 1"
    if value == 0.0:
        return f"{words}; at 0 a surface shows nothing of its own temperature"
    return words + (
        _percent_hint(value)
        or '; write a number such as 0.93, or the surface: { surface = "brick, red" }'
    )


def _transmittance(value: float) -> str | None:
    if 0.0 < value <= 1.0:
        return None
    words = "a transmittance lies above 0 and is at most 1"
    if value == 0.0:
        return f"{words}; at 0 nothing of the surface is seen"
    return words + (_percent_hint(value) or "; write a number such as 0.98")


def _reflectance(value: float) -> str | None:
    if 0.0 <= value < 1.0:
        return None
    return "a reflectance is at least 0 and below 1" + (
        _percent_hint(value) or "; write a number such as 0.04"
    )


def _humidity(value: float) -> str | None:
    if 0.0 <= value <= 1.0:
        return None
    words = "humidity is a fraction, 0 to 1"
    return words + (f"; write {value / 100:g}" if 1.0 < value <= 100.0 else "; 0.75 is 75 %")


def _distance(value: float) -> str | None:
    return None if value >= 0.0 else "a distance is at least 0; write it in metres"


def _angle(value: float) -> str | None:
    if 0.0 <= value < 90.0:
        return None
    return "a view angle is at least 0 (square on) and below 90 degrees (edge on)"


def _wind(value: float) -> str | None:
    return None if 0.0 <= value <= 150.0 else "a wind speed is between 0 and 150 m/s"


def _height(value: float) -> str | None:
    return None if 0.0 < value <= 200.0 else "a height is above 0 and at most 200 m"


def _design_humidity(value: float) -> str | None:
    if value == 0.0:
        return "a design humidity lies above 0; 0.5 is 50 %"
    return _humidity(value)


def _degree_days(value: float) -> str | None:
    if 0.0 < value <= 15_000.0:
        return None
    return "heating degree days of a year lie above 0 and are at most 15000 K day"


def _u_value(value: float) -> str | None:
    return None if 0.02 <= value <= 10.0 else "a U-value is between 0.02 and 10 W m-2 K-1"


def _load_exponent(value: float) -> str | None:
    low, high = EXPONENT_RANGE
    if low <= value <= high:
        return None
    return f"an exponent of the load lies between {low:g} and {high:g}; published are 1.5 to 2"


def _load(value: float) -> str | None:
    return None if value >= 0.0 else "a load must not be below zero; write it in amperes"


def _temperature(value: float) -> str | None:
    if value < -ZERO_CELSIUS_K:
        return f"a temperature is at least -{ZERO_CELSIUS_K} degC (absolute zero); write degC"
    if value >= HOTTEST_C:
        return f"a temperature lies below {HOTTEST_C:g} degC; write degC"
    return None


_CHECKS: dict[str, Callable[[float], str | None]] = {
    "emissivity": _emissivity,
    "transmittance": _transmittance,
    "window.transmittance": _transmittance,
    "window.reflectance": _reflectance,
    "humidity": _humidity,
    "distance_m": _distance,
    "view_angle_deg": _angle,
    "wind_m_s": _wind,
    "load_exponent": _load_exponent,
    "load_a": _load,
    "height_m": _height,
    "design.humidity": _design_humidity,
    "design.degree_days_k": _degree_days,
    "conditions.u_value": _u_value,
}
