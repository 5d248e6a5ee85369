"""The quantities that criteria compare, from a measured temperature and the state of the site."""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError
from thermo_fix.measure.words import input_words
from thermo_fix.radiometry import humidity as moist
from thermo_fix.records import Input, SceneInputs, VariableWords
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

SIDE = "side"
"""Sheet key, and the name under which is kept what is lacking to tell the side of a surface."""
_SIDE_KEYS = ("air_c", "indoor_c", "outdoor_c")


@dataclass(frozen=True, slots=True)
class Site:
    """What the sheet says of the air around a surface."""

    inputs: SceneInputs
    where: str

    def told(self, key: str) -> Input | None:
        """Return an input that was stated or measured; a default is a guess, and is not."""
        return self.inputs.told(key)

    @property
    def inside(self) -> bool | None:
        """Whether the surface is inside: as told, else the air before it is nearer to indoors."""
        return self.inputs.inside


Quantities = tuple[dict[str, Estimate], dict[str, tuple[str, ...]], dict[str, VariableWords]]


def quantities_of(
    extreme: Estimate, difference: Estimate | None, *, like: bool, site: Site
) -> Quantities:
    """Return every quantity that the inputs allow, and what the others lack.

    Parameters
    ----------
    extreme
        Surface temperature, degC.
    difference
        To the reference, K.
    like
        Whether the reference is a like component.
    site
        The air around the surface.

    Returns
    -------
    tuple
        Quantities by name; sheet keys that others lack, by name; words for variables that only
        these quantities use.

    """
    quantities: dict[str, Estimate] = {"surface_c": extreme}
    missing: dict[str, tuple[str, ...]] = {}
    if site.inside is None:
        untold = tuple(key for key in _SIDE_KEYS if site.told(key) is None)
        # All told, and the air is as near to the one as to the other.
        missing[SIDE] = untold or (SIDE,)
    words: dict[str, VariableWords] = {}
    if difference is None:
        missing["difference"] = ("a reference",)
    else:
        # The size of a difference is graded, whichever its sense.
        quantities["difference"] = _magnitude(difference)
    if like and difference is not None:
        quantities["like_difference"] = difference
    else:
        missing["like_difference"] = ("like",)
    needs = {
        "rise_over_air": ("air_c",),
        "surface_factor": ("indoor_c", "outdoor_c"),
        "dew_point_margin": ("indoor_c", "humidity"),
        "surface_humidity": ("indoor_c", "humidity"),
    }
    for name, keys in needs.items():
        lacking = tuple(key for key in keys if site.told(key) is None)
        if lacking:
            missing[name] = lacking
            continue
        given = {key: site.inputs.values[key] for key in keys}
        try:
            quantities[name] = _QUANTITY[name](extreme, *given.values())
        except DomainError as error:
            missing[name] = (str(error),)
            continue
        words |= {
            each.name: input_words(key, site.inputs, site.where) for key, each in given.items()
        }
    return quantities, missing, words


def _magnitude(difference: Estimate) -> Estimate:
    if difference.value >= 0.0:
        return difference
    return Estimate(
        -difference.value,
        {name: -part for name, part in difference.contributions.items()},
        -difference.draws,
    )


def _variable(given: Input) -> Variable:
    bounds = (0.0, 1.0) if given.key == "humidity" else (-math.inf, math.inf)
    return Variable(given.name, given.value, given.u, lower=bounds[0], upper=bounds[1])


def _with(extreme: Estimate, per_k: float, others: dict[str, float]) -> dict[str, float]:
    parts = {name: per_k * part for name, part in extreme.contributions.items()}
    for name, part in others.items():
        parts[name] = parts.get(name, 0.0) + part
    return parts


def _rise_over_air(extreme: Estimate, air: Input) -> Estimate:
    return Estimate(
        extreme.value - air.value,
        _with(extreme, 1.0, {air.name: -air.u}),
        extreme.draws - _variable(air).draw(len(extreme.draws)),
    )


