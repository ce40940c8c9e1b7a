"""The modal model: ordinates at a foot, points of largest response, mean squares, the mass of people."""

from __future__ import annotations

import math

import numpy as np
import pytest

from crowdsim.bridge.modal import ModalModel, Mode
from crowdsim.bridge.ordinates import HalfWaves, Table

L, WIDTH = 48.0, 3.2


def wave(n: int, amplitude: float = 1.0) -> HalfWaves:
    return HalfWaves(n, L, amplitude)


def model(*modes: Mode) -> ModalModel:
    return ModalModel(L, WIDTH, modes)


V1 = Mode("V1", 1.92, 0.005, 38500.0, vertical=wave(1))
V3 = Mode("V3", 8.0, 0.01, 30000.0, vertical=wave(3))
T1 = Mode("T1", 3.0, 0.01, 2e4, twist=wave(1, 0.6))
L1 = Mode("L1", 0.9, 0.01, 4e4, lateral=wave(1))


def test_the_ordinate_at_a_foot_is_vertical_plus_e_times_twist() -> None:
    mode = Mode("m", 2.0, 0.01, 1e4, vertical=wave(1), twist=wave(2, 0.4), lateral=wave(3), longitudinal=wave(4))
    s, e = np.array([6.0, 12.0, 30.0]), np.array([1.0, -0.5, 0.25])
    x = math.pi * s / L
    np.testing.assert_allclose(mode.ordinate("vertical", s, e), np.sin(x) + e * 0.4 * np.sin(2 * x), rtol=1e-13)
    np.testing.assert_allclose(mode.ordinate("lateral", s, e), np.sin(3 * x), atol=1e-14)
    np.testing.assert_allclose(mode.ordinate("longitudinal", s, e), np.sin(4 * x), atol=1e-14)


def test_directions_and_what_a_vertical_force_can_drive() -> None:
    assert [m.directions for m in (V1, T1, L1)] == [("vertical",), ("vertical",), ("lateral",)]
    assert [m.driven for m in (V1, T1, L1)] == [True, True, False]
    assert model(L1, V1).directions == ("vertical", "lateral")


def test_a_time_constant() -> None:
    assert V1.time_constant == pytest.approx(1 / (0.005 * 2 * math.pi * 1.92), rel=1e-15)


def test_edges_are_looked_at_where_the_deck_twists() -> None:
    assert model(V1).edges == (0.0,)
    assert model(V1, T1).edges == (-1.6, 0.0, 1.6)


def test_of_equal_antinodes_the_one_nearest_mid_span_counts() -> None:
    s, e, ordinate = model(V3).largest(V3, "vertical")
    assert (s, e) == (pytest.approx(24.0, abs=1e-9), 0.0)
    assert ordinate == pytest.approx(-1.0, rel=1e-12)  # with its sign


def test_the_antinode_of_a_table_is_found_between_the_points() -> None:
    lopsided = Mode("m", 2.0, 0.01, 1e4, vertical=Table((0.0, 10.0, 20.0, 34.0, 48.0), (0.0, 0.6, 1.0, 0.8, 0.0)))
    s, _, ordinate = model(lopsided).largest(lopsided, "vertical")
    fine = np.linspace(0.0, L, 480_001)
    values = lopsided.ordinate("vertical", fine)
    assert ordinate == pytest.approx(values.max(), rel=1e-9)  # flat at the top: 1e-4 m beside it costs 1e-12
    assert s == pytest.approx(fine[np.argmax(values)], abs=0.01)
    assert ordinate > 1.0


def test_a_twist_alone_has_its_point_at_the_left_edge() -> None:
    (point,) = model(T1).antinodes
    assert (point.s, point.e) == (pytest.approx(24.0, abs=1e-9), 1.6)


def test_modes_at_one_place_share_a_point() -> None:
    (point,) = model(V1, V3).antinodes
    assert (point.name, point.direction) == ("V1+V3", "vertical")


@pytest.mark.parametrize("n", [1, 2, 5])
def test_the_mean_square_of_half_waves_is_one_half(n: int) -> None:
    mode = Mode("m", 2.0, 0.01, 1e4, vertical=wave(n, 0.8))
    assert model(mode).mean_square(mode) == pytest.approx(0.32, rel=1e-12)


def test_the_mean_square_with_offsets_by_hand() -> None:
    mode = Mode("m", 2.0, 0.01, 1e4, vertical=wave(1), twist=wave(1, 0.5), lateral=wave(2))
    # mean of sin^2 (1 + 0.5 e)^2 + sin^2: 0.5 (1 + E e + 0.25 E e^2) + 0.5
    assert model(mode).mean_square(mode, 0.4, 0.7) == pytest.approx(0.5 * (1 + 0.4 + 0.175) + 0.5, rel=1e-12)


def test_added_mass_lowers_the_frequency_and_keeps_the_rest() -> None:
    heavier = model(V1, T1).with_mass({"V1": 1500.0})
    assert heavier.modes[0].modal_mass == 40000.0
    assert heavier.modes[0].frequency == pytest.approx(1.92 * math.sqrt(38500 / 40000), rel=1e-15)
    assert heavier.modes[0].damping == 0.005
    assert heavier.modes[1] == T1


def test_a_mode_is_found_by_name() -> None:
    assert model(V1, V3).mode("V3") is V3
    with pytest.raises(KeyError):
        model(V1).mode("V9")
