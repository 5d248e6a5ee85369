"""What the survey sheet refuses, on which line and in which words."""

import re
import tomllib
from pathlib import Path

import pytest
import tomlkit
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.sheets import EXAMPLE, IMAGE, SQUARE, ZONE, load, paths_of, refused, values
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import FolderError, SheetError, SurveyError
from thermo_fix.records import Survey
from thermo_fix.sheet import SHEET_NAME, load_survey
from thermo_fix.sheet.toml_text import MAX_BYTES

# ---------------------------------------------------------------- what is refused

# A sheet, the line of the mistake and telling parts of the message.
BAD: dict[str, tuple[str, int, tuple[str, ...]]] = {
    "unknown key": (
        "[scene]\nair_c = 1\nhumdity = 0.5\n",
        3,
        ('survey.toml, line 3: unknown key "humdity" in [scene]; nearest known key: "humidity"',),
    ),
    "unknown table": ("[scenes]\n", 1, ('unknown key "scenes"', '"scene"')),
    "unknown key of an image": (
        IMAGE + "aset = 'x'\n",
        3,
        ('unknown key "aset" in [image 1]', '"asset"'),
    ),
    "unknown key of a zone": (
        IMAGE + ZONE + "lod_a = 1\n",
        6,
        ('unknown key "lod_a" in [image 1, zone 1]', '"load_a"'),
    ),
    "unknown key of the camera": ("[camera]\nnoise = 0.1\n", 2, ('"noise_k"',)),
    "unknown key of the detection": (
        IMAGE + "[image.detect]\nmin_delta = 1\n",
        4,
        ("[image 1].detect", '"min_delta_k"'),
    ),
    "unknown key inside a quantity": (
        "[scene]\nair_c = { value = 1, U = 1 }\n",
        2,
        ('unknown key "U" in [scene].air_c', '"u"'),
    ),
    "unknown key of the recorded settings": (
        "[camera.recorded]\nemissivty = 1\n",
        2,
        ("[camera].recorded", '"emissivity"'),
    ),
    "unknown key of a window": (
        "[scene.window]\ntransmittance = 0.8\nreflectence = 0.1\n",
        3,
        ('"reflectance"',),
    ),
    "key in the wrong table": (
        "[scene]\nband_um = [8, 14]\n",
        2,
        ('nearest known key: "band_um" of [camera]',),
    ),
    "key outside any table": ("emissivity = 0.9\n", 1, ("outside any table", "[scene]")),
    "strange key": ('[scene]\n"a\\nb" = 1\n', 2, ('unknown key "a\\nb"',)),
    "newer sheet": (
        "# a comment\nsheet_version = 2\nnew_table = 1\n",
        2,
        ("sheet_version = 2", "reads version 1"),
    ),
    "odd version": ("sheet_version = '1'\n", 1, ("write sheet_version = 1",)),
    "version zero": ("sheet_version = 0\n", 1, ("write sheet_version = 1",)),
    # emissivity
    "emissivity above 1": (
        "[scene]\nemissivity = 1.2\n",
        2,
        ("[scene].emissivity = 1.2: an emissivity lies above 0 and is at most 1",),
    ),
    "emissivity 0": ("[scene]\nemissivity = 0\n", 2, ("emissivity = 0:", "lies above 0")),
    "emissivity below 0": ("[scene]\nemissivity = -0.9\n", 2, ("lies above 0",)),
    "emissivity in percent": ("[scene]\nemissivity = 95\n", 2, ("did you mean 0.95?",)),
    "emissivity as text": ('[scene]\nemissivity = "0.95"\n', 2, ("write a number",)),
    "surface as text": (
        '[scene]\nemissivity = "brick, red"\n',
        2,
        ('{ surface = "brick, red" }',),
    ),
    "unknown surface": (
        '[scene]\nemissivity = { surface = "brick, redd" }\n',
        2,
        ('[scene].emissivity.surface = "brick, redd"', "unknown surface", '"brick, red"'),
    ),
    "emissivity stated twice over": (
        '[scene]\nemissivity = { value = 0.9, surface = "brick, red" }\n',
        2,
        ("exactly one of value, surface, file",),
    ),
    "emissivity without a value": (
        "[scene]\nemissivity = { u = 0.1 }\n",
        2,
        ("exactly one of value, surface, file",),
    ),
    "emissivity true": ("[scene]\nemissivity = true\n", 2, ("write a number",)),
    "emissivity nan": ("[scene]\nemissivity = nan\n", 2, ("must be finite",)),
    "emissivity of one image": (
        IMAGE + "[[image]]\nfile = 'b.tif'\n\nemissivity = 1.5\n",
        6 - 0,
        ("[image 2].emissivity = 1.5",),
    ),
    # other quantities
    "humidity in percent": (
        "[scene]\nhumidity = 75\n",
        2,
        ("humidity is a fraction", "write 0.75"),
    ),
    "humidity below 0": ("[scene]\nhumidity = -0.1\n", 2, ("humidity is a fraction",)),
    "transmittance 0": ("[scene]\ntransmittance = 0\n", 2, ("transmittance lies above 0",)),
    "transmittance in percent": ("[scene]\ntransmittance = 98\n", 2, ("did you mean 0.98?",)),
    "distance below 0": ("[scene]\ndistance_m = -1\n", 2, ("a distance is at least 0",)),
    "below absolute zero": (
        "[scene]\nair_c = -273.16\n",
        2,
        (f"at least -{ZERO_CELSIUS_K} degC (absolute zero)",),
    ),
    "too hot": ("[scene]\nreflected_c = 3000\n", 2, ("below 3000 degC",)),
    "edge on": ("[scene]\nview_angle_deg = 90\n", 2, ("below 90 degrees",)),
    "wind below 0": ("[scene]\nwind_m_s = -1\n", 2, ("wind speed",)),
    "infinite": ("[scene]\nair_c = inf\n", 2, ("must be finite",)),
    "beyond floating point": ("[scene]\nair_c = 1" + "0" * 400 + "\n", 2, ("must be finite",)),
    "a list for a quantity": ("[scene]\nair_c = [1, 2]\n", 2, ("write a number, or { value",)),
    "a date for a quantity": ("[scene]\nair_c = 2026-01-14\n", 2, ("write a number, or",)),
    "no value": ("[scene]\nair_c = { u = 1 }\n", 2, ('[scene].air_c: "value" is missing',)),
    # uncertainties
    "uncertainty 0": (
        "[scene]\nair_c = { value = 1, u = 0 }\n",
        2,
        ("[scene].air_c.u = 0: a standard uncertainty must be above zero; leave it out",),
    ),
    "uncertainty below 0": ("[scene]\nair_c = { value = 1, u = -1 }\n", 2, ("above zero",)),
    "uncertainty in percent": (
        "[scene]\nemissivity = { value = 0.9, u = 2 }\n",
        2,
        ("larger than the value 0.9", "not in percent"),
    ),
    "uncertainty above the distance": (
        "[scene]\ndistance_m = { value = 2, u = 3 }\n",
        2,
        ("larger than the value 2",),
    ),
    "uncertainty of a surface": (
        '[scene]\nemissivity = { surface = "brick, red", u = 0 }\n',
        2,
        ("above zero",),
    ),
    "uncertainty of a foil zone": (
        IMAGE + 'reflected_c = { zone = "z", u = 1 }\n' + ZONE,
        3,
        ("u is not stated for a foil zone",),
    ),
    # reflected temperature
    "reflected two ways": (
        '[scene]\nreflected_c = { value = 1, file = "r.tif" }\n',
        2,
        ("exactly one of value, file, zone, sky",),
    ),
    "foil zone of another name": (
        IMAGE + 'reflected_c = { zone = "foyl" }\n' + ZONE.replace('"z"', '"foil"'),
        3,
        ('[image 1].reflected_c.zone = "foyl"', "no zone of that name", 'nearest: "foil"'),
    ),
    "foil zone wanted by the scene": (
        '[scene]\nreflected_c = { zone = "foil" }\n' + IMAGE,
        3,
        ("[image 1]: ", '"foil"', '"a.tif" has no zone of that name'),
    ),
    "foil zone without images": (
        '[scene]\nreflected_c = { zone = "foil" }\n',
        2,
        ("this sheet names no image",),
    ),
    "foil that is tape": (
        IMAGE + 'reflected_c = { zone = "z" }\n' + ZONE + 'role = "tape"\n',
        7,
        ('write role = "foil"',),
    ),
    "cloud in percent": (
        "[scene]\nreflected_c = { sky = { cloud = 30, tilt_deg = 90, ground_c = 0 } }\n",
        2,
        ("[scene].reflected_c.sky.cloud = 30", "between 0 and 1"),
    ),
    "tilt": (
        "[scene]\nreflected_c = { sky = { cloud = 0, tilt_deg = 190, ground_c = 0 } }\n",
        2,
        ("a tilt is between 0",),
    ),
    "sky without ground": (
        "[scene]\nreflected_c = { sky = { cloud = 0, tilt_deg = 90 } }\n",
        2,
        ('"ground_c" is missing',),
    ),
    "uncertainty of the sky": (
        "[scene]\nreflected_c = { sky = { cloud = 0, tilt_deg = 9, ground_c = 0, u = 0 } }\n",
        2,
        ("above zero",),
    ),
    # window
    "window that gives more than it gets": (
        "[scene]\nwindow = { transmittance = 0.9, reflectance = 0.2 }\n",
        2,
        ("[scene].window: transmittance and reflectance together are 1.1, more than 1",),
    ),
    "window without transmittance": (
        "[scene]\nwindow = { reflectance = 0.2 }\n",
        2,
        ('"transmittance" is missing',),
    ),
    "window as a number": ("[scene]\nwindow = 0.9\n", 2, ("write a table",)),
    "reflectance 1": (
        "[scene]\nwindow = { transmittance = 0.9, reflectance = 1 }\n",
        2,
        ("below 1",),
    ),
    # survey
    "purpose": (
        '[survey]\npurpose = "electric"\n',
        2,
        ('write one of "building", "electrical"; did you mean "electrical"?',),
    ),
    "unit": ('[survey]\ntemperature_unit = "K"\n', 2, ('"celsius", "fahrenheit"',)),
    "date as text": ('[survey]\ndate = "2026-01-14"\n', 2, ("write a date alone",)),
    "date with time": ("[survey]\ndate = 2026-01-14T07:12:00\n", 2, ("write a date alone",)),
    "title of two lines": ('[survey]\ntitle = "a\\nb"\n', 2, ("on one line",)),
    "title as a number": ("[survey]\ntitle = 12\n", 2, ("in quotation marks",)),
    "survey as a list": ("[[survey]]\n", 1, ("[survey] on a line of its own",)),
    # camera
    "pixel": ('[camera]\npixel = "counts"\n', 2, ('"celsius", "kelvin", "linear"',)),
    "linear without scale": ('[camera]\npixel = "linear"\n', 2, ("needs a scale",)),
    "scale 0": ('[camera]\npixel = "linear"\nscale = 0\n', 3, ("a scale of zero",)),
    "scale without pixel": ("[camera]\nscale = 0.01\n", 2, ('goes with pixel = "linear"',)),
    "falling band": ("[camera]\nband_um = [14, 8]\n", 2, ("band_um = [14, 8]", "must rise")),
    "band of one": ("[camera]\nband_um = [8]\n", 2, ("the two ends of the band",)),
    "band in nanometres": ("[camera]\nband_um = [8000, 14000]\n", 2, ("0.7 to 30",)),
    "noise 0": ("[camera]\nnoise_k = 0\n", 2, ("must be above zero",)),
    "accuracy below 0": ("[camera]\naccuracy_k = -2\n", 2, ("must not be below zero",)),
    "accuracy in percent": ("[camera]\naccuracy_fraction = 2\n", 2, ("write 0.02 for 2 %",)),
    "ifov 0": ("[camera]\nifov_mrad = 0\n", 2, ("above 0",)),
    "number in quotes": ('[camera]\nnoise_k = "0.05"\n', 2, ("without quotation marks",)),
    "recorded emissivity": (
        "[camera]\nrecorded = { emissivity = 0 }\n",
        2,
        ("[camera].recorded.emissivity = 0",),
    ),
    "missing response": (
        '[camera]\nresponse_file = "r.csv"\n',
        2,
        ("no such file in the survey folder",),
    ),
    # the rest
    "model": ('[radiation]\nmodel = "full"\n', 2, ('"total", "band"',)),
    "flag": ("[detect]\nwarm = 1\n", 2, ("[detect].warm = 1: write true or false",)),
    "area": ("[detect]\nmin_area_px = 0\n", 2, ("at least 1 pixel",)),
    "area of halves": ("[detect]\nmin_area_px = 1.5\n", 2, ("a whole number",)),
    "difference 0": ("[detect]\nmin_delta_k = 0\n", 2, ("above zero",)),
    "criteria as text": ('[criteria]\nuse = "x"\n', 2, ("write a list of names",)),
    "criteria twice": (
        '[criteria]\nuse = [\n  "known-rule",\n  "known-rule",\n]\n',
        4,
        ("stands in the list twice",),
    ),
    "unknown criterion": (
        '[criteria]\nuse = ["known-rool"]\n',
        2,
        ("unknown criterion", 'nearest: "known-rule"'),
    ),
    "missing file of criteria": ('[criteria]\nfile = "c.toml"\n', 2, ("no such file",)),
    "setting as text": (
        '[criteria.settings]\nlimit = "0.7"\n',
        2,
        ("[criteria].settings.limit", "without quotation marks"),
    ),
    # images and files
    "one bracket": ("[image]\nfile = 'a.tif'\n", 1, ("[[image]] with double brackets",)),
    "one bracket for a zone": (
        IMAGE + "[image.zone]\nname = 'z'\n",
        3,
        ("[[image.zone]] with double brackets",),
    ),
    "image without file": ("[[image]]\nasset = 'x'\n", 1, ('[image 1]: "file" is missing',)),
    "file twice": (
        IMAGE + "\n[[image]]\nfile = './a.tif'\n",
        5,
        ('[image 2].file = "./a.tif"', "has an entry already", "(the other is on line 2)"),
    ),
    "file twice in other letters": (
        IMAGE + "[[image]]\nfile = 'A.TIF'\n",
        4,
        ('this is "a.tif" in other letters', "(the other is on line 2)"),
    ),
    "absolute file": ("[[image]]\nfile = '/data/a.tif'\n", 2, ("relative to the survey folder",)),
    "file with a drive": ("[[image]]\nfile = 'C:/a.tif'\n", 2, ("relative to the survey folder",)),
    "file above": ("[[image]]\nfile = 'x/../../a.tif'\n", 2, ("outside the survey folder",)),
    "backslash": ("[[image]]\nfile = 'x\\a.tif'\n", 2, ("write / between",)),
    "empty file": ("[[image]]\nfile = ''\n", 2, ("name of a file is missing",)),
    "file of two lines": ('[[image]]\nfile = "a\\u0000.tif"\n', 2, ("control character",)),
    "the folder itself": ("[[image]]\nfile = '.'\n", 2, ("the survey folder itself",)),
    "endless name": (f"[[image]]\nfile = '{'a' * 300}.tif'\n", 2, ("too long",)),
    "date of an image": (IMAGE + "taken = 2026-01-14\n", 3, ("write date and time",)),
    # zones
    "zone without polygon": (
        IMAGE + "[[image.zone]]\nname = 'z'\n",
        3,
        ('[image 1, zone 1]: "polygon" is missing',),
    ),
    "zone without name": (IMAGE + "[[image.zone]]\n" + SQUARE, 3, ('"name" is missing',)),
    "empty name": (IMAGE + "[[image.zone]]\nname = ' '\n" + SQUARE, 4, ("must not be empty",)),
    "zones of one name": (
        IMAGE + ZONE + ZONE,
        7,
        ("another zone of this image has that name", "(the other is on line 4)"),
    ),
    "two points": (
        IMAGE + "[[image.zone]]\nname = 'z'\npolygon = [[0, 0], [1, 1], [0, 0]]\n",
        5,
        ("at least 3 different points, this one has 2",),
    ),
    "bow tie": (
        IMAGE + "[[image.zone]]\nname = 'z'\npolygon = [[0, 0], [4, 4], [4, 0], [0, 4]]\n",
        5,
        ("crosses or touches itself",),
    ),
    "flat": (
        IMAGE + "[[image.zone]]\nname = 'z'\npolygon = [[0, 0], [1, 1], [2, 2]]\n",
        5,
        ("lie on one line",),
    ),
    "point of three": (
        IMAGE + "[[image.zone]]\nname = 'z'\npolygon = [\n[0, 0],\n[1, 1, 1],\n[2, 2]\n]\n",
        7,
        ("polygon, entry 2", "a list of corners [x, y]"),
    ),
    "point nowhere": (
        IMAGE + "[[image.zone]]\nname = 'z'\npolygon = [[0, 0], [nan, 1], [2, 2]]\n",
        5,
        ("must be finite",),
    ),
    "point far away": (
        IMAGE + "[[image.zone]]\nname = 'z'\npolygon = [[0, 0], [1e9, 1], [2, 2]]\n",
        5,
        ("no place in an image",),
    ),
    "rated 0": (IMAGE + ZONE + "rated_a = 0\n", 6, ("above zero",)),
    "load below 0": (IMAGE + ZONE + "load_a = -1\n", 6, ("must not be below zero",)),
    "role": (IMAGE + ZONE + "role = 'target'\n", 6, ('"foil", "tape"',)),
    "emissivity of a zone": (
        IMAGE + ZONE + "emissivity = 12\n",
        6,
        ("[image 1, zone 1].emissivity = 12", "did you mean 0.12?"),
    ),
    # not TOML
    "key twice": ("[scene]\nair_c = 1\nair_c = 2\n", 3, ("stated twice",)),
    "table twice": ("[scene]\n[detect]\n[scene]\n", 3, ("[scene] is declared twice",)),
    "decimal comma": ("[scene]\nhumidity = 0,75\n", 2, ("decimal point, not a comma",)),
    "no quotes": ("[survey]\npurpose = building\n", 2, ("text stands in quotation marks",)),
    "True": ("[detect]\nwarm = True\n", 2, ("true or false, in small letters",)),
    "percent sign": ("[scene]\nhumidity = 75%\n", 2, ("without the percent sign",)),
    "unit behind the number": ("[scene]\nair_c = 20 C\n", 2, ("write the number alone",)),
    "day first": ("[survey]\ndate = 14.01.2026\n", 2, ("year-month-day",)),
    "point first": ("[scene]\nhumidity = .75\n", 2, ("a digit before the decimal point",)),
    "point last": ("[scene]\nair_c = 20.\n", 2, ("a digit after the decimal point",)),
    "curly quotes": ("[survey]\ntitle = “mill”\n", 2, ("straight quotation marks",)),
    "no value at all": ("[scene]\nair_c =\n", 2, ("a value is missing",)),
    "colon": ("[scene]\nair_c: 20\n", 2, ("not a colon",)),
    "open list": ("[camera]\nband_um = [8, 14\n", 2, ("not closed",)),
    "open text": ('[survey]\ntitle = "mill\n', 2, ("ends with the quotation mark",)),
    "escape": ('[[image]]\nfile = "x\\a.tif"\n', 2, ("a backslash in a text",)),
}