def _surface_factor(extreme: Estimate, indoor: Input, outdoor: Input) -> Estimate:
    """Temperature factor fRsi = (Tsi - Te)/(Ti - Te) (ISO 13788:2012, 3.1)."""
    span = indoor.value - outdoor.value
    if span <= 0.0:
        raise DomainError("indoor_c must be above outdoor_c for a temperature factor")
    factor = (extreme.value - outdoor.value) / span
    warm = _variable(indoor).draw(len(extreme.draws))
    cold = _variable(outdoor).draw(len(extreme.draws))
    with np.errstate(divide="ignore", invalid="ignore"):
        draws = np.where(warm > cold, (extreme.draws - cold) / (warm - cold), np.nan)
    return Estimate(
        factor,
        _with(
            extreme,
            1.0 / span,
            {
                indoor.name: -factor / span * indoor.u,
                outdoor.name: (factor - 1.0) / span * outdoor.u,
            },
        ),
        np.asarray(draws),
    )


def _moist_draws(
    extreme: Estimate, indoor: Input, humid: Input
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    low, high = moist.RANGE_C
    count = len(extreme.draws)
    surface = np.where((extreme.draws > low) & (extreme.draws < high), extreme.draws, np.nan)
    air = np.clip(_variable(indoor).draw(count), low, high)
    fraction = np.clip(_variable(humid).draw(count), 1e-6, 1.0)
    return surface, air, fraction


def _dew_point_margin(extreme: Estimate, indoor: Input, humid: Input) -> Estimate:
    """Surface temperature minus dew point of the indoor air, K."""
    dew = float(moist.dew_point_c(indoor.value, humid.value))
    if math.isnan(dew):
        raise DomainError(f"a dew point below {moist.RANGE_C[0]:g} degC is not computed")
    step = 1e-3
    by_air = float(
        moist.dew_point_c(indoor.value + step, humid.value)
        - moist.dew_point_c(indoor.value - step, humid.value)
    ) / (2.0 * step)
    saturation = float(moist.saturation_pressure_pa(dew))
    slope = float(
        moist.saturation_pressure_pa(dew + step) - moist.saturation_pressure_pa(dew - step)
    ) / (2.0 * step)
    by_humidity = saturation / humid.value / slope
    surface, air, fraction = _moist_draws(extreme, indoor, humid)
    return Estimate(
        extreme.value - dew,
        _with(
            extreme,
            1.0,
            {indoor.name: -by_air * indoor.u, humid.name: -by_humidity * humid.u},
        ),
        surface - moist.dew_point_c(air, fraction),
    )


def _surface_humidity(extreme: Estimate, indoor: Input, humid: Input) -> Estimate:
    """Relative humidity at the surface (ISO 13788:2012, 5.3)."""
    step = 1e-3

    def relative(surface_c: float, air_c: float, fraction: float) -> float:
        return float(moist.surface_humidity(surface_c, air_c, fraction))

    value = relative(extreme.value, indoor.value, humid.value)
    by_surface = (
        relative(extreme.value + step, indoor.value, humid.value)
        - relative(extreme.value - step, indoor.value, humid.value)
    ) / (2.0 * step)
    by_air = (
        relative(extreme.value, indoor.value + step, humid.value)
        - relative(extreme.value, indoor.value - step, humid.value)
    ) / (2.0 * step)
    surface, air, fraction = _moist_draws(extreme, indoor, humid)
    return Estimate(
        value,
        _with(
            extreme,
            by_surface,
            {indoor.name: by_air * indoor.u, humid.name: value / humid.value * humid.u},
        ),
        np.asarray(moist.surface_humidity(surface, air, fraction)),
    )


_QUANTITY: Mapping[str, Callable[..., Estimate]] = {
    "rise_over_air": _rise_over_air,
    "surface_factor": _surface_factor,
    "dew_point_margin": _dew_point_margin,
    "surface_humidity": _surface_humidity,
}
