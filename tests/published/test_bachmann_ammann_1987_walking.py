"""Load factors of walking after Bachmann & Ammann 1987.

Source: H. Bachmann & W. Ammann, Vibrations in Structures Induced by Man and Machines, IABSE Structural Engineering
Documents 3e, 1987; values from memory, the range 1.6 to 2.4 Hz read in a text that quotes it.

Symbol map: F = G + dG1 sin(2 pi f t) + dG2 sin(4 pi f t - phi2) + dG3 sin(6 pi f t - phi3), phi2 = phi3 = pi/2;
dGk/G -> load factors, -phik -> phases (crowdsim adds its phases, the source takes its off).

Tolerance: the values are exact as they stand (rounding of the arithmetic).
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim import load_set

NAME = "bachmann-ammann-1987"
ROUNDING = 1e-12


@pytest.mark.parametrize(("pace", "first"), [(2.0, 0.4), (2.4, 0.5)])
def test_first_factor(pace, first):
    """0.4 at 2.0 Hz, 0.5 at 2.4 Hz: from memory."""
    assert load_set("walking", NAME).factors(np.array([pace]))[0, 0] == pytest.approx(first, rel=ROUNDING)


@pytest.mark.parametrize(("pace", "first"), [(1.6, 0.4), (1.8, 0.4), (2.2, 0.45)])
def test_first_factor_between_and_below(pace, first):
    """Straight between the two values, held at the lower one below 2.0 Hz (the program's choice): computed."""
    assert load_set("walking", NAME).factors(np.array([pace]))[0, 0] == pytest.approx(first, rel=ROUNDING)


@pytest.mark.parametrize("pace", [1.6, 2.0, 2.4])
def test_second_and_third_factor(pace):
    """0.1 each near 2 Hz: from memory; held over the range by the program."""
    np.testing.assert_allclose(load_set("walking", NAME).factors(np.array([pace]))[0, 1:], [0.1, 0.1], rtol=ROUNDING)


@pytest.mark.parametrize(("pace", "limit"), [(1.2, 1.6), (1.59, 1.6), (2.41, 2.4), (3.0, 2.4)])
def test_held_outside_the_range(pace, limit):
    """Outside 1.6 to 2.4 Hz the factors are those at the limit (the program's choice)."""
    chosen = load_set("walking", NAME)
    np.testing.assert_array_equal(chosen.factors(np.array([pace])), chosen.factors(np.array([limit])))


def test_phases_and_shape():
    """Second and third harmonic lag a quarter turn: F/G - 1 at whole and half steps, by hand.

    At t = 0: 0.4 x 0 - 0.1 - 0.1; a quarter step on: 0.4 x 1 + 0.1 + 0; half a step on: 0 - 0.1 + 0.1.
    """
    factors, phases = load_set("walking", NAME).draw(
        np.array([2.0]), np.random.default_rng(0), np.random.default_rng(1000)
    )
    np.testing.assert_allclose(phases[0], [0.0, -np.pi / 2, -np.pi / 2], rtol=ROUNDING)
    theta = np.array([0.0, 0.5 * np.pi, np.pi])
    force = sum(a * np.sin(k * theta + p) for k, (a, p) in enumerate(zip(factors[0], phases[0], strict=True), start=1))
    np.testing.assert_allclose(force, [-0.2, 0.5, 0.0], atol=ROUNDING)


def test_no_scatter():
    """The source gives none."""
    with pytest.raises(ValueError, match="no scatter"):
        load_set("walking", NAME, scatter=True)
