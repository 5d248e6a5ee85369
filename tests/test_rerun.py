"""A run again computes only what changed, and gives the bytes of a clean run."""

import hashlib
import os
import random
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.simulator.survey import write_survey
from thermo_fix import work
from thermo_fix.errors import FolderError
from thermo_fix.results.kept import load_kept
from thermo_fix.survey import RunOptions, run_survey

ONE = RunOptions(jobs=1)
_RUN_TIME = re.compile(rb"20\d\d-\d\d-\d\dT\d\d:\d\d:\d\d\+00:00")


def bytes_of(results: Path) -> dict[str, str]:
    """Hash of every file, the run time left out."""
    return {
        path.relative_to(results).as_posix(): hashlib.sha256(
            _RUN_TIME.sub(b"RUN TIME", path.read_bytes())
        ).hexdigest()
        for path in sorted(results.rglob("*"))
        if path.is_file()
    }


@pytest.fixture
def survey(tmp_path: Path) -> Path:
    folder = tmp_path / "survey"
    write_survey(folder, "building", 3, images=4, shape=(120, 160))
    return folder


@pytest.fixture
def computed(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """Names of the images that were computed."""
    names: list[str] = []
    compute = work._compute

    def counted(task: work.ImageTask, key: str) -> object:
        names.append(task.job.file)
        return compute(task, key)

    monkeypatch.setattr(work, "_compute", counted)
    return names


def test_one_process_pool_and_rerun_give_the_same_bytes(survey: Path) -> None:
    run_survey(survey, options=ONE)
    clean = bytes_of(survey / "results")
    assert len([name for name in clean if name.startswith("corrected/")]) == 4
    run_survey(survey, options=RunOptions(jobs=2, fresh=True))
    assert bytes_of(survey / "results") == clean
    run_survey(survey, options=ONE)
    assert bytes_of(survey / "results") == clean


def test_nothing_is_computed_again_when_nothing_changed(survey: Path, computed: list[str]) -> None:
    run_survey(survey, options=ONE)
    assert len(computed) == 4
    computed.clear()
    run_survey(survey, options=ONE)
    assert computed == []
    run_survey(survey, options=RunOptions(jobs=1, fresh=True))
    assert len(computed) == 4


def test_only_the_changed_image_is_computed_again(survey: Path, computed: list[str]) -> None:
    run_survey(survey, options=ONE)
    computed.clear()
    sheet = survey / "survey.toml"
    text = sheet.read_text()
    first = text.index("distance_m", text.index('file = "IR_0002.tif"'))
    sheet.write_text(text[:first] + "note = 'seen again'\n" + text[first:])
    run_survey(survey, options=ONE)
    assert computed == ["IR_0002.tif"]
    changed = bytes_of(survey / "results")
    run_survey(survey, options=RunOptions(jobs=1, fresh=True))
    assert bytes_of(survey / "results") == changed


def test_a_changed_file_is_computed_again(survey: Path, computed: list[str]) -> None:
    run_survey(survey, options=ONE)
    computed.clear()
    (survey / "IR_0003.tif").write_bytes((survey / "IR_0001.tif").read_bytes())
    run_survey(survey, options=ONE)
    assert computed == ["IR_0003.tif"]


@pytest.mark.parametrize("damage", ["plane", "kept", "gone", "one bit"])
def test_what_was_kept_and_got_damaged_is_computed_again(
    survey: Path, computed: list[str], damage: str
) -> None:
    run_survey(survey, options=ONE)
    clean = bytes_of(survey / "results")
    computed.clear()
    if damage == "plane":
        path = survey / "results/corrected/IR_0001.tif"
        path.write_bytes(path.read_bytes()[:-1] + b"x")
    else:
        path = sorted((survey / "results/.kept").iterdir())[0]
        if damage == "kept":
            path.write_bytes(b"PK not a ZIP file")
        elif damage == "one bit":
            content = bytearray(path.read_bytes())
            content[len(content) // 2] ^= 1
            path.write_bytes(content)
        else:
            path.unlink()
    run_survey(survey, options=ONE)
    assert len(computed) == 1
    assert bytes_of(survey / "results") == clean


def test_a_survey_may_be_moved(survey: Path, computed: list[str]) -> None:
    run_survey(survey, options=ONE)
    computed.clear()
    moved = survey.rename(survey.with_name("moved"))
    run_survey(moved, options=ONE)
    assert computed == []


def test_planes_and_pictures_may_be_left_out(survey: Path) -> None:
    run_survey(survey, options=RunOptions(jobs=1, planes=False, pictures=False))
    names = set(bytes_of(survey / "results"))
    assert not any(name.endswith(".tif") for name in names)
    assert b"data:image/png" not in (survey / "results/report.html").read_bytes()
    run_survey(survey, options=ONE)
    assert (survey / "results/corrected/IR_0001.tif").exists()


def test_two_runs_at_once_on_one_folder_are_refused(survey: Path) -> None:
    from thermo_fix.results.workshop import Workshop

    with (
        Workshop(survey / "results"),
        pytest.raises(FolderError, match="another run is at work on these results"),
    ):
        run_survey(survey, options=ONE)


def test_kept_work_of_a_foreign_kind_is_not_taken(tmp_path: Path) -> None:
    (tmp_path / "abc.zip").write_bytes(b"")
    assert load_kept(tmp_path, "abc") is None
    assert load_kept(tmp_path, "missing") is None


@pytest.mark.slow
def test_kills_at_random_times_leave_the_old_or_the_new_result(survey: Path) -> None:
    """A hundred kills; each leaves a whole result, and a run afterwards finishes it."""
    run_survey(survey, options=ONE)
    old = bytes_of(survey / "results")
    command = [sys.executable, "-m", "thermo_fix", "run", str(survey), "--jobs", "1", "--fresh"]
    rng = random.Random(11)
    begin = time.monotonic()
    subprocess.run(command, check=True, capture_output=True)
    takes = time.monotonic() - begin
    killed = 0
    for _ in range(100):
        process = subprocess.Popen(
            command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True
        )
        time.sleep(rng.uniform(0.0, 1.1 * takes))
        if process.poll() is None:
            killed += 1
            os.killpg(process.pid, signal.SIGKILL)
        process.wait()
        assert bytes_of(survey / "results") == old
    assert killed >= 50
    run_survey(survey, options=ONE)
    assert bytes_of(survey / "results") == old
    hidden = [path.name for path in survey.iterdir() if path.name.startswith(".")]
    assert hidden == []
