"""What the building trade adds to findings and images: moisture, heat flow."""

import math
from collections.abc import Sequence

import numpy as np

from thermo_fix import cautions
from thermo_fix.measure.heat import (
    SOURCE,
    HeatFlow,
    area_of,
    heat_flow,
    height_of,
    missing_inputs,
    no_u_value,
    validity,
    warm_side_is_inside,
)
from thermo_fix.measure.moisture import DESIGN, moisture_of
from thermo_fix.measure.pattern import pattern_assessment
from thermo_fix.measure.spot import Spot, spot_of_median
from thermo_fix.measure.trade import Extras, Measured
from thermo_fix.records import (
    Assessment,
    CorrectedFrame,
    Figure,
    Input,
    MeasuredRegion,
    SceneInputs,
)
from thermo_fix.thermal.heat_flow import yearly_energy_kwh
from thermo_fix.uncertainty.combine import combined, of_variable
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

KIND = "heat flow"
_LEAST_PIXELS = 50
"""Of the main surface outside all findings; with fewer all of it is taken."""


def finding_extras(measured: Measured) -> Extras:
    """Return what the trade adds to one finding.

    Parameters
    ----------
    measured
        The finding with its estimates.

    Returns
    -------
    Extras
        Moisture for a cold finding inside, with the design conditions as a scenario; heat flow
        for a finding that lets more heat through than its surroundings. What they lack is named;
        where the sheet tells nothing of indoors and outdoors, neither is added. The pattern that
        its shape resembles, for any finding.

    """
    inputs = measured.corrected.inputs[measured.region.label]
    shape = pattern_assessment(measured)
    patterns = () if shape is None else (shape,)
    if not _is_building_told(inputs):
        return Extras(patterns)
    job = measured.corrected.job
    lacking = missing_inputs(inputs)
    assessments: list[Assessment] = []
    extras = Extras()
    if measured.finding.sense == "cold" and inputs.inside is not False:
        at_extreme = (
            None if lacking else heat_flow(measured.corrected, measured.spot, measured.extreme)
        )
        if inputs.inside is None:
            assessments.append(_not_computed("moisture", "Moisture and mould", ("side",)))
        else:
            found = moisture_of(
                measured.quantities, measured.missing, inputs, job.design, at_extreme
            )
            assessments.append(found.assessment)
            scenarios = {DESIGN: found.scenario} if found.scenario else {}
            extras = Extras(scenarios=scenarios, words=found.words)
    if _lets_heat_through(measured.finding.sense, inputs):
        title = "Heat flow through the finding"
        assessments.append(
            _not_computed(KIND, title, lacking) if lacking else _excess(measured, title)
        )
    return Extras((*assessments, *patterns), (), extras.scenarios, words=extras.words)


def image_assessments(
    corrected: CorrectedFrame, regions: Sequence[MeasuredRegion]
) -> tuple[Assessment, ...]:
    """Return what the trade says of an image as a whole: the U-value of its main surface.

    Parameters
    ----------
    corrected
        The image.
    regions
        Its findings, which are left out of the main surface.

    """
    inputs = corrected.inputs[0]
    where = (corrected.labels == 0) & np.isfinite(corrected.surface_k)
    if not _is_building_told(inputs) or not where.any():
        return ()
    title = "Heat flow through the main surface"
    lacking = missing_inputs(inputs)
    if lacking:
        return (_not_computed(KIND, title, lacking),)
    sound = where.copy()
    for each in regions:
        x0, y0, x1, y1 = each.finding.bbox_px
        sound[y0:y1, x0:x1] = False
    if np.count_nonzero(sound) < _LEAST_PIXELS:
        sound = where
    spot = spot_of_median(corrected, f"main surface of {corrected.job.file}", 0, sound)
    flow = heat_flow(corrected, spot)
    figures = [
        _figure("heat flow, inside to outside", flow.flux, "W/m2"),
        _figure("convection and radiation together", flow.coefficient, "W m-2 K-1"),
        _figure("environmental temperature of the side seen", flow.environment_c, "degC"),
        Figure("indoors minus outdoors", flow.difference_k, None, "K"),
    ]
    if flow.u_value is None:
        statement = no_u_value()
    else:
        figures.append(_figure("U-value", flow.u_value, "W m-2 K-1"))
        statement = _u_value_words(flow.u_value)
        stated = corrected.job.conditions.u_value
        if stated is not None:
            figures.append(Figure("U-value as stated", stated.value, stated.u, "W m-2 K-1"))
    figures += _height_figure(inputs)
    return (
        Assessment(
            kind=KIND,
            title=title,
            statement=statement,
            figures=tuple(figures),
            cautions=validity(corrected.job, inputs, flow),
            source=SOURCE,
        ),
    )


