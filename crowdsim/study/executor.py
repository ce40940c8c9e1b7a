"""Runs jobs on threads and hands their rows back in order: numbers never depend on the workers."""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor

import numpy as np

from crowdsim.dynamics.realisation import Control
from crowdsim.study.jobs import Row, run_realisation
from crowdsim.study.prepare import Case

_AHEAD = 4


def default_workers() -> int:
    """The processors this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # not on every system
        return os.cpu_count() or 1


class Halt:
    """Set from outside to end a run after the rows that are finished."""

    def __init__(self) -> None:
        self.flag = np.zeros(1, np.uint8)
        self.progress = np.zeros(1, np.int64)

    def set(self) -> None:
        """Stops kernels at their next block."""
        self.flag[0] = 1

    @property
    def is_set(self) -> bool:
        """Whether it was set."""
        return bool(self.flag[0])


def rows(
    case: Case,
    count: int,
    workers: int,
    halt: Halt,
    run: Callable[..., Row | None] = run_realisation,
) -> Iterator[Row]:
    """Rows 0, 1, 2, ... of a case, as far as they were finished before `halt` was set.

    Raises whatever a job raises, after the rows before it.
    """
    waiting: deque[Future[Row | None]] = deque()
    following = 0
    with ThreadPoolExecutor(workers, thread_name_prefix="realisation") as pool:
        try:
            while following < count or waiting:
                while following < count and len(waiting) < _AHEAD * workers and not halt.is_set:
                    control = Control(stop=halt.flag, progress=halt.progress)
                    waiting.append(pool.submit(run, case, following, control=control))
                    following += 1
                if not waiting:
                    return
                row = waiting.popleft().result()
                if row is None:
                    return
                yield row
        except BaseException:
            halt.set()
            raise
        finally:
            for future in waiting:
                future.cancel()
