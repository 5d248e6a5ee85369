"""What the load says of a finding: at full load, at a stated load, at equal load."""

import math

from thermo_fix import cautions
from thermo_fix.errors import DomainError
from thermo_fix.measure.trade import Extras, Measured
from thermo_fix.measure.warmth import (
    Warmth,
    at_equal_load,
    at_load,
    exponent_input,
    is_same_load,
    zone_of,
)
from thermo_fix.records import Assessment, Figure, Zone
from thermo_fix.thermal.load import LEAST_LOAD
from thermo_fix.uncertainty.estimate import Estimate

FULL_LOAD = "full load"
STATED_LOAD = "stated load"
EQUAL_LOAD = "equal load"
SOURCE = (
    "dT2 = dT1 (I2/I1)^n: n = 2/(1 + m) from a heat loss as dT^(1 + m); published n of about 1.5 "
    "to 2 (Lyon, Orlove and Peters, Proc. SPIE 4020, 2000, from memory), 1.8 in IEEE C37.010 "
    "(from memory)"
)


def targets_of(measured: Measured) -> dict[str, float]:
    """Return the loads that a finding is to be brought to, A, by scenario."""
    zone = zone_of(measured)
    if zone is None:
        return {}
    found = {}
    if zone.rated_a is not None:
        found[FULL_LOAD] = zone.rated_a
    if zone.inputs.target_load_a is not None:
        found[STATED_LOAD] = zone.inputs.target_load_a
    return found


def load_extras(measured: Measured, warmth: Warmth) -> Extras:
    """Return the scenarios of other loads and the assessment of the load.

    Parameters
    ----------
    measured
        A finding.
    warmth
        Its state as measured.

    """
    zone = zone_of(measured)
    if zone is None or zone.load_a is None or warmth.current is None:
        return Extras()
    load_a = zone.load_a
    own: list[str] = []
    if zone.rated_a is not None and load_a > zone.rated_a:
        own.append(cautions.overload(load_a, zone.rated_a))
    sentences = [_load_sentence(zone)]
    figures = _load_figures(zone, warmth)
    scenarios: dict[str, dict[str, Estimate]] = {}
    notes: list[str] = []
    if load_a == 0.0:
        if measured.finding.sense == "hot":
            own.append(cautions.heat_without_current(zone.name))
            sentences.append("The heat has another source; it does not grow with the load.")
        else:
            sentences.append("Without current it is expected to be as cold as what surrounds it.")
        return Extras(
            (_assessment(sentences, figures, ()),),
            cautions=tuple(own),
        )
    if measured.finding.sense == "hot":
        targets = targets_of(measured)
        if not targets:
            sentences.append("The values at full load need rated_a.")
        for scenario, target_a in targets.items():
            try:
                other = at_load(warmth, target_a)
            except DomainError as error:
                sentences.append(f"Not brought to {scenario}: {error}.")
                continue
            scenarios[scenario] = other.quantities()
            sentences.append(_scenario_sentence(scenario, target_a, warmth, other))
            figures += _scenario_figures(scenario, target_a, other)
            share = load_a / target_a
            if share < LEAST_LOAD:
                factor = share**-warmth.exponent.value
                notes.append(cautions.far_from_load(share, factor))
    equal = _equal_load(measured, warmth)
    if equal is not None:
        difference, sentence, more = equal
        sentences.append(sentence)
        figures += more
        scenarios[EQUAL_LOAD] = {
            # In the sense of the finding; what is left on the other side is no deficiency.
            "difference": difference if measured.finding.sense == "hot" else _negative(difference),
            "like_difference": difference,
        }
    return Extras(
        (_assessment(sentences, figures, tuple(notes), exponent=_exponent_figure(measured)),),
        cautions=tuple(own),
        scenarios=scenarios,
    )


def _assessment(
    sentences: list[str],
    figures: list[Figure],
    notes: tuple[str, ...],
    exponent: Figure | None = None,
) -> Assessment:
    every = (*figures, exponent) if exponent is not None else tuple(figures)
    return Assessment("load", "Load", " ".join(sentences), every, notes, SOURCE)


