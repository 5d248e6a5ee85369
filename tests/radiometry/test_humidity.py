"""Saturation pressure, dew point and surface humidity, against tables and two libraries."""

import math

import numpy as np
import psychrolib
import pytest
from CoolProp.CoolProp import PropsSI
from CoolProp.HumidAirProp import HAPropsSI
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants as codata

from tests.published_checks import Row, row, rows
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.humidity import (
    RANGE_C,
    dew_point_c,
    saturation_pressure_pa,
    surface_at_humidity_c,
    surface_humidity,
)

psychrolib.SetUnitSystem(psychrolib.SI)

MOULD = 0.8
"""Surface humidity above which mould grows (ISO 13788:2012, 5.3)."""

FOUR_ROUTES = [check for check in rows("b-psat") if not check.id.startswith("b-psat_ashrae")]


# ---------------------------------------------------------------- saturation pressure


@pytest.mark.parametrize("check", rows("b-psat_ashrae"), ids=str)
def test_saturation_pressure_of_the_handbook_table(check: Row) -> None:
    # 3e-4 relative; the coldest value is printed with three digits.
    tolerance = max(3e-4 * check.expected, 0.01 if check.inputs["t_C"] == -60 else 0.0)
    ours = float(saturation_pressure_pa(float(check.inputs["t_C"])))
    assert ours == pytest.approx(check.expected, abs=tolerance)


@pytest.mark.parametrize("check", FOUR_ROUTES, ids=str)
def test_saturation_pressure_by_four_routes(check: Row) -> None:
    celsius = float(check.inputs["t_C"])
    ours = float(saturation_pressure_pa(celsius))
    expected = check.expected
    assert ours == pytest.approx(expected["psychrolib_ASHRAE"], rel=5e-4)
    if expected["CoolProp_IAPWS95"] is not None:
        assert ours == pytest.approx(expected["CoolProp_IAPWS95"], rel=5e-4)
    assert ours == pytest.approx(expected["ISO13788_formula"], rel=2e-3 if celsius > 0 else 2e-2)
    if celsius > 0:
        assert ours == pytest.approx(expected["Magnus_WMO_over_water"], rel=4e-3)
    else:
        # Over supercooled water it is higher: at -10 degC by a tenth, at -40 degC by a half.
        assert ours < 0.92 * expected["Magnus_WMO_over_water"]


@settings(deadline=None)
@given(celsius=st.floats(*RANGE_C))
def test_saturation_pressure_against_psychrolib(celsius: float) -> None:
    # The library changes phase at the triple point, 0.01 degC, we at 0 degC: 1e-4 between them.
    assert float(saturation_pressure_pa(celsius)) == pytest.approx(
        psychrolib.GetSatVapPres(celsius), rel=2e-4
    )


@settings(deadline=None)
@given(celsius=st.floats(0.01, 100.0))
def test_saturation_pressure_over_water_against_iapws95(celsius: float) -> None:
    reference = PropsSI("P", "T", celsius + codata.zero_Celsius, "Q", 0, "Water")
    assert float(saturation_pressure_pa(celsius)) == pytest.approx(reference, rel=5e-4)


def test_saturation_pressure_is_continuous_at_the_freezing_point() -> None:
    ice, water = (float(each) for each in saturation_pressure_pa(np.array([-1e-9, 1e-9])))
    assert water == pytest.approx(ice, rel=2e-4)
    # 611.2 Pa at 0 degC: ASHRAE Handbook - Fundamentals 2017, ch. 1, table 3 (from memory).
    assert water == pytest.approx(611.2, abs=0.1)


def test_saturation_pressure_rises_everywhere() -> None:
    celsius = np.linspace(*RANGE_C, 16_001)
    pressure = saturation_pressure_pa(celsius)
    assert pressure.shape == celsius.shape
    assert np.all(np.diff(pressure) > 0.0)


def test_one_atmosphere_at_the_boiling_point() -> None:
    # 101.42 kPa at 100 degC (ASHRAE table 3, from memory): water boils at 99.97 degC.
    assert float(saturation_pressure_pa(100.0)) == pytest.approx(101_420.0, rel=1e-3)


