"""A result is the old one or the new one, whatever ends a run, and a run again finishes it."""

import json
import os
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.survey_folders import SHEET, files_below, write_folder
from tests.test_rerun import bytes_of
from thermo_fix.errors import FolderError
from thermo_fix.results import Staging, recover
from thermo_fix.results import moving as moving_module
from thermo_fix.results import staging as staging_module
from thermo_fix.results.moving import swap
from thermo_fix.results.workshop import Workshop
from thermo_fix.survey import RunOptions, run_survey

ROOT = Path(__file__).parents[1]
ONE = RunOptions(jobs=1, pictures=False)
PROCESSES = Path("/proc")


@pytest.fixture(scope="module")
def template(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A survey with a result, and a sheet that has changed since: a run gives other numbers."""
    folder = write_folder(tmp_path_factory.mktemp("template") / "survey", "a.tif", "b.tif")
    run_survey(folder, options=ONE)
    (folder / "survey.toml").write_text(SHEET.replace("0.95", "0.90"), encoding="utf-8")
    return folder


@pytest.fixture
def place() -> Iterator[Path]:
    """A folder that other users may enter, which those of the tests are not."""
    with tempfile.TemporaryDirectory() as name:
        yield Path(name)


def interruptions(what: str, template: Path, work: Path, *more: str) -> tuple[Any, list[str]]:
    work.mkdir()
    done = subprocess.run(
        [sys.executable, "-m", "tests.interruptions", what, str(template), str(work), *more],
        capture_output=True,
        text=True,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        cwd=ROOT,
        timeout=500,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    return json.loads(done.stdout), done.stderr.splitlines()


@pytest.mark.parametrize(
    ("what", "stride"),
    [
        ("swap", 14),
        ("no-swap", 19),
        pytest.param("swap", 1, marks=pytest.mark.slow),
        pytest.param("no-swap", 1, marks=pytest.mark.slow),
    ],
)
def test_killed_at_any_change_on_the_disk(
    template: Path, tmp_path: Path, what: str, stride: int
) -> None:
    """Every nth change, counted over the whole run; then a run again."""
    found, _ = interruptions(what, template, tmp_path / "work", str(stride))
    assert found["wrong"] == []
    assert found["kills"] == found["old"] + found["new"] + found["aside"]
    assert found["kills"] >= 30 / stride
    assert found["old"] >= 1
    if stride == 1:
        assert found["new"] >= 1
        # Without a swap in one step there is one moment at which the old result stands aside.
        assert found["aside"] == (0 if what == "swap" else 1)


def test_a_disk_that_takes_no_more_leaves_the_old_result(template: Path, place: Path) -> None:
    found, lines = interruptions("refusals", template, place / "work")
    full = found["full"]
    assert len(full) == 3
    assert all(each == {"status": 2, "kept": True, "again": 0, "hidden": []} for each in full)
    assert found["flush"] == {"status": 2, "kept": True}
    names = ["a.tif", "b.tif", "results", "survey.toml"]
    assert found["read-only"] == {"status": 2, "kept": True, "names": names}
    # One line each.
    says = ["file too large"] * 3
    says += ["cannot be put into place (no space left on device)"]
    says += ["cannot be written (permission denied); give another --out"]
    assert len(lines) == len(says)
    for line, words in zip(lines, says, strict=True):
        assert words in line


# ---- the pool ----------------------------------------------------------------------------------


def children_of(process: int) -> list[int]:
    try:
        text = (PROCESSES / f"{process}/task/{process}/children").read_text()
    except OSError:
        return []
    direct = [int(number) for number in text.split()]
    return direct + [each for number in direct for each in children_of(number)]


def is_alive(process: int) -> bool:
    try:
        state = (PROCESSES / f"{process}/stat").read_text().rpartition(")")[2].split()[0]
    except OSError:
        return False
    return state not in "ZX"


def kill_and_wait(process: "subprocess.Popen[bytes]") -> list[int]:
    """Kill the one process, not its workers; return those that outlive it by 20 s."""
    workers = children_of(process.pid)
    os.kill(process.pid, signal.SIGKILL)
    process.wait()
    until = time.monotonic() + 20
    while any(is_alive(worker) for worker in workers) and time.monotonic() < until:
        time.sleep(0.05)
    return [worker for worker in workers if is_alive(worker)]


def started(folder: Path) -> "subprocess.Popen[bytes]":
    return subprocess.Popen(
        [sys.executable, "-m", "thermo_fix", "run", str(folder), "--jobs", "2", "--fresh"],
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )


@pytest.mark.skipif(not (PROCESSES / "self/task").is_dir(), reason="needs /proc to see workers")
@pytest.mark.parametrize("kills", [2, pytest.param(25, marks=pytest.mark.slow)])
def test_workers_end_with_the_run_that_started_them(tmp_path: Path, kills: int) -> None:
    folder = write_folder(tmp_path, *(f"{number}.tif" for number in range(12)))
    run_survey(folder, options=RunOptions(jobs=1))
    old = bytes_of(folder / "results")
    seen = 0
    for number in range(kills):
        process = started(folder)
        # From before there are workers until they are at work, and on to the end.
        until = time.monotonic() + 60
        while len(children_of(process.pid)) < 3 and process.poll() is None:
            assert time.monotonic() < until
            time.sleep(0.01)
        time.sleep(0.15 * number)
        seen += process.poll() is None
        assert kill_and_wait(process) == []
        assert bytes_of(folder / "results") == old
    assert seen >= kills / 2
    run_survey(folder, options=RunOptions(jobs=1))
    assert bytes_of(folder / "results") == old
    assert [path.name for path in folder.iterdir() if path.name.startswith(".")] == []


def test_ctrl_c_is_one_line_and_the_run_is_carried_on(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, *(f"{number}.tif" for number in range(8)))
    process = subprocess.Popen(
        [sys.executable, "-m", "thermo_fix", "run", str(folder), "--jobs", "2"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        start_new_session=True,
    )
    work = folder / ".results.work"
    until = time.monotonic() + 60
    while not list(work.glob("*.zip")) and process.poll() is None:
        assert time.monotonic() < until
        time.sleep(0.01)
    os.killpg(process.pid, signal.SIGINT)  # as a terminal does: to all of its processes
    out, err = process.communicate(timeout=60)
    assert out == b""
    assert process.returncode == 2
    assert err.decode() == (
        "thermo-fix: stopped; finished images are kept, and the same command carries on\n"
    )
    assert not (folder / "results").exists()
    assert list(work.glob("*.zip"))
    run_survey(folder, options=RunOptions(jobs=1))
    assert [path.name for path in folder.iterdir() if path.name.startswith(".")] == []


# ---- what dead runs leave ----------------------------------------------------------------------


def result_in(folder: Path, text: str) -> Path:
    folder.mkdir(parents=True)
    (folder / "findings.json").write_text(text)
    return folder


def test_a_result_that_stepped_aside_is_put_back(tmp_path: Path) -> None:
    result_in(tmp_path / ".results.replaced-abcdefgh", "old")
    result_in(tmp_path / ".results.partial-abcdefgh", "new, perhaps")
    recover(tmp_path / "results")
    assert files_below(tmp_path) == {"results/findings.json": b"old"}


def test_a_result_that_was_replaced_is_thrown_away(tmp_path: Path) -> None:
    result_in(tmp_path / "results", "new")
    result_in(tmp_path / ".results.replaced-abcdefgh", "old")
    recover(tmp_path / "results")
    assert files_below(tmp_path) == {"results/findings.json": b"new"}


def test_only_what_is_ours_is_cleared_up(tmp_path: Path) -> None:
    target = result_in(tmp_path / "survey" / "results", "new")
    others = ["results.partial-x", ".other.partial-abcdefgh", ".results", ".results.partial"]
    for name in others:
        result_in(target.with_name(name), "another's")
    result_in(tmp_path / "elsewhere", "another's")
    target.with_name(".results.partial-link0000").symlink_to(tmp_path / "elsewhere")
    before = files_below(tmp_path)
    recover(target)
    assert files_below(tmp_path) == before
    recover(tmp_path / "none" / "results")


def test_a_run_takes_up_what_a_killed_one_left(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    run_survey(folder, options=ONE)
    old = bytes_of(folder / "results")
    (folder / "results").rename(folder / ".results.replaced-abcdefgh")
    result_in(folder / ".results.partial-12345678", "half")
    run_survey(folder, options=ONE)
    assert bytes_of(folder / "results") == old
    assert [path.name for path in folder.iterdir() if path.name.startswith(".")] == []


def test_folders_change_places_in_one_step_or_not_at_all(tmp_path: Path) -> None:
    first, second = result_in(tmp_path / "a", "a"), result_in(tmp_path / "b", "b")
    if swap(first, second):
        assert files_below(tmp_path) == {"a/findings.json": b"b", "b/findings.json": b"a"}
    else:
        assert files_below(tmp_path) == {"a/findings.json": b"a", "b/findings.json": b"b"}
    assert not swap(first, tmp_path / "none")


def test_a_system_that_cannot_swap(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(moving_module, "_renameat2", lambda: None)
    target = result_in(tmp_path / "results", "old")
    with Staging(target) as staging:
        (staging.folder / "findings.json").write_text("new")
        staging.finish()
    assert files_below(tmp_path) == {"results/findings.json": b"new"}
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_everything_is_flushed_before_it_is_moved(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    done: list[str] = []
    fsync, exchange = os.fsync, moving_module.swap

    def flushed(descriptor: int) -> None:
        done.append(Path(f"/proc/self/fd/{descriptor}").readlink().name)
        fsync(descriptor)

    def swapped(first: Path, second: Path) -> bool:
        done.append("swap")
        return exchange(first, second)

    if not (PROCESSES / "self/fd").is_dir():
        pytest.skip("needs /proc to see the names of open files")
    target = result_in(tmp_path / "results", "old")
    monkeypatch.setattr(os, "fsync", flushed)
    monkeypatch.setattr(staging_module, "swap", swapped)
    with Staging(target) as staging:
        (staging.folder / "sub").mkdir()
        (staging.folder / "sub" / "plane").write_text("x")
        (staging.folder / "findings.json").write_text("new")
        name = staging.folder.name
        staging.finish()
    moment = done.index("swap")
    assert {"findings.json", "plane", "sub", name} <= set(done[:moment])
    assert done[moment + 1 :] == [tmp_path.name]


# ---- two at once, and where results may lie ----------------------------------------------------


def test_the_lock_dies_with_its_owner(tmp_path: Path) -> None:
    script = (
        "import sys, time\nfrom pathlib import Path\n"
        "from thermo_fix.results.workshop import Workshop\n"
        "with Workshop(Path(sys.argv[1])):\n    print('held', flush=True)\n    time.sleep(60)\n"
    )
    with subprocess.Popen(
        [sys.executable, "-c", script, str(tmp_path / "results")],
        stdout=subprocess.PIPE,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    ) as owner:
        assert owner.stdout is not None
        assert owner.stdout.readline() == b"held\n"
        with pytest.raises(FolderError, match="another run is at work"):
            Workshop(tmp_path / "results")
        owner.kill()
    with Workshop(tmp_path / "results"):
        pass
    assert list(tmp_path.iterdir()) == []


def test_a_lock_whose_file_was_taken_away_is_no_lock(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The run before us deletes the file between our opening and our locking it."""
    lock = tmp_path / ".results.lock"
    opened = os.open
    times = 0

    def late(path: Any, *more: Any) -> int:
        nonlocal times
        descriptor = opened(path, *more)
        if Path(path) == lock and times == 0:
            times += 1
            lock.unlink()
        return descriptor

    monkeypatch.setattr(os, "open", late)
    with Workshop(tmp_path / "results"):
        assert times == 1
        assert lock.exists()


def test_a_sheet_may_not_name_what_lies_in_the_results(tmp_path: Path) -> None:
    sheet = SHEET + '[[image]]\nfile = "results/corrected/a.tif"\n'
    folder = write_folder(tmp_path, "a.tif")
    run_survey(folder, options=ONE)
    before = files_below(folder)
    (folder / "survey.toml").write_text(sheet, encoding="utf-8")
    with pytest.raises(FolderError, match=r"holds results/corrected/a\.tif, which the sheet names"):
        run_survey(folder, options=ONE)
    (folder / "survey.toml").write_text(SHEET, encoding="utf-8")
    assert files_below(folder) == before


@pytest.mark.parametrize("out", [".", "./", "sub/..", "/"])
def test_an_odd_place_for_results(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, out: str
) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    (tmp_path / "here" / "sub").mkdir(parents=True)
    (tmp_path / "here" / "sub").rmdir()
    monkeypatch.chdir(tmp_path / "here")
    if out == "/":
        with pytest.raises(FolderError, match="holds the survey"):
            run_survey(folder, out, options=ONE)
        return
    run_survey(folder, out, options=ONE)
    assert (tmp_path / "here" / "findings.json").is_file()
    assert sorted(path.name for path in tmp_path.iterdir()) == ["here", "survey"]


def test_a_place_whose_name_is_too_long(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    for name in ("n" * 300, "n" * 250):
        with pytest.raises(FolderError, match="file name too long"):
            run_survey(folder, tmp_path / name, options=ONE)
    assert [path.name for path in tmp_path.iterdir()] == ["survey"]
