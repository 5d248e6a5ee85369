"""``thermo_fix.correct``: readings from numbers and arrays, without a survey."""

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import thermo_fix.point
from tests.published_checks import Row, row, rows
from thermo_fix import __all__ as public_names
from thermo_fix import correct
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.defaults import default_for
from thermo_fix.errors import DomainError
from thermo_fix.point import Corrected
from thermo_fix.radiometry.air import air_transmittance
from thermo_fix.radiometry.blackbody import TotalModel, band_model
from thermo_fix.radiometry.path import OpticalPath, Window, surface_temperature
from thermo_fix.records import ModelName
from thermo_fix.surfaces import UnknownSurface, find_surface


def room(reading_c: Any = 60.0, **inputs: Any) -> Corrected:
    """Correct in a room of 20 degC."""
    stated: dict[str, Any] = {"emissivity": 0.9, "reflected_c": 20.0, "air_c": 20.0}
    return correct(reading_c, **(stated | inputs))


# ---------------------------------------------------------------- numbers


@pytest.mark.parametrize(
    ("emissivity", "total_c", "band_c"), [(0.6, 80.8, 81.8), (0.3, 120.4, 126.2)]
)
def test_worked_numbers(emissivity: float, total_c: float, band_c: float) -> None:
    # The measurement equation of ISO 18434-1 with sigma T^4 and with 8-14 um, to 0.1 K; worked
    # out by quadrature in tests/radiometry/test_path.py.
    for model, expected in (("total", total_c), ("band", band_c)):
        result = room(emissivity=emissivity, transmittance=0.99, model=model)
        assert round(float(result), 1) == expected


@pytest.mark.parametrize("check", rows("f-meq_"), ids=str)
def test_measurement_equation_rows(check: Row) -> None:
    stated = check.inputs
    low_um, high_um = stated["band_um"]
    cases: list[tuple[ModelName, float]] = [
        ("band", check.expected["T_app_C"]),
        ("total", check.expected["T_app_C_if_T4"]),
    ]
    for model, reading_c in cases:
        result = correct(
            reading_c,
            emissivity=stated["eps"],
            reflected_c=stated["T_refl_C"],
            air_c=stated["T_atm_C"],
            transmittance=stated["tau"],
            model=model,
            band_um=(low_um, high_um),
        )
        # Readings are printed to 0.1 mK, which a low emissivity magnifies.
        tolerance = 1e-3 + 1e-4 / (stated["eps"] * stated["tau"])
        assert float(result) == pytest.approx(stated["T_obj_C"], abs=tolerance)


@pytest.mark.parametrize("check", rows("g-sens"), ids=str)
def test_first_order_uncertainty_rows(check: Row) -> None:
    stated, u = check.inputs, check.inputs["u"]
    result = correct(
        stated["T_app_C"],
        emissivity=(stated["eps"], u["eps"]),
        reflected_c=(stated["T_refl_C"], u["T_refl"]),
        air_c=(stated["T_atm_C"], u["T_atm"]),
        transmittance=(stated["tau"], u["tau"]),
        model="band",
        accuracy_k=u["T_app"] * math.sqrt(3.0),  # a rectangular half-width
        accuracy_fraction=0.0,
        noise_k=0.0,
    )
    temperature_c, u_k = result
    assert temperature_c == pytest.approx(check.expected["T_obj_C"], abs=1e-3)
    assert u_k == pytest.approx(check.expected["uc_K"], abs=1e-3)


