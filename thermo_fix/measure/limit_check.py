"""A part against the limit that the sheet names for it."""

import math
from collections.abc import Mapping

import cv2
import numpy as np

from thermo_fix import cautions
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.limits import RISE_AIR_C, STATED
from thermo_fix.measure.combining import as_estimate, shifted
from thermo_fix.measure.load import FULL_LOAD
from thermo_fix.measure.spot import spot_at_extreme, temperature_of
from thermo_fix.measure.trade import Extras, Measured
from thermo_fix.measure.warmth import (
    Warmth,
    current_of,
    exponent_of,
    rise_under,
    told_air,
)
from thermo_fix.records import Assessment, CorrectedFrame, Figure, Limit, SceneInputs
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

AS_MEASURED = "as measured"
DESIGN_AMBIENT = "design ambient"
FULL_LOAD_AT_DESIGN = "full load at design ambient"
SETTING = "absolute_limit_c"
"""Setting of the criterion that compares a surface temperature with a limit."""
_EVEN = 0.5


def limit_extras(measured: Measured, warmth: Warmth, at_full: Warmth | None) -> Extras:
    """Return the limit in force for a finding, its scenarios and its assessment.

    Parameters
    ----------
    measured
        A finding.
    warmth
        Its state as measured.
    at_full
        Its state at full load; None where that cannot be told.

    """
    label = measured.region.label
    inputs = measured.corrected.inputs[label]
    full_rise = None if at_full is None else at_full.rise
    scenarios = _design_scenarios(inputs, warmth.rise, full_rise)
    limit = inputs.limit
    if limit is None or measured.finding.sense != "hot":
        return Extras(scenarios=scenarios if measured.finding.sense == "hot" else {})
    number = limit_number(limit, inputs)
    if number is None:
        return Extras(
            (
                Assessment(
                    "limit",
                    "Limit",
                    f'The limit "{limit.name}" is a rise over the air, and air_c was not told.',
                    source=_source(limit),
                ),
            ),
            missing={"surface_c": ("air_c",)},
        )
    states = {AS_MEASURED: measured.extreme}
    quantities: dict[str, Estimate] = {}
    if limit.rise_k is not None and warmth.rise is not None and warmth.air is not None:
        # What is compared is the rise: the error of the air counts, and the design ambient does
        # not, because a rise hardly depends on it.
        scenarios = {}
        states[AS_MEASURED] = quantities["surface_c"] = shifted(warmth.rise, warmth.air.value)
        if full_rise is not None:
            states[FULL_LOAD] = shifted(full_rise, warmth.air.value)
            scenarios[FULL_LOAD] = {"surface_c": states[FULL_LOAD]}
    else:
        if at_full is not None and "surface_c" in at_full.quantities():
            states[FULL_LOAD] = at_full.quantities()["surface_c"]
        states |= {name: each["surface_c"] for name, each in scenarios.items()}
    return Extras(
        (_assessment(limit, number, states),),
        scenarios=scenarios,
        quantities=quantities,
        settings={SETTING: number},
    )


def limits_of_zones(corrected: CorrectedFrame, found: set[str]) -> tuple[Assessment, ...]:
    """Check the zones that have a limit and no finding: like parts may all be too hot.

    Parameters
    ----------
    corrected
        The image.
    found
        Names of zones with a hot finding, which are checked there.

    """
    lines: list[str] = []
    figures: list[Figure] = []
    sources: dict[str, None] = {}
    notes: dict[str, None] = {}
    for label, zone in enumerate(corrected.job.zones, 1):
        inputs = corrected.inputs[label]
        limit = inputs.limit
        if limit is None or zone.ignore or zone.role is not None or zone.name in found:
            continue
        number = limit_number(limit, inputs)
        place = hottest_px(corrected, label)
        if place is None:
            lines.append(f"{zone.name} is not checked (it has no surface temperature).")
            continue
        if number is None:
            lines.append(
                f"{zone.name} is not checked (its limit is a rise, and air_c is not told)."
            )
            continue
        spot = spot_at_extreme(
            corrected, f"hottest of zone {zone.name} of {corrected.job.file}", label, place
        )
        states = _zone_states(corrected, label, temperature_of(spot, corrected.equations[label]))
        for state, estimate in states.items():
            figures.append(_margin_figure(f"{zone.name}: margin {state}", number, estimate))
            chance = chance_above(estimate, number)
            if chance >= _EVEN:
                lines.append(
                    f"{zone.name} is above the limit of {number:.0f} degC {_when(state)} "
                    f"({_percent(chance)} likely), and no difference shows it."
                )
        sources[_source(limit)] = None
        notes |= dict.fromkeys(_notes(limit))
    if not figures and not lines:
        return ()
    if not lines:
        lines.append("The zones without a finding are within their limits.")
    return (
        Assessment(
            "limit",
            "Limits of zones without a finding",
            " ".join(lines),
            tuple(figures),
            tuple(notes),
            "; ".join(sources),
        ),
    )


