"""The same results from a real Dask scheduler with worker processes on loopback."""

import os
import re
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.simulator.survey import write_survey
from tests.test_rerun import bytes_of
from thermo_fix.errors import FolderError
from thermo_fix.survey import RunOptions, run_survey

pytest.importorskip("distributed", reason="needs the extra: pip install -e '.[cluster]'")
pytestmark = pytest.mark.filterwarnings("default")


class Cluster:
    """A scheduler and workers, each a process of its own."""

    def __init__(self, workers: int) -> None:
        self.scheduler = subprocess.Popen(
            [sys.executable, "-m", "distributed.cli.dask_scheduler", "--host", "127.0.0.1",
             "--port", "0", "--no-dashboard"],
            stderr=subprocess.PIPE, text=True,
        )  # fmt: skip
        self.address = self._address()
        self.workers = [self.start_worker() for _ in range(workers)]

    def _address(self) -> str:
        assert self.scheduler.stderr is not None
        for line in self.scheduler.stderr:
            found = re.search(r"Scheduler at:\s+(tcp://\S+)", line)
            if found:
                threading.Thread(target=self.scheduler.stderr.read, daemon=True).start()
                return found.group(1)
        raise AssertionError("the scheduler did not start")

    def start_worker(self) -> "subprocess.Popen[bytes]":
        return subprocess.Popen(
            [sys.executable, "-m", "distributed.cli.dask_worker", self.address, "--no-nanny",
             "--nthreads", "1", "--no-dashboard", "--host", "127.0.0.1"],
            stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL,
        )  # fmt: skip

    def wait_for_workers(self, count: int) -> None:
        from distributed import Client

        with Client(self.address, set_as_default=False) as client:
            client.wait_for_workers(count, timeout=60)

    def stop(self) -> None:
        for worker in self.workers:
            worker.kill()
            worker.wait()
        self.scheduler.kill()
        self.scheduler.wait()


@pytest.fixture
def cluster() -> Iterator[Cluster]:
    found = Cluster(2)
    try:
        found.wait_for_workers(2)
        yield found
    finally:
        found.stop()


def test_cluster_gives_the_bytes_of_one_process(cluster: Cluster, tmp_path: Path) -> None:
    folder = tmp_path / "survey"
    write_survey(folder, "building", 3, images=4, shape=(120, 160))
    run_survey(folder, tmp_path / "one", options=RunOptions(jobs=1))
    run_survey(folder, tmp_path / "many", options=RunOptions(cluster=cluster.address))
    assert bytes_of(tmp_path / "many") == bytes_of(tmp_path / "one")


def test_a_worker_that_dies_in_mid_run_costs_no_image(cluster: Cluster, tmp_path: Path) -> None:
    folder = tmp_path / "survey"
    write_survey(folder, "building", 3, images=16, shape=(120, 160))
    killed: list[str] = []

    def kill_one(done: int, total: int, file: str) -> None:
        if done == 3 and not killed:
            os.kill(cluster.workers[0].pid, signal.SIGKILL)
            killed.append(file)

    options = RunOptions(cluster=cluster.address)
    result = run_survey(folder, tmp_path / "many", options=options, progress=kill_one)
    assert killed
    assert result.failed == ()
    run_survey(folder, tmp_path / "one", options=RunOptions(jobs=1))
    assert bytes_of(tmp_path / "many") == bytes_of(tmp_path / "one")


def test_no_scheduler_is_one_clear_line(tmp_path: Path) -> None:
    folder = tmp_path / "survey"
    write_survey(folder, "building", 3, images=1, shape=(120, 160))
    begin = time.monotonic()
    with pytest.raises(FolderError, match="no scheduler answers there"):
        run_survey(folder, options=RunOptions(cluster="tcp://127.0.0.1:9"))
    assert time.monotonic() - begin < 60
    assert not (folder / "results").exists()
