"""Directional emissivity and the footprint of a pixel."""

import cmath
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad

from tests.published_checks import Row, row, rows
from thermo_fix.errors import DomainError
from thermo_fix.radiometry.surface import (
    DIELECTRIC_FROM,
    MEASURABLE_FOOTPRINTS,
    STEEP_VIEW_DEG,
    directional_factor,
    fresnel_emissivity,
    pixel_footprint_m,
    pixel_footprint_m2,
    refractive_index,
)


def by_angles(index: float, angle_deg: float) -> float:
    """Fresnel's laws in their sine and tangent form (Fresnel 1823; any optics textbook)."""
    outside = math.radians(angle_deg)
    inside = math.asin(math.sin(outside) / index)
    crossed = math.sin(outside - inside) / math.sin(outside + inside)
    parallel = math.tan(outside - inside) / math.tan(outside + inside)
    return 1.0 - (crossed**2 + parallel**2) / 2.0


def by_admittance(index: complex, angle_deg: float) -> float:
    """The same from the tilted admittances of a complex index, as for thin films."""
    cosine = math.cos(math.radians(angle_deg))
    inside = cmath.sqrt(1.0 - (math.sin(math.radians(angle_deg)) / index) ** 2)
    crossed = (cosine - index * inside) / (cosine + index * inside)
    parallel = (1.0 / cosine - index / inside) / (1.0 / cosine + index / inside)
    return 1.0 - (abs(crossed) ** 2 + abs(parallel) ** 2) / 2.0


# ---------------------------------------------------------------- Fresnel


@settings(deadline=None)
@given(index=st.floats(1.01, 5.0), angle_deg=st.floats(0.1, 89.5))
def test_fresnel_against_two_other_forms(index: float, angle_deg: float) -> None:
    ours = fresnel_emissivity(index, angle_deg)
    assert ours == pytest.approx(by_angles(index, angle_deg), abs=1e-9)
    assert ours == pytest.approx(by_admittance(complex(index), angle_deg), abs=1e-9)


@pytest.mark.parametrize(("index", "reflectance"), [(1.5, 0.04), (2.0, 1.0 / 9.0), (3.0, 0.25)])
def test_normal_incidence(index: float, reflectance: float) -> None:
    # ((n - 1)/(n + 1))^2, by hand; 4 % for glass is in every optics textbook.
    assert fresnel_emissivity(index, 0.0) == pytest.approx(1.0 - reflectance, rel=1e-12)


@pytest.mark.parametrize("index", [1.2, 1.5, 2.5])
def test_brewster_angle(index: float) -> None:
    # At tan(angle) = n no parallel-polarised light is reflected, and r_s = (1 - n^2)/(1 + n^2).
    brewster = math.degrees(math.atan(index))
    expected = 1.0 - ((1.0 - index**2) / (1.0 + index**2)) ** 2 / 2.0
    assert fresnel_emissivity(index, brewster) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("index", [1.2, 1.5, 3.0])
def test_at_grazing_view_nothing_is_emitted(index: float) -> None:
    values = [fresnel_emissivity(index, angle) for angle in (80.0, 89.0, 89.9, 89.99, 89.9999)]
    assert values == sorted(values, reverse=True)
    assert values[-1] < 1e-4


def test_hemispherical_emissivity_of_glass() -> None:
    # Diffuse reflectance of n = 1.5 from outside: 0.092 (Walsh 1926, from memory).
    def weighted(angle: float) -> float:
        return fresnel_emissivity(1.5, math.degrees(angle)) * math.sin(2.0 * angle)

    assert quad(weighted, 0.0, math.pi / 2 - 1e-9)[0] == pytest.approx(1.0 - 0.092, abs=1e-3)


def test_nothing_is_reflected_where_nothing_changes() -> None:
    for angle in (0.0, 45.0, 89.0):
        assert fresnel_emissivity(1.0, angle) == pytest.approx(1.0, abs=1e-12)


@given(emissivity=st.floats(1e-3, 1.0))
def test_index_and_normal_emissivity_round_trip(emissivity: float) -> None:
    assert fresnel_emissivity(refractive_index(emissivity), 0.0) == pytest.approx(
        emissivity, rel=1e-9
    )


# ---------------------------------------------------------------- directional factor


