"""Random stream with every pace's own response: against transfer functions, quadrature, limits and simulated streams.

The other side is written from the equation of motion and uses nothing of the package.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.signal import freqs
from scipy.stats import truncnorm, uniform

from crowdsim import parse_scenario
from crowdsim.guides.narrow_band import standard_deviation, stream_density
from crowdsim.guides.random_stream import amplification, paces, variance
from crowdsim.study.estimate import NARROW_SD, STREAM_SD, estimate
from crowdsim.study.jobs import run_realisation
from crowdsim.study.prepare import Case

# ---------------------------------------------------------------- the response of one pace


@pytest.mark.parametrize("frequency", [0.8, 1.95, 4.6])
@pytest.mark.parametrize("damping", [0.0005, 0.005, 0.02, 0.3])
def test_amplification_is_the_transfer_function(frequency: float, damping: float) -> None:
    """s^2/(s^2 + 2 zeta omega s + omega^2). In resonance omega^2 - omega^2 has lost digits: rounding over 2 zeta."""
    omega = 2.0 * math.pi * frequency
    ratio = np.concatenate([np.linspace(0.01, 3.0, 300), 1.0 + damping * np.linspace(-3.0, 3.0, 61), [1.0, 50.0]])
    _, response = freqs([1.0, 0.0, 0.0], [1.0, 2.0 * damping * omega, omega**2], worN=ratio * omega)
    np.testing.assert_allclose(amplification(ratio * frequency, frequency, damping), np.abs(response), rtol=1e-11)


def test_amplification_at_its_ends() -> None:
    """In resonance 1/(2 zeta); far above, the mass alone; far below, r^2: next to nothing."""
    found = amplification(np.array([2.0, 2e4, 2e-4]), 2.0, 0.004)
    np.testing.assert_allclose(found, [125.0, 1.0, 1e-8], rtol=1e-7)


# ---------------------------------------------------------------- the integral over the paces

PERSONS, MASS, SQUARE = 18.0, 40_000.0, 0.5
NORMAL = truncnorm((1.3 - 1.87) / 0.186, (2.6 - 1.87) / 0.186, loc=1.87, scale=0.186)
UNIFORM = uniform(1.6, 0.7)
DENSITIES = {"normal": NORMAL, "uniform": UNIFORM}


def force(pace: float | np.ndarray) -> float | np.ndarray:
    """Amplitude [N] of a harmonic that grows with the pace."""
    return 300.0 * (1.0 + 0.4 * (pace - 1.8))


def by_quadrature(of, force_at: Callable, harmonic: int, frequency: float, damping: float) -> float:
    """N <phi^2>/2 times the integral of p F^2 |H(k x)|^2, in pieces that end near the resonance; good to 1e-10."""
    low, high = of.support()
    centre = frequency / harmonic
    near = [centre * (1.0 + m * damping) for m in (-100, -30, -10, -3, -1, 0, 1, 3, 10, 30, 100)]
    edges = [low, *(x for x in near if low < x < high), high]

    def integrand(pace: float) -> float:
        r = harmonic * pace / frequency
        return of.pdf(pace) * force_at(pace) ** 2 * abs(r * r / (1.0 - r * r + 2j * damping * r)) ** 2

    total = math.fsum(quad(integrand, a, b, epsabs=0.0, epsrel=1e-11, limit=200)[0] for a, b in pairwise(edges))
    return 0.5 * PERSONS * SQUARE * total / MASS**2


def by_rule(of, force_at: Callable, harmonic: int, frequency: float, damping: float) -> float:
    """The same by the package."""
    x = paces(*of.support(), harmonic, frequency, damping)
    force_square = np.broadcast_to(force_at(x) ** 2, x.shape)
    return variance(PERSONS, SQUARE, x, of.pdf(x), force_square, harmonic, frequency, damping, MASS)


PLACES = [  # name of density, harmonic x pace at which the mode lies [Hz]
    ("normal", 1.0), ("normal", 1.3), ("normal", 1.5), ("normal", 1.87), ("normal", 2.5), ("normal", 2.6),
    ("normal", 3.4), ("uniform", 1.2), ("uniform", 1.6), ("uniform", 1.62), ("uniform", 1.95), ("uniform", 2.29),
    ("uniform", 2.3), ("uniform", 2.305), ("uniform", 2.6), ("uniform", 4.0),
]  # fmt: skip


@pytest.mark.parametrize("damping", [0.002, 0.005, 0.01, 0.02])
@pytest.mark.parametrize(("density", "place"), PLACES)
@pytest.mark.parametrize("harmonic", [1, 2])
def test_variance_is_the_integral(density: str, place: float, harmonic: int, damping: float) -> None:
    """Inside, at the edge and outside the paces.

    The paces near the resonance grow apart by a factor exp(h), h = ln(2000/zeta)/399, at most 0.035. Over the skirts,
    1/u^2 in the distance u, the trapezoidal rule gives (exp(h) + exp(-h))/2 = 1 + h^2/2 times the integral: at most
    6e-4 high where all of it is skirt. The even paces elsewhere, 1/800 of the range apart, leave 1e-5.
    """
    of = DENSITIES[density]
    frequency = harmonic * place
    step = math.log(2000.0 / damping) / 399.0
    found = by_rule(of, force, harmonic, frequency, damping)
    expected = by_quadrature(of, force, harmonic, frequency, damping)
    assert -1e-5 < found / expected - 1.0 < 0.5 * step**2 + 1e-5 < 6.5e-4


def test_variance_scales_as_it_must() -> None:
    """In proportion to the persons, the mean square ordinate and 1/M^2; rounding only."""
    x = paces(1.6, 2.3, 1, 2.0, 0.005)
    density, square = UNIFORM.pdf(x), force(x) ** 2
    one = variance(1.0, 1.0, x, density, square, 1, 2.0, 0.005, 1.0)
    assert variance(12.0, 0.3, x, density, square, 1, 2.0, 0.005, 7.0) == pytest.approx(one * 12.0 * 0.3 / 49.0)


def test_paces_are_in_order_within_the_range_and_close_in_resonance() -> None:
    """Nothing beyond the ends, wherever the mode lies; for a mode inside, the resonance itself is among them."""
    for place in (1.0, 1.6, 1.9, 2.3, 2.31, 3.0):
        for harmonic in (1, 2, 3):
            x = paces(1.6, 2.3, harmonic, harmonic * place, 0.005)
            assert np.all(np.diff(x) > 0.0)
            assert (x[0], x[-1]) == (1.6, 2.3)
            if 1.6 < place < 2.3:
                near = np.min(np.abs(x - place))
                assert near < 1e-12
                assert np.sum(np.abs(x - place) < 0.005 * place) > 200  # within the half-power band


# ---------------------------------------------------------------- the narrow band as the limit


def skirt(low: float, high: float) -> float:
    """Finite part of the integral of r^4/(1 - r^2)^2 from low to high, 1 between them (own derivation).

    r + r/(2 (1 - r^2)) + (3/4) ln|(1 - r)/(1 + r)|, whose derivative is r^4/(1 - r^2)^2.
    """

    def at(r: float) -> float:
        return r + 0.5 * r / (1.0 - r * r) + 0.75 * math.log(abs((1.0 - r) / (1.0 + r)))

    return at(high) - at(low)


@pytest.mark.parametrize("place", [1.7, 1.95, 2.2])
@pytest.mark.parametrize("harmonic", [1, 2, 3])
@pytest.mark.parametrize("damping", [0.001, 0.002, 0.005, 0.01])
def test_the_narrow_band_is_the_limit_of_low_damping(place: float, harmonic: int, damping: float) -> None:
    """A flat density and a force that is the same for all paces: the ratio of variances goes to 1 with zeta.

    The resonance holds pi/(4 zeta), the skirts the finite part above: 1 + (4 zeta/pi) x skirt, here within 20 zeta of
    1. What is left is of second order, at most (20 zeta)^2, and the rule's own 6e-4.
    """
    frequency = harmonic * place
    narrow = standard_deviation(
        stream_density(PERSONS, SQUARE, 300.0**2, float(UNIFORM.pdf(place)), harmonic), frequency, damping, MASS
    )
    ratio = by_rule(UNIFORM, lambda _: np.float64(300.0), harmonic, frequency, damping) / narrow**2
    first = 4.0 * damping / math.pi * skirt(1.6 / place, 2.3 / place)
    assert abs(first) < 20.0 * damping
    assert ratio == pytest.approx(1.0, abs=20.0 * damping + 6e-4)
    assert ratio == pytest.approx(1.0 + first, abs=(20.0 * damping) ** 2 + 6e-4)


def test_at_the_edge_of_a_flat_density_half_the_resonance_is_left() -> None:
    """The narrow band gives the whole up to the edge, so twice the variance; within 20 zeta."""
    for damping in (0.001, 0.005):
        half = by_rule(UNIFORM, lambda _: np.float64(300.0), 1, 2.3, damping)
        inside = standard_deviation(stream_density(PERSONS, SQUARE, 300.0**2, 1.0 / 0.7), 2.3, damping, MASS)
        assert half / inside**2 == pytest.approx(0.5, abs=20.0 * damping)


# ---------------------------------------------------------------- simulated streams

LENGTH, RATE, WEIGHT, REALISATIONS = 48.0, 0.25, 750.0, 1500
TEXT = """
[deck]
length = {length}
width = 2.5
[[mode]]
name = "V1"
frequency = {frequency}
damping = {damping}
modal_mass = {mass}
vertical = {{ half_waves = 1 }}
[[stream]]
name = "Ropewalk"
arrival = {{ per_hour = 900 }}
forward_share = 0.5
pace = {pace}
{stride}
weight = {weight}
load = {{ harmonics = {factors} }}
[run]
duration = 300
seed = 11
"""


@dataclass(frozen=True)
class Crowd:
    """A stream, its pace's law beside what the file says, and the mode it meets; bias: of the formula, computed."""

    pace: str
    stride: str
    law: Any
    speed: Callable[[float], float]
    frequency: float
    damping: float
    factors: list[float]
    bias: float

    def text(self) -> str:
        """The scenario."""
        return TEXT.format(
            length=LENGTH, frequency=self.frequency, damping=self.damping, mass=MASS, pace=self.pace,
            stride=self.stride, weight=WEIGHT, factors=self.factors,
        )  # fmt: skip

    def mean_square(self, length: float = LENGTH) -> float:
        """Mean square [m2/s4] with every crossing as it is: the force grows and fades as sin(pi t/T), T long.

        Campbell's theorem (textbook, from memory): arrivals per second x E of the energy of one response. By Parseval
        a harmonic of a crossing has (F/M)^2/2 times the integral of |H|^2 |W(nu - k x)|^2 over all nu, with
        |W(d)| = (2 T/pi) cos(pi d T)/(1 - (2 d T)^2) of a half sine; harmonics do not mix, for phases are random.
        Midpoints 2e-4 Hz apart, 80 in the half-power band of 2 Hz and 0.4 %, out to 12 Hz, where |W|^2 is 1e-10 of its
        height.
        """
        nu = (np.arange(-60_000, 60_000) + 0.5) * 2e-4
        r = nu / self.frequency
        response = r**4 / ((1.0 - r * r) ** 2 + (2.0 * self.damping * r) ** 2)
        low, high = self.law.support()
        x, w = np.polynomial.legendre.leggauss(240)
        total = 0.0
        for pace, share in zip(low + 0.5 * (high - low) * (x + 1.0), 0.5 * (high - low) * w, strict=True):
            time = length / self.speed(pace)
            for k, factor in enumerate(self.factors, start=1):
                d = 2.0 * (nu - k * pace) * time
                window = 2.0 * time / math.pi * np.cos(0.5 * math.pi * d) / (1.0 - d**2)
                energy = 0.5 * (factor * WEIGHT / MASS) ** 2 * float(np.sum(response * window**2)) * 2e-4
                total += float(share * self.law.pdf(pace)) * energy
        return RATE * total


