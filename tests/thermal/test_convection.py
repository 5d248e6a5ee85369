"""Natural and forced convection against textbooks and reference libraries."""

import math

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from ht.conv_free_immersed import Nu_vertical_plate_Churchill
from hypothesis import given
from hypothesis import strategies as st

from tests.building_checks import building_row, rows_like
from tests.published_checks import Row
from thermo_fix.constants import STANDARD_GRAVITY, STANDARD_PRESSURE, ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.thermal.convection import (
    WIND_JOIN_M_S,
    air_properties,
    natural_coefficient,
    nusselt_vertical,
    rayleigh,
    wind_coefficient,
)


@pytest.mark.parametrize("celsius", [-50.0, -20.0, 0.0, 20.0, 60.0, 100.0, 150.0])
def test_air_against_coolprop(celsius: float) -> None:
    # Reference library: CoolProp, dry air at standard pressure.
    kelvin = celsius + ZERO_CELSIUS_K
    air = air_properties(kelvin)

    def reference(name: str) -> float:
        return float(PropsSI(name, "T", kelvin, "P", STANDARD_PRESSURE, "Air"))

    density = reference("D")
    assert air.conductivity == pytest.approx(reference("L"), rel=0.005)
    assert air.kinematic_viscosity == pytest.approx(reference("V") / density, rel=0.005)
    # The heat capacity is one number; it is 1 % off at the hot end.
    assert air.diffusivity == pytest.approx(
        reference("L") / density / reference("C"), rel=0.005 if celsius <= 60 else 0.015
    )


@pytest.mark.parametrize("row", rows_like("e-CC"), ids=str)
def test_churchill_and_chu_against_ht(row: Row) -> None:
    value = nusselt_vertical(row.inputs["Ra"], row.inputs["Pr"])
    assert value == pytest.approx(row.expected["Nu_all"], abs=1e-4)
    again = Nu_vertical_plate_Churchill(row.inputs["Pr"], row.inputs["Ra"] / row.inputs["Pr"])
    assert value == pytest.approx(again, rel=1e-12)


def test_worked_solution_of_a_textbook() -> None:
    # Cengel, Heat and Mass Transfer, problem 9-19E, solution manual: Nu 102.6.
    row = building_row("e-cengel919E")
    value = nusselt_vertical(row.inputs["Ra"], row.inputs["Pr"])
    assert value == pytest.approx(row.expected, abs=0.1)


def test_fire_screen_of_a_textbook() -> None:
    # Incropera et al., example 9.2 (printed numbers from memory, recomputed with ht 1.2.0).
    row = building_row("e-incropera92")
    given_, expected = row.inputs, row.expected
    difference = given_["Ts_C"] - given_["Tinf_C"]
    number = given_["g"] * given_["beta"] * difference * given_["H_m"] ** 3
    number /= given_["nu"] * given_["alpha"]
    assert number == pytest.approx(expected["Ra"], abs=1e6)
    nusselt = float(nusselt_vertical(number, given_["Pr"]))
    assert nusselt == pytest.approx(expected["Nu"], abs=0.1)
    coefficient = nusselt * given_["k"] / given_["H_m"]
    assert coefficient == pytest.approx(expected["h"], abs=0.01)
    power = coefficient * given_["H_m"] * given_["W_m"] * difference
    assert power == pytest.approx(expected["q_W"], abs=1.0)
    # With the air of this module instead of the book's table (steps of 50 K): within 1 %.
    own = natural_coefficient(
        given_["Ts_C"] + ZERO_CELSIUS_K, given_["Tinf_C"] + ZERO_CELSIUS_K, given_["H_m"]
    )
    assert own == pytest.approx(expected["h"], rel=0.01)


@pytest.mark.parametrize("name", ["e-wall_h", "e-panel_h"])
def test_wall_and_panel_against_ht_with_coolprop(name: str) -> None:
    row = building_row(name)
    surface, air = row.inputs["Ts_C"] + ZERO_CELSIUS_K, row.inputs["Tinf_C"] + ZERO_CELSIUS_K
    height, film = row.inputs["H_m"], 0.5 * (surface + air)
    assert rayleigh(surface - air, film, height) == pytest.approx(row.expected["Ra"], rel=0.01)
    value = natural_coefficient(surface, air, height)
    assert value == pytest.approx(row.expected["h"], rel=0.005)
    if "Pr" in row.expected:
        assert air_properties(film).prandtl == pytest.approx(row.expected["Pr"], rel=0.005)


