"""Load factors of walking and running after ISO 10137:2007.

Source: ISO 10137:2007, Bases for design of structures - Serviceability of buildings and walkways against vibrations,
Annex A; from memory. Walking, vertical: 0.37 (f - 1.0) for 1.2 to 2.4 Hz; 0.1; 0.06, 0.06, 0.06. Running, vertical: 1.4
(2 to 4 Hz), 0.4, 0.1.

Symbol map: alpha_n,v -> load factor of harmonic n, f -> pace. The table of the first walking factor is computed.
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim import load_set

NAME = "iso-10137-2007"


# pace, a1: computed from the law, three decimals
@pytest.mark.parametrize(("pace", "first"), [(1.6, 0.222), (1.8, 0.296), (2.0, 0.370), (2.2, 0.444), (2.4, 0.518)])
def test_first_factor_of_walking(pace, first):
    """Exact at three decimals: rounding only."""
    assert load_set("walking", NAME).factors(np.array([pace]))[0, 0] == pytest.approx(first, rel=1e-12)


@pytest.mark.parametrize("pace", [1.2, 2.0, 2.4])
def test_higher_factors_of_walking(pace):
    """0.1, 0.06, 0.06, 0.06: from memory, exact."""
    np.testing.assert_array_equal(load_set("walking", NAME).factors(np.array([pace]))[0, 1:], [0.1, 0.06, 0.06, 0.06])


@pytest.mark.parametrize("pace", [2.0, 2.7, 4.0])
def test_factors_of_running(pace):
    """1.4, 0.4, 0.1: from memory, exact."""
    np.testing.assert_array_equal(load_set("jogging", NAME).factors(np.array([pace]))[0], [1.4, 0.4, 0.1])


@pytest.mark.parametrize(("pace", "limit"), [(1.0, 1.2), (1.19, 1.2), (2.5, 2.4)])
def test_walking_held_outside_the_range(pace, limit):
    """1.2 to 2.4 Hz: at 1 Hz the law itself would be nought."""
    chosen = load_set("walking", NAME)
    np.testing.assert_array_equal(chosen.factors(np.array([pace])), chosen.factors(np.array([limit])))


@pytest.mark.parametrize(("gait", "limits"), [("walking", (1.2, 2.4)), ("jogging", (2.0, 4.0))])
def test_ranges(gait, limits):
    """As the source has them, and no scatter."""
    chosen = load_set(gait, NAME)
    assert chosen.pace_range == limits
    np.testing.assert_array_equal(chosen.held(np.array([0.5, 6.0])), limits)
    with pytest.raises(ValueError, match="no scatter"):
        load_set(gait, NAME, scatter=True)


@pytest.mark.parametrize(("gait", "harmonics"), [("walking", 5), ("jogging", 3)])
def test_phases_are_drawn(gait, harmonics):
    """The source gives none: every harmonic of every person has its own, within a turn, none twice."""
    _, phases = load_set(gait, NAME).draw(np.full(200, 2.2), np.random.default_rng(1), np.random.default_rng(1000))
    assert phases.shape == (200, harmonics)
    assert np.unique(phases).size == 200 * harmonics
    assert 0.0 <= phases.min() < 0.1
    assert 6.2 < phases.max() < 2.0 * np.pi
