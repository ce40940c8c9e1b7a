"""Percentiles and exceedance probabilities of the peaks in windows, several to a realisation.

Windows of one realisation are not independent. How far they are not is measured by resampling
whole realisations: the variance of the share of windows beyond a level under that resampling has
a closed form, sum (p_i - p)^2 / n^2 with p_i the share in realisation i, so that nothing random is
left in the interval. Its ratio to the variance of independent windows is the design effect; the
number of windows divided by it is the effective number, which takes the place of n in the
binomial rank interval (carried to the pooled order statistics, Woodruff 1952, from memory) and in
Wilson's interval. With one window a realisation the design effect is 1, and both are the usual
intervals to the last digit.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from crowdsim.response.statistics import Percentile, interval_ranks, percentile_rank

Floats = NDArray[np.float64]
FEW_BEYOND = 10  # values beyond a level, fewer of which say little of how they cluster


@dataclass(frozen=True)
class Proportion:
    """A share of windows and its interval; `effective` is the number of independent windows it is worth."""

    value: float
    low: float
    high: float
    effective: float


def normal_quantile(share: float) -> float:
    """Of the standard normal distribution."""
    from statistics import NormalDist

    return NormalDist().inv_cdf(share)


def wilson(share: float, count: float, confidence: float = 0.95) -> tuple[float, float]:
    """Interval of a probability from the share seen in `count` independent trials.

    Wilson, Probable inference, the law of succession, and statistical inference, Journal of the
    American Statistical Association 22, 1927.

    >>> [round(x, 4) for x in wilson(0.05, 100)]
    [0.0215, 0.1118]
    """
    z = normal_quantile(0.5 + 0.5 * confidence)
    middle = share + z * z / (2.0 * count)
    half = z * math.sqrt(share * (1.0 - share) / count + (z / (2.0 * count)) ** 2)
    whole = 1.0 + z * z / count
    return max(0.0, (middle - half) / whole), min(1.0, (middle + half) / whole)


def _windows(values: Floats) -> Floats:
    values = np.asarray(values, dtype=np.float64)
    values = values[:, None] if values.ndim == 1 else values
    if values.ndim != 2 or values.size == 0:
        raise ValueError(f"values: [realisation, window], at least one, not {values.shape}")
    return values


def _design_effect(beyond: NDArray[np.bool_]) -> float | None:
    """Of the share of True over [realisation, window], within 1 and the number of windows; None: all alike."""
    count, windows = beyond.shape
    each = beyond.mean(axis=1)
    share = float(each.mean())
    if share in (0.0, 1.0):
        return None
    variance = float(np.sum((each - share) ** 2)) / count**2
    effect: float = variance * count * windows / (share * (1.0 - share))
    return min(max(effect, 1.0), float(windows))


def _effective(beyond: NDArray[np.bool_], values: Floats) -> float:
    """Independent windows that the share of True over [realisation, window] is worth.

    Where fewer than ten windows are on one side, the design effect is at least that at the 95 %
    value; where that says nothing either, whole realisations count, not windows.
    """
    if beyond.shape[1] == 1:
        return float(beyond.size)
    effect = _design_effect(beyond)
    if effect is None or min(int(beyond.sum()), int((~beyond).sum())) < FEW_BEYOND:
        rank = percentile_rank(values.size, 0.95)
        usual = _design_effect(values > np.partition(values, rank - 1, axis=None)[rank - 1])
        effect = max((e for e in (effect, usual) if e is not None), default=float(beyond.shape[1]))
    return beyond.size / effect


def window_percentile(values: Floats, share: float = 0.95, confidence: float = 0.95) -> Percentile:
    """The pooled x_(ceil(share n)) of `values` [realisation, window] and its interval.

    The interval is distribution-free and equal-tailed; none where the realisations are too few for
    one (72 for the 95 % value), however many windows they have. Raises ValueError for other shapes.
    """
    values = _windows(values)
    ordered = np.sort(values, axis=None)
    count = ordered.size
    value = float(ordered[percentile_rank(count, share) - 1])
    effective = _effective(values > value, values)
    whole = max(1, math.floor(effective + 1e-9))
    ranks = interval_ranks(whole, share, confidence)
    if ranks is None or interval_ranks(values.shape[0], share, confidence) is None:
        return Percentile(share, value, None, None, effective)
    # the r-th of `whole` stands for the r-th run of count/whole pooled values: its outer end
    low = math.floor((ranks[0] - 1) * count / whole + 1e-9)
    high = min(count, math.ceil(ranks[1] * count / whole - 1e-9))
    return Percentile(share, value, float(ordered[low]), float(ordered[high - 1]), effective)


def window_exceedance(values: Floats, limit: float, confidence: float = 0.95) -> Proportion:
    """Probability that the peak in a window is above `limit`, from `values` [realisation, window].

    Wilson's interval with the effective number of windows. Raises ValueError for other shapes.
    """
    values = _windows(values)
    return _proportion(values > limit, values, confidence)


def window_share(values: Floats, low: float, high: float, confidence: float = 0.95) -> Proportion:
    """Probability that the peak in a window is at least `low` and below `high`, in the same way."""
    values = _windows(values)
    return _proportion((values >= low) & (values < high), values, confidence)


def _proportion(inside: NDArray[np.bool_], values: Floats, confidence: float) -> Proportion:
    share, effective = float(inside.mean()), _effective(inside, values)
    low, high = wilson(share, effective, confidence)
    return Proportion(share, min(low, share), max(high, share), effective)
