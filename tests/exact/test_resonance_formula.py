"""The simple resonance formula, its factor for a crossing and its forms in weights.

The factor of a crossing follows from the slowly varying amplitude; here it stands against the second-order equation
q'' + 2 zeta omega q' + omega^2 q = (F/M) sin(omega t + phase) phi(v t / L), solved by scipy, and against closed forms.
Ricciardelli & Briatico 2011, J. Eng. Mech. 137, treat the same problem (from memory); the table is computed.
"""

from __future__ import annotations

import math
import time

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq

from crowdsim.guides import resonance

TABLE = [  # s, R: computed, to the digits given
    (0.02, 0.0388), (0.05, 0.0927), (0.1, 0.1728), (0.2, 0.3040), (0.3, 0.4066), (0.5, 0.5553), (0.75, 0.6765),
    (1.0, 0.7562), (1.5, 0.8506), (2.0, 0.9014), (3.0, 0.9497), (5.0, 0.9806), (6.0, 0.986), (10.0, 0.9950),
    (20.0, 0.9988),
]  # fmt: skip
PLACES = np.linspace(0.0, 1.0, 481)

CROSSINGS = [  # frequency [Hz], damping, length [m], speed [m/s]
    (2.0, 0.005, 40.0, 1.4),
    (2.0, 0.003, 20.0, 1.4),
    (1.8, 0.010, 60.0, 1.3),
    (2.7, 0.004, 30.0, 3.0),  # a jogger
]
SHAPES = {  # of the share of the deck; half waves, for the number of load cycles in one
    "half sine": (lambda x: np.sin(np.pi * x), 1),
    "two half waves": (lambda x: np.sin(2.0 * np.pi * x), 2),
    "triangle": (lambda x: 1.0 - np.abs(2.0 * x - 1.0), 1),
    "unequal spans": (lambda x: np.sin(2.0 * np.pi * x) - 0.6 * np.sin(np.pi * x), 2),
}


def crossing_peak(shape, frequency, damping, length, speed, vertex_peak, phase=0.0):
    """Peak acceleration over F / (2 zeta M) where the ordinate is 1, up to one cycle after stepping off."""
    omega, crossing = 2.0 * math.pi * frequency, length / speed

    def force(t, on):
        return np.sin(omega * t + phase) * shape(t / crossing) if on else 0.0 * t

    peaks, state = [], [0.0, 0.0]
    for start, end, on in ((0.0, crossing, True), (crossing, crossing + 1.0 / frequency, False)):
        found = solve_ivp(
            lambda t, y, on=on: [y[1], force(t, on) - 2.0 * damping * omega * y[1] - omega**2 * y[0]],
            (start, end),
            state,
            t_eval=np.linspace(start, end, int(80 * frequency * (end - start)) + 2),
            method="DOP853",
            rtol=1e-9,
            atol=1e-13,  # beside a displacement of about 0.1 for F/M = 1
        )
        q, v = found.y
        peaks.append(vertex_peak(force(found.t, on) - 2.0 * damping * omega * v - omega**2 * q))
        state = [q[-1], v[-1]]
    return max(peaks) * 2.0 * damping


@pytest.mark.parametrize(("s", "factor"), TABLE)
def test_table(s, factor):
    """Half a unit of the last digit."""
    digits = 3 if s == 6.0 else 4
    assert resonance.moving_force_factor(s) == pytest.approx(factor, abs=0.5 * 10.0**-digits)


@pytest.mark.parametrize("s", [1e-3, 0.0267, 0.3, 1.0, 4.0, 50.0])
def test_the_largest_value_is_where_the_force_meets_the_decay(s):
    """There R = sin theta, theta the root of s cos + sin = s exp(-s theta), by another root finder; rounding only."""

    def slope(theta):
        return s * math.cos(theta) + math.sin(theta) - s * math.exp(-s * theta)

    theta = brentq(slope, 0.5 * math.pi, math.pi, xtol=1e-15)
    assert resonance.moving_force_factor(s) == pytest.approx(math.sin(theta), rel=1e-11)


