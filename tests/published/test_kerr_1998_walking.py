"""Load factors of walking after Kerr 1998.

Source: S. C. Kerr, Human induced loading on staircases, PhD thesis, University College London, 1998 (40 people, about
1000 records); values from memory: a1 = -0.2649 f^3 + 1.3206 f^2 - 1.7597 f + 0.7613, a2 about 0.07, a3 about 0.05,
f 1 to 3 Hz; 95 % of a1 within 32 % of the mean, a standard deviation of 16 %.

Symbol map: f -> pace, DLF -> load factor. The table of a1 is computed from the polynomial.
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim import load_set

NAME = "kerr-1998"


# f, a1: computed, three decimals
@pytest.mark.parametrize(("pace", "first"), [(1.6, 0.241), (1.8, 0.328), (2.0, 0.405), (2.2, 0.461), (2.4, 0.483)])
def test_first_factor(pace, first):
    """Half a unit of the third decimal."""
    assert load_set("walking", NAME).factors(np.array([pace]))[0, 0] == pytest.approx(first, abs=0.5e-3)


def test_coefficients():
    """The four coefficients from memory, recovered from four paces: exact but for the rounding of the solution."""
    pace = np.array([1.0, 1.5, 2.2, 3.0])
    first = load_set("walking", NAME).factors(pace)[:, 0]
    np.testing.assert_allclose(np.polyfit(pace, first, 3), [-0.2649, 1.3206, -1.7597, 0.7613], atol=1e-10)


@pytest.mark.parametrize("pace", [1.0, 2.0, 3.0])
def test_second_and_third_factor(pace):
    """0.07 and 0.05, from memory."""
    np.testing.assert_array_equal(load_set("walking", NAME).factors(np.array([pace]))[0, 1:], [0.07, 0.05])


@pytest.mark.parametrize(("pace", "limit"), [(0.7, 1.0), (3.3, 3.0)])
def test_held_outside_the_range(pace, limit):
    """1 to 3 Hz."""
    chosen = load_set("walking", NAME)
    np.testing.assert_array_equal(chosen.factors(np.array([pace])), chosen.factors(np.array([limit])))


def test_scatter_of_the_first_factor():
    """Standard deviation 16 % of the mean at the person's pace; 95 % within 32 %. The others do not scatter.

    20 000 persons: standard errors 0.16/sqrt(n) of the mean, 0.16/sqrt(2n) of the deviation, sqrt(0.95 0.05/n) of the
    share within 1.96 deviations. Four of each: a false alarm in 1 of 5000 for the three together; the seed is fixed.
    """
    count = 20_000
    pace = np.linspace(1.5, 2.5, count)
    chosen = load_set("walking", NAME, scatter=True)
    factors, phases = chosen.draw(pace, np.random.default_rng(1998), np.random.default_rng(1000))
    ratio = factors[:, 0] / load_set("walking", NAME).factors(pace)[:, 0]
    assert abs(ratio.mean() - 1.0) < 4.0 * 0.16 / np.sqrt(count)
    assert abs(ratio.std() - 0.16) < 4.0 * 0.16 / np.sqrt(2 * count)
    assert abs(np.mean(np.abs(ratio - 1.0) < 1.96 * 0.16) - 0.95) < 4.0 * np.sqrt(0.95 * 0.05 / count)
    assert np.ptp(factors[:, 1]) == np.ptp(factors[:, 2]) == 0.0
    assert phases.shape == (count, 3)


def test_without_scatter_by_default():
    """Everybody at the same pace has the same factors."""
    factors, _ = load_set("walking", NAME).draw(np.full(50, 1.9), np.random.default_rng(0), np.random.default_rng(1000))
    assert np.ptp(factors, axis=0).max() == 0.0


def test_phases_are_uniform():
    """The source gives none: each harmonic's phase uniform over a turn, independent of the others.

    |mean of exp(i phase)|^2 x n is exponential with mean 1: above 12 with probability 6e-6, for six combinations 4e-5.
    """
    count = 20_000
    _, phases = load_set("walking", NAME).draw(
        np.full(count, 2.0), np.random.default_rng(5), np.random.default_rng(1000)
    )
    assert phases.min() >= 0.0
    assert phases.max() < 2.0 * np.pi
    one, two, three = phases.T
    for combined in (one, two, three, one - two, one - three, two - three):
        assert count * abs(np.exp(1j * combined).mean()) ** 2 < 12.0
