"""Order statistics: rank of the percentile, the interval by a search of its own, and its edge at 72."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.stats import binom

from crowdsim.response.statistics import (
    LEAST_FOR_INTERVAL,
    describe,
    interval_ranks,
    percentile,
    percentile_rank,
)


@pytest.mark.parametrize(
    ("count", "share", "rank"),
    [(1, 0.95, 1), (19, 0.95, 19), (20, 0.95, 19), (100, 0.95, 95), (200, 0.95, 190), (7, 0.5, 4)],
)
def test_the_rank_is_the_next_whole_number_above(count: int, share: float, rank: int) -> None:
    assert percentile_rank(count, share) == rank


@pytest.mark.parametrize("count", [72, 73, 100, 200, 1000])
@pytest.mark.parametrize("share", [0.9, 0.95])
def test_the_interval_is_the_shortest_equal_tailed_one(count: int, share: float) -> None:
    below = binom(count, share)
    # x_(r) lies above the quantile when fewer than r values lie below it: largest r with P(B <= r - 1) <= 2.5 %
    low = max(r for r in range(1, count + 1) if below.cdf(r - 1) <= 0.025)
    # x_(s) lies below it when at least s values do: least s with P(B >= s) <= 2.5 %
    high = min(s for s in range(1, count + 1) if below.sf(s - 1) <= 0.025)
    assert interval_ranks(count, share) == (low, high)


def test_the_interval_begins_with_72_values() -> None:
    # the largest value lies above the 95 % quantile but for 0.95^n: below 2.5 % from n = 72 on
    assert math.ceil(math.log(0.025) / math.log(0.95)) == 72 == LEAST_FOR_INTERVAL
    assert interval_ranks(71, 0.95) is None
    assert interval_ranks(72, 0.95) is not None
    few = percentile(np.arange(71.0))
    assert (few.value, few.low, few.high) == (67.0, None, None)


def test_the_interval_covers_as_often_as_it_says() -> None:
    random = np.random.default_rng(1)
    hits = 0
    for _ in range(2000):
        found = percentile(random.random(100))
        assert found.low is not None
        assert found.high is not None
        hits += found.low <= 0.95 <= found.high
    # at least 95 % by construction; four standard errors of 2000 trials are 1.95 % (false alarm 3e-5, fixed seed)
    assert hits / 2000 >= 0.95 - 0.0195


def test_a_summary_equals_numpy() -> None:
    values = np.random.default_rng(2).random(150)
    said = describe(values)
    assert (said.count, said.mean, said.median) == (150, np.mean(values), np.median(values))
    assert said.sd == np.std(values, ddof=1)
    assert said.largest == values.max()
    assert said.p95.value == np.sort(values)[143 - 1]  # ceil(142.5)


def test_a_single_value_has_no_spread() -> None:
    said = describe(np.array([0.7]))
    assert (said.sd, said.mean, said.p95.value, said.p95.low) == (None, 0.7, 0.7, None)
