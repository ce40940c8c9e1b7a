"""The modal model: mean squares of ordinates by quadrature, frequency with added mass, antinodes, tables."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.interpolate import PchipInterpolator, make_interp_spline

from crowdsim import HalfWaves, ModalModel, Mode, Table

LENGTH, WIDTH = 42.0, 3.4
PLACES = (0.0, 7.0, 15.0, 23.5, 31.0, 42.0)
VALUES = (0.0, 0.55, 1.0, 0.6, -0.2, 0.1)


def model(**ordinates):
    return ModalModel(LENGTH, WIDTH, (Mode("one", 2.0, 0.005, 30_000.0, **ordinates),))


def by_quadrature(function):
    """Mean over the deck, piece by piece between the points of the tables."""
    edges = sorted({*PLACES, LENGTH})
    return sum(quad(function, a, b, epsabs=1e-13)[0] for a, b in itertools.pairwise(edges)) / LENGTH


@pytest.mark.parametrize("half_waves", [1, 2, 3, 7])
def test_mean_square_of_half_waves(half_waves):
    """1/2 for every number of half waves, amplitude squared; Simpson's rule on 4800 divisions errs below 1e-10."""
    bridge = model(vertical=HalfWaves(half_waves, LENGTH, 0.8))
    assert bridge.mean_square(bridge.modes[0]) == pytest.approx(0.5 * 0.8**2, rel=1e-10)


@pytest.mark.parametrize("interpolation", ["spline", "linear", "monotone"])
def test_mean_square_of_a_table(interpolation):
    """Against adaptive quadrature of the curve. Tolerance: Simpson's rule over a kink errs by (L/4800)^2."""
    curves = {
        "spline": make_interp_spline(PLACES, VALUES, k=3, bc_type="natural"),
        "monotone": PchipInterpolator(PLACES, VALUES),
        "linear": lambda s: np.interp(s, PLACES, VALUES),
    }
    bridge = model(vertical=Table(PLACES, VALUES, interpolation))
    expected = by_quadrature(lambda s: float(curves[interpolation](s)) ** 2)
    assert bridge.mean_square(bridge.modes[0]) == pytest.approx(expected, rel=1e-7)


def test_mean_square_with_twist_and_all_directions():
    """Mean of (vertical + e twist)^2 over s and over persons' offsets e, plus lateral and longitudinal squared."""
    bridge = model(
        vertical=HalfWaves(1, LENGTH),
        twist=Table(PLACES, VALUES, "spline"),
        lateral=HalfWaves(2, LENGTH, 0.3),
        longitudinal=HalfWaves(1, LENGTH, 0.1),
    )
    twist = make_interp_spline(PLACES, VALUES, k=3, bc_type="natural")
    offsets = np.array([-1.2, -0.3, 0.4, 1.5])

    def square(s):
        vertical = np.sin(np.pi * s / LENGTH) + offsets * twist(s)
        sideways = 0.3 * np.sin(2.0 * np.pi * s / LENGTH)
        along = 0.1 * np.sin(np.pi * s / LENGTH)
        return float(np.mean(vertical**2)) + sideways**2 + along**2

    got = bridge.mean_square(bridge.modes[0], float(offsets.mean()), float((offsets**2).mean()))
    assert got == pytest.approx(by_quadrature(square), rel=1e-9)


@pytest.mark.parametrize(("added", "factor"), [(0.0, 1.0), (30_000.0, 1.0 / np.sqrt(2.0)), (90_000.0, 0.5)])
def test_frequency_with_added_mass(added, factor):
    """Stiffness stays, so the frequency falls by sqrt(M/(M + m)); the damping ratio is kept, other modes stay."""
    modes = (Mode("one", 2.0, 0.005, 30_000.0, HalfWaves(1, LENGTH)), Mode("two", 3.0, 0.01, 1.0, HalfWaves(2, LENGTH)))
    bridge = ModalModel(LENGTH, WIDTH, modes).with_mass({"one": added})
    assert bridge.mode("one").frequency == pytest.approx(2.0 * factor, rel=1e-14)
    assert bridge.mode("one").modal_mass == 30_000.0 + added
    assert bridge.mode("one").damping == 0.005
    assert bridge.mode("two") == modes[1]


