"""The measure stage at its edges: what a trade says where little is told or little can be measured.

The camera had applied the true settings, so that a reading is the surface temperature. Expected
numbers are arithmetic on the test's own inputs.
"""

from collections.abc import Mapping
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.survey_folders import write_image
from thermo_fix import run_survey
from thermo_fix.measure.shape import describe
from thermo_fix.records import Assessment, Finding, ImageResult
from thermo_fix.survey import RunOptions

CAMERA = """\
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
SHAPE = (80, 150)
BOXES = {"A": (20, 15, 40, 65), "B": (65, 15, 85, 65), "C": (110, 15, 130, 65)}


def scene(levels: Mapping[str, float], around_c: float = 21.0) -> NDArray[np.float32]:
    image = around_c + np.random.default_rng(1).normal(0.0, 0.05, SHAPE)
    for name, level in levels.items():
        x0, y0, x1, y1 = BOXES[name]
        image[y0:y1, x0:x1] += level - around_c
    return image.astype(np.float32)


def with_spot(image: NDArray[np.float32], name: str, by_k: float) -> NDArray[np.float32]:
    """The middle of a zone, 10 x 16 pixels, is warmer or colder."""
    x0, y0, _, _ = BOXES[name]
    image[y0 + 17 : y0 + 33, x0 + 5 : x0 + 15] += by_k
    return image


def zone(name: str, more: str = "", like: str = "poles") -> str:
    x0, y0, x1, y1 = BOXES[name]
    corners = f"[[{x0}, {y0}], [{x1}, {y0}], [{x1}, {y1}], [{x0}, {y1}]]"
    word = f'like = "{like}"\n' if like else ""
    return f'[[image.zone]]\nname = "{name}"\npolygon = {corners}\n{word}{more}\n'


def run(
    folder: Path, image: NDArray[np.float32], *zones: str, head: str = AIR, purpose: str
) -> ImageResult:
    write_image(folder / "a.tif", image)
    sheet = f'[survey]\npurpose = "{purpose}"\n{CAMERA}{head}[[image]]\nfile = "a.tif"\n'
    (folder / "survey.toml").write_text(sheet + "".join(zones), encoding="utf-8")
    (result,) = run_survey(folder, options=RunOptions(jobs=1, pictures=False, planes=False)).images
    assert result.status == "done", result.error
    return result


def only(result: ImageResult) -> Finding:
    (finding,) = result.findings
    return finding


def of_kind(said: Finding | ImageResult, kind: str) -> Assessment:
    (found,) = [each for each in said.assessments if each.kind == kind]
    return found


# ---- load --------------------------------------------------------------------------------------


def test_a_cold_part_without_current_is_as_expected(tmp_path: Path) -> None:
    zones = (zone("A", "load_a = 0\nrated_a = 100", like=""),)
    image = with_spot(scene({"A": 25.0}), "A", -4.0)
    finding = only(run(tmp_path, image, *zones, purpose="electrical"))
    assert finding.sense == "cold"
    assert "as cold as what surrounds it" in of_kind(finding, "load").statement
    assert not any("no current" in text for text in finding.cautions)


def test_a_cold_finding_is_not_brought_to_full_load(tmp_path: Path) -> None:
    zones = (zone("A", "load_a = 50\nrated_a = 100", like=""),)
    image = with_spot(scene({"A": 25.0}), "A", -4.0)
    finding = only(run(tmp_path, image, *zones, purpose="electrical"))
    assert of_kind(finding, "load").statement == "The load was 50 A, 50% of the rated 100 A."
    assert {each.scenario for each in finding.gradings} <= {""}


def test_a_part_that_its_greater_current_more_than_explains(tmp_path: Path) -> None:
    # 8 K over the air at 100 A are 8 x 0.5^1.75 = 2.4 K at 50 A, less than the 4 K of its like.
    zones = (
        zone("A", "load_a = { value = 100, u = 1 }\nrated_a = 200"),
        zone("B", "load_a = { value = 50, u = 0.5 }\nrated_a = 200"),
    )
    image = scene({"A": 28.0, "B": 24.0})
    finding = only(run(tmp_path, image, *zones, purpose="electrical"))
    assert (finding.zone, finding.sense) == ("A", "hot")
    assert "on the other side of its like" in of_kind(finding, "load").statement


def test_without_a_like_the_load_speaks_of_the_difference_to_the_surroundings(
    tmp_path: Path,
) -> None:
    zones = (zone("A", "load_a = 50\nrated_a = 100", like=""),)
    image = with_spot(scene({"A": 25.0}), "A", 5.0)
    finding = only(run(tmp_path, image, *zones, purpose="electrical"))
    statement = of_kind(finding, "load").statement
    assert "At full load (100 A) the difference would be" in statement
    assert "like component" not in statement


# ---- wind, groups ------------------------------------------------------------------------------


def test_wind_without_the_air_corrects_the_difference_alone(tmp_path: Path) -> None:
    head = "outdoors = true\nwind_m_s = { value = 3.0, u = 0.3 }\n"
    image = with_spot(scene({"A": 25.0}), "A", 5.0)
    finding = only(run(tmp_path, image, zone("A", like=""), head=head, purpose="electrical"))
    statement = of_kind(finding, "wind").statement
    assert "the difference would be" in statement
    assert "rise over the air" not in statement


def test_a_group_of_which_one_can_be_measured_is_none(tmp_path: Path) -> None:
    image = with_spot(scene({"A": 25.0, "B": 25.0}), "A", 5.0)
    x0, y0, x1, y1 = BOXES["B"]
    image[y0:y1, x0:x1] = np.nan
    result = run(tmp_path, image, zone("A"), zone("B"), purpose="electrical")
    finding = only(result)
    assert finding.reference_kind == "surroundings"
    assert [each for each in result.assessments if each.kind == "phases"] == []
    assert [each for each in finding.assessments if each.kind == "phases"] == []


# ---- building ----------------------------------------------------------------------------------

WALL = AIR + 'side = "inside"\nindoor_c = 20.0\noutdoor_c = -5.0\nhumidity = 0.5\n'


def test_no_reading_no_main_surface(tmp_path: Path) -> None:
    # All but the zone is blank.
    image = np.full(SHAPE, np.nan, np.float32)
    x0, y0, x1, y1 = BOXES["A"]
    image[y0:y1, x0:x1] = scene({})[y0:y1, x0:x1]
    result = run(tmp_path, image, zone("A", like=""), head=WALL, purpose="building")
    assert result.assessments == ()


def test_findings_that_leave_too_little_are_not_cut_out_of_the_main_surface(
    tmp_path: Path,
) -> None:
    # The box of the finding is all of a small image: 60 pixels or so of wall cannot be left.
    image = (18.0 + np.random.default_rng(1).normal(0.0, 0.05, (30, 30))).astype(np.float32)
    rows, columns = np.mgrid[:30, :30]
    image[np.abs(rows - columns) < 3] -= 5.0
    result = run(tmp_path, image, head=WALL, purpose="building")
    assert result.findings
    flow = of_kind(result, "heat flow")
    assert "U-value" in flow.statement


def test_moisture_of_a_place_too_cold_for_the_formula(tmp_path: Path) -> None:
    # The saturation pressure is used from -60 degC; a cold store's wall may be below.
    image = scene({}, around_c=-55.0)
    image[20:50, 40:80] -= 15.0
    result = run(tmp_path, image, head=WALL, purpose="building")
    finding = only(result)
    statement = of_kind(finding, "moisture").statement
    assert "humidity at the surface is" not in statement
    # The dew point needs no saturation at the surface.
    graded = {each.criterion: each for each in finding.gradings}
    assert any("-60" in key for key in graded["surface-humidity"].missing)


# ---- shapes that cannot be described -----------------------------------------------------------


def height(mask: NDArray[np.bool_], by_k: float) -> NDArray[np.float32]:
    return np.where(mask, 20.0 + by_k, 20.0).astype(np.float32)


EVERYWHERE = np.ones((60, 60), bool)


def box(rows: slice, columns: slice) -> NDArray[np.bool_]:
    mask = np.zeros((60, 60), bool)
    mask[rows, columns] = True
    return mask


@pytest.mark.parametrize(
    ("mask", "by_k", "sign"),
    [
        (box(np.s_[20:24], np.s_[20:24]), 5.0, 1.0),  # too small
        (box(np.s_[20:22], np.s_[5:55]), 5.0, 1.0),  # too narrow
        (box(np.s_[20:40], np.s_[20:40]), 5.0, -1.0),  # of the other sense
    ],
)
def test_no_shape(mask: NDArray[np.bool_], by_k: float, sign: float) -> None:
    assert describe(height(mask, by_k), EVERYWHERE, mask, sign) is None


def test_a_shape_of_which_nothing_is_seen_around_is_not_described() -> None:
    mask = box(np.s_[20:40], np.s_[20:40])
    assert describe(height(mask, 5.0), mask, mask, 1.0) is None


def test_a_shape_does_not_depend_on_sense_and_size() -> None:
    mask = box(np.s_[20:40], np.s_[15:45])
    hot = describe(height(mask, 5.0), EVERYWHERE, mask, 1.0)
    cold = describe(height(mask, -10.0), EVERYWHERE, mask, -1.0)
    assert hot is not None
    assert cold is not None
    assert hot.elongation == pytest.approx(1.5, abs=0.1)
    assert hot.rectangularity == pytest.approx(1.0, abs=0.06)
    assert cold.elongation == pytest.approx(hot.elongation, rel=1e-3)
    assert cold.edge_width == pytest.approx(hot.edge_width, rel=1e-3)
