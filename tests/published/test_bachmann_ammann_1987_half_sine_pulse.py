"""Running as half-sine pulses: Fourier factors and phases against quadrature of the pulse itself.

Source: H. Bachmann & W. Ammann, Vibrations in Structures Induced by Man and Machines, IABSE Structural Engineering
Documents 3e, 1987, from memory: F(t) = k_p G sin(pi t/t_c) during the contact t_c, nought during the flight, a pulse a
step (T = 1/pace, feet alternate); the mean force is the weight, k_p = pi/(2 r) with the contact ratio r = t_c/T.
The series is computed: alpha_n = 2 |cos(pi n r)|/|1 - 4 n^2 r^2|, pi/2 where 2 n r = 1.

Symbol map: r -> contact_ratio, alpha_n -> load factor; t = 0 is the touch-down, as in the formula.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from crowdsim import load_set
from crowdsim.loads.jogging import PULSE_HARMONICS, pulse_factor

# r, alpha_1 .. alpha_4: computed, three decimals
TABLE = [
    (0.45, 1.647, 0.849, 0.144, 0.135),
    (0.50, 1.571, 0.667, 0.000, 0.133),
    (0.55, 1.490, 0.495, 0.092, 0.088),
    (0.60, 1.405, 0.340, 0.135, 0.028),
    (0.65, 1.316, 0.204, 0.139, 0.024),
    (0.70, 1.225, 0.090, 0.114, 0.053),
]
RATIOS = [0.3, 0.375, 0.45, 0.5, 0.55, 0.6, 2 / 3, 0.7, 0.72, 0.9, 1.0]


def pulse(turn, ratio):
    """Force over weight a share `turn` of a step after touch-down."""
    turn = np.mod(turn, 1.0)
    return np.where(turn < ratio, 0.5 * np.pi / ratio * np.sin(np.pi * turn / ratio), 0.0)


def coefficient(harmonic, ratio):
    """Complex amplitude c of c exp(2 pi i n t/T): (2/T) int F exp(-2 pi i n t/T) dt, by quadrature over the contact."""

    def part(wave):
        return quad(
            lambda x: float(pulse(x, ratio)) * wave(2.0 * np.pi * harmonic * x), 0.0, ratio, epsabs=1e-12, limit=200
        )[0]

    return complex(2.0 * part(np.cos), -2.0 * part(np.sin))


@pytest.mark.parametrize(("ratio", "row"), [(r, row) for r, *row in TABLE])
def test_factors(ratio, row):
    """Half a unit of the third decimal."""
    factors = load_set("jogging", "half-sine", contact_ratio=ratio).factors(np.array([2.6]))[0]
    np.testing.assert_allclose(factors, row, atol=0.5e-3)


@pytest.mark.parametrize("ratio", RATIOS)
def test_factors_and_phases_by_quadrature(ratio):
    """a sin(n theta + phase) is the real part of -i a exp(i phase) exp(i n theta), theta from touch-down.

    Complex amplitudes agree to the quadrature's 1e-10, factor and phase together (a factor may be nought).
    """
    factors, phases = load_set("jogging", "half-sine", contact_ratio=ratio).draw(
        np.array([2.7]), np.random.default_rng(0), np.random.default_rng(1000)
    )
    assert factors.shape == (1, PULSE_HARMONICS)
    for n in range(1, PULSE_HARMONICS + 1):
        got = -1j * factors[0, n - 1] * np.exp(1j * phases[0, n - 1])
        assert got == pytest.approx(coefficient(n, ratio), abs=1e-10)
    assert quad(lambda x: float(pulse(x, ratio)), 0.0, ratio)[0] == pytest.approx(1.0, rel=1e-10)


@pytest.mark.parametrize("ratio", [0.5, 0.6, 0.72])
def test_the_series_is_the_pulse(ratio):
    """400 terms of the signed series, 1 + sum c_n cos(2 pi n (t - t_c/2)/T), against the pulse over a step.

    The pulse has a kink, so terms fall like 1/n^2: what is left beyond N is at most the sum of the rest, about
    1/(2 r^2 N).
    """
    turn = np.linspace(0.0, 1.0, 501)
    terms = 400
    series = 1.0 + sum(
        pulse_factor(n, ratio) * np.cos(2.0 * np.pi * n * (turn - 0.5 * ratio)) for n in range(1, terms + 1)
    )
    assert np.abs(series - pulse(turn, ratio)).max() < 1.0 / (2.0 * ratio**2 * terms)


@pytest.mark.parametrize(("harmonic", "ratio"), [(1, 0.5), (2, 0.25)])
def test_where_the_formula_is_nought_over_nought(harmonic, ratio):
    """2 n r = 1: pi/2; and the same a hair beside, to the distance from it."""
    assert pulse_factor(harmonic, ratio) == pytest.approx(0.5 * np.pi, rel=1e-12)
    for beside in (1e-6, -1e-6):
        assert pulse_factor(harmonic, ratio + beside) == pytest.approx(0.5 * np.pi, abs=1e-5)


def test_range_and_refusals():
    """1.5 to 4 Hz (the program's choice), a contact ratio from 0.3 to 1, which must be given."""
    chosen = load_set("jogging", "half-sine", contact_ratio=0.6)
    np.testing.assert_array_equal(chosen.held(np.array([1.0, 5.0])), [1.5, 4.0])
    np.testing.assert_array_equal(chosen.factors(np.array([1.0])), chosen.factors(np.array([5.0])))
    for wrong in (0.29, 1.01):
        with pytest.raises(ValueError, match="contact_ratio"):
            load_set("jogging", "half-sine", contact_ratio=wrong)
    with pytest.raises(ValueError, match="contact_ratio"):
        load_set("jogging", "half-sine")
    with pytest.raises(ValueError, match="contact_ratio"):
        load_set("jogging", "bachmann-1995", contact_ratio=0.6)