@pytest.mark.parametrize("celsius", [-60.01, 100.01, math.inf, -math.inf])
def test_saturation_pressure_is_refused_outside(celsius: float) -> None:
    with pytest.raises(DomainError, match="-60 and 100"):
        saturation_pressure_pa(np.array([20.0, celsius]))


def test_pixels_without_a_value_stay_without() -> None:
    pressure = saturation_pressure_pa(np.array([np.nan, 20.0]))
    assert np.isnan(pressure).tolist() == [True, False]


# ---------------------------------------------------------------- dew point


@pytest.mark.parametrize("check", rows("b-dew"), ids=str)
def test_dew_point_rows(check: Row) -> None:
    ours = float(dew_point_c(float(check.inputs["t_C"]), check.inputs["RH_percent"] / 100.0))
    expected = check.expected
    assert ours == pytest.approx(expected["psychrolib"], abs=0.03)
    assert ours == pytest.approx(expected["CoolProp_humid_air"], abs=0.03)
    assert ours == pytest.approx(expected["ISO13788_formula"], abs=0.03)
    if "printed_table_0.1C" in expected:
        assert ours == pytest.approx(expected["printed_table_0.1C"], abs=0.12)
    over_water = expected["pvlib_Magnus_over_water"]
    if ours > 0.0:
        assert ours == pytest.approx(over_water, abs=0.05)
    else:
        # A frost point: the meteorological dew point, over supercooled water, lies lower.
        assert 0.1 < ours - over_water < 0.9


def test_the_misprint_of_a_printed_table_is_not_copied() -> None:
    check = row("b-table_misprint")
    ours = float(dew_point_c(float(check.inputs["t_C"]), check.inputs["RH_percent"] / 100.0))
    assert ours == pytest.approx(check.expected["correct"], abs=0.1)
    assert abs(ours - check.expected["printed"]) > 0.9


def test_the_handbook_example() -> None:
    check = row("b-ashrae_ex1")
    ours = float(dew_point_c(float(check.inputs["tdb_C"]), check.expected["RH"]))
    assert ours == pytest.approx(check.expected["dew_C"], abs=0.5)


@settings(deadline=None)
@given(air_c=st.floats(-30.0, 90.0), humidity=st.floats(0.05, 1.0))
def test_dew_point_against_psychrolib(air_c: float, humidity: float) -> None:
    # psychrolib iterates to 0.001 K and stops there.
    reference = psychrolib.GetTDewPointFromRelHum(air_c, humidity)
    assert float(dew_point_c(air_c, humidity)) == pytest.approx(reference, abs=0.01)


@pytest.mark.parametrize("air_c", [-15.0, 0.0, 12.0, 20.0, 35.0])
@pytest.mark.parametrize("humidity", [0.2, 0.5, 0.9])
def test_dew_point_against_real_humid_air(air_c: float, humidity: float) -> None:
    reference = HAPropsSI("D", "T", air_c + codata.zero_Celsius, "P", codata.atm, "R", humidity)
    assert float(dew_point_c(air_c, humidity)) == pytest.approx(
        reference - codata.zero_Celsius, abs=0.03
    )


@settings(deadline=None)
@given(air_c=st.floats(*RANGE_C))
def test_saturated_air_is_at_its_dew_point(air_c: float) -> None:
    # A jump of 1e-4 of the pressure at 0 degC is worth 1.4 mK there; exact anywhere else.
    tolerance = 2e-3 if abs(air_c) < 0.01 else 1e-6
    result = float(dew_point_c(air_c, 1.0))
    assert result == pytest.approx(air_c, abs=tolerance) or air_c < RANGE_C[0] + 1e-6


@settings(deadline=None)
@given(air_c=st.floats(-10.0, 60.0), humidity=st.floats(0.05, 1.0))
def test_the_vapour_pressure_comes_back(air_c: float, humidity: float) -> None:
    dew = float(dew_point_c(air_c, humidity))
    vapour = humidity * float(saturation_pressure_pa(air_c))
    assert float(saturation_pressure_pa(dew)) == pytest.approx(vapour, rel=2e-4)
    assert dew <= air_c + 2e-3


def test_dew_point_runs_smoothly_through_the_freezing_point() -> None:
    humidity = np.linspace(0.4, 0.9, 2001)
    dew = dew_point_c(5.0, humidity)
    assert dew.min() < 0.0 < dew.max()
    assert np.all(np.diff(dew) > -1e-9)
    assert np.max(np.diff(dew)) < 0.02


