"""The distribution-free interval of the 95 % value holds the true value as often as it says.

Coverage in closed form from the binomial law of the number below the quantile (textbook, e.g. David & Nagaraja 2003,
section 7.1, from memory), and by drawing samples whose quantile is known. Seeds are fixed; the false-alarm probability
stands with each test.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from crowdsim.response.statistics import LEAST_FOR_INTERVAL, interval_ranks, percentile

SHARE = 0.95


@pytest.mark.parametrize(
    ("count", "ranks"),
    [(100, (90, 100)), (200, (184, 197)), (300, (277, 293)), (500, (465, 485)), (1000, (936, 964)),
     (2000, (1880, 1920)), (5000, (4719, 4781))],
)  # fmt: skip
def test_ranks(count: int, ranks: tuple[int, int]) -> None:
    """Rank pairs (computed)."""
    assert interval_ranks(count, SHARE) == ranks


@pytest.mark.parametrize("count", [72, 73, 99, 100, 137, 200, 500, 1000, 10_000])
def test_each_tail_in_closed_form(count: int) -> None:
    """Each tail at most 2.5 %, and the next rank inwards would leave more: the narrowest equal-tailed interval."""
    ranks = interval_ranks(count, SHARE)
    assert ranks is not None
    low, high = ranks
    below = stats.binom(count, SHARE)  # number of values below the true quantile
    assert below.cdf(low - 1) <= 0.025 < below.cdf(low)  # x_(low) above the quantile: fewer than low below it
    assert below.sf(high - 1) <= 0.025 < below.sf(high - 2)  # x_(high) below it: at least high below


def test_least_number() -> None:
    """0.95^n <= 2.5 % from n = 72 on (computed): below there is no upper end."""
    assert LEAST_FOR_INTERVAL == math.ceil(math.log(0.025) / math.log(0.95)) == 72
    assert interval_ranks(71, SHARE) is None
    assert interval_ranks(72, SHARE) is not None


@pytest.mark.parametrize("count", [72, 100, 200, 500])
@pytest.mark.parametrize(
    "distribution",
    [stats.gumbel_r(loc=1.0, scale=0.15), stats.expon(), stats.randint(0, 41)],
    ids=["peaks", "tail", "ties"],
)
def test_coverage_by_drawing(count: int, distribution) -> None:  # type: ignore[no-untyped-def]
    """Each tail's share of 4000 samples against the binomial law, false alarm 1e-4 for each assertion.

    With ties the interval may only hold the quantile more often.
    """
    samples = 4000
    truth = float(distribution.ppf(SHARE))
    drawn = distribution.rvs(size=(samples, count), random_state=np.random.default_rng(count))
    found = [percentile(row, SHARE) for row in drawn]
    too_high = sum(p.low > truth for p in found)  # type: ignore[operator]
    too_low = sum(p.high < truth for p in found)  # type: ignore[operator]
    ranks = interval_ranks(count, SHARE)
    assert ranks is not None
    below = stats.binom(count, SHARE)
    for misses, expected in ((too_high, below.cdf(ranks[0] - 1)), (too_low, below.sf(ranks[1] - 1))):
        law = stats.binom(samples, expected)
        assert misses <= law.isf(5e-5)
        if distribution.dist.name != "randint":
            assert misses >= law.ppf(5e-5)


def test_the_value_itself_is_an_order_statistic() -> None:
    """x_(ceil(0.95 n)), never interpolated."""
    for count in (1, 19, 20, 21, 100, 101):
        values = np.random.default_rng(count).permutation(count).astype(float) + 1.0
        assert percentile(values, SHARE).value == math.ceil(round(SHARE * count, 9))
