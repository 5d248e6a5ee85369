"""Moisture at an inside surface: at the survey, and under stated design conditions."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache

import numpy as np

from thermo_fix import cautions
from thermo_fix.measure.heat import HeatFlow
from thermo_fix.radiometry import humidity as moist
from thermo_fix.radiometry.blackbody import Real
from thermo_fix.records import Assessment, Design, Figure, Input, SceneInputs, VariableWords
from thermo_fix.thermal.heat_flow import MOULD_RSI, factor_at_resistance
from thermo_fix.uncertainty.combine import combined, of_variable
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

CRITICAL_HUMIDITY = 0.80
"""Surface humidity from which mould may grow (ISO 13788:2012, 5.3)."""
_LIMIT = f"{100 * CRITICAL_HUMIDITY:.0f} %"
DESIGN = "design conditions"
_DESIGN_WORDS = {
    "indoor_c": ("design indoor temperature", "degC"),
    "humidity": ("design humidity", "1"),
    "outdoor_c": ("design outdoor temperature", "degC"),
}
SOURCE = "ISO 13788:2012, 3.1 (temperature factor) and 5.3 (critical surface humidity)"


@dataclass(frozen=True, slots=True)
class Moisture:
    """What moisture adds to a finding."""

    assessment: Assessment
    scenario: Mapping[str, Estimate] = field(default_factory=dict)
    words: Mapping[str, VariableWords] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class _Air:
    """Indoor air, and what follows from it alone."""

    dew_point: Estimate
    """degC."""
    critical: Estimate
    """Surface temperature at which the critical humidity is reached, degC."""


@lru_cache(maxsize=16)
def _air(indoor: Input, humidity: Input) -> _Air:
    """Kept, because all findings of a survey ask for the same air."""
    parts = (_of(indoor), _of(humidity))
    return _Air(
        combined(_dew_point, *parts),
        combined(lambda air, wet: _dew_point(air, wet / CRITICAL_HUMIDITY), *parts),
    )


def moisture_of(
    quantities: Mapping[str, Estimate],
    missing: Mapping[str, tuple[str, ...]],
    inputs: SceneInputs,
    design: Design,
    flow: HeatFlow | None,
) -> Moisture:
    """Judge moisture at a cold place inside.

    Parameters
    ----------
    quantities, missing
        Of the place, as the criteria compare them.
    inputs
        Of its zone.
    design
        Of the survey.
    flow
        Heat flow at the place, where it could be computed.

    """
    surface = quantities["surface_c"]
    figures = [_figure("surface temperature", surface, "degC")]
    said = []
    lacking = [key for key in ("indoor_c", "humidity") if inputs.told(key) is None]
    if lacking:
        said.append(f"The surface humidity at the survey lacks {_listed(lacking)}.")
    elif "surface_humidity" in quantities:
        air = _air(inputs.values["indoor_c"], inputs.values["humidity"])
        figures += _figures(
            air, quantities["dew_point_margin"], quantities["surface_humidity"], "at the survey"
        )
        said.append(_verdict("At the survey", quantities["surface_humidity"]))
    factor = quantities.get("surface_factor")
    if factor is None:
        why = _listed(missing.get("surface_factor", ("indoor_c", "outdoor_c")))
        said.append(f"The temperature factor is not given: {why}.")
    else:
        figures.append(_figure("temperature factor fRsi", factor, "1"))
    scenario: dict[str, Estimate] = {}
    words: dict[str, VariableWords] = {}
    wanted = {"indoor_c": design.indoor_c, "humidity": design.humidity}
    wanted["outdoor_c"] = design.outdoor_c
    told = {key: each for key, each in wanted.items() if each is not None}
    if told and len(told) < len(wanted):
        said.append(
            "Design conditions were not computed: [design] lacks "
            f"{_listed([key for key in wanted if key not in told])}."
        )
    elif told and factor is not None:
        scenario, more, sentence = _designed(factor, told, flow)
        figures += more
        said.append(sentence)
        words = {
            each.name: VariableWords(
                _DESIGN_WORDS[key][0],
                f"agree on a narrower {_DESIGN_WORDS[key][0]}",
                each.value,
                each.u,
                _DESIGN_WORDS[key][1],
            )
            for key, each in told.items()
        }
    warnings = [cautions.not_only_conduction()]
    if factor is not None:
        warnings.append(cautions.surface_resistance(MOULD_RSI))
    assessment = Assessment(
        kind="moisture",
        title="Moisture and mould",
        statement=" ".join(said),
        figures=tuple(figures),
        cautions=tuple(warnings),
        source=SOURCE,
    )
    return Moisture(assessment, scenario, words)


def surface_at_design_c(factor: Real, indoor_c: Real, outdoor_c: Real) -> Real:
    """Surface temperature under other air temperatures, Te + fRsi (Ti - Te), degC.

    Parameters
    ----------
    factor
        fRsi (ISO 13788:2012, 3.1).
    indoor_c, outdoor_c
        degC.

    """
    return outdoor_c + factor * (indoor_c - outdoor_c)


def _designed(
    factor: Estimate, told: Mapping[str, Input], flow: HeatFlow | None
) -> tuple[dict[str, Estimate], list[Figure], str]:
    indoor, wet, outdoor = (_of(told[key]) for key in ("indoor_c", "humidity", "outdoor_c"))
    surface = combined(surface_at_design_c, factor, indoor, outdoor)
    air = _air(told["indoor_c"], told["humidity"])
    margin = surface.minus(air.dew_point)
    damp = combined(
        lambda f, ti, rh, te: _surface_humidity(surface_at_design_c(f, ti, te), ti, rh),
        factor,
        indoor,
        wet,
        outdoor,
    )
    required = combined(
        lambda critical, ti, te: (critical - te) / (ti - te), air.critical, indoor, outdoor
    )
    figures = [
        *(
            _figure(f"design {words}", part, unit)
            for words, part, unit in (
                ("indoor temperature", indoor, "degC"),
                ("humidity indoors", wet, "1"),
                ("outdoor temperature", outdoor, "degC"),
            )
        ),
        _figure("surface temperature at design conditions", surface, "degC"),
        *_figures(air, margin, damp, "at design conditions"),
        _figure(f"fRsi required at design conditions for {_LIMIT}", required, "1"),
    ]
    if flow is not None:
        other = combined(
            lambda f, h: factor_at_resistance(f, 1.0 / h, MOULD_RSI), factor, flow.coefficient
        )
        figures.append(
            _figure(
                f"fRsi if the surface resistance were {MOULD_RSI:g} m2 K/W",
                other,
                "1",
                "converted for a plane wall; a thermal bridge follows it roughly",
            )
        )
    scenario = {
        "surface_c": surface,
        "dew_point_margin": margin,
        "surface_humidity": damp,
    }
    return scenario, figures, _verdict("Under the design conditions", damp)


def _figures(air: _Air, margin: Estimate, damp: Estimate, when: str) -> list[Figure]:
    return [
        _figure(f"dew point of the indoor air {when}", air.dew_point, "degC"),
        _figure(f"surface above the dew point {when}", margin, "K"),
        _figure(f"humidity at the surface {when}", damp, "1"),
        _figure(
            f"critical surface temperature for {_LIMIT} {when}",
            air.critical,
            "degC",
        ),
    ]


def _verdict(when: str, damp: Estimate) -> str:
    finite = damp.draws[np.isfinite(damp.draws)]
    chance = float(np.mean(finite >= CRITICAL_HUMIDITY)) if len(finite) else float("nan")
    reached = "reaches" if damp.value >= CRITICAL_HUMIDITY else "stays below"
    words = (
        "above 99 %"
        if chance > 0.99
        else "below 1 %"
        if chance < 0.01
        else f"{chance:.0%}".replace("%", " %")
    )
    return (
        f"{when} the humidity at the surface is {100 * damp.value:.0f} % and {reached} the "
        f"{_LIMIT} from which mould may grow; the chance that it is reached "
        f"is {words}."
    )


def _of(given: Input) -> Estimate:
    if given.key.endswith("humidity"):
        return of_variable(Variable(given.name, given.value, given.u, lower=0.0, upper=1.0))
    return of_variable(Variable(given.name, given.value, given.u))


def _dew_point(air_c: Real, fraction: Real) -> Real:
    """Dew point within the range of the formula; of air that is more than full, its own."""
    low, high = moist.RANGE_C
    result: Real = moist.dew_point_c(np.clip(air_c, low, high), np.clip(fraction, 1e-6, 1.0))
    return result


def _surface_humidity(surface_c: Real, air_c: Real, fraction: Real) -> Real:
    low, high = moist.RANGE_C
    inside = np.where((surface_c > low) & (surface_c < high), surface_c, np.nan)
    result: Real = moist.surface_humidity(
        inside, np.clip(air_c, low, high), np.clip(fraction, 0.0, 1.0)
    )
    return result


def _figure(label: str, estimate: Estimate, unit: str, note: str = "") -> Figure:
    u = estimate.u
    return Figure(label, estimate.value, u if np.isfinite(u) and u > 0.0 else None, unit, note)


def _listed(keys: list[str] | tuple[str, ...]) -> str:
    return ", ".join(keys)
