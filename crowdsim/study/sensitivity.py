"""What the 95 % peak hangs on: the base and one change at a time, with the same random numbers."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

import crowdsim
from crowdsim.dynamics.realisation import NotFiniteError, Response
from crowdsim.errors import InputError, Problem, RunError
from crowdsim.response.paired import PairedChanges
from crowdsim.response.windows import window_percentile
from crowdsim.results.sensitivity import Base, Sensitivity, Varied, ranked
from crowdsim.scenario.reader import Scenario
from crowdsim.study.executor import Halt, default_workers, rows
from crowdsim.study.prepare import Case
from crowdsim.study.progress import Progress
from crowdsim.study.sanity import OUTSIDE_SHARE
from crowdsim.study.simulate import Plan, plan, refuse_errors, warm_kernels
from crowdsim.study.situation import cases
from crowdsim.study.variations import Variation, same, variations

Floats = NDArray[np.float64]


def sensitivity(
    scenario: Scenario,
    *,
    case: str | None = None,
    realisations: int | None = None,
    seed: int | None = None,
    workers: int | None = None,
    progress: Progress | None = None,
) -> Sensitivity:
    """Changes one thing at a time and says how the 95 % peak anywhere on the deck follows.

    Parameters
    ----------
    case : name of the case; may be left out where there is one
    realisations, seed : of the base and of every variation, default those of the scenario
    workers : threads; changes no number

    All are run with the same random numbers, and observed from the moment at which the base is, so that the same
    persons are compared; intervals of the changes come from resampling realisations in pairs.

    Raises
    ------
    InputError : several cases and none named, no such case, a finding that stops the run
    RunError : the base has no response, or a motion that is not finite
    """
    progress = progress or Progress()
    workers = workers or default_workers()
    prepared = plan(scenario, case=_only(scenario, case), realisations=realisations, seed=seed)
    refuse_errors(prepared)
    (base,) = prepared.cases
    (table,) = [t for t in cases(scenario) if t.name == base.name]
    warm_kernels(base, progress)
    try:
        found = _peaks(base, "as it stands", prepared, workers, progress)
    except NotFiniteError as error:
        raise RunError(f"case {base.name!r}: {error}; check frequencies, masses and the time step") from None
    moved = [i for i in range(found.shape[2]) if found[:, :, i].max() > 0.0]
    peaks = found[:, :, moved[0]] if moved else found[:, :, 0]
    value = window_percentile(peaks)
    if not value.value > 0.0:
        raise RunError(f"case {base.name!r}: the 95 % peak is 0: nobody moves the deck, so nothing changes")
    study = _Study(prepared, base, PairedChanges(peaks), moved[0], workers, progress)
    changes, left = variations(scenario, table, base)
    varied, order = ranked([study.run(v) for v in changes])
    return Sensitivity(
        title=scenario.title, case=base.name, direction=base.model.directions[moved[0]],
        window=base.window if base.recorder.segments else base.duration,
        realisations=prepared.realisations, seed=prepared.seed, version=crowdsim.__version__,
        base=Base(value.value, value.low, value.high), variations=varied, order=order, not_varied=tuple(left),
    )  # fmt: skip


def _only(scenario: Scenario, case: str | None) -> str | None:
    names = [t.name for t in cases(scenario)]
    if case is None and len(names) > 1:
        raise InputError(
            scenario.source, [Problem("case", f"{len(names)} cases", f"name one with --case: {', '.join(names)}")]
        )
    return case


class _Study:
    """Runs variations beside a base that was run."""

    def __init__(
        self, prepared: Plan, base: Case, changes: PairedChanges, direction: int, workers: int, progress: Progress
    ):
        self.prepared, self.base, self.changes, self.direction = prepared, base, changes, direction
        self.workers, self.progress = workers, progress

    def run(self, variation: Variation) -> Varied:
        """The variation with its numbers, or with the reason why it has none."""
        if variation.scenario is None:
            return _without(variation, f"cannot be built: {variation.problem}")
        try:
            made = plan(variation.scenario, realisations=self.prepared.realisations, seed=self.prepared.seed)
            refuse_errors(made)
        except InputError as error:
            return _without(variation, f"cannot be built: {'; '.join(p.text() for p in error.problems)}")
        case = observed_like(made.cases[0], self.base)
        if same(case, self.base):
            return _without(variation, "the same as the base")
        try:
            found = _peaks(case, variation.label, made, self.workers, self.progress)
        except NotFiniteError as error:
            return _without(variation, f"cannot be run: {error}")
        peaks = found[:, :, self.direction]
        change = self.changes.change(peaks)
        note = "; ".join(n for n in (variation.note, *_outside(case, self.base)) if n)
        return Varied(
            variation.subject, variation.label, variation.source, window_percentile(peaks).value,
            change.value, change.low, change.high, note,
        )  # fmt: skip


def _without(variation: Variation, why: str) -> Varied:
    return Varied(variation.subject, variation.label, variation.source, None, None, None, None, why)


def _outside(case: Case, base: Case) -> list[str]:
    """Streams whose pace leaves the range of the load set more often than in the base."""
    found: dict[str, list[str]] = {}
    for now, before in zip(case.streams, base.streams, strict=True):
        if now.outside > max(OUTSIDE_SHARE, 1.1 * before.outside):
            low, high = now.load.pace_range
            said = f"{100 * now.outside:.2g} % outside {low:g} to {high:g} Hz, where {now.load.name} holds"
            found.setdefault(said, []).append(now.walkers.name)
    return [f"paces of {', '.join(names)}: {said}" for said, names in found.items()]


def observed_like(case: Case, base: Case) -> Case:
    """The case, observed from the moment at which `base` is.

    Every draw of a realisation counts from time 0: with a warm-up of its own a variation would look at other persons.
    Where it wanted a longer one (less damping, slower people) the first window lacks a few seconds of build-up; the
    mean peak there is within 1 % of that in later windows at half the damping (computed).
    """
    n = case.choice.per_second
    warm = math.ceil(base.warm_up * n - 1e-9)
    recorder = replace(case.recorder, warm=warm, total=case.recorder.total - case.recorder.warm + warm)
    return replace(case, recorder=recorder, warm_up=warm / n)


def _peaks(case: Case, name: str, prepared: Plan, workers: int, progress: Progress) -> Floats:
    """Largest acceleration anywhere on the deck [realisation, window, direction] [m/s2].

    One column, the whole record, where no window fits.
    """
    count = prepared.realisations
    progress.case(name, count, prepared.person_steps(case))
    halt, found = Halt(), []
    try:
        for row in rows(case, count, min(workers, count), halt):
            found.append(_anywhere(row.response, case))
            progress.row(row)
    except BaseException:
        halt.set()
        raise
    progress.case_done()
    return np.stack(found)


def _anywhere(response: Response, case: Case) -> Floats:
    if response.deck_window_peak.shape[0]:
        return response.deck_window_peak
    parts = np.split(response.envelope, np.cumsum(case.recorder.directions)[:-1])
    return np.array([[part.max() for part in parts]])
