"""Air transmittance: the formula, LOWTRAN7 beside it, and where it is refused."""

import csv
import math
from collections import defaultdict
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy import constants as codata

from tests.published_checks import Row, row, rows
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.air import (
    HUMIDITY_RANGE_C,
    STRETCHED_BEYOND_M,
    absolute_humidity_g_m3,
    air_transmittance,
    air_transmittance_slopes,
    air_transmittance_u,
)

LOWTRAN_FILE = Path(__file__).parents[1] / "data" / "lowtran7_8_14um.csv"

# Greatest difference between formula and LOWTRAN7 up to a distance, over standard atmospheres
# from sub-arctic winter to tropical; LOWTRAN itself is good to 0.01 or so.
LIMITS = ((50.0, 0.005), (100.0, 0.010), (200.0, 0.025), (1000.0, 0.056))

Point = tuple[str, float, float, float, float]
"""Atmosphere, air degC, relative humidity, distance m, LOWTRAN transmittance."""


def humidity_of(water_g_m3: float, air_c: float) -> float:
    return water_g_m3 / float(absolute_humidity_g_m3(air_c, 1.0))


@cache
def lowtran() -> list[Point]:
    """Return the table of the tests and the published rows of six atmospheres."""
    points: list[Point] = []
    with LOWTRAN_FILE.open(encoding="utf-8", newline="") as file:
        for entry in csv.DictReader(file):
            air_c = float(entry["air_c"])
            points.append(
                (
                    entry["atmosphere"],
                    air_c,
                    humidity_of(float(entry["water_vapour_g_m3"]), air_c),
                    float(entry["distance_m"]),
                    float(entry["transmittance_8_14um"]),
                )
            )
    for check in rows("f-lowtran_"):
        air_c = float(check.inputs["t_C"])
        points.append(
            (
                check.inputs["atmosphere"],
                air_c,
                humidity_of(float(check.inputs["rho_w_g_m3"]), air_c),
                float(check.inputs["d_m"]),
                float(check.expected["LT_8-14"]),
            )
        )
    return points


def limit_at(distance_m: float) -> float:
    return next(limit for reach, limit in LIMITS if distance_m <= reach)


# ---------------------------------------------------------------- the formula


@pytest.mark.parametrize("check", rows("f-tau_"), ids=str)
def test_transmittance_rows(check: Row) -> None:
    air_c, humidity = float(check.inputs["t_C"]), check.inputs["RH_percent"] / 100.0
    assert float(absolute_humidity_g_m3(air_c, humidity)) == pytest.approx(
        check.inputs["w_g_m3"], abs=5e-4
    )
    for distance, expected in check.expected.items():
        tau = float(air_transmittance(air_c, humidity, float(distance)))
        assert tau == pytest.approx(expected, abs=1e-6)


def test_absolute_humidity_is_in_grams_and_not_a_pressure() -> None:
    check = row("f-w_unit")
    air_c = np.array(check.inputs["t_C"], dtype=float)
    ours = np.asarray(absolute_humidity_g_m3(air_c, 1.0))
    assert ours == pytest.approx(check.expected["poly"], abs=5e-4)
    published = np.array(check.expected["sat_abs_humidity_over_water_g_m3"])
    # Within 0.976 to 1.002 of the saturated absolute humidity over water, -30 to 50 degC; the
    # cold values are printed with three digits.
    assert np.all(np.abs(ours / published - 0.989) < 0.0135)
    # Read as mmHg, as it is sometimes written, it would be off by more than a tenth at 50 degC.
    assert abs(ours[-1] / check.expected["sat_pressure_mmHg"][-1] - 1.0) > 0.1


@settings(deadline=None)
@given(air_c=st.floats(*HUMIDITY_RANGE_C))
def test_absolute_humidity_against_the_magnus_form(air_c: float) -> None:
    # WMO-No. 8 over water (6.112 hPa, 17.62, 243.12), as an ideal gas; the range documented.
    pressure = 611.2 * math.exp(17.62 * air_c / (243.12 + air_c))
    density = pressure * 18.015268 / (codata.R * (air_c + codata.zero_Celsius))
    assert float(absolute_humidity_g_m3(air_c, 1.0)) == pytest.approx(density, rel=0.03)


