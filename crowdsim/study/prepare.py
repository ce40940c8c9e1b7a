"""From a scenario to what one case needs: modes as simulated, streams, step, recorder."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from crowdsim.bridge.modal import ModalModel, Mode, Point
from crowdsim.bridge.ordinates import HalfWaves, Ordinate, Table
from crowdsim.crowd.arrivals import Arrivals, ConstantNumber, GivenArrivals, PoissonArrivals
from crowdsim.crowd.distributions import Distribution, fixed
from crowdsim.crowd.people import Walkers
from crowdsim.crowd.populations import DEFAULT_POPULATION, GRAVITY, POPULATIONS
from crowdsim.dynamics import newmark, step
from crowdsim.dynamics.realisation import CELLS, Deck, Recorder, deck_table, table_cells
from crowdsim.errors import InputError, Problem
from crowdsim.loads import load_set as loads
from crowdsim.loads import sets
from crowdsim.scenario.quantities import FLOORS
from crowdsim.scenario.reader import Scenario
from crowdsim.scenario.schema import CaseTable, Shape, StreamTable

Floats = NDArray[np.float64]
STATIONS = 96
SLOWEST_SHARE = 0.001
FASTEST_SHARE = 0.999
EDGE = 0.3  # m kept free beside each edge where a mode twists
FINE_FOR_JUMPS = 400  # where a person's force begins with a step
FINEST = 500  # steps in a second, when a short deck with many half waves asks for more


@dataclass(frozen=True)
class Stream:
    """A stream as simulated: who walks and what the feet do; `sources`: where defaults came from."""

    walkers: Walkers
    load: loads.LoadSet
    sources: tuple[str, ...]
    outside: float  # share of persons whose pace is outside the load set's range
    inverse_speed: float  # s/m
    persons: float  # on the deck on average
    mean_mass: float  # kg


@dataclass(frozen=True)
class Case:
    """Everything that the realisations of one case have in common."""

    name: str
    people: str
    target: str | None
    limit: float | None
    bare: ModalModel
    model: ModalModel
    driven: tuple[Mode, ...]
    streams: tuple[Stream, ...]
    added_mass: dict[str, float]
    choice: step.StepChoice
    points: tuple[Point, ...]
    stations: tuple[Point, ...]
    deck_s: Floats
    deck: Deck
    coefficients: Floats
    recorder: Recorder
    duration: float
    warm_up: float
    warm_up_needed: float
    window: float
    seed: int

    @property
    def persons(self) -> float:
        """On the deck on average."""
        return sum(s.persons for s in self.streams)

    @property
    def end(self) -> float:
        """Time of the last step [s]."""
        return (self.recorder.total - 1) * self.choice.time_step


def modal_model(scenario: Scenario) -> ModalModel:
    """The bare deck of a scenario."""
    file = scenario.file
    length = file.deck.length

    def ordinate(shape: Shape | None) -> Ordinate | None:
        if shape is None:
            return None
        if shape.half_waves is not None:
            return HalfWaves(shape.half_waves, length, shape.amplitude)
        assert shape.s is not None
        assert shape.value is not None
        return Table(tuple(shape.s), tuple(shape.value), shape.interpolation)

    return ModalModel(
        length,
        file.deck.width,
        tuple(
            Mode(m.name, m.frequency, m.damping, m.modal_mass, ordinate(m.vertical), ordinate(m.lateral),
                 ordinate(m.longitudinal), ordinate(m.twist))
            for m in file.mode
        ),
    )  # fmt: skip


def cases(scenario: Scenario) -> list[CaseTable]:
    """The cases of a scenario; without any, one with all streams."""
    return list(scenario.file.case) or [CaseTable(name="all streams")]  # type: ignore[call-arg]


def prepare(scenario: Scenario, table: CaseTable, seed: int | None = None) -> Case:
    """Brings one case to numbers. The people's mass and a pace on a mode's frequency are solved together."""
    file = scenario.file
    bare = modal_model(scenario)
    chosen = [s for s in file.stream if table.streams is None or s.name in table.streams]
    timed = all(s.arrival.times for s in chosen)
    model, added = bare, {m.name: 0.0 for m in bare.modes}
    for _ in range(50):
        streams = tuple(_stream(s, model, file.run.duration, scenario.source) for s in chosen)
        if table.people == "none":
            break
        found = {m.name: _people_mass(bare, m, streams) for m in bare.modes}
        change = max(abs(found[k] - added[k]) / bare.mode(k).modal_mass for k in found)
        added, model = found, bare.with_mass(found)
        if change < 1e-12:
            break
    driven = tuple(m for m in model.modes if m.driven) or model.modes[:1]
    choice, deck = _step(scenario, bare, driven, streams)
    needed = _warm_up(bare, driven, streams)
    given = file.run.warm_up
    warm_up = given if given is not None else 0.0 if timed else needed
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
        segment=max(round(file.comfort.window * n), 1),
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
        name=table.name, people=table.people, target=table.target, limit=table.limit, bare=bare, model=model,
        driven=driven, streams=streams, added_mass=added, choice=choice, points=points, stations=stations,
        deck_s=deck_s, deck=deck, coefficients=coefficients, recorder=recorder,
        duration=observed / n, warm_up=warm / n, warm_up_needed=needed,
        window=file.comfort.window, seed=file.run.seed if seed is None else seed,
    )  # fmt: skip


def _stream(table: StreamTable, model: ModalModel, duration: float, source: str) -> Stream:
    population = POPULATIONS[table.population or DEFAULT_POPULATION[table.gait]]
    sources: list[str] = []

    def take(name: str, default: Distribution | None) -> Distribution | None:
        given = getattr(table, name)
        if given is None:
            return default
        mean = None
        if getattr(given, "mean_at", None) is not None:
            mean = model.mode(given.mean_at).frequency / given.harmonic
            times = "" if given.harmonic == 1 else f" / {given.harmonic}"
            sources.append(f"pace: mean on the frequency of mode {given.mean_at}{times}, {mean:.4g} Hz")
        try:
            built: Distribution = given.build(*FLOORS[name], mean)
        except ValueError as error:
            raise InputError(
                source, [Problem(f"stream {table.name!r}.{name}", str(error), "other bounds, or another mean")]
            ) from None
        return built

    pace = take("pace", population.pace)
    weight = take("weight", population.weight)
    length = take("step_length", None if table.speed is not None else population.step_length)
    speed = take("speed", None if table.step_length is not None else population.speed)
    assert pace is not None
    assert weight is not None
    name = table.population or DEFAULT_POPULATION[table.gait]
    how = "as asked" if table.population else "by default"
    given = {"pace": table.pace, "stride": table.step_length or table.speed, "weight": table.weight}
    for quantity, value in given.items():
        if value is None:
            what = ("speed" if speed is not None else "step length") if quantity == "stride" else quantity
            sources.append(f"{what}: population {name} {how} ({population.sources[quantity]})")
    walkers = Walkers(
        name=table.name,
        arrivals=GivenArrivals(()),
        pace=pace,
        step_length=length,
        speed=speed,
        weight=weight,
        offset=_offset(table, model),
        phase=None if table.phase is None else table.phase.build(-math.inf, math.inf),
        forward_share=table.forward_share,
    )
    inverse = walkers.inverse_speed()
    arrivals, persons = _arrivals(table, model, inverse, duration)
    load = _load(table, sources)
    return Stream(
        walkers=replace(walkers, arrivals=arrivals),
        load=load,
        sources=tuple(sources),
        outside=1.0 - pace.share_within(*load.pace_range),
        inverse_speed=inverse,
        persons=persons,
        mean_mass=weight.expectation() / GRAVITY,
    )


def _offset(table: StreamTable, model: ModalModel) -> Distribution:
    half = 0.5 * model.width
    if table.offset is not None:
        if table.offset.distribution == "fixed":
            return table.offset.build(-half, half)
        built = table.offset.build(-half, half)
        return replace(built, minimum=max(built.minimum, -half), maximum=min(built.maximum, half))
    if not model.twists or half <= EDGE:
        return fixed(0.0)
    return Distribution("uniform", minimum=-(half - EDGE), maximum=half - EDGE)


def _arrivals(table: StreamTable, model: ModalModel, inverse: float, duration: float) -> tuple[Arrivals, float]:
    a = table.arrival
    crossing = model.length * inverse
    if a.per_hour is not None:
        return PoissonArrivals(a.per_hour / 3600.0), a.per_hour / 3600.0 * crossing
    if a.density is not None:
        persons = a.density * model.length * model.width
        return PoissonArrivals(persons / crossing), persons
    if a.constant is not None:
        return ConstantNumber(a.constant), float(a.constant)
    assert a.times is not None
    times = tuple(sorted(a.times))
    # at the mean crossing time, over the observed time or up to the last who leaves
    return GivenArrivals(times), len(times) * crossing / max(duration, times[-1] + crossing)


def _load(table: StreamTable, sources: list[str]) -> loads.LoadSet:
    given = table.load
    if given is None:
        name = sets.DEFAULT_LOAD[table.gait]
        chosen = sets.load_set(table.gait, name)
        sources.append(f"load: {name} by default ({chosen.source})")
        return chosen
    if given.harmonics is not None:
        phases = None if given.phases is None else tuple(given.phases)
        return loads.given(tuple(given.harmonics), phases, table.gait)
    assert given.set is not None
    chosen = sets.load_set(table.gait, given.set, scatter=given.scatter, contact_ratio=given.contact_ratio)
    sources.append(f"load: {chosen.name} ({chosen.source}){', factors scattered' if chosen.scatter else ''}")
    return chosen


def _people_mass(bare: ModalModel, mode: Mode, streams: tuple[Stream, ...]) -> float:
    total = 0.0
    for s in streams:
        e = s.walkers.offset
        mean = e.expectation(1.0)
        x, w = e.nodes
        total += s.persons * s.mean_mass * bare.mean_square(mode, mean, math.fsum(w * x * x))
    return total


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


def resonates(driven: tuple[Mode, ...], streams: tuple[Stream, ...]) -> bool:
    """Whether a harmonic of any stream comes near the frequency of any mode."""
    for stream in streams:
        low = float(stream.walkers.pace.quantile(SLOWEST_SHARE))
        high = float(stream.walkers.pace.quantile(FASTEST_SHARE))
        for k, factor in enumerate(stream.load.factors(np.array([0.5 * (low + high)]))[0], start=1):
            for mode in driven:
                band = max(3.0 * mode.damping, 0.03) * mode.frequency
                if factor > 0.0 and k * low - band <= mode.frequency <= k * high + band:
                    return True
    return False


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
