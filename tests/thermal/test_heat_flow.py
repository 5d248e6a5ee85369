"""Heat balance of a surface, U-values and what follows, against ISO arithmetic and quadrature."""

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate

from tests.building_checks import building_row, rows_like
from tests.published_checks import Row
from thermo_fix.constants import STEFAN_BOLTZMANN, ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.surface import fresnel_emissivity, refractive_index
from thermo_fix.thermal.convection import natural_coefficient
from thermo_fix.thermal.heat_flow import (
    factor_at_resistance,
    hemispherical_ratio,
    radiative_coefficient,
    surface_exchange,
    u_value,
    yearly_energy_kwh,
)
from thermo_fix.uncertainty.combine import combined, combined_all, of_variable
from thermo_fix.uncertainty.variables import Variable


@pytest.mark.parametrize("row", rows_like("c-hr0_"), ids=str)
def test_black_radiative_coefficient(row: Row) -> None:
    # ISO 6946:2017, annex C: 4 sigma T^3.
    kelvin = row.inputs["t_C"] + ZERO_CELSIUS_K
    assert radiative_coefficient(kelvin, kelvin) == pytest.approx(row.expected, abs=1e-4)


@pytest.mark.parametrize("row", rows_like("c-Rs_"), ids=str)
def test_conventional_inside_resistances(row: Row) -> None:
    # ISO 6946:2017, annex C: 1/(hc + eps hr0).
    kelvin = row.inputs["t_C"] + ZERO_CELSIUS_K
    # Nearly equal temperatures, so that the linear coefficient is that of the annex.
    found = surface_exchange(kelvin, kelvin, kelvin, row.inputs["eps"], row.inputs["hc"])
    resistance = 1.0 / (float(found.radiative_coefficient) + row.inputs["hc"])
    assert resistance == pytest.approx(row.expected, abs=1e-6)
    assert found.flux == 0.0


@pytest.mark.parametrize("row", rows_like("c-Rse_"), ids=str)
def test_conventional_outside_resistances(row: Row) -> None:
    # ISO 6946:2017, annex C: hce = 4 + 4 v, eps 0.9 at 0 degC.
    convective = 4.0 + 4.0 * row.inputs["v_m_s"]
    zero = ZERO_CELSIUS_K
    found = surface_exchange(zero, zero, zero, 0.9, convective)
    resistance = 1.0 / (float(found.radiative_coefficient) + convective)
    assert resistance == pytest.approx(row.expected, abs=1e-4)


@pytest.mark.parametrize("row", rows_like("c-Usurf_"), ids=str)
def test_u_value_from_the_inside_surface(row: Row) -> None:
    # Steady state: q = (Ti - Tsi)/Rsi = U (Ti - Te), Rsi 0.13.
    indoor, outdoor, surface = (row.inputs[key] for key in ("Ti_C", "Te_C", "Tsi_C"))
    flux = (indoor - surface) / 0.13
    assert flux == pytest.approx(row.expected["q_W_m2"], rel=1e-5)
    value = u_value(flux, indoor + ZERO_CELSIUS_K, outdoor + ZERO_CELSIUS_K)
    assert value == pytest.approx(row.expected["U"], rel=1e-5)


@pytest.mark.parametrize("row", rows_like("c-plane_U"), ids=str)
def test_plane_wall_there_and_back(row: Row) -> None:
    # ISO 13788, 4.4.1 and ISO 6946, plain arithmetic: fRsi = 1 - U Rsi.
    wall, expected = row.inputs["U"], row.expected
    assert u_value(expected["q_W_m2"], 293.15, 268.15) == pytest.approx(wall, abs=1e-9)
    factor = (expected["Tsi_C"] + 5.0) / 25.0
    assert factor == pytest.approx(expected["fRsi_Rsi0.13"], abs=1e-9)
    # The same resistances behind the surface under Rsi 0.25: R = 1/U - 0.13.
    behind = 1.0 / wall - 0.13
    assert factor_at_resistance(factor, 0.13, 0.25) == pytest.approx(
        behind / (behind + 0.25), abs=1e-12
    )
    # The row keeps U instead, and so has the lower factor (1 - 0.25 U).
    assert float(factor_at_resistance(factor, 0.13, 0.25)) > expected["fRsi_Rsi0.25"]


def test_resistance_of_its_own_changes_nothing() -> None:
    assert factor_at_resistance(0.8, 0.13, 0.13) == pytest.approx(0.8, abs=1e-15)


def test_u_at_the_limit_of_the_factor() -> None:
    # BRE IP 1/06 limit 0.75 with ISO 6946: U = (1 - 0.75)/Rsi.
    row = building_row("c-U_at_075")
    wall = 0.25 / 0.13
    assert wall == pytest.approx(row.expected["Rsi0.13"], abs=1e-5)
    rest = 1.0 / row.expected["Rsi0.13"] - 0.13
    assert rest / (rest + 0.13) == pytest.approx(0.75, abs=1e-5)


@given(
    surface_c=st.floats(-20.0, 60.0),
    reflected_c=st.floats(-40.0, 60.0),
    air_c=st.floats(-20.0, 40.0),
    emissivity=st.floats(0.05, 1.0),
    convective=st.floats(0.5, 40.0),
)
def test_balance_is_the_fourth_power_law_and_the_environment(
    surface_c: float, reflected_c: float, air_c: float, emissivity: float, convective: float
) -> None:
    # The definition itself: equation 1, and its exact linear form in the environment.
    surface, reflected, air = (each + ZERO_CELSIUS_K for each in (surface_c, reflected_c, air_c))
    found = surface_exchange(surface, reflected, air, emissivity, convective)
    direct = emissivity * STEFAN_BOLTZMANN * (surface**4 - reflected**4)
    direct += convective * (surface - air)
    assert found.flux == pytest.approx(direct, abs=1e-8)
    by_environment = (float(found.radiative_coefficient) + convective) * (
        surface - float(found.environment_k)
    )
    assert by_environment == pytest.approx(direct, abs=1e-8)
    low, high = sorted((reflected, air))
    assert low - 1e-9 <= float(found.environment_k) <= high + 1e-9


