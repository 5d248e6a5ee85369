"""What the electrical trade adds to findings and images: load, wind, limits, phases."""

from collections.abc import Sequence

from thermo_fix.errors import DomainError
from thermo_fix.measure.limit_check import limit_extras, limits_of_zones
from thermo_fix.measure.load import FULL_LOAD, load_extras, targets_of
from thermo_fix.measure.phases import assess_group, group_words
from thermo_fix.measure.trade import Extras, Measured
from thermo_fix.measure.warmth import Warmth, at_load, warmth_of, words_of, zone_of
from thermo_fix.measure.wind import wind_extras, wind_of
from thermo_fix.records import Assessment, CorrectedFrame, MeasuredRegion
from thermo_fix.uncertainty.estimate import Estimate


def finding_extras(measured: Measured) -> Extras:
    """Return what the trade adds to one finding."""
    warmth = warmth_of(measured)
    parts = (
        load_extras(measured, warmth),
        wind_extras(measured, warmth),
        limit_extras(measured, warmth, _at_full(measured, warmth)),
    )
    scenarios: dict[str, dict[str, Estimate]] = {}
    for part in parts:
        for name, quantities in part.scenarios.items():
            # A limit of rise compares another estimate at full load than the load alone gives.
            scenarios[name] = {**scenarios.get(name, {}), **quantities}
    return Extras(
        assessments=(
            *(each for part in parts for each in part.assessments),
            *_among_its_like(measured),
        ),
        cautions=tuple(each for part in parts for each in part.cautions),
        scenarios=scenarios,
        quantities={name: each for part in parts for name, each in part.quantities.items()},
        missing={name: keys for part in parts for name, keys in part.missing.items()},
        words=words_of(warmth, measured, wind_of(measured)),
        settings={name: value for part in parts for name, value in part.settings.items()},
    )


def image_assessments(
    corrected: CorrectedFrame, regions: Sequence[MeasuredRegion]
) -> tuple[Assessment, ...]:
    """Return what the trade says of groups of like zones, and of limits without a finding."""
    hot = {
        region.finding.zone
        for region in regions
        if region.finding.sense == "hot" and region.finding.zone is not None
    }
    groups = [assess_group(corrected, word) for word in group_words(corrected)]
    return (
        *(group for group in groups if group is not None),
        *limits_of_zones(corrected, hot),
    )


def _at_full(measured: Measured, warmth: Warmth) -> Warmth | None:
    rated_a = targets_of(measured).get(FULL_LOAD)
    if rated_a is None or measured.finding.sense != "hot":
        return None
    try:
        return at_load(warmth, rated_a)
    except DomainError:
        # The assessment of the load says why.
        return None


def _among_its_like(measured: Measured) -> tuple[Assessment, ...]:
    """Let a finding refer to what its group of like zones shows."""
    zone = zone_of(measured)
    if zone is None or zone.like is None:
        return ()
    group = assess_group(measured.corrected, zone.like)
    if group is None:
        return ()
    statement = f"{group.statement} The numbers stand with the image."
    return (Assessment(group.kind, group.title, statement, source=group.source),)
