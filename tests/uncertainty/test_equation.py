"""The measurement equation: its sensitivities and its draws.

The equation is written once more here: for the total model with the ``uncertainties`` package
(https://pypi.org/project/uncertainties, 3.2), which differentiates by itself; for the band model
with the simulator's own integral of Planck's law.
"""

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from uncertainties import ufloat, umath

from tests.simulator import detector
from tests.uncertainty.published import expected, inputs
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.radiometry.blackbody import RadiationModel, TotalModel, band_model
from thermo_fix.radiometry.path import IDENTITY_PATH, OpticalPath
from thermo_fix.uncertainty.equation import (
    AIR_FORMULA,
    CALIBRATION,
    MODEL,
    NOISE,
    NONUNIFORMITY,
    MeasurementEquation,
)
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import DRAWS, Variable

Draws = NDArray[np.float64]
BAND = band_model((8.0, 14.0))
UNIT_BOUNDS = {"lower": 1e-3, "upper": 1.0}


def equation(
    model: RadiationModel,
    values: dict[str, tuple[float, float]],
    recorded: OpticalPath = IDENTITY_PATH,
    **camera: float,
) -> MeasurementEquation:
    """An equation from (value, u) by sheet key."""
    bounded = ("emissivity", "window.transmittance")
    variables = {
        key: Variable(f"{key} [scene]", *pair, **(UNIT_BOUNDS if key in bounded else {}))  # type: ignore[arg-type]
        for key, pair in values.items()
    }
    return MeasurementEquation(model, recorded, variables, **camera)  # type: ignore[arg-type]


# ---- against the uncertainties package -----------------------------------------------------------


def by_uncertainties(
    reading_c: float,
    values: dict[str, tuple[float, float]],
    recorded: OpticalPath,
    camera: dict[str, float],
    formula_u: float = 0.0,
) -> tuple[float, float, dict[str, float]]:
    """Value (degC), u (K) and the signed contributions, with T^4 and automatic differentiation."""
    # The package warns of an exact number that is given an uncertainty of zero.
    x: dict[str, Any] = {
        key: ufloat(value, max(u, 1e-30), tag=key) for key, (value, u) in values.items()
    }
    accuracy = camera.get("accuracy_k", 0.0)
    half = max(accuracy, camera.get("accuracy_fraction", 0.0) * abs(reading_c))
    x[CALIBRATION] = ufloat(0.0, half / math.sqrt(3.0), tag=CALIBRATION)
    x[NOISE] = ufloat(0.0, camera.get("noise_k", 0.0), tag=NOISE)
    x[NONUNIFORMITY] = ufloat(0.0, camera.get("nonuniformity_k", 0.0), tag=NONUNIFORMITY)
    if "transmittance" not in values:
        x[AIR_FORMULA] = ufloat(0.0, formula_u, tag=AIR_FORMULA)

    def power(celsius: Any) -> Any:
        return (celsius + 273.15) ** 4  # sigma cancels

    read = power(reading_c + x[CALIBRATION] + x[NOISE] + x[NONUNIFORMITY])
    seen = recorded.transmittance * (
        recorded.emissivity * read + (1.0 - recorded.emissivity) * recorded.reflected_k**4
    )
    seen += (1.0 - recorded.transmittance) * recorded.air_k**4
    if "window.transmittance" in x:
        tau_w, rho_w = x["window.transmittance"], x["window.reflectance"]
        seen -= rho_w * power(x["window.reflected_c"])
        seen -= (1.0 - tau_w - rho_w) * power(x["window.temperature_c"])
        seen /= tau_w
    if "transmittance" in x:
        tau = x["transmittance"]
    else:
        tau = _formula(x["air_c"], x["humidity"], x["distance_m"]) + x[AIR_FORMULA]
    leaving = (seen - (1.0 - tau) * power(x["air_c"])) / tau
    own = (leaving - (1.0 - x["emissivity"]) * power(x["reflected_c"])) / x["emissivity"]
    surface = own**0.25 - 273.15
    parts = {
        variable.tag: float(surface.derivatives[variable]) * float(variable.std_dev)
        for variable in surface.derivatives
    }
    return float(surface.nominal_value), float(surface.std_dev), parts


