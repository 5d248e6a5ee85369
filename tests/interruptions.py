"""Runs that end before their time, each in a forked process: ``python -m tests.interruptions``.

A process of its own, because it forks: there is nothing in it but this one thread. Prints JSON.
"""

import hashlib
import json
import os
import re
import resource
import shutil
import sys
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import Any

import cv2

from thermo_fix.errors import ThermoFixError
from thermo_fix.results import moving, staging
from thermo_fix.survey import RunOptions, run_survey

OPTIONS = RunOptions(jobs=1, pictures=False)
WRITING = os.O_WRONLY | os.O_RDWR
KILLED, REFUSED, DONE = 9, 2, 0
_RUN_TIME = re.compile(rb"20\d\d-\d\d-\d\dT\d\d:\d\d:\d\d\+00:00")
_NOBODY = 65534


def in_a_fork(action: Callable[[], Any]) -> int:
    """Do something in a child process and return the exit status."""
    child = os.fork()
    if child == 0:
        status = DONE
        try:
            action()
        except ThermoFixError as error:
            print(str(error), file=sys.stderr)
            status = REFUSED
        except BaseException as error:
            print(repr(error), file=sys.stderr)
            status = 70
        finally:
            sys.stderr.flush()
            os._exit(status)
    return os.waitstatus_to_exitcode(os.waitpid(child, 0)[1])


def state_of(results: Path) -> str:
    """Hash of everything in a folder, the run time left out; empty where there is none."""
    if not results.is_dir():
        return ""
    digest = hashlib.sha256()
    for path in sorted(results.rglob("*")):
        if path.is_file():
            digest.update(path.relative_to(results).as_posix().encode())
            digest.update(_RUN_TIME.sub(b"", path.read_bytes()))
    return digest.hexdigest()


def killed_at(folder: Path, step: int) -> Callable[[], object]:
    """A run that dies right before it changes a name or opens a file to write for the nth time."""

    def action() -> object:
        count = 0

        def hook(event: str, arguments: tuple[Any, ...]) -> None:
            nonlocal count
            writes = event == "open" and isinstance(arguments[2], int) and arguments[2] & WRITING
            if writes or event in ("os.rename", "os.remove", "os.mkdir", "os.rmdir", "os.link"):
                count += 1
                if count == step:
                    os._exit(KILLED)

        sys.addaudithook(hook)
        return run_survey(folder, options=OPTIONS)

    return action


def kills(template: Path, work: Path, *, swap: bool, stride: int) -> dict[str, Any]:
    """Kill a run at every ``stride``-th change on the disk and look at what is there."""
    if not swap:
        vars(staging)["swap"] = lambda first, second: False
    folder = work / "survey"
    outcome: dict[str, Any] = {"kills": 0, "old": 0, "new": 0, "aside": 0, "wrong": []}
    shutil.copytree(template, folder)
    before = state_of(folder / "results")
    in_a_fork(lambda: run_survey(folder, options=OPTIONS))
    after = state_of(folder / "results")
    assert before != after
    step = 1
    while True:
        shutil.rmtree(folder)
        shutil.copytree(template, folder)
        status = in_a_fork(killed_at(folder, step))
        if status == DONE:
            break
        found = state_of(folder / "results")
        aside = [state_of(path) for path in folder.glob(".results.replaced-*")]
        outcome["kills"] += status == KILLED
        if found in (before, after):
            outcome["old" if found == before else "new"] += 1
        elif not found and not swap and before in aside:
            outcome["aside"] += 1
        else:
            outcome["wrong"].append(f"step {step}: neither the old nor the new result")
        again = in_a_fork(lambda: run_survey(folder, options=OPTIONS))
        hidden = [path.name for path in folder.iterdir() if path.name.startswith(".")]
        if again != DONE or state_of(folder / "results") != after or hidden:
            outcome["wrong"].append(f"step {step}: a run again ends with {again}, left {hidden}")
        step += stride
    return outcome


def full_disk(template: Path, work: Path) -> list[dict[str, Any]]:
    """Let no file grow beyond a size, as on a disk without room."""
    found = []
    for bytes_left in (0, 3_000, 30_000):
        folder = work / f"survey {bytes_left}"
        shutil.copytree(template, folder)
        before = state_of(folder / "results")

        def limited(folder: Path = folder, room: int = bytes_left) -> None:
            resource.setrlimit(resource.RLIMIT_FSIZE, (room, room))
            run_survey(folder, options=OPTIONS)

        status = in_a_fork(limited)
        kept = state_of(folder / "results") == before
        again = in_a_fork(lambda folder=folder: run_survey(folder, options=OPTIONS))  # type: ignore[misc]
        hidden = [path.name for path in folder.iterdir() if path.name.startswith(".")]
        found.append({"status": status, "kept": kept, "again": again, "hidden": hidden})
    return found


def no_flush(template: Path, work: Path) -> dict[str, Any]:
    """Let the disk turn out to be full only when it is asked whether all has arrived."""
    folder = work / "not flushed"
    shutil.copytree(template, folder)
    before = state_of(folder / "results")

    def failing() -> None:
        def refuse(descriptor: int) -> None:
            raise OSError(28, "No space left on device")

        moving.os.fsync = refuse  # type: ignore[attr-defined]
        run_survey(folder, options=OPTIONS)

    status = in_a_fork(failing)
    return {"status": status, "kept": state_of(folder / "results") == before}


def read_only(template: Path, work: Path) -> dict[str, Any]:
    """Run in a folder in which nothing may be written."""
    folder = work / "read only"
    shutil.copytree(template, folder)
    before = state_of(folder / "results")
    for place in (work.parent, work, folder, folder / "results"):
        place.chmod(0o755)
    folder.chmod(0o555)

    def unprivileged() -> None:
        if os.getuid() == 0:  # who may write anywhere
            # Once before, so that nobody has to read what only the superuser may.
            run_survey(folder, work / "elsewhere", options=OPTIONS)
            os.setgid(_NOBODY)
            os.setuid(_NOBODY)
        run_survey(folder, options=OPTIONS)

    status = in_a_fork(unprivileged)
    names = sorted(path.name for path in folder.iterdir())
    folder.chmod(0o755)
    return {"status": status, "kept": state_of(folder / "results") == before, "names": names}


def main() -> None:
    what, template, work = sys.argv[1], Path(sys.argv[2]), Path(sys.argv[3])
    cv2.setNumThreads(1)
    outcome: Any
    if what == "refusals":
        outcome = {
            "full": full_disk(template, work),
            "flush": no_flush(template, work),
            "read-only": read_only(template, work),
        }
    else:
        outcome = kills(template, work, swap=what == "swap", stride=int(sys.argv[4]))
    with suppress(BrokenPipeError):
        print(json.dumps(outcome))


if __name__ == "__main__":
    main()
