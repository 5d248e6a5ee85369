"""The survey sheet: what it accepts, what it refuses and in which words, what it resolves to.

Unless a comment says otherwise, expected numbers are those written in the sheet of the test, and
default values are those of ``docs/survey_sheet.md`` (common practice, no source).
"""

import math
import re
from datetime import date, datetime
from pathlib import Path

import pytest

from tests.sheets import EXAMPLE, IMAGE, SQUARE, ZONE, load, refused
from thermo_fix.defaults import all_defaults, default_for, default_value
from thermo_fix.radiometry.surroundings import REFLECTED_U_K
from thermo_fix.records import Camera, DetectSettings, Recorded, SkyAndGround
from thermo_fix.sheet import SHEET_NAME, load_survey
from thermo_fix.sheet.lines import KeyPath
from thermo_fix.sheet.schema import IMAGE_KEYS, TABLES, TOP_KEYS, ZoneTable, known_keys
from thermo_fix.surfaces import find_surface

DATA = Path(__file__).parent / "data"
DOCS = Path(__file__).parents[1] / "docs"

# ---------------------------------------------------------------- what is accepted


def test_documented_example_loads(tmp_path: Path) -> None:
    (tmp_path / "VIS_0007.jpg").touch()
    survey = load(tmp_path, EXAMPLE, criteria=["iso13788-surface-factor"])
    assert survey.title == "Quayside mill, north elevation"
    assert (survey.purpose, survey.model, survey.temperature_unit) == (
        "building",
        "total",
        "celsius",
    )
    assert survey.date == date(2026, 1, 14)
    assert survey.criteria == ("iso13788-surface-factor",)
    assert survey.camera == Camera(
        pixel="celsius",
        band_um=(8.0, 14.0),
        ifov_mrad=1.3,
        noise_k=0.05,
        noise_origin="given",
        accuracy_origin="given",
        nonuniformity_k=0.1,
        recorded=Recorded(origin="given"),
    )
    # Scale and offset belong to linear pixels alone; the sheet says so, and so does the note.
    assert any("scale and offset are not used" in note for note in survey.notes)
    (image,) = survey.images
    assert image.file == "IR_0007.tif"
    assert image.path == tmp_path / "IR_0007.tif"
    assert image.photo == tmp_path / "VIS_0007.jpg"
    assert image.taken == datetime(2026, 1, 14, 7, 12)
    assert image.inputs.surface == "brick, red"
    (zone,) = image.zones
    assert zone.polygon == ((120.0, 80.0), (140.0, 80.0), (140.0, 96.0), (120.0, 96.0))
    assert (zone.like, zone.load_a, zone.rated_a, zone.ignore) == ("lugs", 62.0, 100.0, False)
    assert zone.inputs.value("reflected_c") == -4.0
    assert zone.inputs.value("transmittance") is None


@pytest.mark.parametrize(
    ("name", "images", "zones"), [("sheet_building.toml", 6, 0), ("sheet_facades.toml", 4, 9)]
)
def test_sheets_of_simulated_surveys_load(
    tmp_path: Path, name: str, images: int, zones: int
) -> None:
    survey = load(tmp_path, (DATA / name).read_bytes())
    assert len(survey.images) == images
    assert sum(len(image.zones) for image in survey.images) == zones
    first = survey.images[0].inputs.values
    assert {one.origin for one in first.values()} == {"given"}
    assert first["air_c"].value == 14.05
    assert first["air_c"].u == 0.5
    assert survey.model == "band"


def test_byte_order_mark_and_carriage_returns_are_no_obstacle(tmp_path: Path) -> None:
    plain = load(tmp_path, EXAMPLE)
    marked = load(tmp_path, b"\xef\xbb\xbf" + EXAMPLE.replace("\n", "\r\n").encode())
    assert marked == plain


