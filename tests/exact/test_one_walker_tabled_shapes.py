"""One person on tabled shapes, twist and ends that move, against scipy's integrator DOP853.

Where no closed form is at hand, the equations of motion of all modes are handed to an independent integrator of
eighth order, piece by piece between the points of the tables, at a relative tolerance of 1e-8. The force is the
formula itself, at the foot's own place: no grid, no table of crowdsim's.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.interpolate import PchipInterpolator, make_interp_spline

PROMISE = 1e-3  # of the default step: history within 0.1 % of its largest value


def shape_of(s, value, kind):
    """The curve of a table by scipy's other tools: a B-spline with natural ends, straight lines, a monotone cubic."""
    if kind == "spline":
        return make_interp_spline(s, value, k=3, bc_type="natural")
    if kind == "monotone":
        return PchipInterpolator(s, value)
    return lambda x: np.interp(x, s, value)


def solved(walker, length, modes, knots, times):
    """q'' [time, mode] of modes as (frequency, damping, mass, ordinate of s) under one walker."""
    omega = 2.0 * np.pi * np.array([m[0] for m in modes])
    damping = np.array([m[1] for m in modes])
    mass = np.array([m[2] for m in modes])
    crossing = length / walker.speed

    def modal_force(t):
        place = walker.place(t, length)
        force = walker.force(t) + np.zeros(np.shape(t))
        return np.stack([force * m[3](place) for m in modes]) / mass.reshape((-1,) + (1,) * np.ndim(t))

    def slope(loaded):
        def of(t, y):
            q, v = y[: omega.size], y[omega.size :]
            force = modal_force(t) if loaded else 0.0
            return np.concatenate([v, force - 2.0 * damping * omega * v - omega**2 * q])

        return of

    since = times - walker.arrival
    passed = sorted({0.0, crossing, *(x / walker.speed for x in knots), *((length - x) / walker.speed for x in knots)})
    edges = [t for t in passed if 0.0 <= t <= crossing] + [float(since[-1]) + 1e-9]
    state, found = np.zeros(2 * omega.size), np.zeros((times.size, omega.size))
    scale = walker.weight * max(walker.harmonics) / mass.min() / omega.max() ** 2
    for begin, end in itertools.pairwise(edges):
        loaded = end <= crossing + 1e-12
        inside = (since > begin) & (since <= end) if begin else (since >= 0.0) & (since <= end)
        solution = solve_ivp(
            slope(loaded), (begin, end), state, method="DOP853", rtol=1e-8, atol=1e-8 * scale, dense_output=True
        )
        if inside.any():
            y = solution.sol(since[inside])
            q, v = y[: omega.size], y[omega.size :]
            force = modal_force(since[inside]) if loaded else 0.0
            found[inside] = (force - 2.0 * (damping * omega)[:, None] * v - (omega**2)[:, None] * q).T
        state = solution.y[:, -1]
    return found


def table_text(s, value, kind):
    return f'{{ s = {list(s)}, value = {list(value)}, interpolation = "{kind}" }}'


def mode_text(name, frequency, damping, mass, **ordinates):
    shapes = "\n".join(f"{direction} = {text}" for direction, text in ordinates.items())
    return f"""
[[mode]]
name = "{name}"
frequency = {frequency!r}
damping = {damping!r}
modal_mass = {mass!r}
{shapes}
"""


def deck_text(length, width, modes, walker, duration):
    return f"""
[deck]
length = {length!r}
width = {width!r}
{modes}
{walker.stream()}
[run]
duration = {duration!r}
realisations = 1
"""


def largest_deviation(history, exact):
    """Over the points, of the history from the exact one, relative to the largest value at the point."""
    return float((np.abs(history - exact).max(axis=0) / np.abs(exact).max(axis=0)).max())


