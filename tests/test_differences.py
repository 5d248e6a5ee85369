"""Differences inside an image, between zones and to the air: what cancels, and what does not.

Closed forms for the total model, M = sigma T^4: with T_s the surface, T_r the reflected
temperature, eps the emissivity and no air, eps T_s^4 = T^4 - (1 - eps) T_r^4 for a reading T. Then
dT_s/dT = T^3/(eps T_s^3), dT_s/dT_r = -(1 - eps)/eps (T_r/T_s)^3 and
dT_s/deps = -(T_s^4 - T_r^4)/(4 eps T_s^3).
"""

import math

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.uncertainty.in_memory import corrected_image, scene_inputs, with_emissivity
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct.inputs import Models, equation_of
from thermo_fix.measure.quantities import Site, quantities_of
from thermo_fix.measure.spot import Spot, spot_of_median, temperature_of
from thermo_fix.radiometry.blackbody import TotalModel
from thermo_fix.records import Camera, SceneInputs, Zone
from thermo_fix.uncertainty.equation import CALIBRATION, NOISE, NONUNIFORMITY
from thermo_fix.uncertainty.estimate import Estimate

TOTAL = Models(TotalModel(), None)
CAMERA = Camera(noise_k=0.05, accuracy_k=1.5, accuracy_fraction=0.0, nonuniformity_k=0.08)
EPS, U_EPS = 0.8, 0.03
REFLECTED_C, U_REFLECTED_K = 15.0, 2.0
AIR_C, U_AIR_K = 18.0, 1.0
SCENE = scene_inputs(
    emissivity=(EPS, U_EPS), reflected_c=(REFLECTED_C, U_REFLECTED_K), air_c=(AIR_C, U_AIR_K)
)


def estimate(
    name: str, reading_c: float, inputs: SceneInputs = SCENE, camera: Camera = CAMERA
) -> Estimate:
    spot = Spot(name, 0, reading_c + ZERO_CELSIUS_K, 1.0)
    return temperature_of(spot, equation_of(inputs, camera, TOTAL))


def part(of: Estimate, key: str) -> float:
    """Net contribution of the variables of this key."""
    return math.fsum(value for name, value in of.contributions.items() if name.startswith(key))


# ---- one zone ------------------------------------------------------------------------------------


def test_equal_readings_of_one_zone_share_everything_but_noise() -> None:
    gap = estimate("a", 55.0).minus(estimate("b", 55.0))
    assert gap.value == 0.0
    own = 0.0
    for name, net in gap.contributions.items():
        if name.startswith((NOISE, NONUNIFORMITY)):
            own += net**2
        else:
            assert net == 0.0, name
    kelvin = 55.0 + ZERO_CELSIUS_K
    surface = estimate("a", 55.0).value + ZERO_CELSIUS_K
    slope = kelvin**3 / (EPS * surface**3)
    assert gap.u == pytest.approx(slope * math.sqrt(2.0) * math.hypot(0.05, 0.08), rel=1e-9)
    assert gap.u == pytest.approx(math.sqrt(own))
    # Each of the two by itself is known twenty times worse.
    assert estimate("a", 55.0).u > 10.0 * gap.u


