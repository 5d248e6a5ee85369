"""A function of quantities that share variables: value, contributions and draws."""

from collections.abc import Callable

import numpy as np

from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable


def of_variable(variable: Variable, *, draws: int = DRAWS, seed: int = SEED) -> Estimate:
    """Return an input variable as an estimate; an exact one contributes nothing.

    Parameters
    ----------
    variable
        The input.
    draws, seed
        As for :meth:`Variable.draw`.

    """
    parts = {} if variable.u == 0.0 else {variable.name: variable.u}
    return Estimate(variable.value, parts, variable.draw(draws, seed))


def combined(function: Callable[..., object], *parts: Estimate) -> Estimate:
    """Value, signed contributions and draws of a function of estimates.

    Parameters
    ----------
    function
        Vectorised; takes the parts in their order.
    parts
        Estimates of the same number of draws. They may share variables: contributions of one
        variable through several parts add up with their signs.

    Returns
    -------
    Estimate
        Sensitivities are central differences over a thousandth of each part's standard
        uncertainty (JCGM 100:2008, 5.1.3).

    """
    best = [part.value for part in parts]
    contributions: dict[str, float] = {}
    for place, part in enumerate(parts):
        if not part.contributions:
            continue
        step = 1e-3 * part.first_order_u or 1e-6
        above, below = list(best), list(best)
        above[place] += step
        below[place] -= step
        slope = (_number(function(*above)) - _number(function(*below))) / (2.0 * step)
        for name, share in part.contributions.items():
            contributions[name] = contributions.get(name, 0.0) + slope * share
    # Draws outside a function's domain become NaN, and are counted as lost.
    with np.errstate(invalid="ignore", divide="ignore"):
        draws = np.asarray(function(*(part.draws for part in parts)), np.float64)
    return Estimate(_number(function(*best)), contributions, draws)


def _number(value: object) -> float:
    return float(value)  # type: ignore[arg-type]