def test_it_is_the_optical_path_and_nothing_else() -> None:
    window = Window(0.85, 0.05, 303.15, 298.15)
    path = OpticalPath(0.8, 288.15, 283.15, float(air_transmittance(10.0, 0.7, 25.0)), window)
    recorded = OpticalPath(0.95, 291.15, 294.15, 0.98)
    for name, model in (("total", TotalModel()), ("band", band_model((7.5, 13.0)))):
        expected = surface_temperature(45.0 + ZERO_CELSIUS_K, path, recorded, model)
        result = correct(
            45.0,
            emissivity=0.8,
            reflected_c=15.0,
            air_c=10.0,
            humidity=0.7,
            distance_m=25.0,
            window_transmittance=0.85,
            window_reflectance=0.05,
            window_c=30.0,
            window_reflected_c=25.0,
            model="band" if name == "band" else "total",
            band_um=(7.5, 13.0),
            recorded_emissivity=0.95,
            recorded_reflected_c=18.0,
            recorded_air_c=21.0,
            recorded_transmittance=0.98,
        )
        assert float(result) == pytest.approx(float(expected) - ZERO_CELSIUS_K, abs=1e-9)


@settings(deadline=None)
@given(reading_c=st.floats(-40.0, 500.0), reflected_c=st.floats(-40.0, 60.0))
def test_a_blackbody_seen_through_nothing_keeps_its_reading(
    reading_c: float, reflected_c: float
) -> None:
    cases: list[dict[str, Any]] = [{}, {"distance_m": 0.0}, {"transmittance": 1.0}]
    for stated in cases:
        result = correct(reading_c, emissivity=1.0, reflected_c=reflected_c, **stated)
        assert float(result) == pytest.approx(reading_c, abs=1e-9)


def test_settings_that_were_right_change_nothing() -> None:
    result = correct(
        60.0,
        emissivity=0.7,
        reflected_c=25.0,
        air_c=15.0,
        transmittance=0.95,
        recorded_emissivity=0.7,
        recorded_reflected_c=25.0,
        recorded_air_c=15.0,
        recorded_transmittance=0.95,
    )
    assert float(result) == pytest.approx(60.0, abs=1e-9)


def test_recorded_settings_of_a_blackbody_do_not_matter() -> None:
    assert float(room(recorded_reflected_c=80.0, recorded_air_c=-10.0)) == float(room())


def test_directions() -> None:
    base = float(room(distance_m=10.0))
    assert base > 60.0
    assert float(room(61.0, distance_m=10.0)) > base
    assert float(room(distance_m=10.0, emissivity=0.8)) > base
    assert float(room(distance_m=10.0, reflected_c=30.0)) < base
    assert float(room(distance_m=50.0)) > base
    assert float(room(distance_m=10.0, humidity=0.95)) > base
    assert float(room(distance_m=10.0, window_transmittance=0.9)) > base


def test_a_response_curve() -> None:
    box = room(emissivity=0.5, model="band", band_um=(8.0, 14.0))
    curve = room(emissivity=0.5, model="band", response=[(8.0, 1.0), (14.0, 1.0)])
    assert float(curve) == pytest.approx(float(box), abs=1e-3)
    lists: Any = [[8.0, 1.0], [14.0, 1.0]]
    assert float(room(emissivity=0.5, model="band", response=lists)) == float(curve)


# ---------------------------------------------------------------- what is not stated


def test_without_distance_no_air_is_corrected_for() -> None:
    assert float(room()) == float(room(transmittance=1.0))
    assert float(room(humidity=0.9)) == float(room())


def test_a_given_transmittance_replaces_the_formula() -> None:
    assert float(room(transmittance=0.9, distance_m=500.0)) == float(room(transmittance=0.9))


def test_what_is_reflected_is_as_warm_as_the_air() -> None:
    for air_c in (-5.0, 35.0):
        assert float(correct(60.0, emissivity=0.8, air_c=air_c)) == float(
            correct(60.0, emissivity=0.8, air_c=air_c, reflected_c=air_c)
        )
    assert float(correct(60.0, emissivity=0.8)) == float(room(emissivity=0.8))


def test_a_window_is_as_warm_as_the_air() -> None:
    stated: dict[str, Any] = {"emissivity": 0.8, "air_c": -5.0, "window_transmittance": 0.8}
    assert float(correct(60.0, **stated)) == float(
        correct(60.0, **stated, window_c=-5.0, window_reflected_c=20.0, window_reflectance=0.04)
    )


