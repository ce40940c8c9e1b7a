"""The main job: every case of a scenario, its realisations, the results file."""

from __future__ import annotations

import tempfile
import threading
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from crowdsim.dynamics.kernels import CHUNK
from crowdsim.dynamics.realisation import NotFiniteError
from crowdsim.errors import InputError, InterruptedRunError, Problem, RunError
from crowdsim.results.reader import Results, open_results
from crowdsim.results.writer import CaseHead, CaseWriter, ResultsWriter
from crowdsim.scenario.reader import Scenario
from crowdsim.study.assumptions import assumptions
from crowdsim.study.executor import Halt, default_workers, rows
from crowdsim.study.jobs import run_realisation
from crowdsim.study.prepare import Case, prepare
from crowdsim.study.progress import Progress
from crowdsim.study.sanity import Finding, findings
from crowdsim.study.situation import cases

LONG_RECORD = 3600.0  # s; of longer records only the surroundings of the largest peak are kept
AROUND_PEAK = 120.0  # s
_PATIENCE = 1.0  # s before a compilation is announced


@dataclass(frozen=True)
class Plan:
    """A scenario brought to numbers: what `check` shows and `simulate` runs."""

    scenario: Scenario
    cases: tuple[Case, ...]
    realisations: int
    seed: int
    findings: tuple[Finding, ...]

    @property
    def errors(self) -> tuple[Finding, ...]:
        """Findings that stop a run."""
        return tuple(f for f in self.findings if f.level == "error")

    def person_steps(self, case: Case) -> float:
        """Expected in one realisation."""
        return case.persons * case.recorder.total


def plan(
    scenario: Scenario, *, case: str | None = None, realisations: int | None = None, seed: int | None = None
) -> Plan:
    """Prepares the cases (or the one called `case`). Raises InputError where there is no such case."""
    tables = cases(scenario)
    if case is not None:
        chosen = [t for t in tables if t.name == case]
        if not chosen:
            names = ", ".join(t.name for t in tables)
            raise InputError(scenario.source, [Problem("case", f"no case is called {case!r}", f"cases here: {names}")])
        tables = chosen
    run = scenario.file.run
    count = run.realisations if realisations is None else realisations
    prepared = tuple(prepare(scenario, t, seed) for t in tables)
    found = findings(scenario, list(prepared), count)
    return Plan(scenario, prepared, count, run.seed if seed is None else seed, tuple(found))


def refuse_errors(plan: Plan) -> None:
    """Raises InputError where a finding stops the run."""
    if plan.errors:
        raise InputError(plan.scenario.source, [Problem(f.key, f.text) for f in plan.errors])


def warm_kernels(case: Case, progress: Progress) -> None:
    """Compiles the kernels, or loads them, and says so where it takes long."""
    timer = threading.Timer(_PATIENCE, progress.compiling)
    timer.daemon = True
    timer.start()
    try:
        halt = Halt()
        halt.set()
        from crowdsim.dynamics.realisation import Control

        run_realisation(case, 0, control=Control(halt.flag, halt.progress))
    finally:
        timer.cancel()
    progress.ready()


def head(scenario: Scenario, case: Case) -> CaseHead:
    """What the results file says of a case beside its numbers."""
    choice = case.choice
    return CaseHead(
        name=case.name, time_step=choice.time_step, warm_up=case.warm_up, duration=case.duration, window=case.window,
        windows=case.recorder.segments, criterion=case.criterion,
        people=case.people, persons=case.persons,
        points=[(p.name, p.s, p.e, p.direction) for p in case.points],
        directions=case.model.directions, deck_s=case.deck_s, deck_e=case.model.edges,
        modes=[(m.name, m.frequency, m.damping, m.modal_mass, case.added_mass[m.name]) for m in case.model.modes],
        assumptions=assumptions(scenario, case), target=case.target, limit=case.limit,
        step={
            "steps_per_second": choice.per_second, "steps_per_force_sample": choice.factor,
            "samples_per_chunk": CHUNK, "peak_error": choice.peak_error, "history_error": choice.history_error,
            "ordinate_error": choice.ordinate_error, "sampling_error": choice.sampling_error,
        },
    )  # fmt: skip