@pytest.mark.parametrize("case", BAD)
def test_bad_sheet(tmp_path: Path, case: str) -> None:
    text, line, parts = BAD[case]
    problems = refused(tmp_path, text, criteria=["known-rule", "other"])
    assert len(problems) == 1, problems
    assert re.match(rf"survey\.toml, line {line}[,:] ", problems[0]), problems[0]
    for part in parts:
        assert part in problems[0]


def test_all_mistakes_are_reported_in_the_order_of_the_file(tmp_path: Path) -> None:
    text = (
        "[[image]]\nfile = '../a.tif'\nemissivity = 1.2\n[[image.zone]]\nname = 'z'\n"
        "polygon = [[0, 0], [1, 1]]\nemissivity = { surface = 'brik' }\n"
        "[scene]\nhumidity = 75\nhumdity = 0.75\n[camera]\nnoise_k = -1\n"
    )
    lines = [int(re.findall(r"line (\d+)", line)[0]) for line in refused(tmp_path, text)]
    assert lines == [2, 3, 6, 7, 9, 10, 12]


def test_one_mistake_made_many_times_is_cut_short(tmp_path: Path) -> None:
    text = "".join(f"[[image]]\nfile = '{i}.tif'\nemissivity = 2\n" for i in range(300))
    problems = refused(tmp_path, text)
    assert len(problems) == 201
    assert problems[-1] == "survey.toml: and 100 more mistakes"


