"""Order statistics and moments of a measure over realisations."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
LEAST_FOR_INTERVAL = 72  # of the 95 % value at 95 % confidence


def percentile_rank(count: int, share: float) -> int:
    """k of the value x_(k) that stands for the percentile: ceil(share n)."""
    return max(1, math.ceil(share * count - 1e-9))


def least_for_interval(share: float, confidence: float = 0.95) -> int:
    """Least number of independent values with an equal-tailed interval of a percentile.

    The largest value must exceed a high percentile, the smallest stay below a low one, each but for
    (1 - confidence)/2 of the time.

    >>> least_for_interval(0.95), least_for_interval(0.5)
    (72, 6)
    """
    return math.ceil(math.log(0.5 * (1.0 - confidence)) / math.log(max(share, 1.0 - share)) - 1e-9)


def interval_ranks(count: int, share: float, confidence: float = 0.95) -> tuple[int, int] | None:
    """Ranks (r, s) of the distribution-free, equal-tailed interval [x_(r), x_(s)] of a percentile.

    P(x_(r) > quantile) and P(x_(s) < quantile) are each at most (1 - confidence)/2, by the
    binomial distribution of the number below the quantile (textbook, e.g. David & Nagaraja 2003,
    section 7.1, from memory). None where the sample is too small.

    >>> interval_ranks(100, 0.95), interval_ranks(71, 0.95)
    ((90, 100), None)
    """
    from scipy.special import bdtr  # here, for it is slow to load and not needed before a run

    tail = 0.5 * (1.0 - confidence)
    below = bdtr(np.arange(count, dtype=np.float64), count, share)  # P(B <= k), k = 0 .. n-1
    low = int(np.searchsorted(below, tail, side="right"))  # largest r with P(B <= r - 1) <= tail
    high = int(np.searchsorted(below, 1.0 - tail, side="left")) + 1  # least s with P(B >= s) <= tail
    if low < 1 or high > count:
        return None
    return low, high


@dataclass(frozen=True)
class Percentile:
    """A percentile and its interval; `low` and `high` are None where the sample is too small.

    effective : number of independent values that the interval rests on
    """

    share: float
    value: float
    low: float | None
    high: float | None
    effective: float


@dataclass(frozen=True)
class Distribution1D:
    """A measure over the realisations; `sd` is None for a single one."""

    count: int
    mean: float
    sd: float | None
    median: float
    p95: Percentile
    largest: float


def percentile(values: Floats, share: float = 0.95, confidence: float = 0.95) -> Percentile:
    """x_(ceil(share n)) and its distribution-free interval."""
    ordered = np.sort(np.asarray(values, dtype=np.float64))
    count = ordered.size
    ranks = interval_ranks(count, share, confidence)
    value = float(ordered[percentile_rank(count, share) - 1])
    if ranks is None:
        return Percentile(share, value, None, None, float(count))
    return Percentile(share, value, float(ordered[ranks[0] - 1]), float(ordered[ranks[1] - 1]), float(count))


def describe(values: Floats) -> Distribution1D:
    """Mean, standard deviation (n - 1), median, 95 % value and the largest."""
    values = np.asarray(values, dtype=np.float64)
    return Distribution1D(
        count=values.size,
        mean=float(np.mean(values)),
        sd=float(np.std(values, ddof=1)) if values.size > 1 else None,
        median=float(np.median(values)),
        p95=percentile(values),
        largest=float(np.max(values)),
    )


@dataclass(frozen=True)
class MeanSquare:
    """Root of the mean square over all realisations and its 95 % interval, None for a single one."""

    value: float
    low: float | None
    high: float | None


def root_mean_square(rms: Floats) -> MeanSquare:
    """The rms of all realisations together from the rms of each; interval by Student's distribution of the squares."""
    square = np.asarray(rms, dtype=np.float64) ** 2
    mean, count = float(np.mean(square)), square.size
    if count < 2:
        return MeanSquare(math.sqrt(mean), None, None)
    from scipy.special import stdtrit

    half = float(stdtrit(count - 1, 0.975)) * float(np.std(square, ddof=1)) / math.sqrt(count)
    return MeanSquare(math.sqrt(mean), math.sqrt(max(mean - half, 0.0)), math.sqrt(mean + half))
