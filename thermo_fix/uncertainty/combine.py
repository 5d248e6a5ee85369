"""Functions of quantities that share variables: value, contributions and draws."""

from collections.abc import Callable, Sequence
from functools import lru_cache

import numpy as np

from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable


@lru_cache(maxsize=64)
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
    drawn = variable.draw(draws, seed)
    drawn.setflags(write=False)  # kept, and shared
    return Estimate(variable.value, parts, drawn)


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
    (only,) = combined_all(lambda *values: (function(*values),), *parts)
    return only


def combined_all(
    function: Callable[..., Sequence[object]], *parts: Estimate
) -> tuple[Estimate, ...]:
    """Return several results of one function, each as :func:`combined` does.

    Parameters
    ----------
    function
        Vectorised; takes the parts in their order and returns a fixed number of results.
    parts
        As for :func:`combined`.

    """
    best = [part.value for part in parts]
    values = _numbers(function(*best))
    contributions: list[dict[str, float]] = [{} for _ in values]
    for place, part in enumerate(parts):
        if not part.contributions:
            continue
        step = 1e-3 * part.first_order_u or 1e-6
        above, below = list(best), list(best)
        above[place] += step
        below[place] -= step
        ends = zip(_numbers(function(*above)), _numbers(function(*below)), strict=True)
        for each, (high, low) in zip(contributions, ends, strict=True):
            slope = (high - low) / (2.0 * step)
            for name, share in part.contributions.items():
                each[name] = each.get(name, 0.0) + slope * share
    # Draws outside a function's domain become NaN, and are counted as lost.
    with np.errstate(invalid="ignore", divide="ignore"):
        drawn = function(*(part.draws for part in parts))
    return tuple(
        Estimate(value, each, np.asarray(draws, np.float64))
        for value, each, draws in zip(values, contributions, drawn, strict=True)
    )


def _numbers(results: Sequence[object]) -> list[float]:
    return [float(result) for result in results]  # type: ignore[arg-type]
