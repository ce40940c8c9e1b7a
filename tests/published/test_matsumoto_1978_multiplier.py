"""Matsumoto's multiplier of one walker's response, sqrt(lambda T0).

Matsumoto, Nishioka, Shiojiri & Matsuzaki, Dynamic design of footbridges, IABSE Proceedings P-17/78, 1978, from memory:
lambda arrivals per second, T0 crossing time, lambda T0 = n persons on the deck on average.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from crowdsim.guides.matsumoto_1978 import multiplier


@pytest.mark.parametrize(
    ("arrivals", "crossing", "expected"),
    [(0.5, 32.0, 4.0), (1.0, 36.0, 6.0), (0.0, 30.0, 0.0), (1.0 / 30.0, 30.0, 1.0)],  # the law from memory, by hand
)
def test_law(arrivals, crossing, expected):
    """Rounding only."""
    assert multiplier(arrivals * crossing) == pytest.approx(expected, rel=1e-12)


def test_root_mean_square_of_random_phases():
    """n equal harmonics of random phase: the root mean square of the resultant is sqrt(n) that of one.

    20 000 draws of a Poisson number with mean n = 16. The square of the resultant has mean n and variance n^2 + n, so a
    standard error of 0.73 %; three of them, 0.27 % false alarm; the seed is fixed.
    """
    persons, draws = 16.0, 20_000
    generator = np.random.default_rng(1978)
    numbers = generator.poisson(persons, draws)
    owner = np.repeat(np.arange(draws), numbers)
    swing = np.exp(2j * math.pi * generator.random(owner.size))
    resultant = np.bincount(owner, swing.real, draws) + 1j * np.bincount(owner, swing.imag, draws)
    mean_square = float(np.mean(np.abs(resultant) ** 2))
    error = math.sqrt((persons**2 + persons) / draws) / persons
    assert abs(mean_square / multiplier(persons) ** 2 - 1.0) < 3.0 * error


@pytest.mark.parametrize("persons", [-1.0, math.nan, math.inf])
def test_what_cannot_be(persons):
    with pytest.raises(ValueError, match="persons must not be below 0"):
        multiplier(persons)
