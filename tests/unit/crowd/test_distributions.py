"""Random quantities: what is refused, moments and quantiles against scipy.stats, draws that redraw.

`scipy.stats` is an implementation of its own of the truncated normal; the lognormal is checked
through the normal of its logarithm.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import integrate, stats

from crowdsim.crowd.distributions import Distribution, Draws, fixed, normal

NORMAL = normal(1.87, 0.186, 1.3, 2.6)
LOGNORMAL = Distribution("lognormal", 725.0, 154.0, 300.0, 1500.0)
UNIFORM = Distribution("uniform", minimum=-1.3, maximum=0.9)
FIXED = fixed(2.0)
ALL = [NORMAL, LOGNORMAL, UNIFORM, FIXED]

TRUNCATED = stats.truncnorm((1.3 - 1.87) / 0.186, (2.6 - 1.87) / 0.186, 1.87, 0.186)
# of the variable itself: variance of the logarithm ln(1 + (sd/mean)^2), mean of the logarithm ln(mean) - variance/2
_LOG_SD = math.sqrt(math.log1p((154 / 725) ** 2))
_UNTRUNCATED = stats.lognorm(_LOG_SD, scale=725 / math.sqrt(1 + (154 / 725) ** 2))


@pytest.mark.parametrize(
    ("values", "message"),
    [
        (("normal", 1.0, 0.0), "sd must be above 0"),
        (("normal", 1.0, -0.1), "sd must be above 0"),
        (("normal", 1.0, 0.1, 2.0, 1.0), "min 2 is not below max 1"),
        (("normal", 1.0, 0.1, 1.3, 2.0), "holds 0.13 % of the probability; at least 1 %"),  # 3 sd: 0.00135
        (("lognormal", -1.0, 0.1), "a mean above 0"),
        (("uniform", 0.0, 0.0, 1.0), "needs min and max"),
        (("uniform", 0.0, 0.0, 2.0, 2.0), "min 2 is not below max 2"),
    ],
)
def test_what_makes_no_sense_is_refused_with_its_numbers(values: tuple[object, ...], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Distribution(*values)  # type: ignore[arg-type]


def test_an_interval_with_just_over_one_per_cent_is_accepted() -> None:
    edge = stats.norm.isf(0.0101)
    assert normal(0.0, 1.0, edge).probability == pytest.approx(0.0101, rel=1e-12)


def test_the_quantile_is_that_of_scipy() -> None:
    p = np.array([0.0, 1e-4, 0.01, 0.3, 0.5, 0.9, 0.999, 1.0])
    np.testing.assert_allclose(NORMAL.quantile(p), TRUNCATED.ppf(p), rtol=1e-9)
    low, high = _UNTRUNCATED.cdf([300.0, 1500.0])
    np.testing.assert_allclose(LOGNORMAL.quantile(p), _UNTRUNCATED.ppf(low + p * (high - low)), rtol=1e-9)
    np.testing.assert_allclose(UNIFORM.quantile(p), -1.3 + 2.2 * p, rtol=1e-15)
    np.testing.assert_array_equal(FIXED.quantile(p), np.full(8, 2.0))


def test_the_probability_kept_is_that_of_scipy() -> None:
    assert NORMAL.probability == pytest.approx(stats.norm(1.87, 0.186).cdf(2.6) - stats.norm(1.87, 0.186).cdf(1.3))
    low, high = _UNTRUNCATED.cdf([300.0, 1500.0])
    assert LOGNORMAL.probability == pytest.approx(high - low, rel=1e-12)


@pytest.mark.parametrize("power", [-1.0, 1.0, 2.0])
def test_moments_are_those_of_the_truncated_density(power: float) -> None:
    exact = integrate.quad(lambda x: x**power * TRUNCATED.pdf(x), 1.3, 2.6, epsabs=1e-13)[0]
    # the rule in the probability meets steep ends: 1e-9 is what it owes
    assert NORMAL.expectation(power) == pytest.approx(exact, rel=1e-9)
    share = LOGNORMAL.probability
    exact = integrate.quad(lambda x: x**power * _UNTRUNCATED.pdf(x) / share, 300, 1500, epsabs=0, epsrel=1e-12)[0]
    assert LOGNORMAL.expectation(power) == pytest.approx(exact, rel=1e-9)
    assert FIXED.expectation(power) == 2.0**power


def test_a_lognormal_quantity_has_its_own_mean_and_sd_before_truncation() -> None:
    wide = Distribution("lognormal", 725.0, 154.0, 0.0)
    assert wide.expectation(1.0) == pytest.approx(725.0, rel=1e-8)  # the tail beyond 1 - 1e-6 by 12 nodes
    assert wide.expectation(2.0) - 725.0**2 == pytest.approx(154.0**2, rel=1e-5)


@pytest.mark.parametrize("of", ALL, ids=lambda d: d.kind)
def test_draws_stay_within_and_never_pile_up_at_an_end(of: Distribution) -> None:
    tight = of if of.kind in ("fixed", "uniform") else Distribution(of.kind, of.mean, of.sd, 0.97 * of.mean, of.mean)
    x = tight.draw(np.random.default_rng(1), 5000)
    assert x.shape == (5000,)
    if tight.kind != "fixed":
        assert tight.minimum <= x.min() < x.max() <= tight.maximum
        assert np.unique(x).size == 5000  # redrawn, never clipped


@pytest.mark.parametrize("of", [NORMAL, LOGNORMAL, UNIFORM], ids=lambda d: d.kind)
def test_draws_have_the_distribution(of: Distribution) -> None:
    x = of.draw(np.random.default_rng(2), 20_000)
    grid = np.linspace(0.0, 1.0, 4001)
    result = stats.kstest(x, lambda v: np.interp(v, of.quantile(grid), grid))
    assert result.pvalue > 1e-4  # false alarm 1e-4, fixed seed


@pytest.mark.parametrize("of", ALL, ids=lambda d: d.kind)
@pytest.mark.parametrize("pieces", [(1000,), (1, 999), (300, 0, 500, 200), (10,) * 100])
def test_the_ith_draw_is_the_same_whatever_the_pieces(of: Distribution, pieces: tuple[int, ...]) -> None:
    whole = of.draw(np.random.default_rng(3), 1500)
    draws = Draws(of, lambda: np.random.default_rng(3))
    np.testing.assert_array_equal(np.concatenate([draws.take(n) for n in pieces]), whole[:1000])


def test_the_share_within_an_interval() -> None:
    assert NORMAL.share_within(1.6, 2.4) == pytest.approx(TRUNCATED.cdf(2.4) - TRUNCATED.cdf(1.6), rel=1e-12)
    assert NORMAL.share_within(0.0, 9.0) == pytest.approx(1.0, rel=1e-15)
    assert NORMAL.share_within(3.0, 4.0) == 0.0
    assert UNIFORM.share_within(-0.2, 5.0) == pytest.approx(1.1 / 2.2, rel=1e-15)
    assert (FIXED.share_within(1.0, 2.0), FIXED.share_within(2.1, 3.0)) == (1.0, 0.0)


def test_the_text_says_all_numbers() -> None:
    assert NORMAL.text("Hz") == "normal, mean 1.87, sd 0.186, 1.3 to 2.6 Hz"
    assert normal(1.0, 0.1, 0.5).text() == "normal, mean 1, sd 0.1, from 0.5"
    assert normal(1.0, 0.1, maximum=2.0).text("m") == "normal, mean 1, sd 0.1, to 2 m"
    assert UNIFORM.text("m") == "uniform, -1.3 to 0.9 m"
    assert FIXED.text("Hz") == "2 Hz"
