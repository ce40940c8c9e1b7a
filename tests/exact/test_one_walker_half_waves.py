"""The whole chain, scenario to history, for one walker on half-wave modes, against the closed form.

Text -> scenario -> case (step, samples of the force, ordinate table chosen by the program) -> kernel ->
measures. The closed form (conftest) knows the equation of motion only. It holds the promise of the default step:
a peak within 0.1 % of the continuous motion's peak, and the history within 0.1 % of its largest value.

Source: moving harmonic load on a half-wave mode, Fryba 1972 (from memory), re-derived; the free swing after the
walker has left is elementary.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

PROMISE = 1e-3  # of the default step, see dynamics.step; nothing here is loosened beyond it
FACTORS = (0.4, 0.1, 0.1, 0.06, 0.05, 0.03, 0.02, 0.02)
FINE = 1000  # points per second of the continuous closed form: omega dt = 0.04 at 6 Hz, its vertex exact to 1e-7
MASS = 40_000.0


def scenario_text(walker, length, modes, duration):
    """One walker, modes as (frequency, damping, half waves); duration sees the walker off and the deck swing."""
    tables = "".join(
        f"""
        [[mode]]
        name = "{number}"
        frequency = {frequency!r}
        damping = {damping!r}
        modal_mass = {MASS}
        vertical = {{ half_waves = {half_waves} }}
        """
        for number, (frequency, damping, half_waves) in enumerate(modes)
    )
    return f"""
        [deck]
        length = {length!r}
        width = 3.0
        {tables}
        {walker.stream()}
        [run]
        duration = {duration!r}
        realisations = 1
        """


def row(walker_of, random, pace, count, length):
    """A walker with `count` harmonics; arrival off the grid of steps, phases, speed and direction at random."""
    return walker_of(
        pace=pace,
        speed=pace * random.uniform(0.6, 0.85),
        harmonics=FACTORS[:count],
        phases=tuple(random.uniform(0.0, 2.0 * np.pi, count).tolist()),
        phase=random.uniform(0.0, 2.0 * np.pi),
        arrival=random.uniform(0.0, 2.0),
        forward=bool(random.integers(0, 2)),
    )


def deviations(case, run, exact, duration, vertex_peak):
    """(history, peak) errors at the first point, relative to the largest value and to the continuous peak."""
    steps = np.arange(case.recorder.total) * case.choice.time_step
    at_steps = exact(steps)
    history = np.abs(run.response.history[:, 0] - at_steps).max() / np.abs(at_steps).max()
    peak = vertex_peak(exact(np.arange(0.0, duration, 1.0 / FINE)))
    return history, abs(run.response.peak[0] / peak - 1.0)


# pace so that harmonic k, within those that the walker has, is on the mode or 2 % beside it
NEAR = [
    (frequency, damping, count, harmonic)
    for frequency, damping, count in itertools.product(
        (1.0, 1.5, 2.0, 2.6, 3.2, 4.0, 5.0, 6.0), (0.002, 0.005, 0.01, 0.02), (1, 2, 3, 4, 5)
    )
    for harmonic in range(1, count + 1)
    if 1.25 <= frequency / harmonic <= 2.6 or (frequency == 1.0 and harmonic == 1)
]


@pytest.mark.parametrize(("frequency", "damping", "count", "harmonic"), NEAR)
def test_crossing_near_resonance(
    frequency, damping, count, harmonic, walker_of, half_wave_acceleration, prepared, full_run, vertex_peak
):
    """Modes of 1 to 6 Hz, 0.2 to 2 % damping, 1 to 5 harmonics with phases, 1 to 4 half waves, both directions.

    Worst of the grid: history 0.018 %, peak 0.014 %.
    """
    random = np.random.default_rng([round(10 * frequency), round(1000 * damping), count, harmonic])
    beside = (1.0, 1.02, 0.98)[random.integers(0, 3)]
    half_waves = int(random.integers(1, 5))
    length = round(random.uniform(max(15.0, 8.0 * half_waves), 90.0), 2)
    walker = row(walker_of, random, frequency / harmonic * beside, count, length)
    duration = float(np.ceil(walker.arrival + length / walker.speed + 4.0))
    case = prepared(scenario_text(walker, length, [(frequency, damping, half_waves)], duration))
    ordinate = np.sin(half_waves * np.pi * case.points[0].s / length)

    def exact(time):
        return ordinate * half_wave_acceleration(walker, length, frequency, damping, MASS, half_waves, time)

    history, peak = deviations(case, full_run(case), exact, duration, vertex_peak)
    assert history < PROMISE
    assert peak < PROMISE


FAR = [
    (frequency, damping, count)
    for frequency, damping, count in itertools.product((1.0, 2.9, 4.4, 5.9), (0.002, 0.005, 0.02), (1, 2, 3, 5))
    if not (count == 5 and frequency > 4.0)  # a harmonic is always near
]


@pytest.mark.parametrize(("frequency", "damping", "count"), FAR)
def test_crossing_far_from_resonance(
    frequency, damping, count, walker_of, half_wave_acceleration, prepared, full_run, vertex_peak
):
    """No harmonic within 8 % of the mode: hardly any response, and how the force is sampled would show.

    Every step is then a sample of the force. Worst of the grid: peak 0.054 %, history 0.036 %.
    """
    random = np.random.default_rng([round(10 * frequency), round(1000 * damping), count, 77])
    paces = [
        p for p in np.linspace(1.35, 2.5, 47) if all(abs(k * p / frequency - 1) > 0.08 for k in range(1, count + 1))
    ]
    pace = float(random.choice(paces))
    half_waves = int(random.integers(1, 5))
    length = round(random.uniform(12.0, 30.0) * half_waves, 2)
    walker = row(walker_of, random, pace, count, length)
    duration = float(np.ceil(walker.arrival + length / walker.speed + 4.0))
    case = prepared(scenario_text(walker, length, [(frequency, damping, half_waves)], duration))
    ordinate = np.sin(half_waves * np.pi * case.points[0].s / length)

    def exact(time):
        return ordinate * half_wave_acceleration(walker, length, frequency, damping, MASS, half_waves, time)

    history, peak = deviations(case, full_run(case), exact, duration, vertex_peak)
    assert case.choice.factor == 1
    assert peak < PROMISE
    assert history < PROMISE


@pytest.mark.parametrize("count", [1, 4, 5, 8])
@pytest.mark.parametrize("modes", [1, 2, 3, 4, 5, 7])
def test_several_modes_at_several_points(modes, count, walker_of, half_wave_acceleration, prepared, full_run):
    """One to seven modes (the kernel takes four, or two, in a pass) and up to eight harmonics, at every antinode.

    Worst: 0.004 %.
    """
    random = np.random.default_rng([modes, count])
    length = 54.0
    table = [(1.9 + 0.55 * j, 0.004 + 0.001 * j, (1, 2, 1, 3, 2, 4, 1)[j]) for j in range(modes)]
    walker = row(walker_of, random, 1.9, count, length)
    case = prepared(scenario_text(walker, length, table, 45.0))
    history = full_run(case).response.history
    steps = np.arange(case.recorder.total) * case.choice.time_step
    modal = np.stack([half_wave_acceleration(walker, length, f, z, MASS, n, steps) for f, z, n in table], axis=1)
    for j, point in enumerate(case.points):
        exact = modal @ np.array([np.sin(n * np.pi * point.s / length) for _, _, n in table])
        assert np.abs(history[:, j] - exact).max() < PROMISE * np.abs(exact).max()


def test_a_long_crossing_keeps_its_phase(walker_of, half_wave_acceleration, prepared, full_run):
    """600 m at 1.3 m/s: 900 steps of the foot, 55 000 time steps; a drift of the phase would show. Worst: 0.001 %."""
    walker = walker_of(pace=1.937, speed=1.3, phases=(0.3, 1.2, 2.1), phase=0.7, arrival=0.123, forward=False)
    case = prepared(scenario_text(walker, 600.0, [(1.94, 0.003, 2)], 480.0))
    run = full_run(case)
    steps = np.arange(case.recorder.total) * case.choice.time_step
    ordinate = np.sin(2.0 * np.pi * case.points[0].s / 600.0)
    exact = ordinate * half_wave_acceleration(walker, 600.0, 1.94, 0.003, MASS, 2, steps)
    assert np.abs(run.response.history[:, 0] - exact).max() < PROMISE * np.abs(exact).max()


def test_walkers_add_up(walker_of, half_wave_acceleration, prepared, full_run):
    """Two streams, both directions, two to five harmonics: the sum of the closed forms. Worst: 0.004 %."""
    length, modes = 48.0, [(1.95, 0.004, 1), (3.9, 0.006, 2)]
    common = {"speed": 1.35, "weight": 750.0}
    there = [
        walker_of(pace=1.95, harmonics=(0.4, 0.1), phase=0.4, arrival=arrival, **common)
        for arrival in (0.0, 1.513, 7.77)
    ]
    back = [
        walker_of(
            pace=1.88, harmonics=(0.35, 0.1, 0.06, 0.06, 0.06), phases=(0.0, 1.0, 2.0, 3.0, 4.0),
            arrival=arrival, forward=False, **common,
        )
        for arrival in (0.0049, 3.001, 3.002, 20.0)
    ]  # fmt: skip

    def stream(people, name):
        times = f"times = {[p.arrival for p in people]}"
        text = people[0].stream().replace(f"times = [{people[0].arrival!r}]", times)
        return text.replace("one person", name)

    both = there[0]
    text = scenario_text(both, length, modes, 70.0).replace(
        both.stream(), stream(there, "there") + stream(back, "back")
    )
    case = prepared(text)
    history = full_run(case).response.history
    steps = np.arange(case.recorder.total) * case.choice.time_step
    for j, point in enumerate(case.points):
        exact = np.zeros(steps.size)
        for f, z, n in modes:
            ordinate = np.sin(n * np.pi * point.s / length)
            for walker in (*there, *back):
                exact += ordinate * half_wave_acceleration(walker, length, f, z, MASS, n, steps)
        assert np.abs(history[:, j] - exact).max() < PROMISE * np.abs(exact).max()
