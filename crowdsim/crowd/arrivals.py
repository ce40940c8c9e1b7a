"""When persons step on: Poisson streams, given times, a constant number on the deck."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class PoissonArrivals:
    """Independent arrivals at `rate` [1/s], from time 0, both directions together."""

    rate: float


@dataclass(frozen=True)
class GivenArrivals:
    """The given times [s] from time 0, in order."""

    times: tuple[float, ...]


@dataclass(frozen=True)
class ConstantNumber:
    """Exactly `count` persons on the deck at all times; whoever leaves re-enters at the other end."""

    count: int


Arrivals = PoissonArrivals | GivenArrivals | ConstantNumber


class PoissonTimes:
    """Arrival times one after the other: two `take`s give what one gives."""

    def __init__(self, rate: float, generator: np.random.Generator):
        self._rate, self._generator = rate, generator
        self._left = np.zeros(0)
        self._last = 0.0

    def take(self, until: float) -> Floats:
        """The next times, all below `until`."""
        kept = [self._left]
        while self._last < until:
            size = int(self._rate * (until - self._last) * 1.05) + 16
            # summed in order from the time before, so that the pieces do not matter
            gaps = self._generator.exponential(1.0 / self._rate, size)
            gaps[0] += self._last
            kept.append(np.cumsum(gaps))
            self._last = float(kept[-1][-1])
        times = np.concatenate(kept)
        count = int(np.searchsorted(times, until, side="left"))
        self._left = times[count:]
        return times[:count]
