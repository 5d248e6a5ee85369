"""The optical path: measurement equation, its inversion and its sensitivities."""

import math
from dataclasses import replace
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy import constants as codata
from scipy.integrate import quad

from tests.published_checks import Row, row, rows
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.radiometry.blackbody import RadiationModel, TotalModel, band_model
from thermo_fix.radiometry.path import (
    IDENTITY_PATH,
    Affine,
    OpticalPath,
    Window,
    air_step,
    apparent_temperature,
    correction_map,
    is_unsolved,
    seen_map,
    sensitivities,
    surface_step,
    surface_temperature,
    window_step,
)

TOTAL = TotalModel()
BAND = band_model((8.0, 14.0))
MODELS: list[RadiationModel] = [TOTAL, BAND, band_model((7.5, 13.0)), band_model((3.0, 5.0))]


def path_of(
    emissivity: float, reflected_c: float, air_c: float, transmittance: float
) -> OpticalPath:
    return OpticalPath(
        emissivity, reflected_c + ZERO_CELSIUS_K, air_c + ZERO_CELSIUS_K, transmittance
    )


def corrected_c(
    reading_c: float,
    path: OpticalPath,
    model: RadiationModel,
    recorded: OpticalPath = IDENTITY_PATH,
) -> float:
    kelvin = surface_temperature(reading_c + ZERO_CELSIUS_K, path, recorded, model)
    return float(kelvin) - ZERO_CELSIUS_K


def seen_c(surface_c: float, path: OpticalPath, model: RadiationModel) -> float:
    return float(apparent_temperature(surface_c + ZERO_CELSIUS_K, path, model)) - ZERO_CELSIUS_K


def tolerance_k(
    reading_k: float, surface_k: float, path: OpticalPath, model: RadiationModel
) -> float:
    """1 mK, or more where a lossy path magnifies the last digits of the reading.

    The tables of a band model are good to some 1e-5 K; a dim surface behind a bright window
    magnifies that by hundreds.
    """
    slopes = sensitivities(reading_k, surface_k, path, IDENTITY_PATH, model)
    return 1e-3 + 2e-5 * abs(float(slopes["reading"]))


temperatures_k = st.floats(ZERO_CELSIUS_K - 60.0, ZERO_CELSIUS_K + 120.0)
surfaces_k = st.floats(ZERO_CELSIUS_K - 40.0, ZERO_CELSIUS_K + 700.0)


@st.composite
def windows(draw: st.DrawFn) -> Window:
    transmittance = draw(st.floats(0.4, 1.0))
    reflectance = draw(st.floats(0.0, 1.0)) * (1.0 - transmittance)
    return Window(transmittance, reflectance, draw(temperatures_k), draw(temperatures_k))


@st.composite
def paths(draw: st.DrawFn, lowest_emissivity: float = 0.1) -> OpticalPath:
    return OpticalPath(
        emissivity=draw(st.floats(lowest_emissivity, 1.0)),
        reflected_k=draw(temperatures_k),
        air_k=draw(temperatures_k),
        transmittance=draw(st.floats(0.5, 1.0)),
        window=draw(st.none() | windows()),
    )


models = st.sampled_from(MODELS)


# ---------------------------------------------------------------- published and worked numbers


@pytest.mark.parametrize("check", rows("f-meq_"), ids=str)
def test_measurement_equation_forward(check: Row) -> None:
    given_inputs = check.inputs
    path = path_of(
        given_inputs["eps"], given_inputs["T_refl_C"], given_inputs["T_atm_C"], given_inputs["tau"]
    )
    low_um, high_um = (float(edge) for edge in given_inputs["band_um"])
    band = band_model((low_um, high_um))
    surface_c = float(given_inputs["T_obj_C"])
    assert seen_c(surface_c, path, band) == pytest.approx(check.expected["T_app_C"], abs=1e-3)
    assert seen_c(surface_c, path, TOTAL) == pytest.approx(
        check.expected["T_app_C_if_T4"], abs=1e-3
    )