def test_mistakes_keep_their_line_with_carriage_returns(tmp_path: Path) -> None:
    text = "\ufeff[scene]\r\nnote_text = '''\r\n\r\n'''\r\nhumidity = 75\r\n"
    assert [line.split(":")[0] for line in refused(tmp_path, text)] == [
        "survey.toml, line 2",
        "survey.toml, line 5",
    ]


def test_without_a_sheet_all_tiffs_are_run_with_assumed_inputs(tmp_path: Path) -> None:
    survey = load_survey(tmp_path, found_files=["b.tif", "a.tif"])
    assert survey.sheet is None
    assert survey.title == tmp_path.name
    assert [image.file for image in survey.images] == ["a.tif", "b.tif"]
    values = survey.images[0].inputs.values
    assert {one.origin for one in values.values()} == {"assumed"}
    assert {one.scope for one in values.values()} == {"default"}
    expected = {
        "emissivity": (0.95, 0.03),
        "reflected_c": (20.0, 5.0),
        "air_c": (20.0, 5.0),
        "humidity": (0.5, 0.2),
        "distance_m": (2.0, 1.0),
        "view_angle_deg": (0.0, 10.0),
    }
    assert {key: (one.value, one.u) for key, one in values.items()} == expected
    assert survey.camera.noise_k == 0.1
    assert survey.camera.nonuniformity_k == 0.1
    assert "all inputs are assumed" in survey.notes[0]


def test_empty_sheet_is_the_same_as_none_but_for_the_notes(tmp_path: Path) -> None:
    without = load_survey(tmp_path, found_files=["a.tif"])
    empty = load(tmp_path, "", "a.tif")
    assert empty.images == without.images
    assert empty.camera == without.camera
    assert "emissivity was not told: 0.95 is assumed." in empty.notes
    assert "reflected_c was not told: 20 degC is assumed." in empty.notes


def test_sheet_without_images_takes_every_tiff_with_the_scene_inputs(tmp_path: Path) -> None:
    survey = load(tmp_path, "[scene]\nair_c = 7\n[detect]\ncold = false\n", "a.tif", "sub/b.tif")
    assert [image.file for image in survey.images] == ["a.tif", "sub/b.tif"]
    assert {image.inputs.value("air_c") for image in survey.images} == {7.0}
    assert not survey.images[1].detect.cold
    assert any("all 2 TIFF files" in note for note in survey.notes)


def test_file_of_emissivities_is_no_image_of_the_survey(tmp_path: Path) -> None:
    survey = load(
        tmp_path, '[scene]\nemissivity = { file = "emissivity.tif" }\n', "a.tif", "emissivity.tif"
    )
    assert [image.file for image in survey.images] == ["a.tif"]
    named = load(
        tmp_path, IMAGE + 'emissivity = { file = "emissivity.tif" }\n', "a.tif", "emissivity.tif"
    )
    assert not any("not named" in note for note in named.notes)


def test_tiffs_that_the_sheet_does_not_name_get_a_note(tmp_path: Path) -> None:
    survey = load(tmp_path, IMAGE, *(f"{letter}.tif" for letter in "abcdefgh"))
    assert [image.file for image in survey.images] == ["a.tif"]
    assert (
        "7 TIFF files in the folder are not named in the sheet and not run: "
        "b.tif, c.tif, d.tif, e.tif, f.tif and 2 more." in survey.notes
    )
    one = load(tmp_path, IMAGE, "a.tif", "b.tif")
    assert "1 TIFF file in the folder is not named in the sheet and not run: b.tif." in one.notes


def test_image_whose_file_is_missing_is_kept(tmp_path: Path) -> None:
    assert not (tmp_path / "a.tif").exists()
    assert load(tmp_path, IMAGE).images[0].file == "a.tif"


def test_missing_photo_is_left_out_with_a_note(tmp_path: Path) -> None:
    survey = load(tmp_path, IMAGE + 'photo = "gone.jpg"\n')
    assert survey.images[0].photo is None
    assert any("gone.jpg" in note for note in survey.notes)