def test_a_window_of_assumed_reflectance_may_be_nearly_clear() -> None:
    # 0.98 + the assumed 0.04 is more than 1: the assumption gives way, not the stated value.
    assert float(room(window_transmittance=0.98)) == pytest.approx(
        float(room(window_transmittance=0.98, window_reflectance=0.02)), abs=1e-9
    )


def test_the_less_is_stated_the_less_is_known() -> None:
    stated = float(room(emissivity=0.6).u_k)
    without_reflected = float(correct(60.0, emissivity=0.6, air_c=20.0).u_k)
    without_anything = float(correct(60.0, emissivity=0.6).u_k)
    assert stated < without_reflected < without_anything
    exact = float(room(emissivity=(0.6, 0.0)).u_k)
    assert exact < stated < float(room(emissivity=(0.6, 0.1)).u_k)


def test_an_uncertainty_that_is_not_stated_is_the_documented_default() -> None:
    u = default_for("emissivity").u_given
    assert u is not None
    assert float(room().u_k) == float(room(emissivity=(0.9, u)).u_k)


# ---------------------------------------------------------------- shapes


@pytest.mark.parametrize("model", ["total", "band"])
def test_arrays_and_numbers_agree(model: str) -> None:
    image = np.array([[15.0, 60.0, 90.0], [20.0, 120.0, 300.0]])
    result = room(image, emissivity=0.7, transmittance=0.95, model=model)
    assert np.asarray(result).shape == image.shape
    assert np.shape(result.u_k) == image.shape
    for index in np.ndindex(image.shape):
        single = room(float(image[index]), emissivity=0.7, transmittance=0.95, model=model)
        assert isinstance(single.temperature_c, float)
        assert isinstance(single.u_k, float)
        assert np.asarray(result)[index] == pytest.approx(single.temperature_c, abs=1e-9)
        assert np.asarray(result.u_k)[index] == pytest.approx(single.u_k, rel=1e-9)


@pytest.mark.parametrize("model", ["total", "band"])
def test_planes_of_emissivity_and_reflected_temperature(model: str) -> None:
    image = np.array([[30.0, 60.0], [90.0, 120.0]])
    emissivity = np.array([[0.3, 0.6], [0.9, 1.0]])
    reflected_c = np.array([[10.0, 20.0], [-30.0, 40.0]])
    result = np.asarray(room(image, emissivity=emissivity, reflected_c=reflected_c, model=model))
    for index in np.ndindex(image.shape):
        single = room(
            float(image[index]),
            emissivity=float(emissivity[index]),
            reflected_c=float(reflected_c[index]),
            model=model,
        )
        assert result[index] == pytest.approx(float(single), abs=1e-9)


@pytest.mark.parametrize(
    "readings", [[20.0, 60.0], (20, 60), np.array([20, 60]), np.array([20.0, 60.0], np.float32)]
)
def test_any_kind_of_numbers(readings: Any) -> None:
    expected = [float(room(20.0)), float(room(60.0))]
    assert np.asarray(room(readings)) == pytest.approx(expected, abs=1e-9)


def test_a_single_precision_image_is_corrected_in_double_precision() -> None:
    image = np.linspace(-20.0, 400.0, 1000, dtype=np.float32).reshape(20, 50)
    result = np.asarray(room(image, emissivity=0.5, transmittance=0.9, model="band"))
    expected = np.asarray(
        room(image.astype(np.float64), emissivity=0.5, transmittance=0.9, model="band")
    )
    solved = np.isfinite(expected)
    assert solved.sum() > 900
    assert np.isnan(result[~solved]).all()
    assert np.max(np.abs(result[solved] - expected[solved])) < 5e-3


