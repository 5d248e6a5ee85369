"""Bad files beside good ones: each gets its line, the good ones are done."""

import contextlib
import json
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import cv2
import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.hostile.bad_files import BAD_ENTRIES, BAD_FILES, GOOD, write_bad_files
from tests.survey_folders import SHEET, files_below, picture, write_folder, write_image
from thermo_fix import work
from thermo_fix.errors import ImageError, SheetError, UnreadableImage
from thermo_fix.read import ReadLimits
from thermo_fix.read.photo import read_photo
from thermo_fix.records import ImageResult, SurveyResult
from thermo_fix.results.kept import KeptImage
from thermo_fix.survey import RunOptions, run_survey

ROOT = Path(__file__).parents[2]
BARE = RunOptions(jobs=1, pictures=False)
GOOD_NAMES = ("IR_1.tif", "IR_2.tif", "IR_3.tif")
COMMAND = """\
import resource, sys
from thermo_fix.cli import main
try:
    main()
finally:
    print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss // 1024)
"""


def command(*arguments: str | Path, cwd: Path) -> tuple[int, list[str], int]:
    """Run the command; return status, lines on standard error and peak memory in MiB."""
    done = subprocess.run(
        [sys.executable, "-c", COMMAND, *map(str, arguments)],
        capture_output=True,
        text=True,
        cwd=cwd,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        timeout=120,
        check=False,
    )
    return done.returncode, done.stderr.splitlines(), int(done.stdout.splitlines()[-1])


def test_there_are_enough_of_them() -> None:
    assert len(BAD_FILES) + len(BAD_ENTRIES) >= 60
    assert GOOD not in [content for content, _ in BAD_FILES.values()]


@pytest.mark.parametrize("arguments", [("vet",), ("run", "--jobs", "1", "--no-pictures")])
def test_each_bad_file_gets_its_line_and_the_good_ones_are_done(
    tmp_path: Path, arguments: tuple[str, ...]
) -> None:
    folder = write_folder(tmp_path / "survey", *GOOD_NAMES)
    due = write_bad_files(folder)
    status, lines, peak_mib = command(arguments[0], folder, *arguments[1:], cwd=tmp_path)
    assert status == 1
    assert len(lines) == len(due)
    for name, says in due.items():
        (line,) = [line for line in lines if line.startswith(f"thermo-fix: {name}: ")]
        assert says in line, line
        assert line.isprintable()
        assert len(line) < 250
    # A usual image costs some 200 MiB with all libraries; the worst of these would cost tens of
    # gigabytes, were it believed.
    assert peak_mib < 700
    if arguments[0] == "vet":
        assert not (folder / "results").exists()
        return
    content = json.loads((folder / "results/findings.json").read_text("utf-8"))
    states = {image["file"]: image["status"] for image in content["images"]}
    assert states == dict.fromkeys(GOOD_NAMES, "done") | dict.fromkeys(due, "failed")
    planes = sorted(path.name for path in (folder / "results/corrected").iterdir())
    assert planes == sorted(GOOD_NAMES)
    assert not [path for path in tmp_path.rglob(".*") if path.name != ".kept"]


