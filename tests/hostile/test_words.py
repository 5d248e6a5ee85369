"""Words from outside: file names, sheets and tables say what they like, and forge nothing."""

import csv
import html.parser
import json
import os
import re
import sys
import urllib.parse
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.survey_folders import SHEET, files_below, picture, write_folder, write_image
from tests.test_cli import Command, Said
from thermo_fix.cli import main
from thermo_fix.errors import FolderError, about_file, one_line
from thermo_fix.survey import RunOptions, _plane_names, run_survey

ONE = RunOptions(jobs=1)

NAMES = [
    "two words",
    "Ünder-straße",
    "端子 3",
    "لوحة",
    "पैनल",
    "e\u0301 and é",
    "100% #1 a?b&c=d",
    'it\'s "quoted"',
    "back\\slash",
    "<b>bold",
    "$(touch here) `id`",
    "~",
    "-rf",
    "[red]rich[bold]",
    "{{ 7 * 7 }} {% raise %}",
    "%s%n%d {0}",
    "=1+1",
    "＝1+1",
    "+1",
    "@x",
    ",;\t,",
    "line\nbreak",
    "carriage\rreturn",
    "colour \x1b[31m\x1b]0;title\x07",
    "back\x08space",
    "C1 \x9b31m",
    "right to left \u202etxt.exe",
    "isolate \u2067x",
    "zero\u200bwidth\u2028line\u2029paragraph",
    "\ufeffmark",
    "no text \udcff\udc9b",
    "emoji 🔥👩\u200d🔬",
    "CON",
    "a..b",
    "n" * 240,
]
"""Stems of images; each is a good name on a usual file system."""

UNSEEN = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069]")
BAD_NAMES = [name for name in NAMES if len(name) < 200]
ESCAPES = re.compile(r"[\x00-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069\ud800-\udfff]")


