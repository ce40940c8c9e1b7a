"""The time step, how often the force is sampled, and the error to expect."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from crowdsim.dynamics.interpolation import REACH, between_error
from crowdsim.dynamics.kernels import CHUNK
from crowdsim.dynamics.newmark import Newmark, acceleration_response

Floats = NDArray[np.float64]
MODE_ANGLE = 0.3  # rad per step at the highest mode
HARMONIC_ANGLE = 0.4
ORDINATE_ERROR = 1e-4
ENTRY_ERROR = 1e-4  # a person's force begins and ends with a kink between samples; measured in the tests
_ROUND = 20
_LEAST = 100


@dataclass(frozen=True)
class StepChoice:
    """The step in force and what it costs in accuracy.

    per_second : steps in a second; factor : steps in a sample of the force
    peak_error : of a peak, by the parabola through three samples at the highest mode
    history_error : of the response, relative to a resonant peak, over all modes and harmonics
    ordinate_error : of the ordinates between their table values, relative to the largest
    sampling_error : largest of any harmonic at the steps between samples
    mode_angle : omega dt of the highest mode [rad]
    """

    per_second: int
    factor: int
    peak_error: float
    history_error: float
    ordinate_error: float
    sampling_error: float
    mode_angle: float

    @property
    def time_step(self) -> float:
        """[s]"""
        return 1.0 / self.per_second

    @property
    def expected_error(self) -> float:
        """Relative error of a peak to expect: the four parts, and at least that of stepping on and off."""
        return max(ENTRY_ERROR, self.peak_error + self.history_error + self.ordinate_error + self.sampling_error)


def parabola_error(angle: float) -> float:
    """Largest relative error of the vertex through three samples of a sine, `angle` [rad] apart."""
    offset = np.linspace(0.0, 0.5, 201) * angle
    a, b, c = (np.cos(offset + k * angle) for k in (-1, 0, 1))
    vertex = b - (c - a) ** 2 / (8.0 * (a - 2.0 * b + c))
    return float(np.abs(vertex - 1.0).max())


def ordinate_error(table: Floats, cells: float, before: int) -> float:
    """Largest error of parabolas over chunks of `cells` table cells, relative to the largest ordinate.

    table : [cell, column], the deck from cell `before` to the last but `before` and two.
    """
    if cells < 1.0:
        return 0.0
    inside = table[before : table.shape[0] - before - 1]
    top = np.abs(inside).max(axis=0)
    x = np.arange(table.shape[0], dtype=np.float64)
    starts = np.linspace(before, table.shape[0] - before - 2 - cells, 257)
    worst = 0.0
    for column in range(table.shape[1]):
        if top[column] == 0.0:
            continue
        y = table[:, column]
        a, b, c = (np.interp(starts + share * cells, x, y) for share in (0.0, 0.5, 1.0))
        for share in (0.1, 0.21, 0.35, 0.65, 0.79, 0.9):
            t = 2.0 * share - 1.0
            curve = b + t * (0.5 * (c - a) + t * 0.5 * (a - 2.0 * b + c))
            worst = max(worst, float(np.abs(curve - np.interp(starts + share * cells, x, y)).max() / top[column]))
    return worst


def steps_per_second(highest_mode: float, highest_harmonic: float) -> int:
    """Steps in a second for modes up to `highest_mode` and a load up to `highest_harmonic` [Hz].

    omega dt at most 0.3 at the highest mode (a peak within 0.1 %), and the load's highest harmonic
    within the reach of the rule between samples of four steps.
    """
    need = 2.0 * math.pi * max(highest_mode / MODE_ANGLE, highest_harmonic / min(HARMONIC_ANGLE, REACH / 4.0))
    return max(_LEAST, _ROUND * math.ceil(need / _ROUND - 1e-9))


def choose(
    scheme: Newmark,
    frequency: Floats,
    damping: Floats,
    highest_harmonic: float,
    ordinates: Floats,
    before: int,
    cell: float,
    mean_speed: float,
    *,
    sharp: bool,
    per_second: int,
) -> StepChoice:
    """The samples of the force at a step of 1/per_second, and the errors that both leave.

    Parameters
    ----------
    frequency, damping : [mode] of the driven modes
    highest_harmonic : of the load [Hz]
    ordinates : [cell, mode] fine table with `before` cells beyond each end, `cell` [m] long
    mean_speed : of the fastest stream [m/s]
    sharp : the force is sampled at every step: an ordinate does not vanish at an end, so that the
        force begins with a step which no rule between samples may smooth; or nothing resonates,
        so that the kink of stepping on is not small beside the response
    """
    top = float(np.max(frequency))
    n = per_second
    dt = 1.0 / n
    factor, curve = 1, 0.0
    for factor in (4, 2, 1):
        curve = ordinate_error(ordinates, mean_speed * dt * factor * CHUNK / cell, before)
        fits = 2.0 * math.pi * highest_harmonic * dt * factor <= REACH * 1.0001
        if factor == 1 or (fits and curve <= ORDINATE_ERROR and not sharp):
            break
    load = np.linspace(0.5, max(highest_harmonic, 1.0), 200)
    history = 0.0
    for f, z in zip(frequency, damping, strict=True):
        if 2.0 * math.pi * f * dt >= min(scheme.stability_limit, math.pi):
            return StepChoice(n, factor, math.inf, math.inf, curve, 0.0, 2.0 * math.pi * top * dt)
        at = np.append(load, f)
        exact = acceleration_response(None, float(f), float(z), at, dt)
        numerical = acceleration_response(scheme, float(f), float(z), at, dt)
        scale = max(float(np.abs(exact).max()), 1.0)
        history = max(history, float(np.abs(numerical - exact).max()) / scale)
    angle = 2.0 * math.pi * highest_harmonic * dt * factor
    between = float(between_error(factor, np.linspace(0.0, angle, 200)).max()) if factor > 1 else 0.0
    return StepChoice(
        n, factor, parabola_error(2.0 * math.pi * top * dt), history, curve, between, 2.0 * math.pi * top * dt
    )