def _formula(air_c: Any, humidity: Any, distance_m: Any) -> Any:
    """The exponential long-wave formula, written once more (coefficients from memory)."""
    h = 1.5587 + 6.939e-2 * air_c - 2.7816e-4 * air_c**2 + 6.8455e-7 * air_c**3
    root_w = umath.sqrt(humidity * umath.exp(h))
    root_d = umath.sqrt(distance_m)
    first = umath.exp(-root_d * (0.006569 - 0.002276 * root_w))
    second = umath.exp(-root_d * (0.01262 - 0.00667 * root_w))
    return 1.9 * first - 0.9 * second


CAMERA = {"accuracy_k": 1.0, "accuracy_fraction": 0.02, "noise_k": 0.05, "nonuniformity_k": 0.1}
PLAIN = {
    "emissivity": (0.62, 0.04),
    "reflected_c": (24.0, 2.0),
    "air_c": (18.0, 1.5),
    "transmittance": (0.93, 0.02),
}
FORMULA = {
    "emissivity": (0.91, 0.02),
    "reflected_c": (-6.0, 3.0),
    "air_c": (2.0, 1.0),
    "humidity": (0.75, 0.05),
    "distance_m": (40.0, 3.0),
}
WINDOW = {
    "window.transmittance": (0.82, 0.02),
    "window.reflectance": (0.05, 0.02),
    "window.temperature_c": (27.0, 2.0),
    "window.reflected_c": (22.0, 3.0),
}
RECORDED = OpticalPath(
    emissivity=0.95,
    reflected_k=20.0 + ZERO_CELSIUS_K,
    air_k=15.0 + ZERO_CELSIUS_K,
    transmittance=0.97,
)


@pytest.mark.parametrize("reading_c", [-18.0, 12.0, 60.0, 240.0])
@pytest.mark.parametrize("recorded", [IDENTITY_PATH, RECORDED], ids=["black", "recorded"])
@pytest.mark.parametrize("window", [{}, WINDOW], ids=["open", "window"])
@pytest.mark.parametrize("air", [PLAIN, FORMULA], ids=["given tau", "formula"])
def test_first_order_agrees_with_the_uncertainties_package(
    air: dict[str, tuple[float, float]],
    window: dict[str, tuple[float, float]],
    recorded: OpticalPath,
    reading_c: float,
) -> None:
    values = {**air, **window}
    tested = equation(TotalModel(), values, recorded, **CAMERA)
    value, u, parts = by_uncertainties(reading_c, values, recorded, CAMERA, tested.air_formula_u)
    reading_k = reading_c + ZERO_CELSIUS_K
    assert tested.temperature_k(reading_k) - ZERO_CELSIUS_K == pytest.approx(value, abs=1e-8)
    ours = tested.contributions_k(reading_k)
    assert set(ours) == set(parts)
    for name, part in parts.items():
        assert ours[name] == pytest.approx(part, rel=1e-6, abs=1e-9), name
    assert tested.u_k(reading_k) == pytest.approx(u, rel=1e-7)


@settings(max_examples=60, deadline=None)
@given(
    reading_c=st.floats(-30.0, 300.0),
    emissivity=st.floats(0.1, 1.0),
    reflected_c=st.floats(-60.0, 80.0),
    air_c=st.floats(-30.0, 50.0),
    tau=st.floats(0.5, 1.0),
    u=st.tuples(*[st.floats(0.0, 1.0)] * 4),
)
def test_first_order_agrees_anywhere(
    reading_c: float,
    emissivity: float,
    reflected_c: float,
    air_c: float,
    tau: float,
    u: tuple[float, float, float, float],
) -> None:
    values = {
        "emissivity": (emissivity, 0.05 * u[0]),
        "reflected_c": (reflected_c, 4.0 * u[1]),
        "air_c": (air_c, 4.0 * u[2]),
        "transmittance": (tau, 0.05 * u[3]),
    }
    tested = equation(TotalModel(), values, IDENTITY_PATH, **CAMERA)
    found = tested.temperature_k(reading_c + ZERO_CELSIUS_K)
    # Below 100 K the reading is hardly explained by any surface, and slopes grow without limit.
    if not found > 100.0:
        return
    _, expected_u, _ = by_uncertainties(reading_c, values, IDENTITY_PATH, CAMERA)
    assert tested.u_k(reading_c + ZERO_CELSIUS_K) == pytest.approx(expected_u, rel=1e-6)