@pytest.fixture
def thermo_fix(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Command:
    return Command(monkeypatch, capsys)


@pytest.fixture(scope="module")
def named(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A survey of oddly named images, and of as many that fail."""
    folder = write_folder(tmp_path_factory.mktemp("named") / "survey")
    for number, name in enumerate(NAMES):
        write_image(folder / f"{name}.tif", picture(seed=number))
    for name in BAD_NAMES:
        (folder / f"{name} bad.tif").write_bytes(b"no image")
    return folder


@pytest.fixture(scope="module")
def spoken(named: Path) -> Said:
    out, err = named.parent / "out", named.parent / "err"
    with (
        pytest.MonkeyPatch().context() as patch,
        out.open("w", encoding="utf-8", newline="") as stdout,
        err.open("w", encoding="utf-8", newline="") as stderr,
    ):
        patch.setattr(sys, "argv", ["thermo-fix", "run", str(named), "--jobs", "1"])
        patch.setattr(sys, "stdout", stdout)
        patch.setattr(sys, "stderr", stderr)
        with pytest.raises(SystemExit) as leave:
            main()
    texts = [path.read_bytes().decode("utf-8") for path in (out, err)]
    return Said(int(str(leave.value.code)), *texts)


def test_images_of_any_name_are_done_and_bad_ones_get_one_line(named: Path, spoken: Said) -> None:
    assert spoken.status == 1
    lines = spoken.err.split("\n")[:-1]
    assert len(lines) == len(BAD_NAMES)
    says = "not a TIFF file; export the radiometric data as TIFF"
    assert set(lines) == {f"thermo-fix: {one_line(name)} bad.tif: {says}" for name in BAD_NAMES}
    assert f"{len(NAMES)} of {len(NAMES) + len(BAD_NAMES)} images done" in spoken.out
    for text in (spoken.out, spoken.err):
        assert not ESCAPES.search(text.replace("\n", ""))


def test_json_holds_each_name_as_it_is(named: Path, spoken: Said) -> None:
    content = json.loads((named / "results/findings.json").read_text("utf-8"))
    done = {image["file"] for image in content["images"] if image["status"] == "done"}
    assert done == {f"{name}.tif" for name in NAMES}
    for image in content["images"]:
        assert image["status"] == "done" or "\n" not in image["error"]


def test_no_cell_of_the_table_is_a_formula(named: Path, spoken: Said) -> None:
    with (named / "results/findings.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) >= len(NAMES)
    for row in rows:
        for column in ("image", "zone", "reference", "settle", "cautions", "criterion"):
            assert not re.match(r"[\s\ufeff\u200b]*[=+@＝-]", row[column]), row[column]
    images = {row["image"] for row in rows}
    assert {"'=1+1.tif", "'＝1+1.tif", "'+1.tif", "'@x.tif", "'-rf.tif"} <= images


def test_planes_have_the_names_of_their_images(named: Path, spoken: Said) -> None:
    for kind in ("corrected", "uncertainty"):
        planes = {path.name for path in (named / "results" / kind).iterdir()}
        assert planes == {f"{name}.tif" for name in NAMES}


class _Links(html.parser.HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.targets: set[str] = set()
        self.ids: set[str] = set()
        self.elements: set[str] = set()
        self.text = ""

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        self.elements.add(tag)
        for name, value in attributes:
            assert not name.startswith("on"), name
            if name == "href":
                self.targets.add(str(value))
            if name == "id":
                self.ids.add(str(value))

    def handle_data(self, data: str) -> None:
        self.text += data


def test_the_report_shows_the_names_as_text_and_its_links_lead_somewhere(
    named: Path, spoken: Said
) -> None:
    # Past some dozens of images the report is an entry page with a page for each.
    pages = [named / "results/report.html", *sorted((named / "results/pages").iterdir())]
    seen = {path: _Links() for path in pages}
    for path, links in seen.items():
        page = path.read_bytes().decode("utf-8")
        links.feed(page)
        assert not UNSEEN.search(page)
        assert "b" not in links.elements
    text = "".join(links.text for links in seen.values())
    for name in ("<b>bold", "{{ 7 * 7 }} {% raise %}", "端子 3", "100% #1 a?b&c=d", "لوحة"):
        assert name in text
    for path, links in seen.items():
        for target in links.targets - {"#"}:
            if target.startswith("data:"):
                continue
            file, _, anchor = urllib.parse.unquote(target).partition("#")
            other = Path(os.path.normpath(path.parent / file)) if file else path
            assert other in seen, target
            assert not anchor or anchor in seen[other].ids, target


def test_a_run_again_takes_all_of_it_over(named: Path, spoken: Said) -> None:
    before = files_below(named / "results/corrected")
    assert len(run_survey(named, options=ONE).failed) == len(BAD_NAMES)
    assert files_below(named / "results/corrected") == before


# ---- what a sheet says -------------------------------------------------------------------------

EVIL = r"\u001b[2J\u202e<script>alert(1)</script>\u009b=cmd"


@pytest.mark.parametrize(
    "line",
    [
        f'title = "{EVIL}"',
        f'surveyor = "{EVIL}"',
        f'"{EVIL}" = 1',
        f'purpose = "{EVIL}"',
        f'date = "{EVIL}"',
    ],
)
def test_a_sheet_cannot_talk_to_the_terminal(
    thermo_fix: Command, tmp_path: Path, line: str
) -> None:
    sheet = SHEET.replace('title = "Small survey"\n', "")
    sheet = sheet.replace('purpose = "building"\n', "") if "purpose" in line else sheet
    folder = write_folder(tmp_path, "a.tif", sheet=sheet.replace("[survey]", f"[survey]\n{line}"))
    said = thermo_fix("run", folder, "--jobs", "1", "--no-pictures")
    assert said.status in (0, 2)
    assert not ESCAPES.search((said.out + said.err).replace("\n", ""))
    if said.status == 2:
        assert said.problem.startswith("survey.toml, line 2: ")
    else:
        assert "<script>alert" not in (folder / "results/report.html").read_text("utf-8")


def test_zone_names_are_no_paths(tmp_path: Path) -> None:
    zone = '[[image.zone]]\nname = "../../../up"\npolygon = [[28, 18], [46, 18], [46, 34]]\n'
    sheet = SHEET + '[[image]]\nfile = "a.tif"\n' + zone + zone.replace("../../../up", "/abs\\n")
    folder = write_folder(tmp_path / "deep" / "survey", "a.tif", sheet=sheet)
    assert run_survey(folder, options=ONE).failed == ()
    assert {path.name for path in tmp_path.iterdir()} == {"deep"}
    assert {path.name for path in folder.iterdir()} == {"a.tif", "survey.toml", "results"}


@pytest.mark.parametrize("name", ["../up.tif", "/up.tif", "a/../../up.tif", "C:/up.tif"])
def test_planes_stay_in_the_results(name: str) -> None:
    # Such a name never comes through a sheet; this is the second lock.
    (plane,) = _plane_names([name]).values()
    if ".." in name or name.startswith("/"):
        assert plane == "image 1.tif"


def test_every_plane_has_a_name_of_its_own() -> None:
    files = ["a.tif", "A.TIF", "a.tiff", "a.tif.tif", "image 5.tif", "n" * 251 + ".tif", "b/a.tif"]
    files += ["n" * 250 + ".tiff", "x/../a.tif"]
    names = _plane_names(files)
    assert len({name.casefold() for name in names.values()}) == len(files)
    for name in names.values():
        assert ".." not in Path(name).parts
        assert all(len(part.encode()) <= 255 for part in Path(name).parts)


@given(st.lists(st.text("aA./\u0301ßſ", min_size=1, max_size=6), unique=True))
def test_any_names_give_planes_of_their_own_inside(files: list[str]) -> None:
    names = _plane_names([f"{file}.tif" for file in files])
    assert len({name.casefold() for name in names.values()}) == len(files)
    for name in names.values():
        assert not Path(os.path.normpath(Path("results") / name)).is_absolute()
        assert os.path.normpath(Path("results") / name).startswith("results/")


# ---- one line ----------------------------------------------------------------------------------


@given(st.text(st.characters()))
def test_one_line_is_one_line_and_shows_everything(text: str) -> None:
    line = one_line(text)
    assert line.isprintable()
    assert one_line(line) == line
    line.encode("utf-8")


def test_plain_text_of_any_script_is_left_alone() -> None:
    for text in ("Mühle", "端子 3", "لوحة", "🔥", "a\\b", ""):
        assert one_line(text) == text
    assert one_line("a\nb\x1b[1m\u202e\udcff\x9b") == r"a\nb\x1b[1m\u202e\udcff\x9b"


def test_about_file_names_an_odd_file_once() -> None:
    assert about_file("sub/a\nb.tif", r"a\nb.tif: empty") == r"sub/a\nb.tif: empty"
    assert about_file("a\nb.tif", r"a\nb.tif: empty") == r"a\nb.tif: empty"
    assert about_file("a.tif", "empty") == "a.tif: empty"


# ---- the terminal ------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "arguments",
    [
        ("run", "none \x1b[31m\n\u202e"),
        ("vet", "none \x1b[31m\n\u202e"),
        ("draft", "none \x1b[31m\n\u202e"),
        ("point", "60", "--emissivity", "\x1b[31m\nwood\u202e"),
        ("point", "60", "--emissivity", "0.9", "--model", "\x1b[31m\n\u202e"),
        ("solve", "transmittance", ".", "--through", "\x1b\n", "--direct", "a:b"),
        ("run", "folder", "--\x1b[31m\n\u202e"),
        ("\x1b[31m\n\u202e",),
    ],
)
def test_arguments_are_shown_and_not_obeyed(
    thermo_fix: Command, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, arguments: tuple[str, ...]
) -> None:
    monkeypatch.chdir(tmp_path)
    said = thermo_fix(*arguments)
    assert said.status == 2
    assert not ESCAPES.search((said.out + said.err).replace("\n", ""))


def test_a_drafted_sheet_of_odd_names_can_be_used(thermo_fix: Command, tmp_path: Path) -> None:
    names = [name for name in NAMES if not name.startswith(".")]
    folder = write_folder(tmp_path / "$(here) 'x' `y`", sheet=None)
    for number, name in enumerate(names):
        write_image(folder / f"{name}.tif", picture(seed=number))
    said = thermo_fix("draft", folder)
    assert said.status == 0
    assert not ESCAPES.search((said.out + said.err).replace("\n", ""))
    # What is to be pasted is one word for the shell.
    assert "'\"'\"'" in said.out
    vetted = thermo_fix("vet", folder)
    assert vetted.status == 0, vetted.err


def test_debug_shows_where_and_otherwise_nothing_does(
    thermo_fix: Command, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from thermo_fix import survey

    def broken(folder: Path) -> None:
        raise ZeroDivisionError(f"in {folder}\n\x1b[31m")

    folder = write_folder(tmp_path, "a.tif")
    monkeypatch.setattr(survey, "open_survey", broken)
    said = thermo_fix("run", folder)
    assert said.status == 2
    assert said.problem.startswith("a fault of this program (ZeroDivisionError: in ")
    assert "--debug" in said.problem
    monkeypatch.setattr(sys, "argv", ["thermo-fix", "--debug", "run", str(folder)])
    with pytest.raises(SystemExit) as leave:
        main()
    assert leave.value.code == 2


def test_debug_prints_the_traceback(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys, "argv", ["thermo-fix", "--debug", "run", str(tmp_path / "none")])
    with pytest.raises(SystemExit) as leave:
        main()
    said = capsys.readouterr().err
    assert leave.value.code == 2
    assert "Traceback" in said
    assert said.splitlines()[-1].startswith("thermo-fix: ")
    monkeypatch.setattr(sys, "argv", ["thermo-fix", "run", str(tmp_path / "none")])
    with pytest.raises(SystemExit):
        main()
    assert "Traceback" not in capsys.readouterr().err


def test_a_default_results_folder_that_is_a_link_is_refused(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    (tmp_path / "elsewhere").mkdir()
    (folder / "results").symlink_to(tmp_path / "elsewhere")
    with pytest.raises(FolderError, match="is a link"):
        run_survey(folder, options=ONE)
    assert list((tmp_path / "elsewhere").iterdir()) == []


def test_a_work_folder_that_is_a_link_is_not_followed(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    (tmp_path / "elsewhere").mkdir()
    (folder / ".results.work").symlink_to(tmp_path / "elsewhere")
    assert run_survey(folder, options=ONE).failed == ()
    assert list((tmp_path / "elsewhere").iterdir()) == []
    assert not (folder / ".results.work").is_symlink()


def test_a_sheet_is_not_written_through_a_link(thermo_fix: Command, tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif", sheet=None)
    (tmp_path / "secret").write_text("secret")
    for name in (".survey.toml.partial", "survey.toml"):
        (folder / name).unlink(missing_ok=True)
        (folder / name).symlink_to(tmp_path / "secret")
        assert thermo_fix("draft", folder, "--force").status == 0
    assert (tmp_path / "secret").read_text() == "secret"
    assert not (folder / "survey.toml").is_symlink()
    other = tmp_path / "other"
    other.touch()
    assert (folder / "survey.toml").stat().st_mode == other.stat().st_mode


@pytest.mark.parametrize("kind", ["link", "pipe", "folder"])
def test_a_lock_that_is_no_file_is_not_followed(tmp_path: Path, kind: str) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    lock = folder / ".results.lock"
    if kind == "link":
        lock.symlink_to(tmp_path / "made by the link")
    elif kind == "pipe":
        os.mkfifo(lock)
    else:
        lock.mkdir()
    if kind == "pipe":
        run_survey(folder, options=ONE)
    else:
        with pytest.raises(FolderError, match="cannot be written"):
            run_survey(folder, options=ONE)
    assert not (tmp_path / "made by the link").exists()
