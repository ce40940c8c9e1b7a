"""Percentiles and exceedance probabilities of windows that hang together within a realisation.

Three things are exact and checked as such: one window a realisation gives the usual intervals; windows that are all
alike within a realisation are worth one each; and the design effect between those is the variance of the share over
resampled realisations, beside that of independent windows.
"""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from numpy.typing import NDArray

from crowdsim.response.statistics import interval_ranks, percentile
from crowdsim.response.windows import (
    FEW_BEYOND,
    wilson,
    window_exceedance,
    window_percentile,
    window_share,
)

Floats = NDArray[np.float64]


def peaks(count: int, windows: int, seed: int = 3) -> Floats:
    """Independent, all different."""
    return np.random.default_rng(seed).gumbel(1.0, 0.2, (count, windows))


# ---------------------------------------------------------------- one window a realisation


@pytest.mark.parametrize("count", [1, 2, 19, 20, 71, 72, 90, 200, 501])
@pytest.mark.parametrize("share", [0.5, 0.9, 0.95, 0.99])
def test_one_window_a_realisation_is_the_usual_percentile(count: int, share: float) -> None:
    """To the last bit, as a row and as a column."""
    values = peaks(count, 1)
    assert window_percentile(values, share) == percentile(values[:, 0], share)
    assert window_percentile(values[:, 0], share) == percentile(values[:, 0], share)


@pytest.mark.parametrize("count", [1, 20, 72, 200])
def test_one_window_a_realisation_is_wilsons_interval(count: int) -> None:
    values = peaks(count, 1)
    limit = float(np.median(values))
    found = window_exceedance(values, limit)
    share = float(np.mean(values > limit))
    assert found.effective == count
    assert found.value == share
    assert (found.low, found.high) == wilson(share, count)


@pytest.mark.parametrize("windows", [1, 3])
def test_an_interval_from_72_realisations_on(windows: int) -> None:
    """However many windows they have."""
    few, enough = window_percentile(peaks(71, windows)), window_percentile(peaks(72, windows))
    assert few.low is None
    assert few.high is None
    assert enough.low is not None
    assert enough.high is not None
    assert enough.low <= enough.value <= enough.high


def test_the_confidence_asked_for_counts() -> None:
    """90 % confidence at 59 realisations and not at 58: 0.95^59 <= 0.05 < 0.95^58 (computed)."""
    assert math.ceil(math.log(0.05) / math.log(0.95) - 1e-9) == 59
    assert window_percentile(peaks(58, 2), confidence=0.90).high is None
    assert window_percentile(peaks(59, 2), confidence=0.90).high is not None
    narrow, wide = (window_exceedance(peaks(80, 2), 1.3, c) for c in (0.8, 0.99))
    assert wide.low < narrow.low < narrow.value < narrow.high < wide.high


# ---------------------------------------------------------------- windows that are all alike


@pytest.mark.parametrize("windows", [2, 4, 10])
@pytest.mark.parametrize("count", [72, 100, 333])
def test_windows_all_alike_are_worth_one(count: int, windows: int) -> None:
    """The values at the ranks are those of the realisations: nothing is gained by counting each many times."""
    one = peaks(count, 1)
    many = np.repeat(one, windows, axis=1)
    pooled, single = window_percentile(many), percentile(one[:, 0])
    assert pooled.effective == pytest.approx(count, rel=1e-12)
    assert (pooled.low, pooled.high) == (single.low, single.high)
    # x_(ceil(0.95 n w)) of w copies each is x_(ceil(ceil(0.95 n w)/w)), which is x_(ceil(0.95 n))
    assert pooled.value == single.value
    for limit in (0.9, 1.1, 1.5):
        beyond, alone = window_exceedance(many, limit), window_exceedance(one, limit)
        assert beyond.effective == pytest.approx(count, rel=1e-12)
        assert beyond.value == pytest.approx(alone.value, rel=1e-14)
        assert (beyond.low, beyond.high) == (pytest.approx(alone.low, abs=1e-13), pytest.approx(alone.high, abs=1e-13))


def test_every_value_equal() -> None:
    """No window is beyond another: whole realisations count, and the interval is that one value."""
    found = window_percentile(np.full((100, 3), 0.7))
    assert (found.value, found.low, found.high) == (0.7, 0.7, 0.7)
    assert found.effective == 100
    assert window_exceedance(np.full((100, 3), 0.7), 0.7).value == 0.0  # at the limit is not beyond it
    every = window_exceedance(np.full((100, 3), 0.7), 0.6)
    assert (every.value, every.high, every.effective) == (1.0, 1.0, 100.0)
    assert every.low == pytest.approx(1.0 - wilson(0.0, 100)[1], abs=1e-14)


