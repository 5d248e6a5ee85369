"""What an exterior surface mirrors: sky and ground."""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.published_checks import Row, row, rows
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.humidity import dew_point_c, saturation_pressure_pa
from thermo_fix.radiometry.surroundings import (
    REFLECTED_U_K,
    clear_sky_emissivity,
    sky_and_ground_temperature_c,
    sky_temperature_c,
    sky_view_factor,
)


def humidity_for(dew_c: float, air_c: float) -> float:
    return float(saturation_pressure_pa(dew_c) / saturation_pressure_pa(air_c))


# ---------------------------------------------------------------- sky


@pytest.mark.parametrize("check", rows("e-sky"), ids=str)
def test_clear_sky_rows(check: Row) -> None:
    # Of the four models of a row ours is Berdahl and Martin's (BM): the formula is tested, since
    # the models disagree by 3 to 11 K among themselves.
    air_c, dew_c = float(check.inputs["Ta_C"]), float(check.inputs["Tdew_C"])
    assert clear_sky_emissivity(dew_c) == pytest.approx(check.expected["BM_eps"], abs=1e-4)
    sky_c = sky_temperature_c(air_c, humidity_for(dew_c, air_c))
    assert sky_c == pytest.approx(check.expected["BM_Tsky_C"], abs=5e-3)


@pytest.mark.parametrize("check", rows("e-sky"), ids=str)
def test_the_stated_uncertainty_covers_the_other_models(check: Row) -> None:
    ours = check.expected["BM_Tsky_C"]
    others = [
        value
        for name, value in check.expected.items()
        if name.endswith("Tsky_C") and not name.startswith("BM_")
    ]
    assert len(others) == 3
    # 5 K is for the half of the reflection that is sky, and k = 2 for the model of the sky alone.
    assert max(abs(other - ours) for other in others) < 2.0 * REFLECTED_U_K


@pytest.mark.parametrize("air_c", [-15.0, 0.0, 10.0, 30.0])
def test_an_overcast_sky_is_as_warm_as_the_air(air_c: float) -> None:
    assert sky_temperature_c(air_c, 0.8, cloud=1.0) == pytest.approx(air_c, abs=1e-9)


@settings(deadline=None)
@given(air_c=st.floats(-10.0, 35.0), humidity=st.floats(0.3, 0.99), cloud=st.floats(0.0, 0.9))
def test_clouds_and_damp_warm_the_sky(air_c: float, humidity: float, cloud: float) -> None:
    sky = sky_temperature_c(air_c, humidity, cloud)
    assert sky < air_c
    assert sky_temperature_c(air_c, humidity, cloud + 0.1) > sky
    assert sky_temperature_c(air_c, humidity * 0.9, cloud) < sky


def test_a_half_cloudy_sky_by_hand() -> None:
    # e-sky10_0: clear emissivity 0.711; half cloud brings it half way to 1.
    clear = row("e-sky10_0").expected["BM_eps"]
    expected = 283.15 * (clear + 0.5 * (1.0 - clear)) ** 0.25 - ZERO_CELSIUS_K
    sky = sky_temperature_c(10.0, humidity_for(0.0, 10.0), cloud=0.5)
    assert sky == pytest.approx(expected, abs=1e-3)


# ---------------------------------------------------------------- view and mixture


@pytest.mark.parametrize(("tilt", "share"), [(0.0, 1.0), (60.0, 0.75), (90.0, 0.5), (180.0, 0.0)])
def test_view_factor_of_the_sky(tilt: float, share: float) -> None:
    # (1 + cos tilt)/2, by hand.
    assert sky_view_factor(tilt) == pytest.approx(share, abs=1e-12)


def test_a_roof_mirrors_the_sky_and_a_soffit_the_ground() -> None:
    sky = sky_temperature_c(5.0, 0.7, 0.2)
    assert sky_and_ground_temperature_c(5.0, 0.7, 0.2, 0.0, 8.0) == pytest.approx(sky, abs=1e-9)
    assert sky_and_ground_temperature_c(5.0, 0.7, 0.2, 180.0, 8.0) == pytest.approx(8.0, abs=1e-9)


def test_a_wall_mirrors_both_in_the_fourth_power() -> None:
    sky = sky_temperature_c(5.0, 0.7, 0.0)
    wall = sky_and_ground_temperature_c(5.0, 0.7, 0.0, 90.0, 8.0)
    sky_k, ground_k, wall_k = (each + ZERO_CELSIUS_K for each in (sky, 8.0, wall))
    assert wall_k**4 == pytest.approx((sky_k**4 + ground_k**4) / 2.0, rel=1e-12)
    assert sky < wall < 8.0
    assert wall > (sky + 8.0) / 2.0  # the warmer half counts for more


def test_the_more_a_surface_faces_up_the_colder_its_reflection() -> None:
    around = [
        sky_and_ground_temperature_c(5.0, 0.7, 0.0, tilt, 6.0) for tilt in (0, 30, 60, 90, 135, 180)
    ]
    assert around == sorted(around)
    assert around[0] < around[-1]


def test_equal_surroundings_are_one_temperature() -> None:
    for tilt in (0.0, 45.0, 90.0, 180.0):
        assert sky_and_ground_temperature_c(10.0, 0.8, 1.0, tilt, 10.0) == pytest.approx(10.0)


# ---------------------------------------------------------------- refused


@pytest.mark.parametrize("dew_c", [-40.1, 40.1, math.nan, math.inf])
def test_a_dew_point_out_of_range_is_refused(dew_c: float) -> None:
    with pytest.raises(DomainError, match="dew point"):
        clear_sky_emissivity(dew_c)


@pytest.mark.parametrize("dew_c", [-40.0, 40.0])
def test_the_ends_of_the_dew_point_range_are_in_it(dew_c: float) -> None:
    assert 0.5 < clear_sky_emissivity(dew_c) < 1.1


@pytest.mark.parametrize("cloud", [-0.1, 1.1, 50.0, math.nan])
def test_a_cloud_fraction_is_a_fraction(cloud: float) -> None:
    with pytest.raises(DomainError, match="cloud"):
        sky_temperature_c(10.0, 0.5, cloud)


@pytest.mark.parametrize("tilt", [-0.1, 180.1, math.nan])
def test_a_tilt_lies_between_up_and_down(tilt: float) -> None:
    with pytest.raises(DomainError, match="tilt"):
        sky_view_factor(tilt)


@pytest.mark.parametrize("humidity", [0.0, 1.1, 70.0])
def test_a_sky_needs_a_humidity(humidity: float) -> None:
    with pytest.raises(DomainError, match="humidity"):
        sky_temperature_c(10.0, humidity)


def test_air_too_dry_for_a_dew_point_is_refused() -> None:
    assert math.isnan(float(dew_point_c(-50.0, 0.1)))
    with pytest.raises(DomainError, match="dew point"):
        sky_temperature_c(-50.0, 0.1)
