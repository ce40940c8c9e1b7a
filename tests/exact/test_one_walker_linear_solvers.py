"""One walker under two independent linear solvers at an eighth of the step: scipy's lsim and pyyeti's SolveExp2.

Both are exact for a force that is linear between their points, so they err by V^2/12 on a harmonic of V [rad] per
point. Tolerance: that, at the highest mode, and the error that the program states for its own step; 0.03 % together.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.signal import lsim

FINER = 8
LENGTH, MASS = 42.0, 35_000.0
MODES = [(1.93, 0.004, 1), (3.85, 0.006, 2), (5.8, 0.008, 3)]  # Hz, damping, half waves


def scenario_text(walker):
    tables = "".join(
        f"""
        [[mode]]
        name = "V{n}"
        frequency = {frequency}
        damping = {damping}
        modal_mass = {MASS}
        vertical = {{ half_waves = {n} }}
        """
        for frequency, damping, n in MODES
    )
    return f"""
        [deck]
        length = {LENGTH}
        width = 3.0
        {tables}
        {walker.stream()}
        [run]
        duration = 40.0
        realisations = 1
        """


def by_lsim(force, time):
    """Modal accelerations [time, mode], each mode by itself."""
    found = []
    for j, (frequency, damping, _) in enumerate(MODES):
        w = 2.0 * np.pi * frequency
        system = (
            [[0.0, 1.0], [-(w**2), -2.0 * damping * w]], [[0.0], [1.0]], [[-(w**2), -2.0 * damping * w]], [[1.0]],
        )  # fmt: skip
        found.append(lsim(system, force[:, j], time)[1])
    return np.stack(found, axis=1)


def by_pyyeti(force, time):
    """Modal accelerations [time, mode], all modes in one system."""
    ode = pytest.importorskip("pyyeti.ode")
    w = 2.0 * np.pi * np.array([f for f, _, _ in MODES])
    damping = np.array([z for _, z, _ in MODES])
    solver = ode.SolveExp2(np.eye(w.size), np.diag(2.0 * damping * w), np.diag(w**2), time[1] - time[0])
    return solver.tsolve(np.ascontiguousarray(force.T)).a.T


@pytest.mark.parametrize("solve", [by_lsim, by_pyyeti])
@pytest.mark.parametrize("forward", [True, False])
def test_histories_agree(solve, forward, walker_of, prepared, full_run):
    """Three modes, three harmonics near all of them, at every antinode. Worst: 0.003 %."""
    walker = walker_of(
        pace=1.93, speed=1.37, phases=(0.0, 0.7, 4.0), phase=1.0, arrival=0.613, forward=forward, weight=800.0
    )
    case = prepared(scenario_text(walker))
    history = full_run(case).response.history
    time = np.arange(FINER * (case.recorder.total - 1) + 1) * (case.choice.time_step / FINER)
    since = time - walker.arrival
    on = (since >= 0.0) & (since <= LENGTH / walker.speed)
    place = walker.place(since, LENGTH)
    shapes = np.stack([np.sin(n * np.pi * place / LENGTH) for _, _, n in MODES], axis=1)
    modal = solve(shapes * (on * walker.force(since) / MASS)[:, None], time)[::FINER]
    points = np.array([p.s for p in case.points])
    exact = modal @ np.stack([np.sin(n * np.pi * points / LENGTH) for _, _, n in MODES])
    angle = 2.0 * np.pi * max(f for f, _, _ in MODES) * case.choice.time_step / FINER
    allowed = case.choice.expected_error + angle**2 / 12.0
    assert allowed < 3e-4
    assert (np.abs(history - exact).max(axis=0) / np.abs(exact).max(axis=0)).max() < allowed
