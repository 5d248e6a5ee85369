"""The drafted sheet: it loads, holds what the images tell, and asks for the rest."""

import re
import tomllib
from datetime import date, datetime
from itertools import pairwise
from pathlib import Path

from thermo_fix.sheet import SHEET_NAME, FileFacts, draft_sheet, load_survey

DAY = datetime(2026, 1, 14, 7, 12)
COUNTS = [
    FileFacts("IR_2.tif", 320, 240, DAY, "linear", 0.04, 1.5, "inferred"),
    FileFacts("IR_1.tif", 640, 480, DAY.replace(hour=8), "linear", 0.04, 1.5, "inferred", "dim"),
]
CRITERIA = ["iso13788-surface-factor"]


def test_draft_loads_and_holds_what_the_images_tell(tmp_path: Path) -> None:
    folder = tmp_path / "mill, north"
    folder.mkdir()
    text = draft_sheet(folder, COUNTS)
    (folder / SHEET_NAME).write_text(text, encoding="utf-8")
    survey = load_survey(folder, found_files=[one.file for one in COUNTS], known_criteria=CRITERIA)
    assert survey.title == "mill, north"
    assert survey.date == date(2026, 1, 14)
    assert (survey.camera.pixel, survey.camera.scale, survey.camera.offset) == (
        "linear",
        0.04,
        1.5,
    )
    assert [image.file for image in survey.images] == ["IR_1.tif", "IR_2.tif"]
    assert survey.images[1].taken == DAY
    assert 'file = "IR_1.tif"               # 640 x 480 px\n# dim\n' in text
    # Nothing that only a person knows has been answered for them.
    assert {one.origin for one in survey.images[0].inputs.values.values()} == {"assumed"}
    assert survey.camera.noise_origin == survey.camera.recorded.origin == "assumed"
    assert any("purpose was not told" in note for note in survey.notes)


def test_every_question_can_be_answered_as_it_stands(tmp_path: Path) -> None:
    text = re.sub(r"^# (\w+ = |\[\[)", r"\1", draft_sheet(tmp_path, COUNTS), flags=re.MULTILINE)
    (tmp_path / SHEET_NAME).write_text(text, encoding="utf-8")
    (tmp_path / "weather.csv").touch()
    survey = load_survey(tmp_path, known_criteria=CRITERIA)
    origins = {one.origin for one in survey.images[0].inputs.values.values()}
    assert origins == {"given"}
    assert survey.images[0].zones[0].rated_a == 100.0
    assert survey.criteria == ("iso13788-surface-factor",)
    assert survey.camera.recorded.origin == "given"


def test_each_question_has_a_comment_or_a_heading(tmp_path: Path) -> None:
    lines = draft_sheet(tmp_path, COUNTS).splitlines()
    for before, line in pairwise(lines):
        if re.match(r"# \w+ = ", line) and not re.search(r"(name|rated_a) = ", line):
            assert line.count("#") == 2 or before.endswith(":"), line


def test_images_that_differ_leave_the_pixel_a_question(tmp_path: Path) -> None:
    facts = [
        FileFacts("a.tif", 1, 1, datetime(2026, 1, 14), "celsius", origin="given"),
        FileFacts("b.tif", 1, 1, datetime(2026, 1, 15), "kelvin"),
    ]
    text = draft_sheet(tmp_path, facts)
    assert "the files differ" in text
    assert "of several days" in text
    assert "pixel" not in tomllib.loads(text)["camera"]


def test_files_that_do_not_tell(tmp_path: Path) -> None:
    text = draft_sheet(tmp_path, [FileFacts("a.tif", 8, 6)])
    assert text.startswith("# Survey sheet, drafted from the 1 TIFF file in")
    assert "the files do not tell" in text
    assert "taken" not in text
    told = draft_sheet(tmp_path, [FileFacts("a.tif", 8, 6, None, "kelvin", origin="given")])
    assert 'pixel = "kelvin"                # as the files say' in told
    assert "scale" not in tomllib.loads(told)["camera"]


def test_draft_of_an_empty_folder(tmp_path: Path) -> None:
    (tmp_path / SHEET_NAME).write_text(draft_sheet(tmp_path, []), encoding="utf-8")
    assert load_survey(tmp_path, found_files=["late.tif"]).images[0].file == "late.tif"


def test_names_that_need_care(tmp_path: Path) -> None:
    names = [
        'say "hi".tif',
        "a b/c.tif",
        "Kaltbrücke.tif",
        "IR_1.tif",
        "ir_1.tif",
        "line\nbreak.tif",
        "back\\slash.tif",
        "half\udce9.tif",
    ]
    text = draft_sheet(
        tmp_path, [FileFacts(name, 2, 3, note="odd\n[scene]\nair_c = 1 \udce9") for name in names]
    )
    (tmp_path / SHEET_NAME).write_text(text, encoding="utf-8")
    survey = load_survey(tmp_path, found_files=names[:4])
    assert {image.file for image in survey.images} == set(names[:4])
    left_out = [line for line in text.splitlines() if line.startswith("# Left out")]
    assert len(left_out) == 4
    assert "differs from IR_1.tif only in capital letters" in "".join(left_out)
    assert "# odd [scene] air_c = 1\n" in text


def test_folder_name_that_needs_care(tmp_path: Path) -> None:
    folder = tmp_path / 'a "b"\n # c'
    folder.mkdir()
    assert tomllib.loads(draft_sheet(folder, COUNTS))["survey"]["title"] == 'a "b" # c'