# ---------------------------------------------------------------- between the two


def test_the_design_effect_is_the_variance_over_resampled_realisations() -> None:
    """By hand: four realisations of two windows, three of eight beyond: p_i = 1, 1/2, 0, 0, p = 3/8.

    sum (p_i - p)^2 = 0.390625 + 0.015625 + 2 x 0.140625 = 0.6875; over 4^2: 0.04296875. Independent windows:
    3/8 x 5/8 / 8 = 0.029296875. Ratio 1.4667, so 8 / 1.4667 = 5.4545 windows. A hundred copies of the four, so that
    more than nine windows are on either side: the ratio stays.
    """
    four = np.array([[2.0, 2.0], [2.0, 1.0], [1.0, 1.0], [1.0, 1.0]])
    found = window_exceedance(np.tile(four, (100, 1)), 1.5)
    assert found.value == 0.375
    assert found.effective == pytest.approx(800 / (0.04296875 / 0.029296875), rel=1e-12)
    assert found.effective == pytest.approx(100 * 5.4545, rel=1e-4)
    assert (found.low, found.high) == wilson(found.value, found.effective)


def test_the_variance_formula_is_what_resampling_gives() -> None:
    """20 000 resamples of 60 realisations: the variance of the share has a standard error of 1 %; three of them,
    false alarm 0.27 %, fixed seed."""
    generator = np.random.default_rng(11)
    level = generator.normal(0.0, 0.6, (60, 1))
    beyond = level + generator.normal(0.0, 1.0, (60, 5)) > 0.8
    values = beyond.astype(float)
    assert FEW_BEYOND <= beyond.sum() <= beyond.size - FEW_BEYOND
    share = beyond.mean()
    resampled = beyond.mean(axis=1)[generator.integers(0, 60, (20_000, 60))].mean(axis=1)
    effective = window_exceedance(values, 0.5).effective
    assert 60.0 < effective < 300.0
    assert share * (1.0 - share) / effective == pytest.approx(resampled.var(), rel=3 * math.sqrt(2 / 20_000))


@pytest.mark.parametrize("seed", range(5))
def test_effective_windows_lie_between_realisations_and_windows(seed: int) -> None:
    generator = np.random.default_rng(seed)
    values = generator.gumbel(1.0, 0.2, (90, 4)) + generator.normal(0.0, 0.1 * seed, (90, 1))
    for limit in (0.5, 1.0, 1.5, 3.0):
        assert 90.0 <= window_exceedance(values, limit).effective <= 360.0
    found = window_percentile(values)
    assert 90.0 <= found.effective <= 360.0
    assert found.low is not None
    assert found.high is not None
    assert found.low <= found.value <= found.high
    assert {found.value, found.low, found.high} <= {*values.ravel()}


def test_many_independent_windows_narrow_the_interval() -> None:
    """Effective number near all of them: within 20 % (the variance of 90 shares has a standard error of 15 %)."""
    values = peaks(90, 10, seed=5)
    found = window_percentile(values)
    assert found.effective == pytest.approx(900, rel=0.2)
    one = percentile(values[:, 0])
    assert found.high is not None and found.low is not None  # noqa: PT018
    assert one.high is not None and one.low is not None  # noqa: PT018
    assert found.high - found.low < one.high - one.low


def test_windows_that_shun_each_other_are_not_worth_more_than_themselves() -> None:
    """One of two beyond in every realisation: no variance between realisations, design effect held at 1."""
    found = window_exceedance(np.tile([2.0, 1.0], (50, 1)), 1.5)
    assert (found.value, found.effective) == (0.5, 100.0)


def test_ranks_of_an_effective_number_in_the_pooled_sample() -> None:
    """All pooled values below the lower end, and above the upper, hold no more than the ranks' shares of them.

    n' effective windows with ranks (r, s) stand for n windows: at most (r - 1)/n' of the values are below the lower end
    and at most 1 - s/n' above the upper one; one value less and it would no longer be so.
    """
    generator = np.random.default_rng(8)
    values = generator.gumbel(1.0, 0.2, (120, 3)) + generator.normal(0.0, 0.2, (120, 1))
    found = window_percentile(values)
    whole = math.floor(found.effective)
    assert 120 < whole < 360
    ranks = interval_ranks(whole, 0.95)
    assert ranks is not None
    low, high = ranks
    ordered = np.sort(values, axis=None)
    below, above = (int(np.sum(values < found.low)), int(np.sum(values > found.high)))
    assert below <= (low - 1) / whole * 360 < below + 1
    assert above <= (1 - high / whole) * 360 < above + 1
    assert found.value == ordered[math.ceil(0.95 * 360) - 1]


