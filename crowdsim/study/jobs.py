"""One realisation as an independent job: (case, number) -> a row of measures."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from crowdsim.crowd.people import People, draw_people, generator
from crowdsim.dynamics import realisation
from crowdsim.dynamics.realisation import Control, Passages, Response
from crowdsim.loads.load_set import LoadSet
from crowdsim.study.prepare import Case

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Row:
    """Measures of one realisation, as the results file keeps them."""

    number: int
    response: Response
    crossings: int
    person_steps: int


def passages(people: People, load: LoadSet, random: np.random.Generator, length: float, end: float) -> Passages:
    """The walks of `people` over the deck up to time `end`, and the force of each."""
    factors, phases = load.draw(people.pace, random)
    force = people.weight[:, None] * factors
    way = np.where(people.direction > 0, length - people.place, people.place)
    first = people.enter + way / people.speed
    if not people.returns:
        who = np.arange(people.count)
        enter, leave, place = people.enter, first, people.place
    else:
        again = length / people.speed
        more = np.maximum(np.ceil((end - first) / again), 0.0).astype(np.int64)
        who = np.repeat(np.arange(people.count), 1 + more)
        turn = np.arange(who.size) - np.repeat(np.cumsum(1 + more) - (1 + more), 1 + more)
        begin = first[who] + (turn - 1) * again[who]
        enter = np.where(turn == 0, people.enter[who], begin)
        leave = np.where(turn == 0, first[who], begin + again[who])
        place = np.where(turn == 0, people.place[who], np.where(people.direction[who] > 0, 0.0, length))
    return Passages(
        enter=enter,
        leave=leave,
        place=place,
        velocity=(people.speed * people.direction)[who],
        offset=people.offset[who],
        pace=people.pace[who],
        turns=people.phase[who] / (2.0 * np.pi) + people.pace[who] * (enter - people.enter[who]),
        cosine=(force * np.cos(phases))[who],
        sine=(force * np.sin(phases))[who],
    )


def draw(case: Case, number: int) -> list[tuple[People, Passages]]:
    """The persons of realisation `number`, stream by stream, and their walks."""
    found = []
    for stream in case.streams:
        walkers = stream.walkers
        people = draw_people(walkers, case.bare.length, case.bare.width, case.end, case.seed, number)
        random = generator(case.seed, number, walkers.name, "load")
        found.append((people, passages(people, stream.load, random, case.bare.length, case.end)))
    return found


def joined(parts: list[Passages]) -> Passages:
    """All walks in one table; missing harmonics are nought."""
    width = max(p.cosine.shape[1] for p in parts)

    def wide(values: Floats) -> Floats:
        return np.pad(values, ((0, 0), (0, width - values.shape[1])))

    flat = {
        k: np.concatenate([getattr(p, k) for p in parts])
        for k in ("enter", "leave", "place", "velocity", "offset", "pace", "turns")
    }
    return Passages(
        **flat,
        cosine=np.concatenate([wide(p.cosine) for p in parts]),
        sine=np.concatenate([wide(p.sine) for p in parts]),
    )


def run_realisation(
    case: Case,
    number: int,
    *,
    history: tuple[int, int] | None = None,
    control: Control | None = None,
    block: int = realisation.BLOCK,
) -> Row | None:
    """Realisation `number` of `case`; None where `control` stopped it. Raises NotFiniteError."""
    walks = joined([p for _, p in draw(case, number)])
    response = realisation.run(
        walks, case.deck, case.coefficients, case.recorder, case.choice.time_step,
        history=history, control=control, factor=case.choice.factor, block=block,
    )  # fmt: skip
    if response is None:
        return None
    begin, end = case.warm_up, case.end
    crossings = int(np.sum((walks.leave > begin) & (walks.leave <= end + 1e-9)))
    on_deck = np.minimum(walks.leave, end) - np.minimum(walks.enter, end)
    return Row(number, response, crossings, int(on_deck.sum() * case.choice.per_second))
