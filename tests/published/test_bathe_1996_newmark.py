"""Two coupled degrees of freedom by modal superposition, against a textbook's tables of direct integration.

Source: K. J. Bathe, Finite Element Procedures, Prentice Hall, 1996, the two-degree system that runs through the
examples of chapter 9; the same in the editions before. Average acceleration and the exact values read in a text that
quotes the book; central difference from memory.

Symbol map: M = diag(2, 1), K = [[6, -2], [-2, 4]], no damping, constant load R = [0, 10] from rest, dt = 0.28;
U1, U2 at dt, 2 dt, ... 12 dt. omega^2 = 2 and 5. A member of Newmark's family commutes with the change to modal
coordinates, so superposition of plain members must give the book's direct integration.

Tolerance: half a unit of the last printed digit, and a tenth of one for the book's own arithmetic.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import eigh

from crowdsim.dynamics.newmark import Newmark, step_coefficients

MASS, STIFFNESS, LOAD, STEP = np.diag([2.0, 1.0]), np.array([[6.0, -2.0], [-2.0, 4.0]]), np.array([0.0, 10.0]), 0.28

AVERAGE = (
    "0.00673 0.0505 0.189 0.485 0.961 1.58 2.23 2.76 3.00 2.85 2.28 1.40",
    "0.364 1.35 2.68 4.00 4.95 5.34 5.13 4.48 3.64 2.90 2.44 2.31",
)
CENTRAL = (
    "0 0.0307 0.1675 0.4871 1.017 1.701 2.397 2.913 3.071 2.771 2.037 1.022",
    "0.392 1.445 2.834 4.144 5.015 5.257 4.901 4.168 3.368 2.778 2.535 2.601",
)


def unit(printed):
    """One of the last digit of a printed number."""
    return 10.0 ** -len(printed.partition(".")[2]) if "." in printed else 1e-12


def superposed(beta):
    """U [degree of freedom, step 1 to 12]."""
    squares, shapes = eigh(STIFFNESS, MASS)
    frequency = np.sqrt(squares) / (2.0 * np.pi)
    c = step_coefficients(Newmark(beta, matched=False), frequency, np.zeros(2), np.ones(2), STEP).T
    force = shapes.T @ LOAD
    u, v, found = np.zeros(2), np.zeros(2), []
    for _ in range(12):
        u, v = c[0] * u + c[1] * v + (c[2] + c[3]) * force, c[4] * u + c[5] * v + (c[6] + c[7]) * force
        found.append(shapes @ u)
    return np.array(found).T


@pytest.mark.parametrize(
    ("beta", "freedom", "step", "printed"),
    [
        (beta, freedom, step, printed)
        for beta, both in ((1 / 4, AVERAGE), (0.0, CENTRAL))
        for freedom, line in enumerate(both)
        for step, printed in enumerate(line.split(), start=1)
    ],
)
def test_displacements(beta, freedom, step, printed):
    """beta 1/4: average acceleration; 0: central difference."""
    assert superposed(beta)[freedom, step - 1] == pytest.approx(float(printed), abs=0.6 * unit(printed))


def test_frequencies_and_exact_solution():
    """omega^2 = 2 and 5, exact; U(12 dt) = (1.157, 2.489), half a unit of the last digit, and the book's two modes."""
    squares, shapes = eigh(STIFFNESS, MASS)
    np.testing.assert_allclose(squares, [2.0, 5.0], rtol=1e-13)
    time = 12 * STEP
    modal = shapes.T @ LOAD / squares * (1.0 - np.cos(np.sqrt(squares) * time))
    np.testing.assert_allclose(shapes @ modal, [1.157, 2.489], atol=0.5e-3)
    one = 5.0 / np.sqrt(3.0) * (1.0 - np.cos(np.sqrt(2.0) * time))
    two = 2.0 * np.sqrt(2.0 / 3.0) * (np.cos(np.sqrt(5.0) * time) - 1.0)
    columns = np.array([[1 / np.sqrt(3.0), 0.5 * np.sqrt(2 / 3.0)], [1 / np.sqrt(3.0), -np.sqrt(2 / 3.0)]])
    np.testing.assert_allclose(columns @ [one, two], shapes @ modal, rtol=1e-12)
