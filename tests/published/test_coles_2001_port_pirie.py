"""Annual maximum sea levels at Port Pirie, 1923-1987: GEV and Gumbel fits against a textbook and a general library.

Source: S. Coles, An Introduction to Statistical Modeling of Extreme Values, Springer, 2001, section 3.4.1 (section and
years from memory). The 65 levels [m] and the estimates to eight decimals were read in a text that quotes them;
log-likelihoods, covariance and return levels are from memory.

Symbol map: mu, sigma, xi -> location, scale, shape; z_p -> quantile(1 - p).

Independent library: scipy.stats (gumbel_r; genextreme, whose shape is c = -xi).
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import optimize, stats

from crowdsim.response.extremes import fit, goodness

LEVELS = np.array(
    [
        *(4.03, 3.83, 3.65, 3.88, 4.01, 4.08, 4.18, 3.80, 4.36, 3.96, 3.98, 4.69, 3.85, 3.96, 3.85, 3.93, 3.75, 3.63),
        *(3.57, 4.25, 3.97, 4.05, 4.24, 4.22, 3.73, 4.37, 4.06, 3.71, 3.96, 4.06, 4.55, 3.79, 3.89, 4.11, 3.85, 3.86),
        *(3.86, 4.21, 4.01, 4.11, 4.24, 3.96, 4.21, 3.74, 3.85, 3.88, 3.66, 4.11, 3.71, 4.18, 3.90, 3.78, 3.91, 3.72),
        *(4.00, 3.66, 3.62, 4.33, 4.55, 3.75, 4.08, 3.90, 3.88, 3.94, 4.33),
    ]
)


def test_gev_estimates() -> None:
    """The quoted optimiser stops 2e-5 in xi, 2e-4 of a standard error, short of the maximum; hence 3e-5."""
    law = fit(LEVELS, "gev")
    assert (law.location, law.scale, law.shape) == pytest.approx((3.87474692, 0.19804120, -0.05008773), abs=3e-5)
    quoted = -float(stats.genextreme.logpdf(LEVELS, 0.05008773, 3.87474692, 0.19804120).sum())
    assert 0.0 <= law.log_likelihood + quoted < 1e-6  # ours is no lower than at the quoted estimates


def test_gev_likelihood_and_errors() -> None:
    """Half a unit of the last printed digit (from memory)."""
    law = fit(LEVELS, "gev")
    assert law.log_likelihood == pytest.approx(4.34, abs=0.005)
    assert np.sqrt(np.diag(law.covariance)) == pytest.approx([0.028, 0.020, 0.098], abs=0.0005)
    assert law.covariance[np.triu_indices(3)] == pytest.approx(
        [0.000780, 0.000197, -0.00107, 0.000410, -0.000778, 0.00965], abs=5.1e-6
    )


@pytest.mark.parametrize(
    ("years", "level", "low", "high"), [(10, 4.30, 4.19, 4.41), (100, 4.69, 4.38, 5.00)], ids=["10", "100"]
)
def test_gev_return_levels(years: int, level: float, low: float, high: float) -> None:
    """Levels to the printed digit (from memory).

    The book's intervals (from memory) are level +- 1.96 errors; ours are level x exp(+- 1.96 errors/level), which lies
    above by level (1.96 error/level)^2/2, 0.01 m for 100 years. Their half-width on the logarithm is compared.
    """
    law = fit(LEVELS, "gev")
    p = 1.0 - 1.0 / years
    assert law.quantile(p) == pytest.approx(level, abs=0.005)
    found = law.quantile_interval(p)
    reach = 0.5 * (high - low) / level
    assert np.log(np.array(found) / law.quantile(p)) == pytest.approx([-reach, reach], abs=0.0075 / level)


def test_gumbel_estimates() -> None:
    """Location 3.87, scale 0.195, log-likelihood 4.22 (from memory): half a unit of the last digit."""
    law = fit(LEVELS, "gumbel")
    assert law.location == pytest.approx(3.87, abs=0.005)
    assert law.scale == pytest.approx(0.195, abs=0.0005)
    assert law.log_likelihood == pytest.approx(4.22, abs=0.005)
    assert law.shape == 0.0


def test_gumbel_against_a_library() -> None:
    """scipy solves the same likelihood equations to about 1e-12."""
    law = fit(LEVELS, "gumbel")
    location, scale = stats.gumbel_r.fit(LEVELS)
    assert (law.location, law.scale) == pytest.approx((location, scale), rel=1e-9)
    there = stats.gumbel_r(location, scale)
    assert law.log_likelihood == pytest.approx(there.logpdf(LEVELS).sum(), rel=1e-10)
    levels = np.linspace(3.2, 6.0, 15)
    assert law.cumulative(levels) == pytest.approx(there.cdf(levels), rel=1e-7)  # d ln F = 30 dz at the lowest level
    assert law.exceedance(levels) == pytest.approx(there.sf(levels), rel=1e-7)
    assert law.quantile(np.array([0.01, 0.5, 0.999])) == pytest.approx(there.ppf([0.01, 0.5, 0.999]), rel=1e-9)


def test_gev_against_a_library() -> None:
    """scipy's own maximum by a simplex polished here: parameters to 1e-5, a simplex's error; functions to rounding."""
    law = fit(LEVELS, "gev")

    def minus(q: np.ndarray) -> float:
        return -float(stats.genextreme.logpdf(LEVELS, -q[2], q[0], q[1]).sum())

    best = optimize.minimize(minus, [3.9, 0.2, 0.0], method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-13})
    assert (law.location, law.scale, law.shape) == pytest.approx(best.x, abs=1e-5)
    assert law.log_likelihood == pytest.approx(-best.fun, abs=1e-9)
    there = stats.genextreme(-law.shape, law.location, law.scale)
    levels = np.linspace(3.2, 7.5, 15)
    assert law.cumulative(levels) == pytest.approx(there.cdf(levels), rel=1e-9)
    assert law.quantile(np.array([0.01, 0.5, 0.999])) == pytest.approx(there.ppf([0.01, 0.5, 0.999]), rel=1e-12)


@pytest.mark.parametrize("family", ["gumbel", "gev"])
def test_the_fit_is_good(family) -> None:  # type: ignore[no-untyped-def]
    """The book judges both good by eye: no published number; A^2 against scipy's sum of the same definition."""
    law = fit(LEVELS, family)
    found = goodness(law, LEVELS)
    there = stats.genextreme(-law.shape, law.location, law.scale)
    x = np.sort(LEVELS)
    weight = (2.0 * np.arange(1, 66) - 1.0) / 65.0
    assert found.statistic == pytest.approx(-65.0 - np.sum(weight * (there.logcdf(x) + there.logsf(x[::-1]))), abs=1e-8)
    assert found.p_value > 0.5
    assert found.correlation > 0.99