def test_dew_point_of_an_array_and_of_dry_air() -> None:
    image = dew_point_c(np.array([[20.0, 25.0]]), np.array([[0.5], [0.6]]))
    assert image.shape == (2, 2)
    assert image[0, 0] == pytest.approx(row("b-dew20_50").expected["psychrolib"], abs=0.03)
    # Drier than -60 degC: no value rather than an extrapolated one.
    assert math.isnan(float(dew_point_c(-50.0, 0.1)))
    assert np.isnan(dew_point_c(-50.0, np.array([0.1, 0.9]))).tolist() == [True, False]


@pytest.mark.parametrize("humidity", [0.0, -0.1, 1.0001, 55.0, math.nan])
def test_dew_point_needs_a_fraction(humidity: float) -> None:
    with pytest.raises(DomainError, match="humidity"):
        dew_point_c(20.0, humidity)


# ---------------------------------------------------------------- surface humidity


@pytest.mark.parametrize("check", rows("c-crit"), ids=str)
def test_surface_temperature_of_the_mould_limit(check: Row) -> None:
    air_c, humidity = float(check.inputs["Ti_C"]), check.inputs["RH_percent"] / 100.0
    limit_c = surface_at_humidity_c(check.inputs.get("limit_RH", MOULD), air_c, humidity)
    tolerance = 0.05 if check.id == "c-crit_surface" else 0.01
    assert limit_c == pytest.approx(check.expected, abs=tolerance)
    assert float(surface_humidity(limit_c, air_c, humidity)) == pytest.approx(MOULD, rel=1e-6)


def test_both_sides_of_the_wet_limits() -> None:
    air_c, humidity = 20.0, 0.5
    for limit in (MOULD, 1.0):
        at = surface_at_humidity_c(limit, air_c, humidity)
        dry, exact, wet = surface_humidity(np.array([at + 0.01, at, at - 0.01]), air_c, humidity)
        assert dry < limit < wet
        assert exact == pytest.approx(limit, rel=1e-9)


def test_the_limit_of_condensation_is_the_dew_point() -> None:
    assert surface_at_humidity_c(1.0, 20.0, 0.5) == float(dew_point_c(20.0, 0.5))
    assert surface_at_humidity_c(MOULD, 20.0, 0.5) > float(dew_point_c(20.0, 0.5))


@settings(deadline=None)
@given(surface_c=st.floats(-20.0, 60.0), air_c=st.floats(-20.0, 60.0), humidity=st.floats(0.0, 1.0))
def test_surface_humidity_against_psychrolib(
    surface_c: float, air_c: float, humidity: float
) -> None:
    vapour = psychrolib.GetVapPresFromRelHum(air_c, humidity)
    expected = vapour / psychrolib.GetSatVapPres(surface_c)
    assert float(surface_humidity(surface_c, air_c, humidity)) == pytest.approx(expected, rel=4e-4)


def test_surface_at_the_temperature_of_the_air_has_its_humidity() -> None:
    assert float(surface_humidity(20.0, 20.0, 0.47)) == pytest.approx(0.47, rel=1e-12)


def test_surface_humidity_of_an_image() -> None:
    image = np.array([[20.0, 12.0], [9.0, np.nan]])
    result = surface_humidity(image, 20.0, 0.5)
    assert result.shape == image.shape
    assert result[0, 0] == pytest.approx(0.5)
    assert result[0, 0] < result[0, 1] < 1.0 < result[1, 0]  # the dew point is 9.3 degC
    assert np.isnan(result[1, 1])


@pytest.mark.parametrize("humidity", [-0.01, 1.01, 50.0, math.nan])
def test_surface_humidity_needs_a_fraction(humidity: float) -> None:
    with pytest.raises(DomainError, match="humidity"):
        surface_humidity(15.0, 20.0, humidity)


@pytest.mark.parametrize(
    ("limit", "humidity"), [(0.5, 0.5), (0.4, 0.5), (1.01, 0.5), (0.8, 0.0), (math.nan, 0.5)]
)
def test_a_limit_must_lie_above_the_humidity(limit: float, humidity: float) -> None:
    with pytest.raises(DomainError, match="humidity"):
        surface_at_humidity_c(limit, 20.0, humidity)
