"""Uncertainty of any function of named variables, with sensitivities found numerically."""

from collections.abc import Callable, Mapping

from thermo_fix.radiometry.blackbody import Real
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable


def estimate_of(
    function: Callable[[Mapping[str, Real]], Real],
    variables: Mapping[str, Variable],
    *,
    draws: int = DRAWS,
    seed: int = SEED,
) -> Estimate:
    """Value, signed contributions and draws of a function of named variables.

    Parameters
    ----------
    function
        Vectorised; takes the values of all variables by name.
    variables
        Independent input quantities by name.
    draws, seed
        As for :meth:`Variable.draw`.

    Returns
    -------
    Estimate
        A contribution is half the change of the function while its variable goes from one
        standard uncertainty below to one above (JCGM 100:2008, 5.1.3, note 2); where a bound cuts
        that short the change is scaled up to it.

    """
    best: dict[str, Real] = {name: each.value for name, each in variables.items()}
    contributions = {}
    for name, each in variables.items():
        if each.u == 0.0:
            contributions[name] = 0.0
            continue
        high = min(each.value + each.u, each.upper)
        low = max(each.value - each.u, each.lower)
        change = function({**best, name: high}) - function({**best, name: low})
        contributions[name] = float(change) * each.u / (high - low)
    drawn = function({name: each.draw(draws, seed) for name, each in variables.items()})
    return Estimate(float(function(best)), contributions, drawn)  # type: ignore[arg-type]
