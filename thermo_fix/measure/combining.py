"""Estimates made from other estimates; variables common to both stay common."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable


def as_estimate(variable: Variable, draws: int) -> Estimate:
    """Return a variable as an estimate of itself, with that many draws.

    A number without uncertainty contributes nothing and is not named.
    """
    contributions = {variable.name: variable.u} if variable.u > 0.0 else {}
    return Estimate(variable.value, contributions, variable.draw(draws))


def composed(
    value: float, parts: Sequence[tuple[Estimate, float]], draws: NDArray[np.float64]
) -> Estimate:
    """Return an estimate that is a function of others.

    Parameters
    ----------
    value
        The function at the best estimates.
    parts
        What it is made from, each with the sensitivity (derivative) to it.
    draws
        The function of the draws.

    """
    contributions: dict[str, float] = {}
    for estimate, sensitivity in parts:
        for name, part in estimate.contributions.items():
            contributions[name] = contributions.get(name, 0.0) + sensitivity * part
    return Estimate(value, contributions, np.asarray(draws))


def plus(first: Estimate, second: Estimate) -> Estimate:
    """Return the sum of two estimates of one unit."""
    return composed(
        first.value + second.value, [(first, 1.0), (second, 1.0)], first.draws + second.draws
    )


def shifted(estimate: Estimate, by: float) -> Estimate:
    """Return an estimate plus a number without uncertainty."""
    return composed(estimate.value + by, [(estimate, 1.0)], estimate.draws + by)
