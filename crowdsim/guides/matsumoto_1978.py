"""How much more a stream of walkers shakes a deck than one of them, by Matsumoto et al. (1978)."""

from __future__ import annotations

import math


def multiplier(persons: float) -> float:
    """sqrt(lambda T0) = sqrt(n), by which the response to one walker is multiplied.

    persons : mean number on the deck, n, equal to arrivals per second lambda x crossing time T0

    Walkers who arrive at random, none in step with another, at a density that leaves each a free pace. Exact for root
    mean squares over the crossing time, if all are like the one; applied to the peak of one walker in resonance it
    takes all to walk at the mode's pace and says nothing of how rare the peak is. Matsumoto, Nishioka, Shiojiri &
    Matsuzaki, Dynamic design of footbridges, IABSE Proceedings P-17/78, 1978; from memory.

    >>> multiplier(25.0)
    5.0
    """
    if not 0.0 <= persons < math.inf:
        raise ValueError(f"persons must not be below 0, not {persons:g}")
    return math.sqrt(persons)
