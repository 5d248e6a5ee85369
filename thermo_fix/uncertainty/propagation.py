"""Propagation of uncertainty: first order (JCGM 100) and of distributions (JCGM 101)."""

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable

Contributions = Mapping[str, float]
"""Signed contribution of each variable: sensitivity times its standard uncertainty."""


def combined_u(
    contributions: Contributions, correlations: Mapping[tuple[str, str], float] | None = None
) -> float:
    """Combined standard uncertainty from signed contributions.

    Parameters
    ----------
    contributions
        c_i u(x_i) by variable, in the unit of the result.
    correlations
        r(x_i, x_j) of pairs of different variables, each pair once; absent pairs are uncorrelated.

    Returns
    -------
    float
        u_c = sqrt(sum_i (c_i u_i)^2 + 2 sum_i<j c_i u_i c_j u_j r_ij); JCGM 100:2008, eq. 16.

    Raises
    ------
    DomainError
        A correlation outside -1 to 1, or of a variable that contributes nothing.

    """
    variance = math.fsum(part * part for part in contributions.values())
    for (first, second), r in (correlations or {}).items():
        if first not in contributions or second not in contributions or first == second:
            raise DomainError(f"correlation of {first} and {second}: both must contribute")
        if not -1.0 <= r <= 1.0:
            raise DomainError(f"correlation of {first} and {second} = {r:g} is not in -1 to 1")
        variance += 2.0 * r * contributions[first] * contributions[second]
    return math.sqrt(max(variance, 0.0))


def difference(minuend: Contributions, subtrahend: Contributions) -> dict[str, float]:
    """Signed contributions to a difference; a variable in both counts with its net effect.

    Parameters
    ----------
    minuend, subtrahend
        Contributions of the two quantities by variable, in one unit.

    """
    return {
        name: minuend.get(name, 0.0) - subtrahend.get(name, 0.0)
        for name in (*minuend, *(key for key in subtrahend if key not in minuend))
    }


def effective_freedom(contributions: Contributions, freedom: Mapping[str, float]) -> float:
    """Effective degrees of freedom by Welch and Satterthwaite (JCGM 100:2008, eq. G.2b).

    Parameters
    ----------
    contributions
        Of uncorrelated variables.
    freedom
        Degrees of freedom by variable; absent means infinite.

    """
    below = math.fsum(
        part**4 / freedom[name] for name, part in contributions.items() if name in freedom
    )
    return combined_u(contributions) ** 4 / below if below > 0.0 else math.inf


def coverage_factor(probability: float, freedom: float = math.inf) -> float:
    """Coverage factor k of a symmetric interval (JCGM 100:2008, G.3).

    Parameters
    ----------
    probability
        Above 0 and below 1, such as 0.95.
    freedom
        Effective degrees of freedom; infinite for a normal distribution.

    """
    if not 0.0 < probability < 1.0:
        raise DomainError(f"a coverage probability lies between 0 and 1, not {probability:g}")
    # Imported here: loading it takes longer than all else that a single reading needs.
    from scipy.special import ndtri, stdtrit

    tail = (1.0 + probability) / 2.0
    if math.isinf(freedom):
        return float(ndtri(tail))
    return float(stdtrit(freedom, tail))


@dataclass(frozen=True, slots=True)
class Distribution:
    """Draws of a result."""

    draws: NDArray[np.float64]
    """Sorted, finite."""
    lost: int
    """Draws for which the model has no solution, left out."""

    @property
    def mean(self) -> float:
        """Mean of the draws."""
        return float(self.draws.mean())

    @property
    def u(self) -> float:
        """Standard uncertainty: standard deviation of the draws (JCGM 101:2008, 7.6)."""
        return float(self.draws.std(ddof=1))

    def interval(self, probability: float = 0.95) -> tuple[float, float]:
        """Probabilistically symmetric coverage interval (JCGM 101:2008, 7.7)."""
        tail = (1.0 - probability) / 2.0
        low, high = np.quantile(self.draws, [tail, 1.0 - tail])
        return float(low), float(high)

    def shortest_interval(self, probability: float = 0.95) -> tuple[float, float]:
        """Shortest coverage interval (JCGM 101:2008, 7.7.4)."""
        held = round(probability * len(self.draws))
        widths = self.draws[held:] - self.draws[:-held]
        start = int(np.argmin(widths))
        return float(self.draws[start]), float(self.draws[start + held])


def as_distribution(draws: NDArray[np.float64]) -> Distribution:
    """Sort the draws of a result and count those without a solution.

    Raises
    ------
    DomainError
        Fewer than half of the draws have a solution.

    """
    finite = draws[np.isfinite(draws)]
    if len(finite) < max(2, len(draws) // 2):
        raise DomainError("more than half of the draws have no solution")
    return Distribution(np.sort(finite), len(draws) - len(finite))


def monte_carlo(
    function: Callable[..., NDArray[np.float64]],
    variables: Sequence[Variable],
    *,
    draws: int = DRAWS,
    seed: int = SEED,
) -> Distribution:
    """Propagate distributions through a model (JCGM 101:2008, clause 7).

    Parameters
    ----------
    function
        Vectorised model; takes one array of draws for each variable, in order.
    variables
        Independent input quantities.
    draws, seed
        Number of draws; the seed of them.

    Returns
    -------
    Distribution
        Of the result.

    """
    return as_distribution(function(*(variable.draw(draws, seed) for variable in variables)))
