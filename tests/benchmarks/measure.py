"""Measure processor time, and put ratios into words."""

import statistics
import time
from collections.abc import Callable


def cpu_seconds(function: Callable[[], object], rounds: int = 7) -> float:
    """Median processor time of a call, s, over the threads of this process.

    One round is thrown away: it loads what the others find loaded.
    """
    function()
    times = []
    for _ in range(rounds):
        begin = time.process_time()
        function()
        times.append(time.process_time() - begin)
    return statistics.median(times)


def cpu_seconds_of_many(function: Callable[[], object], repeats: int, rounds: int = 7) -> float:
    """Median processor time of a call that is too short for the clock, s."""

    def many() -> None:
        for _ in range(repeats):
            function()

    return cpu_seconds(many, rounds) / repeats


def report(name: str, ratio: float, limit: float | None, detail: str) -> None:
    """Print one row of the table in docs/performance.md."""
    allowed = "" if limit is None else f" (at most {limit:g})"
    print(f"\n| {name} | {ratio:.2f}{allowed} | {detail} |")
