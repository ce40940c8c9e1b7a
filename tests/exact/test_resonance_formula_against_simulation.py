"""The hand formulas of `estimate` beside a simulation of the very situation that each stands for.

One person in the mode's rhythm: the steady state, one crossing, a force that stays in one place; then what they leave
out, in the direction in which it must go: a pace off the mode, many persons at once, a stationary stream. Formula and
simulation share the scenario's text and nothing else.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from crowdsim import parse_scenario
from crowdsim.study.estimate import CROSSING, FIXED, NARROW_SD, SQUARE_ROOT, STEADY, estimate
from crowdsim.study.jobs import run_realisation

FREQUENCY, SPEED, MASS, WEIGHT = 2.0, 1.5, 40_000.0, 750.0


def text(length, damping, shape, stream, run, width=2.5):
    return f"""
[deck]
length = {length}
width = {width}
[[mode]]
name = "V1"
frequency = {FREQUENCY}
damping = {damping}
modal_mass = {MASS}
vertical = {shape}
[[stream]]
name = "Ropewalk"
{stream}
[run]
{run}
"""


def one_person(pace=FREQUENCY, factors="[0.4]"):
    return f"""
arrival = {{ times = [0.0] }}
pace = {pace}
speed = {SPEED}
weight = {WEIGHT}
phase = 0.0
load = {{ harmonics = {factors} }}
"""


def crossing_text(length, damping, shape="{ half_waves = 1 }", pace=FREQUENCY, factors="[0.4]"):
    """One person, observed from stepping on until 5 s after stepping off."""
    return text(length, damping, shape, one_person(pace, factors), f"duration = {length / SPEED + 5.0}")


def formula(scenario, name, harmonic=1):
    """Value of a formula for the only mode, in the only case."""
    (found,) = [
        m for m in estimate(parse_scenario(scenario)).methods if m.name == name and m.harmonic in (None, harmonic)
    ]
    assert found.value is not None
    return found.value


def simulated(scenario, prepared, number=0):
    """Peak at the antinode."""
    return float(run_realisation(prepared(scenario), number).response.peak[0])


def test_steady_state(prepared):
    """A long deck with ordinate 1 but for smooth ends: 267 s at 1/(zeta omega) = 8 s.

    Within 1 %: what is asked of the formula. What is left: exp(-33) of the build-up, a response in quadrature of
    zeta^2 = 1e-4, the load's second harmonic far off, 2e-4 of the time step.
    """
    length = 400.0
    ramp = [0.0, 10.0, 20.0, 30.0, 40.0]
    value = [0.5 - 0.5 * math.cos(math.pi * s / 40.0) for s in ramp]
    places = [*ramp, 120.0, 200.0, 280.0, *(length - s for s in reversed(ramp))]
    shape = f'{{ s = {places}, value = {[*value, 1.0, 1.0, 1.0, *reversed(value)]}, interpolation = "monotone" }}'
    scenario = crossing_text(length, 0.01, shape)
    steady = formula(scenario, STEADY)
    assert steady == pytest.approx(0.4 * WEIGHT / (2.0 * 0.01 * MASS), rel=1e-12)  # F/(2 zeta M), by hand 0.375
    peak = simulated(scenario, prepared)
    assert peak / steady == pytest.approx(1.0, abs=0.01)
    assert peak / steady == pytest.approx(1.0, abs=1e-3)  # and what the reasons above leave
    # nothing is lost by walking where the ordinate is 1 for so long
    assert formula(scenario, CROSSING) == pytest.approx(steady, rel=1e-9)


DECKS = [  # length [m], damping: zeta x cycles from 0.04 to 4
    (15.0, 0.002), (24.0, 0.004), (40.0, 0.003), (40.0, 0.01), (75.0, 0.01), (90.0, 0.02), (150.0, 0.02),
]  # fmt: skip


@pytest.mark.parametrize(("length", "damping"), DECKS)
def test_one_crossing(length, damping, prepared):
    """A half sine. The slowly varying amplitude leaves out zeta^2 + (1/(2 cycles))^2: at most 0.07 %; time step and
    peak 0.04 %. Asked: 0.5 %.
    """
    scenario = crossing_text(length, damping)
    cycles = FREQUENCY * length / SPEED
    assert 0.03 < damping * cycles < 4.1
    peak = simulated(scenario, prepared)
    left_out = damping**2 + (0.5 / cycles) ** 2 + 4e-4
    assert left_out < 5e-3
    assert peak / formula(scenario, CROSSING) == pytest.approx(1.0, abs=left_out)


@pytest.mark.parametrize(("length", "damping"), DECKS)
def test_a_force_in_one_place_is_too_high(length, damping, prepared):
    """By the ratio of the two factors: 1 - exp(-pi s) over max of s (s sin - cos + exp(-s theta))/(1 + s^2), found
    here on a fine grid of theta (its error is of second order, 1e-8)."""
    scenario = crossing_text(length, damping)
    s = 2.0 * damping * FREQUENCY * length / SPEED
    theta = np.linspace(0.0, np.pi, 40_001)
    moving = float(np.max(s * (s * np.sin(theta) - np.cos(theta) + np.exp(-s * theta)) / (1.0 + s * s)))
    ratio = -math.expm1(-math.pi * s) / moving
    assert 1.0 < ratio < 0.5 * math.pi
    # the shape of the estimate is read at 961 places: 1.4e-6 by the chords
    assert formula(scenario, FIXED) / formula(scenario, CROSSING) == pytest.approx(ratio, rel=1e-5)
    assert formula(scenario, FIXED) / simulated(scenario, prepared) == pytest.approx(ratio, rel=5e-3)


def test_a_crossing_of_two_half_waves(prepared):
    """The amplitude turns round at mid-span; the half waves are half as long: (1/cycles)^2 is left out."""
    scenario = crossing_text(60.0, 0.005, "{ half_waves = 2 }")
    cycles = FREQUENCY * 60.0 / SPEED
    peak = simulated(scenario, prepared)
    assert peak / formula(scenario, CROSSING) == pytest.approx(1.0, abs=0.005**2 + (1.0 / cycles) ** 2 + 4e-4)


def test_the_second_harmonic(prepared):
    """A pace of half the frequency and a factor of 0.1. The first harmonic, with 0.4, is far off resonance and adds
    what it adds as a static force would: at most 0.4 W/M (1/4)/(1 - 1/4), which is 1.3 times 0.4 W/(4 M)."""
    scenario = crossing_text(75.0, 0.005, pace=0.5 * FREQUENCY, factors="[0.4, 0.1]")
    value = formula(scenario, CROSSING, harmonic=2)
    beside = 0.4 * WEIGHT / MASS * 0.25 / 0.75
    peak = simulated(scenario, prepared)
    assert value < peak < value * 1.005 + beside
    alone = simulated(crossing_text(75.0, 0.005, pace=0.5 * FREQUENCY, factors="[0.0, 0.1]"), prepared)
    assert alone / value == pytest.approx(1.0, abs=5e-3)


@pytest.mark.parametrize("side", [-1.0, 1.0])
@pytest.mark.parametrize(("length", "damping"), [(40.0, 0.003), (75.0, 0.01), (150.0, 0.02)])
def test_a_pace_off_the_mode_gives_less(length, damping, side, prepared):
    """3 % off: below one crossing in resonance.

    The direction is held, with 30 % to spare on all three decks; the amount has no hand formula here.
    """
    on = crossing_text(length, damping)
    off = crossing_text(length, damping, pace=FREQUENCY * (1.0 + 0.03 * side))
    assert simulated(off, prepared) < 0.7 * formula(on, CROSSING)


CROWD = """
arrival = {{ constant = {count} }}
pace = {pace}
speed = {speed}
weight = {weight}
load = {{ harmonics = [0.4] }}
"""


def test_thirty_at_once(prepared):
    """Thirty in resonance, phases and places at random, whoever leaves comes back at the other end.

    All walk alike, so the amplitude repeats itself every crossing time T: A(t) = sum over k of c_k exp(2 pi i k t/T),
    with c_k = f_k x (the resultant of n unit vectors of random direction), f_k = (2/pi)/(4 k^2 - 1) x
    1/|1 + 2 i k/s| of the steady state, from the Fourier series of |sin| and the lag of a mode with s = 2 zeta cycles.
    A resultant has the mean square n and is nearly Rayleigh, mean sqrt(pi n)/2 (n = 30: 0.4 % less). Hence

        mean of the peak >= that of |A| at any time = sqrt(pi)/2 sqrt(n sum f_k^2),
        mean of the peak <= sum of the means of |c_k| = sqrt(pi)/2 sqrt(n) sum f_k.

    100 realisations: three standard errors of the mean on either side.
    """
    length, damping, count = 60.0, 0.005, 30
    stream = CROWD.format(count=count, pace=FREQUENCY, speed=SPEED, weight=WEIGHT)
    scenario = text(length, damping, "{ half_waves = 1 }", stream, "duration = 80.0\nseed = 30")
    case = prepared(scenario)
    peaks = np.array([run_realisation(case, k).response.peak[0] for k in range(100)])
    error = 3.0 * peaks.std(ddof=1) / 10.0
    mean = peaks.mean()

    s = 2.0 * damping * FREQUENCY * length / SPEED
    k = np.arange(-400, 401)
    f = 2.0 / np.pi / np.abs(4.0 * k**2 - 1.0) / np.abs(1.0 + 2j * k / s)
    steady = formula(scenario, STEADY)
    low = 0.5 * math.sqrt(math.pi) * math.sqrt(count * np.sum(f**2)) * steady
    high = 0.5 * math.sqrt(math.pi) * math.sqrt(count) * np.sum(f) * steady
    assert high / low < 1.5  # the bounds are worth something
    assert error < 0.2 * mean
    assert low - error < mean < high + error

    one = formula(scenario, CROSSING)
    assert formula(scenario, SQUARE_ROOT) == pytest.approx(math.sqrt(30.0) * one, rel=1e-12)
    assert mean > 2.0 * one  # many are more than one, and fewer than all in step
    assert peaks.max() < count * one
    # the rule is a size, not a bound: most realisations are below it, some above, the mean is of its order
    assert 0.5 < mean / formula(scenario, SQUARE_ROOT) < 1.2


def test_a_stationary_stream(prepared):
    """Root mean square of one mode under a Poisson stream, 400 realisations of 300 s, fixed seed.

    The formula takes the density of pace at the resonance for that under the whole of it. Near the commonest pace,
    where the density is hollow to both sides, it is too high: by 2 % at zeta 0.5 % and 4 % at 1 % (Campbell's theorem,
    computed; see the test of the stationary stream, 0.979 and 0.960 at 1.92 Hz). Held here: the root mean square is 0
    to 4 % below the formula at zeta 0.5 %, with three standard errors on either side (false alarm below 0.27 %).
    """
    stream = """
arrival = { per_hour = 900 }
forward_share = 0.5
pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }
step_length = { mean = 0.71, sd = 0.071, min = 0.4, max = 1.1 }
weight = 750
load = { harmonics = [0.4] }
"""
    scenario = text(48.0, 0.005, "{ half_waves = 1 }", stream, "duration = 300\nseed = 4").replace(
        f"frequency = {FREQUENCY}", "frequency = 1.92"
    )
    case = prepared(scenario)
    squares = np.array([run_realisation(case, k).response.rms[0] ** 2 for k in range(400)])
    measured = math.sqrt(squares.mean())
    error = squares.std(ddof=1) / math.sqrt(squares.size) / squares.mean() / 2.0
    assert 3.0 * error < 0.03
    ratio = measured / formula(scenario, NARROW_SD)
    assert 0.96 - 3.0 * error < ratio < 1.0 + 3.0 * error
