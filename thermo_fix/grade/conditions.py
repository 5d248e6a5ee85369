"""Conditions of a survey: which were met, which were not, and which were never told."""

from collections.abc import Sequence
from typing import Literal

from thermo_fix.grade.conditions_building import building_conditions
from thermo_fix.grade.stated import every_input, told
from thermo_fix.records import Condition, Finding, ImageJob, Survey
from thermo_fix.thermal.load import LEAST_LOAD
from thermo_fix.thermal.wind import MOST_WIND_M_S

State = Literal["met", "not met", "not told"]

_STEEP_VIEW_DEG = 60.0


def conditions(survey: Survey, findings: Sequence[Finding] = ()) -> tuple[Condition, ...]:
    """Check the conditions of a survey as far as its sheet tells them.

    Parameters
    ----------
    survey
        As the sheet describes it.
    findings
        Of the survey, for the size of what was measured.

    Returns
    -------
    tuple of Condition
        Each with its rule and source; those that the sheet does not tell are named too.

    """
    if survey.purpose == "building":
        return (*building_conditions(survey, findings), _view_angle(survey))
    return (_load(survey), *_wind(survey), _view_angle(survey))


def _wind(survey: Survey) -> tuple[Condition, ...]:
    """Check the wind of an electrical survey; none where nothing of it is outdoors."""
    outdoors = [each for each in every_input(survey) if each.outdoors]
    if not outdoors:
        return ()
    rule = f"Wind of at most {MOST_WIND_M_S:g} m/s at parts outdoors"
    source = "Common practice, no source: no correction for more wind is in use"
    told_winds = [each.told("wind_m_s") for each in outdoors]
    winds = [each.value for each in told_winds if each is not None]
    if len(winds) < len(outdoors) and not any(wind > MOST_WIND_M_S for wind in winds):
        return (Condition("Wind", "not told", "", rule, source),)
    state: State = "met" if max(winds) <= MOST_WIND_M_S else "not met"
    return (Condition("Wind", state, f"{max(winds):.1f} m/s", rule, source),)


def _view_angle(survey: Survey) -> Condition:
    rule = f"View angle of at most {_STEEP_VIEW_DEG:g} degrees from the normal"
    source = "Fresnel's equations: the emissivity of dielectrics falls steeply beyond"
    angles = told(survey, "view_angle_deg")
    if not angles:
        return Condition("View angle", "not told", "", rule, source)
    state: State = "met" if max(angles) <= _STEEP_VIEW_DEG else "not met"
    return Condition("View angle", state, f"{max(angles):.0f} degrees", rule, source)


def _load(survey: Survey) -> Condition:
    rule = f"Load of at least {LEAST_LOAD:.0%} of the rating"
    source = "NETA MTS 2019 practice; NFPA 70B:2023, 7.4 (clause from memory)"
    shares = [share for job in survey.images for share in _loads(job)]
    if not shares:
        return Condition("Load", "not told", "", rule, source)
    state: State = "met" if min(shares) >= LEAST_LOAD else "not met"
    return Condition("Load", state, f"least {min(shares):.0%}", rule, source)


def _loads(job: ImageJob) -> list[float]:
    return [
        zone.load_a / zone.rated_a
        for zone in job.zones
        if zone.load_a is not None and zone.rated_a and not zone.ignore
    ]
