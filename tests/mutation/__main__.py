"""Put faults into the radiometry and the grading, and see which of them the tests find.

    python -m tests.mutation [--sample N] [--seed S] [--only PART]

Each fault is tried in a process that is forked from this one, with the faulty module in place of
the sound one; no file is changed. A fault that no test finds is printed: either a test is
missing, or the fault changes nothing that anybody could see.
"""

import argparse
import importlib.abc
import importlib.machinery
import importlib.util
import os
import random
import signal
import sys
import time
import types
from collections import Counter
from collections.abc import Sequence
from pathlib import Path

import pytest

from tests.mutation.mutants import Mutant, mutants_of

ROOT = Path(__file__).parents[2]
TESTS = {
    "radiometry/air.py": ("radiometry/test_air.py",),
    "radiometry/blackbody.py": ("radiometry/test_blackbody.py",),
    "radiometry/humidity.py": ("radiometry/test_humidity.py",),
    "radiometry/path.py": ("radiometry/test_path.py",),
    "radiometry/reference.py": ("radiometry/test_reference.py", "test_reference.py"),
    "radiometry/surface.py": ("radiometry/test_surface.py",),
    "radiometry/surroundings.py": ("radiometry/test_surroundings.py",),
    "grade/grading.py": ("test_grading.py", "uncertainty/test_grade_probability.py"),
    "grade/conditions.py": ("test_conditions.py",),
    "grade/conditions_building.py": ("test_conditions.py",),
    "grade/stated.py": ("test_conditions.py",),
}
"""The test files that answer for a module."""
LONGEST_S = 300
"""A fault that makes the tests hang is found."""


class _Faulty(importlib.abc.MetaPathFinder, importlib.abc.Loader):
    """Imports one module from a text."""

    def __init__(self, name: str, mutant: Mutant) -> None:
        self._name = name
        self._mutant = mutant

    def find_spec(
        self,
        fullname: str,
        path: Sequence[str] | None,
        target: types.ModuleType | None = None,
    ) -> importlib.machinery.ModuleSpec | None:
        if fullname != self._name:
            return None
        file = ROOT / "thermo_fix" / self._mutant.file
        return importlib.util.spec_from_file_location(fullname, file, loader=self)

    def exec_module(self, module: types.ModuleType) -> None:
        exec(compile(self._mutant.source, self._mutant.file, "exec"), module.__dict__)


class _SameExamples:
    """Generated examples that are few and the same for every fault."""

    def pytest_configure(self) -> None:
        # Not before: pytest has to see the library being imported.
        from hypothesis import settings

        settings.register_profile(
            "faults", max_examples=20, deadline=None, database=None, derandomize=True
        )
        settings.load_profile("faults")


def module_name(file: str) -> str:
    return "thermo_fix." + file.removesuffix(".py").replace("/", ".")


def survives(mutant: Mutant | None, tests: Sequence[Path]) -> bool:
    """Whether all tests pass with the fault; None is no fault."""
    child = os.fork()
    if child == 0:
        quiet = os.open(os.devnull, os.O_WRONLY)
        os.dup2(quiet, 1)
        os.dup2(quiet, 2)
        signal.signal(signal.SIGALRM, signal.SIG_DFL)
        signal.alarm(LONGEST_S)
        if mutant is not None:
            sys.meta_path.insert(0, _Faulty(module_name(mutant.file), mutant))
        arguments = ["-x", "-q", "-p", "no:cacheprovider", *map(str, tests)]
        status = pytest.main(arguments, plugins=[_SameExamples()])
        os._exit(int(status))
    _, status = os.waitpid(child, 0)
    return status == 0


def main() -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.mutation", description=__doc__)
    parser.add_argument("--sample", type=int, default=None, help="faults to try; all of them")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--only", default="", help="modules whose path contains this")
    asked = parser.parse_args()
    # What is imported here need not be imported again for each fault.
    import cv2  # noqa: F401
    import scipy.interpolate
    import scipy.stats  # noqa: F401

    files = {
        file: [ROOT / "tests" / name for name in names if (ROOT / "tests" / name).exists()]
        for file, names in TESTS.items()
        if asked.only in file and (ROOT / "thermo_fix" / file).exists()
    }
    for tests in {tuple(tests) for tests in files.values()}:
        begun = time.monotonic()
        if not survives(None, tests):
            print(f"the tests fail without any fault: {' '.join(map(str, tests))}")
            return 2
        print(f"{time.monotonic() - begun:6.1f} s {' '.join(path.name for path in tests)}")
    every = [
        mutant
        for file in files
        for mutant in mutants_of(file, (ROOT / "thermo_fix" / file).read_text(encoding="utf-8"))
    ]
    tried = every
    if asked.sample is not None and asked.sample < len(every):
        tried = random.Random(asked.seed).sample(every, asked.sample)
    print(f"{len(every)} faults, {len(tried)} tried")
    found: Counter[str] = Counter()
    total: Counter[str] = Counter()
    for mutant in sorted(tried, key=lambda each: (each.file, each.line)):
        total[mutant.file] += 1
        if survives(mutant, files[mutant.file]):
            print(f"survives {mutant}", flush=True)
        else:
            found[mutant.file] += 1
    for file, number in total.items():
        print(f"{found[file]:4d} of {number:4d} found in {file}")
    share = sum(found.values()) / max(sum(total.values()), 1)
    print(f"{sum(found.values())} of {sum(total.values())} found: {share:.1%}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