# ---- the band model ------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["sens1", "sens2", "sens3", "sens4"])
def test_published_sensitivities_in_the_band(name: str) -> None:
    row, result = inputs(name), expected(name)
    u = row["u"]
    tested = equation(
        BAND,
        {
            "emissivity": (row["eps"], u["eps"]),
            "reflected_c": (row["T_refl_C"], u["T_refl"]),
            "air_c": (row["T_atm_C"], u["T_atm"]),
            "transmittance": (row["tau"], u["tau"]),
        },
        accuracy_k=u["T_app"] * math.sqrt(3.0),
    )
    reading_k = row["T_app_C"] + ZERO_CELSIUS_K
    found = tested.temperature_k(reading_k) - ZERO_CELSIUS_K
    assert found == pytest.approx(result["T_obj_C"], abs=0.001)
    parts = tested.contributions_k(reading_k)
    for key, slope, u_key in (
        (CALIBRATION, "dT_dTapp", "T_app"),
        ("emissivity", "dT_deps_K_per_1", "eps"),
        ("reflected_c", "dT_dTrefl", "T_refl"),
        ("air_c", "dT_dTatm", "T_atm"),
        ("transmittance", "dT_dtau_K_per_1", "tau"),
    ):
        # The row prints four or five digits; half of the last one matters for the smallest slope.
        assert parts[key] / u[u_key] == pytest.approx(result[slope], rel=1e-3, abs=6e-6), key
    assert tested.u_k(reading_k) == pytest.approx(result["uc_K"], abs=0.001)


def surface_c_in_band(
    reading_c: Draws,
    emissivity: Draws | float,
    reflected_c: Draws | float,
    air_c: Draws | float,
    tau: Draws | float,
) -> Draws:
    """The measurement equation on the simulator's integral of Planck's law, 8-14 um."""
    box = detector("box")
    leaving = (box.exitance(reading_c) - (1.0 - tau) * box.exitance(air_c)) / tau
    own = (leaving - (1.0 - emissivity) * box.exitance(reflected_c)) / emissivity
    return box.celsius(own)


def poor_emissivity() -> tuple[MeasurementEquation, Estimate]:
    row = inputs("mc_therm")
    tested = equation(
        BAND,
        {
            "emissivity": (row["eps"], row["u_eps"]),
            "reflected_c": (row["T_refl_C"], 2.0),
            "air_c": (row["T_atm_C"], 2.0),
            "transmittance": (row["tau"], 0.01),
        },
    )
    reading_k = row["T_app_C"] + ZERO_CELSIUS_K
    # The row's u of 1 K of the apparent temperature is that of a normal distribution.
    parts = {key: float(part) for key, part in tested.contributions_k(reading_k).items()}
    gain = (
        float(tested.temperature_k(reading_k + 0.01) - tested.temperature_k(reading_k - 0.01))
        / 0.02
    )
    parts["apparent"] = gain * 1.0
    draws = tested.draw_k(reading_k, independent={"apparent": 1.0}) - ZERO_CELSIUS_K
    return tested, Estimate(float(tested.temperature_k(reading_k)) - ZERO_CELSIUS_K, parts, draws)


def test_poor_emissivity_by_monte_carlo() -> None:
    result = expected("mc_therm")
    _, estimate = poor_emissivity()
    assert [estimate.value, estimate.first_order_u] == pytest.approx(
        result["first_order"], abs=0.01
    )
    spread = estimate.distribution
    # Of 20 000 draws the mean scatters by 0.04 K, u by 0.04 K, the ends by 0.1 and 0.25 K.
    assert [spread.mean, spread.u] == pytest.approx(result["MC_mean_u"], abs=0.12)
    low, high = spread.interval()
    assert low == pytest.approx(result["MC95"][0], abs=0.3)
    assert high == pytest.approx(result["MC95"][1], abs=0.75)


def test_poor_emissivity_is_noticed() -> None:
    result = expected("mc_therm")
    _, estimate = poor_emissivity()
    assert not estimate.is_linear
    assert estimate.u == estimate.distribution.u
    low, high = estimate.interval()
    # Skewed upwards, as the row's interval is: 9.0 K below and 14.0 K above the value.
    assert high - estimate.value > 1.3 * (estimate.value - low)
    assert [low, high] == pytest.approx(result["MC95"], abs=0.75)