@pytest.mark.parametrize("check", rows("f-meq_"), ids=str)
def test_measurement_equation_inverse(check: Row) -> None:
    given_inputs = check.inputs
    path = path_of(
        given_inputs["eps"], given_inputs["T_refl_C"], given_inputs["T_atm_C"], given_inputs["tau"]
    )
    low_um, high_um = (float(edge) for edge in given_inputs["band_um"])
    # The rows are printed to 0.1 mK, which low emissivity magnifies by 1/(eps tau).
    tolerance = 1e-3 + 1e-4 / (given_inputs["eps"] * given_inputs["tau"])
    for model, reading_c in (
        (band_model((low_um, high_um)), check.expected["T_app_C"]),
        (TOTAL, check.expected["T_app_C_if_T4"]),
    ):
        surface_c = corrected_c(reading_c, path, model)
        assert surface_c == pytest.approx(given_inputs["T_obj_C"], abs=tolerance)


@pytest.mark.parametrize(
    ("emissivity", "total_c", "band_c"), [(0.6, 80.8, 81.8), (0.3, 120.4, 126.2)]
)
def test_a_camera_sees_only_a_band(emissivity: float, total_c: float, band_c: float) -> None:
    # To 0.1 K; both are worked out again below, by plain arithmetic and by quadrature.
    path = path_of(emissivity, 20.0, 20.0, 0.99)
    assert round(corrected_c(60.0, path, TOTAL), 1) == total_c
    assert round(corrected_c(60.0, path, BAND), 1) == band_c

    reading, around = ((each + codata.zero_Celsius) ** 4 for each in (60.0, 20.0))
    power = ((reading - 0.01 * around) / 0.99 - (1.0 - emissivity) * around) / emissivity
    assert corrected_c(60.0, path, TOTAL) == pytest.approx(
        power**0.25 - codata.zero_Celsius, abs=1e-9
    )

    def planck(wavelength_um: float, kelvin: float) -> float:
        exponent = codata.h * codata.c / (wavelength_um * 1e-6 * codata.k * kelvin)
        return wavelength_um**-5 / math.expm1(exponent)

    def radiance(celsius: float) -> float:
        kelvin = celsius + codata.zero_Celsius
        return float(quad(planck, 8.0, 14.0, args=(kelvin,), epsrel=1e-11)[0])

    ours = corrected_c(60.0, path, BAND)
    leaving = emissivity * radiance(ours) + (1.0 - emissivity) * radiance(20.0)
    seen = 0.99 * leaving + 0.01 * radiance(20.0)
    assert seen == pytest.approx(radiance(60.0), rel=1e-6)


@pytest.mark.parametrize("check", rows("g-sens"), ids=str)
def test_published_sensitivities(check: Row) -> None:
    given_inputs, expected = check.inputs, check.expected
    path = path_of(
        given_inputs["eps"], given_inputs["T_refl_C"], given_inputs["T_atm_C"], given_inputs["tau"]
    )
    reading_k = given_inputs["T_app_C"] + ZERO_CELSIUS_K
    surface_k = surface_temperature(reading_k, path, IDENTITY_PATH, BAND)
    assert float(surface_k) - ZERO_CELSIUS_K == pytest.approx(expected["T_obj_C"], abs=1e-3)
    slopes = sensitivities(reading_k, surface_k, path, IDENTITY_PATH, BAND)
    for ours, theirs, printed in (
        ("reading", "dT_dTapp", 1e-5),
        ("emissivity", "dT_deps_K_per_1", 1e-4),
        ("reflected", "dT_dTrefl", 5e-6),
        ("air", "dT_dTatm", 5e-6),
        ("transmittance", "dT_dtau_K_per_1", 1e-4),
    ):
        # 1e-3 relative, or the last printed digit.
        assert float(slopes[ours]) == pytest.approx(expected[theirs], rel=1e-3, abs=printed)
    u = given_inputs["u"]
    combined = math.sqrt(
        sum(
            (float(slopes[ours]) * u[theirs]) ** 2
            for ours, theirs in (
                ("reading", "T_app"),
                ("emissivity", "eps"),
                ("reflected", "T_refl"),
                ("air", "T_atm"),
                ("transmittance", "tau"),
            )
        )
    )
    assert combined == pytest.approx(expected["uc_K"], abs=1e-3)


