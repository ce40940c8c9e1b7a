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

    def draw(self, generator: np.random.Generator, end: float) -> Floats:
        """Times in [0, end). A longer `end` only adds to them."""
        if self.rate <= 0.0:
            return np.zeros(0)
        mean = self.rate * end
        gaps: list[Floats] = []
        total = 0.0
        size = int(mean + 6.0 * mean**0.5) + 16
        while total < end:
            gap = generator.exponential(1.0 / self.rate, size)
            gaps.append(gap)
            total += float(np.sum(gap))
            size = 64
        times = np.cumsum(np.concatenate(gaps))
        return times[times < end]


@dataclass(frozen=True)
class GivenArrivals:
    """The given times [s] from time 0, in order."""

    times: tuple[float, ...]

    def draw(self, generator: np.random.Generator, end: float) -> Floats:
        """The times before `end`."""
        times = np.array(self.times, dtype=np.float64)
        return times[times < end]


@dataclass(frozen=True)
class ConstantNumber:
    """Exactly `count` persons on the deck at all times; whoever leaves re-enters at the other end."""

    count: int


Arrivals = PoissonArrivals | GivenArrivals | ConstantNumber
