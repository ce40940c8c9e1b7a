"""Wilson's interval of a probability.

Source: E. B. Wilson, Probable inference, the law of succession, and statistical inference, Journal of the American
Statistical Association 22, 1927. Symbol map: share p, count n, z the normal quantile of (1 + confidence)/2:

    (p + z^2/2n +- z sqrt(p (1 - p)/n + z^2/4n^2)) / (1 + z^2/n).

The examples are computed, not published; scipy's binomial test, an independent library, gives the same.
"""

from __future__ import annotations

import math

import pytest
from scipy.stats import binom, binomtest

from crowdsim.response.windows import normal_quantile, wilson

EXAMPLES = [  # beyond, of how many, low, high: 95 %, computed
    (0, 100, 0.0000, 0.0370),
    (5, 100, 0.0215, 0.1118),
    (15, 300, 0.0305, 0.0808),
    (25, 500, 0.0341, 0.0728),
    (50, 1000, 0.0381, 0.0653),
]
SIZES = [  # half width around p = 0.05; least n by the normal form and by Wilson's interval: computed
    (0.01, 1825, 1838),
    (0.02, 457, 469),
    (0.03, 203, 215),
]


@pytest.mark.parametrize(("beyond", "count", "low", "high"), EXAMPLES)
def test_examples(beyond, count, low, high):
    """Half a unit of the fourth decimal."""
    assert wilson(beyond / count, count) == (pytest.approx(low, abs=0.5e-4), pytest.approx(high, abs=0.5e-4))


@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.99])
@pytest.mark.parametrize(("beyond", "count"), [*(row[:2] for row in EXAMPLES), (1, 1), (0, 1), (7, 7), (299, 300)])
def test_against_a_general_library(beyond, count, confidence):
    """The same law written twice: rounding, for a lower end near 0 that of a difference of numbers below 1."""
    expected = binomtest(beyond, count).proportion_ci(confidence, method="wilson")
    found = wilson(beyond / count, count, confidence)
    assert found == (pytest.approx(expected.low, abs=1e-14), pytest.approx(expected.high, abs=1e-14))
    assert 0.0 <= found[0] < found[1] <= 1.0


@pytest.mark.parametrize("share", [0.0, 0.03, 0.4, 1.0])
def test_its_ends_solve_the_equation_that_it_comes_from(share):
    """|p - P| = z sqrt(P (1 - P)/n) for both ends P; a number of trials need not be whole. Rounding only."""
    count, z = 87.5, normal_quantile(0.975)
    for end in wilson(share, count):
        assert (share - end) ** 2 == pytest.approx(z * z * end * (1.0 - end) / count, abs=1e-15)


def test_half_of_successes_mirrors():
    """What is not beyond is within. Rounding only."""
    low, high = wilson(0.07, 250)
    assert wilson(0.93, 250) == (pytest.approx(1.0 - high, abs=1e-15), pytest.approx(1.0 - low, abs=1e-15))


@pytest.mark.parametrize(("half_width", "by_normal", "by_wilson"), SIZES)
def test_how_many_trials_a_half_width_takes(half_width, by_normal, by_wilson):
    """1825, 457 and 203 are what the normal form, z sqrt(p (1 - p)/n), needs; Wilson's interval takes twelve or
    thirteen more, for its middle moves towards one half. Whole numbers, each the least.
    """
    z = normal_quantile(0.975)

    def normal(n):
        return z * math.sqrt(0.05 * 0.95 / n)

    def wilsons(n):
        low, high = wilson(0.05, n)
        return 0.5 * (high - low)

    for half, least in ((normal, by_normal), (wilsons, by_wilson)):
        assert half(least) <= half_width < half(least - 1)


@pytest.mark.parametrize(("count", "share"), [(100, 0.05), (300, 0.05), (1000, 0.05), (500, 0.3)])
def test_it_covers_the_probability_about_as_often_as_it_says(count, share):
    """Exact, by the binomial distribution: 93 to 97.5 % here (computed); Wilson's interval covers 95 % on average
    over probabilities, not at each."""
    coverage = math.fsum(
        binom.pmf(k, count, share) for k in range(count + 1) if wilson(k / count, count)[0] <= share
        and share <= wilson(k / count, count)[1]
    )  # fmt: skip
    assert 0.93 <= coverage <= 0.975


@pytest.mark.parametrize(("share", "value"), [(0.5, 0.0), (0.975, 1.959964), (0.95, 1.644854), (0.025, -1.959964)])
def test_normal_quantile(share, value):
    """As in any table of the normal distribution: half a unit of the sixth decimal."""
    assert normal_quantile(share) == pytest.approx(value, abs=0.5e-6)