def test_long_values_are_shortened(tmp_path: Path) -> None:
    (problem,) = refused(tmp_path, f"[survey]\npurpose = '{'x' * 500}'\n")
    assert len(problem) < 200
    assert 'xxx..."' in problem


@pytest.mark.parametrize(
    ("data", "parts"),
    [
        ("[survey]\ntitle = 'Caf\xe9'\n".encode("latin-1"), ("line 2", "0xE9", "UTF-8")),
        ("[survey]\n".encode("utf-16"), ("UTF-16",)),
        (b"[survey]\rtitle = 'a'\r", ("carriage return",)),
        (b"a = " + b"[" * 5000, ("nested too deeply",)),
        (b"a." * 5000 + b"b = 1", ("more than 32 parts",)),
        (b"a = " + b"9" * 5000, ("not valid TOML",)),
        (b"[scene]\n\x00", ("line 2", "not valid TOML")),
    ],
)
def test_bytes_that_are_no_sheet(tmp_path: Path, data: bytes, parts: tuple[str, ...]) -> None:
    (problem,) = refused(tmp_path, data)
    for part in parts:
        assert part in problem


def test_sheet_too_large(tmp_path: Path) -> None:
    with (tmp_path / SHEET_NAME).open("wb") as stream:
        stream.truncate(MAX_BYTES + 1)  # a sparse file
    with pytest.raises(SheetError, match="too large for a survey sheet"):
        load_survey(tmp_path)


