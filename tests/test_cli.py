"""The command line as a person or a script meets it.

Most calls run in this process through the same `main` as the command; a few run it as a process of
its own, because exit status, pipes and environment are only then what they are in the world.
"""

import json
import os
import re
import shlex
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.survey_folders import SHAPE, SHEET, files_below, picture, write_folder, write_image
from thermo_fix.cli import main
from thermo_fix.demo import demo_surveys
from thermo_fix.records import Survey
from thermo_fix.survey import open_survey
from thermo_fix.version import __version__

COMMANDS = ("run", "draft", "vet", "point", "solve", "demo")
FAST = ("--no-pictures", "--jobs", "1")
IMAGE = '[[image]]\nfile = "a.tif"\n'


@dataclass(frozen=True)
class Said:
    status: int
    out: str
    err: str

    @property
    def problem(self) -> str:
        """The one line on standard error."""
        (line,) = self.err.splitlines()
        assert line.startswith("thermo-fix: ")
        return line.removeprefix("thermo-fix: ")


class Command:
    """Runs the command in this process."""

    def __init__(self, patch: pytest.MonkeyPatch, capture: pytest.CaptureFixture[str]) -> None:
        self._patch = patch
        self._capture = capture

    def __call__(self, *arguments: str | Path) -> Said:
        self._patch.setattr(sys, "argv", ["thermo-fix", *map(str, arguments)])
        self._capture.readouterr()
        with pytest.raises(SystemExit) as leave:
            main()
        said = self._capture.readouterr()
        code = leave.value.code
        assert isinstance(code, int)
        assert "Traceback" not in said.err
        return Said(code, said.out, said.err)


