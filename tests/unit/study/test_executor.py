"""Jobs on threads: rows come in order whatever the workers, stop where they are told, errors come through."""

from __future__ import annotations

import threading
import time
from typing import Any

import pytest

from crowdsim.study.executor import Halt, default_workers, rows


class Job:
    """Stands for `run_realisation`: gives its number, later numbers faster; remembers what was begun."""

    def __init__(self, slow: float = 0.002):
        self.begun: list[int] = []
        self.slow = slow
        self.lock = threading.Lock()
        self.together = self.most = 0

    def __call__(self, case: Any, number: int, *, control: Any) -> Any:
        with self.lock:
            self.begun.append(number)
            self.together += 1
            self.most = max(self.most, self.together)
        time.sleep(self.slow * (3 - number % 3))
        with self.lock:
            self.together -= 1
        return None if control.stop[0] else number


def collect(count: int, workers: int, job: Any, halt: Halt | None = None) -> list[int]:
    return list(rows(None, count, workers, halt or Halt(), job))  # type: ignore[arg-type]


@pytest.mark.parametrize("workers", [1, 2, 5])
@pytest.mark.parametrize("count", [1, 2, 23])
def test_rows_come_in_order_and_each_once(workers: int, count: int) -> None:
    job = Job()
    assert collect(count, workers, job) == list(range(count))
    assert sorted(job.begun) == list(range(count))


def test_nothing_is_asked_for_nothing() -> None:
    assert collect(0, 2, Job()) == []


def test_workers_work_at_the_same_time_and_no_more_than_asked() -> None:
    job = Job(slow=0.02)
    collect(12, 3, job)
    assert job.most == 3
    job = Job(slow=0.005)
    collect(6, 1, job)
    assert job.most == 1


def test_jobs_are_handed_out_a_few_ahead_only() -> None:
    job = Job(slow=0.0)
    iterator = rows(None, 10_000, 2, Halt(), job)  # type: ignore[arg-type]
    next(iterator)
    time.sleep(0.05)
    assert len(job.begun) <= 10  # 2 workers: 8 waiting and the one that was taken
    iterator.close()  # type: ignore[attr-defined]


def test_a_halt_gives_the_rows_before_it_and_begins_no_more() -> None:
    halt = Halt()
    job = Job()
    got = []
    for row in rows(None, 1000, 2, halt, job):  # type: ignore[arg-type]
        got.append(row)
        if row == 4:  # type: ignore[comparison-overlap]
            halt.set()
    assert halt.is_set
    assert got[:5] == [0, 1, 2, 3, 4]
    assert got == list(range(len(got)))
    assert len(job.begun) < 20


def test_a_halt_set_before_gives_nothing() -> None:
    halt = Halt()
    halt.set()
    job = Job()
    assert collect(10, 2, job, halt) == []
    assert job.begun == []


def test_an_error_comes_after_the_rows_before_it_and_halts_the_rest() -> None:
    halt = Halt()
    got = []

    def job(case: Any, number: int, *, control: Any) -> int:
        if number == 3:
            raise ZeroDivisionError
        return number

    def collect_until_error() -> None:
        for row in rows(None, 1000, 2, halt, job):  # type: ignore[arg-type]
            got.append(row)

    with pytest.raises(ZeroDivisionError):
        collect_until_error()
    assert got == [0, 1, 2]
    assert halt.is_set


def test_no_thread_is_left_behind() -> None:
    before = threading.active_count()
    collect(20, 4, Job(slow=0.0))
    assert threading.active_count() == before


def test_the_default_is_what_this_process_may_use() -> None:
    assert default_workers() >= 1