@pytest.mark.parametrize("surface_c", [-10.0, 5.0, 19.5, 35.0, 90.0])
@pytest.mark.parametrize("height", [0.1, 1.0, 2.5, 6.0])
def test_room_walls_against_ht_with_coolprop(surface_c: float, height: float) -> None:
    # Reference libraries: ht for the law, CoolProp for the air at film temperature.
    surface, air = surface_c + ZERO_CELSIUS_K, 20.0 + ZERO_CELSIUS_K
    film = 0.5 * (surface + air)
    conductivity, viscosity, density, capacity = (
        float(PropsSI(name, "T", film, "P", STANDARD_PRESSURE, "Air")) for name in "LVDC"
    )
    prandtl = capacity * viscosity / conductivity
    grashof = STANDARD_GRAVITY / film * abs(surface - air) * height**3 / (viscosity / density) ** 2
    expected = Nu_vertical_plate_Churchill(prandtl, grashof) * conductivity / height
    assert natural_coefficient(surface, air, height) == pytest.approx(expected, rel=0.005)


@given(
    surface_c=st.floats(-40.0, 120.0),
    air_c=st.floats(-40.0, 60.0),
    height=st.floats(0.05, 20.0),
)
def test_coefficient_rises_with_the_difference(
    surface_c: float, air_c: float, height: float
) -> None:
    # Direction, and the least value: the law is 0.825^2 at no difference.
    air = air_c + ZERO_CELSIUS_K
    here = float(natural_coefficient(surface_c + ZERO_CELSIUS_K, air, height))
    still = float(natural_coefficient(air, air, height))
    assert math.isfinite(here)
    assert still == pytest.approx(
        0.825**2 * float(air_properties(air).conductivity) / height, rel=1e-9
    )
    if abs(surface_c - air_c) > 1.0:
        assert here > still


def test_arrays_are_taken_as_numbers_are() -> None:
    surfaces = np.array([280.0, 290.0, 300.0])
    together = np.asarray(natural_coefficient(surfaces, 293.15, 2.5))
    apart = [float(natural_coefficient(float(each), 293.15, 2.5)) for each in surfaces]
    np.testing.assert_allclose(together, apart, rtol=1e-14)


def test_a_height_of_nothing_is_refused() -> None:
    with pytest.raises(DomainError, match="height"):
        natural_coefficient(290.0, 293.0, 0.0)


@pytest.mark.parametrize("row", rows_like("e-mcadams"), ids=str)
def test_linear_wind_law(row: Row) -> None:
    # McAdams (1954), Juerges (1924): 5.7 + 3.8 v.
    assert wind_coefficient(row.inputs["V_m_s"]) == pytest.approx(row.expected, rel=1e-12)


@pytest.mark.parametrize("row", rows_like("e-juerges"), ids=str)
def test_power_law_of_wind(row: Row) -> None:
    # The form that joins the linear law at 5 m/s (coefficients from memory).
    expected = row.expected["5.678*0.50*(V/0.3048)^0.78"]
    wind = row.inputs["V_m_s"]
    if wind > WIND_JOIN_M_S:
        assert wind_coefficient(wind) == pytest.approx(expected, abs=1e-3)
    else:
        # At the join the linear law holds; just above it the power law.
        assert wind_coefficient(np.nextafter(wind, 9.0)) == pytest.approx(expected, abs=1e-3)


def test_the_step_at_the_join_is_as_stated() -> None:
    below, above = wind_coefficient(5.0), wind_coefficient(np.nextafter(5.0, 6.0))
    # 24.7 and 25.167 W m-2 K-1: rows e-mcadams5 and e-juerges5.
    assert float(above) - float(below) == pytest.approx(0.467, abs=1e-3)
    winds = np.linspace(0.0, 12.0, 500)
    assert np.all(np.diff(wind_coefficient(winds)) > 0.0)


def test_a_wind_below_zero_is_refused() -> None:
    with pytest.raises(DomainError, match="wind"):
        wind_coefficient(-0.1)
