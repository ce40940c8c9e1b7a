"""What a person at a terminal sees: tables, progress, JSON for programs."""

from __future__ import annotations

import json as json_module
import textwrap
import time
from bisect import insort
from math import floor, isfinite, log10
from types import TracebackType
from typing import Any

import rich.console
from rich.progress import BarColumn, MofNCompleteColumn, TextColumn, TimeRemainingColumn
from rich.progress import Progress as Bar
from rich.table import Table

from crowdsim.response.statistics import LEAST_FOR_INTERVAL, Distribution1D, percentile_rank
from crowdsim.results.summary import CaseSummary, DeckSummary, Summary
from crowdsim.study.executor import default_workers
from crowdsim.study.jobs import Row
from crowdsim.study.progress import Progress
from crowdsim.study.simulate import Plan

CAUTION = (
    "Comfort only: this is no safety check of the structure. Lateral lock-in, deliberate jumping and panic are "
    "outside. Damping is uncertain until it is measured. The governing code, the owner's criteria and a licensed "
    "engineer decide."
)
# measured on one core; says how long a run takes, decides nothing
_PER_PERSON_STEP = 0.5e-9
_PER_STEP = 12e-9
_START = 1.0
WIDE = 110  # columns; a narrower terminal gets fewer columns, never a cut number
FEW = 20  # realisations below which 95 % is the largest of all


def number(value: float, digits: int = 3) -> str:
    """With `digits` significant digits and no power of ten within reach."""
    if value == 0.0:
        return "0"
    if not 1e-4 <= abs(value) < 1e6:
        return f"{value:.{digits - 1}e}"
    places = max(0, digits - 1 - floor(log10(abs(value))))
    return f"{value:,.{places}f}"


def span(seconds: float) -> str:
    """A duration as a person says it."""
    if seconds < 90.0:
        return f"{seconds:.3g} s"
    if seconds < 5400.0:
        return f"{seconds / 60:.3g} min"
    return f"{seconds / 3600:.3g} h"


def interval(values: Distribution1D) -> str:
    """Of the 95 % value."""
    if values.p95.low is None or values.p95.high is None:
        return "none"
    return f"{number(values.p95.low)} to {number(values.p95.high)}"


def _or_dash(value: float | None) -> str:
    return "-" if value is None else number(value)


def _headline(case: CaseSummary, deck: DeckSummary) -> str:
    """The answer of a case in one direction, as a sentence."""
    p = deck.peak
    if p.largest == 0.0:
        if deck.direction != "vertical":
            return f"No {deck.direction} response: no force acts in that direction in this version."
        return "No vertical response: nobody stepped on in time, or everybody walks where no mode moves."
    if deck.direction != "vertical":
        return (
            f"The {deck.direction} response below comes from vertical forces alone: far too small, and no assessment."
        )
    where = f"It is largest at s = {number(deck.s)} m, e = {number(deck.e)} m."
    if case.realisations < FEW:
        spans = f"{case.realisations} spans" if case.realisations > 1 else "one span"
        return (
            f"The largest {deck.direction} acceleration anywhere on the deck in {spans} of {span(case.duration)} is "
            f"{number(p.largest)} m/s2; a 95 % value takes at least {FEW} realisations, its interval "
            f"{LEAST_FOR_INTERVAL}. {where}"
        )
    sure = (
        f"95 % confidence interval {interval(p)}"
        if p.p95.low is not None
        else f"no interval: that takes {LEAST_FOR_INTERVAL} realisations"
    )
    return (
        f"In an estimated 95 of 100 such spans of {span(case.duration)} the largest {deck.direction} acceleration "
        f"anywhere on the deck stays at or below {number(p.p95.value)} m/s2 ({sure}). {where}"
    )


