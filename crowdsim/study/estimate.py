"""Hand formulas for a scenario: what each stands for, assumes and gives. No simulation, no kernel."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from crowdsim.bridge.modal import Mode
from crowdsim.crowd.populations import GRAVITY
from crowdsim.errors import InputError, Problem
from crowdsim.guides import narrow_band, random_stream, resonance, static_deflection
from crowdsim.guides.matsumoto_1978 import multiplier
from crowdsim.results.texts import number, percent, span
from crowdsim.scenario.reader import Scenario
from crowdsim.study.resonances import (
    Resonance,
    densities_on_deck,
    density_on_deck,
    reach,
    resonances,
    simple_span,
    stationary,
)
from crowdsim.study.screening import Screened, screen
from crowdsim.study.situation import Situation, Stream, cases, situation

Floats = NDArray[np.float64]
TEXTBOOK = "textbook; derived and tested here"
STEADY, CROSSING = "steady state in resonance", "one crossing in resonance, force moving"
FIXED = "one crossing in resonance, force in one place"
WEIGHTS = "resonance by weights, C = {}"
SQUARE_ROOT = "one crossing x square root of the number"
STREAM_SD, STREAM_PEAK = "random stream, all paces, rms", "random stream, all paces, peak"
NARROW_SD, NARROW_PEAK = "random stream, narrow band, rms", "random stream, narrow band, peak"
DEFLECTION = "deflection under own weight"
FEW_IN_BAND = 0.3  # persons in the half-power band below which a Gaussian peak means nothing
PEAK, RMS = "peak acceleration", "rms acceleration"


@dataclass(frozen=True)
class Method:
    """One formula applied to one mode of one case.

    value : None where the formula gives no number; `note` then says why
    stands_for, assumes : what the number is; why : how it differs from a simulation of the case
    window : of the peaks that it is compared with [s]
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
    window: float


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


def estimate(
    scenario: Scenario, case: str | None = None, *, share: float = 0.95, windows: Mapping[str, float] | None = None
) -> Estimates:
    """The hand formulas of every case, or of the one called `case`. Raises InputError for a case that is none.

    share : percentile of the peak that formulas with one are asked for; windows : time of that peak by case [s], in
    place of the comfort window
    """
    tables = [t for t in cases(scenario) if case is None or t.name == case]
    if not tables:
        names = ", ".join(t.name for t in cases(scenario))
        raise InputError(scenario.source, [Problem("case", f"no case is called {case!r}", f"cases here: {names}")])
    all_of_them = tuple(situation(scenario, table) for table in tables)
    if windows is not None:
        all_of_them = tuple(replace(now, window=windows.get(now.name, now.window)) for now in all_of_them)
    return Estimates(
        title=scenario.title,
        screening=tuple(screen(all_of_them)),
        methods=tuple(m for now in all_of_them for m in _case(now, share)),
        situations=all_of_them,
    )


def _case(now: Situation, share: float) -> Iterator[Method]:
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
        yield from _stream(now, mode, share)
    yield from _deflection(now)


