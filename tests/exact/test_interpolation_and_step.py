"""The rule between samples of the force, and the errors that the choice of the step states, by direct evaluation."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.signal import find_peaks

from crowdsim.dynamics import step
from crowdsim.dynamics.interpolation import REACH, between_error, between_weights
from crowdsim.dynamics.kernels import CHUNK, TAPS
from crowdsim.dynamics.newmark import Newmark, step_coefficients
from crowdsim.dynamics.realisation import CELLS

SIDE_LOBE = 1.8e-5  # of the Kaiser window used, over the whole reach of the rule; computed


@pytest.mark.parametrize("factor", [1, 2, 4])
def test_weights_sum_to_one_and_mirror(factor):
    """A constant force stays as it is (to the rounding of twelve numbers); j/factor on is (factor - j)/factor back."""
    weights = between_weights(factor)
    assert weights.shape == (factor - 1, TAPS)
    np.testing.assert_allclose(weights.sum(axis=1), 1.0, rtol=0.0, atol=TAPS * 1.2e-16)
    np.testing.assert_allclose(weights, weights[::-1, ::-1], rtol=0.0, atol=1e-15)


def test_another_factor_is_refused():
    """One, two or four steps in a sample."""
    with pytest.raises(ValueError, match="1, 2 or 4"):
        between_weights(3)


@pytest.mark.parametrize("factor", [2, 4])
def test_the_rule_on_sampled_harmonics(factor):
    """Harmonics of any phase, sampled and put together between: within the side lobes up to REACH.

    And the error that `between_error` states is the largest that any phase gives (0.1 %: of 361 phases).
    """
    weights = between_weights(factor)
    taps = np.arange(TAPS) - (TAPS // 2 - 1)
    phases = np.linspace(0.0, np.pi, 361)[:, None]
    worst = 0.0
    for angle in np.linspace(0.0, REACH, 66):
        found = 0.0
        for j in range(1, factor):
            ruled = np.cos(angle * taps + phases) @ weights[j - 1]
            found = max(found, float(np.abs(ruled - np.cos(angle * j / factor + phases[:, 0])).max()))
        assert found == pytest.approx(float(between_error(factor, np.array(angle))), rel=1e-3, abs=1e-15)
        worst = max(worst, found)
    assert 1e-5 < worst < SIDE_LOBE


def test_the_rule_fails_beyond_its_reach():
    """At 1.6 rad a sample the error is a hundred times larger: the limit is where it has to be."""
    assert between_error(4, np.array(1.6)) > 100.0 * SIDE_LOBE / 1.8


@pytest.mark.parametrize("angle", [0.05, 0.1, 0.2, 0.3, 0.4, 0.8])
def test_parabola_error(angle):
    """Vertex through three samples of a sine, by scanning the sine: every place of the samples below its top.

    Tolerance: the scan has 2000 places, the program 201; near its largest the error bends by less than 1e-3 between.
    """
    offset = np.linspace(-0.5, 0.5, 2001) * angle
    worst = 0.0
    for o in offset:
        a, b, c = (math.cos(o + k * angle) for k in (-1, 0, 1))
        second, first = (a + c) / 2.0 - b, (c - a) / 2.0
        worst = max(worst, abs(b - first * first / (4.0 * second) - 1.0))
    assert step.parabola_error(angle) == pytest.approx(worst, rel=1e-3)


def test_parabola_error_is_of_fourth_order():
    """Half the angle, a sixteenth of the error: to 2 % at 0.1 rad (the next order is angle^2)."""
    assert step.parabola_error(0.1) / step.parabola_error(0.05) == pytest.approx(16.0, rel=0.02)


@pytest.mark.parametrize("half_waves", [1, 2, 5])
@pytest.mark.parametrize("speed", [1.3, 3.0])
def test_ordinate_error(half_waves, speed):
    """A parabola through the ends and the middle of a chunk of a half wave: x^3/(9 sqrt 3), x half the chunk's angle.

    Textbook error of quadratic interpolation. Tolerance 3 %: the program looks at six places in a chunk, and the next
    order of the sine is x^2/20 of the first.
    """
    length, dt, before = 40.0, 1.0 / 120.0, 300
    cells = speed * 4.0 * dt * CHUNK / (length / CELLS)
    s = (np.arange(CELLS + 2 * before + 2) - before) * (length / CELLS)
    table = np.sin(half_waves * np.pi * s / length)[:, None]
    x = 0.5 * cells * (length / CELLS) * half_waves * np.pi / length
    assert step.ordinate_error(table, cells, before) == pytest.approx(x**3 / (9.0 * np.sqrt(3.0)), rel=0.03)


def test_ordinate_error_of_a_parabola_is_nought():
    """What the rule is made of, it reproduces, up to the chord over a cell of the table."""
    before = 50
    x = (np.arange(CELLS + 2 * before + 2) - before) / CELLS
    assert step.ordinate_error((x * (1.0 - x))[:, None], 32.0, before) < 4.0 * (1.0 / CELLS) ** 2
    assert step.ordinate_error((x * (1.0 - x))[:, None], 0.5, before) == 0.0


@pytest.mark.parametrize(
    ("mode", "harmonic", "expected"),
    [(1.0, 2.0, 100), (3.0, 5.0, 100), (6.0, 5.0, 140), (2.0, 8.0, 160), (6.0, 12.0, 240), (8.0, 12.0, 240)],
)
def test_steps_per_second(mode, harmonic, expected):
    """omega dt at most 0.3 at the top mode, 1.3/4 at the top harmonic; a multiple of 20, at least 100: by hand."""
    assert step.steps_per_second(mode, harmonic) == expected


@pytest.mark.parametrize("scheme", [Newmark(), Newmark(0.25), Newmark(0.25, matched=False)])
def test_the_stated_history_error(scheme):
    """That of the steady response to a harmonic, relative to the resonant one, by stepping through it.

    The largest over the load frequencies that the program looks at, and the mode's own. Tolerance: the swing from
    rest has decayed by exp(-23), a millionth of the error at most.
    """
    frequency, damping, top, dt = 3.0, 0.05, 6.0, 1.0 / 120.0
    ordinates = np.sin(np.pi * np.linspace(-0.1, 1.1, 4930))[:, None]
    choice = step.choose(
        scheme, np.array([frequency]), np.array([damping]), top, ordinates, 400, 0.01, 1.3, sharp=False, per_second=120
    )
    u, v, before, now, du, dv, dbefore, dnow, force, drag, spring = step_coefficients(
        scheme, np.array([frequency]), np.array([damping]), np.array([1.0]), dt
    )[0]
    load = np.append(np.linspace(0.5, top, 200), frequency)
    x = y = np.zeros(load.size, dtype=complex)
    for n in range(1, 3000):
        f0, f1 = np.exp(2j * np.pi * load * dt * (n - 1)), np.exp(2j * np.pi * load * dt * n)
        x, y = u * x + v * y + before * f0 + now * f1, du * x + dv * y + dbefore * f0 + dnow * f1
    stepped = (f1 * force - drag * y - spring * x) / f1
    exact = -(load**2) / (frequency**2 - load**2 + 2j * damping * frequency * load)
    error = np.abs(stepped - exact).max() / np.abs(exact).max()
    assert error == pytest.approx(choice.history_error, rel=1e-5)


def test_choice_of_the_samples():
    """Every step where asked; every fourth on a long smooth deck; fewer between where a chunk bends."""
    s = (np.arange(CELLS + 602) - 300) / CELLS

    def factor(half_waves, length, sharp):
        table = np.sin(half_waves * np.pi * s)[:, None]
        return step.choose(
            Newmark(),
            np.array([2.0]),
            np.array([0.005]),
            6.0,
            table,
            300,
            length / CELLS,
            1.4,
            sharp=sharp,
            per_second=140,
        ).factor

    assert factor(1, 60.0, True) == 1
    assert factor(1, 60.0, False) == 4
    assert factor(2, 25.0, False) == 2
    assert factor(5, 25.0, False) == 1


def test_peaks_of_a_decaying_sine_by_parabola(vertex_peak):
    """The peak measure itself, as the tests compute it: within `parabola_error` of the true top."""
    t = np.arange(0.0, 3.0, 0.01)
    y = 1.7 * np.exp(-0.05 * t) * np.cos(2.0 * np.pi * 4.77 * (t - 0.1234))
    peaks, _ = find_peaks(np.abs(y))
    fine = np.arange(t[peaks[0] - 1], t[peaks[0] + 1], 1e-6)
    top = np.abs(1.7 * np.exp(-0.05 * fine) * np.cos(2.0 * np.pi * 4.77 * (fine - 0.1234))).max()
    assert vertex_peak(y[peaks[0] - 1 :]) == pytest.approx(top, rel=step.parabola_error(2.0 * np.pi * 4.77 * 0.01))
