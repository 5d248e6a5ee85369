"""Named input variables and their draws.

The draws of a variable depend on its name and the seed alone. Two regions, or two images in two
processes, that use the same variable therefore use the same draws, and its error cancels or adds
as it does in the world.
"""

import hashlib
import math
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError

Shape = Literal["normal", "rectangular"]

DRAWS = 20_000
"""Draws of a Monte Carlo evaluation: a probability of 0.5 is then good to 0.0035 (k = 1), the
ends of a 95 % interval to about 1.5 % of its width."""

SEED = 20_170_407
"""Seed of all draws; fixed, so that the same survey gives the same report."""


@dataclass(frozen=True, slots=True)
class Variable:
    """An input quantity: best estimate, standard uncertainty and distribution.

    Parameters
    ----------
    name
        Identity; equal names are one variable.
    value
        Best estimate.
    u
        Standard uncertainty (k = 1), same unit, zero or more.
    shape
        ``normal``, or ``rectangular`` with half-width u sqrt(3).
    lower, upper
        Physical bounds. Where a normal distribution would cross one within three standard
        uncertainties it is cut off there (a truncated normal distribution).

    Raises
    ------
    DomainError
        A negative u, or a value outside its bounds.

    """

    name: str
    value: float
    u: float
    shape: Shape = "normal"
    lower: float = -math.inf
    upper: float = math.inf

    def __post_init__(self) -> None:
        if not self.u >= 0.0:
            raise DomainError(f"{self.name}: a standard uncertainty cannot be {self.u}")
        if not self.lower <= self.value <= self.upper:
            raise DomainError(
                f"{self.name} = {self.value:g} lies outside {self.lower:g} to {self.upper:g}"
            )

    @property
    def is_cut(self) -> bool:
        """Whether the distribution is cut off at a bound."""
        return self.u > 0.0 and (
            self.value - 3.0 * self.u < self.lower or self.value + 3.0 * self.u > self.upper
        )

    def draw(self, count: int = DRAWS, seed: int = SEED) -> NDArray[np.float64]:
        """Draw ``count`` values; the same ones for the same name and seed. Read only."""
        return _draw(self, count, seed)


@lru_cache(maxsize=256)
def _draw(variable: Variable, count: int, seed: int) -> NDArray[np.float64]:
    # Kept, because every finding of a zone and every scenario of a finding draws the same again.
    # Imported here: loading it takes longer than all else that a single reading needs.
    from scipy.special import ndtr, ndtri

    if variable.u == 0.0:
        draws = np.full(count, variable.value)
    elif variable.shape == "rectangular":
        unit = 2.0 * uniform_draws(variable.name, count, seed) - 1.0
        draws = variable.value + variable.u * math.sqrt(3.0) * unit
    else:
        uniform = uniform_draws(variable.name, count, seed)
        if variable.is_cut:
            low = float(ndtr((variable.lower - variable.value) / variable.u))
            high = float(ndtr((variable.upper - variable.value) / variable.u))
            uniform = low + uniform * (high - low)
        draws = np.asarray(variable.value + variable.u * ndtri(uniform))
    draws.setflags(write=False)
    return draws


@lru_cache(maxsize=256)
def uniform_draws(name: str, count: int, seed: int) -> NDArray[np.float64]:
    """Return ``count`` draws from (0, 1) that depend on the name and the seed alone.

    Read only, because they are shared.
    """
    # The name may be that of a file, whose bytes need be no text.
    written = name.encode("utf-8", "surrogatepass")
    digest = hashlib.blake2b(written, digest_size=16, key=str(seed).encode()).digest()
    generator = np.random.Generator(np.random.PCG64(int.from_bytes(digest, "big")))
    uniform = generator.random(count)
    # random() may return exactly 0, whose normal quantile is minus infinity.
    np.clip(uniform, 2.0**-54, 1.0 - 2.0**-54, out=uniform)
    uniform.setflags(write=False)
    return uniform


def standard_deviates(name: str, count: int, seed: int, shape: Shape) -> NDArray[np.float64]:
    """Return the draws of a variable of value 0 and standard uncertainty 1."""
    return Variable(name, 0.0, 1.0, shape).draw(count, seed)
