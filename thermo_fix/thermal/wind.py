"""Temperature rise outdoors without the wind.

The factors by which electrical thermography brings a measured rise to a wind of 1 m/s. Common
practice, no source found; recalled from memory. They follow v^0.45 within 0.011, an exponent of
forced convection. A rule of thumb: its own uncertainty grows with the wind, and it is not
extrapolated.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_fix.errors import DomainError

WIND_FACTORS: dict[float, float] = {
    1.0: 1.0,
    2.0: 1.36,
    3.0: 1.64,
    4.0: 1.86,
    5.0: 2.06,
    6.0: 2.23,
    7.0: 2.40,
    8.0: 2.54,
}
"""By wind speed in m/s: what multiplies the measured rise (common practice, no source)."""

CALM_M_S = 1.0
"""To this wind a rise is brought; below it no correction is made."""
MOST_WIND_M_S = 8.0
"""Above this wind no factor is published, and none is made up."""
_RELATIVE_U = 0.15
"""Standard uncertainty of a factor as a share of what it adds: judged, no source."""

_LOG_SPEED = np.log(np.array(list(WIND_FACTORS)))
_LOG_FACTOR = np.log(np.array(list(WIND_FACTORS.values())))


class WindFactor(NamedTuple):
    """A factor with what is known of it."""

    factor: float
    u: float
    """Standard uncertainty of the rule itself, apart from that of the wind."""
    by_wind: float
    """1 per m/s."""


def wind_factor(wind_m_s: float) -> WindFactor:
    """Factor that brings a rise measured in wind to a wind of 1 m/s.

    Parameters
    ----------
    wind_m_s
        At the part, 0 to 8 m/s.

    Returns
    -------
    WindFactor
        1 up to 1 m/s. Between the entries of the table a power of the wind is interpolated,
        which meets every entry.

    Raises
    ------
    DomainError
        A negative wind, or one above 8 m/s.

    """
    if not wind_m_s >= 0.0:
        raise DomainError(f"a wind of {wind_m_s:g} m/s is none")
    if wind_m_s > MOST_WIND_M_S:
        raise DomainError(
            f"no wind correction above {MOST_WIND_M_S:g} m/s: {wind_m_s:g} m/s is too much; "
            "repeat the survey in less wind"
        )
    factor = float(factors_of(np.array([wind_m_s]))[0])
    by_wind = 0.0
    if wind_m_s > CALM_M_S:
        # The slope of the segment that ends at the wind, so that 8 m/s has one too.
        upper = max(1, int(np.searchsorted(_LOG_SPEED, math.log(wind_m_s) - 1e-12)))
        power = (_LOG_FACTOR[upper] - _LOG_FACTOR[upper - 1]) / (
            _LOG_SPEED[upper] - _LOG_SPEED[upper - 1]
        )
        by_wind = float(power) * factor / wind_m_s
    return WindFactor(factor, _RELATIVE_U * (factor - 1.0), by_wind)


def factors_of(wind_m_s: NDArray[np.float64]) -> NDArray[np.float64]:
    """Factors for draws of the wind; those beyond the table take its ends.

    Parameters
    ----------
    wind_m_s
        Any shape, m/s.

    """
    clipped = np.clip(wind_m_s, CALM_M_S, MOST_WIND_M_S)
    return np.asarray(np.exp(np.interp(np.log(clipped), _LOG_SPEED, _LOG_FACTOR)))
