"""Met, not met, undecided; and what more realisations would buy.

With independent windows the verdict is a matter of counting: of n, k are above the limit, and the interval [x_(r),
x_(s)] lies at or below it when k <= n - s, above it when k > n - r. That is exact, and checks the approximation that
says how many would decide.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.stats import binom

from crowdsim.response.statistics import Percentile, interval_ranks, least_for_interval
from crowdsim.response.verdict import (
    OUT_OF_REACH,
    realisations_for_width,
    realisations_to_decide,
    relative_half_width,
    verdict,
)
from crowdsim.response.windows import Proportion, window_exceedance, window_percentile


def share_of(value: float, effective: float) -> Proportion:
    return Proportion(value, 0.0, 1.0, effective)


def counted(count: int, above: int) -> str:
    """The verdict when `above` of `count` independent values are above the limit, from the ranks alone."""
    ranks = interval_ranks(count, 0.95)
    if ranks is None:
        return "undecided"
    if above <= count - ranks[1]:
        return "met"
    return "not met" if above > count - ranks[0] else "undecided"


# ---------------------------------------------------------------- the verdict


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [
        (0.5, 0.9, "met"), (0.5, 1.0, "met"), (0.5, math.nextafter(1.0, 2.0), "undecided"), (0.5, 1.5, "undecided"),
        (1.0, 1.5, "undecided"), (math.nextafter(1.0, 2.0), 1.5, "not met"), (1.2, 1.5, "not met"),
        (1.0, 1.0, "met"), (None, None, "undecided"),
    ],
)  # fmt: skip
def test_verdict(low: float | None, high: float | None, expected: str) -> None:
    """The upper end at the limit is met; the lower end at it is not yet exceeded; no interval, no verdict."""
    assert verdict(Percentile(0.95, 1.0, low, high, 100.0), 1.0) == expected


@pytest.mark.parametrize("count", [72, 80, 100, 143, 300, 1000])
def test_verdict_by_counting(count: int) -> None:
    """`counted` is what percentile and verdict do with values on either side of a limit, at every turn."""
    ranks = interval_ranks(count, 0.95)
    assert ranks is not None
    turns = {0, count - ranks[1], count - ranks[1] + 1, count - ranks[0], count - ranks[0] + 1, count}
    for above in sorted(turns):
        values = np.concatenate([np.linspace(0.1, 0.9, count - above), np.linspace(1.1, 1.9, above)])
        assert verdict(window_percentile(values), 1.0) == counted(count, above), above


# ---------------------------------------------------------------- how many would decide

BELOW = [0.0, 0.005, 0.01, 0.015, 0.02, 0.025, 0.03, 0.035, 0.04, 0.043, 0.045]
ABOVE = [0.056, 0.057, 0.06, 0.065, 0.07, 0.08, 0.09, 0.1, 0.13, 0.2, 0.3, 0.5, 1.0]


@pytest.mark.parametrize("share", [*BELOW, *ABOVE])
def test_the_number_said_decides(share: float) -> None:
    """With that share above the limit (to the whole number of windows) the verdict is there at the number said."""
    needed = realisations_to_decide(share_of(share, 10.0), 10)
    assert needed is not None
    if share < 0.05:
        assert counted(needed, math.floor(share * needed + 1e-9)) == "met"
    else:
        assert counted(needed, math.ceil(share * needed - 1e-9)) == "not met"


@pytest.mark.parametrize("share", [*BELOW, *(s for s in ABOVE if s <= 0.1)])
def test_two_thirds_of_the_number_do_not_decide(share: float) -> None:
    """It is at most half as large again as it need be, rounding to two digits included."""
    needed = realisations_to_decide(share_of(share, 10.0), 10)
    assert needed is not None
    fewer = math.floor(needed / 1.5)
    above = math.ceil(share * fewer - 1e-9) if share < 0.05 else math.floor(share * fewer + 1e-9)
    assert counted(fewer, above) == "undecided"


@pytest.mark.parametrize("share", [s for s in ABOVE if s > 0.13])
def test_what_is_plain_takes_the_least_for_an_interval(share: float) -> None:
    assert realisations_to_decide(share_of(share, 10.0), 10) == 72 == least_for_interval(0.95)


@pytest.mark.parametrize("share", [0.01, 0.02, 0.03, 0.04, 0.06, 0.07, 0.08, 0.1])
def test_at_that_number_about_half_of_all_runs_are_decided(share: float) -> None:
    """The count above the limit is binomial; the number says when its mean has left the interval of ranks, and is
    rounded up to two digits: 40 to 80 % decide there, at half the number clearly fewer. Exact probabilities."""
    needed = realisations_to_decide(share_of(share, 100.0), 100)
    assert needed is not None

    def decided(count: int) -> float:
        ranks = interval_ranks(count, 0.95)
        assert ranks is not None
        return float(
            binom.cdf(count - ranks[1], count, share) if share < 0.05 else binom.sf(count - ranks[0], count, share)
        )

    assert 0.4 <= decided(needed) <= 0.8
    if needed // 2 >= 72:
        assert decided(needed // 2) < decided(needed) - 0.1
        assert decided(3 * needed) > 0.85


@pytest.mark.parametrize("share", [0.03, 0.08])
def test_growing_samples(share: float) -> None:
    """200 samples grown until decided: the middle one within a factor of two of the number said at the outset.

    Stopping at the first decision is earlier than deciding at one number, for a sample has many chances on its way.
    """
    said = realisations_to_decide(share_of(share, 80.0), 80)
    assert said is not None
    generator = np.random.default_rng(17)
    above = np.cumsum(generator.random((200, 4 * said)) < share, axis=1)
    at = np.unique(np.geomspace(72, 4 * said, 60).astype(int))
    wanted = "met" if share < 0.05 else "not met"
    first = [next((n for n in at if counted(n, int(row[n - 1])) == wanted), 4 * said) for row in above]
    assert said / 2.0 <= float(np.median(first)) <= said
    decided_there = np.mean([counted(said, int(row[said - 1])) == wanted for row in above])
    # 0.4 to 0.8 as above, and three standard errors of 3.5 %
    assert 0.3 <= decided_there <= 0.9


def test_five_per_cent_above_never_decides() -> None:
    assert realisations_to_decide(share_of(0.05, 200.0), 200) is None
    assert realisations_to_decide(share_of(1.0 - 0.9, 200.0), 200, share=0.9) is None
    assert realisations_to_decide(share_of(math.nextafter(0.05, 1.0), 200.0), 200) is None  # ten million are too few
    assert realisations_to_decide(share_of(0.0501, 200.0), 200) is None
    near = realisations_to_decide(share_of(0.0503, 200.0), 200)
    assert near is not None
    assert near <= OUT_OF_REACH


@pytest.mark.parametrize("now", [10, 72, 200, 5000, 777_777])
def test_more_than_there_are(now: int) -> None:
    """Even where the formula says that there were enough: the sample at hand has just not decided."""
    for share in (0.0, 0.03, 0.3):
        needed = realisations_to_decide(share_of(share, float(now)), now)
        assert needed is not None
        assert needed > now
        assert needed >= 72


def test_two_significant_digits_rounded_up() -> None:
    for share in (0.011, 0.033, 0.047, 0.056, 0.09):
        needed = realisations_to_decide(share_of(share, 100.0), 100)
        assert needed is not None
        digits = str(needed)
        assert set(digits[2:]) <= {"0"}


def test_windows_that_hang_together_take_more_realisations() -> None:
    """Ten effective windows a realisation need a tenth of the realisations, once that is above the least of 72."""
    alone, ten = (realisations_to_decide(share_of(0.045, 100.0 * each), 100) for each in (1, 10))
    assert alone is not None
    assert ten is not None
    assert alone / 10 == pytest.approx(ten, rel=0.11)  # rounding up to two digits on both sides


def test_another_percentile() -> None:
    """The median needs 6 realisations for an interval, and a limit that 30 % exceed is soon seen to hold."""
    assert realisations_to_decide(share_of(0.3, 4.0), 4, share=0.5) == pytest.approx(1 / 0.04 * 0.25 * 3.84 + 5, abs=1)
    assert realisations_to_decide(share_of(0.0, 4.0), 4, share=0.5) >= least_for_interval(0.5) == 6


def test_from_simulated_windows_to_a_number() -> None:
    """As `judge` does it: 100 realisations of three windows, 4 % above; half of all runs of that size decide."""
    generator = np.random.default_rng(4)
    limit = 1.0 + 0.2 * -math.log(-math.log(0.96))  # of the Gumbel law below
    values = generator.gumbel(1.0, 0.2, (100, 3))
    needed = realisations_to_decide(share_of(0.04, window_exceedance(values, limit).effective), 100)
    assert needed is not None
    decided = 0
    for _ in range(100):
        more = generator.gumbel(1.0, 0.2, (needed, 3))
        decided += verdict(window_percentile(more), limit) == "met"
    # the effective number of 100 realisations is known to 15 %; three standard errors of 5 % beside 0.4 to 0.8
    assert 0.25 <= decided / 100 <= 0.95


# ---------------------------------------------------------------- widths


@pytest.mark.parametrize(
    ("value", "low", "high", "expected"),
    [
        (1.0, 0.9, 1.1, 0.1),
        (0.5, 0.48, 0.56, 0.08),
        (2.0, 2.0, 2.0, 0.0),
        (0.0, 0.0, 0.0, None),
        (1.0, None, None, None),
    ],
)
def test_half_width(value: float, low: float | None, high: float | None, expected: float | None) -> None:
    """Rounding only."""
    found = relative_half_width(Percentile(0.95, value, low, high, 100.0))
    assert found == (None if expected is None else pytest.approx(expected, abs=1e-15))


def test_realisations_for_a_width() -> None:
    """Four times as many for half the width, in two digits rounded up; by hand: 100 x (0.1/0.03)^2 = 1111.1 -> 1200."""
    wide = Percentile(0.95, 1.0, 0.9, 1.1, 100.0)
    assert realisations_for_width(wide, 100, 0.03) == 1200
    assert realisations_for_width(Percentile(0.95, 1.0, 0.75, 1.25, 100.0), 100, 0.125) == 400
    assert realisations_for_width(wide, 100, 0.5) == 72  # the least for an interval
    assert realisations_for_width(Percentile(0.5, 1.0, 0.9, 1.1, 100.0), 100, 0.5) == 6
    assert realisations_for_width(Percentile(0.95, 1.0, None, None, 50.0), 50, 0.03) is None


def test_widths_do_fall_as_the_square_root() -> None:
    """Mean half width of 100 samples of 800 against that at the number said for half of it: 10 %, for ranks are
    conservative by a rank or two, which counts for less in the larger sample."""
    generator = np.random.default_rng(9)

    def half(count: int) -> float:
        found = [relative_half_width(window_percentile(generator.gumbel(1.0, 0.2, count))) for _ in range(100)]
        return float(np.mean([f for f in found if f is not None]))

    at = half(800)
    said = realisations_for_width(Percentile(0.95, 1.0, 1.0 - at, 1.0 + at, 800.0), 800, at / 2.0)
    assert said in (3200, 3300)  # 4 x 800, up to what rounding adds
    assert half(said) == pytest.approx(at / 2.0, rel=0.1)
