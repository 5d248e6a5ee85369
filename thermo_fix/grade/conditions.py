"""Conditions of a survey: which were met, which were not, and which were never told."""

from typing import Literal

from thermo_fix.records import Condition, ImageJob, SceneInputs, Survey

State = Literal["met", "not met", "not told"]

_LEAST_DIFFERENCE_K = 10.0
_MOST_WIND_M_S = 5.0
_LEAST_LOAD = 0.4
_STEEP_VIEW_DEG = 60.0


def conditions(survey: Survey) -> tuple[Condition, ...]:
    """Check the conditions of a survey as far as its sheet tells them.

    Parameters
    ----------
    survey
        As the sheet describes it.

    Returns
    -------
    tuple of Condition
        Each with its rule and source; those that the sheet does not tell are named too.

    """
    if survey.purpose == "building":
        return (
            _indoor_outdoor(survey),
            _wind(survey),
            _not_told("Rain", "No rain on the surface before or during the survey"),
            _not_told("Sun", "No direct sun on the surface for 12 h before (EN 13187, annex D)"),
            _not_told(
                "Steady state",
                "Indoor and outdoor air steady for hours before (EN 13187, annex D)",
            ),
            _view_angle(survey),
        )
    return (_load(survey), _wind(survey), _view_angle(survey))


def _not_told(name: str, rule: str) -> Condition:
    return Condition(name, "not told", "", rule, "EN 13187:1998, annex D (from memory)")


def _every_input(survey: Survey) -> list[SceneInputs]:
    return [
        every
        for job in survey.images
        for every in (job.inputs, *(zone.inputs for zone in job.zones if not zone.ignore))
    ]


def _told(survey: Survey, key: str) -> list[float]:
    found = [each.values[key] for each in _every_input(survey) if key in each.values]
    return [each.value for each in found if each.origin != "assumed"]


def _indoor_outdoor(survey: Survey) -> Condition:
    rule = f"At least {_LEAST_DIFFERENCE_K:g} K between indoor and outdoor air"
    source = "Common practice, no source (EN 13187 annex D asks for 3/U kelvins, at least 5 K)"
    gaps = [
        abs(each.values["indoor_c"].value - each.values["outdoor_c"].value)
        for each in _every_input(survey)
        if "indoor_c" in each.values and "outdoor_c" in each.values
    ]
    name = "Indoor-outdoor difference"
    if not gaps:
        return Condition(name, "not told", "", rule, source)
    state: State = "met" if min(gaps) >= _LEAST_DIFFERENCE_K else "not met"
    return Condition(name, state, f"{min(gaps):.1f} K", rule, source)


def _wind(survey: Survey) -> Condition:
    rule = f"Wind of at most {_MOST_WIND_M_S:g} m/s for work outdoors"
    source = "Survey practice citing EN 13187; ASTM C1060 allows 6.7 m/s"
    winds = _told(survey, "wind_m_s")
    if not winds:
        return Condition("Wind", "not told", "", rule, source)
    state: State = "met" if max(winds) <= _MOST_WIND_M_S else "not met"
    return Condition("Wind", state, f"{max(winds):.1f} m/s", rule, source)


def _view_angle(survey: Survey) -> Condition:
    rule = f"View angle of at most {_STEEP_VIEW_DEG:g} degrees from the normal"
    source = "Fresnel's equations: the emissivity of dielectrics falls steeply beyond"
    angles = _told(survey, "view_angle_deg")
    if not angles:
        return Condition("View angle", "not told", "", rule, source)
    state: State = "met" if max(angles) <= _STEEP_VIEW_DEG else "not met"
    return Condition("View angle", state, f"{max(angles):.0f} degrees", rule, source)


def _load(survey: Survey) -> Condition:
    rule = f"Load of at least {_LEAST_LOAD:.0%} of the rating"
    source = "NETA MTS 2019 practice; NFPA 70B:2023, 7.4 (clause from memory)"
    shares = [share for job in survey.images for share in _loads(job)]
    if not shares:
        return Condition("Load", "not told", "", rule, source)
    state: State = "met" if min(shares) >= _LEAST_LOAD else "not met"
    return Condition("Load", state, f"least {min(shares):.0%}", rule, source)


def _loads(job: ImageJob) -> list[float]:
    return [
        zone.load_a / zone.rated_a
        for zone in job.zones
        if zone.load_a is not None and zone.rated_a and not zone.ignore
    ]