def test_low_emissivity_near_the_reflected_temperature_is_noticed() -> None:
    # A bare bar that mirrors a room of its own temperature: the reading says next to nothing.
    values = {
        "emissivity": (0.1, 0.03),
        "reflected_c": (22.0, 2.0),
        "air_c": (22.0, 1.0),
        "transmittance": (1.0, 0.0),
    }
    tested = equation(BAND, values, accuracy_k=1.0, noise_k=0.05)
    reading_k = 24.0 + ZERO_CELSIUS_K
    parts = {key: float(part) for key, part in tested.contributions_k(reading_k).items()}
    draws = tested.draw_k(reading_k, independent={"noise": 0.05}) - ZERO_CELSIUS_K
    estimate = Estimate(float(tested.temperature_k(reading_k)) - ZERO_CELSIUS_K, parts, draws)
    assert not estimate.is_linear

    rng = np.random.default_rng(5)
    eps = rng.normal(0.1, 0.03, 400_000)
    eps = eps[eps > 1e-3][:300_000]
    count = len(eps)
    own = surface_c_in_band(
        24.0 + rng.uniform(-1.0, 1.0, count) + rng.normal(0.0, 0.05, count),
        eps,
        rng.normal(22.0, 2.0, count),
        22.0,
        1.0,
    )
    lost = float(np.mean(np.isnan(own)))
    assert np.mean(np.isnan(draws)) == pytest.approx(lost, abs=0.005)
    low, high = np.nanquantile(own, [0.025, 0.975])
    found_low, found_high = estimate.interval()
    assert found_low == pytest.approx(low, abs=1.5)
    assert found_high == pytest.approx(high, abs=0.06 * (high - low))
    assert high - low > 60.0  # useless, and said so


@pytest.mark.parametrize("model", [TotalModel(), BAND], ids=["total", "band"])
@pytest.mark.parametrize(("value", "u"), [(0.97, 0.03), (0.04, 0.03), (1.0, 0.05)])
def test_emissivity_that_reaches_a_bound_is_drawn_inside(
    model: RadiationModel, value: float, u: float
) -> None:
    values = {
        "emissivity": (value, u),
        "reflected_c": (20.0, 1.0),
        "air_c": (20.0, 1.0),
        "transmittance": (0.99, 0.004),
    }
    tested = equation(model, values, accuracy_k=1.0)
    emissivity = tested.variables["emissivity"]
    assert emissivity.is_cut
    assert emissivity.draw().min() >= 1e-3
    assert emissivity.draw().max() <= 1.0
    draws = tested.draw_k(40.0 + ZERO_CELSIUS_K, independent={})
    # A reading above the reflected temperature: no emissivity up to 1 puts the surface more than
    # the calibration error and the air below the reading.
    assert np.nanmin(draws) > 40.0 + ZERO_CELSIUS_K - 1.0 - 0.05
    # Whatever is lost lies where a tiny emissivity would ask for more than the band table's end.
    assert np.mean(np.isnan(draws)) <= (0.0 if value > 0.5 else 0.2)


def test_first_order_is_left_where_a_cut_matters() -> None:
    # sd of a normal distribution cut at 0 standard uncertainties above: u sqrt(1 - 2/pi).
    values = {
        "emissivity": (1.0, 0.01),
        "reflected_c": (20.0, 0.0),
        "air_c": (20.0, 0.0),
        "transmittance": (1.0, 0.0),
    }
    tested = equation(BAND, values)
    reading_k = 60.0 + ZERO_CELSIUS_K
    parts = {key: float(part) for key, part in tested.contributions_k(reading_k).items()}
    estimate = Estimate(60.0, parts, tested.draw_k(reading_k, independent={}) - ZERO_CELSIUS_K)
    assert not estimate.is_linear
    assert estimate.u == pytest.approx(
        math.sqrt(1.0 - 2.0 / math.pi) * estimate.first_order_u, rel=0.03
    )
    low, _ = estimate.interval()
    assert low >= 60.0 - 1e-3


# ---- single inputs -------------------------------------------------------------------------------


@pytest.mark.parametrize("model", [TotalModel(), BAND], ids=["total", "band"])
@pytest.mark.parametrize(
    "key",
    ["emissivity", "reflected_c", "air_c", "humidity", "distance_m", "view_angle_deg", *WINDOW],
)
def test_contribution_is_the_slope_times_u(model: RadiationModel, key: str) -> None:
    values = {**FORMULA, **WINDOW, "view_angle_deg": (40.0, 3.0)}
    tested = equation(model, values)
    reading_k = 25.0 + ZERO_CELSIUS_K
    part = tested.contributions_k(reading_k)[key]
    step = 0.02 * values[key][1]

    def moved(by: float) -> float:
        shifted = {**values, key: (values[key][0] + by, values[key][1])}
        return float(equation(model, shifted).temperature_k(reading_k))

    slope = (moved(step) - moved(-step)) / (2.0 * step)
    # The band tables are linear between their nodes: slopes of differences scatter by 1e-3.
    assert part == pytest.approx(slope * values[key][1], rel=3e-3, abs=1e-5)


