"""Work folders, finished images and folders that change places: what is left when all fails."""

import ctypes
import json
import zipfile
from dataclasses import dataclass
from pathlib import Path

import pytest

from thermo_fix.errors import FolderError
from thermo_fix.records import ImageResult
from thermo_fix.results import moving, workshop
from thermo_fix.results.kept import KeptImage, canonical, keep_image, load_kept
from thermo_fix.results.staging import MARK, Staging, _aside, recover
from thermo_fix.results.workshop import Workshop


def results_folder(path: Path, text: str) -> Path:
    path.mkdir(parents=True)
    (path / MARK).write_text(text, encoding="utf-8")
    return path


# ---- finished images ---------------------------------------------------------------------------


def test_a_finished_image_comes_back_as_it_was(tmp_path: Path) -> None:
    kept = KeptImage(
        ImageResult("a.tif", "done", min_c=1.5, cautions=("One.",)), {"x": b"\x00\xff"}
    )
    keep_image(tmp_path, "key", kept)
    assert load_kept(tmp_path, "key") == kept
    assert load_kept(tmp_path, "key", []) == KeptImage(kept.result, {})
    assert [path.name for path in tmp_path.iterdir()] == ["key.zip"]


def test_damaged_and_oversized_ones_are_computed_again(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    keep_image(tmp_path, "key", KeptImage(ImageResult("a.tif", "done"), {"x": bytes(5000)}))
    whole = (tmp_path / "key.zip").read_bytes()
    (tmp_path / "half.zip").write_bytes(whole[: len(whole) // 2])
    assert load_kept(tmp_path, "half") is None
    assert load_kept(tmp_path, "absent") is None
    with zipfile.ZipFile(tmp_path / "odd.zip", "w") as archive:
        archive.writestr("result.json", json.dumps({"file": "a.tif", "status": "splendid"}))
    assert load_kept(tmp_path, "odd") is None
    monkeypatch.setattr("thermo_fix.results.kept._MOST_BYTES", 4999)
    assert load_kept(tmp_path, "key") is None


def test_an_image_that_cannot_be_kept_says_where(tmp_path: Path) -> None:
    (tmp_path / "file").write_bytes(b"")
    with pytest.raises(FolderError, match="cannot be written"):
        keep_image(tmp_path / "file", "key", KeptImage(ImageResult("a.tif", "done"), {}))


def test_only_plain_data_makes_a_key() -> None:
    @dataclass
    class Odd:
        what: object

    assert canonical(Odd((1, "two", None))) == b'{"what":[1,"two",null]}'
    with pytest.raises(TypeError, match="bytes cannot be kept"):
        canonical(Odd(b"raw"))


def test_a_survey_that_moved_makes_the_same_key(tmp_path: Path) -> None:
    here, there = tmp_path / "here", tmp_path / "there"
    assert canonical([here / "a.tif"], here) == canonical([there / "a.tif"], there)
    assert canonical([here / "a.tif"], here) != canonical([here / "a.tif"], there)


# ---- the work folder ---------------------------------------------------------------------------


def test_work_is_kept_until_it_is_closed(tmp_path: Path) -> None:
    target = tmp_path / "results"
    with Workshop(target) as work:
        (work.folder / "done.zip").write_bytes(b"work")
    with Workshop(target) as work:
        assert (work.folder / "done.zip").read_bytes() == b"work"
        work.close()
    assert list(tmp_path.iterdir()) == []


def test_a_fresh_run_throws_the_work_away(tmp_path: Path) -> None:
    target = tmp_path / "results"
    with Workshop(target) as work:
        (work.folder / "done.zip").write_bytes(b"work")
    with Workshop(target, fresh=True) as work:
        assert list(work.folder.iterdir()) == []


def test_a_link_in_the_place_of_the_work_folder_is_not_followed(tmp_path: Path) -> None:
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    (tmp_path / ".results.work").symlink_to(elsewhere)
    with Workshop(tmp_path / "results") as work:
        (work.folder / "done.zip").write_bytes(b"work")
    assert list(elsewhere.iterdir()) == []


def test_a_file_in_the_place_of_the_work_folder_is_named(tmp_path: Path) -> None:
    (tmp_path / ".results.work").write_bytes(b"")
    with pytest.raises(FolderError, match=r"\.results\.work: cannot be written"):
        Workshop(tmp_path / "results")
    # The lock is given back.
    (tmp_path / ".results.work").unlink()
    with Workshop(tmp_path / "results"):
        pass


def test_two_at_once_are_refused(tmp_path: Path) -> None:
    with (
        Workshop(tmp_path / "results"),
        pytest.raises(FolderError, match="another run is at work"),
    ):
        Workshop(tmp_path / "results")


def test_a_lock_that_was_taken_away_is_taken_again(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    # The run before removes the file between our opening and locking it, once.
    usual, answers = Workshop._is_in_place, iter([False])

    def in_place(self: Workshop, lock: int) -> bool:
        if next(answers, True):
            return usual(self, lock)
        self._lock_path.unlink()
        return usual(self, lock)

    monkeypatch.setattr(Workshop, "_is_in_place", in_place)
    with Workshop(tmp_path / "results"):
        assert (tmp_path / ".results.lock").exists()


def test_without_locks_of_the_system_a_run_goes_on(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(workshop, "fcntl", None)
    with Workshop(tmp_path / "results") as work:
        work.close()
    assert list(tmp_path.iterdir()) == []


# ---- folders that change places ---------------------------------------------------------------


@pytest.mark.parametrize("in_one_step", [True, False])
def test_results_replace_older_ones(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, in_one_step: bool
) -> None:
    if not in_one_step:
        monkeypatch.setattr(moving, "_renameat2", lambda: None)
    target = results_folder(tmp_path / "results", "old")
    with Staging(target) as staging:
        (staging.folder / MARK).write_text("new", encoding="utf-8")
        staging.finish()
    assert (target / MARK).read_text("utf-8") == "new"
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_a_system_without_the_swap_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    def absent(*_: object) -> object:
        raise OSError("no such library")

    moving._renameat2.cache_clear()
    monkeypatch.setattr(ctypes, "CDLL", absent)
    try:
        assert moving._renameat2() is None
    finally:
        moving._renameat2.cache_clear()


def test_folders_of_different_kinds_are_not_swapped(tmp_path: Path) -> None:
    results_folder(tmp_path / "one", "one")
    assert moving.swap(tmp_path / "one", tmp_path / "absent") is False
    assert (tmp_path / "one" / MARK).read_text("utf-8") == "one"


def unfinished(parent: Path) -> Path:
    """A name under which a killed run leaves what it was filling."""
    with Staging(parent / "results") as staging:
        return staging.folder


def test_a_killed_run_is_cleared_up(tmp_path: Path) -> None:
    results_folder(unfinished(tmp_path), "half")
    target = results_folder(tmp_path / "results", "whole")
    recover(target)
    assert [path.name for path in tmp_path.iterdir()] == ["results"]
    recover(tmp_path / "nowhere" / "results")


def test_results_that_stepped_aside_come_back(tmp_path: Path) -> None:
    target = tmp_path / "results"
    results_folder(tmp_path / f"{_aside(target)}12345678", "old")
    recover(target)
    assert (target / MARK).read_text("utf-8") == "old"
    # Beside a whole result they are what was replaced.
    results_folder(tmp_path / f"{_aside(target)}87654321", "older")
    recover(target)
    assert (target / MARK).read_text("utf-8") == "old"
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_a_link_beside_the_results_is_left_alone(tmp_path: Path) -> None:
    precious = results_folder(tmp_path / "precious", "keep")
    unfinished(tmp_path).symlink_to(precious)
    recover(tmp_path / "results")
    assert (precious / MARK).read_text("utf-8") == "keep"