def _u_value_words(estimate: Estimate) -> str:
    """Conclude from a U-value, and name what makes most of its uncertainty."""
    spread = _spread(estimate, "W m-2 K-1")
    name = max(estimate.contributions, key=lambda each: abs(estimate.contributions[each]))
    cause = f"Most of its uncertainty comes from {name.partition(' [')[0]}."
    if abs(estimate.value) > 2.0 * estimate.u:
        return f"The U-value of the main surface is {spread}. {cause}"
    return f"The U-value of the main surface, {spread}, cannot be told from zero. {cause}"


def _is_building_told(inputs: SceneInputs) -> bool:
    """Whether the sheet tells anything of indoors and outdoors."""
    return inputs.side is not None or any(
        inputs.told(key) is not None for key in ("indoor_c", "outdoor_c")
    )


def _lets_heat_through(sense: str, inputs: SceneInputs) -> bool:
    """Whether a finding of this sense lets more heat through than its surroundings."""
    inside, warm_inside = inputs.inside, warm_side_is_inside(inputs)
    if inside is None or warm_inside is None:
        # Not told: named as missing, for either sense.
        return True
    return (sense == "cold") == (inside == warm_inside)


def _excess(measured: Measured, title: str) -> Assessment:
    corrected, finding = measured.corrected, measured.finding
    inputs = corrected.inputs[measured.region.label]
    own = heat_flow(corrected, _mean_spot(measured))
    figures = [_figure("heat flow through the finding, inside to outside", own.flux, "W/m2")]
    warnings = list(validity(corrected.job, inputs, own))
    if finding.sense == "cold" and inputs.inside:
        warnings.insert(0, cautions.not_only_conduction())
    statement = "There is no reference to compare the heat flow with."
    if measured.reference_spot is not None and measured.reference is not None:
        other = heat_flow(corrected, measured.reference_spot, measured.reference)
        # Positive is what flows beyond the surroundings, in the direction in which heat flows.
        sign = 1.0 if own.difference_k >= 0.0 else -1.0
        surplus = _times(own.flux.minus(other.flux), sign)
        figures += [
            _figure(f"heat flow through the {finding.reference_name}", other.flux, "W/m2"),
            _figure("excess of the finding", surplus, "W/m2"),
        ]
        statement = _excess_figures(measured, own, other, surplus, figures)
    if own.u_value is None:
        statement += f" {no_u_value()}"
    figures.append(_figure("convection and radiation together", own.coefficient, "W m-2 K-1"))
    figures += _height_figure(inputs)
    return Assessment(
        kind=KIND,
        title=title,
        statement=statement,
        figures=tuple(figures),
        cautions=tuple(warnings),
        source=SOURCE,
    )


