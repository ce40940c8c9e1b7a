"""Laws of maxima: derivatives, limits, errors, flags of extrapolation, intervals that stay in their range."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from crowdsim.response.extreme_likelihood import (
    derivatives,
    growth,
    growth_slope,
    log_likelihood,
    log_ratio,
    log_ratio_slopes,
)
from crowdsim.response.extremes import ExtremeFit, fit, goodness

pytestmark = pytest.mark.filterwarnings("error")
PEAKS = 0.5 + 0.1 * np.random.default_rng(1).gumbel(size=120)


def law(shape: float, location: float = 0.5, scale: float = 0.1, count: int = 100) -> ExtremeFit:
    family = "gev" if shape else "gumbel"
    free = 3 if shape else 2
    covariance = np.diag([1e-4, 6e-5, 6e-3][:free])
    return ExtremeFit(family, location, scale, shape, covariance, 0.0, count, count)  # type: ignore[arg-type]


def test_import_loads_no_scipy(python: Callable[..., str]) -> None:
    loaded = python(
        "import sys, crowdsim.response.extremes as e; e.fit(list(range(1, 20)), 'gev'); print(*sys.modules)"
    )
    assert not [name for name in loaded.split() if name.split(".")[0] == "scipy"]


@pytest.mark.parametrize("shape", [-0.4, -0.05, -1e-4, 0.0, 1e-9, 1e-4, 0.05, 0.3])
def test_derivatives_are_those_of_the_likelihood(shape: float) -> None:
    """Central differences: their error is of the order 1e-5^2 and rounding/1e-5, both under 1e-6 of the terms."""
    x = np.random.default_rng(2).gumbel(size=50)
    x = x[1.0 + shape * (x - 0.1) / 1.2 > 0.05]
    here = np.array([0.1, 1.2, shape])
    scores, hessian = derivatives(x, here)
    for i in range(3):
        step = 1e-5 * np.eye(3)[i]
        slope = (log_likelihood(x, here + step) - log_likelihood(x, here - step)) / 2e-5
        assert scores[i].sum() == pytest.approx(slope, rel=1e-6, abs=1e-6 * np.abs(scores[i]).sum())
        bend = (derivatives(x, here + step)[0].sum(axis=1) - derivatives(x, here - step)[0].sum(axis=1)) / 2e-5
        assert hessian[i] == pytest.approx(bend, rel=1e-6, abs=1e-6 * np.abs(hessian).max())


@pytest.mark.parametrize("edge", [1e-8, 1e-3, 0.03])
@pytest.mark.parametrize("sign", [-1.0, 1.0])
def test_series_and_closed_forms_meet(edge: float, sign: float) -> None:
    """Either side of the change-over; what is left is the functions' slope, of order 1, over 2e-9 of the edge."""
    two = sign * edge * np.array([1.0 - 1e-9, 1.0 + 1e-9])
    slopes = log_ratio_slopes(two, log_ratio(two))
    for before, after in (growth(two), growth_slope(two), log_ratio(two), *slopes):
        assert before == pytest.approx(after, abs=1e-11 + 2e-9 * edge * 3.0)  # no slope is above 3


def test_gumbel_is_the_limit_of_gev() -> None:
    x = np.array([0.2, 0.45, 0.6, 0.9, 1.4])
    p = np.array([0.01, 0.5, 0.95, 0.9999])
    for shape in (-1e-7, 1e-7):
        # the next term is shape y^2/2, 4e-6 at y = 9
        assert law(shape).quantile(p) == pytest.approx(law(0.0).quantile(p), rel=5e-6)
        assert law(shape).exceedance(x) == pytest.approx(law(0.0).exceedance(x), rel=5e-6)
    # for a sample whose estimated shape is near 0 both fits agree and GEV's likelihood is the larger
    gumbel, gev = fit(PEAKS, "gumbel"), fit(PEAKS, "gev")
    assert gev.log_likelihood >= gumbel.log_likelihood
    assert gev.log_likelihood - gumbel.log_likelihood < 4.0  # half a chi-square of 1 degree: beyond 4 with p = 0.005