EVEN = "{ distribution = 'uniform', min = 1.6, max = 2.3 }"
USUAL = "{ mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
CROWDS = {
    # whose own lines, v/L = 0.03 Hz wide, reach over the edge that the formula cuts off
    "just above the fastest": Crowd(EVEN, "speed = 1.5", UNIFORM, lambda _: 1.5, 2.305, 0.005, [0.4], -0.069),
    "among even paces": Crowd(EVEN, "speed = 1.5", UNIFORM, lambda _: 1.5, 1.95, 0.005, [0.4], 0.000),
    "among usual paces": Crowd(USUAL, "step_length = 0.75", NORMAL, lambda x: 0.75 * x, 1.92, 0.005, [0.4], 0.0015),
    "in the fast flank": Crowd(USUAL, "step_length = 0.75", NORMAL, lambda x: 0.75 * x, 2.4, 0.008, [0.4], -0.010),
    "second harmonic": Crowd(USUAL, "speed = 1.4", NORMAL, lambda _: 1.4, 3.8, 0.008, [0.4, 0.1], 0.0004),
}


def formula(scenario: str, name: str) -> float | None:
    """Value for the only mode in the only case."""
    (found,) = [m for m in estimate(parse_scenario(scenario)).methods if m.name == name]
    return found.value