@pytest.mark.parametrize("emissivity", [0.7, 0.8, 0.9, 0.95, 0.99])
def test_the_factor_is_one_at_the_normal_and_falls(emissivity: float) -> None:
    assert directional_factor(emissivity, 0.0) == 1.0
    angles = (0.0, 30.0, 45.0, STEEP_VIEW_DEG, 70.0, 80.0, 89.0)
    factors = [directional_factor(emissivity, angle) for angle in angles]
    assert all(0.0 < factor <= 1.0 + 1e-12 for factor in factors)
    # Flat to within 1.5 % up to 45 degrees, steep beyond 60: why a caution is printed there.
    assert min(factors[:3]) > 0.985
    assert factors[3:] == sorted(factors[3:], reverse=True)
    assert factors[-1] < 0.35


def test_the_factor_scales_a_measured_emissivity() -> None:
    expected = by_angles(refractive_index(0.93), 70.0) / 0.93
    assert directional_factor(0.93, 70.0) == pytest.approx(expected, rel=1e-9)


def test_a_blackbody_looks_the_same_from_everywhere() -> None:
    assert directional_factor(1.0, 75.0) == pytest.approx(1.0, abs=1e-12)


def test_a_metal_is_left_alone() -> None:
    # Fresnel's law for dielectrics says nothing about a metal, on either side of the limit.
    assert directional_factor(DIELECTRIC_FROM - 0.01, 75.0) == 1.0
    assert directional_factor(DIELECTRIC_FROM, 75.0) < 1.0


# ---------------------------------------------------------------- footprint


@pytest.mark.parametrize("check", rows("i-ifov_"), ids=str)
def test_footprint_rows(check: Row) -> None:
    ifov, distance = check.expected["IFOV_mrad"], float(check.inputs["D_m"])
    side = pixel_footprint_m(ifov, distance)
    assert side * 1e3 == pytest.approx(check.expected["pixel_mm"], rel=1e-3)
    spot = MEASURABLE_FOOTPRINTS * side
    assert spot * 1e3 == pytest.approx(check.expected["spot3_mm"], rel=1e-3)
    assert distance / spot == pytest.approx(check.expected["distance_to_spot"], rel=1e-3)
    # The small angle: 2 atan(pitch / 2 focal length).
    exact = 2e3 * math.atan(check.inputs["pitch_um"] * 1e-3 / check.inputs["focal_mm"] / 2.0)
    assert ifov == pytest.approx(exact, rel=1e-4)


def test_footprint_area() -> None:
    check = row("i-ifov_17_25_10")
    ifov, distance = check.expected["IFOV_mrad"], float(check.inputs["D_m"])
    side_m = check.expected["pixel_mm"] * 1e-3
    assert pixel_footprint_m2(ifov, distance) == pytest.approx(side_m**2, rel=2e-3)
    # At 60 degrees one footprint is twice as long along the tilt: 1/cos, by hand.
    tilted = pixel_footprint_m2(ifov, distance, 60.0)
    assert tilted == pytest.approx(2.0 * pixel_footprint_m2(ifov, distance), rel=1e-12)
    assert pixel_footprint_m2(ifov, 2.0 * distance) == pytest.approx(
        4.0 * pixel_footprint_m2(ifov, distance), rel=1e-12
    )


# ---------------------------------------------------------------- refused


@pytest.mark.parametrize("emissivity", [0.0, -0.1, 1.01, math.nan])
def test_an_impossible_emissivity_is_refused(emissivity: float) -> None:
    with pytest.raises(DomainError, match="emissivity"):
        refractive_index(emissivity)


@pytest.mark.parametrize(
    ("index", "angle_deg"),
    [(0.9, 10.0), (math.nan, 10.0), (1.5, -1.0), (1.5, 90.0), (1.5, math.nan)],
)
def test_an_impossible_view_is_refused(index: float, angle_deg: float) -> None:
    with pytest.raises(DomainError, match="angle"):
        fresnel_emissivity(index, angle_deg)


@pytest.mark.parametrize(
    ("ifov", "distance", "angle_deg"),
    [
        (0.0, 5.0, 0.0),
        (-1.0, 5.0, 0.0),
        (1.0, 0.0, 0.0),
        (1.0, -5.0, 0.0),
        (1.0, 5.0, 90.0),
        (1.0, 5.0, -1.0),
        (math.nan, 5.0, 0.0),
        (1.0, math.nan, 0.0),
    ],
)
def test_an_impossible_footprint_is_refused(ifov: float, distance: float, angle_deg: float) -> None:
    with pytest.raises(DomainError, match="footprint"):
        pixel_footprint_m2(ifov, distance, angle_deg)