def test_limits():
    """s to 0: R/(2 s) = 1 - pi s/2 + (pi s/2)^2 and so on (series by hand). s to infinity: s/sqrt(1 + s^2)."""
    assert resonance.moving_force_factor(0.0) == 0.0
    for s in (1e-6, 1e-4, 1e-2):
        missing = 1.0 - resonance.moving_force_factor(s) / (2.0 * s)
        first = 0.5 * math.pi * s
        assert missing == pytest.approx(first - first**2, abs=2.0 * first**3 + 1e-15)  # next order, and rounding
    for s in (20.0, 100.0, 1e4):  # what has decayed since stepping on: exp(-pi s / 2)
        assert resonance.moving_force_factor(s) == pytest.approx(s / math.hypot(1.0, s), rel=1e-12)


@pytest.mark.parametrize(("frequency", "damping", "length", "speed"), CROSSINGS)
@pytest.mark.parametrize("name", SHAPES)
def test_factor_against_the_equation_of_motion(name, frequency, damping, length, speed, vertex_peak):
    """Tolerance: what the slow amplitude leaves out, zeta^2 and (half waves / (2 cycles))^2, and the chords' 1.5e-5.

    Vertices of parabolas through 80 samples a cycle are good to 1e-6. Worst: a third of the tolerance.
    """
    shape, half_waves = SHAPES[name]
    cycles = frequency * length / speed
    ordinates = shape(PLACES)
    factor = resonance.moving_force_factor_along(ordinates, 2.0 * math.pi * damping * cycles)
    true = crossing_peak(shape, frequency, damping, length, speed, vertex_peak) / np.abs(ordinates).max()
    left_out = damping**2 + (0.5 * half_waves / cycles) ** 2 + 1.5e-5
    assert true == pytest.approx(factor, rel=left_out)
    if name == "half sine":
        assert true == pytest.approx(resonance.moving_force_factor(2.0 * damping * cycles), rel=left_out)


@pytest.mark.parametrize("phase", [0.0, 0.5 * math.pi])
@pytest.mark.parametrize(("frequency", "damping", "length", "speed"), CROSSINGS)
def test_a_deck_that_moves_at_its_ends(frequency, damping, length, speed, phase, vertex_peak):
    """Constant ordinate. A force that starts at once leaves a swing of half F/M, zeta of the steady state."""
    decay = 2.0 * math.pi * damping * frequency * length / speed
    factor = resonance.moving_force_factor_along(np.ones(11), decay)
    true = crossing_peak(np.ones_like, frequency, damping, length, speed, vertex_peak, phase)
    assert true == pytest.approx(factor, abs=damping)


@pytest.mark.parametrize("s", [0.02, 0.1, 0.444, 1.0, 3.0, 20.0, 60.0])
def test_along_a_half_sine(s):
    """481 places: chords are low by at most (pi/480)^2 / 8 = 5.4e-6."""
    along = resonance.moving_force_factor_along(np.sin(np.pi * PLACES), math.pi * s)
    assert along == pytest.approx(resonance.moving_force_factor(s), rel=1e-5)
    assert along == pytest.approx(resonance.moving_force_factor_along(-7.0 * np.sin(np.pi * PLACES), math.pi * s))


@pytest.mark.parametrize("places", [3, 5, 481, 4801])
@pytest.mark.parametrize("decay", [1e-6, 0.01, 0.3, 2.0, 20.0, 200.0])
def test_along_a_triangle(decay, places):
    """Straight flanks: 1 - (2/d) ln(2 - exp(-d/2)), in any number of cells; by hand.

    Rising, b' + d b = d p with p = 2 t: b(1/2) = 1 - (2/d)(1 - exp(-d/2)). Falling, p = 1 - 2 u and
    b = p + 2/d + c exp(-d u), c = -(2/d)(2 - exp(-d/2)). b' = 0 where exp(d u) = 2 - exp(-d/2), and there b = p.
    Rounding: the form above, a difference of about d/2 of numbers near 1, loses 1e-15/d; the sum over the cells 1e-12.
    """
    ordinates = 1.0 - np.abs(2.0 * np.linspace(0.0, 1.0, places) - 1.0)
    by_hand = 1.0 - 2.0 / decay * math.log1p(-math.expm1(-0.5 * decay))
    found = resonance.moving_force_factor_along(ordinates, decay)
    assert found == pytest.approx(by_hand, rel=1e-11 + 1e-15 / decay)