def test_emissivity_from_a_contact_reading() -> None:
    # The emissivity that ASTM E1933's algebra gives brings the reading to the contact reading.
    check = row("h-E1933_contact")
    path = path_of(check.expected, check.inputs["T_refl_C"], 20.0, 1.0)
    surface_c = corrected_c(check.inputs["T_app_C"], path, BAND)
    # 5e-6 in the printed emissivity is worth 5e-6 x 50 K.
    assert surface_c == pytest.approx(check.inputs["T_contact_C"], abs=2e-3)


def test_emissivity_from_a_reference_patch() -> None:
    check = row("h-E1933_noncontact")
    given_inputs, expected = check.inputs, check.expected
    patch = path_of(given_inputs["eps_ref"], given_inputs["T_refl_C"], 20.0, 1.0)
    sample = path_of(expected["eps"], given_inputs["T_refl_C"], 20.0, 1.0)
    on_patch = corrected_c(given_inputs["T_app_ref_C"], patch, BAND)
    on_sample = corrected_c(given_inputs["T_app_sample_C"], sample, BAND)
    assert on_patch == pytest.approx(expected["T_true_C"], abs=2e-3)
    assert on_sample == pytest.approx(on_patch, abs=2e-3)


@pytest.mark.parametrize("check", rows("h-caution_"), ids=str)
def test_a_target_near_the_surroundings_hides_its_emissivity(check: Row) -> None:
    reflected_c = check.inputs["T_refl_C"]
    surface_c = reflected_c + check.inputs["dT_above_refl_K"]
    path = path_of(check.inputs["eps_true"], reflected_c, 20.0, 1.0)
    reading_c = seen_c(surface_c, path, BAND)
    assert reading_c == pytest.approx(check.expected["T_app_C"], abs=1e-4 + 1e-3)
    # An emissivity found from a contact reading 0.5 K too high explains just that temperature.
    wrong = replace(path, emissivity=check.expected["eps_if_+0.5K"])
    slope = sensitivities(
        reading_c + ZERO_CELSIUS_K,
        surface_c + 0.5 + ZERO_CELSIUS_K,
        wrong,
        IDENTITY_PATH,
        BAND,
    )["emissivity"]
    tolerance = 1e-3 + 1e-4 * abs(float(slope))
    assert corrected_c(reading_c, wrong, BAND) == pytest.approx(surface_c + 0.5, abs=tolerance)


def test_transmittance_of_a_window_from_a_hot_source() -> None:
    # ASTM E1897: the source seen directly, then through the window, whose own emission and
    # reflection both stand at one temperature.
    check = row("h-E1897_num")
    given_inputs = check.inputs
    medium_k = given_inputs["T_medium_and_reflected_C"] + ZERO_CELSIUS_K
    for reflectance in (0.0, 0.1, 0.3):  # of no matter, since both terms are equally warm
        window = Window(check.expected, reflectance, medium_k, medium_k)
        path = OpticalPath(1.0, 293.15, 293.15, 1.0, window)
        through = seen_c(given_inputs["T_direct_C"], path, BAND)
        assert through == pytest.approx(given_inputs["T_through_C"], abs=2e-3)
        direct = corrected_c(given_inputs["T_through_C"], path, BAND)
        assert direct == pytest.approx(given_inputs["T_direct_C"], abs=2e-3)


