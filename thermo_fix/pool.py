"""Map a pure function over many tasks: in this process, in a pool of processes, or on a cluster.

Results come back in the order of the tasks, whatever finishes first. A bounded number of tasks is
in flight, so that memory does not grow with their number. A worker that dies loses at most the
task that killed it.
"""

import multiprocessing
import os
import signal
import threading
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import BrokenExecutor, Executor, Future, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing.connection import wait
from multiprocessing.process import BaseProcess
from typing import TypeVar

from thermo_fix.errors import SurveyError

Task = TypeVar("Task")
Done = TypeVar("Done")

_IN_FLIGHT_PER_WORKER = 3
_THREAD_SETTINGS = (
    "OMP_NUM_THREADS",
    "OPENBLAS_NUM_THREADS",
    "MKL_NUM_THREADS",
    "NUMEXPR_NUM_THREADS",
)


def default_jobs() -> int:
    """Return the number of processor cores that this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # not on every system
        return os.cpu_count() or 1


def map_in_process(
    function: Callable[[Task], Done], tasks: Iterable[Task]
) -> Iterator[tuple[Task, Done]]:
    """Call the function in this process, task by task."""
    for task in tasks:
        yield task, function(task)


def map_over_pool(
    function: Callable[[Task], Done],
    tasks: Iterable[Task],
    jobs: int,
    lost: Callable[[Task], Done],
) -> Iterator[tuple[Task, Done]]:
    """Call the function in a pool of processes, one thread each.

    Parameters
    ----------
    function
        Importable by name; its tasks and results can be pickled.
    tasks
        Taken as they are needed.
    jobs
        Number of worker processes.
    lost
        Called for a task whose worker died, also when it was tried alone.

    Yields
    ------
    tuple
        Task and result, in the order of the tasks.

    """
    waiting: deque[Task] = deque()
    flying: deque[tuple[Task, Future[Done]]] = deque()
    source = iter(tasks)
    pool = _new_pool(jobs)
    try:
        while True:
            while len(flying) < jobs * _IN_FLIGHT_PER_WORKER:
                task = waiting.popleft() if waiting else next(source, None)
                if task is None:
                    break
                try:
                    flying.append((task, _submit(pool, function, task)))
                except BrokenExecutor:
                    # A worker died between two tasks of ours. Who killed it is found among those
                    # in flight; with none there, it was no task.
                    waiting.appendleft(task)
                    if flying:
                        break
                    pool.shutdown(wait=True, cancel_futures=True)
                    pool = _new_pool(jobs)
            if not flying:
                return
            task, future = flying.popleft()
            try:
                done = future.result()
            except BrokenExecutor:
                # One of the tasks in flight killed its worker, and the pool with it. This one is
                # tried alone; the others go back to the front of the queue.
                pool.shutdown(wait=True, cancel_futures=True)
                done = _alone(function, task, lost)
                waiting.extendleft(again for again, _ in reversed(flying))
                flying.clear()
                pool = _new_pool(jobs)
            yield task, done
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


def map_over_executor(
    function: Callable[[Task], Done],
    tasks: Iterable[Task],
    executor: Executor,
    in_flight: int,
    lost: Callable[[Task], Done],
) -> Iterator[tuple[Task, Done]]:
    """Call the function on any executor, such as that of a cluster, which does its own retries."""
    flying: deque[tuple[Task, Future[Done]]] = deque()
    source = iter(tasks)
    while True:
        while len(flying) < in_flight and (task := next(source, None)) is not None:
            flying.append((task, executor.submit(function, task)))
        if not flying:
            return
        task, future = flying.popleft()
        try:
            done = future.result()
        except SurveyError:
            raise  # as where the disk is full
        except Exception:
            # A cluster gives up on a task whose workers keep dying, with an exception of its
            # own; an error of ours would have come back as a failed image.
            done = lost(task)
        yield task, done


def _alone(function: Callable[[Task], Done], task: Task, lost: Callable[[Task], Done]) -> Done:
    pool = _new_pool(1)
    try:
        return _submit(pool, function, task).result()
    except BrokenExecutor:
        return lost(task)
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


def _new_pool(jobs: int) -> ProcessPoolExecutor:
    # 'spawn' everywhere: a forked process would inherit the locks of numeric libraries' threads.
    return ProcessPoolExecutor(
        jobs, mp_context=multiprocessing.get_context("spawn"), initializer=_start_worker
    )


def _submit(pool: Executor, function: Callable[[Task], Done], task: Task) -> "Future[Done]":
    """Submit a task; workers that start meanwhile inherit that Ctrl-C does not reach them.

    It goes to every process of the terminal, and the parent alone decides what it means.
    """
    if not hasattr(signal, "pthread_sigmask"):  # not on every system
        return pool.submit(function, task)
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        return pool.submit(function, task)
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _start_worker() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_end_with, args=(parent,), daemon=True).start()
    import cv2

    cv2.setNumThreads(1)


def _end_with(parent: BaseProcess) -> None:
    """End this process when its parent is gone, killed without a word to anybody."""
    wait([parent.sentinel])
    os._exit(1)


@contextmanager
def single_threads() -> Iterator[None]:
    """Let worker processes that start meanwhile use one thread for numeric libraries.

    Those read their settings when they are loaded, so it has to be in the environment before.
    """
    before = {name: os.environ.get(name) for name in _THREAD_SETTINGS}
    os.environ.update(dict.fromkeys(_THREAD_SETTINGS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value