def test_equal_files_have_one_way_of_writing(tmp_path: Path) -> None:
    assert load(tmp_path, '[[image]]\nfile = "./sub//a.tif"\n').images[0].file == "sub/a.tif"


def test_time_of_an_image_is_the_local_clock(tmp_path: Path) -> None:
    survey = load(tmp_path, IMAGE + "taken = 2026-01-14T07:12:00+05:30\n")
    assert survey.images[0].taken == datetime(2026, 1, 14, 7, 12)


def test_camera_of_counts(tmp_path: Path) -> None:
    camera = load(tmp_path, '[camera]\npixel = "linear"\nscale = 0.04\n', "a.tif").camera
    assert (camera.pixel, camera.scale, camera.offset) == ("linear", 0.04, 0.0)
    kelvin = load(tmp_path, '[camera]\npixel = "kelvin"\n', "a.tif").camera
    assert (kelvin.scale, kelvin.offset) == (None, None)


def test_half_told_camera_is_completed_and_says_so(tmp_path: Path) -> None:
    survey = load(tmp_path, "[camera]\naccuracy_k = 1\nrecorded = { emissivity = 0.95 }\n", "a.tif")
    assert (survey.camera.accuracy_k, survey.camera.accuracy_fraction) == (1.0, 0.02)
    assert survey.camera.accuracy_origin == "given"
    assert survey.camera.recorded == Recorded(emissivity=0.95, origin="given")
    assert any(note.startswith("accuracy_fraction was not told") for note in survey.notes)
    assert any("reflected_c = 20" in note and "camera had applied" in note for note in survey.notes)


def test_files_of_the_camera_and_the_criteria(tmp_path: Path) -> None:
    (tmp_path / "own.toml").touch()
    (tmp_path / "response.csv").touch()
    asked: list[Path | None] = []

    def known(own_file: Path | None) -> list[str]:
        asked.append(own_file)
        return ["house-rule"]

    (tmp_path / SHEET_NAME).write_text(
        '[camera]\nresponse_file = "response.csv"\n[criteria]\nuse = ["house-rule"]\n'
        'file = "own.toml"\n[criteria.settings]\nsurface_factor_limit = 0.7\n'
    )
    survey = load_survey(tmp_path, found_files=["a.tif"], known_criteria=known)
    assert survey.camera.response_file == tmp_path / "response.csv"
    assert survey.criteria_file == tmp_path / "own.toml"
    assert survey.criteria_settings == {"surface_factor_limit": 0.7}
    assert asked == [tmp_path / "own.toml"]


def test_unusual_air_is_questioned_not_refused(tmp_path: Path) -> None:
    notes = load(tmp_path, "[scene]\nair_c = 293.15\n", "a.tif").notes
    assert any("air_c = 293.15" in note and "20.00 degC" in note for note in notes)


# ---------------------------------------------------------------- inheritance and identity


def test_inner_tables_win_key_by_key(tmp_path: Path) -> None:
    survey = load(
        tmp_path,
        "[scene]\nemissivity = 0.9\nair_c = 1\nhumidity = 0.4\n"
        + IMAGE
        + "air_c = 2\n"
        + ZONE
        + "humidity = 0.6\n[[image]]\nfile = 'b.tif'\n",
    )
    first, second = survey.images
    zone = first.zones[0].inputs
    assert [one.inputs.value("air_c") for one in (first, second)] == [2.0, 1.0]
    assert (zone.value("emissivity"), zone.value("air_c"), zone.value("humidity")) == (0.9, 2, 0.6)
    assert {key: zone.values[key].scope for key in ("emissivity", "air_c", "humidity")} == {
        "emissivity": "scene",
        "air_c": "image a.tif",
        "humidity": "zone z of a.tif",
    }
    # One variable for the whole survey, one for the image, one for the zone.
    assert first.inputs.values["emissivity"].name == second.inputs.values["emissivity"].name
    assert first.inputs.values["air_c"].name != second.inputs.values["air_c"].name
    assert zone.values["air_c"].name == first.inputs.values["air_c"].name
    assert zone.values["humidity"].name != first.inputs.values["humidity"].name