def test_a_half_filled_pixel_mixes_exitances_not_temperatures() -> None:
    check = row("i-mix")
    fill = check.inputs["fill"]
    hot, cold = (float(BAND.exitance(each + ZERO_CELSIUS_K)) for each in (60.0, 20.0))
    mixed = float(BAND.temperature(fill * hot + (1.0 - fill) * cold)) - ZERO_CELSIUS_K
    assert mixed == pytest.approx(check.expected, abs=0.01)


# ---------------------------------------------------------------- steps


def test_each_step_is_its_energy_balance() -> None:
    # The definitions themselves (ISO 18434-1; energy balance of a plate), with round numbers.
    assert surface_step(0.8, 400.0)(500.0) == pytest.approx(0.8 * 500.0 + 0.2 * 400.0)
    assert air_step(0.9, 300.0)(500.0) == pytest.approx(0.9 * 500.0 + 0.1 * 300.0)
    assert window_step(0.7, 0.1, 350.0, 450.0)(500.0) == pytest.approx(
        0.7 * 500.0 + 0.1 * 350.0 + 0.2 * 450.0
    )


def test_steps_are_chained_in_the_order_of_the_light() -> None:
    path = path_of(0.8, -40.0, 10.0, 0.9)
    window = Window(0.7, 0.1, 305.0, 295.0)
    path = replace(path, window=window)
    surface = TOTAL.exitance(350.0)
    at_surface = 0.8 * surface + 0.2 * TOTAL.exitance(path.reflected_k)
    after_air = 0.9 * at_surface + 0.1 * TOTAL.exitance(path.air_k)
    after_window = (
        0.7 * after_air + 0.1 * TOTAL.exitance(295.0) + (1 - 0.7 - 0.1) * TOTAL.exitance(305.0)
    )
    assert seen_map(path, TOTAL)(surface) == pytest.approx(after_window, rel=1e-12)


@given(
    first=st.tuples(st.floats(0.05, 1.0), st.floats(-500.0, 500.0)),
    second=st.tuples(st.floats(0.05, 1.0), st.floats(-500.0, 500.0)),
    x=st.floats(0.0, 1e4),
)
def test_affine_maps_compose_and_invert(
    first: tuple[float, float], second: tuple[float, float], x: float
) -> None:
    one, two = Affine(*first), Affine(*second)
    assert one.then(two)(x) == pytest.approx(two(one(x)), rel=1e-9, abs=1e-9)
    assert one.inverse(one(x)) == pytest.approx(x, rel=1e-9, abs=1e-6)


# ---------------------------------------------------------------- identities and round trips


@settings(deadline=None)
@given(surface_k=surfaces_k, path=paths(), model=models)
def test_forward_then_inverse_is_identity(
    surface_k: float, path: OpticalPath, model: RadiationModel
) -> None:
    reading = float(apparent_temperature(surface_k, path, model))
    assert float(surface_temperature(reading, path, IDENTITY_PATH, model)) == pytest.approx(
        surface_k, abs=tolerance_k(reading, surface_k, path, model)
    )


@settings(deadline=None)
@given(surface_k=surfaces_k, path=paths(), recorded=paths(0.3), model=models)
def test_settings_recorded_by_the_camera_are_undone(
    surface_k: float, path: OpticalPath, recorded: OpticalPath, model: RadiationModel
) -> None:
    """A simulated camera sees through ``path`` but reports what ``recorded`` would explain."""
    seen = seen_map(path, model)(model.exitance(surface_k))
    reading = float(model.temperature(seen_map(recorded, model).inverse(seen)))
    assume(math.isfinite(reading))  # else the camera itself found no temperature
    seen_k = float(model.temperature(seen))
    assert float(surface_temperature(reading, path, recorded, model)) == pytest.approx(
        surface_k, abs=2.0 * tolerance_k(seen_k, surface_k, path, model)
    )


