"""Hand formulas for a scenario: what each stands for, assumes and gives. No simulation, no kernel."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from crowdsim.bridge.modal import Mode
from crowdsim.crowd.populations import GRAVITY
from crowdsim.errors import InputError, Problem
from crowdsim.guides import narrow_band, resonance, static_deflection
from crowdsim.guides.matsumoto_1978 import multiplier
from crowdsim.results.texts import number, percent, span
from crowdsim.scenario.reader import Scenario
from crowdsim.study.resonances import Resonance, density_on_deck, reach, resonances, stationary
from crowdsim.study.screening import Screened, screen
from crowdsim.study.situation import Situation, Stream, cases, situation

TEXTBOOK = "textbook; derived and tested here"
STEADY, CROSSING = "steady state in resonance", "one crossing in resonance, force moving"
FIXED = "one crossing in resonance, force in one place"
WEIGHTS = "resonance by weights, C = {}"
SQUARE_ROOT = "one crossing x square root of the number"
NARROW_SD, NARROW_PEAK = "random stream, narrow band, rms", "random stream, narrow band, peak"
DEFLECTION = "deflection under own weight"
PEAK, RMS = "peak acceleration", "rms acceleration"


@dataclass(frozen=True)
class Method:
    """One formula applied to one mode of one case.

    value : None where the formula gives no number; `note` then says why
    stands_for, assumes : what the number is; why : how it differs from a simulation of the case
    """

    name: str
    source: str
    case: str
    direction: str
    measure: str
    value: float | None
    unit: str
    mode: str
    stream: str
    harmonic: int | None
    stands_for: str
    assumes: str
    why: str
    note: str


@dataclass(frozen=True)
class Estimates:
    """All formulas and the screening of a scenario."""

    title: str
    screening: tuple[Screened, ...]
    methods: tuple[Method, ...]
    situations: tuple[Situation, ...]

    def of(self, case: str) -> tuple[Method, ...]:
        """Those of one case."""
        return tuple(m for m in self.methods if m.case == case)

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return {
            "title": self.title,
            "methods": [asdict(m) for m in self.methods],
            "screening": [asdict(s) for s in self.screening],
        }


def estimate(scenario: Scenario, case: str | None = None) -> Estimates:
    """The hand formulas of every case, or of the one called `case`. Raises InputError for a case that is none."""
    tables = [t for t in cases(scenario) if case is None or t.name == case]
    if not tables:
        names = ", ".join(t.name for t in cases(scenario))
        raise InputError(scenario.source, [Problem("case", f"no case is called {case!r}", f"cases here: {names}")])
    all_of_them = tuple(situation(scenario, table) for table in tables)
    return Estimates(
        title=scenario.title,
        screening=tuple(screen(all_of_them)),
        methods=tuple(m for now in all_of_them for m in _case(now)),
        situations=all_of_them,
    )


def _case(now: Situation) -> Iterator[Method]:
    for mode in now.model.modes:
        for direction in ("lateral", "longitudinal"):
            if direction in mode.directions:
                yield _none(now, mode, direction, f"no {direction} force acts in this version")
        if not mode.driven:
            continue
        found = list(resonances(now, mode))
        if not found:
            yield _none(now, mode, "vertical", _out_of_reach(now, mode))
            continue
        for one in found:
            yield from _single(now, one)
        yield from _weights(now, max(found, key=_crossing))
        yield _square_root(now, mode, found)
        yield from _stream(now, mode)
    yield from _deflection(now)


def _method(now: Situation, mode: Mode, name: str, source: str, value: float | None, **other: Any) -> Method:
    given: dict[str, Any] = {
        "direction": "vertical", "measure": PEAK, "unit": "m/s2", "stream": "", "harmonic": None, "stands_for": "",
        "assumes": "", "why": "", "note": "",
    }  # fmt: skip
    return Method(name=name, source=source, case=now.name, mode=mode.name, value=value, **{**given, **other})


def _none(now: Situation, mode: Mode, direction: str, note: str) -> Method:
    return _method(now, mode, STEADY, TEXTBOOK, None, direction=direction, note=note)


def _out_of_reach(now: Situation, mode: Mode) -> str:
    spans = []
    for stream in now.streams:
        low, high = reach(stream, 1)
        spans.append(f"{stream.walkers.name} {number(low)} to {number(high)} Hz times 1 to {stream.load.harmonics}")
    return f"no harmonic of anybody's pace reaches {number(mode.frequency, 4)} Hz ({'; '.join(spans)})"


def _crossing(one: Resonance) -> float:
    """Peak of one crossing [m/s2]."""
    steady = resonance.steady_state(one.force * one.path * one.top, one.mode.damping, one.mode.modal_mass)
    return steady * one.crossing


def _single(now: Situation, one: Resonance) -> Iterator[Method]:
    """One person in resonance: steady state, one crossing, force at a fixed place."""
    mode = one.mode
    steady = resonance.steady_state(one.force * one.path * one.top, mode.damping, mode.modal_mass)
    fixed = resonance.fixed_position_factor(mode.damping, one.cycles)
    who = {"stream": one.who, "harmonic": one.harmonic}
    force = (
        f"harmonic {one.harmonic} of a person of mean weight, {number(one.weight)} N x {number(one.load_factor)} = "
        f"{number(one.force)} N at {number(mode.frequency, 4)} Hz"
    )
    near = (
        f"the simulation has {number(now.persons)} persons on the deck on average, of whom "
        f"{number(one.persons * one.in_band)} at a time have a pace within the half-power band of {mode.name}, and it "
        f"takes the largest peak of {span(now.window)}"
    )
    yield _method(
        now, mode, STEADY, TEXTBOOK, steady, **who,
        stands_for="one person at the mode's antinode, stepping there until the motion grows no more",
        assumes=f"F/(2 zeta M); {force}",
        why=f"95 % of it takes {number(0.477 / mode.damping)} load cycles, a crossing has {number(one.cycles)}; {near}",
    )  # fmt: skip
    yield _method(
        now, mode, CROSSING, f"moving-force factor, {TEXTBOOK}", steady * one.crossing, **who,
        stands_for="one person who crosses once, exactly in the mode's rhythm",
        assumes=f"{number(one.crossing)} of the steady state, in {number(one.cycles)} cycles at {number(one.speed)} "
        f"m/s on the line e = {number(one.line)} m; {force}",
        why=near,
    )  # fmt: skip
    yield _method(
        now, mode, FIXED, f"build-up from rest, {TEXTBOOK}", steady * fixed, **who,
        stands_for="for contrast: the same time of stepping, but at the antinode throughout",
        assumes=f"1 - exp(-2 pi zeta N) = {number(fixed)} of the steady state, N = {number(one.cycles)}",
        why=f"{number(fixed / one.crossing)} times the crossing above: a walker spends most of it where the mode "
        "moves less",
    )  # fmt: skip


def _weights(now: Situation, one: Resonance) -> Iterator[Method]:
    """a/g = C alpha Wp/(2 zeta W) with three meanings of C."""
    mode = one.mode
    who = {"stream": one.who, "harmonic": one.harmonic}
    modal = mode.modal_mass * GRAVITY / one.top**2

    def by(constant: float, walkers: float, structure: float) -> float:
        return GRAVITY * resonance.weight_form(constant, one.load_factor, walkers, mode.damping, structure)

    yield _method(
        now, mode, WEIGHTS.format("1"), TEXTBOOK, by(resonance.MODAL_WEIGHT, one.weight, modal), **who,
        stands_for="the steady state in weights",
        assumes=f"W is the mode's weight M g/phi^2 = {number(modal / 1e3)} kN, one person of {number(one.weight)} N at "
        "the antinode",
        why="as the steady state",
    )  # fmt: skip
    if not one.simple:
        note = "the form is for the first mode of a simple span, sin(pi s/L)"
        for constant in ("2", "1.27"):
            yield _method(now, mode, WEIGHTS.format(constant), _weight_source(constant), None, **who, note=note)
        return
    total = 2.0 * modal
    yield _method(
        now, mode, WEIGHTS.format("2"), TEXTBOOK, by(resonance.TOTAL_WEIGHT_OF_SIMPLE_SPAN, one.weight, total), **who,
        stands_for="the steady state in weights, W of the whole span",
        assumes=f"uniform simple span: W = 2 M g/phi^2 = {number(total / 1e3)} kN, of which the mode has half",
        why="as the steady state",
    )  # fmt: skip
    if one.persons < 1.0:
        note = f"{number(one.persons)} persons on the deck on average: the form is for a group"
        yield _method(now, mode, WEIGHTS.format("1.27"), _weight_source("1.27"), None, **who, note=note)
        return
    crowd = by(resonance.SPREAD_OVER_SIMPLE_SPAN, one.persons * one.weight, total)
    yield _method(
        now, mode, WEIGHTS.format("1.27"), _weight_source("1.27"), crowd, **who,
        stands_for=f"{number(one.persons)} persons, the average number, spread evenly over the deck and all in step",
        assumes="weights per unit area, both spread over a simple span: C = 4/pi, published as 1.3; for groups in "
        "rhythm, not for walkers",
        why="nobody keeps step in the simulation: phases are random and paces differ",
    )  # fmt: skip


def _weight_source(constant: str) -> str:
    if constant == "1.27":
        return "AISC Design Guide 11 (1997), chapter 2, rhythmic groups, with 1.3; from memory"
    return TEXTBOOK


def _square_root(now: Situation, mode: Mode, found: list[Resonance]) -> Method:
    """Matsumoto et al. 1978, with the harmonic and people that give the largest single crossing."""
    one = max(found, key=_crossing)
    source = "Matsumoto, Nishioka, Shiojiri & Matsuzaki 1978, IABSE Proceedings P-17/78; from memory"
    who = {"stream": one.who, "harmonic": one.harmonic}
    if not stationary(now) or one.persons < 1.0:
        note = (
            "the arrivals are given: there is no stream"
            if not stationary(now)
            else f"{number(one.persons)} persons on the deck on average: the rule is for one and more"
        )
        return _method(now, mode, SQUARE_ROOT, source, None, **who, note=note)
    return _method(
        now, mode, SQUARE_ROOT, source, _crossing(one) * multiplier(one.persons), **who,
        stands_for=f"{number(one.persons)} persons on the deck who arrive at random, the average number",
        assumes=f"everybody in the mode's rhythm, phases at random; sqrt({number(one.persons)}) = "
        f"{number(math.sqrt(one.persons))} times one crossing",
        why=f"{percent(one.in_band)} of them are within the half-power band of {mode.name}, not all; and it is a usual "
        f"size, not the 95 % peak in {span(now.window)}",
    )  # fmt: skip


def _stream(now: Situation, mode: Mode) -> Iterator[Method]:
    """The stationary random stream on a narrow band: rms and the 95 % peak in the comfort window."""
    source = "random vibration, textbook; paces weighted by the time on the deck"
    peak_source = f"{source}; peak factor of Vanmarcke 1975, from memory"
    reason = ""
    if not stationary(now):
        reason = "the arrivals are given: nothing is stationary"
    elif any(s.walkers.pace.kind == "fixed" for s in now.streams):
        reason = "a fixed pace has no band: everybody is in resonance, or nobody"
    if reason:
        yield _method(now, mode, NARROW_SD, source, None, measure=RMS, note=reason)
        yield _method(now, mode, NARROW_PEAK, peak_source, None, note=reason)
        return
    density = sum(force_density(now, mode, stream) for stream in now.streams)
    top = abs(now.model.largest(mode, "vertical")[2])
    sd = narrow_band.standard_deviation(density, mode.frequency, mode.damping, mode.modal_mass, top)
    factor = narrow_band.vanmarcke(0.95, mode.frequency, mode.damping, now.window)
    assumes = (
        f"modal force of {number(density)} N2/Hz at {number(mode.frequency, 4)} Hz, flat over the mode's band; a "
        "stream without end, phases at random"
    )
    yield _method(
        now, mode, NARROW_SD, source, sd, measure=RMS,
        stands_for=f"rms over time of mode {mode.name} alone at its antinode, all streams together", assumes=assumes,
        why="other modes; the force of a walker grows and fades; and where few paces lie on the mode's frequency, the "
        "many beside it count for more than the band holds",
    )  # fmt: skip
    yield _method(
        now, mode, NARROW_PEAK, peak_source, factor * sd,
        stands_for=f"95 % value of the peak of mode {mode.name} alone in {span(now.window)}",
        assumes=f"{assumes}; Gaussian, peak factor {number(factor)}",
        why=f"{number(_in_band(now, mode))} persons are in the half-power band at a time: the fewer, the more the "
        "response comes in bursts and the higher its peaks are above the Gaussian ones; other modes add",
    )  # fmt: skip


def _in_band(now: Situation, mode: Mode) -> float:
    """Persons on the deck within the half-power band of a mode, on average."""
    return sum(one.persons * one.in_band for one in resonances(now, mode))


def force_density(now: Situation, mode: Mode, stream: Stream) -> float:
    """One-sided spectral density [N2/Hz] of a stream's modal force at the mode's frequency."""
    offset = stream.walkers.offset
    x, w = offset.nodes
    square = now.model.mean_square(mode, math.fsum(w * x), math.fsum(w * x * x), ("vertical",))
    weight_square = stream.walkers.weight.expectation(2.0)
    total = 0.0
    for k in range(1, stream.load.harmonics + 1):
        pace = np.array([mode.frequency / k])
        factor = float(stream.load.factors(pace)[0, k - 1]) ** 2
        if stream.load.scatter and stream.load.spread is not None:
            factor += float(stream.load.spread(stream.load.held(pace))[0, k - 1]) ** 2
        total += narrow_band.stream_density(
            stream.persons, square, weight_square * factor, density_on_deck(stream, float(pace[0])), k
        )
    return total


def _deflection(now: Situation) -> Iterator[Method]:
    upright = [m for m in now.bare.modes if m.vertical is not None and m.twist is None]
    if not upright:
        return
    mode = min(upright, key=lambda m: m.frequency)
    yield _method(
        now, mode, DEFLECTION, "18/sqrt(mm), common practice", static_deflection.deflection(mode.frequency),
        measure="static deflection", unit="m",
        stands_for=f"what a simple span of {number(mode.frequency, 4)} Hz sags under its own weight: a check of the "
        "frequency against a static calculation",
        assumes="uniform straight member, supports that hardly move; not for continuous beams",
    )  # fmt: skip
