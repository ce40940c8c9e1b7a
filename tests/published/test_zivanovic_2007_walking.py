"""Load factors of walking after Zivanovic, Pavic & Reynolds 2007, with their scatter.

Source: S. Zivanovic, A. Pavic & P. Reynolds, Probability-based prediction of multi-mode vibration response to walking
excitation, Engineering Structures 29, 2007, 942-954; from memory. First factor: normal about Kerr's polynomial with
16 %; factors 2 to 5: normal, means 0.07, 0.05, 0.05, 0.03, standard deviations 0.030, 0.020, 0.020, 0.015.
Sub-harmonics and the narrow band about each harmonic are left out by the set, which says so.

Symbol map: DLF_i -> load factor of harmonic i, f_p -> pace. Table of the first factor computed from Kerr's polynomial.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import truncnorm

from crowdsim import load_set

NAME = "zivanovic-2007"
MEANS, DEVIATIONS = (0.07, 0.05, 0.05, 0.03), (0.030, 0.020, 0.020, 0.015)


@pytest.mark.parametrize(("pace", "first"), [(1.6, 0.241), (1.8, 0.328), (2.0, 0.405), (2.2, 0.461), (2.4, 0.483)])
def test_mean_of_the_first_factor(pace, first):
    """Computed, three decimals; half a unit."""
    assert load_set("walking", NAME).factors(np.array([pace]))[0, 0] == pytest.approx(first, abs=0.5e-3)


@pytest.mark.parametrize("pace", [1.3, 1.87, 2.5])
def test_means_and_deviations_of_the_others(pace):
    """From memory, exact, at any pace; the first deviates by 16 %."""
    chosen = load_set("walking", NAME)
    assert chosen.spread is not None
    mean, spread = chosen.factors(np.array([pace]))[0], chosen.spread(np.array([pace]))[0]
    np.testing.assert_array_equal(mean[1:], MEANS)
    np.testing.assert_array_equal(spread[1:], DEVIATIONS)
    assert spread[0] == pytest.approx(0.16 * mean[0], rel=1e-12)


@pytest.mark.parametrize(("pace", "limit"), [(1.0, 1.2), (3.0, 2.6)])
def test_held_outside_the_range(pace, limit):
    """1.2 to 2.6 Hz, for mean and scatter alike: the same random numbers give the same factors."""
    chosen = load_set("walking", NAME)
    out = chosen.draw(np.full(20, pace), np.random.default_rng(3), np.random.default_rng(1000))[0]
    np.testing.assert_array_equal(
        out, chosen.draw(np.full(20, limit), np.random.default_rng(3), np.random.default_rng(1000))[0]
    )


def test_scatter_by_default():
    """Every person has factors of their own: the moments of normal laws, a negative factor drawn again.

    The cut at nought (2 to 2.5 deviations below the mean) by scipy's truncated normal law. 20 000 persons, four
    standard errors of each of ten moments: a false alarm in 1 of 1600; the seed is fixed.
    """
    count, pace = 20_000, 1.9
    factors, phases = load_set("walking", NAME).draw(
        np.full(count, pace), np.random.default_rng(2007), np.random.default_rng(1000)
    )
    first = load_set("walking", "kerr-1998").factors(np.array([pace]))[0, 0]
    assert factors.min() > 0.0
    for k, (mean, sd) in enumerate(zip((first, *MEANS), (0.16 * first, *DEVIATIONS), strict=True)):
        law = truncnorm(-mean / sd, np.inf, loc=mean, scale=sd)
        kurtosis = float(law.stats(moments="k"))
        assert abs(factors[:, k].mean() - law.mean()) < 4.0 * law.std() / np.sqrt(count)
        assert abs(factors[:, k].std() - law.std()) < 4.0 * law.std() * np.sqrt((kurtosis + 2.0) / (4.0 * count))
    assert phases.shape == (count, 5)
    assert count * np.abs(np.exp(1j * phases).mean(axis=0)).max() ** 2 < 12.0  # uniform over a turn: 1 in 30 000


def test_without_scatter_on_wish():
    """The means."""
    chosen = load_set("walking", NAME, scatter=False)
    factors, _ = chosen.draw(np.full(5, 2.0), np.random.default_rng(0), np.random.default_rng(1000))
    np.testing.assert_array_equal(factors, chosen.factors(np.full(5, 2.0)))


def test_a_persons_draw_does_not_depend_on_the_others():
    """The first ten of a hundred are the ten alone."""
    chosen = load_set("walking", NAME)
    many = chosen.draw(np.full(100, 1.9), np.random.default_rng(9), np.random.default_rng(1000))
    few = chosen.draw(np.full(10, 1.9), np.random.default_rng(9), np.random.default_rng(1000))
    np.testing.assert_array_equal(many[0][:10], few[0])
    np.testing.assert_array_equal(many[1][:10], few[1])