def limit_number(limit: Limit, inputs: SceneInputs) -> float | None:
    """Return a limit as a surface temperature, degC; None for a rise over an air not told."""
    if limit.temperature_c is not None:
        return limit.temperature_c
    air = inputs.told("air_c")
    if air is None or limit.rise_k is None:
        return None
    return air.value + limit.rise_k


def chance_above(estimate: Estimate, number: float) -> float:
    """Return the probability that a quantity is above a number."""
    finite = estimate.draws[np.isfinite(estimate.draws)]
    return float(np.mean(finite > number)) if len(finite) else 0.0


def hottest_px(corrected: CorrectedFrame, label: int) -> tuple[int, int] | None:
    """Return x, y of the hottest 3 x 3 mean of a zone, clear of its blurred edge."""
    here = ((corrected.labels == label) & np.isfinite(corrected.surface_k)).astype(np.uint8)
    clear = cv2.erode(here, np.ones((3, 3), np.uint8), borderValue=0)
    if not clear.any():
        clear = here
    if not clear.any():
        return None
    warm = np.where(here > 0, corrected.surface_k - ZERO_CELSIUS_K, 0.0).astype(np.float64)
    total = cv2.boxFilter(warm, -1, (3, 3), normalize=False, borderType=cv2.BORDER_CONSTANT)
    count = cv2.boxFilter(
        here.astype(np.float64), -1, (3, 3), normalize=False, borderType=cv2.BORDER_CONSTANT
    )
    mean = np.where(clear > 0, total / np.maximum(count, 1.0), -np.inf)
    row, column = np.unravel_index(int(np.argmax(mean)), mean.shape)
    return int(column), int(row)


def _design_scenarios(
    inputs: SceneInputs, rise: Estimate | None, full_rise: Estimate | None
) -> dict[str, Mapping[str, Estimate]]:
    design_c = inputs.design_air_c
    if design_c is None:
        return {}
    found: dict[str, Mapping[str, Estimate]] = {}
    for name, each in ((DESIGN_AMBIENT, rise), (FULL_LOAD_AT_DESIGN, full_rise)):
        if each is not None:
            found[name] = {"surface_c": shifted(each, design_c)}
    return found


def _zone_states(corrected: CorrectedFrame, label: int, surface: Estimate) -> dict[str, Estimate]:
    zone, inputs = corrected.job.zones[label - 1], corrected.inputs[label]
    states = {AS_MEASURED: surface}
    air = told_air(inputs)
    if air is None:
        return states
    rise = surface.minus(as_estimate(air, len(surface.draws)))
    is_rise = inputs.limit is not None and inputs.limit.rise_k is not None
    if is_rise:
        states[AS_MEASURED] = shifted(rise, air.value)
    full: Estimate | None = None
    current = current_of(zone, corrected.job.file)
    if current is not None and zone.rated_a is not None:
        try:
            rated = Variable("rated load", zone.rated_a, 0.0)
            full = rise_under(rise, current, rated, exponent_of(inputs))
            states[FULL_LOAD] = shifted(full, air.value)
        except DomainError:
            full = None
    if not is_rise:
        designed = _design_scenarios(inputs, rise, full)
        states |= {name: each["surface_c"] for name, each in designed.items()}
    return states


def _assessment(limit: Limit, number: float, states: Mapping[str, Estimate]) -> Assessment:
    figures = [Figure("limit", number, None, "degC", limit.name)]
    sentences = []
    for state, estimate in states.items():
        margin = number - estimate.value
        figures.append(_margin_figure(f"margin {state}", number, estimate))
        chance = chance_above(estimate, number)
        side = "below" if margin >= 0.0 else "above"
        sentences.append(
            f"{_when(state)} {abs(margin):.0f} K {side} it ({_percent(chance)} likely above)"
        )
    statement = f'The limit is "{limit.name}", {number:.0f} degC: {"; ".join(sentences)}.'
    return Assessment("limit", "Limit", statement, tuple(figures), _notes(limit), _source(limit))


def _margin_figure(label: str, number: float, estimate: Estimate) -> Figure:
    u = estimate.u
    return Figure(
        label,
        number - estimate.value,
        u if math.isfinite(u) else None,
        "K",
        f"above with a probability of {_percent(chance_above(estimate, number))}",
    )


def _percent(chance: float) -> str:
    if chance < 0.01:
        return "less than 1%"
    return "more than 99%" if chance > 0.99 else f"{chance:.0%}"


def _when(state: str) -> str:
    return state if state == AS_MEASURED else f"at {state}"


def _notes(limit: Limit) -> tuple[str, ...]:
    notes = [cautions.hotter_inside()]
    if limit.obtained == "from memory":
        notes.append(cautions.limit_from_memory(limit.name))
    return tuple(notes)


def _source(limit: Limit) -> str:
    if limit.name == STATED:
        return limit.source
    words = f"{limit.source} ({limit.obtained})"
    return f"{words}; holds up to an air of {RISE_AIR_C:g} degC" if limit.rise_k else words