FIRST = ([0.0, 7.0, 15.5, 24.0, 33.0, 41.0, 48.0], [0.0, 0.45, 0.86, 1.0, 0.83, 0.43, 0.0])
SECOND = ([0.0, 6.0, 13.0, 20.0, 26.0, 33.0, 40.0, 48.0], [0.0, 0.72, 1.0, 0.5, -0.25, -0.9, -0.85, 0.0])


@pytest.mark.parametrize(
    ("kind", "forward"), [("spline", True), ("spline", False), ("linear", True), ("monotone", False)]
)
def test_tables(kind, forward, walker_of, prepared, full_run):
    """Two tabled modes at once, their first and second harmonic near resonance. Worst: 0.011 % (linear)."""
    length = 48.0
    walker = walker_of(pace=1.9, speed=1.33, phases=(0.2, 1.1, 2.5), phase=0.9, arrival=0.7071, forward=forward)
    modes = [(1.92, 0.005, 38_500.0, *FIRST), (3.78, 0.006, 41_000.0, *SECOND)]
    text = "".join(
        mode_text(str(j), f, z, m, vertical=table_text(s, v, kind)) for j, (f, z, m, s, v) in enumerate(modes)
    )
    case = prepared(deck_text(length, 3.0, text, walker, 45.0))
    run = full_run(case)
    shapes = [shape_of(s, v, kind) for *_, s, v in modes]
    times = np.arange(case.recorder.total) * case.choice.time_step
    modal = solved(
        walker, length, [(f, z, m, shape) for (f, z, m, _, _), shape in zip(modes, shapes, strict=True)],
        {*FIRST[0], *SECOND[0]}, times,
    )  # fmt: skip
    places = np.array([p.s for p in case.points])
    exact = modal @ np.stack([shape(places) for shape in shapes])
    assert largest_deviation(run.response.history, exact) < PROMISE


@pytest.mark.parametrize("offset", [-1.2, 0.85])
def test_twist_with_an_offset(offset, walker_of, prepared, full_run):
    """A bending mode, a twisting mode and one that does both; ordinate at the foot: vertical + e x twist.

    Worst: 0.002 %.
    """
    length, width = 36.0, 3.6
    walker = walker_of(pace=2.02, speed=1.5, phases=(0.0, 2.0, 4.0), phase=2.2, arrival=1.2345, offset=offset)
    quarters = [0.0, 9.0, 18.0, 27.0, 36.0]
    twist, both = [0.0, 0.3, 0.42, 0.3, 0.0], [0.0, 0.15, 0.0, -0.15, 0.0]
    text = (
        mode_text("bends", 2.0, 0.004, 30_000.0, vertical="{ half_waves = 1 }")
        + mode_text("twists", 3.9, 0.005, 9_000.0, twist=table_text(quarters, twist, "spline"))
        + mode_text(
            "both", 4.2, 0.007, 25_000.0, vertical="{ half_waves = 2 }", twist=table_text(quarters, both, "spline")
        )
    )
    case = prepared(deck_text(length, width, text, walker, 32.0))
    run = full_run(case)
    turn, mixed = shape_of(quarters, twist, "spline"), shape_of(quarters, both, "spline")

    def ordinates(s, e):
        one = np.sin(np.pi * s / length)
        return np.stack([one, e * turn(s), np.sin(2.0 * np.pi * s / length) + e * mixed(s)])

    modes = [
        (f, z, m, lambda s, j=j: ordinates(s, offset)[j])
        for j, (f, z, m) in enumerate([(2.0, 0.004, 30_000.0), (3.9, 0.005, 9_000.0), (4.2, 0.007, 25_000.0)])
    ]
    times = np.arange(case.recorder.total) * case.choice.time_step
    modal = solved(walker, length, modes, quarters, times)
    exact = modal @ ordinates(np.array([p.s for p in case.points]), np.array([p.e for p in case.points]))
    assert {p.e for p in case.points} == {0.0, width / 2} or {p.e for p in case.points} == {0.0, -width / 2}
    assert largest_deviation(run.response.history, exact) < PROMISE