def test_half_width_is_the_larger_of_the_two() -> None:
    tested = equation(TotalModel(), PLAIN, accuracy_k=2.0, accuracy_fraction=0.02)
    celsius = np.array([-150.0, 0.0, 99.0, 100.0, 101.0, 250.0])
    half = tested.calibration_half_width_k(celsius + ZERO_CELSIUS_K)
    assert half == pytest.approx([3.0, 2.0, 2.0, 2.0, 2.02, 5.0])


def test_model_difference_is_a_rectangular_line() -> None:
    # 60 degC, emissivity 0.6, reflected 20, tau 0.99, air 20: 80.8 degC by the fourth power, 81.8
    # degC in the band, to a tenth (closed form, and quadrature of Planck's law).
    values = {
        "emissivity": (0.6, 0.0),
        "reflected_c": (20.0, 0.0),
        "air_c": (20.0, 0.0),
        "transmittance": (0.99, 0.0),
    }
    tested = replace(equation(TotalModel(), values), alternative=BAND)
    reading_k = 60.0 + ZERO_CELSIUS_K
    part = float(tested.contributions_k(reading_k)[MODEL])
    assert part * math.sqrt(3.0) == pytest.approx(81.8 - 80.8, abs=0.1)
    draws = tested.draw_k(reading_k, independent={})
    assert draws.std() == pytest.approx(part, rel=0.02)
    assert np.abs(draws - draws.mean()).max() <= part * math.sqrt(3.0) * 1.02
    # With the band as the model there is no such line.
    assert MODEL not in equation(BAND, values).contributions_k(reading_k)


def test_draws_use_the_same_names_as_the_contributions() -> None:
    # Two equations that share every variable draw the same errors: their difference is exact.
    tested = equation(BAND, PLAIN, accuracy_k=1.0)
    again = equation(BAND, PLAIN, accuracy_k=1.0)
    first = tested.draw_k(310.0, independent={"noise of a": 0.05})
    assert np.array_equal(first, again.draw_k(310.0, independent={"noise of a": 0.05}))
    other = again.draw_k(310.0, independent={"noise of b": 0.05})
    assert (first - other).std() == pytest.approx(
        math.sqrt(2.0) * float(replace(tested, noise_k=0.05).contributions_k(310.0)[NOISE]),
        rel=0.03,
    )
    assert len(first) == DRAWS


@pytest.mark.parametrize(("emissivity", "angle_deg"), [(0.78, 60.0), (0.95, 60.0), (0.95, 70.0)])
def test_emissivity_at_an_angle_moves_with_the_normal_one(
    emissivity: float, angle_deg: float
) -> None:
    # Fresnel at the angle, scaled to the normal value, written once more: n from the normal
    # reflectance ((n - 1)/(n + 1))^2, then the mean of both polarisations.
    def at_angle(normal: Draws) -> Draws:
        root = np.sqrt(1.0 - normal)
        n = (1.0 + root) / (1.0 - root)
        cosine, sine = math.cos(math.radians(angle_deg)), math.sin(math.radians(angle_deg))
        inside = np.sqrt(1.0 - (sine / n) ** 2)
        parallel = (n * cosine - inside) / (n * cosine + inside)
        crossed = (cosine - n * inside) / (cosine + n * inside)
        return np.asarray(1.0 - (parallel**2 + crossed**2) / 2.0)

    u = 0.01
    values = {
        "emissivity": (emissivity, u),
        "reflected_c": (10.0, 0.0),
        "air_c": (10.0, 0.0),
        "transmittance": (1.0, 0.0),
        "view_angle_deg": (angle_deg, 0.0),
    }
    tested = equation(TotalModel(), values)
    reading_k = 30.0 + ZERO_CELSIUS_K
    drawn = at_angle(np.random.default_rng(3).normal(emissivity, u, 200_000))
    reflected = (10.0 + 273.15) ** 4
    surface = (((30.0 + 273.15) ** 4 - (1.0 - drawn) * reflected) / drawn) ** 0.25
    # The angle's factor is taken as linear over the spread of the emissivity.
    assert tested.u_k(reading_k) == pytest.approx(surface.std(), rel=0.03)
    assert tested.draw_k(reading_k, independent={}).std() == pytest.approx(surface.std(), rel=0.03)