def _excess_figures(
    measured: Measured, own: HeatFlow, other: HeatFlow, surplus: Estimate, figures: list[Figure]
) -> str:
    """Add the figures that need an area or a difference; return the conclusion."""
    finding, job = measured.finding, measured.corrected.job
    inputs = measured.corrected.inputs[measured.region.label]
    what = "loss" if own.difference_k >= 0.0 else "gain"
    statement = (
        f"The finding lets {_spread(surplus, 'W/m2')} more through than its reference"
        f"{_weight(surplus)}."
    )
    if finding.area_m2 is None:
        return f"{statement} A {what} in watts needs ifov_mrad and distance_m."
    area = area_of(finding.area_m2, inputs)
    watts = combined(lambda flux, size: flux * size, surplus, area)
    figures += [
        _figure("area of the finding", area, "m2"),
        _figure(f"excess {what}", watts, "W"),
    ]
    statement = (
        f"The finding lets {_spread(watts, 'W')} more through than its reference would on the same "
        f"area{_weight(watts)}."
    )
    if own.u_value is None or other.u_value is None:
        return statement
    per_kelvin = combined(lambda gap, size: gap * size, own.u_value.minus(other.u_value), area)
    figures.append(_figure(f"excess {what} per kelvin", per_kelvin, "W/K"))
    days = job.design.degree_days_k
    if days is None or own.difference_k < 0.0:
        return statement
    energy = combined(yearly_energy_kwh, per_kelvin, _estimate(days))
    note = f"{days.value:g} K day"
    if job.design.climate:
        note += f", {job.design.climate}"
    figures.append(_figure("excess loss in a year", energy, "kWh", note))
    return f"{statement} In a heating season that is {_spread(energy, 'kWh')}."


def _mean_spot(measured: Measured) -> Spot:
    """Return the spot that stands for the whole region: the mean, since heat adds up."""
    corrected, region = measured.corrected, measured.region
    x0, y0, x1, y1 = region.bbox_px
    window = (slice(y0, y1), slice(x0, x1))
    usable = region.mask & np.isfinite(corrected.surface_k[window])
    planes = (corrected.emissivity_planes, corrected.reflected_planes)
    emissivity, reflected_c = (
        None
        if region.label not in each
        else float(np.mean(each[region.label][window][usable], dtype=np.float64))
        for each in planes
    )
    return Spot(
        f"mean of finding {measured.finding.id}",
        region.label,
        float(np.mean(corrected.reading_k[window][usable], dtype=np.float64)),
        1.0 / math.sqrt(np.count_nonzero(usable)),
        emissivity,
        reflected_c,
    )


def _not_computed(kind: str, title: str, lacking: Sequence[str]) -> Assessment:
    return Assessment(
        kind=kind,
        title=title,
        statement=f"Not computed: the sheet does not tell {', '.join(lacking)}.",
    )


def _height_figure(inputs: SceneInputs) -> list[Figure]:
    if not inputs.inside:
        return []
    height = height_of(inputs)
    note = "assumed" if height.origin == "assumed" else ""
    return [Figure("height for natural convection", height.value, height.u, "m", note)]


def _estimate(given: Input) -> Estimate:
    return of_variable(Variable(given.name, given.value, given.u, lower=0.0))


def _times(estimate: Estimate, factor: float) -> Estimate:
    return combined(lambda value: factor * value, estimate)


def _figure(label: str, estimate: Estimate, unit: str, note: str = "") -> Figure:
    return Figure(
        label, estimate.value, estimate.u if math.isfinite(estimate.u) else None, unit, note
    )


def _spread(estimate: Estimate, unit: str) -> str:
    """Write a value with its expanded uncertainty (k = 2) to two digits of that."""
    u = estimate.u
    if not (math.isfinite(u) and u > 0.0):
        return f"{estimate.value:.3g} {unit}"
    places = 1 - math.floor(math.log10(2.0 * u))
    # Adding zero takes the sign from a value that rounds to zero.
    value, wide = round(estimate.value, places) + 0.0, round(2.0 * u, places)
    shown = max(places, 0)
    return f"{value:.{shown}f} ± {wide:.{shown}f} {unit} (k = 2)"


def _weight(estimate: Estimate) -> str:
    """Say that a figure which its uncertainty swallows is none."""
    return "" if abs(estimate.value) > 2.0 * estimate.u else ", which may be nothing at all"