def test_sheet_that_is_a_folder(tmp_path: Path) -> None:
    (tmp_path / SHEET_NAME).mkdir()
    with pytest.raises(SheetError, match="no ordinary file"):
        load_survey(tmp_path, found_files=["a.tif"])


@pytest.mark.parametrize("name", ["Survey.toml", "survey.toml.txt"])
def test_sheet_of_another_name_is_not_passed_over(tmp_path: Path, name: str) -> None:
    (tmp_path / name).touch()
    if (tmp_path / SHEET_NAME).exists():
        pytest.skip("the file system does not tell capital letters")
    with pytest.raises(SheetError, match=r"must be named survey\.toml"):
        load_survey(tmp_path, found_files=["a.tif"])


def test_folder_that_cannot_be_used(tmp_path: Path) -> None:
    with pytest.raises(FolderError, match="no such folder"):
        load_survey(tmp_path / "gone")
    with pytest.raises(FolderError, match="no TIFF file"):
        load_survey(tmp_path)
    with pytest.raises(FolderError, match="no TIFF file"):
        load(tmp_path, "[scene]\nair_c = 1\n")


@pytest.mark.parametrize(
    "line",
    [
        "file = 'link.tif'",
        "file = 'sub/b.tif'",
        "file = 'a.tif'\nphoto = 'link.tif'",
        "file = 'a.tif'\nemissivity = { file = 'link.tif' }",
        "file = 'a.tif'\nreflected_c = { file = 'sub/r.tif' }",
    ],
)
def test_links_out_of_the_folder_are_refused(tmp_path: Path, line: str) -> None:
    survey, outside = tmp_path / "survey", tmp_path / "outside"
    survey.mkdir()
    outside.mkdir()
    (survey / "link.tif").symlink_to(outside / "x.tif")
    (survey / "sub").symlink_to(outside)
    (problem,) = refused(survey, f"[[image]]\n{line}\n")
    assert "leads out of the survey folder" in problem
    assert "outside" not in problem.replace("out of", "")


