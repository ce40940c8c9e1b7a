"""Matched and plain Newmark members under a harmonic force: the formula, the stepping, the exact oscillator.

For any member with gamma = 1/2 a steady force of V = Omega dt gives, per unit mass, the acceleration

    1 / (1 - i C (dt/2)/tan(V/2) - K/B(V)),   B(V) = (2/dt^2) (1 - cos V)/(1 - 2 beta (1 - cos V)),

so K = B(W) and C = 2 zeta (2/dt) tan(W/2), W = omega dt, make the acceleration exact where V = W. Derived from the
member's two update formulas with u, v, a = turning vectors; written here anew, not taken from the program.
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim.dynamics.newmark import Newmark, acceleration_response, step_coefficients

MEMBERS = [0.0, 1.0 / 12.0, 1.0 / 6.0, 1.0 / 4.0]
FREQUENCY, DAMPING, STEP = 3.0, 0.02, 0.01
LOADS = np.array([0.4, 1.0, 1.7, 2.4, 2.9, 2.99, 3.0, 3.01, 3.1, 4.0, 6.0, 9.0, 15.0])


def spring(beta, angle, dt):
    """B of the formula above."""
    return 2.0 / dt**2 * (1.0 - np.cos(angle)) / (1.0 - 2.0 * beta * (1.0 - np.cos(angle)))


def by_formula(beta, matched, frequency, damping, loads, dt):
    w, v = 2.0 * np.pi * frequency * dt, 2.0 * np.pi * loads * dt
    stiffness, drag = (w / dt) ** 2, 2.0 * damping * w / dt
    if matched:
        stiffness, drag = spring(beta, w, dt), 2.0 * damping * 2.0 / dt * np.tan(w / 2.0)
    return 1.0 / (1.0 - 1j * drag * (dt / 2.0) / np.tan(v / 2.0) - stiffness / spring(beta, v, dt))


def by_stepping(scheme, frequency, damping, loads, dt, steps):
    """Acceleration over force after many steps of exp(i Omega t), all loads side by side."""
    c = step_coefficients(scheme, np.array([frequency]), np.array([damping]), np.array([1.0]), dt)[0]
    u = v = np.zeros(loads.size, dtype=complex)
    turn = np.exp(2j * np.pi * loads * dt)
    before = np.ones(loads.size, dtype=complex)
    for _ in range(steps):
        now = before * turn
        u, v = c[0] * u + c[1] * v + c[2] * before + c[3] * now, c[4] * u + c[5] * v + c[6] * before + c[7] * now
        before = now
    return (c[8] * before - c[9] * v - c[10] * u) / before


@pytest.mark.parametrize("matched", [True, False])
@pytest.mark.parametrize("beta", MEMBERS)
def test_stepped_steady_state(beta, matched):
    """Formula of this file, of the program, and 9000 steps: the swing from rest has decayed by exp(-34).

    Tolerance 1e-10: rounding of 9000 steps, 1e-16 x 9000 x the resonance of 25.
    """
    scheme = Newmark(beta, matched)
    formula = by_formula(beta, matched, FREQUENCY, DAMPING, LOADS, STEP)
    program = acceleration_response(scheme, FREQUENCY, DAMPING, LOADS, STEP)
    stepping = by_stepping(scheme, FREQUENCY, DAMPING, LOADS, STEP, 9000)
    np.testing.assert_allclose(program, formula, rtol=1e-11)
    np.testing.assert_allclose(stepping, formula, rtol=1e-10)


@pytest.mark.parametrize("beta", MEMBERS)
@pytest.mark.parametrize("damping", [0.002, 0.005, 0.02, 0.2])
@pytest.mark.parametrize("angle", [0.05, 0.3, 1.0, 1.9])
def test_resonant_acceleration_is_exact(beta, damping, angle):
    """At the mode's own frequency amplitude and phase are the oscillator's, i/(2 zeta), however coarse the step.

    Tolerance: the difference 1 - K/B cancels to rounding, 1e-15 over 2 zeta.
    """
    frequency = angle / (2.0 * np.pi * STEP)
    got = acceleration_response(Newmark(beta), frequency, damping, np.array([frequency]), STEP)[0]
    assert got == pytest.approx(0.5j / damping, rel=1e-12)
    exact = acceleration_response(None, frequency, damping, np.array([frequency]), STEP)[0]
    assert exact == pytest.approx(0.5j / damping, rel=1e-14)


@pytest.mark.parametrize("beta", MEMBERS)
def test_stepped_resonance_is_exact(beta):
    """The same by stepping, at W = 0.6; 1e-9 for 20 000 steps of rounding at a resonance of 100."""
    frequency = 0.6 / (2.0 * np.pi * STEP)
    got = by_stepping(Newmark(beta), frequency, 0.005, np.array([frequency]), STEP, 20_000)[0]
    assert got == pytest.approx(100j, rel=1e-9)


def test_the_plain_scheme_misses_the_resonance():
    """Average acceleration, plain, at W = 0.3 and 0.5 %: period error W^2/12 = 0.75 % is more than the damping.

    Its amplitude is 1/sqrt(1 + (0.0075/0.005)^2) = 0.55 of the exact one (textbook response near resonance, 2 % for
    the next order).
    """
    frequency = 0.3 / (2.0 * np.pi * STEP)
    got = abs(acceleration_response(Newmark(0.25, matched=False), frequency, 0.005, np.array([frequency]), STEP)[0])
    assert got / 100.0 == pytest.approx(1.0 / np.sqrt(1.0 + (0.3**2 / 12.0 / 0.005) ** 2), rel=0.02)


def test_the_exact_oscillator():
    """q'' of q'' + 2 zeta omega q' + omega^2 q = exp(i Omega t): -Omega^2 over the dynamic stiffness (textbook)."""
    omega, load = 2.0 * np.pi * FREQUENCY, 2.0 * np.pi * LOADS
    expected = -(load**2) / (omega**2 - load**2 + 2j * DAMPING * omega * load)
    np.testing.assert_allclose(acceleration_response(None, FREQUENCY, DAMPING, LOADS, STEP), expected, rtol=1e-12)


