"""One walker whose harmonic is on the mode: how far the resonance builds up during one crossing.

Slowly varying amplitude A' + zeta omega A = F0/(2 M omega) sin(nu t), nu = pi v/L, from rest. With a = zeta omega/nu
= 2 zeta f L/v and theta = nu t the acceleration, relative to the steady state F0/(2 zeta M), is

    R(theta) = a (a sin theta - cos theta + exp(-a theta)) / (1 + a^2),

largest at theta*. Ricciardelli & Briatico 2011, J. Eng. Mech. 137, treat the same problem (from memory); the formula is
derived here, and the table of its largest values is computed from it.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

# a, largest R, theta*/pi: computed, to the digits given
TABLE = [
    (0.02, 0.0388, 0.988),
    (0.05, 0.0927, 0.970),
    (0.1, 0.1728, 0.945),
    (0.2, 0.3040, 0.902),
    (0.3, 0.4066, 0.867),
    (0.5, 0.5553, 0.813),
    (0.75, 0.6765, 0.764),
    (1.0, 0.7562, 0.727),
    (1.5, 0.8506, 0.676),
    (2.0, 0.9014, 0.643),
    (3.0, 0.9497, 0.601),
    (5.0, 0.9806, 0.563),
    (10.0, 0.9950, 0.532),
    (20.0, 0.9988, 0.516),
]
CYCLES = 400.0  # load cycles in a crossing: zeta = a/800 is at most 2.5 %
MASS, WEIGHT = 50_000.0, 700.0


def envelope(a, theta):
    """R(theta)."""
    return a * (a * np.sin(theta) - np.cos(theta) + np.exp(-a * theta)) / (1.0 + a * a)


@pytest.mark.parametrize(("a", "factor", "place"), TABLE)
def test_the_table_follows_from_the_formula(a, factor, place):
    """Digits of the table: half a unit of the last one."""
    found = minimize_scalar(lambda theta: -envelope(a, theta), bounds=(0.0, np.pi), method="bounded")
    assert -found.fun == pytest.approx(factor, abs=0.5e-4 + 1e-9)
    assert found.x / np.pi == pytest.approx(place, abs=0.5e-3 + 1e-6)


@pytest.mark.parametrize("harmonic", [1, 2])
@pytest.mark.parametrize(("a", "factor", "place"), TABLE)
def test_peak_of_a_crossing(a, factor, place, harmonic, walker_of, prepared, full_run):
    """The simulated peak and its time, for the first and the second harmonic on the mode.

    Tolerances. Peak: against the table, 0.1 % (the promise of the default step) and half a unit of its last digit;
    against the formula, the error that the program states, and zeta^2 + (nu/omega)^2, the order in which the slow
    amplitude errs. Time: the amplitude is flat where it is largest, so an error epsilon of a value moves the place by
    sqrt(2 epsilon R/|R''|), here with the stated error; and half a cycle of the load.
    Worst: peak 0.0013 % off the formula, time 0.1 % of a crossing off.
    """
    frequency, speed = 2.0, 1.5
    length = CYCLES * speed / frequency
    damping = a / (2.0 * CYCLES)
    harmonics = (0.0,) * (harmonic - 1) + (0.4,)
    walker = walker_of(pace=frequency / harmonic, speed=speed, harmonics=harmonics, phase=0.3, arrival=0.77)
    case = prepared(
        f"""
        [deck]
        length = {length}
        width = 3.0
        [[mode]]
        name = "V1"
        frequency = {frequency}
        damping = {damping!r}
        modal_mass = {MASS}
        vertical = {{ half_waves = 1 }}
        {walker.stream()}
        [run]
        duration = {np.ceil(length / speed + 3.0)}
        realisations = 1
        """
    )
    response = full_run(case).response
    steady = 0.4 * WEIGHT / (2.0 * damping * MASS)
    reached = response.peak[0] / steady
    assert abs(reached - factor) < 1e-3 * factor + 0.5e-4
    theta = minimize_scalar(lambda x: -envelope(a, x), bounds=(0.0, np.pi), method="bounded").x
    formula, stated = envelope(a, theta), case.choice.expected_error
    assert abs(reached / formula - 1.0) < stated + damping**2 + (0.5 / CYCLES) ** 2
    bend = (envelope(a, theta + 1e-3) - 2.0 * formula + envelope(a, theta - 1e-3)) / 1e-6
    flat = np.sqrt(2.0 * stated * formula / abs(bend)) / np.pi
    time = (response.peak_time[0] - walker.arrival) * speed / length
    assert abs(time - place) < flat + 0.5 / CYCLES