def test_links_inside_the_folder_are_followed(tmp_path: Path) -> None:
    (tmp_path / "b.tif").touch()
    (tmp_path / "a.tif").symlink_to(tmp_path / "b.tif")
    (tmp_path / "loop.tif").symlink_to("loop.tif")
    assert load(tmp_path, IMAGE).images[0].file == "a.tif"
    assert load(tmp_path, "[[image]]\nfile = 'loop.tif'\n").images[0].file == "loop.tif"


# ---------------------------------------------------------------- any text


def outcome_of(folder: Path, text: str) -> Survey | SurveyError:
    try:
        return load(folder, text, "a.tif")
    except SurveyError as error:
        return error


PIECES = [
    "[",
    "]",
    "{",
    "}",
    "=",
    '"',
    "'",
    ",",
    "\n",
    "#",
    "0",
    "-1",
    "1e999",
    "nan",
    "true",
    "\0",
]


@settings(
    max_examples=250,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(data=st.data())
def test_any_mutation_gives_a_survey_or_a_survey_error(tmp_path: Path, data: st.DataObject) -> None:
    text = data.draw(st.sampled_from([EXAMPLE, IMAGE + ZONE + "reflected_c = { zone = 'z' }\n"]))
    for _ in range(data.draw(st.integers(1, 4))):
        start = data.draw(st.integers(0, len(text)))
        stop = data.draw(st.integers(start, min(len(text), start + 12)))
        piece = data.draw(st.sampled_from([*PIECES, text[start:stop] * 2]))
        text = text[:start] + piece + text[stop:]
    outcome = outcome_of(tmp_path, text)
    assert outcome.images if isinstance(outcome, Survey) else str(outcome)


@settings(
    max_examples=150,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(data=st.data())
def test_any_value_anywhere_gives_a_survey_or_a_survey_error(
    tmp_path: Path, data: st.DataObject
) -> None:
    document: dict[str, object] = tomllib.loads(EXAMPLE)
    paths = sorted(paths_of(document), key=str)
    path = data.draw(st.sampled_from(paths))
    target: object = document
    for step in path[:-1]:
        assert isinstance(target, dict | list)
        target = target[step]  # type: ignore[index]
    assert isinstance(target, dict | list)
    target[path[-1]] = data.draw(values)  # type: ignore[index]
    outcome = outcome_of(tmp_path, tomlkit.dumps(document))
    assert outcome.images if isinstance(outcome, Survey) else str(outcome)