@pytest.fixture
def thermo_fix(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Command:
    return Command(monkeypatch, capsys)


def process(*arguments: str | Path, **environment: str) -> Said:
    """Run the command as a process of its own, with its output in pipes."""
    done = subprocess.run(
        [sys.executable, "-m", "thermo_fix", *map(str, arguments)],
        capture_output=True,
        text=True,
        encoding="utf-8",
        env={**os.environ, "PYTHONPATH": str(Path(__file__).parent.parent), **environment},
        timeout=120,
        check=False,
    )
    assert "Traceback" not in done.stderr
    return Said(done.returncode, done.stdout, done.stderr)


def findings(folder: Path) -> dict[str, Any]:
    content: dict[str, Any] = json.loads(
        (folder / "results" / "findings.json").read_text(encoding="utf-8")
    )
    return content


# ---- help --------------------------------------------------------------------------------------


@pytest.mark.parametrize("flag", ["--help", "-h"])
def test_help_names_every_command(thermo_fix: Command, flag: str) -> None:
    said = thermo_fix(flag)
    assert said.status == 0
    for command in COMMANDS:
        assert re.search(rf"^  {command}\b", said.out, re.MULTILINE), command


@pytest.mark.parametrize("command", COMMANDS)
def test_each_command_has_help(thermo_fix: Command, command: str) -> None:
    said = thermo_fix(command, "--help")
    assert said.status == 0
    assert len(said.out.splitlines()) > 5


def test_help_of_run_tells_the_exit_status(thermo_fix: Command) -> None:
    text = " ".join(thermo_fix("run", "--help").out.split())
    assert "0 all done" in text
    assert "1 some images failed" in text
    assert "2 the survey could not be run" in text
    assert "--out" in text


def test_version(thermo_fix: Command) -> None:
    said = thermo_fix("--version")
    assert (said.status, said.out) == (0, f"thermo_fix {__version__}\n")


@pytest.mark.parametrize(
    "arguments",
    [
        (),
        ("nonsense",),
        ("run",),
        ("run", "--nonsense", "folder"),
        ("run", "one", "two"),
        ("run", "folder", "--jobs", "0"),
        ("point", "warm", "--emissivity", "1"),
        ("point", "60"),
        ("point", "60", "--emissivity", "1", "--nonsense"),
    ],
)
def test_a_wrong_command_line_is_status_2(thermo_fix: Command, arguments: Sequence[str]) -> None:
    said = thermo_fix(*arguments)
    assert said.status == 2
    assert said.out == ""
    assert "Usage" in said.err


# ---- a survey from nothing ---------------------------------------------------------------------


def test_draft_then_vet_then_run(thermo_fix: Command, tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "two words – Mühle 水", "IR 1.tif", "Ü2.tif", sheet=None)
    drafted = thermo_fix("draft", folder)
    assert drafted.status == 0
    assert drafted.err == ""
    # What to type next can be typed as it stands.
    assert shlex.split(drafted.out.splitlines()[-1]) == ["thermo-fix", "vet", str(folder)]
    vetted = thermo_fix("vet", folder)
    assert vetted.status == 0
    assert vetted.err == ""
    assert "2 of 2 images can be used" in vetted.out
    assert not (folder / "results").exists()
    done = thermo_fix("run", folder, *FAST)
    assert done.status == 0
    assert done.err == ""
    assert "2 of 2 images done" in done.out
    assert str(folder / "results" / "report.html") in done.out
    assert [image["file"] for image in findings(folder)["images"]] == ["IR 1.tif", "Ü2.tif"]


def test_draft_does_not_overwrite(thermo_fix: Command, tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    before = files_below(folder)
    said = thermo_fix("draft", folder)
    assert said.status == 2
    assert "survey.toml: is already there" in said.problem
    assert "--force" in said.problem
    assert files_below(folder) == before
    assert thermo_fix("draft", folder, "--force").status == 0
    assert files_below(folder) != before
    assert sorted(files_below(folder)) == ["a.tif", "survey.toml"]


def test_draft_names_what_it_cannot_read_and_does_the_rest(
    thermo_fix: Command, tmp_path: Path
) -> None:
    folder = write_folder(tmp_path, "a.tif", sheet=None)
    write_image(folder / "b.tif", np.zeros((*SHAPE, 3), np.uint8))
    said = thermo_fix("draft", folder)
    assert said.status == 0
    assert said.problem.startswith("b.tif: ")
    assert thermo_fix("vet", folder).status == 0


@pytest.mark.parametrize("name", ["building", "electrical"])
def test_a_drafted_sheet_of_the_demo_images_loads(
    thermo_fix: Command, tmp_path: Path, name: str
) -> None:
    for image in demo_surveys()[name].glob("*.tif"):
        (tmp_path / image.name).write_bytes(image.read_bytes())
    assert thermo_fix("draft", tmp_path).status == 0
    survey: Survey = open_survey(tmp_path)
    # The one that is broken on purpose is left out.
    assert len(survey.images) == len(list(tmp_path.glob("*.tif"))) - 1
    said = thermo_fix("vet", tmp_path)
    assert said.status == 0
    assert "all" in said.out or "of" in said.out


def test_vet_writes_nothing(thermo_fix: Command, tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    before = files_below(folder)
    assert thermo_fix("vet", folder).status == 0
    assert files_below(folder) == before


def test_a_folder_without_a_sheet_runs_and_says_what_was_assumed(
    thermo_fix: Command, tmp_path: Path
) -> None:
    folder = write_folder(tmp_path, "a.tif", sheet=None)
    said = thermo_fix("run", folder, *FAST)
    assert said.status == 0
    assert "no survey sheet" in said.out
    assert "assumed" in said.out
    assert "assumed" in (folder / "results" / "report.html").read_text("utf-8")


def test_out_and_quiet(thermo_fix: Command, tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    said = thermo_fix("run", folder, "--out", tmp_path / "far" / "away", "--quiet", *FAST)
    assert said == Said(0, "", "")
    assert (tmp_path / "far" / "away" / "report.html").is_file()
    assert not (folder / "results").exists()


# ---- one clear line for each trouble -----------------------------------------------------------


def refused(said: Said, folder: Path) -> str:
    """The problem of a survey that could not be run: status 2, one line, nothing written."""
    assert said.status == 2
    assert said.out == ""
    assert not (folder / "results").exists()
    return said.problem


@pytest.mark.parametrize("command", ["run", "vet", "draft"])
def test_no_such_folder(thermo_fix: Command, tmp_path: Path, command: str) -> None:
    said = thermo_fix(command, tmp_path / "none")
    assert said.status == 2
    assert str(tmp_path / "none") in said.problem


@pytest.mark.parametrize("command", ["run", "vet", "draft"])
def test_an_empty_folder(thermo_fix: Command, tmp_path: Path, command: str) -> None:
    said = thermo_fix(command, tmp_path)
    assert "no TIFF" in refused(said, tmp_path)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("command", ["run", "vet"])
@pytest.mark.parametrize(
    ("old", "new", "line", "says"),
    [
        ("emissivity =", "emisivity =", 8, 'nearest known key: "emissivity"'),
        ("value = 0.95", "value = 0", 8, "emissivity"),
        ("value = 0.95", "value = 1.2", 8, "emissivity"),
        ("humidity = 0.5", "humidity = 75", 11, "write 0.75"),
        ("reflected_c = 20.0", "reflected_c = -300.0", 9, "reflected_c"),
        ("distance_m = 2.0", "distance_m = -2.0", 12, "distance_m"),
        ('"building"', '"bilding"', 3, "purpose"),
        ("[scene]", "[scenes]", 7, 'nearest known key: "scene"'),
        ("noise_k = 0.05", "noise_k = ", 6, "TOML"),
    ],
)
def test_a_mistake_in_the_sheet_names_line_and_key(
    thermo_fix: Command, tmp_path: Path, command: str, old: str, new: str, line: int, says: str
) -> None:
    assert old in SHEET
    folder = write_folder(tmp_path, "a.tif", sheet=SHEET.replace(old, new))
    problem = refused(thermo_fix(command, folder), folder)
    assert re.match(rf"survey\.toml, line {line}(, column 11)?: ", problem), problem
    assert says in problem


def test_a_setting_of_a_criterion_with_a_typo(thermo_fix: Command, tmp_path: Path) -> None:
    criteria = "[criteria]\nsettings = { surface_factor_limt = 0.7 }\n"
    folder = write_folder(tmp_path, "a.tif", sheet=SHEET + criteria)
    problem = refused(thermo_fix("run", folder), folder)
    assert "surface_factor_limt" in problem
    assert 'nearest: "surface_factor_limit"' in problem


def test_a_criterion_with_a_typo(thermo_fix: Command, tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", sheet=SHEET + '[criteria]\nuse = ["dewpoint"]\n')
    assert 'nearest: "dew-point"' in refused(thermo_fix("run", folder), folder)


@pytest.mark.parametrize(
    ("second", "says"),
    [("a.tif", "entry already"), ("A.TIF", "in other letters")],
)
def test_a_file_named_twice(thermo_fix: Command, tmp_path: Path, second: str, says: str) -> None:
    sheet = SHEET + IMAGE + IMAGE.replace("a.tif", second)
    folder = write_folder(tmp_path, "a.tif", sheet=sheet)
    problem = refused(thermo_fix("run", folder), folder)
    assert problem.startswith("survey.toml, line 16: ")
    assert f'"{second}"' in problem
    assert says in problem


def test_two_mistakes_are_two_lines(thermo_fix: Command, tmp_path: Path) -> None:
    sheet = SHEET.replace("humidity = 0.5", "humidity = 75").replace("air_c", "air")
    folder = write_folder(tmp_path, "a.tif", sheet=sheet)
    said = thermo_fix("run", folder)
    assert said.status == 2
    assert [line.split(": ")[1] for line in said.err.splitlines()] == [
        "survey.toml, line 10",
        "survey.toml, line 11",
    ]


def truncated(folder: Path) -> None:
    whole = write_image(folder / "b.tif").read_bytes()
    (folder / "b.tif").write_bytes(whole[: len(whole) // 2])


def rgb(folder: Path) -> None:
    write_image(folder / "b.tif", np.zeros((*SHAPE, 3), np.uint8))


def all_nan(folder: Path) -> None:
    write_image(folder / "b.tif", np.full(SHAPE, np.nan, np.float32))


def no_image(folder: Path) -> None:
    (folder / "b.tif").write_text("not an image", encoding="utf-8")


def empty(folder: Path) -> None:
    (folder / "b.tif").write_bytes(b"")


TROUBLES = [
    (truncated, "truncated"),
    (rgb, "RGB picture"),
    (all_nan, "no finite value"),
    (no_image, "not a"),
    (empty, "empty"),
]


@pytest.mark.parametrize(("spoil", "says"), TROUBLES)
def test_an_image_that_cannot_be_used(
    thermo_fix: Command, tmp_path: Path, spoil: Any, says: str
) -> None:
    folder = write_folder(tmp_path, "a.tif", "c.tif")
    spoil(folder)
    vetted = thermo_fix("vet", folder)
    assert vetted.status == 1
    done = thermo_fix("run", folder, *FAST)
    assert done.status == 1
    assert done.problem == vetted.problem
    assert done.problem.startswith("b.tif: ")
    assert says in done.problem
    assert "2 of 3 images done" in done.out
    states = {image["file"]: image["status"] for image in findings(folder)["images"]}
    assert states == {"a.tif": "done", "b.tif": "failed", "c.tif": "done"}
    report = (folder / "results" / "report.html").read_text("utf-8")
    assert "b.tif" in report


def test_an_image_in_a_subfolder_is_named_by_its_path(thermo_fix: Command, tmp_path: Path) -> None:
    images = '[[image]]\nfile = "sub/a.tif"\n[[image]]\nfile = "sub/none.tif"\n'
    folder = write_folder(tmp_path, "sub/a.tif", sheet=SHEET + images)
    said = thermo_fix("run", folder, *FAST)
    assert said.status == 1
    assert said.problem == "sub/none.tif: no such file"


def test_a_polygon_off_the_image(thermo_fix: Command, tmp_path: Path) -> None:
    zone = '[[image.zone]]\nname = "lug B"\npolygon = [[500, 5], [520, 5], [520, 20]]\n'
    sheet = SHEET + IMAGE + zone + IMAGE.replace("a.tif", "b.tif")
    folder = write_folder(tmp_path, "a.tif", "b.tif", sheet=sheet)
    for command in (("vet", folder), ("run", folder, *FAST)):
        said = thermo_fix(*command)
        assert said.status == 1
        assert said.problem.startswith('a.tif: zone "lug B" lies wholly off the image')
    assert [image["status"] for image in findings(folder)["images"]] == ["failed", "done"]


def test_a_failed_run_after_a_good_one_leaves_the_good_one(
    thermo_fix: Command, tmp_path: Path
) -> None:
    folder = write_folder(tmp_path, "a.tif")
    assert thermo_fix("run", folder, *FAST).status == 0
    before = files_below(folder / "results")
    (folder / "survey.toml").write_text(SHEET + "surprise = 1\n", encoding="utf-8")
    assert thermo_fix("run", folder, *FAST).status == 2
    assert files_below(folder / "results") == before


@pytest.mark.parametrize("kind", ["file", "foreign", "around"])
def test_an_unfit_place_for_results(thermo_fix: Command, tmp_path: Path, kind: str) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    out = {"file": tmp_path / "f", "foreign": tmp_path / "d", "around": tmp_path}[kind]
    (tmp_path / "f").write_text("text", encoding="utf-8")
    write_image(tmp_path / "d" / "mine.tif", picture())
    before = files_below(tmp_path)
    said = thermo_fix("run", folder, "--out", out, *FAST)
    assert said.status == 2
    assert "--out" in said.problem
    assert files_below(tmp_path) == before


# ---- point -------------------------------------------------------------------------------------


def temperature(said: Said) -> float:
    assert said.status == 0
    found = re.search(r"surface temperature (-?[0-9.]+) degC", said.out)
    assert found is not None
    return float(found.group(1))


@pytest.mark.parametrize(
    ("options", "expected"),
    [
        # Reading 60 degC, emissivity 0.6, reflected and air 20 degC, air transmittance 0.99:
        # total radiation 80.8, 8-14 um band 81.8 degC; at emissivity 0.3 they are 120.4 and
        # 126.2 degC (Stefan-Boltzmann and Planck, scipy quadrature).
        (("--emissivity", "0.6"), 80.8),
        (("--emissivity", "0.6", "--model", "band"), 81.8),
        (("--emissivity", "0.3"), 120.4),
        (("--emissivity", "0.3", "--model", "band"), 126.2),
    ],
)
def test_point(thermo_fix: Command, options: Sequence[str], expected: float) -> None:
    common = ("point", "60", "--reflected-c", "20", "--air-c", "20", "--transmittance", "0.99")
    assert temperature(thermo_fix(*common, *options)) == pytest.approx(expected, abs=0.06)


def test_point_of_a_black_body_is_the_reading(thermo_fix: Command) -> None:
    assert temperature(thermo_fix("point", "60", "--emissivity", "1")) == 60.0


def test_point_takes_a_surface_and_temperatures_below_zero(thermo_fix: Command) -> None:
    said = thermo_fix("point", "-5.5", "--emissivity", "plaster", "--reflected-c", "-20")
    assert -5.5 < temperature(said) < 0.0
    assert "standard uncertainty" in said.out
    assert "95 %" in said.out


@pytest.mark.parametrize(
    ("options", "says"),
    [
        (("60", "--emissivity", "plastr"), '"plaster"'),
        (("60", "--emissivity", "0"), "emissivity"),
        (("60", "--emissivity", "1.2"), "emissivity"),
        (("60", "--emissivity", "nan"), "emissivity"),
        (("60", "--emissivity", "0.9", "--distance-m", "5", "--humidity", "75"), "humidity"),
        (("60", "--emissivity", "0.9", "--distance-m", "-5"), "distance_m"),
        (("60", "--emissivity", "0.9", "--transmittance", "0"), "transmittance"),
        (("60", "--emissivity", "0.9", "--model", "planck"), "--model planck"),
        (("60", "--emissivity", "0.9", "--model", "band", "--band-um", "14", "8"), "band_um"),
        (("-300", "--emissivity", "0.9"), "reading_c"),
        (("0", "--emissivity", "0.1", "--reflected-c", "40"), "no surface temperature"),
    ],
)
def test_point_refuses_what_cannot_be(
    thermo_fix: Command, options: Sequence[str], says: str
) -> None:
    said = thermo_fix("point", *options)
    assert said.status == 2
    assert said.out == ""
    assert says in said.problem


# ---- as a process ------------------------------------------------------------------------------

ESCAPE = "\x1b"


def test_run_in_a_pipe_is_plain_text(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif", "b.tif")
    (folder / "b.tif").write_bytes(b"II*\x00")
    said = process("run", folder, *FAST)
    assert said.status == 1
    assert said.problem.startswith("b.tif: ")
    assert ESCAPE not in said.out + said.err
    assert "\r" not in said.out + said.err
    assert "1 of 2 images done, 1 findings" in said.out


def test_no_color_is_respected(tmp_path: Path) -> None:
    setting = {"FORCE_COLOR": "1", "NO_COLOR": "1"}
    for arguments in (("--help",), ("run", tmp_path / "none"), ("nonsense",)):
        said = process(*arguments, **setting)
        assert ESCAPE not in said.out + said.err


def test_wrong_command_line_as_a_process() -> None:
    said = process("run")
    assert said.status == 2
    assert said.out == ""


@pytest.mark.skipif(sys.platform == "win32", reason="needs a shell with pipes")
def test_a_reader_that_goes_away_is_no_error(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    command = f'"{sys.executable}" -m thermo_fix vet "{folder}" | head -n 1'
    done = subprocess.run(
        command,
        shell=True,
        capture_output=True,
        text=True,
        env={**os.environ, "PYTHONPATH": str(Path(__file__).parent.parent)},
        timeout=120,
        check=False,
    )
    assert len(done.stdout.splitlines()) == 1
    assert done.stderr == ""


# ---- demo --------------------------------------------------------------------------------------


def test_demo(thermo_fix: Command, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    # Small surveys in place of the real ones, which test_demo.py runs; each has a broken file, as
    # those have on purpose.
    sources = {}
    for name in demo_surveys():
        sources[name] = write_folder(tmp_path / "package" / name, "a.tif", "b.tif")
        (sources[name] / "b.tif").write_bytes(b"II*\x00")
    monkeypatch.setattr("thermo_fix.demo.demo_surveys", lambda: sources)
    before = files_below(tmp_path / "package")
    folder = tmp_path / "my demo"
    said = thermo_fix("demo", folder)
    assert said.status == 0
    assert [line.split(": ")[1] for line in said.err.splitlines()] == ["b.tif", "b.tif"]
    for name in sources:
        assert (folder / name / "results" / "report.html").is_file()
        assert str(folder / name / "results" / "report.html") in said.out
        assert findings(folder / name)["findings"]
    assert files_below(tmp_path / "package") == before
    again = thermo_fix("demo", folder)
    assert again.status == 2
    assert "give a new or empty folder" in again.problem