def _method(now: Situation, mode: Mode, name: str, source: str, value: float | None, **other: Any) -> Method:
    given: dict[str, Any] = {
        "direction": "vertical", "measure": PEAK, "unit": "m/s2", "stream": "", "harmonic": None, "stands_for": "",
        "assumes": "", "why": "", "note": "", "window": now.window,
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
        f"{number(_in_band(now, mode))} at a time have a pace within the half-power band of {mode.name}, and it "
        f"takes the largest peak of {span(now.window)}"
    )
    yield _method(
        now, mode, STEADY, TEXTBOOK, steady, **who,
        stands_for=f"one person stepping on the line e = {number(one.line)} m where the mode moves it most, until the "
        "motion grows no more, read where the mode moves most",
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
    modal = mode.modal_mass * GRAVITY / (one.path * one.top)

    def by(constant: float, walkers: float, structure: float) -> float:
        return GRAVITY * resonance.weight_form(constant, one.load_factor, walkers, mode.damping, structure)

    yield _method(
        now, mode, WEIGHTS.format("1"), TEXTBOOK, by(resonance.MODAL_WEIGHT, one.weight, modal), **who,
        stands_for="the steady state in weights",
        assumes=f"W is the mode's weight M g over the ordinates of force and reading, {number(modal / 1e3)} kN; one "
        f"person of {number(one.weight)} N",
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


def _stream(now: Situation, mode: Mode, share: float) -> Iterator[Method]:
    """The stationary random stream: every pace with its own response, and the narrow band; rms and peak."""
    source = "random vibration, textbook; paces weighted by the time on the deck"
    peak_source = f"{source}; peak factor of Vanmarcke 1975, from memory"
    kinds = ((STREAM_SD, STREAM_PEAK), (NARROW_SD, NARROW_PEAK))
    reason = ""
    if not stationary(now):
        reason = "the arrivals are given: nothing is stationary"
    elif any(s.walkers.pace.kind == "fixed" for s in now.streams):
        reason = "with a fixed pace a crossing, not the pace, says how much of the resonance is reached"
    if reason:
        for rms_name, peak_name in kinds:
            yield _method(now, mode, rms_name, source, None, measure=RMS, note=reason)
            yield _method(now, mode, peak_name, peak_source, None, note=reason)
        return
    top = abs(now.model.largest(mode, "vertical")[2])
    density = sum(force_density(now, mode, stream) for stream in now.streams)
    narrow = narrow_band.standard_deviation(density, mode.frequency, mode.damping, mode.modal_mass, top)
    whole = top * math.sqrt(sum(_variance(now, mode, stream) for stream in now.streams))
    assumed = (
        "each pace with its own response to its harmonics",
        f"modal force of {number(density)} N2/Hz at {number(mode.frequency, 4)} Hz, flat over the mode's band",
    )
    differs = (
        "other modes, and the force of a walker, which grows and fades: up to some 7 % low for a mode just beyond the "
        "end of the paces",
        "as the line above, and where the density of paces is not flat near the mode's frequency it can be far off",
    )
    for (rms_name, peak_name), sd, assumes, why in zip(kinds, (whole, narrow), assumed, differs, strict=True):
        assumes += "; a stream without end, phases at random"
        yield _method(
            now, mode, rms_name, source, sd or None, measure=RMS,
            stands_for=f"rms over time of mode {mode.name} alone at its antinode, all streams together",
            assumes=assumes, why=why, note="" if sd else "nobody walks at exactly this pace",
        )  # fmt: skip
        yield _peak(now, mode, peak_name, peak_source, sd, share, assumes)


def _peak(now: Situation, mode: Mode, name: str, source: str, sd: float, share: float, assumes: str) -> Method:
    """The percentile of the peak of a stationary Gaussian response, where that means anything."""
    near = _in_band(now, mode)
    if near < FEW_IN_BAND or not sd:
        note = (
            "nobody walks at exactly this pace"
            if near >= FEW_IN_BAND
            else (
                f"{number(near)} persons are in the half-power band of {mode.name} at a time: the response comes in "
                f"bursts, and a Gaussian peak (below {FEW_IN_BAND:g} persons) would be far too low"
            )
        )
        return _method(now, mode, name, source, None, note=note)
    factor = narrow_band.vanmarcke(share, mode.frequency, mode.damping, now.window)
    return _method(
        now, mode, name, source, factor * sd,
        stands_for=f"{100 * share:g} % value of the peak of mode {mode.name} alone in {span(now.window)}",
        assumes=f"{assumes}; Gaussian, peak factor {number(factor)}",
        why=f"{number(near)} persons are in the half-power band at a time: the fewer, the more the response comes in "
        "bursts and the higher its peaks are above the Gaussian ones; other modes add",
    )  # fmt: skip


def _variance(now: Situation, mode: Mode, stream: Stream) -> float:
    """Of the modal acceleration under one stream [m2/s4], every pace with its own response."""
    pace = stream.walkers.pace
    low, high = (float(pace.quantile(p)) for p in (1e-9, 1.0 - 1e-9))
    total = 0.0
    for k in range(1, stream.load.harmonics + 1):
        x = random_stream.paces(low, high, k, mode.frequency, mode.damping)
        total += random_stream.variance(
            stream.persons, _mean_square(now, mode, stream), x, densities_on_deck(stream, x),
            _force_square(stream, x, k), k, mode.frequency, mode.damping, mode.modal_mass,
        )  # fmt: skip
    return total


def _mean_square(now: Situation, mode: Mode, stream: Stream) -> float:
    """Of the vertical ordinates where the stream walks."""
    x, w = stream.walkers.offset.nodes
    return now.model.mean_square(mode, math.fsum(w * x), math.fsum(w * x * x), ("vertical",))


def _force_square(stream: Stream, pace: Floats, harmonic: int) -> Floats:
    """E[F^2] [N2] of a harmonic at each pace, over weights and scattered factors."""
    factors = stream.load.factors(pace)[:, harmonic - 1] ** 2
    if stream.load.scatter and stream.load.spread is not None:
        factors = factors + stream.load.spread(stream.load.held(pace))[:, harmonic - 1] ** 2
    return np.asarray(stream.walkers.weight.expectation(2.0) * factors)


def _in_band(now: Situation, mode: Mode) -> float:
    """Persons on the deck within the half-power band of a mode, on average."""
    return sum(one.persons * one.in_band for one in resonances(now, mode))


def force_density(now: Situation, mode: Mode, stream: Stream) -> float:
    """One-sided spectral density [N2/Hz] of a stream's modal force at the mode's frequency."""
    square, total = _mean_square(now, mode, stream), 0.0
    for k in range(1, stream.load.harmonics + 1):
        pace = np.array([mode.frequency / k])
        force_square = float(_force_square(stream, pace, k)[0])
        total += narrow_band.stream_density(
            stream.persons, square, force_square, density_on_deck(stream, float(pace[0])), k
        )
    return total


def _deflection(now: Situation) -> Iterator[Method]:
    upright = [m for m in now.bare.modes if m.vertical is not None and m.twist is None]
    if not upright:
        return
    mode = min(upright, key=lambda m: m.frequency)
    source = "18/sqrt(mm), common practice"
    if not simple_span(mode, now.bare.length) or len(mode.directions) > 1:
        note = "the rule is for the first vertical mode of a single span"
        yield _method(now, mode, DEFLECTION, source, None, measure="static deflection", unit="m", note=note)
        return
    yield _method(
        now, mode, DEFLECTION, source, static_deflection.deflection(mode.frequency),
        measure="static deflection", unit="m",
        stands_for=f"what a simple span of {number(mode.frequency, 4)} Hz sags under its own weight: a check of the "
        "frequency against a static calculation",
        assumes="uniform straight member, supports that hardly move; not for continuous beams",
    )  # fmt: skip