def test_largest_of_k_gumbel_maxima() -> None:
    """F^k of a Gumbel law is the Gumbel law with location + scale ln k; of a GEV law one of the same shape."""
    x = np.linspace(0.3, 2.0, 18)
    assert law(0.0).cumulative(x) ** 12 == pytest.approx(
        law(0.0, location=0.5 + 0.1 * math.log(12.0)).cumulative(x), rel=1e-12, abs=1e-300
    )
    shape = -0.1
    longer = law(shape, location=0.5 + 0.1 * (12.0**shape - 1.0) / shape, scale=0.1 * 12.0**shape)
    x = np.linspace(0.3, 1.4, 12)
    assert law(shape).cumulative(x) ** 12 == pytest.approx(longer.cumulative(x), rel=1e-11, abs=1e-300)
    # and a fit to the moved sample is the moved fit
    moved, still = fit(PEAKS + 0.1 * math.log(12.0)), fit(PEAKS)
    assert moved.location - still.location == pytest.approx(0.1 * math.log(12.0), rel=1e-9)


@pytest.mark.parametrize("family", ["gumbel", "gev"])
@pytest.mark.parametrize("factor", [1e-6, 3.0, 1e5])
def test_the_unit_does_not_matter(family, factor: float) -> None:  # type: ignore[no-untyped-def]
    one, other = fit(PEAKS, family), fit(factor * PEAKS, family)
    assert other.location == pytest.approx(factor * one.location, rel=1e-9)
    assert other.scale == pytest.approx(factor * one.scale, rel=1e-9)
    assert other.shape == pytest.approx(one.shape, abs=1e-9)
    assert other.quantile_interval(0.99) == pytest.approx(factor * np.array(one.quantile_interval(0.99)), rel=1e-8)
    assert other.log_likelihood == pytest.approx(one.log_likelihood - PEAKS.size * math.log(factor), rel=1e-9)


@pytest.mark.parametrize("shape", [-0.2, 0.0, 0.15])
def test_quantile_and_probability_are_inverses(shape: float) -> None:
    p = np.array([1e-6, 0.1, 0.5, 0.95, 0.999])
    x = law(shape).quantile(p)
    assert law(shape).cumulative(x) == pytest.approx(p, rel=1e-9)
    assert law(shape).exceedance(x) == pytest.approx(1.0 - p, rel=1e-9)
    assert isinstance(law(shape).quantile(0.9), float)
    assert isinstance(law(shape).exceedance_interval(0.9)[1], float)


def test_a_rare_exceedance_is_not_rounded_to_nothing() -> None:
    # 1 - exp(-exp(-45)) = exp(-45) to 20 digits; 45 stands for (5.0 - 0.5)/0.1
    assert law(0.0).exceedance(5.0) == pytest.approx(math.exp(-45.0), rel=1e-12)


def test_ends_of_the_law() -> None:
    bounded, heavy = law(-0.2), law(0.2)
    assert bounded.upper_end == pytest.approx(1.0)
    assert (bounded.cumulative(1.2), bounded.exceedance(1.2)) == (1.0, 0.0)
    assert (heavy.cumulative(-0.1), heavy.exceedance(-0.1)) == (0.0, 1.0)  # lower end 0
    assert heavy.upper_end == law(0.0).upper_end == math.inf
    low, high = bounded.exceedance_interval(1.2)
    assert low == 0.0
    # the sample does not exclude a larger value; the limit is the least of those at smaller ones
    inside = bounded.exceedance_interval(np.linspace(0.5, 0.999, 500))[1]
    assert 0.0 < high < inside[0]
    assert high == pytest.approx(inside.min(), rel=1e-4)  # the least is sought on variates 0.01 apart
    assert heavy.exceedance_interval(-0.1)[1] == 1.0
    assert heavy.exceedance_interval(-0.1)[0] > 0.95


@pytest.mark.parametrize("shape", [-0.2, 0.0, 0.15])
def test_limits_of_the_exceedance_fall_with_the_value(shape: float) -> None:
    x = np.linspace(-0.5, 3.0, 701)
    low, high = law(shape).exceedance_interval(x)
    value = law(shape).exceedance(x)
    assert np.all((low >= 0.0) & (low <= value) & (value <= high) & (high <= 1.0))
    for limit in (low, high):  # the least and largest are sought on variates 0.01 apart: good to about 0.01^2
        assert np.all(np.diff(limit) <= 1e-4 * limit[1:])
    one = np.array([law(shape).exceedance_interval(float(v)) for v in x[::70]])
    assert np.array_equal(one[:, 0], low[::70])
    assert np.array_equal(one[:, 1], high[::70])