class Console:
    """Prints results on standard output, all else on standard error."""

    def __init__(self, *, quiet: bool = False, verbose: bool = False, json: bool = False):
        self.quiet, self.verbose, self.json = quiet, verbose, json
        self.out = rich.console.Console(highlight=False, markup=False)
        self.err = rich.console.Console(stderr=True, highlight=False, markup=False)
        if not self.out.is_terminal:
            self.out.width = 120

    def note(self, text: str) -> None:
        """A line on standard error, unless quiet."""
        if not self.quiet:
            self.err.print(text)

    def _table(self, title: str, columns: list[tuple[str, str]], rows: list[list[str]]) -> None:
        table = Table(title=title, title_justify="left", title_style="bold", box=None, pad_edge=False, padding=(0, 1))
        for i, (name, side) in enumerate(columns):
            whole = max([len(name), *(len(row[i]) for row in rows)]) if side != "l" else None
            table.add_column(
                name, justify="right" if side == "r" else "left", no_wrap=side != "l", min_width=whole, overflow="fold"
            )
        for row in rows:
            table.add_row(*row)
        self.out.print(table)

    def _list(self, title: str, lines: list[str] | tuple[str, ...]) -> None:
        if not lines:
            return
        self.out.print(title, style="bold")
        for line in lines:
            self.out.print(textwrap.fill(line, self.out.width - 2, initial_indent="  - ", subsequent_indent="    "))

    def _json(self, value: Any) -> None:
        self.out.file.write(json_module.dumps(value, indent=2, allow_nan=False) + "\n")

    def summary(self, summary: Summary) -> None:
        """The summary of a run."""
        if self.json:
            self._json(summary.as_dict())
            return
        if self.quiet:
            return
        self.out.print(summary.title, style="bold")
        self._list("Findings", summary.findings)
        shared = [a for a in summary.cases[0].assumptions if all(a in c.assumptions for c in summary.cases)]
        for case in summary.cases:
            self._case(case, [a for a in case.assumptions if a not in shared])
        self.out.print()
        self._list("Assumed" if len(summary.cases) == 1 else "Assumed in every case", shared)
        self.out.print()
        self.out.print(textwrap.fill(CAUTION, self.out.width))
        self.out.print(f"Results: {summary.file} (seed {summary.seed}, crowdsim {summary.version})", soft_wrap=True)

    def _case(self, case: CaseSummary, own: list[str]) -> None:
        self.out.print()
        warm = f"each after a warm-up of {span(case.warm_up)}" if case.warm_up else "each from rest"
        self.out.print(
            textwrap.fill(
                f"Case {case.name}: {case.realisations:,} realisation{'s' if case.realisations != 1 else ''} of "
                f"{span(case.duration)}, {warm}; "
                f"{number(case.persons_on_deck)} persons on the deck on average, "
                f"{number(case.crossings_mean)} crossings a realisation.",
                self.out.width,
            )
        )
        mass = [m for m in case.modes if m["added_mass"] > 0.0]
        if mass:
            shifted = ", ".join(f"{m['name']} at {number(m['frequency'], 4)} Hz" for m in mass)
            self.out.print(f"With the people's mass: {shifted}.")
        asked = f"class {case.target}" if case.target else f"at most {number(case.limit)} m/s2" if case.limit else ""
        if asked:
            self.out.print(f"Asked: {asked}; kept with the results, no verdict in this version.")
        for deck in case.deck:
            self.out.print(textwrap.fill(_headline(case, deck), self.out.width))
        rows = []
        for point in case.points:
            p = point.peak
            rows.append(
                [point.name, number(point.s), number(point.e), point.direction, number(p.mean), _or_dash(p.sd),
                 number(p.median), number(p.p95.value), interval(p), number(p.largest), number(point.rms.mean),
                 number(point.running_rms_max.p95.value)]
            )  # fmt: skip
        columns = [("at", "l"), ("s, m", "r"), ("e, m", "r"), ("direction", "k"), ("mean", "r"), ("sd", "r"),
                   ("median", "r"), ("95 % value", "r"), ("its 95 % interval", "r"), ("largest", "r"),
                   ("RMS, mean", "r"), ("1 s RMS, 95 %", "r")]  # fmt: skip
        if self.out.width < WIDE:
            keep = [
                i for i, (name, _) in enumerate(columns) if name not in ("sd", "median", "RMS, mean", "1 s RMS, 95 %")
            ]
            columns, rows = [columns[i] for i in keep], [[row[i] for i in keep] for row in rows]
        self._table("Peak acceleration of all modes together, m/s2, where each mode moves most", columns, rows)
        self._list("Assumed", own)

    def check(self, plan: Plan) -> None:
        """A scenario as understood."""
        if self.json:
            self._json(check_dict(plan))
            return
        model = plan.cases[0].bare
        self.out.print(plan.scenario.title, style="bold")
        self.out.print(f"Deck {number(model.length)} m long, {number(model.width)} m wide")
        rows = []
        for m in model.modes:
            shapes = [
                f"{d}: {getattr(m, d).text()}"
                for d in ("vertical", "lateral", "longitudinal", "twist")
                if getattr(m, d) is not None
            ]
            rows.append([m.name, f"{number(m.frequency, 4)} Hz", f"{number(100 * m.damping)} %",
                         f"{number(m.modal_mass, 4)} kg", span(m.time_constant), "; ".join(shapes)])  # fmt: skip
        columns = [("mode", "l"), ("frequency", "r"), ("damping", "r"), ("modal mass", "r"), ("1/(zeta omega)", "r"),
                   ("ordinates", "l")]  # fmt: skip
        self._table("Modes", columns, rows)
        for case in plan.cases:
            self._check_case(plan, case)
        self._list("Findings", [f"{f.level}: {f.line()}" for f in plan.findings])
        if not plan.findings:
            self.out.print("No findings.")

    def _check_case(self, plan: Plan, case: Any) -> None:
        self.out.print()
        self.out.print(f"Case {case.name}", style="bold")
        density = case.persons / (case.bare.length * case.bare.width)
        self.out.print(f"{number(case.persons)} persons on the deck on average, {number(density)} per m2")
        rows = [
            [s.walkers.name, s.walkers.pace.text("Hz"), f"{number(1.0 / s.inverse_speed)} m/s",
             s.walkers.weight.text("N"), s.load.name, number(s.persons)]
            for s in case.streams
        ]  # fmt: skip
        columns = [("stream", "l"), ("pace", "l"), ("speed, mean on deck", "r"), ("weight", "l"), ("load", "l"),
                   ("on deck", "r")]  # fmt: skip
        self._table("Streams", columns, rows)
        c = case.choice
        self.out.print(
            f"Time step 1/{c.per_second} s, force sampled at every {_ordinal(c.factor)}step, "
            f"expected error of a resonant peak {100 * c.expected_error:.3g} %; warm-up {span(case.warm_up)}"
        )
        steps = plan.person_steps(case)
        seconds = run_time(plan, case, default_workers())
        self.out.print(
            f"{plan.realisations:,} realisations of {span(case.duration)}: "
            f"{plan.realisations * steps:.2g} person-steps, about {span(seconds)} with {default_workers()} workers"
        )
        if self.verbose:
            self.out.print(
                f"Errors: peak by parabola {c.peak_error:.1e}, integration {c.history_error:.1e}, ordinates between "
                f"table values {c.ordinate_error:.1e}, force between samples {c.sampling_error:.1e}"
            )
            rows = [[p.name, number(p.s), number(p.e), p.direction] for p in case.points]
            self._table("Recorded", [("at", "l"), ("s, m", "r"), ("e, m", "r"), ("direction", "l")], rows)
        from crowdsim.study.assumptions import assumptions

        self._list("Assumed", assumptions(plan.scenario, case))


