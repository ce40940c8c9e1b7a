"""Newmark members with gamma = 1/2: order, period error, stability, energy.

Textbook properties of the plain members (Newmark 1959; Hughes, The Finite Element Method, 1987, from memory): second
order, fourth for beta = 1/12 without damping; relative period error (omega dt)^2 (beta - 1/12)/2; limit of a stable
step 1/sqrt(1/4 - beta); no loss and no gain of energy without damping at beta = 1/4. The fourth-order constant -W^4/480
of beta = 1/12 and its fall to second order with damping are computed.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from crowdsim.dynamics.newmark import MEMBERS, Newmark, step_coefficients

CENTRAL, FOX_GOODWIN, LINEAR, AVERAGE = 0.0, 1.0 / 12.0, 1.0 / 6.0, 1.0 / 4.0


def one_mode(scheme, frequency, damping, dt, mass=1.0):
    """The eleven numbers of a step of one mode."""
    return step_coefficients(scheme, np.array([frequency]), np.array([damping]), np.array([mass]), dt)[0]


def stepped(coefficients, force, u=0.0, v=0.0):
    """Displacement, velocity and acceleration at every step of a force given at every step."""
    c = coefficients
    rows = [(u, v, c[8] * force[0] - c[9] * v - c[10] * u)]
    for before, now in itertools.pairwise(force):
        u, v = c[0] * u + c[1] * v + c[2] * before + c[3] * now, c[4] * u + c[5] * v + c[6] * before + c[7] * now
        rows.append((u, v, c[8] * now - c[9] * v - c[10] * u))
    return np.array(rows)


def test_members_by_name():
    """Names of the scenario and their beta (textbook)."""
    assert MEMBERS == {"fox-goodwin": FOX_GOODWIN, "linear-acceleration": LINEAR, "average-acceleration": AVERAGE}
    assert Newmark.named("linear-acceleration", matched=False) == Newmark(LINEAR, matched=False)
    assert Newmark() == Newmark(FOX_GOODWIN, matched=True)


def exact_forced(time, omega, zeta, load, u0, v0):
    """Displacement under cos(load t) per unit mass from (u0, v0): textbook."""
    steady = 1.0 / (omega**2 - load**2 + 2j * zeta * omega * load)
    root = complex(-zeta * omega, omega * np.sqrt(1.0 - zeta**2))
    x = u0 - steady.real
    y = v0 - (1j * load * steady).real
    swing = complex(x, (root.real * x - y) / root.imag)
    return (steady * np.exp(1j * load * time)).real + (swing * np.exp(root * time)).real


@pytest.mark.parametrize(
    ("beta", "matched", "zeta", "order"),
    [
        (AVERAGE, False, 0.0, 2),
        (AVERAGE, False, 0.02, 2),
        (LINEAR, False, 0.0, 2),
        (LINEAR, False, 0.02, 2),
        (CENTRAL, False, 0.0, 2),
        (CENTRAL, False, 0.02, 2),
        (FOX_GOODWIN, False, 0.0, 4),
        (FOX_GOODWIN, False, 0.05, 2),
        (AVERAGE, True, 0.02, 2),
        (LINEAR, True, 0.02, 2),
        (FOX_GOODWIN, True, 0.0, 4),
        (FOX_GOODWIN, True, 0.05, 2),
    ],
)
def test_order_of_convergence(beta, matched, zeta, order):
    """Largest displacement error over 4 s of a forced swing, with four steps each half the one before.

    The order is the slope of the last halving; 0.005 for the next order (W^2 = 2e-4 there) and for the places where the
    error is read. The swing begins with a displacement, not with a velocity: the scheme's velocity is that of a chord
    over two steps, and a given one would leave an error of second order whatever the member.
    """
    frequency, load, u0, v0 = 2.0, 2.0 * np.pi * 1.3, 0.01, 0.0
    errors = []
    for per_second in (100, 200, 400, 800):
        time = np.arange(4 * per_second + 1) / per_second
        rows = stepped(one_mode(Newmark(beta, matched), frequency, zeta, 1.0 / per_second), np.cos(load * time), u0, v0)
        exact = exact_forced(time, 2.0 * np.pi * frequency, zeta, load, u0, v0)
        errors.append(np.abs(rows[:, 0] - exact).max())
    slopes = np.log2(np.array(errors[:-1]) / errors[1:])
    assert slopes[-1] == pytest.approx(order, abs=0.005)


@pytest.mark.parametrize(
    ("beta", "constant", "power"),
    [(AVERAGE, 1 / 12, 2), (LINEAR, 1 / 24, 2), (CENTRAL, -1 / 24, 2), (FOX_GOODWIN, -1 / 480, 4)],
)
def test_period_error(beta, constant, power):
    """Relative error of the period, from the eigenvalues of the step; 0.5 % for the next order at W = 0.2."""
    angle = 0.2
    c = one_mode(Newmark(beta, matched=False), angle / (2.0 * np.pi), 0.0, 1.0)
    turn = np.abs(np.angle(np.linalg.eigvals(np.array([[c[0], c[1]], [c[4], c[5]]])))).max()
    assert angle / turn - 1.0 == pytest.approx(constant * angle**power, rel=0.005)


@pytest.mark.parametrize("beta", [AVERAGE, LINEAR, FOX_GOODWIN])
def test_matched_members_keep_the_period(beta):
    """With matched stiffness the angle of an undamped step is omega dt to rounding, also for a coarse step."""
    for angle in (0.1, 0.5, 1.5):
        c = one_mode(Newmark(beta), angle / (2.0 * np.pi), 0.0, 1.0)
        values = np.linalg.eigvals(np.array([[c[0], c[1]], [c[4], c[5]]]))
        assert np.abs(np.angle(values)).max() == pytest.approx(angle, rel=1e-13)
        np.testing.assert_allclose(np.abs(values), 1.0, rtol=1e-13)


@pytest.mark.parametrize("zeta", [0.0, 0.02])
@pytest.mark.parametrize(
    ("beta", "limit"), [(CENTRAL, 2.0), (FOX_GOODWIN, np.sqrt(6.0)), (LINEAR, 2.0 * np.sqrt(3.0)), (AVERAGE, np.inf)]
)
def test_limit_of_a_stable_step(beta, limit, zeta):
    """Textbook limits; no eigenvalue beyond one up to there (and up to half a turn), and refused from there on."""
    scheme = Newmark(beta, matched=False)
    assert scheme.stability_limit == pytest.approx(limit, rel=1e-12)
    usable = min(limit, np.pi)
    for angle in np.linspace(0.05, 0.999, 20) * usable:
        c = one_mode(scheme, angle / (2.0 * np.pi), zeta, 1.0)
        assert np.abs(np.linalg.eigvals(np.array([[c[0], c[1]], [c[4], c[5]]]))).max() < 1.0 + 1e-7
    with pytest.raises(ValueError, match="stable"):
        one_mode(scheme, 1.001 * usable / (2.0 * np.pi), zeta, 1.0)


def energies(scheme, zeta, mass, force, dt):
    """(change of energy, work of the force less dissipation) of every step, and a scale."""
    c = one_mode(scheme, 2.3, zeta, dt, mass)
    u, v, _ = stepped(c, force, 0.004, -0.1).T
    stiffness, drag = c[10] * mass, c[9] * mass
    energy = 0.5 * mass * v**2 + 0.5 * stiffness * u**2
    mean = (v[1:] + v[:-1]) / 2.0
    work = (force[1:] + force[:-1]) / 2.0 * np.diff(u)
    return np.diff(energy), work - drag * mean * np.diff(u), energy.max()


@pytest.mark.parametrize("matched", [False, True])
@pytest.mark.parametrize("zeta", [0.0, 0.005, 0.05])
def test_energy_identity_of_average_acceleration(matched, zeta):
    """Change of energy = mean force x way - dissipation c x mean velocity x way, in every step, for any force.

    From u1 - u0 = dt (v0 + v1)/2, v1 - v0 = dt (a0 + a1)/2 and the equation of motion at both ends; to rounding.
    """
    force = 50.0 * np.random.default_rng(3).normal(size=800)
    change, expected, scale = energies(Newmark(AVERAGE, matched), zeta, 120.0, force, 0.02)
    np.testing.assert_allclose(change, expected, rtol=0.0, atol=1e-13 * scale)


@pytest.mark.parametrize("beta", [LINEAR, FOX_GOODWIN])
def test_the_identity_belongs_to_average_acceleration_alone(beta):
    """The other members gain and lose within a step: the check above can fail."""
    force = 50.0 * np.random.default_rng(3).normal(size=800)
    change, expected, scale = energies(Newmark(beta, matched=False), 0.005, 120.0, force, 0.02)
    assert np.abs(change - expected).max() > 1e-4 * scale


def test_energy_of_a_free_swing_stays():
    """Average acceleration without damping and force: 1e5 steps, the energy to 1e-10 (rounding of 1e5 steps)."""
    c = one_mode(Newmark(AVERAGE, matched=False), 2.3, 0.0, 0.02)
    power = np.linalg.matrix_power(np.array([[c[0], c[1]], [c[4], c[5]]]), 100_000)
    u, v = power @ np.array([0.01, 0.0])
    assert 0.5 * v**2 + 0.5 * c[10] * u**2 == pytest.approx(0.5 * c[10] * 0.01**2, rel=1e-10)
