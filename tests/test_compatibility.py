"""What other programs and older sheets rely on: versions, and keys that were renamed."""

import importlib.metadata
import json
import re
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any

import pytest

from tests.sheets import load, refused
from tests.survey_folders import SHEET, write_folder
from thermo_fix import __all__ as public_names
from thermo_fix import run_survey
from thermo_fix.cli import main
from thermo_fix.results.document import SCHEMA_VERSION
from thermo_fix.sheet import renamed
from thermo_fix.sheet.renamed import RENAMED, Renamed, renewed
from thermo_fix.sheet.schema import SHEET_VERSION, TABLES, known_keys
from thermo_fix.survey import RunOptions

ROOT = Path(__file__).parent.parent
PROJECT: dict[str, Any] = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))
DOCS = (ROOT / "docs" / "compatibility.md").read_text("utf-8")

OLD_AIR = Renamed(("scene", "image", "image.zone"), "air_temp_c", "air_c", "0.2", "0.3")
"""A name that never was."""
OLD_TABLE = Renamed(("",), "rules", "criteria", "0.2", "0.3")


@pytest.fixture
def old_names(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(renamed, "RENAMED", (OLD_AIR, OLD_TABLE))


def command(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], *arguments: str
) -> tuple[object, str, str]:
    monkeypatch.setattr(sys, "argv", ["thermo-fix", *arguments])
    with pytest.raises(SystemExit) as leave:
        main()
    said = capsys.readouterr()
    return leave.value.code, said.out, said.err


# ---- versions of sheet and results -------------------------------------------------------------


@pytest.mark.parametrize("name", ["run", "vet"])
def test_a_newer_sheet_is_refused_in_one_line(
    name: str,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    newer = f"sheet_version = {SHEET_VERSION + 1}\nof_the_future = true\n" + SHEET
    write_folder(tmp_path, "a.tif", sheet=newer)
    status, out, err = command(monkeypatch, capsys, name, str(tmp_path))
    assert (status, out) == (2, "")
    (line,) = err.splitlines()
    assert "survey.toml, line 1" in line
    assert f"reads version {SHEET_VERSION} of the sheet" in line
    assert "use a newer program" in line
    assert not (tmp_path / "results").exists()


def test_this_version_of_the_sheet_may_be_stated(tmp_path: Path) -> None:
    stated = load(tmp_path, f"sheet_version = {SHEET_VERSION}\n" + SHEET, "a.tif")
    assert stated.title == "Small survey"


def test_results_name_their_version_and_that_of_the_program(tmp_path: Path) -> None:
    write_folder(tmp_path, "a.tif")
    run_survey(tmp_path, options=RunOptions(jobs=1, planes=False, pictures=False))
    content = json.loads((tmp_path / "results" / "findings.json").read_text("utf-8"))
    schema = json.loads((ROOT / "thermo_fix" / "data" / "findings.schema.json").read_text("utf-8"))
    assert content["schema"] == SCHEMA_VERSION
    assert schema["properties"]["schema"]["const"] == SCHEMA_VERSION
    assert content["tool"]["name"] == "thermo_fix"
    assert content["tool"]["version"] == importlib.metadata.version("thermo-fix")


# ---- renamed keys ------------------------------------------------------------------------------


def test_the_table_of_renamed_keys_is_sound() -> None:
    for entry in RENAMED:
        for table in entry.tables:
            keys = known_keys(tuple(table.split(".")) if table else ())
            assert entry.new in keys
            assert entry.old not in keys


@pytest.mark.usefixtures("old_names")
def test_an_old_name_is_read_with_one_note(tmp_path: Path) -> None:
    image = '[[image]]\nfile = "a.tif"\nair_temp_c = 12.5\n'
    survey = load(tmp_path, SHEET.replace("air_c = 20.0", "air_temp_c = 21.5") + image, "a.tif")
    (job,) = survey.images
    assert job.inputs.value("air_c") == 12.5
    (note,) = (note for note in survey.notes if "air_temp_c" in note)
    assert '"air_c" since version 0.2' in note
    assert "until version 0.3" in note


@pytest.mark.usefixtures("old_names")
def test_an_old_name_of_a_table_is_read(tmp_path: Path) -> None:
    survey = load(tmp_path, SHEET + '[rules]\nuse = ["dew-point"]\n', "a.tif")
    assert survey.criteria == ("dew-point",)


@pytest.mark.usefixtures("old_names")
def test_the_new_name_needs_no_note(tmp_path: Path) -> None:
    survey = load(tmp_path, SHEET, "a.tif")
    assert survey.images[0].inputs.value("air_c") == 20.0
    assert not any("air_temp_c" in note for note in survey.notes)


@pytest.mark.usefixtures("old_names")
def test_both_names_at_once_are_a_mistake(tmp_path: Path) -> None:
    (line,) = refused(tmp_path, SHEET.replace("air_c = 20.0", "air_c = 20.0\nair_temp_c = 21.0"))
    number = SHEET.splitlines().index("air_c = 20.0") + 2
    assert f"line {number}:" in line
    assert '"air_temp_c" is the old name of "air_c"' in line


@pytest.mark.usefixtures("old_names")
def test_a_mistake_under_an_old_name_is_shown_as_it_stands_in_the_sheet(tmp_path: Path) -> None:
    (line,) = refused(tmp_path, SHEET.replace("air_c = 20.0", 'air_temp_c = "warm"'))
    assert f"line {SHEET.splitlines().index('air_c = 20.0') + 1}:" in line
    assert '[scene].air_temp_c = "warm"' in line


def test_an_old_name_in_another_table_stays_unknown(tmp_path: Path) -> None:
    raw: dict[str, object] = {"camera": {"air_temp_c": 3.0}}
    assert renewed(raw, (OLD_AIR,)).sheet == raw


def test_without_renamed_keys_the_sheet_is_taken_as_it_is() -> None:
    raw: dict[str, object] = {"scene": {"air_c": 3.0}}
    renewal = renewed(raw, ())
    assert renewal.sheet is raw
    assert renewal.notes == ()


# ---- what is promised --------------------------------------------------------------------------


def test_the_promise_names_every_table_and_public_name() -> None:
    for table in TABLES:
        assert f"`[{table}]`" in DOCS
    for name in public_names:
        assert f"`{name}`" in DOCS


@pytest.mark.parametrize("first", ["thermo_fix.correct.frame", "thermo_fix.survey"])
def test_the_function_is_not_hidden_by_the_stage_of_its_name(first: str) -> None:
    # In a process of its own, because the order of the imports is what matters.
    code = f"import {first}, thermo_fix; print(thermo_fix.correct(20.0, emissivity=1.0).u_k > 0)"
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert (done.stdout, done.stderr) == ("True\n", "")


def test_the_promise_names_the_pythons_of_the_project() -> None:
    minors = re.findall(r"Python :: 3\.(\d+)", " ".join(PROJECT["project"]["classifiers"]))
    assert PROJECT["project"]["requires-python"] == f">=3.{min(map(int, minors))}"
    assert f"3.{min(map(int, minors))} to 3.{max(map(int, minors))}" in DOCS
