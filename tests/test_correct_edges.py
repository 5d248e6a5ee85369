"""The correct stage at its edges: planes that do not fit, zones without pixels, ends of the range.

Expected numbers are arithmetic on the test's own inputs unless a comment names a source.
"""

import json
from pathlib import Path
from typing import Any

import cv2
import numpy as np
import pytest
from numpy.typing import NDArray

from tests.survey_folders import SHAPE, picture, write_image
from thermo_fix import run_survey
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct import kernel
from thermo_fix.correct.quality import range_ends_k
from thermo_fix.correct.reference_zone import foil_reading, inner_part
from thermo_fix.errors import ImageError
from thermo_fix.radiometry.blackbody import TotalModel, band_model
from thermo_fix.radiometry.path import OpticalPath
from thermo_fix.read import reading_k
from thermo_fix.records import (
    Camera,
    Encoding,
    Frame,
    ImageResult,
    RangeEnds,
)
from thermo_fix.results import read_plane
from thermo_fix.survey import RunOptions
from thermo_fix.uncertainty.equation import MeasurementEquation
from thermo_fix.uncertainty.variables import Variable

OPTIONS = RunOptions(jobs=1, pictures=False)
HEAD = """\
[camera]
pixel = "celsius"
recorded = { emissivity = 1.0, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }
[scene]
emissivity = 0.9
reflected_c = 20.0
air_c = 20.0
distance_m = 0.0
humidity = 0.5
view_angle_deg = 0.0
"""
IMAGE = '[[image]]\nfile = "a.tif"\n'


def run_one(folder: Path, more: str, image: NDArray[Any] | None = None) -> ImageResult:
    write_image(folder / "a.tif", picture() if image is None else image)
    (folder / "survey.toml").write_text(HEAD + more, encoding="utf-8")
    (result,) = run_survey(folder, options=OPTIONS).images
    return result


def zone(corners: list[list[int]], more: str = "") -> str:
    return f'[[image.zone]]\nname = "z"\npolygon = {corners}\n{more}'


# ---- planes of the sheet -----------------------------------------------------------------------


@pytest.mark.parametrize("wrong", [0.0, -0.1, 1.01, np.nan])
def test_an_emissivity_file_must_hold_emissivities(tmp_path: Path, wrong: float) -> None:
    plane = np.full(SHAPE, 0.9, np.float32)
    plane[3, 4] = wrong
    write_image(tmp_path / "eps.tif", plane)
    result = run_one(tmp_path, IMAGE + 'emissivity = { file = "eps.tif" }\n')
    assert result.status == "failed"
    assert result.error is not None
    assert "above 0 and at most 1" in result.error


@pytest.mark.parametrize("key", ["emissivity", "reflected_c"])
def test_a_plane_must_have_the_shape_of_its_image(tmp_path: Path, key: str) -> None:
    write_image(tmp_path / "plane.tif", np.full((60, 79), 0.9, np.float32))
    result = run_one(tmp_path, IMAGE + f'{key} = {{ file = "plane.tif" }}\n')
    assert result.status == "failed"
    assert result.error is not None
    assert "plane.tif" in result.error
    assert "79 x 60" in result.error
    assert "80 x 60" in result.error


def test_planes_of_a_zone_hold_in_the_zone_alone(tmp_path: Path) -> None:
    write_image(tmp_path / "eps.tif", np.full(SHAPE, 0.5, np.float32))
    level = np.full(SHAPE, 30.0, np.float32)
    corners = [[10, 10], [30, 10], [30, 40], [10, 40]]
    run_one(tmp_path, IMAGE + zone(corners, 'emissivity = { file = "eps.tif" }\n'), level)
    corrected = read_plane(tmp_path / "results" / "corrected" / "a.tif")

    def surface_c(emissivity: float) -> float:
        # Stefan-Boltzmann, reflected 20 degC, no air: T^4 = (M - (1 - eps) Mr) / eps.
        seen, reflected = 303.15**4, 293.15**4
        power: float = ((seen - (1.0 - emissivity) * reflected) / emissivity) ** 0.25
        return power - 273.15

    assert corrected[20, 20] == pytest.approx(surface_c(0.5), abs=0.005)
    assert corrected[50, 60] == pytest.approx(surface_c(0.9), abs=0.005)


def test_a_zone_under_another_one_takes_no_pixel(tmp_path: Path) -> None:
    corners = [[10, 10], [30, 10], [30, 40], [10, 40]]
    first = zone(corners, "emissivity = 0.5\n")
    second = zone(corners, "emissivity = 0.7\n").replace('"z"', '"y"')
    result = run_one(tmp_path, IMAGE + first + second, np.full(SHAPE, 30.0, np.float32))
    assert result.status == "done"
    corrected = read_plane(tmp_path / "results" / "corrected" / "a.tif")
    power = (303.15**4 - 0.3 * 293.15**4) / 0.7
    assert corrected[20, 20] == pytest.approx(power**0.25 - 273.15, abs=0.005)
    assert any("z" in note.split('"') or "zone z" in note for note in result.notes)


# ---- many pixels -------------------------------------------------------------------------------


def equation(emissivity: float = 0.9) -> MeasurementEquation:
    values = {"emissivity": emissivity, "reflected_c": 20.0, "air_c": 20.0, "transmittance": 1.0}
    return MeasurementEquation(
        model=TotalModel(),
        recorded=OpticalPath(emissivity=1.0, reflected_k=293.15, air_k=293.15, transmittance=1.0),
        variables={key: Variable(key, value, 0.01) for key, value in values.items()},
    )


