"""Ordinates along the deck: half waves, tables, how a curve runs on beyond the ends and leaves its table."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.interpolate import CubicSpline, PchipInterpolator

from crowdsim.bridge.ordinates import HalfWaves, Table

S = (0.0, 12.0, 24.0, 36.0, 48.0)
VALUE = (0.0, 0.7, 1.0, 0.7, 0.0)
FINE = np.linspace(0.0, 48.0, 97)


def test_half_waves_with_their_amplitude_also_beyond_the_ends() -> None:
    s = np.array([-1.0, 0.0, 6.0, 12.0, 48.0, 49.0])
    expected = [-2.0 * math.sin(2 * math.pi * x / 48.0) for x in s]
    np.testing.assert_allclose(HalfWaves(2, 48.0, -2.0)(s), expected, atol=1e-15)
    assert HalfWaves(1, 48.0)(24.0) == 1.0


def test_a_table_goes_through_its_points() -> None:
    for how in ("spline", "linear", "monotone"):
        np.testing.assert_allclose(Table(S, VALUE, how)(np.array(S)), VALUE, atol=1e-15)  # type: ignore[arg-type]


def test_the_spline_has_natural_ends() -> None:
    natural = CubicSpline(S, VALUE, bc_type=((2, 0.0), (2, 0.0)))
    np.testing.assert_allclose(Table(S, VALUE)(FINE), natural(FINE), atol=1e-14)


def test_the_monotone_curve_stays_within_its_points() -> None:
    table = Table((0.0, 10.0, 20.0, 28.0, 38.0, 48.0), (0.0, 0.0, 1.0, 1.0, 0.0, 0.0), "monotone")
    np.testing.assert_allclose(table(FINE), PchipInterpolator(table.s, table.value)(FINE), atol=1e-14)
    assert table.excursion() == 0.0


def test_fewer_than_four_points_are_joined_by_straight_lines() -> None:
    table = Table((0.0, 24.0, 48.0), (0.0, 1.0, 0.5))
    assert table.used == "linear"
    np.testing.assert_allclose(table(np.array([12.0, 36.0])), [0.5, 0.75], rtol=1e-15)
    assert table.excursion() == 0.0


@pytest.mark.parametrize("how", ["spline", "linear", "monotone"])
def test_a_table_runs_straight_on_beyond_its_ends(how: str) -> None:
    table = Table(S, VALUE, how)  # type: ignore[arg-type]
    small = 1e-6
    for end, side in ((0.0, -1.0), (48.0, 1.0)):
        inside = (float(table(end)) - float(table(end - side * small))) / (side * small)
        outside = (float(table(end + side * 3.0)) - float(table(end))) / (side * 3.0)
        # a one-sided difference over 1e-6 m of a curve with second derivatives below 0.1: 1e-7 and rounding
        assert outside == pytest.approx(inside, abs=1e-6)


def test_the_excursion_is_a_share_of_the_largest_ordinate() -> None:
    table = Table((0.0, 10.0, 20.0, 28.0, 38.0, 48.0), (0.0, 0.0, 2.0, 2.0, 0.0, 0.0))
    curve = CubicSpline(table.s, table.value, bc_type="natural")(np.linspace(0, 48, 4801))
    assert table.excursion() == pytest.approx(max(curve.max() - 2.0, -curve.min()) / 2.0, rel=1e-12)
    assert table.excursion() > 0.02
