"""How warm a part is over its air and over its like, now and under other conditions.

A ``Warmth`` is a measured state. Taking away the wind or changing the load gives another one, so
that conditions can be combined, and each gives the quantities that criteria compare.
"""

from dataclasses import dataclass, replace

from thermo_fix.defaults import default_for
from thermo_fix.errors import DomainError
from thermo_fix.measure.combining import as_estimate, composed, plus
from thermo_fix.measure.trade import Measured
from thermo_fix.records import Input, SceneInputs, VariableWords, Zone
from thermo_fix.thermal.load import load_factor, rise_at_load
from thermo_fix.thermal.wind import factors_of, wind_factor
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

WIND_RULE = "wind factors"
"""Name of the variable for the error of the wind factors, common to the whole survey."""
SAME_LOAD = 0.05
"""Currents that differ by less than this share are the same load."""
_LEAST_CURRENT = 0.02
"""Draws of a current are kept above this share of it."""


@dataclass(frozen=True, slots=True)
class Warmth:
    """State of a finding; absent parts could not be told."""

    rise: Estimate | None
    """Over the air, K."""
    like_rise: Estimate | None
    """Of the like component that is the reference, K."""
    difference: Estimate | None
    """To the reference, K."""
    is_like: bool
    """Whether the reference is a like component."""
    air: Estimate | None
    """degC."""
    current: Variable | None
    """A."""
    like_current: Variable | None
    exponent: Variable

    def quantities(self) -> dict[str, Estimate]:
        """Quantities of criteria in this state."""
        found: dict[str, Estimate] = {}
        if self.rise is not None and self.air is not None:
            found["rise_over_air"] = self.rise
            found["surface_c"] = plus(self.rise, self.air)
        if self.difference is not None:
            found["difference"] = self.difference
            if self.is_like:
                found["like_difference"] = self.difference
        return found


def zone_of(measured: Measured) -> Zone | None:
    """Return the zone of a finding; None for the rest of the image."""
    label = measured.region.label
    return measured.corrected.job.zones[label - 1] if label else None


def like_zone_of(measured: Measured) -> Zone | None:
    """Return the zone of the like component that is the reference."""
    label = measured.region.reference_label
    if measured.region.reference_kind != "like component" or not label:
        return None
    return measured.corrected.job.zones[label - 1]


def told_air(inputs: SceneInputs) -> Variable | None:
    """Return the air temperature where it was told, degC."""
    air = inputs.told("air_c")
    return None if air is None else Variable(air.name, air.value, air.u)


def current_of(zone: Zone, file: str) -> Variable | None:
    """Return the current of a zone, A; None where it was not told."""
    if zone.load_a is None:
        return None
    u = zone.load_u_a
    if u is None:
        u = default_for("load_a").u_for(zone.load_a)
    name = f"load_a [zone {zone.name} of {file}]"
    return Variable(name, zone.load_a, u, lower=_LEAST_CURRENT * zone.load_a)


def exponent_input(inputs: SceneInputs) -> Input:
    """Return the exponent of the load: stated, or the default."""
    stated = inputs.values.get("load_exponent")
    if stated is not None:
        return stated
    default = default_for("load_exponent")
    assert default.value is not None  # of the data file
    assert default.u is not None
    return Input(
        "load_exponent",
        default.value,
        default.u,
        "assumed",
        "default",
        "assumed",
        default.reason,
    )


def exponent_of(inputs: SceneInputs) -> Variable:
    """Return the exponent of the load as a variable with a rectangular distribution."""
    given = exponent_input(inputs)
    return Variable(given.name, given.value, given.u, "rectangular")


def warmth_of(measured: Measured) -> Warmth:
    """Return the state of a finding as measured."""
    corrected, region = measured.corrected, measured.region
    inputs = corrected.inputs[region.label]
    draws = len(measured.extreme.draws)
    air = told_air(inputs)
    own_air = None if air is None else as_estimate(air, draws)
    zone, like = zone_of(measured), like_zone_of(measured)
    like_rise: Estimate | None = None
    if like is not None and measured.reference is not None and region.reference_label:
        like_air = told_air(corrected.inputs[region.reference_label])
        if like_air is not None:
            like_rise = measured.reference.minus(as_estimate(like_air, draws))
    file = corrected.job.file
    return Warmth(
        rise=None if own_air is None else measured.extreme.minus(own_air),
        like_rise=like_rise,
        difference=measured.difference,
        is_like=like is not None,
        air=own_air,
        current=None if zone is None else current_of(zone, file),
        like_current=None if like is None else current_of(like, file),
        exponent=exponent_of(inputs),
    )


def rise_under(rise: Estimate, current: Variable, other: Variable, exponent: Variable) -> Estimate:
    """Return a rise brought from one current to another, both with their uncertainty.

    Raises
    ------
    DomainError
        No current, or a part that is not warmer than the air.

    """
    draws = len(rise.draws)
    at = rise_at_load(rise.value, current.value, other.value, exponent.value)
    factors = load_factor(current.draw(draws), other.draw(draws), exponent.draw(draws))
    return composed(
        at.rise_k,
        [
            (rise, at.by_rise),
            (as_estimate(current, draws), at.by_current),
            (as_estimate(other, draws), at.by_other),
            (as_estimate(exponent, draws), at.by_exponent),
        ],
        rise.draws * factors,
    )