def _load_sentence(zone: Zone) -> str:
    assert zone.load_a is not None  # told
    if zone.rated_a is None:
        return f"The load was {zone.load_a:g} A."
    share = zone.load_a / zone.rated_a
    return f"The load was {zone.load_a:g} A, {share:.0%} of the rated {zone.rated_a:g} A."


def _scenario_sentence(scenario: str, target_a: float, now: Warmth, then: Warmth) -> str:
    parts = []
    for noun, before, after in (
        ("difference", now.difference, then.difference),
        ("rise over the air", now.rise, then.rise),
    ):
        if before is not None and after is not None:
            parts.append(
                f"the {noun} would be {after.value:.1f} K (u = {after.u:.1f} K) instead of "
                f"{before.value:.1f} K"
            )
    place = f"At {scenario} ({target_a:g} A) "
    sentence = f"{place}{' and '.join(parts)}."
    if now.is_like and then.difference is None:
        sentence += (
            " The difference to the like component needs the rise of both over the air (air_c) and "
            "a current in both."
        )
    elif now.is_like and now.like_current is None:
        sentence += " The like component is taken to carry the same current."
    return sentence


def _load_figures(zone: Zone, warmth: Warmth) -> list[Figure]:
    assert warmth.current is not None  # told
    figures = [Figure("current", warmth.current.value, warmth.current.u, "A")]
    if zone.rated_a is not None:
        share = 100.0 / zone.rated_a
        figures.append(
            Figure("load", warmth.current.value * share, warmth.current.u * share, "%", "of rated")
        )
    if warmth.like_current is not None:
        other = warmth.like_current
        figures.append(Figure("current of the like component", other.value, other.u, "A"))
    if warmth.rise is not None:
        figures.append(_figure("rise over the air, as measured", warmth.rise, "K"))
    if warmth.difference is not None:
        figures.append(_figure("difference, as measured", warmth.difference, "K"))
    return figures


def _scenario_figures(scenario: str, target_a: float, state: Warmth) -> list[Figure]:
    figures = []
    note = f"{target_a:g} A"
    for name, words, unit in (
        ("rise_over_air", "rise over the air", "K"),
        ("surface_c", "surface temperature", "degC"),
        ("difference", "difference", "K"),
    ):
        estimate = state.quantities().get(name)
        if estimate is not None:
            figures.append(_figure(f"{words}, {scenario}", estimate, unit, note))
    return figures


def _equal_load(measured: Measured, warmth: Warmth) -> tuple[Estimate, str, list[Figure]] | None:
    """Compare with the like at one current, and say what the currents explain."""
    current, other, now = warmth.current, warmth.like_current, warmth.difference
    if not warmth.is_like or current is None or other is None or now is None:
        return None
    if is_same_load(current, other):
        return None
    left = at_equal_load(warmth)
    name = measured.finding.reference_name.partition(",")[0]
    if left is None:
        return None
    explained = now.minus(left)
    share = explained.value / now.value if now.value else 0.0
    figures = [
        _figure("difference, equal load", left, "K", f"{current.value:g} A in both"),
        _figure("explained by the current", explained, "K"),
    ]
    if 0.0 <= share <= 1.0:
        figures.append(Figure("explained share", 100.0 * share, None, "%"))
    sentence = (
        f"{name} carries {other.value:g} A: of the difference of {now.value:.1f} K the current "
        f"explains {explained.value:.1f} K, and at equal load {left.value:.1f} K "
        f"(u = {left.u:.1f} K) are left"
    )
    if abs(left.value) <= 2.0 * left.u:
        sentence += ", which is within its expanded uncertainty: the current may explain it all."
    elif left.value * now.value < 0.0:
        sentence += ": for its current the part is on the other side of its like."
    else:
        sentence += ": the current does not explain it all."
    return left, sentence, figures


def _negative(difference: Estimate) -> Estimate:
    return Estimate(
        -difference.value,
        {name: -part for name, part in difference.contributions.items()},
        -difference.draws,
    )


def _exponent_figure(measured: Measured) -> Figure:
    given = exponent_input(measured.corrected.inputs[measured.region.label])
    return Figure("exponent n", given.value, given.u, "1", given.origin)


def _figure(label: str, estimate: Estimate, unit: str, note: str = "") -> Figure:
    u = estimate.u
    return Figure(label, estimate.value, u if math.isfinite(u) else None, unit, note)