@pytest.mark.parametrize(("hot_c", "cool_c"), [(70.0, 40.0), (25.0, 5.0), (120.0, 21.0)])
def test_unequal_readings_of_one_zone_keep_the_difference_of_their_slopes(
    hot_c: float, cool_c: float
) -> None:
    hot, cool = estimate("hot", hot_c), estimate("cool", cool_c)
    gap = hot.minus(cool)
    t = np.array([hot_c, cool_c]) + ZERO_CELSIUS_K
    s = np.array([hot.value, cool.value]) + ZERO_CELSIUS_K
    reflected = REFLECTED_C + ZERO_CELSIUS_K
    assert EPS * s**4 == pytest.approx(t**4 - (1.0 - EPS) * reflected**4)
    by_reading = t**3 / (EPS * s**3)
    by_reflected = -(1.0 - EPS) / EPS * (reflected / s) ** 3
    by_emissivity = -(s**4 - reflected**4) / (4.0 * EPS * s**3)
    u_offset = CAMERA.accuracy_k / math.sqrt(3.0)
    for key, slopes, u in (
        (CALIBRATION, by_reading, u_offset),
        ("reflected_c", by_reflected, U_REFLECTED_K),
        ("emissivity", by_emissivity, U_EPS),
    ):
        net = (slopes[0] - slopes[1]) * u
        assert part(gap, key) == pytest.approx(net, rel=1e-6, abs=1e-12), key
    # What is left of the offset and of the reflected term is a small part of what each had.
    assert abs(part(gap, CALIBRATION)) < 0.25 * abs(part(hot, CALIBRATION))
    assert abs(part(gap, "reflected_c")) < 0.75 * abs(part(cool, "reflected_c"))
    # The emissivity acts in proportion to the height over the reflected temperature: it stays, and
    # adds up where the reflected temperature lies between the two.
    own = by_emissivity[0] - by_emissivity[1]
    assert abs(part(gap, "emissivity")) == pytest.approx(abs(own) * U_EPS)


def test_difference_against_independent_draws() -> None:
    hot_c, cool_c = 70.0, 40.0
    gap = estimate("hot", hot_c).minus(estimate("cool", cool_c))
    rng = np.random.default_rng(8)
    n = 400_000
    eps = rng.normal(EPS, U_EPS, n)
    reflected = (rng.normal(REFLECTED_C, U_REFLECTED_K, n) + 273.15) ** 4
    offset = rng.uniform(-CAMERA.accuracy_k, CAMERA.accuracy_k, n)

    def surface(reading_c: float) -> NDArray[np.float64]:
        own = rng.normal(0.0, math.hypot(0.05, 0.08), n)
        seen = (reading_c + offset + own + 273.15) ** 4
        return np.asarray(((seen - (1.0 - eps) * reflected) / eps) ** 0.25)

    draws = surface(hot_c) - surface(cool_c)
    assert gap.u == pytest.approx(draws.std(), rel=0.02)
    assert gap.draws.std() == pytest.approx(draws.std(), rel=0.02)
    assert gap.interval() == pytest.approx(np.quantile(draws, [0.025, 0.975]), abs=0.1)


def test_stated_fraction_of_the_reading_cancels_only_in_part() -> None:
    # 2 % of the reading in degC: at 150 and 100 degC half-widths of 3 and 2 K, one common error, in
    # K 1.5 times as large at the hot place.
    camera = Camera(noise_k=0.0, accuracy_k=1.0, accuracy_fraction=0.02, nonuniformity_k=0.0)
    black = scene_inputs(emissivity=(1.0, 0.0))
    gap = estimate("a", 150.0, black, camera).minus(estimate("b", 100.0, black, camera))
    assert gap.u == pytest.approx((3.0 - 2.0) / math.sqrt(3.0), rel=1e-6)


# ---- zones ---------------------------------------------------------------------------------------


def zone_estimates(first: SceneInputs, second: SceneInputs) -> Estimate:
    """Difference of two zones of equal readings in one image, through the correct stage."""
    readings_c = np.full((20, 40), 20.0)
    readings_c[5:15, 5:35] = 60.0

    def square(x0: float) -> tuple[tuple[float, float], ...]:
        return ((x0, 5.0), (x0 + 15.0, 5.0), (x0 + 15.0, 15.0), (x0, 15.0))

    zones = (Zone("left", square(5.0), first), Zone("right", square(20.0), second))
    frame = corrected_image(readings_c, SCENE, CAMERA, zones=zones)
    left, right = (
        temperature_of(
            spot_of_median(frame, zone.name, label, frame.labels == label), frame.equations[label]
        )
        for label, zone in enumerate(zones, 1)
    )
    return left.minus(right)