@settings(deadline=None)
@given(reading_k=surfaces_k, path=paths(), model=models)
def test_settings_that_were_right_are_left_alone(
    reading_k: float, path: OpticalPath, model: RadiationModel
) -> None:
    assert float(surface_temperature(reading_k, path, path, model)) == pytest.approx(
        reading_k, abs=1e-3
    )


@settings(deadline=None)
@given(reading_k=surfaces_k, reflected_k=temperatures_k, air_k=temperatures_k, model=models)
def test_a_blackbody_through_nothing_reads_itself(
    reading_k: float, reflected_k: float, air_k: float, model: RadiationModel
) -> None:
    path = OpticalPath(1.0, reflected_k, air_k, 1.0, Window(1.0, 0.0, 250.0, 350.0))
    assert float(surface_temperature(reading_k, path, IDENTITY_PATH, model)) == pytest.approx(
        reading_k, abs=1e-3
    )


@settings(deadline=None)
@given(reading_k=surfaces_k, path=paths(), model=models, other_k=temperatures_k)
def test_what_is_not_in_the_path_does_not_matter(
    reading_k: float, path: OpticalPath, model: RadiationModel, other_k: float
) -> None:
    blackbody = replace(path, emissivity=1.0)
    airless = replace(path, transmittance=1.0)
    for first, second in (
        (blackbody, replace(blackbody, reflected_k=other_k)),
        (airless, replace(airless, air_k=other_k)),
    ):
        one = float(surface_temperature(reading_k, first, IDENTITY_PATH, model))
        two = float(surface_temperature(reading_k, second, IDENTITY_PATH, model))
        assert one == two or (math.isnan(one) and math.isnan(two))


@settings(deadline=None)
@given(
    kelvin=temperatures_k,
    emissivity=st.floats(0.02, 1.0),
    transmittance=st.floats(0.05, 1.0),
    window=windows(),
    model=models,
)
def test_in_a_closed_isothermal_room_everything_reads_the_same(
    kelvin: float, emissivity: float, transmittance: float, window: Window, model: RadiationModel
) -> None:
    # Second law: equal temperatures return themselves whatever the emissivity (f-meq_identity).
    same = replace(window, temperature_k=kelvin, reflected_k=kelvin)
    path = OpticalPath(emissivity, kelvin, kelvin, transmittance, same)
    assert float(apparent_temperature(kelvin, path, model)) == pytest.approx(kelvin, abs=1e-3)
    # 0.001 of the path is left at worst: rounding in 1e-16 M is still nothing.
    assert float(surface_temperature(kelvin, path, IDENTITY_PATH, model)) == pytest.approx(
        kelvin, abs=1e-2
    )


def test_the_identity_path_changes_no_reading_at_all() -> None:
    reading = np.linspace(230.0, 1700.0, 50)
    undone = correction_map(IDENTITY_PATH, IDENTITY_PATH, TOTAL)
    assert (undone.gain, undone.offset) == (1.0, 0.0)
    assert np.asarray(
        surface_temperature(reading, IDENTITY_PATH, IDENTITY_PATH, TOTAL)
    ) == pytest.approx(reading, rel=1e-12)


# ---------------------------------------------------------------- directions


@settings(deadline=None)
@given(reading_k=surfaces_k, path=paths(), recorded=paths(0.3), model=models)
def test_reading_up_surface_up(
    reading_k: float, path: OpticalPath, recorded: OpticalPath, model: RadiationModel
) -> None:
    first = float(surface_temperature(reading_k, path, recorded, model))
    second = float(surface_temperature(reading_k + 0.5, path, recorded, model))
    assume(math.isfinite(first) and math.isfinite(second))
    assert second > first


