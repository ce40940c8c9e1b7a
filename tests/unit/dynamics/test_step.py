"""The time step, the sampling of the force and the rule between samples: the errors that are stated."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from crowdsim.dynamics.interpolation import REACH, between_error, between_weights
from crowdsim.dynamics.kernels import CHUNK, TAPS
from crowdsim.dynamics.newmark import MEMBERS, Newmark
from crowdsim.dynamics.step import ENTRY_ERROR, choose, ordinate_error, parabola_error, steps_per_second


def choice(frequency: float = 2.0, harmonic: float = 7.0, **options: Any) -> Any:
    """A step for one half-wave mode on 48 m and 1.4 m/s."""
    before, cells, length = 300, 4096, 48.0
    s = (np.arange(cells + 2 * before + 2) - before) * length / cells
    shape = np.sin(options.pop("waves", 1) * math.pi * s / length)[:, None]
    values: dict[str, Any] = {"sharp": False, "per_second": 160, **options}
    scheme = values.pop("scheme", Newmark())
    return choose(
        scheme, np.array([frequency]), np.array([0.01]), harmonic, shape, before, length / cells, 1.4, **values
    )  # fmt: skip


@pytest.mark.parametrize("mode", [0.5, 2.0, 4.77, 12.0, 30.0])
@pytest.mark.parametrize("harmonic", [2.0, 7.3, 12.5])
def test_the_step_is_fine_enough_and_no_finer_than_it_must_be(mode: float, harmonic: float) -> None:
    n = steps_per_second(mode, harmonic)
    need = 2 * math.pi * max(mode / 0.3, harmonic / min(0.4, REACH / 4))
    assert n % 20 == 0
    assert n >= max(need, 100) * (1 - 1e-9)
    assert n - 20 < max(need, 100)


def test_the_force_is_sampled_every_fourth_step_where_that_is_good() -> None:
    made = choice()
    assert made.factor == 4
    assert made.sampling_error < 1e-4
    assert made.ordinate_error < 1e-4


def test_the_expected_error_is_the_sum_of_the_four_and_no_less_than_that_of_stepping_on_and_off() -> None:
    made = choice()
    assert made.expected_error == ENTRY_ERROR
    made = choice(per_second=60, scheme=Newmark.named("average-acceleration"))
    parts = made.peak_error + made.history_error + made.ordinate_error + made.sampling_error
    assert made.expected_error == parts > ENTRY_ERROR


def test_a_step_of_force_is_never_smoothed() -> None:
    assert choice(sharp=True).factor == 1


def test_a_coarse_given_step_is_sampled_more_often() -> None:
    assert choice(per_second=100).factor == 2  # 2 pi 7 x 4/100 = 1.76 beyond the reach of the rule, half of it within
    assert choice(per_second=40).factor == 1
    assert choice(per_second=40).time_step == 1 / 40


def test_a_sharp_shape_is_sampled_more_often() -> None:
    assert choice(waves=20).factor < 4


@pytest.mark.parametrize("name", MEMBERS)
def test_an_unstable_step_has_no_finite_error(name: str) -> None:
    made = choice(frequency=12.0, per_second=20, scheme=Newmark.named(name))  # omega dt = 3.77
    assert made.peak_error == math.inf
    assert made.expected_error == math.inf
    assert made.mode_angle == pytest.approx(2 * math.pi * 12.0 / 20)


@pytest.mark.parametrize("angle", [0.05, 0.1, 0.3])
def test_the_vertex_of_a_sine_is_off_by_the_fourth_power(angle: float) -> None:
    x = np.linspace(0.0, 0.5, 2001) * angle
    a, b, c = np.cos(x - angle), np.cos(x), np.cos(x + angle)
    vertex = b + (a - c) ** 2 / (8 * (2 * b - a - c))
    assert parabola_error(angle) == pytest.approx(np.abs(vertex - 1).max(), rel=1e-3)  # grids of 201 and 2001 places
    # series in the angle, derived here: 3/128 angle^4, next term smaller by some angle^2
    assert parabola_error(angle) == pytest.approx(3 / 128 * angle**4, rel=angle**2)


def test_the_error_of_the_parabolas_is_that_of_a_sine() -> None:
    cells, before = 4096, 100
    table = np.sin(math.pi * (np.arange(cells + 2 * before + 2) - before) / cells)[:, None]
    # largest error of a parabola over an interval h of sin(x): h^3 / (72 sqrt 3) at most; the program looks at six
    # places of an interval and takes its mid value from the table
    for chunk in (100.0, 200.0):
        h = math.pi * chunk / cells
        assert (
            0.9 * h**3 / (72 * math.sqrt(3)) < ordinate_error(table, chunk, before) < 1.02 * h**3 / (72 * math.sqrt(3))
        )
    assert ordinate_error(table, 0.5, before) == 0.0
    assert CHUNK == 32


@pytest.mark.parametrize("factor", [1, 2, 4])
def test_the_rule_between_samples_keeps_a_constant_and_a_slow_sine(factor: int) -> None:
    weights = between_weights(factor)
    assert weights.shape == (factor - 1, TAPS)
    np.testing.assert_allclose(weights.sum(axis=1), np.ones(factor - 1), rtol=1e-15)
    for j, row in enumerate(weights, start=1):
        places = np.arange(TAPS) - (TAPS // 2 - 1)
        for angle in (0.1, 0.7, REACH):
            for phase in (0.0, 1.0):
                exact = math.sin(angle * j / factor + phase)
                assert (
                    abs(row @ np.sin(angle * places + phase) - exact) <= between_error(factor, np.array(angle)) + 1e-15
                )


def test_the_rule_is_good_within_its_reach_and_useless_beyond_half_the_sampling() -> None:
    assert between_error(4, np.linspace(0.0, REACH, 50)).max() < 1e-4
    assert between_error(4, np.array(math.pi)) > 0.1


def test_another_factor_is_refused() -> None:
    with pytest.raises(ValueError, match="factor: 1, 2 or 4, not 3"):
        between_weights(3)
