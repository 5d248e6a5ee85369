"""What a trade adds to a measured finding; the common form of ``electrical`` and ``building``."""

from collections.abc import Mapping
from dataclasses import dataclass, field

from thermo_fix.measure.spot import Spot
from thermo_fix.records import Assessment, CorrectedFrame, Finding, Region, VariableWords
from thermo_fix.uncertainty.estimate import Estimate


@dataclass(frozen=True, slots=True)
class Measured:
    """A region with its estimates, as the trades take it."""

    corrected: CorrectedFrame
    region: Region
    finding: Finding
    """Without gradings, cautions and assessments."""
    spot: Spot
    """At the extreme."""
    reference_spot: Spot | None
    extreme: Estimate
    """degC."""
    reference: Estimate | None
    """degC."""
    difference: Estimate | None
    """K."""
    where: str
    """Words for the zone or asset."""
    quantities: Mapping[str, Estimate] = field(default_factory=dict)
    """As the criteria compare them."""
    missing: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """Sheet keys that a quantity lacks, by its name."""


@dataclass(frozen=True, slots=True)
class Extras:
    """What a trade adds."""

    assessments: tuple[Assessment, ...] = ()
    cautions: tuple[str, ...] = ()
    scenarios: Mapping[str, Mapping[str, Estimate]] = field(default_factory=dict)
    """Quantities of criteria under other conditions, by scenario."""
    quantities: Mapping[str, Estimate] = field(default_factory=dict)
    """Further quantities as measured."""
    missing: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    words: Mapping[str, VariableWords] = field(default_factory=dict)
    """For variables that only these estimates use."""
    settings: Mapping[str, float] = field(default_factory=dict)
    """Settings of criteria that hold for this finding alone."""
