"""Bad sheets, weather logs, response curves and criteria: status 2, one line each, nothing written.

What each bad sheet is told is tested in ``tests/test_sheet_mistakes.py``; here it is that the
command tells it, and does nothing else.
"""

import os
from pathlib import Path

import pytest

from tests.survey_folders import SHEET, files_below, picture, write_folder, write_image
from tests.test_cli import Command, process
from tests.test_sheet_mistakes import BAD
from thermo_fix.errors import SheetError
from thermo_fix.text_file import read_text_file

RUN = ("--jobs", "1", "--no-pictures")


@pytest.fixture
def thermo_fix(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Command:
    return Command(monkeypatch, capsys)


def test_there_are_enough_bad_sheets() -> None:
    assert len(BAD) >= 60


@pytest.mark.parametrize("case", BAD)
def test_a_bad_sheet_is_told_in_one_line_and_nothing_is_written(
    thermo_fix: Command, tmp_path: Path, case: str
) -> None:
    sheet, line, _ = BAD[case]
    write_image(tmp_path / "a.tif", picture())
    (tmp_path / "survey.toml").write_text(sheet, encoding="utf-8")
    before = files_below(tmp_path)
    for command in (("run", tmp_path, *RUN), ("vet", tmp_path)):
        said = thermo_fix(*command)
        assert said.status == 2
        assert said.out == ""
        assert f"survey.toml, line {line}" in said.err
        for each in said.err.splitlines():
            assert each.startswith("thermo-fix: survey.toml, line ")
            assert each.isprintable()
    assert files_below(tmp_path) == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.tif", "survey.toml"]


@pytest.mark.parametrize("case", ["unknown key", "humidity in percent", "bow tie"])
def test_the_same_from_a_process_of_its_own(tmp_path: Path, case: str) -> None:
    sheet, line, _ = BAD[case]
    write_image(tmp_path / "a.tif", picture())
    (tmp_path / "survey.toml").write_text(sheet, encoding="utf-8")
    said = process("run", tmp_path)
    assert said.status == 2
    assert said.problem.startswith(f"survey.toml, line {line}: ")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.tif", "survey.toml"]


HEADING = b"time,air_c\n"
ROW = b"2026-01-20T06:00,3\n"
CLASS = b'[[criterion.class]]\nat_least = 1\nlabel = "l"\ntext = "t"\ngrade = "act"\n'
CRITERION = b"""\
[[criterion]]
id = "own"
title = "t"
source = "s"
unit = "K"
gaps = "g"
quantity = "difference"
senses = ["hot"]
"""

BAD_TABLES: dict[str, tuple[str, bytes, str]] = {
    # Key that names the file, its content, a part of the line.
    "empty log": ("weather", b"", "must name the columns"),
    "log of a heading": ("weather", HEADING, "has a heading and no rows"),
    "log of zeros": ("weather", b"\0" * 400, "must name the columns"),
    "log in UTF-16": ("weather", "time,air_c\n".encode("utf-16"), "save it as UTF-8"),
    "log in Latin 1": ("weather", HEADING + b"2026-01-20T06:00,\xb0\n", "line 2: the byte 0xB0"),
    "log of a picture": ("weather", b"\x89PNG\r\n\x1a\n", "not UTF-8 text"),
    "log without time": ("weather", b"air_c\n3\n", "must name the columns"),
    "log with no time": ("weather", HEADING + b"=cmd|' /C calc'!A0,3\n", "is no ISO 8601 time"),
    "log with escapes": ("weather", HEADING + b"\x1b[31m\xe2\x80\xae,3\n", "is no ISO 8601 time"),
    "log before the calendar": (
        "weather",
        HEADING + b"0001-01-01T00:00+14:00,3\n",
        "the year 1 is no time",
    ),
    "log after the calendar": (
        "weather",
        HEADING + b"9999-12-31T23:59-14:00,3\n",
        "the year 9999 is no time",
    ),
    "log of mixed times": ("weather", HEADING + ROW + b"2026-01-20T07:00Z,3\n", "write all alike"),
    "log with no number": ("weather", HEADING + b"2026-01-20T06:00,warm\n", "is no number"),
    "log of infinity": ("weather", HEADING + b"2026-01-20T06:00,inf\n", "is not between"),
    "log of absurd heat": ("weather", HEADING + b"2026-01-20T06:00,1e308\n", "is not between"),
    "log of a long cell": ("weather", HEADING + b"2" * 200_000 + b",3\n", "no CSV file"),
    "log of an open quote": ("weather", HEADING + b'"' + ROW * 9000, "no CSV file"),
    "log with a column twice": ("weather", b"time,air_c,air_c\n" + ROW, "stands twice"),
    "empty curve": ("response_file", b"", "response"),
    "curve of one point": ("response_file", b"8,1\n", "response"),
    "curve of text": ("response_file", b"um,r\nfar,near\n", "line 2: 'far,near' is no pair"),
    "curve with escapes": ("response_file", b"8,1\n\x1b[31m,1\n", "is no pair of numbers"),
    "curve of three": ("response_file", b"8,1,1\n9,1,1\n", "is no pair of numbers"),
    "curve of NaN": ("response_file", b"8,1\n9,nan\n10,1\n", "response"),
    "curve of infinity": ("response_file", b"8,1\ninf,1\n", "response"),
    "curve that falls back": ("response_file", b"8,1\n7,1\n9,1\n", "response"),
    "curve below zero": ("response_file", b"8,1\n9,-1\n10,1\n", "response"),
    "curve of zero": ("response_file", b"8,0\n9,0\n10,0\n", "response"),
    "curve of gamma rays": ("response_file", b"1e-9,1\n2e-9,1\n", "response"),
    "curve of many points": ("response_file", b"8,1\n" * 30_000, "give fewer points"),
    "curve in UTF-16": ("response_file", "8,1\n".encode("utf-16"), "save it as UTF-8"),
    "curve of a long cell": ("response_file", b"8," + b"1" * 200_000, "no CSV file"),
    "empty criteria": ("file", b"", "must hold [[criterion]] tables"),
    "criteria that are no TOML": ("file", b"= =", "not valid TOML"),
    "criteria in UTF-16": ("file", "a = 1\n".encode("utf-16"), "save it as UTF-8"),
    "criteria of zeros": ("file", b"\0" * 100, "not valid TOML"),
    "criteria without classes": ("file", CRITERION, "needs at least one"),
    "deep criteria": ("file", b"criterion = " + b"[" * 20_000, "nested too deeply"),
    "long number": ("file", b"criterion = " + b"9" * 9_000, "not valid TOML"),
    "class of a huge number": (
        "file",
        CRITERION + CLASS.replace(b"= 1\n", b"= 1" + b"0" * 400 + b"\n"),
        "must be a number",
    ),
    "class of NaN": ("file", CRITERION + CLASS.replace(b"= 1\n", b"= nan\n"), "must be a number"),
    "unknown grade": ("file", CRITERION + CLASS.replace(b'"act"', b'"\\u001b[1m"'), "grade = "),
    "unknown quantity": ("file", CRITERION.replace(b'"difference"', b'["x"]') + CLASS, "quantity"),
    "unknown key": ("file", CRITERION + b'"a\\nb" = 1\n' + CLASS, "unknown key"),
    "criterion twice": ("file", (CRITERION + CLASS) * 2, "stands twice"),
}
TABLE_OF = {"weather": "survey", "response_file": "camera", "file": "criteria"}


def with_table(folder: Path, key: str) -> Path:
    """A survey whose sheet names ``table.txt`` under a key."""
    heading, entry = f"[{TABLE_OF[key]}]", f'{key} = "table.txt"\n'
    sheet = SHEET if heading in SHEET else f"{SHEET}{heading}\n"
    if key == "weather":
        entry += "utc_offset_hours = 1\n"
    write_folder(folder, "a.tif", sheet=sheet.replace(f"{heading}\n", f"{heading}\n{entry}"))
    return folder / "table.txt"


@pytest.mark.parametrize("case", BAD_TABLES)
def test_a_bad_table_is_told_in_one_line_and_nothing_is_written(
    thermo_fix: Command, tmp_path: Path, case: str
) -> None:
    key, content, says = BAD_TABLES[case]
    with_table(tmp_path, key).write_bytes(content)
    said = thermo_fix("run", tmp_path, *RUN)
    assert said.status == 2, said
    assert said.out == ""
    assert says in said.problem
    assert "table.txt" in said.problem or "response" in said.problem
    assert said.problem.isprintable()
    assert len(said.problem) < 400
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.tif", "survey.toml", "table.txt"]


@pytest.mark.parametrize("key", TABLE_OF)
def test_a_table_that_is_too_large_is_not_read(
    thermo_fix: Command, tmp_path: Path, key: str
) -> None:
    with with_table(tmp_path, key).open("wb") as stream:
        stream.truncate(2**40)
    said = thermo_fix("run", tmp_path, *RUN)
    assert said.status == 2
    assert said.problem.startswith("table.txt: 1099512 MB is too large for a")


@pytest.mark.parametrize("key", TABLE_OF)
@pytest.mark.parametrize("kind", ["pipe", "folder", "absent", "link outside"])
def test_a_table_that_is_no_file(thermo_fix: Command, tmp_path: Path, key: str, kind: str) -> None:
    table = with_table(tmp_path / "survey", key)
    if kind == "pipe":
        os.mkfifo(table)
    elif kind == "folder":
        table.mkdir()
    elif kind == "link outside":
        (tmp_path / "secret").write_text("secret")
        table.symlink_to(tmp_path / "secret")
    said = thermo_fix("run", tmp_path / "survey", *RUN)
    assert said.status == 2
    assert said.problem.startswith("survey.toml, line ")
    assert ("leads out of" if kind == "link outside" else "no such file") in said.problem


def test_a_pipe_that_takes_the_place_of_a_table_is_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "a.csv")
    with pytest.raises(SheetError, match="no ordinary file; a log is a text file"):
        read_text_file(tmp_path / "a.csv", 100, "a log", "cut it")
    with pytest.raises(SheetError, match="no ordinary file"):
        read_text_file(tmp_path, 100, "a log", "cut it")
    with pytest.raises(SheetError, match="cannot be read"):
        read_text_file(tmp_path / "none", 100, "a log", "cut it")