def test_the_result_unpacks_and_converts() -> None:
    result = room()
    temperature_c, u_k = result
    assert (temperature_c, u_k) == (result.temperature_c, result.u_k)
    assert float(result) == temperature_c
    assert np.asarray(result).shape == ()
    assert np.asarray(result, dtype=np.float32).dtype == np.float32
    several = room([20.0, 60.0])
    assert np.allclose(several, np.asarray(several.temperature_c))
    with pytest.raises(TypeError):
        float(several)


def test_the_readings_are_not_changed() -> None:
    image = np.array([20.0, 60.0])
    emissivity = np.array([0.5, 0.6])
    room(image, emissivity=emissivity)
    assert image.tolist() == [20.0, 60.0]
    assert emissivity.tolist() == [0.5, 0.6]


def test_it_is_public() -> None:
    assert {"correct", "Corrected"} <= set(public_names)
    assert correct is thermo_fix.point.correct


# ---------------------------------------------------------------- no solution


@pytest.mark.parametrize("model", ["total", "band"])
def test_where_nothing_explains_a_reading_it_is_nan(model: str) -> None:
    hidden = {"emissivity": 0.1, "reflected_c": 60.0, "model": model}
    assert math.isnan(float(room(-20.0, **hidden)))
    image = np.asarray(room([-20.0, 65.0, math.nan], **hidden))
    assert np.isnan(image).tolist() == [True, False, True]
    assert np.isnan(np.asarray(room([-20.0, 65.0], **hidden).u_k)).tolist() == [True, False]


# ---------------------------------------------------------------- surfaces by name


def test_a_surface_by_name_brings_its_value_and_uncertainty() -> None:
    surface = find_surface("brick, red")
    by_name = room(emissivity="brick, red")
    by_number = room(emissivity=(surface.emissivity, surface.u))
    assert tuple(by_name) == tuple(by_number)
    assert tuple(room(emissivity="Brick,  red")) == tuple(by_name)


def test_an_unknown_surface_suggests_the_nearest() -> None:
    with pytest.raises(UnknownSurface) as caught:
        room(emissivity="red brick")
    assert caught.value.nearest[0] == "brick, red"
    assert '"brick, red"' in str(caught.value)


# ---------------------------------------------------------------- out of range

NAN, INF = math.nan, math.inf
WINDOW = {"window_transmittance": 0.8}
FRACTIONS_ABOVE_ZERO = (0.0, 1e-4, -0.1, 1.0001, 95.0, NAN, INF)
TEMPERATURES = (-273.16, -300.0, NAN, INF, -INF)

OUT_OF_RANGE: list[tuple[str, Any, dict[str, Any]]] = [
    *(("emissivity", value, {}) for value in FRACTIONS_ABOVE_ZERO),
    *(("transmittance", value, {}) for value in FRACTIONS_ABOVE_ZERO),
    *(("window_transmittance", value, {}) for value in FRACTIONS_ABOVE_ZERO),
    *(("recorded_emissivity", value, {}) for value in FRACTIONS_ABOVE_ZERO),
    *(("recorded_transmittance", value, {}) for value in FRACTIONS_ABOVE_ZERO),
    *(("reflected_c", value, {}) for value in TEMPERATURES),
    *(("air_c", value, {}) for value in TEMPERATURES),
    *(("recorded_reflected_c", value, {}) for value in TEMPERATURES),
    *(("recorded_air_c", value, {}) for value in TEMPERATURES),
    *(("window_c", value, WINDOW) for value in TEMPERATURES),
    *(("window_reflected_c", value, WINDOW) for value in TEMPERATURES),
    *(("air_c", value, {"distance_m": 5.0}) for value in (-41.0, 61.0)),
    *(("humidity", value, {"distance_m": 5.0}) for value in (-0.1, 1.1, 50.0, NAN)),
    *(("humidity", value, {}) for value in (-0.1, 50.0)),
    *(("distance_m", value, {}) for value in (-1.0, NAN, INF)),
    ("distance_m", -1.0, {"transmittance": 0.9}),
    *(("window_reflectance", value, WINDOW) for value in (-0.1, 1.1, NAN)),
    ("window_reflectance", 0.21, WINDOW),
    ("window_reflectance", 0.05, {}),
    ("window_c", 20.0, {}),
    ("window_reflected_c", 20.0, {}),
    *(("accuracy_k", value, {}) for value in (-1.0, NAN, INF)),
    *(("accuracy_fraction", value, {}) for value in (-0.1, NAN)),
    *(("noise_k", value, {}) for value in (-0.1, NAN)),
    ("model", "both", {}),
    *(("band_um", value, {"model": "band"}) for value in ((14.0, 8.0), (0.0, 8.0), (8.0, 8.0))),
    *(("emissivity", (0.9, u), {}) for u in (-0.1, NAN, INF)),
    ("emissivity", (0.9, 0.02, 0.01), {}),
    ("emissivity", np.array([0.9, 0.8]), {}),
    ("reflected_c", np.array([20.0, 21.0]), {}),
    ("transmittance", np.array([0.9, 0.8]), {}),
    ("air_c", np.array([20.0, 21.0]), {}),
]


