"""Temperature rise under another load.

A part that carries a current I makes heat in proportion to I^2 (its resistance taken as
constant) and loses it in proportion to dT^(1 + m), where dT is its rise over the air. In balance

    dT2 = dT1 (I2 / I1)^n,    n = 2 / (1 + m)                                          (1)

with m = 0 for forced or linear cooling (n = 2), 1/4 for laminar (n = 1.6) and 1/3 for turbulent
natural convection (n = 1.5). Published exponents lie between about 1.5 and 2 (Lyon, Orlove and
Peters, Thermosense XXII, Proc. SPIE 4020, 2000; from memory); IEEE C37.010 takes 1.8 for the
load-current capability of switchgear (from memory). Equation (1) is an extrapolation, and its
exponent an input with an uncertainty.
"""

import math
from typing import NamedTuple, overload

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError

FloatArray = NDArray[np.float64]

LEAST_LOAD = 0.4
"""Least load at inspection, as a share of the rating (NETA MTS 2019 practice; NFPA 70B:2023,
7.4 - clause from memory)."""
EXPONENT_RANGE = (1.0, 2.5)
"""Exponents for which equation (1) is meant; wider than what is published."""


class RiseAtLoad(NamedTuple):
    """A rise under another load, with its sensitivities."""

    rise_k: float
    by_rise: float
    """K per K of the measured rise: the load factor."""
    by_current: float
    """K per A of the current under which it was measured."""
    by_other: float
    """K per A of the other current."""
    by_exponent: float
    """K per unit of the exponent."""


def exponent_of_cooling(m: float) -> float:
    """Exponent n of equation (1) for a heat loss in proportion to dT^(1 + m).

    Parameters
    ----------
    m
        0 or more: 0 forced, 1/4 laminar, 1/3 turbulent natural convection.

    Raises
    ------
    DomainError
        A negative m.

    """
    if not m >= 0.0:
        raise DomainError(f"a heat loss cannot grow as dT^(1 + {m:g})")
    return 2.0 / (1.0 + m)


@overload
def load_factor(current_a: float, other_a: float, exponent: float) -> float: ...
@overload
def load_factor(
    current_a: float | FloatArray, other_a: float | FloatArray, exponent: float | FloatArray
) -> float | FloatArray: ...
def load_factor(
    current_a: float | FloatArray, other_a: float | FloatArray, exponent: float | FloatArray
) -> float | FloatArray:
    """Factor by which a rise changes from one current to another, equation (1).

    Parameters
    ----------
    current_a
        Under which the rise was measured, A, above 0. Scalars or arrays of one shape.
    other_a
        For which it is asked, A, 0 or more.
    exponent
        n, 1 to 2.5. Only a scalar is checked: draws of it may reach a little beyond.

    Raises
    ------
    DomainError
        A current of zero (a rise without current has another source and does not scale), a
        negative one, or an exponent out of range.

    """
    if not np.all(np.asarray(current_a) > 0.0):
        raise DomainError(
            "a rise measured without current cannot be brought to another load: its heat has "
            "another source"
        )
    if not np.all(np.asarray(other_a) >= 0.0):
        raise DomainError("the load to which a rise is brought cannot be negative")
    low, high = EXPONENT_RANGE
    if isinstance(exponent, int | float) and not low <= exponent <= high:
        raise DomainError(f"load exponent {exponent:g} is not between {low:g} and {high:g}")
    factor: float | FloatArray = (other_a / current_a) ** exponent
    return factor


def rise_at_load(rise_k: float, current_a: float, other_a: float, exponent: float) -> RiseAtLoad:
    """Rise over the air under another load, equation (1), with analytic sensitivities.

    Parameters
    ----------
    rise_k
        Measured rise over the air, K; a rise below zero is not heat of the part's own.
    current_a, other_a, exponent
        As for :func:`load_factor`.

    Raises
    ------
    DomainError
        As :func:`load_factor`, and for a rise below zero or not finite.

    """
    if not (math.isfinite(rise_k) and rise_k >= 0.0):
        raise DomainError(
            f"a rise of {rise_k:g} K over the air cannot be brought to another load: the part is "
            "not warmer than the air"
        )
    factor = load_factor(current_a, other_a, exponent)
    rise = rise_k * factor
    if other_a == 0.0:
        return RiseAtLoad(0.0, 0.0, 0.0, 0.0, 0.0)
    return RiseAtLoad(
        rise_k=rise,
        by_rise=factor,
        by_current=-exponent * rise / current_a,
        by_other=exponent * rise / other_a,
        by_exponent=rise * math.log(other_a / current_a),
    )


def difference_at_load(
    rise_k: float,
    current_a: float,
    like_rise_k: float,
    like_current_a: float,
    common_a: float,
    exponent: float,
) -> float:
    """Difference of two like parts, K, if both carried one current.

    Parameters
    ----------
    rise_k, current_a
        Rise over the air, K, and current, A, of the one.
    like_rise_k, like_current_a
        Of the other.
    common_a
        The current of both, A.
    exponent
        n of equation (1).

    Raises
    ------
    DomainError
        As :func:`rise_at_load`.

    """
    own = rise_at_load(rise_k, current_a, common_a, exponent).rise_k
    return own - rise_at_load(like_rise_k, like_current_a, common_a, exponent).rise_k