def test_intervals_by_hand() -> None:
    """Gumbel, independent location and scale: error^2 = v_location + y^2 v_scale; over the scale for the variate."""
    y = -math.log(-math.log(0.99))
    error = math.sqrt(1e-4 + y * y * 6e-5)
    x = 0.5 + 0.1 * y
    low, high = law(0.0).quantile_interval(0.99)
    assert (low, high) == pytest.approx(
        (x * math.exp(-1.959964 * error / x), x * math.exp(1.959964 * error / x)), rel=1e-7
    )
    low, high = law(0.0).exceedance_interval(x)
    reach = 1.959964 * error / 0.1
    assert low == pytest.approx(-math.expm1(-math.exp(-y - reach)), rel=1e-6)
    assert high == pytest.approx(-math.expm1(-math.exp(-y + reach)), rel=1e-6)
    # a quantile below 0 has no logarithm
    low, high = law(0.0, location=-1.0).quantile_interval(0.99)
    assert (low, high) == pytest.approx((x - 1.5 - 1.959964 * error, x - 1.5 + 1.959964 * error), rel=1e-7)


def test_more_confidence_is_wider() -> None:
    found = fit(PEAKS, "gev")
    for method, at in ((found.quantile_interval, 0.99), (found.exceedance_interval, 0.9)):
        narrow, wide = method(at, 0.8), method(at, 0.99)
        assert wide[0] < narrow[0] < narrow[1] < wide[1]


def test_extrapolation_begins_beyond_the_sample() -> None:
    found = law(0.0, count=100)
    assert [found.extrapolates(p) for p in (0.5, 0.95, 0.99, 0.991, 0.999)] == [False, False, False, True, True]
    edge = found.quantile(0.99)
    assert not found.extrapolates_value(edge * (1.0 - 1e-9))
    assert found.extrapolates_value(edge * (1.0 + 1e-6))
    assert law(-0.2).extrapolates_value(1.2)


@pytest.mark.parametrize("family", ["gumbel", "gev"])
def test_covariance_of_groups_is_that_of_leaving_one_out(family) -> None:  # type: ignore[no-untyped-def]
    """The jackknife sum of squared changes with real refits.

    Second order in 1/groups: 12 % with 60 groups (computed), so about 3 % with 250.
    """
    rows = np.random.default_rng(4).gumbel(5.0, 1.0, size=(250, 2))
    whole = fit(rows, family)
    free = whole.covariance.shape[0]
    refits = [fit(np.delete(rows, i, axis=0), family) for i in range(250)]
    change = np.array([[f.location - whole.location, f.scale - whole.scale, f.shape - whole.shape] for f in refits])
    expected = np.sqrt(np.diag(change.T @ change))[:free]
    assert np.sqrt(np.diag(whole.covariance)) == pytest.approx(expected, rel=0.05)


def test_dependent_windows_widen_the_errors() -> None:
    """Every realisation's value written twice holds no more than once."""
    twice = np.stack([PEAKS, PEAKS], axis=1)
    single, double = fit(PEAKS, "gev"), fit(twice, "gev")
    assert (double.location, double.scale, double.shape) == pytest.approx(
        (single.location, single.scale, single.shape), abs=1e-9
    )
    # d = (2H - 2H_i)^-1 2 g_i: the doubling cancels
    scores, hessians = derivatives(PEAKS[:, None], np.tile([single.location, single.scale, single.shape], (120, 1)))
    d = np.linalg.solve(hessians.sum(axis=0) - hessians, scores)[..., 0]
    assert double.covariance == pytest.approx(d.T @ d, rel=1e-6)
    assert (double.count, double.groups) == (240, 120)
    assert "240 values in 120 independent groups" in double.text()
    naive = fit(twice.ravel(), "gev")
    assert np.all(np.diag(double.covariance) > 1.4 * np.diag(naive.covariance))


