"""Limits of zones that have no finding: what is checked, what is said where it cannot be.

The camera had applied the true settings, so that a reading is the surface temperature. Expected
numbers are arithmetic on the test's own inputs.
"""

from pathlib import Path

import numpy as np
import pytest

from tests.survey_folders import picture, write_image
from thermo_fix import run_survey
from thermo_fix.records import Assessment, ImageResult
from thermo_fix.survey import RunOptions

HEAD = """\
[survey]
purpose = "electrical"
[camera]
pixel = "celsius"
noise_k = 0.05
accuracy_k = 0.5
accuracy_fraction = 0.0
recorded = { emissivity = 0.95, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }
[radiation]
model = "band"
[scene]
emissivity = { value = 0.95, u = 0.01 }
reflected_c = { value = 20.0, u = 0.5 }
transmittance = { value = 1.0, u = 0.001 }
view_angle_deg = 0.0
"""
AIR = "air_c = { value = 20.0, u = 0.2 }\n"
BOX = (20, 10, 50, 50)
POLYGON = "polygon = [[20, 10], [50, 10], [50, 50], [20, 50]]\n"
RISE_K = 70.0
RISE = 'limit = "terminal for external conductors, rise 70 K"\n'


def run_zone(folder: Path, zone: str, scene: str = AIR, level_c: float = 60.0) -> ImageResult:
    image = picture(25.0, 0.0)
    x0, y0, x1, y1 = BOX
    image[y0:y1, x0:x1] += level_c - 25.0
    write_image(folder / "a.tif", image)
    sheet = HEAD + scene + '[[image]]\nfile = "a.tif"\n[[image.zone]]\nname = "busbar"\n'
    (folder / "survey.toml").write_text(sheet + POLYGON + zone, encoding="utf-8")
    (result,) = run_survey(folder, options=RunOptions(jobs=1, pictures=False, planes=False)).images
    assert result.status == "done", result.error
    assert result.findings == ()
    return result


def limit_of(result: ImageResult) -> Assessment:
    (found,) = [each for each in result.assessments if each.kind == "limit"]
    return found


def margins(assessment: Assessment) -> dict[str, float]:
    return {
        each.label.removeprefix("busbar: margin "): each.value
        for each in assessment.figures
        if each.value is not None
    }


def test_a_zone_within_its_limit(tmp_path: Path) -> None:
    found = limit_of(run_zone(tmp_path, "limit = 70\n"))
    assert found.statement == "The zones without a finding are within their limits."
    assert margins(found) == {"as measured": pytest.approx(10.0, abs=0.3)}


def test_a_zone_above_its_limit_of_which_no_difference_tells(tmp_path: Path) -> None:
    found = limit_of(run_zone(tmp_path, "limit = 55\n"))
    assert "busbar is above the limit of 55 degC as measured (more than 99% likely)" in (
        found.statement
    )


def test_full_load_and_design_ambient(tmp_path: Path) -> None:
    zone = "limit = 70\nload_a = 50\nrated_a = 100\ndesign_air_c = 35\nload_exponent = 1.6\n"
    found = limit_of(run_zone(tmp_path, zone))
    # dT2 = dT1 (I2/I1)^n: 40 K at half load are 40 x 2^1.6 = 121.3 K at the rated one.
    full = 40.0 * 2.0**1.6
    assert margins(found) == {
        "as measured": pytest.approx(10.0, abs=0.3),
        "full load": pytest.approx(70.0 - (20.0 + full), abs=1.0),
        "design ambient": pytest.approx(70.0 - (35.0 + 40.0), abs=0.3),
        "full load at design ambient": pytest.approx(70.0 - (35.0 + full), abs=1.0),
    }
    assert "above the limit of 70 degC at full load" in found.statement


def test_without_the_air_only_the_measured_temperature_is_judged(tmp_path: Path) -> None:
    zone = "limit = 70\nload_a = 50\nrated_a = 100\ndesign_air_c = 35\n"
    found = limit_of(run_zone(tmp_path, zone, scene=""))
    assert set(margins(found)) == {"as measured"}


def test_no_current_tells_nothing_of_full_load(tmp_path: Path) -> None:
    found = limit_of(run_zone(tmp_path, "limit = 70\nload_a = 0\nrated_a = 100\n"))
    assert set(margins(found)) == {"as measured"}


def test_a_limit_of_rise_without_the_air_is_not_checked(tmp_path: Path) -> None:
    found = limit_of(run_zone(tmp_path, RISE, scene=""))
    assert found.statement == (
        "busbar is not checked (its limit is a rise, and air_c is not told)."
    )
    assert found.figures == ()


def test_a_limit_of_rise_is_that_of_the_air_and_no_design_ambient_moves_it(
    tmp_path: Path,
) -> None:
    found = limit_of(run_zone(tmp_path, RISE + "design_air_c = 35\n"))
    assert set(margins(found)) == {"as measured"}
    number = margins(found)["as measured"] + 60.0
    # Limit = air + rise.
    assert number - 20.0 == pytest.approx(RISE_K, abs=0.3)


@pytest.mark.parametrize("left_out", ["ignore = true\n", 'role = "tape"\n'])
def test_a_zone_that_is_no_target_has_no_limit(tmp_path: Path, left_out: str) -> None:
    result = run_zone(tmp_path, "limit = 55\n" + left_out)
    assert [each for each in result.assessments if each.kind == "limit"] == []


def test_a_zone_narrower_than_three_pixels_is_measured_too(tmp_path: Path) -> None:
    image = picture(25.0, 0.0)
    image[10:50, 19:24] += 35.0
    write_image(tmp_path / "a.tif", image)
    narrow = "polygon = [[20, 10], [22, 10], [22, 50], [20, 50]]\n"
    sheet = HEAD + AIR + '[[image]]\nfile = "a.tif"\n[[image.zone]]\nname = "busbar"\n'
    (tmp_path / "survey.toml").write_text(sheet + narrow + "limit = 70\n", encoding="utf-8")
    (result,) = run_survey(
        tmp_path, options=RunOptions(jobs=1, pictures=False, planes=False)
    ).images
    assert margins(limit_of(result)) == {"as measured": pytest.approx(10.0, abs=0.3)}


def test_a_zone_without_readings_is_not_measured(tmp_path: Path) -> None:
    image = picture(25.0, 0.0)
    image[10:50, 20:50] = np.nan
    write_image(tmp_path / "a.tif", image)
    sheet = HEAD + AIR + '[[image]]\nfile = "a.tif"\n[[image.zone]]\nname = "busbar"\n'
    (tmp_path / "survey.toml").write_text(sheet + POLYGON + "limit = 70\n", encoding="utf-8")
    (result,) = run_survey(
        tmp_path, options=RunOptions(jobs=1, pictures=False, planes=False)
    ).images
    assert limit_of(result).statement == "busbar is not checked (it has no surface temperature)."