def test_no_distance_no_loss() -> None:
    assert air_transmittance(20.0, 0.5, 0.0) == 1.0
    assert air_transmittance(-40.0, 0.0, 0.0) == 1.0
    assert air_transmittance_u(20.0, 0.5, 0.0) == 0.0


@settings(deadline=None)
@given(
    air_c=st.floats(*HUMIDITY_RANGE_C),
    humidity=st.floats(0.0, 1.0),
    distance_m=st.floats(0.1, 500.0),
)
def test_transmittance_falls_with_distance_and_never_leaves_0_to_1(
    air_c: float, humidity: float, distance_m: float
) -> None:
    try:
        far = float(air_transmittance(air_c, humidity, distance_m * 1.1))
    except DomainError:
        assume(False)
        return
    near = float(air_transmittance(air_c, humidity, distance_m))
    assert 0.0 < far < near < 1.0


@settings(deadline=None)
@given(air_c=st.floats(10.0, 40.0), humidity=st.floats(0.1, 0.9), distance_m=st.floats(1.0, 200.0))
def test_more_vapour_less_transmittance(air_c: float, humidity: float, distance_m: float) -> None:
    # In dry cold air the formula has it the other way by a few 1e-4; above 1.3 g/m3, from
    # 10 degC and 0.1 on, it is as it should be.
    drier = float(air_transmittance(air_c, humidity, distance_m))
    damper = float(air_transmittance(air_c, humidity + 0.1, distance_m))
    assert damper < drier


def test_arrays_and_numbers_agree() -> None:
    distances = np.array([[0.0, 1.0, 10.0], [50.0, 100.0, 500.0]])
    image = np.asarray(air_transmittance(20.0, 0.5, distances))
    assert image.shape == distances.shape
    for index in np.ndindex(distances.shape):
        single = float(air_transmittance(20.0, 0.5, float(distances[index])))
        assert image[index] == pytest.approx(single, rel=1e-14)


# ---------------------------------------------------------------- LOWTRAN7


@pytest.mark.parametrize("point", lowtran(), ids=lambda point: f"{point[0]}, {point[3]:g} m")
def test_the_formula_lies_near_lowtran(point: Point) -> None:
    _, air_c, humidity, distance_m, expected = point
    tau = float(air_transmittance(air_c, humidity, distance_m))
    # LOWTRAN's transmittances are printed to 1e-4.
    assert abs(tau - expected) <= limit_at(distance_m) + 5e-5


@pytest.mark.parametrize("point", lowtran(), ids=lambda point: f"{point[0]}, {point[3]:g} m")
def test_the_uncertainty_of_the_formula_covers_lowtran(point: Point) -> None:
    _, air_c, humidity, distance_m, expected = point
    tau = float(air_transmittance(air_c, humidity, distance_m))
    assert abs(tau - expected) <= 2.0 * air_transmittance_u(air_c, humidity, distance_m)


def test_the_table_covers_what_is_claimed() -> None:
    distances: dict[str, set[float]] = defaultdict(set)
    for atmosphere, _, _, distance_m, _ in lowtran():
        distances[atmosphere].add(distance_m)
    assert len({name.replace("-", "").replace(" ", "").casefold() for name in distances}) >= 6
    assert {2.0, 1000.0} <= distances["tropical"]


def test_the_stated_relative_humidity_gives_nearly_the_stated_vapour() -> None:
    # Both stand in the table of the tests; they must describe one air.
    with LOWTRAN_FILE.open(encoding="utf-8", newline="") as file:
        for entry in csv.DictReader(file):
            ours = float(
                absolute_humidity_g_m3(float(entry["air_c"]), float(entry["relative_humidity"]))
            )
            assert ours == pytest.approx(float(entry["water_vapour_g_m3"]), rel=0.03)


def test_the_formula_reads_high_on_long_humid_paths() -> None:
    excess = [
        float(air_transmittance(air_c, humidity, distance_m)) - expected
        for atmosphere, air_c, humidity, distance_m, expected in lowtran()
        if atmosphere == "tropical" and distance_m > STRETCHED_BEYOND_M
    ]
    assert excess
    assert min(excess) > 0.025


# ---------------------------------------------------------------- uncertainty


