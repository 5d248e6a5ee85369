"""What the wind outdoors says of a finding."""

import math
from contextlib import suppress

from thermo_fix.errors import DomainError
from thermo_fix.measure.load import FULL_LOAD, targets_of
from thermo_fix.measure.trade import Extras, Measured
from thermo_fix.measure.warmth import Warmth, at_load, without_wind
from thermo_fix.records import Assessment, Figure, Input
from thermo_fix.thermal.wind import CALM_M_S, wind_factor
from thermo_fix.uncertainty.estimate import Estimate

WITHOUT_WIND = "without wind"
FULL_LOAD_WITHOUT_WIND = "full load without wind"
SOURCE = (
    "Factors in common use in electrical thermography, no source found (they follow the wind to "
    "the power of 0.45); from memory"
)


def wind_of(measured: Measured) -> Input | None:
    """Return the wind where it counts: outdoors, and told."""
    inputs = measured.corrected.inputs[measured.region.label]
    return inputs.told("wind_m_s") if inputs.outdoors else None


def wind_extras(measured: Measured, warmth: Warmth) -> Extras:
    """Return the scenarios without wind and the assessment of the wind; nothing indoors.

    Parameters
    ----------
    measured
        A finding.
    warmth
        Its state as measured.

    """
    inputs = measured.corrected.inputs[measured.region.label]
    if not inputs.outdoors or measured.finding.sense != "hot":
        return Extras()
    wind = wind_of(measured)
    if wind is None:
        return Extras(
            (
                _assessment(
                    "The part stands outdoors and the wind was not told (wind_m_s): wind cools it, "
                    "and the grade may be understated by an unknown amount."
                ),
            )
        )
    figures = [Figure("wind", wind.value, wind.u, "m/s")]
    if wind.value <= CALM_M_S:
        return Extras(
            (
                _assessment(
                    f"A wind of {wind.value:g} m/s needs no correction (up to {CALM_M_S:g} m/s).",
                    figures,
                ),
            )
        )
    try:
        factor = wind_factor(wind.value)
        calm = without_wind(warmth, wind)
    except DomainError as error:
        return Extras((_assessment(f"Not corrected for the wind: {error}.", figures),))
    figures.append(Figure("wind factor", factor.factor, factor.u, "1", "without that of the wind"))
    scenarios: dict[str, dict[str, Estimate]] = {WITHOUT_WIND: calm.quantities()}
    parts = []
    for noun, before, after in (
        ("difference", warmth.difference, calm.difference),
        ("rise over the air", warmth.rise, calm.rise),
    ):
        if before is None or after is None:
            continue
        u = after.u
        figures.append(
            Figure(f"{noun}, {WITHOUT_WIND}", after.value, u if math.isfinite(u) else None, "K")
        )
        parts.append(f"the {noun} would be {after.value:.1f} K (u = {u:.1f} K)")
    rated_a = targets_of(measured).get(FULL_LOAD)
    if rated_a is not None and warmth.current is not None:
        # Where that cannot be told the assessment of the load says why.
        with suppress(DomainError):
            scenarios[FULL_LOAD_WITHOUT_WIND] = at_load(calm, rated_a).quantities()
    statement = (
        f"The wind of {wind.value:g} m/s cools: at {CALM_M_S:g} m/s {' and '.join(parts)}. The "
        "factors are a rule of thumb whose uncertainty grows with the wind."
    )
    return Extras((_assessment(statement, figures),), scenarios=scenarios)


def _assessment(statement: str, figures: list[Figure] | None = None) -> Assessment:
    return Assessment("wind", "Wind", statement, tuple(figures or ()), (), SOURCE)
