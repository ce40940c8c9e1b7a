"""Load factors of running after Bachmann et al. 1995.

Source: H. Bachmann et al., Vibration Problems in Structures: Practical Guidelines, Birkhaeuser, 1995; from memory: 1.6,
0.7, 0.2 for 2.0 to 3.0 Hz.

Symbol map: alpha_k -> load factor of harmonic k. Exact numbers; tolerance: none needed.
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim import load_set

NAME = "bachmann-1995"


@pytest.mark.parametrize("pace", [2.0, 2.5, 3.0])
def test_factors(pace):
    """From memory."""
    np.testing.assert_array_equal(load_set("jogging", NAME).factors(np.array([pace]))[0], [1.6, 0.7, 0.2])


@pytest.mark.parametrize(("pace", "held"), [(1.7, 2.0), (2.5, 2.5), (3.6, 3.0)])
def test_range(pace, held):
    """2.0 to 3.0 Hz; constant there, and held beyond."""
    chosen = load_set("jogging", NAME)
    assert chosen.held(np.array([pace]))[0] == held
    np.testing.assert_array_equal(chosen.factors(np.array([pace]))[0], [1.6, 0.7, 0.2])


def test_a_pulse_of_half_a_step_has_nearly_these_factors():
    """Consistency between sources (computed): half-sine pulses of contact ratio 0.5 give 1.571, 0.667, 0.

    The guide's numbers are rounded up to one decimal: within 0.05, the third (0.2) being above the pulse's.
    """
    pulse = load_set("jogging", "half-sine", contact_ratio=0.5).factors(np.array([2.5]))[0]
    np.testing.assert_allclose(pulse[:2], [1.6, 0.7], atol=0.05)
    assert pulse[2] < 0.2


def test_it_belongs_to_jogging_and_does_not_scatter():
    """No walking set of this name; the source gives no scatter."""
    with pytest.raises(KeyError):
        load_set("walking", NAME)
    with pytest.raises(ValueError, match="no scatter"):
        load_set("jogging", NAME, scatter=True)