@settings(deadline=None)
@given(
    air_c=st.floats(-30.0, 45.0),
    humidity=st.floats(0.0, 0.9),
    distance_m=st.floats(0.5, 2000.0),
)
def test_the_uncertainty_grows_with_distance_and_vapour(
    air_c: float, humidity: float, distance_m: float
) -> None:
    here = air_transmittance_u(air_c, humidity, distance_m)
    assert here > 0.0
    assert air_transmittance_u(air_c, humidity, distance_m * 1.2) > here
    assert air_transmittance_u(air_c, humidity + 0.1, distance_m) > here


def test_the_uncertainty_stays_sensible_at_short_range() -> None:
    # Common practice, no source: within a room the air is nearly nothing to worry about.
    assert air_transmittance_u(20.0, 0.5, 2.0) < 0.005
    assert air_transmittance_u(20.0, 0.5, 0.01) < 1e-4


# ---------------------------------------------------------------- slopes


@settings(deadline=None)
@given(
    air_c=st.floats(-30.0, 50.0), humidity=st.floats(0.02, 0.98), distance_m=st.floats(0.5, 300.0)
)
def test_slopes_are_the_central_differences(
    air_c: float, humidity: float, distance_m: float
) -> None:
    slopes = air_transmittance_slopes(air_c, humidity, distance_m)
    arguments = (air_c, humidity, distance_m)
    for index, step in enumerate((1e-3, 1e-5, 1e-4 * distance_m)):
        above, below = list(arguments), list(arguments)
        above[index] += step
        below[index] -= step
        try:
            rise = float(air_transmittance(*above)) - float(air_transmittance(*below))
        except DomainError:
            assume(False)
        assert slopes[index] == pytest.approx(rise / (2.0 * step), rel=1e-4, abs=1e-9)


def test_slopes_at_the_corners() -> None:
    assert air_transmittance_slopes(20.0, 0.5, 0.0) == (0.0, 0.0, 0.0)
    dry = air_transmittance_slopes(20.0, 0.0, 50.0)
    assert all(math.isfinite(slope) for slope in dry)
    assert dry[0] == 0.0  # without vapour the air temperature does not enter
    assert dry[2] < 0.0


# ---------------------------------------------------------------- refused


@pytest.mark.parametrize("which", range(7))
def test_refused_where_the_formula_turns_negative(which: int) -> None:
    check = row("f-limits")
    water = check.inputs["w_g_m3"][which]
    first_m = check.expected["first_d_with_tau<=0_m"][which]
    humidity = humidity_of(water, 50.0)
    assert 0.0 < float(air_transmittance(50.0, humidity, first_m * 0.99)) < 0.02
    with pytest.raises(DomainError, match="transmittance") as caught:
        air_transmittance(50.0, humidity, first_m * 1.01)
    assert "\n" not in str(caught.value)
    with pytest.raises(DomainError):  # one pixel too far is enough
        air_transmittance(50.0, humidity, np.array([1.0, first_m * 1.01]))


def test_dry_air_never_turns_negative() -> None:
    # Below w = 3.58 g/m3 both terms decay (from the coefficients: sqrt(w) = -a2/b2 = 1.892).
    humidity = humidity_of(3.4, 20.0)
    assert float(air_transmittance(20.0, humidity, 1e5)) > 0.0


@pytest.mark.parametrize(
    ("air_c", "humidity", "distance_m", "named"),
    [
        (-40.1, 0.5, 10.0, "air_c"),
        (60.1, 0.5, 10.0, "air_c"),
        (math.nan, 0.5, 10.0, "air_c"),
        (math.inf, 0.5, 10.0, "air_c"),
        (20.0, -0.01, 10.0, "humidity"),
        (20.0, 1.01, 10.0, "humidity"),
        (20.0, 50.0, 10.0, "humidity"),
        (20.0, math.nan, 10.0, "humidity"),
        (20.0, 0.5, -0.1, "distance_m"),
        (20.0, 0.5, math.nan, "distance_m"),
    ],
)
def test_out_of_range_is_refused_by_name(
    air_c: float, humidity: float, distance_m: float, named: str
) -> None:
    with pytest.raises(DomainError, match=named) as caught:
        air_transmittance(air_c, humidity, distance_m)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("air_c", HUMIDITY_RANGE_C)
def test_the_ends_of_the_range_are_in_it(air_c: float) -> None:
    assert 0.0 < float(air_transmittance(air_c, 0.0, 5.0)) < 1.0
    assert 0.0 < float(air_transmittance(air_c, 1.0, 5.0)) < 1.0
