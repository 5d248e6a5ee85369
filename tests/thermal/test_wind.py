"""Wind factors.

The table is in common use in electrical thermography texts; from memory, no source found.
"""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from thermo_fix.errors import DomainError
from thermo_fix.thermal.wind import MOST_WIND_M_S, factors_of, wind_factor

# Common practice, no source; from memory.
TABLE = {1: 1.0, 2: 1.36, 3: 1.64, 4: 1.86, 5: 2.06, 6: 2.23, 7: 2.40, 8: 2.54}


@pytest.mark.parametrize(("wind", "expected"), TABLE.items())
def test_every_entry_of_the_table(wind: int, expected: float) -> None:
    assert wind_factor(float(wind)).factor == pytest.approx(expected, abs=1e-9)


@given(st.floats(1.0, 8.0))
def test_between_entries_it_follows_a_power_of_the_wind(wind: float) -> None:
    # The entries fit v^0.45 to better than 0.011: an exponent of forced convection.
    assert wind_factor(wind).factor == pytest.approx(wind**0.45, abs=0.02)


@given(st.floats(0.0, 8.0), st.floats(0.0, 8.0))
def test_more_wind_is_a_greater_factor_and_a_greater_doubt(first: float, second: float) -> None:
    low, high = sorted((first, second))
    calm, windy = wind_factor(low), wind_factor(high)
    assert windy.factor >= calm.factor >= 1.0
    assert windy.u >= calm.u >= 0.0


@pytest.mark.parametrize("wind", [0.0, 0.5, 1.0])
def test_a_calm_needs_no_correction(wind: float) -> None:
    assert wind_factor(wind) == (1.0, 0.0, 0.0)


def test_just_above_the_calm() -> None:
    found = wind_factor(math.nextafter(1.0, 2.0))
    assert found.factor == pytest.approx(1.0, abs=1e-9)
    assert found.by_wind == pytest.approx(math.log(1.36) / math.log(2.0))


@given(st.floats(1.05, 7.95).filter(lambda v: abs(v - round(v)) > 1e-3))
def test_slope(wind: float) -> None:
    step = 1e-5
    slope = (wind_factor(wind + step).factor - wind_factor(wind - step).factor) / (2.0 * step)
    assert wind_factor(wind).by_wind == pytest.approx(slope, rel=1e-5)


def test_both_sides_of_the_greatest_wind() -> None:
    assert wind_factor(MOST_WIND_M_S).by_wind > 0.0
    with pytest.raises(DomainError, match=r"above 8 m/s.*less wind"):
        wind_factor(math.nextafter(8.0, 9.0))


@pytest.mark.parametrize("wind", [-0.1, math.nan])
def test_no_wind_at_all(wind: float) -> None:
    with pytest.raises(DomainError):
        wind_factor(wind)


def test_draws_beyond_the_table_take_its_ends() -> None:
    assert factors_of(np.array([-1.0, 0.0, 20.0])).tolist() == pytest.approx([1.0, 1.0, 2.54])