@pytest.mark.parametrize("arrival", [0.5, 1.0037])
@pytest.mark.parametrize("phase", [0.0, 1.5])
def test_ends_that_move(phase, arrival, walker_of, prepared, full_run):
    """Ordinates of 0.35 and -0.6 at the ends: the force begins and ends with a step, on and off the grid.

    Between two samples the scheme takes the force as linear, so a step F comes early or late by up to half a step of
    time: an impulse F dt / 2, which leaves a free swing of acceleration omega F dt / (2 M). That is the tolerance,
    beside the promise for everything else. Worst: 0.13 % on the grid (0.25 % allowed), 0.015 % off it.
    """
    length = 30.0
    s, value = [0.0, 10.0, 20.0, 30.0], [0.35, 1.0, 0.4, -0.6]
    walker = walker_of(pace=1.8, speed=1.25, phase=phase, arrival=arrival)
    text = mode_text("one", 1.8, 0.006, 20_000.0, vertical=table_text(s, value, "spline")) + mode_text(
        "two", 3.6, 0.006, 20_000.0, vertical=table_text(s, value, "linear")
    )
    case = prepared(deck_text(length, 3.0, text, walker, 30.0))
    run = full_run(case)
    shapes = [shape_of(s, value, "spline"), shape_of(s, value, "linear")]
    modes = [(1.8, 0.006, 20_000.0, shapes[0]), (3.6, 0.006, 20_000.0, shapes[1])]
    times = np.arange(case.recorder.total) * case.choice.time_step
    modal = solved(walker, length, modes, s, times)
    exact = modal @ np.stack([shape(np.array([p.s for p in case.points])) for shape in shapes])
    steps = sum(
        abs(float(walker.force(t)) * shape(x)) * np.pi * f * case.choice.time_step / m
        for (f, _, m, shape) in modes
        for t, x in ((0.0, 0.0), (length / walker.speed, length))
    )
    largest = np.abs(exact).max()
    assert np.abs(run.response.history - exact).max() < PROMISE * largest + steps


@pytest.mark.parametrize("contact", [0.45, 0.72])
def test_jogging_with_the_half_sine_pulse(contact, walker_of, prepared, full_run):
    """The pulse's first four harmonics with their phases, by quadrature of the pulse itself; jogging speed.

    Worst: 0.0012 %.
    """
    length = 40.0
    share = (np.arange(20_000) + 0.5) / 20_000  # midpoint rule in the contact; error below 1e-8
    height = 0.5 * np.pi / contact
    turns = np.array(
        [
            2.0 * contact * np.mean(height * np.sin(np.pi * share) * np.exp(-2j * np.pi * k * contact * share))
            for k in (1, 2, 3, 4)
        ]
    )
    # Re(c e^{i x}) = |c| sin(x + arg c + pi/2)
    walker = walker_of(
        pace=2.61, speed=2.9, harmonics=tuple(np.abs(turns)), phases=tuple(np.angle(turns) + 0.5 * np.pi), phase=0.4,
        arrival=0.333, gait="jogging", load=f'{{ set = "half-sine", contact_ratio = {contact} }}',
    )  # fmt: skip
    frequencies = [(2.6, 0.004), (5.25, 0.006), (7.7, 0.008)]
    text = "".join(
        mode_text(str(j), f, z, 25_000.0, vertical=f"{{ half_waves = {j + 1} }}")
        for j, (f, z) in enumerate(frequencies)
    )
    case = prepared(deck_text(length, 3.0, text, walker, 20.0))
    run = full_run(case)

    def shape(n):
        return lambda s: np.sin(n * np.pi * s / length)

    modes = [(f, z, 25_000.0, shape(j + 1)) for j, (f, z) in enumerate(frequencies)]
    times = np.arange(case.recorder.total) * case.choice.time_step
    modal = solved(walker, length, modes, (), times)
    places = np.array([p.s for p in case.points])
    exact = modal @ np.stack([m[3](places) for m in modes])
    assert largest_deviation(run.response.history, exact) < PROMISE