def test_equal_numbers_in_two_zones_are_two_variables(tmp_path: Path) -> None:
    text = IMAGE + ZONE + "emissivity = 0.8\n" + ZONE.replace('"z"', '"y"') + "emissivity = 0.8\n"
    first, second = load(tmp_path, text).images[0].zones
    assert first.inputs.values["emissivity"].name == "emissivity [zone z of a.tif]"
    assert second.inputs.values["emissivity"].name == "emissivity [zone y of a.tif]"


def test_a_surface_is_one_variable_wherever_it_is_named(tmp_path: Path) -> None:
    text = (
        '[scene]\nemissivity = { surface = "brick, red" }\n'
        + IMAGE
        + ZONE
        + 'emissivity = { surface = "Brick,red" }\n'
        + '[[image]]\nfile = "b.tif"\nemissivity = { surface = "brick, red", u = 0.011 }\n'
    )
    first, second = load(tmp_path, text).images
    scene, zone = first.inputs.values["emissivity"], first.zones[0].inputs.values["emissivity"]
    table = find_surface("brick, red")
    assert scene.name == zone.name == "emissivity [surface brick, red]"
    assert (scene.value, scene.u) == (table.emissivity, table.u)
    assert (scene.origin, scene.u_origin) == ("surface table", "surface table")
    assert scene.note == table.source
    assert first.zones[0].inputs.surface == "brick, red"
    # Judged differently, it is another variable: one variable has one uncertainty.
    judged = second.inputs.values["emissivity"]
    assert (judged.value, judged.u, judged.u_origin) == (table.emissivity, 0.011, "given")
    assert judged.name != scene.name


def test_uncertainty_is_given_or_assumed(tmp_path: Path) -> None:
    text = (
        "[scene]\nemissivity = { value = 0.9, u = 0.01 }\nair_c = 5\ndistance_m = 30\n"
        "humidity = { value = 0.7 }\nreflected_c = 3\nview_angle_deg = 20\nindoor_c = 21\n"
        "outdoor_c = 5\nwind_m_s = 2\ntransmittance = 0.97\n"
    )
    values = load(tmp_path, text, "a.tif").images[0].inputs.values
    assert {key: (one.u, one.u_origin) for key, one in values.items()} == {
        "emissivity": (0.01, "given"),
        "air_c": (1.0, "assumed"),
        "distance_m": (1.5, "assumed"),
        "humidity": (0.05, "assumed"),
        "reflected_c": (2.0, "assumed"),
        "view_angle_deg": (5.0, "assumed"),
        "indoor_c": (0.5, "assumed"),
        "outdoor_c": (1.0, "assumed"),
        "wind_m_s": (1.0, "assumed"),
        "transmittance": (0.01, "assumed"),
    }
    assert {one.origin for one in values.values()} == {"given"}


def test_assumed_uncertainty_is_at_most_the_value(tmp_path: Path) -> None:
    text = "[scene]\nemissivity = 0.02\nhumidity = 0\ndistance_m = 0\nair_c = 0.1\n"
    values = load(tmp_path, text, "a.tif").images[0].inputs.values
    assert values["emissivity"].u == 0.02
    assert values["humidity"].u == 0.05
    assert values["distance_m"].u == 0.0
    assert values["air_c"].u == 1.0


def test_reflected_temperature_not_told_follows_the_air(tmp_path: Path) -> None:
    survey = load(tmp_path, "[scene]\nair_c = 4\n" + IMAGE + ZONE + "air_c = 30\n")
    image, zone = survey.images[0].inputs.values, survey.images[0].zones[0].inputs.values
    assert (image["reflected_c"].value, image["reflected_c"].u) == (4.0, 3.0)
    assert image["reflected_c"].origin == "assumed"
    assert "equal to the air temperature" in image["reflected_c"].note
    assert zone["reflected_c"].value == 30.0
    # Two values cannot be one variable.
    assert image["reflected_c"].name != zone["reflected_c"].name


