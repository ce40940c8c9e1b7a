"""Distribution-free interval of the 95 % value: ranks, coverage and the least number of realisations.

P(x_(r) <= q_p < x_(s)) = sum_{i=r}^{s-1} C(n, i) p^i (1 - p)^(n - i) (textbook: David & Nagaraja 2003, Order
Statistics, section 7.1, from memory). The rank pairs are computed, and checked with scipy.stats.binom.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.stats import binom

from crowdsim.response.statistics import LEAST_FOR_INTERVAL, interval_ranks, percentile, percentile_rank

# n, r, s of the 95 % value at 95 % confidence, equal-tailed: computed
RANKS = [
    (100, 90, 100),
    (200, 184, 197),
    (300, 277, 293),
    (500, 465, 485),
    (1000, 936, 964),
    (2000, 1880, 1920),
    (5000, 4719, 4781),
]


@pytest.mark.parametrize(("count", "low", "high"), RANKS)
def test_rank_pairs(count, low, high):
    """Exact: whole numbers. Their coverage is at least what is asked and not much more."""
    assert interval_ranks(count, 0.95) == (low, high)
    coverage = binom.cdf(high - 1, count, 0.95) - binom.cdf(low - 1, count, 0.95)
    assert 0.95 <= coverage < 0.984


@pytest.mark.parametrize("share", [0.5, 0.9, 0.95, 0.99])
@pytest.mark.parametrize("confidence", [0.9, 0.95, 0.99])
def test_ranks_against_the_binomial_distribution(share, confidence):
    """Each tail at most (1 - confidence)/2, and more one rank further in; None just where no rank will do."""
    tail = 0.5 * (1.0 - confidence)
    found = 0
    for count in (*range(1, 120), 299, 473, 1000, 10_000):
        ranks = interval_ranks(count, share, confidence)
        possible = (1.0 - share) ** count <= tail and share**count <= tail
        assert (ranks is not None) == possible
        if ranks is None:
            continue
        found += 1
        low, high = ranks
        below = binom(count, share)
        assert 1 <= low < high <= count
        assert below.cdf(low - 1) <= tail < below.cdf(low)
        assert below.sf(high - 1) <= tail < below.sf(high - 2)
    assert found > 0


def test_least_number_of_realisations():
    """72 for the equal-tailed interval of the 95 % value: 0.95^72 <= 0.025 < 0.95^71 (computed)."""
    assert LEAST_FOR_INTERVAL == 72 == math.ceil(math.log(0.025) / math.log(0.95))
    assert interval_ranks(72, 0.95) is not None
    assert interval_ranks(71, 0.95) is None


@pytest.mark.parametrize(
    ("count", "share", "rank"),
    [(1, 0.95, 1), (20, 0.95, 19), (21, 0.95, 20), (100, 0.95, 95), (101, 0.95, 96), (200, 0.95, 190), (500, 0.5, 250)],
)
def test_percentile_rank(count, share, rank):
    """k = ceil(share n); 0.95 x 20 and 0.95 x 200 are whole though their floats are not."""
    assert percentile_rank(count, share) == rank


def test_values_at_the_ranks():
    """The percentile of a shuffled sample is the value at its rank, with the values at r and s."""
    values = np.random.default_rng(1).permutation(np.arange(1, 501)).astype(float)
    found = percentile(values)
    assert (found.value, found.low, found.high) == (475.0, 465.0, 485.0)
    few = percentile(values[:50])
    assert few.value == np.sort(values[:50])[47]
    assert few.low is None
    assert few.high is None
