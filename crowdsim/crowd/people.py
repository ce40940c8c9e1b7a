"""The persons of one realisation: the only random stage."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from crowdsim.crowd.arrivals import Arrivals, ConstantNumber
from crowdsim.crowd.distributions import Distribution

Floats = NDArray[np.float64]

QUANTITIES = {
    "arrival": 1, "direction": 2, "pace": 3, "length": 4, "weight": 5, "offset": 6, "phase": 7, "place": 8, "load": 9,
}  # fmt: skip


@dataclass(frozen=True)
class Walkers:
    """A stream of people, all alike in distribution.

    pace [Hz]; step_length [m], or speed [m/s] where step length follows; weight [N]; offset e [m]
    phase [rad], None: uniform over a turn; forward_share: share that walks towards growing s
    """

    name: str
    arrivals: Arrivals
    pace: Distribution
    step_length: Distribution | None
    speed: Distribution | None
    weight: Distribution
    offset: Distribution
    phase: Distribution | None = None
    forward_share: float = 1.0

    def inverse_speed(self) -> float:
        """E[1/speed] [s/m] over the truncated distributions, by quadrature."""
        if self.speed is not None:
            return self.speed.expectation(-1.0)
        assert self.step_length is not None
        return self.pace.expectation(-1.0) * self.step_length.expectation(-1.0)

    def speed_quantile(self, share: float) -> float:
        """Speed [m/s] below which `share` of those who step on walk."""
        if self.speed is not None:
            return float(self.speed.quantile(share))
        assert self.step_length is not None
        p, u = self.pace.nodes
        q, v = self.step_length.nodes
        speed = np.multiply.outer(p, q).ravel()
        order = np.argsort(speed, kind="stable")
        weight = np.cumsum(np.multiply.outer(u, v).ravel()[order])
        return float(speed[order[min(int(np.searchsorted(weight, share)), order.size - 1)]])


@dataclass(frozen=True)
class People:
    """The persons of one stream in one realisation, one a row.

    enter [s]: when the person steps on, or 0 for those already there; place [m]: s at `enter`;
    direction: +1 towards growing s, -1 back; pace [Hz]; speed [m/s]; step_length [m]; weight [N];
    offset [m]; phase [rad] at `enter`; returns: whoever leaves re-enters at the other end
    """

    enter: Floats
    place: Floats
    direction: Floats
    pace: Floats
    speed: Floats
    weight: Floats
    offset: Floats
    phase: Floats
    returns: bool

    @property
    def count(self) -> int:
        """Number of persons."""
        return self.enter.size

    @property
    def step_length(self) -> Floats:
        """[m]"""
        return self.speed / self.pace


def stream_id(name: str) -> int:
    """A fixed number for the stream's name."""
    return int.from_bytes(hashlib.sha256(name.encode()).digest()[:4], "big")


def generator(seed: int, realisation: int, stream: str, quantity: str) -> np.random.Generator:
    """Random numbers of one quantity of one stream in one realisation, independent of all others.

    Keyed by fixed numbers, so that changing a distribution, adding a stream or running one
    realisation alone leaves the other draws as they are.
    """
    key = (realisation, stream_id(stream), QUANTITIES[quantity])
    return np.random.Generator(np.random.PCG64(np.random.SeedSequence(seed, spawn_key=key)))


def draw_people(walkers: Walkers, length: float, width: float, end: float, seed: int, realisation: int) -> People:
    """The persons of `walkers` on a deck of `length` and `width` [m] from time 0 to `end` [s]."""

    def random(quantity: str) -> np.random.Generator:
        return generator(seed, realisation, walkers.name, quantity)

    arrivals = walkers.arrivals
    if isinstance(arrivals, ConstantNumber):
        count = arrivals.count
        enter = np.zeros(count)
        forward = np.arange(count) < round(walkers.forward_share * count)
        place = random("place").uniform(0.0, length, count)
    else:
        enter = arrivals.draw(random("arrival"), end)
        count = enter.size
        if walkers.forward_share >= 1.0:
            forward = np.ones(count, dtype=bool)
        else:
            forward = random("direction").uniform(size=count) < walkers.forward_share
        place = np.where(forward, 0.0, length)
    pace = walkers.pace.draw(random("pace"), count)
    if walkers.speed is not None:
        speed = walkers.speed.draw(random("length"), count)
    else:
        assert walkers.step_length is not None
        speed = pace * walkers.step_length.draw(random("length"), count)
    if walkers.phase is None:
        phase = random("phase").uniform(0.0, 2.0 * np.pi, count)
    else:
        phase = walkers.phase.draw(random("phase"), count)
    return People(
        enter=enter,
        place=place,
        direction=np.where(forward, 1.0, -1.0),
        pace=pace,
        speed=speed,
        weight=walkers.weight.draw(random("weight"), count),
        offset=walkers.offset.draw(random("offset"), count),
        phase=phase,
        returns=isinstance(arrivals, ConstantNumber),
    )
