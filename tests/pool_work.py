"""Functions for the pool's tests; a worker process has to be able to import them."""

import os
import signal
import time
from pathlib import Path


def squared(number: int) -> int:
    """Return the square; the first numbers take longest, so that others finish before them."""
    time.sleep(0.05 if number < 2 else 0.0)
    return number * number


def squared_unless_deadly(number: int) -> int:
    """Return the square; 5 kills its worker."""
    if number == 5:
        os.kill(os.getpid(), signal.SIGKILL)
    return number * number


def squared_after_one_death(task: tuple[int, str]) -> int:
    """Return the square; the marked number kills its worker the first time only."""
    number, mark = task
    if number == 3 and not Path(mark).exists():
        Path(mark).write_text("died once")
        os.kill(os.getpid(), signal.SIGKILL)
    return number * number