@pytest.mark.parametrize("beta", [0.0, 1.0 / 6.0, 1.0 / 4.0])
def test_error_beside_resonance(beta):
    """Stiffness against inertia errs by (beta - 1/12)(W^2 - V^2), relative, without damping.

    Read from the steady accelerations: 1 - 1/H is that ratio. 2 % for the next order at W = 0.2.
    """
    loads = np.array([1.5, 2.5, 4.0, 5.0])
    frequency = 0.2 / (2.0 * np.pi * STEP)
    numerical = acceleration_response(Newmark(beta), frequency, 0.0, loads, STEP)
    exact = acceleration_response(None, frequency, 0.0, loads, STEP)
    error = ((1.0 - 1.0 / numerical) / (1.0 - 1.0 / exact) - 1.0).real
    angles = 2.0 * np.pi * loads * STEP
    np.testing.assert_allclose(error, (beta - 1.0 / 12.0) * (0.2**2 - angles**2), rtol=0.02)


def test_fox_goodwin_beside_resonance_is_of_fourth_order():
    """beta = 1/12: what is left without damping is of the order W^4: (V^4 - W^4)/240, computed from B's series."""
    loads = np.array([1.5, 2.5, 4.0, 5.0])
    frequency = 0.2 / (2.0 * np.pi * STEP)
    numerical = acceleration_response(Newmark(), frequency, 0.0, loads, STEP)
    exact = acceleration_response(None, frequency, 0.0, loads, STEP)
    error = ((1.0 - 1.0 / numerical) / (1.0 - 1.0 / exact) - 1.0).real
    angles = 2.0 * np.pi * loads * STEP
    np.testing.assert_allclose(error, (angles**4 - 0.2**4) / 240.0, rtol=0.02)
