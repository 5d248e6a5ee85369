"""Reference procedures: published algebra, round trips, and the uncertainty by Monte Carlo."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate

from tests.published_checks import Row, row, rows
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.blackbody import RadiationModel, TotalModel, band_model
from thermo_fix.radiometry.path import IDENTITY_PATH, OpticalPath, Window, apparent_temperature
from thermo_fix.radiometry.reference import (
    emissivity_of,
    emitted_exitance,
    leaving_exitance,
    normal_emissivity,
    transmittance_of,
)
from thermo_fix.radiometry.surface import directional_factor
from thermo_fix.solve import (
    Bench,
    Solved,
    emissivity_from_numbers,
    transmittance_from_numbers,
)
from thermo_fix.uncertainty.numeric import estimate_of
from thermo_fix.uncertainty.variables import Variable

MODELS: list[RadiationModel] = [TotalModel(), band_model((8.0, 14.0))]


def exitance(model: RadiationModel, celsius: float) -> float:
    return float(model.exitance(celsius + ZERO_CELSIUS_K))


def band_of(published: Row) -> RadiationModel:
    low, high = published.inputs.get("band_um", (8, 14))
    return band_model((float(low), float(high)))


# ---------------------------------------------------------------- published algebra


def test_emissivity_from_a_contact_reading() -> None:
    # ASTM E1933, contact procedure; 8-14 um box; scipy 1.17.1.
    published = row("h-E1933_contact")
    model, told = band_of(published), published.inputs
    found = emissivity_of(
        exitance(model, told["T_app_C"]),
        exitance(model, told["T_contact_C"]),
        exitance(model, told["T_refl_C"]),
    )
    assert found == pytest.approx(published.expected, abs=1e-4)


def test_emissivity_from_a_reference_patch() -> None:
    # ASTM E1933, non-contact procedure; 8-14 um box; scipy 1.17.1.
    published = row("h-E1933_noncontact")
    model, told = band_of(published), published.inputs
    reflected = exitance(model, told["T_refl_C"])
    surface = emitted_exitance(exitance(model, told["T_app_ref_C"]), told["eps_ref"], reflected)
    found = emissivity_of(exitance(model, told["T_app_sample_C"]), surface, reflected)
    assert found == pytest.approx(published.expected["eps"], abs=1e-4)
    true_c = float(model.temperature(surface)) - ZERO_CELSIUS_K
    assert true_c == pytest.approx(published.expected["T_true_C"], abs=2e-3)


def test_transmittance_of_a_window() -> None:
    # ASTM E1897, emission and reflection of the window at one temperature; scipy 1.17.1.
    published = row("h-E1897_num")
    model, told = band_of(published), published.inputs
    found = transmittance_of(
        exitance(model, told["T_through_C"]),
        exitance(model, told["T_direct_C"]),
        exitance(model, told["T_medium_and_reflected_C"]),
    )
    assert found == pytest.approx(published.expected, abs=1e-4)


@pytest.mark.parametrize("published", rows("h-caution_"), ids=str)
def test_a_target_near_the_reflected_temperature_tells_little(published: Row) -> None:
    # What half a kelvin in the contact reading does; 8-14 um box; scipy 1.17.1.
    model, told = band_of(published), published.inputs
    reflected_c = told["T_refl_C"]
    true_c = reflected_c + told["dT_above_refl_K"]
    reflected = exitance(model, reflected_c)
    seen = told["eps_true"] * exitance(model, true_c) + (1.0 - told["eps_true"]) * reflected
    apparent_c = float(model.temperature(seen)) - ZERO_CELSIUS_K
    assert apparent_c == pytest.approx(published.expected["T_app_C"], abs=1e-3)
    for error, key in ((0.5, "eps_if_+0.5K"), (-0.5, "eps_if_-0.5K")):
        found = emissivity_of(seen, exitance(model, true_c + error), reflected)
        assert found == pytest.approx(published.expected[key], abs=1e-4)


@pytest.mark.parametrize("published", rows("h-caution_"), ids=str)
def test_numbers_are_refused_or_cautioned_by_their_separation(published: Row) -> None:
    # Least 10 K, better 20 K: ASTM E1933 / ISO 18434-1, from memory.
    told = published.inputs
    apart = told["dT_above_refl_K"]
    bench = Bench(model="band", reflected=(told["T_refl_C"], 0.0))
    contact_c = told["T_refl_C"] + apart
    if apart < 10:
        with pytest.raises(DomainError, match="within 10 K"):
            emissivity_from_numbers(bench, published.expected["T_app_C"], contact_c=contact_c)
        return
    solved = emissivity_from_numbers(bench, published.expected["T_app_C"], contact_c=contact_c)
    assert solved.value == pytest.approx(told["eps_true"], abs=1e-3)
    assert bool(solved.cautions) == (apart < 20)


# ---------------------------------------------------------------- round trips

celsius = st.floats(-20.0, 300.0)
shares = st.floats(0.05, 1.0)


@given(
    target_c=celsius,
    reflected_c=st.floats(-40.0, 60.0),
    emissivity=shares,
    patch_emissivity=st.floats(0.5, 1.0),
    air_tau=st.floats(0.5, 1.0),
    recorded_emissivity=st.floats(0.3, 1.0),
    which=st.sampled_from(MODELS),
)
def test_emissivity_comes_back_through_any_path(
    target_c: float,
    reflected_c: float,
    emissivity: float,
    patch_emissivity: float,
    air_tau: float,
    recorded_emissivity: float,
    which: RadiationModel,
) -> None:
    if abs(target_c - reflected_c) < 10.0:
        return
    window = Window(0.8, 0.05, 297.0, 295.0)
    recorded = OpticalPath(recorded_emissivity, 293.15, 293.15, 0.98)
    paths = [
        OpticalPath(each, reflected_c + ZERO_CELSIUS_K, 285.0, air_tau, window)
        for each in (emissivity, patch_emissivity)
    ]
    leaving = []
    for path in paths:
        seen_k = apparent_temperature(target_c + ZERO_CELSIUS_K, path, which)
        # What a camera with those settings would have stored.
        undone = leaving_exitance(seen_k, recorded, IDENTITY_PATH, which)
        stored = emitted_exitance(undone, recorded.emissivity, which.exitance(recorded.reflected_k))
        reading_k = which.temperature(stored)
        if not math.isfinite(float(reading_k)):
            return
        leaving.append(leaving_exitance(reading_k, path, recorded, which))
    mirrored = exitance(which, reflected_c)
    surface = emitted_exitance(leaving[1], patch_emissivity, mirrored)
    found = emissivity_of(leaving[0], surface, mirrored)
    # The band model's tables are good to 1 mK, which counts most at the least separation.
    assert found == pytest.approx(emissivity, abs=2e-3)


@given(
    direct_c=celsius,
    window_c=st.floats(0.0, 60.0),
    mirrored_c=st.floats(0.0, 60.0),
    tau=shares,
    rho_share=st.floats(0.0, 1.0),
    which=st.sampled_from(MODELS),
)
def test_transmittance_comes_back(
    direct_c: float,
    window_c: float,
    mirrored_c: float,
    tau: float,
    rho_share: float,
    which: RadiationModel,
) -> None:
    if abs(direct_c - window_c) < 10.0:
        return
    rho = rho_share * (1.0 - tau)
    direct, own, mirrored = (exitance(which, each) for each in (direct_c, window_c, mirrored_c))
    through = tau * direct + rho * mirrored + (1.0 - tau - rho) * own
    assert transmittance_of(through, direct, own, rho, mirrored) == pytest.approx(tau, abs=1e-9)


@given(normal=st.floats(0.05, 0.999), angle_deg=st.floats(0.0, 80.0))
def test_normal_emissivity_undoes_the_angle(normal: float, angle_deg: float) -> None:
    seen = normal * directional_factor(normal, angle_deg)
    if normal >= 0.7 > seen:
        return  # Below 0.7 a surface counts as a metal, for which no angle is applied.
    found = normal_emissivity(seen, angle_deg)
    assert found == pytest.approx(normal, abs=1e-6)


def test_nothing_separates_target_and_reflected() -> None:
    assert math.isnan(float(emissivity_of(400.0, 420.0, 420.0)))
    assert math.isnan(float(transmittance_of(400.0, 420.0, 420.0)))


def test_answers_outside_their_range_are_refused() -> None:
    bench = Bench(model="band", reflected=(20.0, 0.5))
    with pytest.raises(DomainError, match="comes out at 1\\.2"):
        emissivity_from_numbers(bench, 70.0, contact_c=62.0)
    with pytest.raises(DomainError, match="comes out at -0"):
        emissivity_from_numbers(bench, 15.0, contact_c=62.0)
    with pytest.raises(DomainError, match="transmittance comes out at 1"):
        transmittance_from_numbers(bench, 70.0, 60.0, (22.0, 1.0))


# ---------------------------------------------------------------- uncertainty


def test_numeric_contributions_are_those_of_the_calculus() -> None:
    variables = {"x": Variable("x", 2.0, 0.01), "y": Variable("y", 3.0, 0.02)}
    found = estimate_of(lambda at: at["x"] ** 2 * at["y"], variables)
    # d(x^2 y) = 2xy dx + x^2 dy.
    assert found.contributions["x"] == pytest.approx(12.0 * 0.01, rel=1e-4)
    assert found.contributions["y"] == pytest.approx(4.0 * 0.02, rel=1e-9)
    assert found.is_linear


def test_a_contribution_at_a_bound_keeps_its_size() -> None:
    variables = {"x": Variable("x", 0.995, 0.02, upper=1.0)}
    found = estimate_of(lambda at: 3.0 * at["x"], variables)
    assert found.contributions["x"] == pytest.approx(0.06, rel=1e-9)


def box_exitance(celsius: float) -> float:
    """Planck's law over 8-14 um by quadrature, in W m-2: independent of the package's tables."""
    c1, c2 = 3.741771852e-16, 1.438776877e-2  # 2 pi h c^2 and hc/k, CODATA 2018

    def spectral(wavelength: float) -> float:
        return c1 / wavelength**5 / math.expm1(c2 / wavelength / (celsius + 273.15))

    return float(integrate.quad(spectral, 8e-6, 14e-6)[0])


def test_standard_uncertainty_of_a_patch_is_that_of_simulated_measurements() -> None:
    # Every input drawn from its distribution, by code that shares nothing with the package but
    # the two readings; JCGM 101.
    rng = np.random.default_rng(11)
    count = 40_000
    grid = np.linspace(0.0, 90.0, 181)
    table = np.array([box_exitance(each) for each in grid])

    def seen(at: np.ndarray) -> np.ndarray:
        return np.asarray(np.interp(at, grid, table))

    # A stated accuracy of 2 K is the half-width of a rectangle, common to both readings.
    calibration = rng.uniform(-2.0, 2.0, count)
    patch = seen(58.0 + calibration + rng.normal(0.0, 0.1, count))
    target = seen(40.0 + calibration + rng.normal(0.0, 0.1, count))
    mirrored = seen(22.0 + rng.normal(0.0, 1.0, count))
    eps = rng.normal(0.95, 0.015, count)
    eps = eps[eps <= 1.0]
    eps = np.resize(eps, count)
    surface_c = np.interp((patch - (1.0 - eps) * mirrored) / eps, table, grid)
    surface = seen(surface_c + rng.normal(0.0, 0.5, count))
    drawn = (target - mirrored) / (surface - mirrored)

    solved = emissivity_from_numbers(
        Bench(model="band", reflected=(22.0, 1.0)),
        40.0,
        reference_reading_c=58.0,
        reference_emissivity=(0.95, 0.015),
        same_u=0.5,
    )
    assert solved.u == pytest.approx(float(drawn.std()), rel=0.03)
    low, high = np.quantile(drawn, [0.025, 0.975])
    # First order is let stand while the mean is shifted by less than 0.15 u.
    assert solved.interval[0] == pytest.approx(low, abs=0.2 * solved.u)
    assert solved.interval[1] == pytest.approx(high, abs=0.2 * solved.u)


def test_the_shared_calibration_counts_less_than_two_separate_ones() -> None:
    def solved(accuracy_k: float) -> Solved:
        return emissivity_from_numbers(
            Bench(model="band", reflected=(22.0, 0.0), accuracy_k=accuracy_k, accuracy_fraction=0),
            40.0,
            reference_reading_c=58.0,
            reference_emissivity=(0.95, 0.0),
            same_u=0.0,
        )

    shared = solved(2.0).parts["camera calibration"]
    band = MODELS[1]

    def eps(patch_c: float, target_c: float) -> float:
        mirrored = exitance(band, 22.0)
        surface = emitted_exitance(exitance(band, patch_c), 0.95, mirrored)
        return float(emissivity_of(exitance(band, target_c), surface, mirrored))

    u = 2.0 / math.sqrt(3.0)
    apart = math.hypot(eps(58.0 + u, 40.0) - eps(58.0, 40.0), eps(58.0, 40.0 + u) - eps(58.0, 40.0))
    assert shared < 0.6 * apart


@pytest.mark.parametrize("model", ["total", "band"])
def test_the_model_difference_is_a_contribution_of_the_total_model_alone(model: str) -> None:
    bench = Bench(model="total" if model == "total" else "band", reflected=(22.0, 0.5))
    solved = emissivity_from_numbers(bench, 48.0, contact_c=60.0, contact_u=0.5)
    assert ("radiation model" in solved.parts) == (model == "total")