@pytest.mark.parametrize("decay", [0.05, 0.7, 5.0, 200.0])
@pytest.mark.parametrize("places", [2, 12, 600])
def test_along_a_constant_ordinate_is_a_force_that_stands(decay, places):
    """1 - exp(-2 pi zeta N); rounding only. A sign tells nothing."""
    standing = resonance.fixed_position_factor(decay / (2.0 * math.pi * 50.0), 50.0)
    assert resonance.moving_force_factor_along(np.full(places, -0.3), decay) == pytest.approx(standing, rel=1e-11)


def test_without_decay_the_impulse_counts():
    """Small decay d: d x the largest |integral of phi| from the start, over the largest ordinate.

    Two half waves: integral up to mid-span 1/pi, where the sign changes, not 0 as at the end. Second order: d/2.
    """
    two = np.sin(2.0 * np.pi * PLACES)
    assert resonance.moving_force_factor_along(two, 1e-4) == pytest.approx(1e-4 / math.pi, rel=1e-4)
    assert resonance.moving_force_factor_along(two, 0.0) == 0.0


def test_a_scan_is_quick():
    """4801 cells: 1.4 ms, allowed 5; the best of ten, for the machine may be busy."""
    ordinates, best = np.sin(np.pi * np.linspace(0.0, 1.0, 4802)), math.inf
    for _ in range(10):
        start = time.perf_counter()
        resonance.moving_force_factor_along(ordinates, 2.0)
        best = min(best, time.perf_counter() - start)
    assert best < 5e-3


def test_a_force_that_stands_is_too_high_for_one_that_walks():
    """1 - exp(-pi s) over R(s): pi/2 for small s; never below 1."""
    ratio = [resonance.fixed_position_factor(0.5 * s, 1.0) / resonance.moving_force_factor(s) for s, _ in TABLE]
    assert ratio[0] == pytest.approx(0.5 * math.pi, rel=0.02)  # a term of the order s = 0.02 is left out
    assert 1.0 < min(ratio) <= max(ratio) < 1.6


def test_weight_forms_say_the_same():
    """One walker at mid-span of a uniform simple span; a group in step spread over it. Rounding and quadrature."""
    mass, damping, gravity, load_factor, weight = 48_400.0, 0.006, 9.81, 0.4, 750.0
    square, _ = quad(lambda x: math.sin(math.pi * x) ** 2, 0.0, 1.0)
    mean, _ = quad(lambda x: math.sin(math.pi * x), 0.0, 1.0)
    modal_mass = mass * square
    steady = resonance.steady_state(load_factor * weight, damping, modal_mass)
    modal = resonance.weight_form(resonance.MODAL_WEIGHT, load_factor, weight, damping, modal_mass * gravity)
    total = resonance.weight_form(resonance.TOTAL_WEIGHT_OF_SIMPLE_SPAN, load_factor, weight, damping, mass * gravity)
    assert modal * gravity == pytest.approx(steady, rel=1e-12)
    assert total * gravity == pytest.approx(steady, rel=1e-12)
    assert pytest.approx(mean / square, rel=1e-12) == resonance.SPREAD_OVER_SIMPLE_SPAN
    assert round(resonance.SPREAD_OVER_SIMPLE_SPAN, 1) == 1.3  # as published
    length, group = 44.0, 12.0 * weight
    spread = resonance.weight_form(
        resonance.SPREAD_OVER_SIMPLE_SPAN, load_factor, group / length, damping, mass * gravity / length
    )
    together = resonance.steady_state(load_factor * group * mean, damping, modal_mass)
    assert spread * gravity == pytest.approx(together, rel=1e-12)