def test_window_wins_as_a_whole_and_is_completed(tmp_path: Path) -> None:
    text = (
        "[scene]\nair_c = 30\nwindow = { transmittance = 0.8, reflectance = 0.1, "
        "temperature_c = 25, reflected_c = 22 }\n" + IMAGE + "window.transmittance = 0.9\n"
        "[[image]]\nfile = 'b.tif'\n"
    )
    own, inherited = load(tmp_path, text).images

    def window(values: object) -> dict[str, tuple[float, float, str]]:
        assert isinstance(values, dict)
        return {
            key: (one.value, one.u, one.origin)
            for key, one in values.items()
            if key.startswith("window.")
        }

    assert window(inherited.inputs.values) == {
        "window.transmittance": (0.8, 0.02, "given"),
        "window.reflectance": (0.1, 0.02, "given"),
        "window.temperature_c": (25.0, 1.0, "given"),
        "window.reflected_c": (22.0, 2.0, "given"),
    }
    assert window(own.inputs.values) == {
        "window.transmittance": (0.9, 0.02, "given"),
        "window.reflectance": (0.04, 0.02, "assumed"),
        "window.temperature_c": (30.0, 3.0, "assumed"),
        "window.reflected_c": (20.0, 3.0, "assumed"),
    }


def test_default_reflectance_leaves_room_for_the_transmittance(tmp_path: Path) -> None:
    values = load(tmp_path, "[scene]\nwindow = { transmittance = 0.98 }\n", "a.tif").images[0]
    assert values.inputs.value("window.reflectance") == pytest.approx(0.02)
    # 0.9 + 0.1 is not exactly 1 in floating point for every pair of decimals.
    for transmittance in range(1, 100):
        pair = f"transmittance = 0.{transmittance:02}, reflectance = {1 - transmittance / 100:.2f}"
        load(tmp_path, f"[scene]\nwindow = {{ {pair} }}\n", "a.tif")


def test_emissivity_from_a_file(tmp_path: Path) -> None:
    text = IMAGE + 'emissivity = { file = "e.tif", u = 0.04 }\n' + ZONE + "emissivity = 0.5\n"
    image = load(tmp_path, text).images[0]
    entry = image.inputs.values["emissivity"]
    assert image.inputs.emissivity_file == tmp_path / "e.tif"
    assert math.isnan(entry.value)
    assert (entry.u, entry.u_origin, entry.scope) == (0.04, "given", "image a.tif")
    assert image.zones[0].inputs.emissivity_file is None
    default = load(tmp_path, IMAGE + 'emissivity = { file = "e.tif" }\n').images[0].inputs
    assert default.values["emissivity"].u == 0.03


def test_ways_of_stating_the_reflected_temperature(tmp_path: Path) -> None:
    text = (
        "[scene]\nreflected_c = { sky = { cloud = 0.3, tilt_deg = 90, ground_c = 1.5 } }\n"
        + IMAGE
        + 'reflected_c = { zone = "z" }\n'
        + ZONE
        + '[[image.zone]]\nname = "y"\n'
        + SQUARE
        + 'reflected_c = { file = "r.tif" }\n[[image]]\nfile = "b.tif"\n'
        "[[image]]\nfile = 'c.tif'\n"
        "reflected_c = { sky = { cloud = 1, tilt_deg = 0, ground_c = 1, u = 2 } }\n"
    )
    first, second, third = (image for image in load(tmp_path, text).images)
    assert first.inputs.reflected_zone == "z"
    assert first.inputs.sky is None
    assert first.inputs.values["reflected_c"].origin == "measured"
    foil, other = first.zones
    # A zone on which the reflected temperature is measured is a reference, not a target.
    assert foil.role == "foil"
    assert other.role is None
    assert other.inputs.reflected_zone is None
    assert other.inputs.reflected_file == tmp_path / "r.tif"
    assert (
        other.inputs.values["reflected_c"].u,
        math.isnan(other.inputs.value("reflected_c") or 0),
    ) == (2.0, True)
    assert second.inputs.sky == SkyAndGround(0.3, 90.0, 1.5, REFLECTED_U_K)
    assert second.inputs.values["reflected_c"].origin == "computed"
    assert third.inputs.sky == SkyAndGround(1.0, 0.0, 1.0, 2.0)
    assert third.inputs.values["reflected_c"].u == 2.0