def test_separately_judged_emissivities_do_not_cancel() -> None:
    gap = zone_estimates(
        with_emissivity(SCENE, EPS, U_EPS, "zone left of a.tif"),
        with_emissivity(SCENE, EPS, U_EPS, "zone right of a.tif"),
    )
    assert gap.value == pytest.approx(0.0, abs=1e-9)
    parts = [net for name, net in gap.contributions.items() if name.startswith("emissivity")]
    assert len(parts) == 2
    assert parts[0] == pytest.approx(-parts[1])
    assert gap.u > 0.9 * math.sqrt(2.0) * abs(parts[0])
    assert gap.draws.std() == pytest.approx(gap.u, rel=0.03)
    # The camera and the surroundings are common all the same.
    assert gap.contributions[CALIBRATION] == pytest.approx(0.0, abs=1e-9)
    assert part(gap, "reflected_c") == pytest.approx(0.0, abs=1e-9)


def test_one_surface_name_is_one_emissivity() -> None:
    same = with_emissivity(SCENE, EPS, U_EPS, "surface busbar, dull")
    gap = zone_estimates(same, with_emissivity(SCENE, EPS, U_EPS, "surface busbar, dull"))
    assert part(gap, "emissivity") == pytest.approx(0.0, abs=1e-9)
    apart = zone_estimates(same, with_emissivity(SCENE, EPS, U_EPS, "surface paint, grey"))
    assert apart.u > 5.0 * gap.u


def test_variables_of_two_images_are_shared_only_if_stated_once() -> None:
    # Stated in [scene] the emissivity is one variable for the survey; stated for each image, two.
    once = estimate("a", 55.0).minus(estimate("b", 55.0))
    twice = estimate("a", 55.0, with_emissivity(SCENE, EPS, U_EPS, "image a.tif")).minus(
        estimate("b", 55.0, with_emissivity(SCENE, EPS, U_EPS, "image b.tif"))
    )
    assert part(once, "emissivity") == 0.0
    single = abs(part(estimate("a", 55.0), "emissivity"))
    assert twice.u == pytest.approx(math.hypot(once.u, math.sqrt(2.0) * single), rel=1e-9)


# ---- the air -------------------------------------------------------------------------------------


@pytest.mark.parametrize("tau", [1.0, 0.9])
def test_surface_minus_air_keeps_one_air_temperature(tau: float) -> None:
    inputs = scene_inputs(
        emissivity=(EPS, 0.0),
        reflected_c=(REFLECTED_C, 0.0),
        air_c=(AIR_C, U_AIR_K),
        transmittance=(tau, 0.0),
    )
    surface = estimate("a", 45.0, inputs)
    found, _, _ = quantities_of(surface, None, like=False, site=Site(inputs, "here"))
    rise = found["rise_over_air"]
    assert rise.value == pytest.approx(surface.value - AIR_C)
    # d(T_s - T_air)/dT_air = -(1 - tau)/(tau eps) (T_air/T_s)^3 - 1: the air adds to itself.
    kelvin = surface.value + ZERO_CELSIUS_K
    through_path = -(1.0 - tau) / (tau * EPS) * ((AIR_C + ZERO_CELSIUS_K) / kelvin) ** 3
    assert part(rise, "air_c") == pytest.approx((through_path - 1.0) * U_AIR_K, rel=1e-6)
    assert len([name for name in rise.contributions if name.startswith("air_c")]) == 1
    # Draw by draw the same air is taken away that was in the path.
    rest = math.sqrt(rise.first_order_u**2 - part(rise, "air_c") ** 2)
    assert rise.draws.std() == pytest.approx(math.hypot(rest, part(rise, "air_c")), rel=0.02)


def test_difference_of_two_rises_is_the_difference_of_the_surfaces() -> None:
    inputs = scene_inputs(
        emissivity=(EPS, U_EPS), reflected_c=(REFLECTED_C, 1.0), air_c=(AIR_C, U_AIR_K)
    )
    hot, cool = estimate("a", 60.0, inputs), estimate("b", 40.0, inputs)
    site = Site(inputs, "here")
    rises = [
        quantities_of(each, None, like=False, site=site)[0]["rise_over_air"] for each in (hot, cool)
    ]
    gap, direct = rises[0].minus(rises[1]), hot.minus(cool)
    assert gap.value == pytest.approx(direct.value)
    assert gap.u == pytest.approx(direct.u)
    assert gap.draws == pytest.approx(direct.draws, abs=1e-9)
