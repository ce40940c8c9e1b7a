"""From a scenario to one design situation: the modes with these people on the deck, and who walks.

Light: loads no kernel, so that hand formulas answer at once.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from crowdsim.bridge.modal import ModalModel, Mode
from crowdsim.bridge.ordinates import HalfWaves, Ordinate, Table
from crowdsim.crowd.arrivals import Arrivals, ConstantNumber, GivenArrivals, PoissonArrivals
from crowdsim.crowd.distributions import Distribution, fixed
from crowdsim.crowd.people import Walkers
from crowdsim.crowd.populations import DEFAULT_POPULATION, GRAVITY, POPULATIONS
from crowdsim.errors import InputError, Problem
from crowdsim.loads import load_set as loads
from crowdsim.loads import sets
from crowdsim.scenario.quantities import FLOORS
from crowdsim.scenario.reader import Scenario
from crowdsim.scenario.schema import CaseTable, Shape, StreamTable

SLOWEST_SHARE = 0.001
FASTEST_SHARE = 0.999
DEFAULT_WINDOW = 240.0  # s, the time of a stream in the simulations behind EUR 23984 (2009), from memory
EDGE = 0.3  # m kept free beside each edge where a mode twists


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
class Situation:
    """The bare deck, the deck with the people's mass where the case adds it, the streams, what is asked.

    added_mass : [kg] by mode; duration, window : observed time, comfort window [s]
    """

    name: str
    people: str
    target: str | None
    limit: float | None
    criterion: str
    duration: float
    window: float
    bare: ModalModel
    model: ModalModel
    streams: tuple[Stream, ...]
    added_mass: dict[str, float]

    @property
    def persons(self) -> float:
        """On the deck on average."""
        return sum(s.persons for s in self.streams)

    @property
    def event(self) -> bool:
        """Whether every arrival is given: the record holds the whole event."""
        return all(isinstance(s.walkers.arrivals, GivenArrivals) for s in self.streams)


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


def situation(scenario: Scenario, table: CaseTable) -> Situation:
    """One case. The people's mass and a pace on a mode's frequency are solved together."""
    file = scenario.file
    bare = modal_model(scenario)
    chosen = [s for s in file.stream if table.streams is None or s.name in table.streams]
    model, added = bare, {m.name: 0.0 for m in bare.modes}
    for _ in range(50):
        streams = tuple(_stream(s, model, scenario.source) for s in chosen)
        if table.people == "none":
            break
        found = {m.name: people_mass(bare, m, streams) for m in bare.modes}
        change = max(abs(found[k] - added[k]) / bare.mode(k).modal_mass for k in found)
        added, model = found, bare.with_mass(found)
        if change < 1e-12:
            break
    timed = all(s.arrival.times for s in chosen)
    return Situation(
        name=table.name, people=table.people, target=table.target, limit=table.limit,
        criterion=file.comfort.criterion, duration=file.run.duration,
        window=_window(file.comfort.window, file.run.duration, timed),
        bare=bare, model=model, streams=streams, added_mass=added,
    )  # fmt: skip


def _window(given: float | None, duration: float, timed: bool) -> float:
    """The comfort window [s]: the whole record where that is shorter and nothing longer was asked for.

    Given arrivals are an event: its windows are not alike, most of a long record's hold nobody, so the record is the
    window unless a shorter one was asked for.
    """
    if timed:
        return min(given or duration, duration)
    return min(DEFAULT_WINDOW, duration) if given is None else given


def _stream(table: StreamTable, model: ModalModel, source: str) -> Stream:
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
    arrivals, persons = _arrivals(table, model, inverse)
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


def _arrivals(table: StreamTable, model: ModalModel, inverse: float) -> tuple[Arrivals, float]:
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
    # at the mean crossing time, from the first arrival to the last departure
    return GivenArrivals(times), len(times) * crossing / (times[-1] - times[0] + crossing)


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


def people_mass(bare: ModalModel, mode: Mode, streams: tuple[Stream, ...]) -> float:
    """What the people of the streams, spread evenly, add to the modal mass of a mode [kg]."""
    total = 0.0
    for s in streams:
        e = s.walkers.offset
        mean = e.expectation(1.0)
        x, w = e.nodes
        total += s.persons * s.mean_mass * bare.mean_square(mode, mean, math.fsum(w * x * x))
    return total


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
