"""What a long run tells of itself: rate, time left, the 95 % value so far."""

from __future__ import annotations

import time
from bisect import insort
from types import TracebackType

from rich.progress import BarColumn, MofNCompleteColumn, TextColumn, TimeRemainingColumn
from rich.progress import Progress as Bar

from crowdsim.console.base import Console
from crowdsim.response.statistics import percentile_rank
from crowdsim.results.texts import number, span
from crowdsim.study.jobs import Row
from crowdsim.study.progress import Progress


class RunProgress(Progress):
    """Progress on standard error: rate, time left, the 95 % value so far. Silent where that is no terminal."""

    def __init__(self, console: Console):
        self.console = console
        self.bar: Bar | None = None
        self.peaks: list[float] = []
        self._name, self._done, self._steps = "", 0, 0
        self._shown = 0.0
        self._begun = 0.0
        if console.err.is_terminal and not console.quiet:
            self.bar = Bar(
                TextColumn("{task.description}"),
                BarColumn(),
                MofNCompleteColumn(),
                TextColumn("{task.fields[rate]}"),
                TimeRemainingColumn(),
                TextColumn("{task.fields[value]}"),
                console=console.err,
                transient=True,
            )

    def __enter__(self) -> RunProgress:
        if self.bar:
            self.bar.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self.bar:
            self.bar.stop()

    def compiling(self) -> None:
        self.console.note("compiling the kernels for this machine: once, about 10 s ...")

    def case(self, name: str, realisations: int, person_steps: float) -> None:
        self.peaks = []
        self._name, self._done, self._steps = name, 0, 0
        self._begun = time.monotonic()
        if self.bar:
            self.task = self.bar.add_task(name, total=realisations, rate="", value="")

    def row(self, row: Row) -> None:
        self._done += 1
        self._steps += row.person_steps
        if not self.bar:
            return
        insort(self.peaks, float(row.response.peak.max()))
        now = time.monotonic()
        if now - self._shown < 0.1:
            return
        self._shown = now
        done = len(self.peaks)
        value = self.peaks[percentile_rank(done, 0.95) - 1]
        rate = done / max(now - self._begun, 1e-9)
        self.bar.update(
            self.task,
            completed=done,
            rate=f"{rate:.3g} a second",
            value=f"95 % of whole records so far {number(value)} m/s2",
        )

    def case_done(self) -> None:
        if self.console.verbose:
            elapsed = max(time.monotonic() - self._begun, 1e-9)
            rate = f"{self._steps / elapsed:.3g} person-steps a second"
            self.console.note(f"{self._name}: {self._done} realisations in {span(elapsed)}, {rate}")
        if self.bar:
            self.bar.update(self.task, completed=len(self.peaks))