@pytest.mark.parametrize(("name", "value", "beside"), OUT_OF_RANGE, ids=str)
def test_out_of_range_is_one_clear_line(name: str, value: Any, beside: dict[str, Any]) -> None:
    with pytest.raises(DomainError, match=name) as caught:
        room(**{**beside, name: value})
    assert "\n" not in str(caught.value)
    assert isinstance(caught.value, ValueError)


def test_a_path_too_long_and_humid_asks_for_a_transmittance() -> None:
    with pytest.raises(DomainError, match="state it as transmittance"):
        room(air_c=30.0, humidity=0.9, distance_m=20_000.0)


@pytest.mark.parametrize("response", [[(8.0, 1.0)], [(14.0, 1.0), (8.0, 1.0)], [(8, 0), (14, 0)]])
def test_an_impossible_response_is_refused(response: list[tuple[float, float]]) -> None:
    with pytest.raises(DomainError, match="response"):
        room(model="band", response=response)


@pytest.mark.parametrize("reading_c", [-273.15, -300.0, math.inf, -math.inf])
def test_an_impossible_reading_is_refused(reading_c: float) -> None:
    for readings in (reading_c, [20.0, reading_c]):
        with pytest.raises(DomainError, match="reading_c"):
            room(readings)


def test_one_bad_pixel_of_a_plane_is_refused() -> None:
    image = np.full((2, 2), 60.0)
    bad = np.array([[0.9, 0.9], [0.9, 1.1]])
    with pytest.raises(DomainError, match="emissivity"):
        room(image, emissivity=bad)
    with pytest.raises(DomainError, match="reflected_c"):
        room(image, reflected_c=np.where(bad > 1.0, np.nan, 20.0))
    with pytest.raises(DomainError, match="shape"):
        room(image, emissivity=np.full((2, 3), 0.9))


def test_the_ends_of_the_ranges_are_in_them() -> None:
    assert float(room(emissivity=1.0, transmittance=1.0)) == pytest.approx(60.0, abs=1e-9)
    assert math.isfinite(float(room(emissivity=0.001)))
    assert math.isfinite(float(room(humidity=0.0, distance_m=5.0)))
    assert math.isfinite(float(room(humidity=1.0, distance_m=5.0)))
    assert math.isfinite(float(room(window_transmittance=0.8, window_reflectance=0.2)))
    assert float(room(accuracy_k=0.0, accuracy_fraction=0.0, noise_k=0.0).u_k) > 0.0


def test_the_row_of_equal_temperatures() -> None:
    # Second law: in a room of one temperature nothing can read another, whatever is stated.
    equal = row("f-meq_identity_8-14").inputs
    for model in ("total", "band"):
        result = room(
            equal["T_obj_C"],
            emissivity=equal["eps"],
            transmittance=equal["tau"],
            window_transmittance=0.5,
            model=model,
        )
        assert float(result) == pytest.approx(equal["T_obj_C"], abs=1e-3)