def test_a_deck_worked_by_hand():
    """Ropewalk bridge, Oxmere: simple span of 44 m, 1100 kg/m, 1.9 Hz, zeta 0.6 %; a walker of 750 N, 0.4, 1.4 m/s.

    Mode: M = 1100 x 44 / 2 = 24 200 kg. Force: 0.4 x 750 = 300 N.
    Steady state: 300 / (2 x 0.006 x 24 200) = 300 / 290.4 = 1.0331 m/s2; at the quarter, phi^2 = 1/2: 0.5165.
    Cycles in a crossing: 1.9 x 44 / 1.4 = 59.714. Standing still: exponent 2 pi x 0.006 x 59.714 = 2.2512,
    exp(-2.2512) = 0.1053, factor 0.8947.
    Moving: s = 2 x 0.006 x 59.714 = 0.71657. theta = 2.41: 0.71657 cos = -0.53321, sin = 0.66806, sum
    0.13485; 0.71657 exp(-1.72693) = 0.12743: still rising. 2.42: -0.53797 + 0.66058 = 0.12261 against 0.12652: falling.
    Between them in the ratio 742 to 391: theta = 2.41655, R = sin 2.41655 = 0.66316. Peak 0.66316 x 1.0331 = 0.6851.
    Weights: W = 24 200 x 9.81 = 237 402 N: 0.4 x 750 / (0.012 x 237 402) = 300 / 2848.8 = 0.10531 of g; with the
    whole, 474 804 N, twice 0.05265. Twelve in step, spread: 9000 / 44 = 204.55 N/m on 10 791 N/m:
    1.2732 x 0.4 x 204.55 / (0.012 x 10 791) = 104.18 / 129.49 = 0.8045 of g.
    Digits: half a unit of the last one written, and as much again for what was rounded on the way.
    """
    damping, modal_mass, cycles = 0.006, 24_200.0, 59.714
    steady = resonance.steady_state(300.0, damping, modal_mass)
    assert steady == pytest.approx(1.0331, abs=1e-4)
    assert resonance.steady_state(300.0, damping, modal_mass, math.sqrt(0.5)) == pytest.approx(0.5165, abs=1e-4)
    assert resonance.fixed_position_factor(damping, cycles) == pytest.approx(0.8947, abs=1e-4)
    factor = resonance.moving_force_factor(2.0 * damping * cycles)
    assert factor == pytest.approx(0.66316, abs=1e-5)
    assert factor * steady == pytest.approx(0.6851, abs=1e-4)
    modal = resonance.weight_form(resonance.MODAL_WEIGHT, 0.4, 750.0, damping, 237_402.0)
    total = resonance.weight_form(resonance.TOTAL_WEIGHT_OF_SIMPLE_SPAN, 0.4, 750.0, damping, 474_804.0)
    spread = resonance.weight_form(resonance.SPREAD_OVER_SIMPLE_SPAN, 0.4, 204.55, damping, 10_791.0)
    assert modal == pytest.approx(0.10531, abs=1e-5)
    assert total == pytest.approx(0.10531, abs=1e-5)
    assert spread == pytest.approx(0.8045, abs=1e-4)


@pytest.mark.parametrize(
    ("function", "arguments", "words"),
    [
        (resonance.steady_state, (300.0, 0.0, 1e4), "damping must be above 0"),
        (resonance.steady_state, (300.0, 0.01, math.nan), "modal_mass must be above 0"),
        (resonance.moving_force_factor, (-0.1,), "s must not be below 0"),
        (resonance.moving_force_factor_along, (np.ones(3), -1.0), "decay must not be below 0"),
        (resonance.moving_force_factor_along, (np.zeros(3), 1.0), "ordinates"),
        (resonance.moving_force_factor_along, (np.ones(1), 1.0), "ordinates"),
        (resonance.moving_force_factor_along, (np.ones((2, 2)), 1.0), "ordinates"),
        (resonance.moving_force_factor_along, (np.array([0.0, math.nan, 1.0]), 1.0), "ordinates"),
        (resonance.fixed_position_factor, (0.01, -1.0), "cycles must not be below 0"),
        (resonance.weight_form, (1.0, 0.4, 750.0, 0.01, 0.0), "structure_weight must be above 0"),
    ],
)
def test_what_cannot_be(function, arguments, words):
    with pytest.raises(ValueError, match=words):
        function(*arguments)
