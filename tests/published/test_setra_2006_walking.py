"""Load factors of walking after the French footbridge guide.

Source: Setra/AFGC, Footbridges: assessment of vibrational behaviour of footbridges under pedestrian loading, October
2006; from memory: 0.4, 0.1, 0.1 of G0 = 700 N, second and third harmonic about a quarter turn behind.

Symbol map: F = G0 + G1 sin(2 pi f t) + sum G_i sin(2 pi i f t - phi_i); G_i/G0 -> load factors, -phi_i -> phases.
Exact numbers; tolerance: rounding.
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim import load_set

NAME = "setra-2006"


@pytest.mark.parametrize("pace", [1.6, 2.0, 2.4])
def test_factors(pace):
    """At every pace; 0.4 x 700 N = 280 N, the guide's vertical amplitude (from memory)."""
    factors = load_set("walking", NAME).factors(np.array([pace]))[0]
    np.testing.assert_array_equal(factors, [0.4, 0.1, 0.1])
    assert 700.0 * factors[0] == pytest.approx(280.0, rel=1e-12)


def test_phases():
    """0, -pi/2, -pi/2: the same for everybody."""
    _, phases = load_set("walking", NAME).draw(
        np.array([1.8, 2.2]), np.random.default_rng(0), np.random.default_rng(1000)
    )
    np.testing.assert_allclose(phases, [[0.0, -np.pi / 2, -np.pi / 2]] * 2, rtol=1e-12)


@pytest.mark.parametrize(("pace", "held"), [(1.0, 1.6), (2.0, 2.0), (3.0, 2.4)])
def test_range(pace, held):
    """1.6 to 2.4 Hz (the program's reading: the guide's range of walking); constant, so held trivially."""
    chosen = load_set("walking", NAME)
    assert chosen.held(np.array([pace]))[0] == held
    np.testing.assert_array_equal(chosen.factors(np.array([pace]))[0], [0.4, 0.1, 0.1])


def test_no_scatter():
    """The guide gives none."""
    with pytest.raises(ValueError, match="no scatter"):
        load_set("walking", NAME, scatter=True)