def test_a_case_with_the_persons_mass(prepared):
    """people = "mass": M + persons x mean mass x mean square of the ordinate; a half wave and a known crowd, by hand.

    0.4 persons/m2 on 42 x 3.4 m are 57.12 persons of 75 kg, 2142 kg on a half wave; pace and step length do not matter.
    """
    text = f"""
        [deck]
        length = {LENGTH}
        width = {WIDTH}
        [[mode]]
        name = "V1"
        frequency = 2.0
        damping = 0.005
        modal_mass = 30000.0
        vertical = {{ half_waves = 1 }}
        [[stream]]
        name = "crowd"
        arrival = {{ density = 0.4 }}
        weight = {75.0 * 9.81}
        [[case]]
        name = "with mass"
        people = "mass"
    """
    case = prepared(text)
    mass = 30_000.0 + 0.5 * 0.4 * LENGTH * WIDTH * 75.0
    assert mass == pytest.approx(32_142.0)
    assert case.driven[0].modal_mass == pytest.approx(mass, rel=1e-9)
    assert case.driven[0].frequency == pytest.approx(2.0 * np.sqrt(30_000.0 / mass), rel=1e-9)


@pytest.mark.parametrize(("half_waves", "place"), [(1, 21.0), (2, 10.5), (3, 21.0)])
def test_antinode_of_half_waves(half_waves, place):
    """Largest ordinate; of equal ones the nearest to mid-span (for two half waves either quarter point)."""
    (point,) = model(vertical=HalfWaves(half_waves, LENGTH)).antinodes
    assert point.s in (pytest.approx(place), pytest.approx(LENGTH - place))
    assert (point.e, point.direction) == (0.0, "vertical")


def test_antinode_of_a_twisting_mode_is_at_an_edge():
    """|vertical + e twist| over e in {-width/2, 0, width/2}: both of one sign, the left edge, and its ordinate."""
    bridge = model(vertical=HalfWaves(1, LENGTH, 0.6), twist=HalfWaves(1, LENGTH, 0.2))
    (point,) = bridge.antinodes
    assert point.s == pytest.approx(0.5 * LENGTH)
    assert point.e == 0.5 * WIDTH
    s, e, ordinate = bridge.largest(bridge.modes[0], "vertical")
    assert (s, e) == (pytest.approx(point.s), point.e)
    assert ordinate == pytest.approx(0.6 + 0.5 * WIDTH * 0.2, rel=1e-12)
    turned = model(vertical=HalfWaves(1, LENGTH, 0.6), twist=HalfWaves(1, LENGTH, -0.2))
    assert turned.antinodes[0].e == -0.5 * WIDTH


def test_antinode_of_a_table_is_found_between_its_points():
    """Largest |spline| on a fine grid; the place to the program's division of the deck over 200."""
    bridge = model(vertical=Table(PLACES, VALUES))
    fine = np.linspace(0.0, LENGTH, 2_000_001)
    curve = np.abs(make_interp_spline(PLACES, VALUES, k=3, bc_type="natural")(fine))
    s, _, ordinate = bridge.largest(bridge.modes[0], "vertical")
    assert ordinate == pytest.approx(curve.max(), rel=1e-8)
    assert s == pytest.approx(fine[curve.argmax()], abs=2.0 * LENGTH / 4800 / 100)


@pytest.mark.parametrize("interpolation", ["spline", "linear", "monotone"])
def test_tables_run_straight_on_beyond_the_ends(interpolation):
    """Through its points, and beyond the ends along the slope there (which a finite difference gives to 1e-6)."""
    table = Table(PLACES, VALUES, interpolation)
    np.testing.assert_allclose(table(np.array(PLACES)), VALUES, atol=1e-14)
    for end, inward in ((0.0, 1.0), (LENGTH, -1.0)):
        near = table(np.array([end, end + 1e-5 * inward, end - 0.5 * inward]))
        slope = (near[1] - near[0]) / (1e-5 * inward)
        assert near[2] - near[0] == pytest.approx(-0.5 * inward * slope, abs=1e-6)


def test_few_points_are_joined_by_straight_lines():
    """Fewer than four points: linear, whatever was asked."""
    table = Table((0.0, 20.0, 42.0), (0.0, 1.0, 0.0), "spline")
    assert table.used == "linear"
    assert float(table(np.array(10.0))) == pytest.approx(0.5)
