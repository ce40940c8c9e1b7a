"""Frequency from the static deflection, f = 18 / sqrt(deflection in mm): common practice.

The rule is compared with uniform beams, whose constant f sqrt(deflection) is found here from beam theory (textbook):
the roots lambda of the frequency equations, f = lambda^2/(2 pi) sqrt(E I/(m L^4)), and the largest deflection under
m g, a polynomial of the fourth degree. Constants are computed, with g = 9.81 m/s2.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from crowdsim.guides.static_deflection import deflection, frequency

GRAVITY = 9.81
SIMPLE, FIXED, FREE = (0, 2), (0, 1), (2, 3)  # derivatives of the deflection that vanish at an end

# name, conditions at both ends, frequency equation, bracket of its first root, constant [Hz sqrt(mm)]
BEAMS = [
    ("simply supported", SIMPLE, SIMPLE, math.sin, (2.0, 4.0), 17.75),
    ("propped", FIXED, SIMPLE, lambda x: math.tan(x) - math.tanh(x), (3.2, 4.5), 17.89),
    ("fixed at both ends", FIXED, FIXED, lambda x: math.cos(x) * math.cosh(x) - 1.0, (4.0, 5.0), 18.00),
    ("cantilever", FIXED, FREE, lambda x: math.cos(x) * math.cosh(x) + 1.0, (1.0, 3.0), 19.60),
]


def largest_deflection(left, right):
    """c of c m g L^4/(E I): w = x^4/24 + a cubic that meets the conditions at the ends."""
    load = np.polynomial.Polynomial([0.0, 0.0, 0.0, 0.0, 1.0 / 24.0])
    powers = [np.polynomial.Polynomial.basis(k) for k in range(4)]
    conditions = [(0.0, order) for order in left] + [(1.0, order) for order in right]

    def at(polynomial, x, order):
        return polynomial.deriv(order)(x) if order else polynomial(x)

    matrix = [[at(power, x, order) for power in powers] for x, order in conditions]
    cubic = np.linalg.solve(matrix, [-at(load, x, order) for x, order in conditions])
    curve = load + np.polynomial.Polynomial(cubic)
    return float(np.abs(curve(np.linspace(0.0, 1.0, 20_001))).max())


def constant(left, right, equation, bracket):
    """f sqrt(deflection in mm) of a uniform beam, whatever its span, stiffness and mass."""
    root = brentq(equation, *bracket, xtol=1e-13)
    return root**2 / (2.0 * math.pi) * math.sqrt(largest_deflection(left, right) * GRAVITY * 1e3)


def test_a_hundred_millimetres_are_1_8_hertz():
    """Common practice; 18 / sqrt(100) exactly."""
    assert frequency(0.100) == pytest.approx(1.80, rel=1e-12)
    assert frequency(0.001) == pytest.approx(18.0, rel=1e-12)


@pytest.mark.parametrize("value", [0.5, 1.8, 4.0, 12.0])
def test_inverse(value):
    """Rounding only."""
    assert frequency(deflection(value)) == pytest.approx(value, rel=1e-14)


@pytest.mark.parametrize(("name", "left", "right", "equation", "bracket", "expected"), BEAMS)
def test_constants_of_uniform_beams(name, left, right, equation, bracket, expected):
    """As the module's text has them: half a unit of the last digit."""
    assert constant(left, right, equation, bracket) == pytest.approx(expected, abs=0.005)


@pytest.mark.parametrize(
    ("left", "right", "coefficient"), [(SIMPLE, SIMPLE, 5 / 384), (FIXED, FIXED, 1 / 384), (FIXED, FREE, 1 / 8)]
)
def test_deflections_of_uniform_beams(left, right, coefficient):
    """Textbook; the largest of 20 001 places is at one of them."""
    assert largest_deflection(left, right) == pytest.approx(coefficient, rel=1e-11)


@pytest.mark.parametrize(("name", "left", "right", "equation", "bracket", "expected"), BEAMS)
def test_the_rule_against_uniform_beams(name, left, right, equation, bracket, expected):
    """Within 2 % for a span held at both ends: the rule rounds 17.75 to 18.00. Not for a cantilever: 8 % low."""
    ratio = frequency(0.050) * math.sqrt(50.0) / constant(left, right, equation, bracket)
    if name == "cantilever":
        assert ratio == pytest.approx(0.9186, abs=0.5e-3)
    else:
        assert ratio == pytest.approx(1.0, abs=0.02)
        assert ratio > 0.9999


def test_the_rule_is_high_for_a_lumped_mass():
    """sqrt(g/deflection)/(2 pi), 15.76 with g = 9.81: 14 % below the rule."""
    lumped = math.sqrt(GRAVITY / 0.050) / (2.0 * math.pi)
    assert lumped * math.sqrt(50.0) == pytest.approx(15.76, abs=0.005)
    assert frequency(0.050) / lumped == pytest.approx(1.142, abs=0.5e-3)


@pytest.mark.parametrize("function", [frequency, deflection])
@pytest.mark.parametrize("value", [0.0, -0.01, math.nan, math.inf])
def test_what_cannot_be(function, value):
    with pytest.raises(ValueError, match="must be above 0"):
        function(value)