def test_detection_of_one_image(tmp_path: Path) -> None:
    text = "[detect]\nmin_delta_k = 2\n" + IMAGE + "[image.detect]\nwarm = false\n"
    text += '[[image]]\nfile = "b.tif"\n'
    first, second = load(tmp_path, text).images
    assert first.detect == DetectSettings(warm=False, min_delta_k=2.0)
    assert second.detect == DetectSettings(min_delta_k=2.0)


# ---------------------------------------------------------------- defaults and documentation


def test_defaults_agree_with_the_records() -> None:
    assert default_value("camera.accuracy_k") == Camera().accuracy_k
    assert default_value("camera.accuracy_fraction") == Camera().accuracy_fraction
    assert default_value("camera.noise_k") == Camera().noise_k
    for key in ("emissivity", "reflected_c", "air_c", "transmittance"):
        assert default_value(f"camera.recorded.{key}") == getattr(Recorded(), key)


def test_every_default_is_complete() -> None:
    for key, default in all_defaults().items():
        assert default.reason.endswith(".")
        assert default.unit
        if default.u is not None:
            assert default.u > 0
        if not key.startswith("camera."):
            assert (default.value is None) or (default.u is not None)
    assert default_for("distance_m").u_for(40.0) == 2.0
    with pytest.raises(LookupError):
        default_for("camera.noise_k").u_for(1.0)
    with pytest.raises(LookupError):
        default_value("transmittance")


def every_key() -> set[str]:
    paths: list[KeyPath] = [(name,) for name in TABLES]
    paths += [("scene", key) for key in ("emissivity", "reflected_c", "air_c", "window")]
    paths += [("scene", "reflected_c", "sky"), ("camera", "recorded"), ("image", 0, "detect")]
    inner = {key for path in paths for key in known_keys(path)}
    return {*TOP_KEYS, *IMAGE_KEYS, *ZoneTable.model_fields, *inner}


def test_the_reference_describes_every_key() -> None:
    text = (DOCS / "survey_sheet.md").read_text(encoding="utf-8")
    missing = [key for key in sorted(every_key()) if f"`{key}`" not in text]
    assert not missing


def test_the_reference_states_the_defaults() -> None:
    rows = re.findall(
        r"^\| `([\w.]+)` \| ([^|]*) \| ([^|]*) \| ([^|]*) \|",
        (DOCS / "survey_sheet.md").read_text(encoding="utf-8").partition("## Defaults")[2],
        re.MULTILINE,
    )
    stated = {key: tuple(cell.strip() for cell in cells) for key, *cells in rows}

    def written(number: float | None) -> str:
        return "" if number is None else f"{number:g}"

    for key, default in all_defaults().items():
        given_u = written(default.u_given)
        if default.u_given_relative is not None:
            given_u = f"{100 * default.u_given_relative:g} %"
        assert stated[key] == (written(default.value), written(default.u), given_u), key
    assert set(stated) == set(all_defaults())


def test_the_examples_of_the_reference_load(tmp_path: Path) -> None:
    text = (DOCS / "survey_sheet.md").read_text(encoding="utf-8")
    examples = re.findall(r"```toml\n(.*?)```", text, re.DOTALL)
    assert len(examples) >= 4
    for name in ("house_rules.toml", "response.csv", "weather.csv"):
        (tmp_path / name).touch()
    for example in examples:
        assert load(tmp_path, example, "a.tif").images