def test_groups_by_label_are_rows() -> None:
    rows = PEAKS.reshape(40, 3)
    order = np.random.default_rng(3).permutation(120)
    labels = np.repeat([f"realisation {i}" for i in range(40)], 3)[order]
    assert fit(rows.ravel()[order], "gev", groups=labels).covariance == pytest.approx(
        fit(rows, "gev").covariance, rel=1e-8
    )
    assert fit(PEAKS[:, None]).covariance == pytest.approx(fit(PEAKS).covariance, rel=1e-12)


def test_text_holds_parameters_and_errors() -> None:
    said = fit(PEAKS, "gev").text()
    assert said.startswith("Generalised extreme value law of maxima: location 0.")
    assert said.count("standard error") == 3
    assert said.endswith("fitted to 120 values.")
    assert fit(PEAKS).text().count("standard error") == 2


def test_no_standard_errors_where_the_theory_ends() -> None:
    """Triangular density falling to 0 at an end, bent so that the shape lies between -1 and -1/2 (about -0.7)."""
    u = (np.arange(400) + 0.5) / 400.0
    found = fit(1.0 - (-np.log(u)) ** 0.7, "gev")  # quantiles of a GEV law of shape -0.7
    assert -1.0 < found.shape < -0.5
    assert np.all(np.isnan(found.covariance))
    assert "no standard errors" in found.text()
    assert all(math.isnan(v) for v in found.quantile_interval(0.9))
    assert all(math.isnan(v) for v in found.exceedance_interval(0.9))


@pytest.mark.parametrize(
    ("values", "reason"),
    [
        (PEAKS[:9], "9 values are too few"),
        (PEAKS.reshape(2, 60), "2 independent groups"),
        (np.full(50, 0.3), "all 50 values are equal"),
        (0.3 * (1.0 + 1e-12 * np.arange(50)), "all 50 values are equal"),
        (np.append(PEAKS, [0.0, 0.0]), "2 of 122 values are exactly 0"),
        (np.append(PEAKS, np.nan), "1 of 121 values are not finite"),
        (np.append(PEAKS, np.inf), "1 of 121 values are not finite"),
        (PEAKS.reshape(10, 6, 2), "realisation, window"),
        (np.array([]), "0 values are too few"),
    ],
)
@pytest.mark.parametrize("family", ["gumbel", "gev"])
def test_what_cannot_be_fitted(values, reason: str, family) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(ValueError, match=reason):
        fit(values, family)


def test_values_crowding_at_a_bound_have_no_gev_law() -> None:
    """A density that grows without bound towards its end: shape below -1."""
    u = (np.arange(200) + 0.5) / 200.0
    with pytest.raises(ValueError, match="crowd against a bound"):
        fit(1.0 - (1.0 - u) ** 3, "gev")
    assert fit(1.0 - (1.0 - u) ** 3, "gumbel").scale > 0.0


def test_wrong_arguments() -> None:
    found = fit(PEAKS)
    with pytest.raises(ValueError, match="family"):
        fit(PEAKS, "weibull")  # type: ignore[arg-type]
    with pytest.raises(ValueError, match="groups"):
        fit(PEAKS, groups=[1, 2])
    with pytest.raises(ValueError, match="groups"):
        fit(PEAKS.reshape(60, 2), groups=np.arange(120))
    for p in (0.0, 1.0, -0.1, math.nan):
        with pytest.raises(ValueError, match="probability"):
            found.quantile(p)
    with pytest.raises(ValueError, match="confidence"):
        found.quantile_interval(0.9, confidence=95.0)
    with pytest.raises(ValueError, match="120 values, not of these 60"):
        goodness(found, PEAKS[:60])
    with pytest.raises(ValueError, match="120 groups of values, not of these 60"):
        goodness(found, PEAKS.reshape(60, 2))


def test_goodness_is_the_same_twice_and_takes_one_window_a_realisation() -> None:
    rows = PEAKS.reshape(60, 2)
    found = fit(rows)
    first, second = goodness(found, rows), goodness(found, rows)
    assert first == second
    assert (first.count, first.samples) == (60, 199)
    assert goodness(found, rows, seed=2) != first
    # a law is judged with the scale and place taken out
    moved = 7.0 + 3.0 * rows
    assert goodness(fit(moved), moved).statistic == pytest.approx(first.statistic, abs=1e-9)
