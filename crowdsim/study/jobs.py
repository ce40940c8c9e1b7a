"""One realisation as an independent job: (case, number) -> a row of measures."""

from __future__ import annotations

import threading
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from crowdsim.crowd.people import People, PeopleSource, generator
from crowdsim.dynamics import realisation
from crowdsim.dynamics.realisation import Control, Passages, Response
from crowdsim.study.prepare import Case
from crowdsim.study.situation import Stream

Floats = NDArray[np.float64]
_THREAD = threading.local()
SPAN = 2**18  # samples for which persons are drawn at a time: memory does not grow with the duration


@dataclass(frozen=True)
class Row:
    """Measures of one realisation, as the results file keeps them."""

    number: int
    response: Response
    crossings: int
    person_steps: int


class Walks:
    """The walks of one stream in one realisation, taken piece by piece."""

    def __init__(self, case: Case, stream: Stream, number: int):
        self._source = PeopleSource(stream.walkers, case.bare.length, case.seed, number)
        self._load = stream.load
        name = stream.walkers.name
        self._random = [generator(case.seed, number, name, quantity) for quantity in ("load", "harmonic phase")]
        self._length = case.bare.length
        self._constant: People | None = None
        self._force: tuple[Floats, Floats] | None = None

    def take(self, begin: float, until: float) -> tuple[People, Passages]:
        """The persons who come before `until`, and the walks that begin from `begin` to `until`."""
        people = self._source.take(until)
        factors, phases = self._load.draw(people.pace, *self._random)
        force = people.weight[:, None] * factors
        cosine, sine = force * np.cos(phases), force * np.sin(phases)
        if not people.returns:
            way = np.where(people.direction > 0, self._length - people.place, people.place)
            leave = people.enter + way / people.speed
            who = np.arange(people.count)
            return people, _passages(people, who, people.enter, leave, people.place, cosine, sine)
        if self._constant is None:
            self._constant, self._force = people, (cosine, sine)
        assert self._force is not None
        return people, _returning(self._constant, *self._force, self._length, begin, until)


def _passages(
    people: People, who: Any, enter: Floats, leave: Floats, place: Floats, cosine: Floats, sine: Floats
) -> Passages:
    return Passages(
        enter=enter,
        leave=leave,
        place=place,
        velocity=(people.speed * people.direction)[who],
        offset=people.offset[who],
        pace=people.pace[who],
        turns=people.phase[who] / (2.0 * np.pi) + people.pace[who] * (enter - people.enter[who]),
        cosine=cosine[who],
        sine=sine[who],
    )


def _returning(people: People, cosine: Floats, sine: Floats, length: float, begin: float, until: float) -> Passages:
    """Walks of a constant crowd that begin from `begin` to `until`; the first ones at time 0, mid-way."""
    way = np.where(people.direction > 0, length - people.place, people.place)
    first = way / people.speed
    again = length / people.speed
    low = (
        np.maximum(np.ceil((begin - first) / again), 0.0).astype(np.int64) + 1
        if begin > 0.0
        else 0 * first.astype(np.int64)
    )
    high = np.maximum(np.ceil((until - first) / again), 0.0).astype(np.int64) + 1
    count = np.maximum(high - low, 0)
    who = np.repeat(np.arange(people.count), count)
    turn = np.arange(who.size) - np.repeat(np.cumsum(count) - count, count) + np.repeat(low, count)
    enter = np.where(turn == 0, 0.0, first[who] + (turn - 1) * again[who])
    leave = first[who] + turn * again[who]
    start = np.where(people.direction[who] > 0, 0.0, length)
    return _passages(people, who, enter, leave, np.where(turn == 0, people.place[who], start), cosine, sine)


def draw(case: Case, number: int) -> list[tuple[People, Passages]]:
    """The persons of realisation `number`, stream by stream, and their walks."""
    return [Walks(case, stream, number).take(0.0, case.end) for stream in case.streams]


def joined(parts: list[Passages]) -> Passages:
    """All walks in one table; missing harmonics are nought."""
    if len(parts) == 1:
        return parts[0]
    width = max(p.cosine.shape[1] for p in parts)

    def wide(values: Floats) -> Floats:
        if values.shape[1] == width:
            return values
        out = np.zeros((values.shape[0], width))
        out[:, : values.shape[1]] = values
        return out

    flat = {
        k: np.concatenate([getattr(p, k) for p in parts])
        for k in ("enter", "leave", "place", "velocity", "offset", "pace", "turns")
    }
    return Passages(
        **flat,
        cosine=np.concatenate([wide(p.cosine) for p in parts]),
        sine=np.concatenate([wide(p.sine) for p in parts]),
    )


def _workspace() -> realisation.Workspace:
    """That of this thread."""
    if not hasattr(_THREAD, "workspace"):
        _THREAD.workspace = realisation.Workspace()
    found: realisation.Workspace = _THREAD.workspace
    return found


def _later(passages: Passages, time: float) -> Passages:
    keep = passages.leave > time
    return Passages(**{f.name: getattr(passages, f.name)[keep] for f in fields(Passages)})


def run_realisation(
    case: Case,
    number: int,
    *,
    history: tuple[int, int] | None = None,
    control: Control | None = None,
    block: int = realisation.BLOCK,
) -> Row | None:
    """Realisation `number` of `case`; None where `control` stopped it. Raises NotFiniteError."""
    sample = case.choice.time_step * case.choice.factor
    whole = realisation.Realisation(
        case.deck, case.coefficients, case.recorder, case.choice.time_step,
        history=history, control=control, factor=case.choice.factor, block=block, workspace=_workspace(),
    )  # fmt: skip
    walks = [Walks(case, stream, number) for stream in case.streams]
    here: list[Passages] = []
    begin, crossings, person_time = 0.0, 0, 0.0
    while whole.sample < whole.samples:
        last = whole.sample + SPAN >= whole.samples
        until = case.end + sample if last else (whole.sample + SPAN) * sample
        new = joined([w.take(begin, until)[1] for w in walks])
        passages = joined([*here, new])
        if not whole.advance(passages, whole.sample + SPAN):
            return None
        crossings += int(np.sum((new.leave > case.warm_up) & (new.leave <= case.end + 1e-9)))
        person_time += float(np.sum(np.minimum(new.leave, case.end) - np.minimum(new.enter, case.end)))
        here = [_later(passages, until - sample)]
        begin = until
    return Row(number, whole.response(), crossings, int(person_time * case.choice.per_second))
