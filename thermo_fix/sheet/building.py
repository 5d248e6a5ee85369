"""From the tables ``[conditions]`` and ``[design]`` to what a building survey is judged by."""

from thermo_fix.defaults import default_for
from thermo_fix.records import Design, Input, SurveyConditions
from thermo_fix.sheet.schema import ConditionsTable, DesignTable, Quantity

_EXACT = "A stated condition without an uncertainty of its own is taken as exact."
_U_ASSUMED = "Its standard uncertainty was not told and is assumed (common practice, no source)."


def survey_conditions(table: ConditionsTable) -> SurveyConditions:
    """Turn ``[conditions]`` into a record."""
    return SurveyConditions(
        rain=table.rain,
        sun_hours_since=table.sun_hours_since,
        steady_hours=table.steady_hours,
        pressure_difference_pa=table.pressure_difference_pa,
        u_value=_measured("conditions.u_value", table.u_value),
    )


def design_conditions(table: DesignTable) -> Design:
    """Turn ``[design]`` into a record."""
    return Design(
        indoor_c=_agreed("design.indoor_c", table.indoor_c),
        humidity=_agreed("design.humidity", table.humidity),
        outdoor_c=_agreed("design.outdoor_c", table.outdoor_c),
        degree_days_k=_measured("design.degree_days_k", table.degree_days_k),
        climate=table.climate,
    )


def _agreed(key: str, said: Quantity | None) -> Input | None:
    """Return a condition that is agreed upon, not measured: exact unless it says otherwise."""
    if said is None:
        return None
    if said.u is None:
        return Input(key, said.value, 0.0, "given", "design", "given", _EXACT)
    return Input(key, said.value, said.u, "given", "design", "given")


def _measured(key: str, said: Quantity | None) -> Input | None:
    if said is None:
        return None
    scope = key.partition(".")[0]
    if said.u is not None:
        return Input(key, said.value, said.u, "given", scope, "given")
    u = default_for(key).u_for(said.value)
    return Input(key, said.value, u, "given", scope, "assumed", _U_ASSUMED)