def test_no_u_value_at_a_small_difference() -> None:
    with pytest.raises(DomainError, match=r"4\.9 K.*5 K"):
        u_value(10.0, 293.15, 288.25)
    assert u_value(10.0, 293.15, 288.15) == pytest.approx(2.0)
    # Indoors colder: both change sign.
    assert u_value(-10.0, 288.15, 293.15) == pytest.approx(2.0)


def test_energy_of_a_year() -> None:
    # Arithmetic: 2 W/K over 2500 K day is 2 x 2500 x 24 Wh = 120 kWh.
    assert yearly_energy_kwh(2.0, 2500.0) == pytest.approx(120.0)


@pytest.mark.parametrize("normal", [0.7, 0.8, 0.9, 0.95, 0.99])
def test_hemispherical_emissivity_by_quadrature(normal: float) -> None:
    # Independent: the integral of 2 eps(angle) sin cos over the hemisphere.
    index = refractive_index(normal)
    integral, _ = integrate.quad(
        lambda angle: (
            2.0 * fresnel_emissivity(index, math.degrees(angle)) * math.sin(angle) * math.cos(angle)
        ),
        0.0,
        math.pi / 2.0 - 1e-9,
    )
    assert hemispherical_ratio(normal) == pytest.approx(integral / normal, rel=1e-6)


def test_hemispherical_emissivity_where_nothing_is_known() -> None:
    assert hemispherical_ratio(0.3) == 1.0
    assert hemispherical_ratio(1.0) == 1.0


# ---------------------------------------------------------------- uncertainty


def _inside_wall(*values: Any) -> tuple[Any, Any]:
    surface_c, reflected_c, air_c, emissivity, outdoor_c = values
    surface_k, air_k = surface_c + ZERO_CELSIUS_K, air_c + ZERO_CELSIUS_K
    still = natural_coefficient(surface_k, air_k, 2.5)
    found = surface_exchange(
        surface_k,
        reflected_c + ZERO_CELSIUS_K,
        air_k,
        emissivity,
        still,
    )
    loss = -found.flux
    outdoor_k = outdoor_c + ZERO_CELSIUS_K
    return loss, loss / (found.environment_k - outdoor_k)


VARIABLES = (
    Variable("surface", 17.0, 0.4),
    Variable("reflected", 20.0, 0.5),
    Variable("air", 20.5, 0.3),
    Variable("emissivity", 0.88, 0.02),
    Variable("outdoor", -2.0, 0.5),
)


def test_first_order_agrees_with_monte_carlo() -> None:
    # JCGM 101 by a plain sample of another generator, 400 000 draws.
    flux, wall = combined_all(_inside_wall, *(of_variable(each) for each in VARIABLES))
    generator = np.random.default_rng(7)
    sample = [generator.normal(each.value, each.u, 400_000) for each in VARIABLES]
    for estimate, drawn in zip((flux, wall), _inside_wall(*sample), strict=True):
        assert estimate.first_order_u == pytest.approx(float(np.std(drawn)), rel=0.01)
        assert estimate.distribution.u == pytest.approx(float(np.std(drawn)), rel=0.02)
        assert estimate.is_linear
        assert estimate.value == pytest.approx(float(np.mean(drawn)), abs=0.05 * estimate.u)


def test_sensitivities_are_the_analytic_ones() -> None:
    # dq/dTr of equation 1 is -4 eps sigma Tr^3, dq/deps is sigma (Ts^4 - Tr^4).
    flux, _ = combined_all(_inside_wall, *(of_variable(each) for each in VARIABLES))
    reflected = 20.0 + ZERO_CELSIUS_K
    surface = 17.0 + ZERO_CELSIUS_K
    by_reflected = 4.0 * 0.88 * STEFAN_BOLTZMANN * reflected**3
    by_emissivity = -STEFAN_BOLTZMANN * (surface**4 - reflected**4)
    assert flux.contributions["reflected"] == pytest.approx(by_reflected * 0.5, rel=1e-6)
    assert flux.contributions["emissivity"] == pytest.approx(by_emissivity * 0.02, rel=1e-6)
    assert flux.contributions["outdoor"] == 0.0


def test_common_variables_cancel_in_a_difference() -> None:
    # Two places of one image: the same air and surroundings; only their own surface differs.
    air = of_variable(Variable("air", 20.0, 1.0))

    def loss(surface: Any, air_c: Any) -> Any:
        return 7.0 * (air_c - surface)

    first = combined(loss, of_variable(Variable("a", 15.0, 0.1)), air)
    second = combined(loss, of_variable(Variable("b", 18.0, 0.1)), air)
    excess = first.minus(second)
    assert excess.value == pytest.approx(21.0)
    assert excess.u == pytest.approx(7.0 * math.hypot(0.1, 0.1), rel=0.01)
    assert excess.contributions["air"] == pytest.approx(0.0, abs=1e-9)
    # The same variable in two parts of one function adds up with its signs.
    nothing = combined(lambda one, other: one - other, air, air)
    assert nothing.first_order_u == pytest.approx(0.0, abs=1e-9)


def test_an_exact_input_contributes_nothing() -> None:
    exact = of_variable(Variable("exact", 3.0, 0.0))
    assert exact.contributions == {}
    double = combined(lambda value: 2.0 * value, exact)
    assert (double.value, double.first_order_u) == (6.0, 0.0)