@settings(deadline=None)
@given(
    surface_k=surfaces_k,
    path=paths(0.2),
    model=models,
    below=st.floats(0.5, 0.95),
)
def test_emissivity_down_moves_away_from_the_reflected_temperature(
    surface_k: float, path: OpticalPath, model: RadiationModel, below: float
) -> None:
    assume(abs(surface_k - float(path.reflected_k)) > 1.0)
    reading = apparent_temperature(surface_k, path, model)
    lower = replace(path, emissivity=float(path.emissivity) * below)
    moved = float(surface_temperature(reading, lower, IDENTITY_PATH, model))
    if surface_k > float(path.reflected_k):
        assert moved > surface_k
    else:
        # The colder a target is, the sooner no temperature explains it at all.
        assert moved < surface_k or math.isnan(moved)


@settings(deadline=None)
@given(surface_k=surfaces_k, path=paths(), model=models)
def test_reflected_up_surface_down(
    surface_k: float, path: OpticalPath, model: RadiationModel
) -> None:
    assume(path.emissivity < 0.98)
    reading = apparent_temperature(surface_k, path, model)
    warmer = replace(path, reflected_k=path.reflected_k + 2.0)
    moved = float(surface_temperature(reading, warmer, IDENTITY_PATH, model))
    assert moved < surface_k or math.isnan(moved)


@settings(deadline=None)
@given(surface_k=surfaces_k, path=paths(), model=models, below=st.floats(0.7, 0.95))
def test_transmittance_down_moves_away_from_the_air_temperature(
    surface_k: float, path: OpticalPath, model: RadiationModel, below: float
) -> None:
    # What counts is whether the radiation that leaves the surface is warmer than the air.
    leaving = surface_step(path.emissivity, model.exitance(path.reflected_k))
    leaving_k = float(model.temperature(leaving(model.exitance(surface_k))))
    assume(abs(leaving_k - float(path.air_k)) > 1.0)
    reading = apparent_temperature(surface_k, path, model)
    longer = replace(path, transmittance=float(path.transmittance) * below)
    moved = float(surface_temperature(reading, longer, IDENTITY_PATH, model))
    if leaving_k > float(path.air_k):
        assert moved > surface_k
    else:
        assert moved < surface_k or math.isnan(moved)


@pytest.mark.parametrize("model", MODELS[:3], ids=["total", "8-14", "7.5-13"])
def test_directions_at_a_warm_connection(model: RadiationModel) -> None:
    """The ordinary case by name: a target hotter than everything around it."""
    path = path_of(0.8, 20.0, 20.0, 0.95)
    base = corrected_c(60.0, path, model)
    assert base > 60.0
    assert corrected_c(61.0, path, model) > base
    assert corrected_c(60.0, replace(path, emissivity=0.7), model) > base
    assert corrected_c(60.0, replace(path, transmittance=0.9), model) > base
    assert corrected_c(60.0, replace(path, reflected_k=303.15), model) < base
    assert corrected_c(60.0, replace(path, air_k=303.15), model) < base


@pytest.mark.parametrize("model", MODELS[:3], ids=["total", "8-14", "7.5-13"])
def test_directions_at_a_warm_facade_under_a_cold_sky(model: RadiationModel) -> None:
    # A little warmer than the air, yet what leaves it is colder: absorption by the air then
    # made it look warmer, and a lower transmittance brings the surface down.
    path = path_of(0.8, -40.0, 0.0, 0.95)
    reading_c = seen_c(2.0, path, model)
    assert reading_c < 0.0
    assert corrected_c(reading_c, replace(path, transmittance=0.9), model) < 2.0
    assert corrected_c(reading_c, replace(path, emissivity=0.75), model) > 2.0


# ---------------------------------------------------------------- no solution


@pytest.mark.parametrize("model", MODELS[:3], ids=["total", "8-14", "7.5-13"])
def test_where_nothing_explains_the_reading_it_is_nan(model: RadiationModel) -> None:
    # Mirror-like metal that reflects 60 degC cannot look like -20 degC at any temperature.
    path = path_of(0.1, 60.0, 20.0, 1.0)
    assert math.isnan(corrected_c(-20.0, path, model))
    readings = np.array([[-20.0, 58.0], [np.nan, 65.0]]) + ZERO_CELSIUS_K
    surface = np.asarray(surface_temperature(readings, path, IDENTITY_PATH, model))
    assert np.isnan(surface).tolist() == [[True, False], [True, False]]
    assert is_unsolved(surface, readings).tolist() == [[True, False], [False, False]]


