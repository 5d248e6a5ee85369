from pathlib import Path

import pytest

from tests.pool_work import squared, squared_after_one_death, squared_unless_deadly
from thermo_fix.pool import default_jobs, map_in_process, map_over_pool

LOST = -1


def lost(task: object) -> int:
    return LOST


def test_results_come_in_the_order_of_the_tasks() -> None:
    found = list(map_over_pool(squared, range(12), 2, lost))
    assert found == [(number, number * number) for number in range(12)]
    assert found == list(map_in_process(squared, range(12)))


def test_tasks_are_taken_only_as_they_are_needed() -> None:
    source = iter(range(1000))
    results = map_over_pool(squared, source, 2, lost)
    next(results)
    # Two workers with three tasks each are in flight, and the one that came back.
    assert next(source) <= 8
    results.close()  # type: ignore[attr-defined]


def test_a_task_that_kills_its_worker_is_the_only_one_lost() -> None:
    found = dict(map_over_pool(squared_unless_deadly, range(10), 2, lost))
    assert found == {number: LOST if number == 5 else number * number for number in range(10)}
    assert list(found) == list(range(10))


def test_a_task_whose_worker_died_by_chance_is_done_after_all(tmp_path: Path) -> None:
    mark = str(tmp_path / "mark")
    tasks = [(number, mark) for number in range(6)]
    found = [done for _, done in map_over_pool(squared_after_one_death, tasks, 2, lost)]
    assert found == [0, 1, 4, 9, 16, 25]
    assert Path(mark).exists()


def test_there_is_at_least_one_core() -> None:
    assert default_jobs() >= 1


@pytest.mark.parametrize("jobs", [1, 2])
def test_no_tasks_no_results(jobs: int) -> None:
    assert list(map_over_pool(squared, [], jobs, lost)) == []
