"""Start-up of the command against starting Python with numpy, in the same run."""

import resource
import statistics
import subprocess
import sys

import pytest

from tests.benchmarks.measure import report

HEAVY = ("cv2", "matplotlib", "skimage", "scipy.interpolate", "tifffile", "pydantic", "jinja2")


def child_seconds(*arguments: str) -> float:
    """Median processor time of a child process, s."""
    times = []
    for _ in range(7):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        subprocess.run([sys.executable, *arguments], check=True, capture_output=True)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        times.append(after.ru_utime - before.ru_utime + after.ru_stime - before.ru_stime)
    return statistics.median(times)


@pytest.mark.parametrize(
    "arguments", [("--help",), ("point", "60", "--emissivity", "0.6", "--model", "total")]
)
def test_start_up_against_python_with_numpy(arguments: tuple[str, ...]) -> None:
    floor = child_seconds("-c", "import numpy")
    ours = child_seconds("-m", "thermo_fix", *arguments)
    report(f"start-up, {arguments[0]}", ours / floor, 3.0, f"{ours * 1e3:.0f} ms")
    assert ours > 0.0