def at_load(warmth: Warmth, target_a: float) -> Warmth:
    """Bring a finding, and the like that it is compared with, to one load.

    Where the current of the like is not told it is taken to be that of the finding ("similar
    load"). Parts that cannot be brought there are left out.

    Raises
    ------
    DomainError
        Nothing can be brought to another load, with the reason.

    """
    if warmth.current is None:
        raise DomainError("the current was not told (load_a)")
    if warmth.current.value == 0.0:
        raise DomainError(
            "a rise measured without current cannot be brought to another load: its heat has "
            "another source"
        )
    target = Variable(f"load of {target_a:g} A", target_a, 0.0)
    rise: Estimate | None = None
    if warmth.rise is not None:
        rise = rise_under(warmth.rise, warmth.current, target, warmth.exponent)
    like_rise: Estimate | None = None
    other = warmth.like_current
    if warmth.like_rise is not None and warmth.like_rise.value >= 0.0:
        if other is None:
            like_rise = rise_under(warmth.like_rise, warmth.current, target, warmth.exponent)
        elif other.value > 0.0:
            like_rise = rise_under(warmth.like_rise, other, target, warmth.exponent)
    difference: Estimate | None = None
    if rise is not None and like_rise is not None:
        difference = rise.minus(like_rise)
    elif (
        warmth.difference is not None
        and warmth.difference.value >= 0.0
        and (other is None or is_same_load(warmth.current, other))
    ):
        difference = rise_under(warmth.difference, warmth.current, target, warmth.exponent)
    if rise is None and difference is None:
        raise DomainError("neither the rise over the air (air_c) nor a difference is known")
    return replace(warmth, rise=rise, like_rise=like_rise, difference=difference)


def at_equal_load(warmth: Warmth) -> Estimate | None:
    """Difference to the like if that carried the current of the finding, K."""
    if (
        warmth.rise is None
        or warmth.like_rise is None
        or warmth.current is None
        or warmth.like_current is None
        or min(warmth.current.value, warmth.like_current.value) <= 0.0
        or warmth.like_rise.value < 0.0
    ):
        return None
    like = rise_under(warmth.like_rise, warmth.like_current, warmth.current, warmth.exponent)
    return warmth.rise.minus(like)


def without_wind(warmth: Warmth, wind: Input) -> Warmth:
    """Bring a state measured in wind to a wind of 1 m/s.

    Raises
    ------
    DomainError
        Too much wind.

    """
    speed = Variable(wind.name, wind.value, wind.u, lower=0.0)
    rule = Variable(WIND_RULE, 0.0, 1.0)
    at = wind_factor(wind.value)

    def calm(estimate: Estimate | None) -> Estimate | None:
        if estimate is None:
            return None
        draws = len(estimate.draws)
        factors = factors_of(speed.draw(draws)) + at.u * rule.draw(draws)
        return composed(
            estimate.value * at.factor,
            [
                (estimate, at.factor),
                (as_estimate(speed, draws), estimate.value * at.by_wind),
                (as_estimate(rule, draws), estimate.value * at.u),
            ],
            estimate.draws * factors,
        )

    return replace(
        warmth,
        rise=calm(warmth.rise),
        like_rise=calm(warmth.like_rise),
        difference=calm(warmth.difference),
    )


def is_same_load(current: Variable, other: Variable) -> bool:
    """Say whether two currents count as one load."""
    return abs(current.value - other.value) <= SAME_LOAD * max(current.value, other.value)


def words_of(warmth: Warmth, measured: Measured, wind: Input | None) -> dict[str, VariableWords]:
    """Return the words for the variables that only such states use."""
    words: dict[str, VariableWords] = {}
    named = (
        (warmth.current, measured.where),
        (warmth.like_current, measured.finding.reference_name.partition(",")[0]),
    )
    for current, where in named:
        if current is not None:
            words[current.name] = VariableWords(
                f"current of {where}",
                f"measure the current of {where} while the image is taken",
                current.value,
                current.u,
                "A",
            )
    exponent = warmth.exponent
    words[exponent.name] = VariableWords(
        "exponent of the load",
        f"measure {measured.where} again under a load nearer to the one in question",
        exponent.value,
        exponent.u,
        "1",
        rectangular=True,
    )
    if wind is not None:
        words[wind.name] = VariableWords(
            "wind", f"measure the wind at {measured.where}", wind.value, wind.u, "m/s"
        )
        words[WIND_RULE] = VariableWords(
            "rule for the wind", "repeat the survey in a calm", None, 1.0, "1"
        )
    for label in (measured.region.label, measured.region.reference_label):
        if label is not None:
            inputs = measured.corrected.inputs[label]
            air = inputs.values.get("air_c")
            if air is not None:
                words[air.name] = VariableWords(
                    "air temperature",
                    f"measure the air temperature at {measured.where}",
                    air.value,
                    air.u,
                    "degC",
                )
    return words