def test_no_pixels_and_no_readings() -> None:
    for plane in kernel.planes_of(np.empty((0, 5), np.float32), equation()):
        assert plane.shape == (0, 5)
    for plane in kernel.planes_of(np.full((4, 5), np.nan, np.float32), equation()):
        assert plane.shape == (4, 5)
        assert np.isnan(plane).all()


def test_without_the_library_that_looks_up_the_result_is_the_same(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    readings = (picture(20.0, 15.0) + ZERO_CELSIUS_K).astype(np.float32)
    usual = kernel.planes_of(readings, equation())
    monkeypatch.setattr(kernel, "_CV2_LOOKS_UP_16_BIT", False)
    for ours, theirs in zip(kernel.planes_of(readings, equation()), usual, strict=True):
        np.testing.assert_array_equal(ours, theirs)


def test_an_older_library_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object) -> None:
        raise cv2.error("unsupported index")

    monkeypatch.setattr(cv2, "LUT", refuse)
    assert kernel._cv2_looks_up_16_bit() is False


# ---- reference zones ---------------------------------------------------------------------------


def test_a_zone_too_small_for_an_inset_is_taken_whole() -> None:
    small = np.zeros((20, 20), bool)
    small[5:10, 5:10] = True
    np.testing.assert_array_equal(inner_part(small), small)
    # One pixel of inset leaves 5 x 5 of 7 x 7, as many as are asked for.
    larger = np.zeros((20, 20), bool)
    larger[5:12, 5:12] = True
    assert np.count_nonzero(inner_part(larger)) == 25


def test_a_foil_beyond_the_tables_is_refused() -> None:
    # The band model is tabulated to 1700 degC.
    readings = np.full((20, 20), 2100.0, np.float32)
    with pytest.raises(ImageError, match="no apparent temperature under the recorded"):
        foil_reading(readings, np.ones((20, 20), bool), "foil", "a.tif", Camera(), band_model())


# ---- ends of the range -------------------------------------------------------------------------


def ends_of(values: NDArray[Any], left_out: NDArray[np.bool_] | None = None) -> RangeEnds:
    whole = np.issubdtype(values.dtype, np.integer)
    encoding = (
        Encoding("linear", 0.01, 0.0, "given") if whole else Encoding("celsius", 1.0, 0.0, "given")
    )
    frame = Frame(Path("a.tif"), values, encoding, "0" * 64)
    return range_ends_k(frame, reading_k(frame), left_out)


def test_noise_has_no_ends() -> None:
    assert ends_of(picture()) == RangeEnds()


def test_nothing_and_a_level_scene_have_no_ends() -> None:
    assert ends_of(np.full(SHAPE, np.nan, np.float32)) == RangeEnds()
    assert ends_of(np.full(SHAPE, 20.0, np.float32)) == RangeEnds()


def test_both_ends_are_counted() -> None:
    image = picture(20.0, 0.0)
    image[0:5, 0:5] = 60.0
    image[10:13, 0:3] = -20.0
    found = ends_of(image)
    assert (found.greatest_px, found.least_px) == (25, 9)
    assert found.greatest_k == pytest.approx(333.15, abs=1e-4)
    assert found.least_k == pytest.approx(253.15, abs=1e-4)


@pytest.mark.parametrize(("pixels", "piled"), [(8, False), (9, True)])
def test_fewer_than_a_block_are_no_pile(pixels: int, piled: bool) -> None:
    image = picture(20.0, 0.0)
    image[0, :pixels] = 60.0
    assert (ends_of(image).greatest_k is not None) is piled


@pytest.mark.parametrize(("below", "piled"), [(4, False), (3, True)])
def test_a_tail_that_thins_out_is_no_pile(below: int, piled: bool) -> None:
    # 16 pixels at the greatest: a pile if more than four times those at the next one.
    image = picture(20.0, 0.0)
    image[0, :16] = 60.0
    image[1, :below] = 59.0
    assert (ends_of(image).greatest_k is not None) is piled


def test_whole_numbers_end_with_their_type() -> None:
    counts = np.full(SHAPE, 29_315, np.uint16) + np.arange(80, dtype=np.uint16)
    assert ends_of(counts) == RangeEnds()
    counts[5, 6] = 65_535
    found = ends_of(counts)
    assert found.greatest_px == 1
    # 65535 x 0.01 K.
    assert found.greatest_k == pytest.approx(655.35, abs=1e-4)


def test_what_the_sheet_leaves_out_does_not_count(tmp_path: Path) -> None:
    counts = np.full(SHAPE, 29_315, np.uint16) + np.arange(80, dtype=np.uint16)
    counts[5, 6] = 65_535
    left_out = np.zeros(SHAPE, bool)
    left_out[0:10, 0:10] = True
    assert ends_of(counts, left_out) == RangeEnds()
    corners = [[0, 0], [10, 0], [10, 10], [0, 10]]
    sheet = IMAGE + zone(corners, "ignore = true\n")
    image = picture(20.0, 0.0)
    image[2:8, 2:8] = 60.0
    run_one(tmp_path, sheet, image)
    content = json.loads((tmp_path / "results" / "findings.json").read_text("utf-8"))
    assert not any("greatest reading" in text for text in content["images"][0]["cautions"])


def test_inferred_counts_are_named_with_their_scale(tmp_path: Path) -> None:
    counts = (7_329 + np.random.default_rng(1).normal(0, 5, SHAPE)).astype(np.uint16)
    write_image(tmp_path / "a.tif", counts)
    (tmp_path / "survey.toml").write_text(HEAD.replace('pixel = "celsius"\n', ""), encoding="utf-8")
    (image,) = run_survey(tmp_path, options=OPTIONS).images
    # 0.04 K x 7329 = 293.16 K; 0.01 would give 73 K.
    assert any("read as kelvin = 0.04 x count" in text for text in image.cautions)