def test_the_good_one_of_the_corpus_is_good(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    (folder / "a.tif").write_bytes(GOOD)
    assert run_survey(folder, options=BARE).failed == ()


# ---- a file that does not hold still -----------------------------------------------------------


def changed_after_hashing(
    monkeypatch: pytest.MonkeyPatch, path: Path, content: Callable[[], bytes]
) -> None:
    """Let another program write to a file between the two times that it is read."""
    compute = work._compute

    def late(task: work.ImageTask, key: str) -> KeptImage:
        path.write_bytes(content())
        return compute(task, key)

    monkeypatch.setattr(work, "_compute", late)


def only(result: SurveyResult, file: str) -> ImageResult:
    return next(image for image in result.images if image.file == file)


SHEET_OF_ONE = (
    SHEET.replace("{ value = 0.95, u = 0.02 }", '{ file = "planes/e.tif" }')
    + '[[image]]\nfile = "a.tif"\nphoto = "a.jpg"\n'
)


@pytest.mark.parametrize("name", ["a.tif", "planes/e.tif", "a.jpg"])
def test_a_file_that_changes_while_it_is_read(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str
) -> None:
    folder = write_folder(tmp_path, "a.tif", sheet=SHEET_OF_ONE)
    write_image(folder / "planes/e.tif", np.full_like(picture(), 0.9))
    cv2.imwrite(str(folder / "a.jpg"), np.full((20, 30, 3), 100, np.uint8))
    assert run_survey(folder, options=BARE).failed == ()
    other = {
        "a.tif": lambda: write_image(tmp_path / "x/x.tif", picture(seed=9)).read_bytes(),
        "planes/e.tif": lambda: write_image(
            tmp_path / "x/x.tif", np.full_like(picture(), 0.8)
        ).read_bytes(),
        "a.jpg": lambda: b"another",
    }
    changed_after_hashing(monkeypatch, folder / name, other[name])
    (failed,) = run_survey(folder, options=RunOptions(jobs=1, fresh=True)).failed
    about = "a.tif: " if name == "a.tif" else f"a.tif: {Path(name).name} "
    assert failed.error == (
        f"{about}changed while it was read; wait until nothing writes to it, and run again"
    )
    monkeypatch.undo()
    # What was computed of it is not believed.
    assert run_survey(folder, options=BARE).failed == ()
    clean = files_below(folder / "results/corrected")
    run_survey(folder, options=RunOptions(jobs=1, pictures=False, fresh=True))
    assert files_below(folder / "results/corrected") == clean


def test_a_sheet_that_changes_while_it_is_read(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from thermo_fix import survey as module

    folder = write_folder(tmp_path, "a.tif")
    opened = module.open_survey

    def late(place: Path) -> Any:
        found = opened(place)
        (folder / "survey.toml").write_text(SHEET.replace("0.95", "0.90"), encoding="utf-8")
        return found

    monkeypatch.setattr(module, "open_survey", late)
    with pytest.raises(SheetError, match=r"survey\.toml: changed while it was read"):
        run_survey(folder, options=BARE)
    assert sorted(files_below(folder)) == ["a.tif", "survey.toml"]


def test_a_file_that_may_not_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = write_folder(tmp_path, "a.tif", "b.tif")
    usual = Path.open

    def refuse(self: Path, *arguments: Any, **options: Any) -> Any:
        if self.name == "a.tif":  # the superuser may read everything
            raise PermissionError(13, "Permission denied", str(self))
        return usual(self, *arguments, **options)

    monkeypatch.setattr(Path, "open", refuse)
    (failed,) = run_survey(folder, options=BARE).failed
    assert failed.error == (
        "a.tif: cannot be read (permission denied); check its permissions and its disk"
    )


def test_a_fault_of_the_program_costs_one_image_and_says_so(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = write_folder(tmp_path, "a.tif", "b.tif")
    compute = work._compute

    def faulty(task: work.ImageTask, key: str) -> KeptImage:
        if task.job.file == "a.tif":
            raise KeyError("no such\nthing")
        return compute(task, key)

    monkeypatch.setattr(work, "_compute", faulty)
    (failed,) = run_survey(folder, options=BARE).failed
    assert failed.error is not None
    assert failed.error.startswith("a.tif: a fault of this program (KeyError: 'no such\\nthing')")
    assert failed.error.isprintable()
    assert capsys.readouterr().err == ""
    with pytest.raises(KeyError):
        run_survey(folder, options=RunOptions(jobs=1, debug=True))
    assert "Traceback" in capsys.readouterr().err


# ---- photographs -------------------------------------------------------------------------------


def png_of(width: int, height: int) -> bytes:
    _, encoded = cv2.imencode(".png", np.zeros((4, 4, 3), np.uint8))
    content = bytearray(encoded.tobytes())
    content[16:24] = width.to_bytes(4, "big") + height.to_bytes(4, "big")
    return bytes(content)


def jpeg_of(width: int, height: int) -> bytes:
    _, encoded = cv2.imencode(".jpg", np.zeros((4, 4, 3), np.uint8))
    content = bytearray(encoded.tobytes())
    place = content.index(b"\xff\xc0") + 5
    content[place : place + 4] = height.to_bytes(2, "big") + width.to_bytes(2, "big")
    return bytes(content)


BAD_PHOTOS: dict[str, tuple[bytes, str]] = {
    "empty": (b"", "empty file"),
    "text": (b"no picture", "neither JPEG nor PNG"),
    "GIF": (b"GIF89a" + b"\0" * 50, "neither JPEG nor PNG"),
    "SVG": (b"<svg onload=alert(1)>", "neither JPEG nor PNG"),
    "TIFF": (GOOD, "neither JPEG nor PNG"),
    "huge PNG": (png_of(60_000, 60_000), "60000 x 60000 pixels, more than the limit"),
    "huge JPEG": (jpeg_of(65_000, 65_000), "65000 x 65000 pixels, more than the limit"),
    "PNG of nothing": (png_of(0, 10), "damaged"),
    "PNG header": (png_of(4, 4)[:18], "damaged"),
    "JPEG header": (b"\xff\xd8\xff\xe0\0\x10JFIF\0", "damaged"),
    "JPEG without a frame": (b"\xff\xd8" + b"\xff\xe0\0\x02" * 9, "damaged"),
    "JPEG of zeros": (b"\xff\xd8" + b"\0" * 99, "damaged"),
    "another size": (png_of(400, 300), "cannot be read and is left out"),
    "cut PNG": (png_of(4, 4)[:40], "cannot be read and is left out"),
}


def test_a_bad_photograph_is_left_out_with_a_note(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    images = "".join(
        f'[[image]]\nfile = "{number}.tif"\nphoto = "{name}.jpg"\n'
        for number, name in enumerate(BAD_PHOTOS)
    )
    names = [f"{number}.tif" for number in range(len(BAD_PHOTOS))]
    folder = write_folder(tmp_path, *names, sheet=SHEET + images)
    for name, (content, _) in BAD_PHOTOS.items():
        (folder / f"{name}.jpg").write_bytes(content)
    result = run_survey(folder, options=RunOptions(jobs=1, planes=False))
    assert result.failed == ()
    for image, (name, (_, says)) in zip(result.images, BAD_PHOTOS.items(), strict=True):
        (note,) = [note for note in image.notes if "photograph" in note]
        assert note.startswith(f"{name}.jpg: the photograph "), note
        assert says in note
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("extension", [".jpg", ".png"])
@pytest.mark.parametrize("shape", [(300, 400), (5, 700), (1, 1)])
def test_a_good_photograph_is_taken(tmp_path: Path, extension: str, shape: tuple[int, int]) -> None:
    path = tmp_path / f"a{extension}"
    cv2.imwrite(str(path), np.zeros((*shape, 3), np.uint8))
    assert read_photo(path) == path.read_bytes()
    with pytest.raises(UnreadableImage, match=f"states {shape[1]} x {shape[0]} pixels"):
        read_photo(path, limits=ReadLimits(max_pixels=shape[0] * shape[1] - 1))


@settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    st.one_of(
        st.binary(max_size=300).map(lambda rest: b"\xff\xd8" + rest),
        st.binary(max_size=60).map(lambda rest: png_of(4, 4)[:16] + rest),
    )
)
def test_any_bytes_after_the_start_of_a_photograph(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "a.jpg"
    path.write_bytes(content)
    with contextlib.suppress(ImageError):
        assert read_photo(path) == content
