"""From a scenario to what one case needs: modes as simulated, streams, step, recorder."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from crowdsim.bridge.modal import ModalModel, Mode, Point
from crowdsim.bridge.ordinates import Table
from crowdsim.crowd.arrivals import ConstantNumber
from crowdsim.dynamics import newmark, step
from crowdsim.dynamics.realisation import CELLS, Deck, Recorder, deck_table, table_cells
from crowdsim.loads import load_set as loads
from crowdsim.scenario.reader import Scenario
from crowdsim.scenario.schema import CaseTable
from crowdsim.study.situation import FASTEST_SHARE, SLOWEST_SHARE, Situation, Stream, resonates, situation

Floats = NDArray[np.float64]
STATIONS = 96
FINE_FOR_JUMPS = 400  # where a person's force begins with a step
FINEST = 500  # steps in a second, when a short deck with many half waves asks for more


@dataclass(frozen=True)
class Case(Situation):
    """Everything that the realisations of one case have in common."""

    driven: tuple[Mode, ...]
    choice: step.StepChoice
    points: tuple[Point, ...]
    stations: tuple[Point, ...]
    deck_s: Floats
    deck: Deck
    coefficients: Floats
    recorder: Recorder
    warm_up: float
    warm_up_needed: float
    seed: int

    @property
    def end(self) -> float:
        """Time of the last step [s]."""
        return (self.recorder.total - 1) * self.choice.time_step


def prepare(scenario: Scenario, table: CaseTable, seed: int | None = None) -> Case:
    """Brings one case to numbers. The people's mass and a pace on a mode's frequency are solved together."""
    file = scenario.file
    now = situation(scenario, table)
    bare, model, streams = now.bare, now.model, now.streams
    driven = tuple(m for m in model.modes if m.driven) or model.modes[:1]
    choice, deck = _step(scenario, bare, driven, streams)
    needed = _warm_up(bare, driven, streams)
    given = file.run.warm_up
    warm_up = given if given is not None else 0.0 if now.event else needed
    n = choice.per_second
    warm = math.ceil(warm_up * n - 1e-9)
    observed = max(round(file.run.duration * n), n)
    points = _points(scenario, model)
    deck_s, stations = _stations(model, points)
    recorder = Recorder(
        points=_ordinates(driven, points),
        stations=_ordinates(driven, stations),
        total=warm + observed + 1,
        warm=warm,
        window=n,
        segment=max(round(now.window * n), 1),
        directions=(deck_s.size * len(model.edges),) * len(model.directions),
    )
    scheme = newmark.Newmark.named(file.run.integration, file.run.matched)
    coefficients = (
        newmark.step_coefficients(
            scheme,
            np.array([m.frequency for m in driven]),
            np.array([m.damping for m in driven]),
            np.array([m.modal_mass for m in driven]),
            choice.time_step,
        )
        if math.isfinite(choice.peak_error) and math.isfinite(choice.history_error)
        else np.zeros((len(driven), 11))
    )
    return Case(
        **{**{f.name: getattr(now, f.name) for f in fields(Situation)}, "duration": observed / n},
        driven=driven, choice=choice, points=points, stations=stations,
        deck_s=deck_s, deck=deck, coefficients=coefficients, recorder=recorder,
        warm_up=warm / n, warm_up_needed=needed, seed=file.run.seed if seed is None else seed,
    )  # fmt: skip


def _warm_up(model: ModalModel, driven: tuple[Mode, ...], streams: tuple[Stream, ...]) -> float:
    slowest = max(
        0.0
        if isinstance(s.walkers.arrivals, ConstantNumber)
        else model.length / s.walkers.speed_quantile(SLOWEST_SHARE)
        for s in streams
    )
    return slowest + 3.0 * max(m.time_constant for m in driven)


def _step(
    scenario: Scenario, model: ModalModel, driven: tuple[Mode, ...], streams: tuple[Stream, ...]
) -> tuple[step.StepChoice, Deck]:
    run = scenario.file.run
    top = max(_top_harmonic(s.load) * float(s.walkers.pace.quantile(FASTEST_SHARE)) for s in streams)
    speed = max(1.0 / s.inverse_speed for s in streams)
    scheme = newmark.Newmark.named(run.integration, run.matched)
    frequency = np.array([m.frequency for m in driven])
    damping = np.array([m.damping for m in driven])
    given = round(1.0 / run.time_step) if run.time_step else None
    # a crowd that is there at time 0 begins with a step of force, which a warm-up forgets
    starts = run.warm_up is not None and any(isinstance(s.walkers.arrivals, ConstantNumber) for s in streams)
    kinked = any(isinstance(t, Table) and t.used == "linear" for m in driven for t in (m.vertical, m.twist))
    n = given or step.steps_per_second(float(frequency.max()), top)
    while True:
        before = table_cells(model.length, 4.0 / n)
        vertical, twist = _fine_tables(model, driven, before)
        both = vertical if twist is None else np.hstack([vertical, 0.5 * model.width * twist])
        ends = np.abs(both[[before, before + CELLS]]).max(axis=0)
        jumps = bool(np.any(ends > 1e-6 * np.abs(both[before : before + CELLS + 1]).max()))
        choice = step.choose(
            scheme, frequency, damping, top, both, before, model.length / CELLS, speed,
            sharp=jumps or starts or not resonates(driven, streams), per_second=n,
        )  # fmt: skip
        if jumps and not given and n < FINE_FOR_JUMPS:
            n = FINE_FOR_JUMPS
            continue
        fine = choice.ordinate_error <= step.ORDINATE_ERROR or kinked or given or n >= FINEST
        if fine or not math.isfinite(choice.history_error):
            return choice, deck_table(vertical, twist, model.length, before)
        n = min(FINEST, math.ceil(1.5 * n / 20) * 20)


def _fine_tables(model: ModalModel, driven: tuple[Mode, ...], before: int) -> tuple[Floats, Floats | None]:
    cell = model.length / CELLS
    s: Floats = (np.arange(CELLS + 2 * before + 2, dtype=np.float64) - before) * cell
    zero = np.zeros(s.size)
    vertical = np.stack([m.vertical(s) if m.vertical else zero for m in driven], axis=1)
    if not any(m.twist for m in driven):
        return vertical, None
    return vertical, np.stack([m.twist(s) if m.twist else zero for m in driven], axis=1)


def _top_harmonic(load: loads.LoadSet) -> int:
    low, high = max(load.pace_range[0], 1.0), min(load.pace_range[1], 3.0)
    factors = load.factors(np.linspace(low, high, 5)).max(axis=0)
    return int(np.flatnonzero(factors > 0.0)[-1]) + 1 if np.any(factors > 0.0) else 1


def _points(scenario: Scenario, model: ModalModel) -> tuple[Point, ...]:
    own = tuple(Point(p.name, p.s, p.e, p.direction) for p in scenario.file.point)
    return (*model.antinodes, *own)


def _stations(model: ModalModel, points: tuple[Point, ...]) -> tuple[Floats, tuple[Point, ...]]:
    s = np.array([i * model.length / STATIONS for i in range(STATIONS + 1)] + [p.s for p in points])
    s = np.unique(np.round(s, 9))
    s = s[np.concatenate([[True], np.diff(s) > 1e-6 * model.length])]
    return s, tuple(Point("", float(x), e, direction) for direction in model.directions for e in model.edges for x in s)


def _ordinates(driven: tuple[Mode, ...], points: tuple[Point, ...]) -> Floats:
    s = np.array([p.s for p in points])
    e = np.array([p.e for p in points])
    out = np.zeros((len(points), len(driven)))
    for direction in {p.direction for p in points}:
        rows = np.array([p.direction == direction for p in points])
        for j, m in enumerate(driven):
            out[rows, j] = m.ordinate(direction, s[rows], e[rows])
    return out