@pytest.mark.parametrize(("windows", "spread"), [(1, 0.0), (4, 0.0), (4, 0.3)])
def test_the_interval_covers_the_percentile(windows: int, spread: float) -> None:
    """Among 2000 runs of 100 realisations at most 5 % miss, and three standard errors of 0.5 % more: 6.5 %.

    The clustered windows (Gumbel plus a normal level of the realisation) rest on an estimated design effect and are
    allowed another per cent. The true 95 % value is that of four million draws (known to 0.1 % of the spread).
    """
    generator = np.random.default_rng(20)
    many = 4_000_000
    true = np.quantile(generator.gumbel(1.0, 0.2, many) + generator.normal(0.0, spread + 1e-12, many), 0.95)
    missed = 0
    for _ in range(2000):
        values = generator.gumbel(1.0, 0.2, (100, windows)) + generator.normal(0.0, spread + 1e-12, (100, 1))
        found = window_percentile(values)
        assert found.low is not None and found.high is not None  # noqa: PT018
        missed += not found.low <= true <= found.high
    assert missed / 2000 <= 0.065 + (0.01 if spread else 0.0)


# ---------------------------------------------------------------- few beyond, none beyond


@pytest.mark.parametrize("windows", [1, 2, 5])
def test_nothing_beyond(windows: int) -> None:
    """The interval reaches up: z^2/(n + z^2) of the effective number (Wilson's form at p = 0, by hand)."""
    values = peaks(80, windows)
    found = window_exceedance(values, 99.0)
    assert (found.value, found.low) == (0.0, 0.0)
    z_square = 1.959964**2
    assert found.high == pytest.approx(z_square / (found.effective + z_square), rel=1e-6)
    assert 80 <= found.effective <= 80 * windows


def test_few_beyond_are_trusted_no_more_than_the_95_percent_value() -> None:
    """Two windows beyond in different realisations look independent; how clustered windows are is seen lower down."""
    level = np.linspace(0.0, 1.0, 100)[:, None]
    values = np.repeat(level, 4, axis=1) + 1e-6 * np.arange(4)  # realisations apart, windows alike
    values[0, 0] = values[50, 1] = 9.0
    found = window_exceedance(values, 5.0)
    assert found.value == 2 / 400
    # of the 95 % value: 20 of 400 windows beyond, 18 of them in whole realisations and 2 alone
    value = np.sort(values, axis=None)[380 - 1]
    each = (values > value).mean(axis=1)
    effect = np.sum((each - 0.05) ** 2) / 100**2 * 400 / (0.05 * 0.95)
    assert found.effective == pytest.approx(400 / effect, rel=1e-12)
    assert found.effective < 150


# ---------------------------------------------------------------- shares of classes


@pytest.mark.parametrize("windows", [1, 4])
def test_shares_of_classes_add_to_one(windows: int) -> None:
    values = peaks(77, windows)
    edges = [0.0, 0.9, 1.0, 1.3, np.inf]
    shares = [window_share(values, low, high) for low, high in pairwise(edges)]
    assert sum(s.value for s in shares) == pytest.approx(1.0, abs=1e-15)
    for share, low, high in zip(shares, edges[:-1], edges[1:], strict=True):
        assert share.value == np.mean((values >= low) & (values < high))
        assert 0.0 <= share.low <= share.value <= share.high <= 1.0


def test_an_edge_belongs_to_the_upper_class() -> None:
    values = np.array([0.5, 0.5, 0.7, 1.0])
    assert [window_share(values, a, b).value for a, b in ((0.0, 0.5), (0.5, 1.0), (1.0, np.inf))] == [0.0, 0.75, 0.25]


@pytest.mark.parametrize("values", [np.zeros(0), np.zeros((0, 3)), np.zeros((3, 0)), np.zeros((2, 2, 2)), np.zeros(())])
def test_what_is_no_table_of_windows(values: Floats) -> None:
    for function in (window_percentile, lambda v: window_exceedance(v, 1.0), lambda v: window_share(v, 0.0, 1.0)):
        with pytest.raises(ValueError, match=r"values: \[realisation, window\]"):
            function(values)