@pytest.mark.parametrize("name", CROWDS)
def test_a_stationary_stream(name: str, prepared: Callable[[str], Case]) -> None:
    """Root mean square of 1500 realisations of 300 s together, fixed seed, beside the formula.

    What the formula leaves out is that each walker's force grows and fades: `bias`, against the exact sum of crossings
    (computed here, held to 0.1 %), below 1.5 % but where the mode lies beyond an edge of the paces, there 7 % too low.
    The simulation is within three standard errors of the exact sum (false alarm 0.27 % a case), and so within three
    standard errors and the bias of the formula.
    """
    crowd = CROWDS[name]
    exact = math.sqrt(crowd.mean_square())
    value = formula(crowd.text(), STREAM_SD)
    assert value is not None
    assert value / exact - 1.0 == pytest.approx(crowd.bias, abs=1e-3)
    case = prepared(crowd.text())
    squares = np.array([run_realisation(case, k).response.rms[0] ** 2 for k in range(REALISATIONS)])
    measured = math.sqrt(squares.mean())
    error = squares.std(ddof=1) / math.sqrt(squares.size) / squares.mean() / 2.0
    assert 3.0 * error < 0.04
    assert measured / exact == pytest.approx(1.0, abs=3.0 * error)
    assert value / measured == pytest.approx(1.0, abs=3.0 * error + abs(crowd.bias) + 2e-3)