def test_the_edge_of_what_can_be_solved() -> None:
    # At (M_seen - B) = 0 exactly there is no solution; just above it is near absolute zero, and
    # never clipped to something likelier.
    path = path_of(0.5, 20.0, 20.0, 1.0)
    offset = float(seen_map(path, TOTAL).offset)
    edge_k = float(TOTAL.temperature(offset))
    below, above = (
        float(surface_temperature(edge_k + step, path, IDENTITY_PATH, TOTAL))
        for step in (-1e-6, 1e-3)
    )
    assert math.isnan(below)
    assert 0.0 < above < 30.0
    assert math.isnan(float(TOTAL.temperature(seen_map(path, TOTAL).inverse(offset))))


@settings(deadline=None)
@given(reading_k=surfaces_k, path=paths(), model=models)
def test_a_solution_always_explains_its_reading(
    reading_k: float, path: OpticalPath, model: RadiationModel
) -> None:
    surface_k = surface_temperature(reading_k, path, IDENTITY_PATH, model)
    left = float(seen_map(path, model).inverse(model.exitance(reading_k)))
    if math.isnan(float(surface_k)):
        lowest = 0.0 if model is TOTAL else float(model.exitance(90.0))
        highest = math.inf if model is TOTAL else float(model.exitance(1973.15))
        assert not lowest < left < highest * (1.0 - 1e-9)
    else:
        assert left > 0.0
        assert float(apparent_temperature(surface_k, path, model)) == pytest.approx(
            reading_k, abs=1e-3
        )


# ---------------------------------------------------------------- arrays


def test_a_plane_of_emissivities_and_of_reflected_temperatures() -> None:
    rng = np.random.default_rng(7)
    shape = (4, 6)
    reading = rng.uniform(290.0, 360.0, shape)
    emissivity = rng.uniform(0.3, 1.0, shape)
    reflected = rng.uniform(270.0, 300.0, shape)
    for model in MODELS:
        plane = OpticalPath(emissivity, reflected, 293.15, 0.97)
        result = np.asarray(surface_temperature(reading, plane, IDENTITY_PATH, model))
        assert result.shape == shape
        for index in np.ndindex(shape):
            single = OpticalPath(float(emissivity[index]), float(reflected[index]), 293.15, 0.97)
            expected = surface_temperature(float(reading[index]), single, IDENTITY_PATH, model)
            assert result[index] == pytest.approx(expected, abs=1e-6)


@pytest.mark.parametrize("model", MODELS, ids=["total", "8-14", "7.5-13", "3-5"])
@pytest.mark.parametrize("emissivity", [0.95, 0.6, 0.2])
def test_a_single_precision_image_is_within_five_millikelvin(
    model: RadiationModel, emissivity: float
) -> None:
    rng = np.random.default_rng(11)
    image = rng.uniform(250.0, 900.0, (200, 200)).astype(np.float32)
    path = OpticalPath(emissivity, 285.0, 290.0, 0.93, Window(0.85, 0.05, 295.0, 293.0))
    recorded = path_of(0.97, 18.0, 21.0, 0.99)
    single = np.asarray(surface_temperature(image, path, recorded, model))
    double = np.asarray(surface_temperature(image.astype(np.float64), path, recorded, model))
    assert single.dtype == np.float32
    assert double.dtype == np.float64
    # Near absolute zero the fourth root magnifies any rounding; no surface is that cold.
    solved = np.isfinite(double) & (double > ZERO_CELSIUS_K - 60.0)
    assert solved.sum() > 20_000
    assert np.max(np.abs(single.astype(np.float64) - double)[solved]) < 5e-3


