"""The persons of one realisation: the only random stage."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from functools import cache, partial

import numpy as np
from numpy.typing import NDArray

from crowdsim.crowd.arrivals import Arrivals, ConstantNumber, GivenArrivals, PoissonArrivals, PoissonTimes
from crowdsim.crowd.distributions import Distribution, Draws

Floats = NDArray[np.float64]

QUANTITIES = {
    "arrival": 1, "direction": 2, "pace": 3, "length": 4, "weight": 5, "offset": 6, "phase": 7, "place": 8, "load": 9,
    "harmonic phase": 10,
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


@cache
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


class PeopleSource:
    """The persons of one stream in one realisation, in the order of their arrival.

    Two `take`s give the persons that one gives: memory does not grow with the time simulated.
    """

    def __init__(self, walkers: Walkers, length: float, seed: int, realisation: int):
        def random(quantity: str) -> np.random.Generator:
            return generator(seed, realisation, walkers.name, quantity)

        self.walkers, self._length = walkers, length
        self._random = random
        self._direction = random("direction") if walkers.forward_share < 1.0 else None
        second = walkers.speed if walkers.speed is not None else walkers.step_length
        phase = walkers.phase or Distribution("uniform", minimum=0.0, maximum=2.0 * np.pi)
        assert second is not None
        named = {"pace": walkers.pace, "length": second, "weight": walkers.weight, "offset": walkers.offset,
                 "phase": phase}  # fmt: skip
        self._draws = {name: Draws(of, partial(random, name)) for name, of in named.items()}
        self._poisson = (
            PoissonTimes(walkers.arrivals.rate, random("arrival"))
            if isinstance(walkers.arrivals, PoissonArrivals)
            else None
        )
        self._until = -np.inf

    def _arrivals(self, until: float) -> tuple[Floats, Floats, Floats]:
        """Time, place and direction of those who come before `until`."""
        walkers = self.walkers
        if isinstance(walkers.arrivals, ConstantNumber):
            count = walkers.arrivals.count if self._until < 0.0 else 0
            forward = np.arange(count) < round(walkers.forward_share * count)
            place = self._random("place").uniform(0.0, self._length, count)
            return np.zeros(count), place, np.where(forward, 1.0, -1.0)
        if self._poisson is not None:
            enter = self._poisson.take(until)
        else:
            assert isinstance(walkers.arrivals, GivenArrivals)
            times = np.array(walkers.arrivals.times, dtype=np.float64)
            enter = times[(times >= self._until) & (times < until)]
        if self._direction is None:
            forward = np.ones(enter.size, dtype=bool)
        else:
            forward = self._direction.uniform(size=enter.size) < walkers.forward_share
        return enter, np.where(forward, 0.0, self._length), np.where(forward, 1.0, -1.0)

    def take(self, until: float) -> People:
        """The persons who come from where the last `take` ended to `until` [s]."""
        enter, place, direction = self._arrivals(until)
        self._until = until
        drawn = {name: draws.take(enter.size) for name, draws in self._draws.items()}
        speed = drawn["length"] if self.walkers.speed is not None else drawn["pace"] * drawn["length"]
        return People(
            enter=enter,
            place=place,
            direction=direction,
            pace=drawn["pace"],
            speed=speed,
            weight=drawn["weight"],
            offset=drawn["offset"],
            phase=drawn["phase"],
            returns=isinstance(self.walkers.arrivals, ConstantNumber),
        )


def draw_people(walkers: Walkers, length: float, end: float, seed: int, realisation: int) -> People:
    """The persons of `walkers` on a deck of `length` [m] from time 0 to `end` [s]."""
    return PeopleSource(walkers, length, seed, realisation).take(end)