def simulate_to(
    plan: Plan,
    out: str | Path,
    *,
    workers: int | None = None,
    progress: Progress | None = None,
    force: bool = False,
) -> None:
    """Runs a plan and writes its results file.

    Raises
    ------
    InputError : a finding that stops the run
    ResultsError : the file is there already, or cannot be written
    InterruptedRunError : the user stopped it; the rows finished so far are in the file
    RunError : a realisation whose motion is not finite
    """
    refuse_errors(plan)
    progress = progress or Progress()
    workers = workers or default_workers()
    begun = time.perf_counter()
    text = [f.line() for f in plan.findings]
    with ResultsWriter(Path(out), plan.scenario.text, plan.seed, text, force=force) as results:
        warm_kernels(plan.cases[0], progress)
        finished = 0
        for number, case in enumerate(plan.cases):
            writer = results.case(head(plan.scenario, case))
            complete = _run_case(case, plan, writer, workers, progress)
            finished += writer.count
            if not complete:
                if writer.count == 0:
                    results.drop_last_case()
                place = results.finish(_facts(begun, workers, plan), complete=False) if finished else None
                where = f" of case {case.name!r}" if len(plan.cases) > 1 else ""
                left = len(plan.cases) - number - 1
                rest = f"; {left} case{'s' if left > 1 else ''} not begun" if left else ""
                kept = f" in {place}, marked incomplete" if place else "; no file was made"
                raise InterruptedRunError(
                    f"stopped: {writer.count} of {plan.realisations} written{where}{rest}{kept}",
                    str(place) if place else None,
                )
        results.finish(_facts(begun, workers, plan))


def _facts(begun: float, workers: int, plan: Plan) -> dict[str, Any]:
    return {
        "elapsed": time.perf_counter() - begun,
        "workers": workers,
        "asked": plan.realisations,
        "source": plan.scenario.source,
    }


def _run_case(case: Case, plan: Plan, writer: CaseWriter, workers: int, progress: Progress) -> bool:
    """Fills `writer`; False where the user stopped it."""
    halt = Halt()
    progress.case(case.name, plan.realisations, plan.person_steps(case))
    largest = (-1.0, 0, 0.0)
    first_peak_time = 0.0
    complete = True
    try:
        for row in rows(case, plan.realisations, min(workers, plan.realisations), halt):
            writer.append(row.response, row.crossings)
            top = int(np.argmax(row.response.peak))
            if row.number == 0:
                first_peak_time = float(row.response.peak_time[top])
            if row.response.peak[top] > largest[0]:
                largest = (float(row.response.peak[top]), row.number, float(row.response.peak_time[top]))
            progress.row(row)
    except KeyboardInterrupt:
        halt.set()
        complete = False
    except NotFiniteError as error:
        raise RunError(f"case {case.name!r}: {error}; check frequencies, masses and the time step") from None
    writer.flush()
    if writer.count:
        _keep(case, writer, 0, first_peak_time)
        if largest[1] != 0:
            _keep(case, writer, largest[1], largest[2])
    progress.case_done()
    return complete and writer.count == plan.realisations


def _keep(case: Case, writer: CaseWriter, number: int, peak_time: float) -> None:
    n = case.choice.per_second
    begin, end = 0, case.recorder.total
    if case.duration > LONG_RECORD:
        begin = max(case.recorder.warm, round((peak_time - AROUND_PEAK) * n))
        end = min(case.recorder.total, round((peak_time + AROUND_PEAK) * n) + 1)
    row = run_realisation(case, number, history=(begin, end))
    assert row is not None
    writer.history(number, begin, row.response.history)


def simulate(
    scenario: Scenario,
    *,
    out: str | Path | None = None,
    case: str | None = None,
    realisations: int | None = None,
    seed: int | None = None,
    workers: int | None = None,
    progress: Progress | None = None,
    force: bool = False,
) -> Results:
    """Simulates a scenario and gives its results; `out` keeps the file.

    Parameters
    ----------
    case : name of the only case to run; default all
    realisations, seed : default those of the scenario
    workers : threads; changes no number

    Raises as `plan` and `simulate_to`.
    """
    prepared = plan(scenario, case=case, realisations=realisations, seed=seed)
    if out is not None:
        simulate_to(prepared, out, workers=workers, progress=progress, force=force)
        return open_results(out)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "run.h5"
        simulate_to(prepared, path, workers=workers, progress=progress)
        return open_results(path)
