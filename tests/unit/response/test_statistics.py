"""Order statistics: rank of the percentile, the interval by a search of its own, and its edge at 72."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats
from scipy.stats import binom

from crowdsim.response.statistics import (
    LEAST_FOR_INTERVAL,
    describe,
    interval_ranks,
    percentile,
    percentile_rank,
    root_mean_square,
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


# ---------------------------------------------------------------- root mean square over realisations


def test_root_mean_square_is_that_of_all_records_together() -> None:
    """Records of one length, joined: rounding only."""
    records = np.random.default_rng(3).normal(size=(25, 400)) * np.linspace(0.1, 2.0, 25)[:, None]
    each = np.sqrt(np.mean(records**2, axis=1))
    together = math.sqrt(np.mean(records**2))
    assert root_mean_square(each).value == pytest.approx(together, rel=1e-13)
    assert root_mean_square(each).value > np.mean(each)  # which the mean of the rms is below


def test_its_interval_is_students_of_the_squares() -> None:
    """As scipy has it for the mean of a sample; 1e-12: rounding, and an inverse of its own on either side."""
    rms = np.random.default_rng(4).gamma(4.0, 0.05, 37)
    found = root_mean_square(rms)
    low, high = stats.t.interval(0.95, 36, loc=np.mean(rms**2), scale=stats.sem(rms**2))
    assert low > 0.0
    assert found.low == pytest.approx(math.sqrt(low), rel=1e-12)
    assert found.high == pytest.approx(math.sqrt(high), rel=1e-12)
    ends = stats.ttest_1samp(rms**2, 0.0).confidence_interval(0.95)
    assert (found.low, found.high) == (
        pytest.approx(math.sqrt(ends.low), rel=1e-12), pytest.approx(math.sqrt(ends.high), rel=1e-12),
    )  # fmt: skip


def test_two_records_worked_by_hand() -> None:
    """Squares 0.01 and 0.09: mean 0.05, sd 0.0565685, error 0.04; t of one degree of freedom is tan(0.475 pi) =
    12.7062. 0.05 - 0.508 is below nought, where a square cannot be; 0.05 + 0.508248 = 0.558248."""
    found = root_mean_square(np.array([0.1, 0.3]))
    assert found.value == pytest.approx(math.sqrt(0.05), rel=1e-14)
    assert found.low == 0.0
    assert found.high == pytest.approx(math.sqrt(0.05 + 0.04 * math.tan(0.475 * math.pi)), rel=1e-12)
    assert found.high == pytest.approx(math.sqrt(0.558248), rel=1e-6)


def test_a_single_record_has_no_interval_and_equal_ones_one_without_width() -> None:
    one = root_mean_square(np.array([0.7]))
    assert (one.low, one.high) == (None, None)
    assert one.value == pytest.approx(0.7, rel=1e-15)
    same = root_mean_square(np.full(8, 0.25))
    assert (same.value, same.low, same.high) == (0.25, 0.25, 0.25)


def test_it_covers_as_often_as_it_says() -> None:
    """Mean squares of 12 records, each of 400 normal values: nearly normal, so Student's interval covers 95 %.

    4000 trials: four standard errors are 1.4 %; chi-square of 400 has a skewness of 0.14, worth under 0.2 % (fixed
    seed).
    """
    squares = np.random.default_rng(5).chisquare(400, (4000, 12)) / 400
    hits = 0
    for row in np.sqrt(squares):
        found = root_mean_square(row)
        assert found.low is not None
        assert found.high is not None
        hits += found.low <= 1.0 <= found.high
    assert hits / 4000 == pytest.approx(0.95, abs=0.016)
