"""A quantity with its uncertainty: value, signed contributions and draws, kept together."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError
from thermo_fix.uncertainty.propagation import (
    Contributions,
    Distribution,
    as_distribution,
    combined_u,
    coverage_factor,
    difference,
)

_LINEAR_U = 0.02
_LINEAR_SHIFT = 0.15
_LINEAR_SKEW = 0.2
"""First order is good enough while its u is within 2 % of Monte Carlo's, the mean is shifted by
less than 0.15 u and the middle of the 95 % interval by less than 0.2 u; the interval then misses
by less than half a percent of coverage (the comparison of JCGM 101:2008, clause 8, but of the
middle instead of both ends, so that a rectangular input alone does not set it off)."""


@dataclass(frozen=True)
class Estimate:
    """Best estimate of a quantity with everything known of its uncertainty."""

    value: float
    contributions: Contributions
    """Signed, by variable name, in the unit of the value."""
    draws: NDArray[np.float64]
    """Of the same variables as every other Estimate with the same names."""

    @cached_property
    def first_order_u(self) -> float:
        """Standard uncertainty by the law of propagation (JCGM 100)."""
        return combined_u(self.contributions)

    @cached_property
    def distribution(self) -> Distribution:
        """The draws, sorted; draws without a solution are left out and counted."""
        return as_distribution(self.draws)

    @cached_property
    def is_linear(self) -> bool:
        """Whether first order is good enough."""
        try:
            spread = self.distribution
        except DomainError:
            return False
        if spread.u == 0.0:
            return True
        return (
            spread.lost == 0
            and abs(self.first_order_u / spread.u - 1.0) <= _LINEAR_U
            and abs(spread.mean - self.value) <= _LINEAR_SHIFT * spread.u
            and abs(sum(spread.interval()) / 2.0 - self.value) <= _LINEAR_SKEW * spread.u
        )

    @property
    def u(self) -> float:
        """Standard uncertainty: first order where that is good enough, else Monte Carlo.

        NaN where more than half of the draws have no solution.
        """
        if self.is_linear:
            return self.first_order_u
        try:
            return self.distribution.u
        except DomainError:
            return float("nan")

    def interval(self, probability: float = 0.95) -> tuple[float, float]:
        """Coverage interval: symmetric about the value to first order, else from the draws."""
        if self.is_linear:
            half = coverage_factor(probability) * self.first_order_u
            return self.value - half, self.value + half
        try:
            return self.distribution.interval(probability)
        except DomainError:
            return float("nan"), float("nan")

    def minus(self, other: "Estimate") -> "Estimate":
        """Return the difference; variables common to both cancel as far as they do."""
        return Estimate(
            self.value - other.value,
            difference(self.contributions, other.contributions),
            self.draws - other.draws,
        )

    def halved(self, name: str, deviates: NDArray[np.float64]) -> NDArray[np.float64]:
        """Draws of the quantity if the uncertainty of one variable were halved.

        Parameters
        ----------
        name
            The variable.
        deviates
            (draws,): the standardised draws of that variable that made ``draws``.

        """
        return self.draws - 0.5 * self.contributions[name] * deviates