@pytest.mark.parametrize("name", CROWDS)
def test_what_grows_and_fades_is_lost_on_a_long_deck(name: str) -> None:
    """On a deck ten times as long lines are a tenth as wide, and the bias is below 0.5 % even beyond the edge.

    The number on the deck grows with its length, so the variance does.
    """
    crowd = CROWDS[name]
    value = formula(crowd.text(), STREAM_SD)
    assert value is not None
    short, long = (value / math.sqrt(crowd.mean_square(x) * LENGTH / x) - 1.0 for x in (LENGTH, 10.0 * LENGTH))
    assert abs(long) < 0.005
    assert abs(long) < max(abs(short), 1e-3)


def test_beyond_the_edge_the_narrow_band_has_nothing() -> None:
    """Nobody walks at exactly the pace, and yet there is a response."""
    text = CROWDS["just above the fastest"].text()
    assert formula(text, NARROW_SD) is None
    assert formula(text, STREAM_SD) == pytest.approx(0.142, abs=5e-4)  # computed


def test_in_the_flank_the_narrow_band_is_too_low() -> None:
    """At 2.4 Hz few walk at the pace, and the many beside it count for more: by more than a quarter (computed)."""
    text = CROWDS["in the fast flank"].text()
    narrow, whole = formula(text, NARROW_SD), formula(text, STREAM_SD)
    assert narrow is not None
    assert whole is not None
    assert whole / narrow == pytest.approx(1.28, abs=0.005)
