"""Load factors of walking after Young 2001, mean and design values.

Source: P. Young, Improved floor vibration prediction methodologies, ARUP Vibration Seminar, 2001; design values (25 %
chance of exceedance) also in CCIP-016, A design guide for footfall induced vibration of structures, 2006. From memory:

    mean    0.37 (f - 0.95) <= 0.50   0.054 + 0.0044 f   0.026 + 0.0050 f   0.010 + 0.0051 f
    design  0.41 (f - 0.95) <= 0.56   0.069 + 0.0056 f   0.033 + 0.0064 f   0.013 + 0.0065 f

where f is each harmonic's own frequency (1 to 2.8, 2 to 5.6, 3 to 8.4, 4 to 11.2 Hz); coefficients of variation 0.17,
0.40, 0.40, 0.40 about the mean.

Symbol map: f = k x pace for harmonic k. Tables at given paces are computed from these laws.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import truncnorm

from crowdsim import load_set

MEAN, DESIGN = "young-2001-mean", "young-2001-design"

# set, harmonic, its own frequency [Hz], factor: the laws from memory, evaluated at the ends of their ranges
LAWS = [
    (MEAN, 1, 1.0, 0.0185), (MEAN, 1, 1.95, 0.37), (MEAN, 1, 2.8, 0.50),
    (MEAN, 2, 2.0, 0.0628), (MEAN, 2, 5.6, 0.07864),
    (MEAN, 3, 3.0, 0.041), (MEAN, 3, 8.4, 0.068),
    (MEAN, 4, 4.0, 0.0304), (MEAN, 4, 11.2, 0.06712),
    (DESIGN, 1, 1.0, 0.0205), (DESIGN, 1, 1.95, 0.41), (DESIGN, 1, 2.8, 0.56),
    (DESIGN, 2, 2.0, 0.0802), (DESIGN, 2, 5.6, 0.10036),
    (DESIGN, 3, 3.0, 0.0522), (DESIGN, 3, 8.4, 0.08676),
    (DESIGN, 4, 4.0, 0.039), (DESIGN, 4, 11.2, 0.0858),
]  # fmt: skip


@pytest.mark.parametrize(("name", "harmonic", "frequency", "factor"), LAWS)
def test_laws(name, harmonic, frequency, factor):
    """Exact numbers: rounding only."""
    got = load_set("walking", name).factors(np.array([frequency / harmonic]))[0, harmonic - 1]
    assert got == pytest.approx(factor, rel=1e-12)


# pace, mean, design: computed, three decimals
@pytest.mark.parametrize(
    ("pace", "mean", "design"),
    [(1.6, 0.241, 0.267), (1.8, 0.315, 0.349), (2.0, 0.389, 0.431), (2.2, 0.463, 0.513), (2.4, 0.500, 0.560)],
)
def test_first_factor(pace, mean, design):
    """Half a unit of the third decimal (0.3885 and 0.4305 at 2 Hz lie on the edge of one)."""
    for name, value in ((MEAN, mean), (DESIGN, design)):
        assert load_set("walking", name).factors(np.array([pace]))[0, 0] == pytest.approx(value, abs=0.5001e-3)


@pytest.mark.parametrize(("name", "row"), [(MEAN, (0.0716, 0.0560, 0.0508)), (DESIGN, (0.0914, 0.0714, 0.0650))])
def test_higher_factors_at_two_hertz(name, row):
    """Computed, four decimals; half a unit."""
    np.testing.assert_allclose(load_set("walking", name).factors(np.array([2.0]))[0, 1:], row, atol=0.5e-4)


@pytest.mark.parametrize("name", [MEAN, DESIGN])
@pytest.mark.parametrize(("pace", "limit"), [(0.8, 1.0), (2.9, 2.8), (4.0, 2.8)])
def test_held_outside_the_range(name, pace, limit):
    """1 to 2.8 Hz."""
    chosen = load_set("walking", name)
    np.testing.assert_array_equal(chosen.factors(np.array([pace])), chosen.factors(np.array([limit])))


def test_scatter():
    """Coefficients of variation 0.17, 0.40, 0.40, 0.40 about the mean; a negative factor is drawn again.

    Moments of the normal law cut off at nought (2.5 deviations below the mean for 0.40) by scipy; 20 000 persons,
    four standard errors of each of eight moments: a false alarm in 1 of 2000; the seed is fixed.
    """
    count, pace = 20_000, 2.1
    factors, _ = load_set("walking", MEAN, scatter=True).draw(
        np.full(count, pace), np.random.default_rng(2001), np.random.default_rng(1000)
    )
    mean = load_set("walking", MEAN).factors(np.array([pace]))[0]
    assert factors.min() > 0.0
    for k, variation in enumerate((0.17, 0.40, 0.40, 0.40)):
        law = truncnorm(-1.0 / variation, np.inf, loc=mean[k], scale=variation * mean[k])
        kurtosis = float(law.stats(moments="k"))
        assert abs(factors[:, k].mean() - law.mean()) < 4.0 * law.std() / np.sqrt(count)
        assert abs(factors[:, k].std() - law.std()) < 4.0 * law.std() * np.sqrt((kurtosis + 2.0) / (4.0 * count))
    correlation = np.corrcoef(factors.T) - np.eye(4)
    assert np.abs(correlation).max() < 4.0 / np.sqrt(count)  # six pairs: 1 in 2600


def test_design_values_are_a_quarter_exceeded_by_the_scattered_mean():
    """Consistency within the source: 0.37 x (1 + 0.674 x 0.17) = 0.412 against 0.41; 25 % chance of exceedance.

    Computed; the two laws are rounded to two figures, hence 1.5 %.
    """
    chosen = load_set("walking", MEAN, scatter=True)
    assert chosen.spread is not None
    pace = np.array([1.9])
    quartile = chosen.factors(pace)[0] + 0.6745 * chosen.spread(pace)[0]
    design = load_set("walking", DESIGN).factors(pace)[0]
    np.testing.assert_allclose(quartile, design, rtol=0.015)


def test_the_design_set_has_no_scatter():
    """Its factors are a quantile already."""
    with pytest.raises(ValueError, match="no scatter"):
        load_set("walking", DESIGN, scatter=True)
