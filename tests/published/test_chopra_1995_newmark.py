"""Plain Newmark members against the half-cycle sine tables of a textbook.

Source: A. K. Chopra, Dynamics of Structures, Prentice Hall, 1995, examples 5.2 to 5.4 (central difference, average and
linear acceleration; numbers of the examples from memory; the same tables in later editions). Values read in a text that
quotes the book.

Symbol map: m, k, c -> modal mass, (2 pi frequency)^2 x mass, 2 x damping x 2 pi frequency x mass; zeta = 5 %, for which
the book works with c = 0.1592; u, v, a = displacement, velocity, acceleration.

Two entries of the text that quotes the average- and linear-acceleration tables are misprints, taken here as corrected
by recomputation: v(0.7) of average acceleration is -6.8182, not -6.8192; v(0.5) of linear acceleration is 2.1082, not
2.1802 (two digits changed places). With them as printed the members' own rule v1 = v0 + dt (a0 + a1)/2 would not hold
between the printed accelerations, which `test_the_two_misprints` shows.

Tolerances: half a unit of the last of four decimals in velocity and acceleration; one unit in displacement, two in that
of the central difference, where the book carries rounded displacements from step to step.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from crowdsim.dynamics.newmark import Newmark, step_coefficients

MASS, STIFFNESS, DRAG, STEP = 0.2533, 10.0, 0.1592, 0.1
FORCE = tuple(10.0 * np.sin(np.pi * t / 6.0) if t < 6 else 0.0 for t in range(11))  # 10 sin(pi t/0.6), t in tenths of s

AVERAGE_U = (0.0437, 0.2326, 0.6121, 1.0825, 1.4309, 1.4231, 0.9622, 0.1908, -0.6044, -1.1442)
AVERAGE_V = (0.8733, 2.9057, 4.6833, 4.7260, 2.2421, -2.3996, -6.8182, -8.6092, -7.2932, -3.5026)
AVERAGE_A = (17.4666, 23.1801, 12.3719, -11.5175, -38.1611, -54.6722, -33.6997, -2.1211, 28.4423, 47.3701)
LINEAR_U = (0.0300, 0.2193, 0.6166, 1.1130, 1.4782, 1.4625, 0.9514, 0.1273, -0.6954, -1.2208)
LINEAR_V = (0.8995, 2.9819, 4.7716, 4.7419, 2.1082, -2.6911, -7.1468, -8.7758, -7.1539, -3.0508)
LINEAR_A = (17.9904, 23.6566, 12.1372, -12.7305, -39.9425, -56.0447, -33.0689, 0.4892, 31.9491, 50.1114)
CENTRAL_U = (0.0, 0.1914, 0.6293, 1.1825, 1.5808, 1.5412, 0.9141, -0.0247, -0.8968, -1.3726)


def table(beta):
    """Displacement, velocity, acceleration at 0.1 to 1.0 s."""
    omega = np.sqrt(STIFFNESS / MASS)
    c = step_coefficients(
        Newmark(beta, matched=False),
        np.array([omega / (2.0 * np.pi)]),
        np.array([DRAG / (2.0 * MASS * omega)]),
        np.array([MASS]),
        STEP,
    )[0]
    u = v = 0.0
    rows = []
    for before, now in itertools.pairwise(FORCE):
        u, v = c[0] * u + c[1] * v + c[2] * before + c[3] * now, c[4] * u + c[5] * v + c[6] * before + c[7] * now
        rows.append((u, v, c[8] * now - c[9] * v - c[10] * u))
    return np.array(rows).T


ROWS = [
    *((1 / 4, 0, i, value, 1e-4) for i, value in enumerate(AVERAGE_U)),
    *((1 / 4, 1, i, value, 0.5e-4) for i, value in enumerate(AVERAGE_V)),
    *((1 / 4, 2, i, value, 0.5e-4) for i, value in enumerate(AVERAGE_A)),
    *((1 / 6, 0, i, value, 1e-4) for i, value in enumerate(LINEAR_U)),
    *((1 / 6, 1, i, value, 0.5e-4) for i, value in enumerate(LINEAR_V)),
    *((1 / 6, 2, i, value, 0.5e-4) for i, value in enumerate(LINEAR_A)),
    *((0.0, 0, i, value, 2e-4) for i, value in enumerate(CENTRAL_U)),
]


@pytest.mark.parametrize(("beta", "quantity", "index", "value", "tolerance"), ROWS)
def test_half_cycle_sine(beta, quantity, index, value, tolerance):
    """beta; 0 displacement, 1 velocity, 2 acceleration; the time is (index + 1)/10 s."""
    assert table(beta)[quantity][index] == pytest.approx(value, abs=tolerance)


@pytest.mark.parametrize(
    ("accelerations", "velocities", "index", "misprint"),
    [(AVERAGE_A, AVERAGE_V, 6, -6.8192), (LINEAR_A, LINEAR_V, 4, 2.1802)],
)
def test_the_two_misprints(accelerations, velocities, index, misprint):
    """v1 = v0 + dt (a0 + a1)/2 holds in the tables to one unit of the last digit but for the two values as printed."""
    expected = velocities[index - 1] + 0.5 * STEP * (accelerations[index - 1] + accelerations[index])
    assert velocities[index] == pytest.approx(expected, abs=1.5e-4)
    assert abs(misprint - expected) > 8e-4