def _ordinal(factor: int) -> str:
    return {1: "", 2: "second ", 4: "fourth "}[factor]


def run_time(plan: Plan, case: Any, workers: int) -> float:
    """Rough seconds of a case, from figures measured on one core of a server."""
    one: float = plan.person_steps(case) * _PER_PERSON_STEP + case.recorder.total * _PER_STEP * (
        1 + len(case.driven) / 4
    )
    return _START + plan.realisations * (one + 4e-4) / workers


def check_dict(plan: Plan) -> dict[str, Any]:
    """A scenario as understood, for programs."""
    model = plan.cases[0].bare
    return {
        "title": plan.scenario.title,
        "deck": {"length": model.length, "width": model.width},
        "modes": [
            {"name": m.name, "frequency": m.frequency, "damping": m.damping, "modal_mass": m.modal_mass}
            for m in model.modes
        ],
        "cases": [
            {
                "name": case.name,
                "persons_on_deck": case.persons,
                "time_step": case.choice.time_step,
                "expected_error": case.choice.expected_error if isfinite(case.choice.expected_error) else None,
                "warm_up": case.warm_up,
                "duration": case.duration,
                "person_steps": plan.realisations * plan.person_steps(case),
                "run_time": run_time(plan, case, default_workers()),
                "modes": [
                    {"name": m.name, "frequency": m.frequency, "modal_mass": m.modal_mass} for m in case.model.modes
                ],
                "points": [{"name": p.name, "s": p.s, "e": p.e, "direction": p.direction} for p in case.points],
            }
            for case in plan.cases
        ],
        "realisations": plan.realisations,
        "findings": [{"level": f.level, "key": f.key, "text": f.text} for f in plan.findings],
        "notes": list(plan.scenario.notes),
    }


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
            self.task, completed=done, rate=f"{rate:.3g} a second", value=f"95 % value so far {number(value)} m/s2"
        )

    def case_done(self) -> None:
        if self.console.verbose:
            elapsed = max(time.monotonic() - self._begun, 1e-9)
            rate = f"{self._steps / elapsed:.3g} person-steps a second"
            self.console.note(f"{self._name}: {self._done} realisations in {span(elapsed)}, {rate}")
        if self.bar:
            self.bar.update(self.task, completed=len(self.peaks))