# ---------------------------------------------------------------- sensitivities


def _stepped(path: OpticalPath, name: str, step: float) -> OpticalPath:
    if not name.startswith("window."):
        key = {"reflected": "reflected_k", "air": "air_k"}.get(name, name)
        return replace(path, **{key: getattr(path, key) + step})
    assert path.window is not None
    key = name.removeprefix("window.")
    key = {"temperature": "temperature_k", "reflected": "reflected_k"}.get(key, key)
    return replace(path, window=replace(path.window, **{key: getattr(path.window, key) + step}))


STEPS = {
    "reading": 0.2,
    "emissivity": 1e-3,
    "transmittance": 1e-3,
    "reflected": 0.2,
    "air": 0.2,
    "window.transmittance": 1e-3,
    "window.reflectance": 1e-3,
    "window.temperature": 0.2,
    "window.reflected": 0.2,
}


@settings(deadline=None)
@given(
    surface_k=st.floats(ZERO_CELSIUS_K, ZERO_CELSIUS_K + 300.0),
    path=paths(0.3),
    recorded=paths(0.7),
    model=models,
)
def test_sensitivities_are_the_central_differences(
    surface_k: float, path: OpticalPath, recorded: OpticalPath, model: RadiationModel
) -> None:
    seen = seen_map(path, model)(model.exitance(surface_k))
    reading_k = float(model.temperature(seen_map(recorded, model).inverse(seen)))
    assume(math.isfinite(reading_k) and reading_k > 200.0)
    slopes = sensitivities(reading_k, surface_k, path, recorded, model)
    expected = {name for name in STEPS if path.window is not None or "window" not in name}
    assert set(slopes) == expected

    def by_reading(step: float) -> Any:
        return surface_temperature(reading_k + step, path, recorded, model)

    for name, slope in slopes.items():

        def by_input(step: float, name: str = name) -> Any:
            return surface_temperature(reading_k, _stepped(path, name, step), recorded, model)

        make = by_reading if name == "reading" else by_input
        # At most half a kelvin of the surface, so that the curve is straight over the step; the
        # tables of a band model add some 1e-5 K to that.
        step = min(STEPS[name], 0.5 / max(abs(float(slope)), 1e-9))
        difference = (float(make(step)) - float(make(-step))) / (2.0 * step)
        assert float(slope) == pytest.approx(difference, rel=5e-3, abs=2e-5 / step)


def test_sensitivities_of_an_image_are_those_of_its_pixels() -> None:
    readings = np.array([[300.0, 320.0], [340.0, 360.0]])
    path = OpticalPath(0.8, 285.0, 290.0, 0.93, Window(0.85, 0.05, 295.0, 293.0))
    for model in MODELS:
        surface = np.asarray(surface_temperature(readings, path, IDENTITY_PATH, model))
        slopes = sensitivities(readings, surface, path, IDENTITY_PATH, model)
        for index in np.ndindex(readings.shape):
            single = sensitivities(
                float(readings[index]), float(surface[index]), path, IDENTITY_PATH, model
            )
            for name, slope in slopes.items():
                assert np.asarray(slope)[index] == pytest.approx(single[name], rel=1e-9)


def test_an_emissivity_step_matters_more_the_hotter_the_target() -> None:
    path = path_of(0.9, 20.0, 20.0, 1.0)
    slopes = []
    for reading_c in (20.0, 30.0, 60.0, 120.0):
        reading_k = reading_c + ZERO_CELSIUS_K
        surface_k = surface_temperature(reading_k, path, IDENTITY_PATH, BAND)
        slopes.append(
            float(sensitivities(reading_k, surface_k, path, IDENTITY_PATH, BAND)["emissivity"])
        )
    assert slopes[0] == pytest.approx(0.0, abs=1e-3)
    assert all(later < earlier for earlier, later in pairwise(slopes))
