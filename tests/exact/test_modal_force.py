"""The force that feet put on a mode, seen through a mode so soft that its acceleration is force over mass.

At 0.0001 Hz the deck's own stiffness and damping take some millionths of a walking force, so the recorded acceleration
is the modal force itself: phases, ordinates, re-entry and the rule between samples are seen one by one, without
resonance.
Sources: the equations of the scenario (force, place, ordinate) and nothing else.
"""

from __future__ import annotations

import numpy as np
import pytest

from crowdsim.dynamics.kernels import CHUNK
from crowdsim.dynamics.realisation import CELLS
from crowdsim.study import jobs

MASS = 30_000.0
SOFT_MODE = 1e-4  # Hz
RULE = 1.8e-5  # largest error of the rule between samples within its reach, see test_interpolation.py


def bound(case, walker, half_waves, length, factor=1):
    """Largest error of the modal force relative to weight x sum of the load factors.

    Parabola over a chunk of samples through its ends and middle: x^3/(9 sqrt 3), x the angle of half a chunk. Chord
    over a cell of the ordinate table: x^2/8. Soft mode: omega^2 u, where u starts with the velocity that one force
    cycle gives and drifts on; its damping is a thousandth of that.
    """
    wave = half_waves * np.pi / length
    parabola = (wave * walker.speed * case.choice.time_step * factor * CHUNK / 2.0) ** 3 / (9.0 * np.sqrt(3.0))
    chord = (wave * length / CELLS) ** 2 / 8.0
    drift = 2.0 * np.pi * SOFT_MODE**2 / walker.pace * case.end
    return parabola + chord + 1.1 * drift


def scenario_text(length, ordinates, stream, duration, warm_up=""):
    return f"""
        [deck]
        length = {length}
        width = 4.0
        [[mode]]
        name = "soft"
        frequency = {SOFT_MODE}
        damping = 0.002
        modal_mass = {MASS}
        {ordinates}
        {stream}
        [[point]]
        name = "unit"
        s = {length / 2}
        [run]
        duration = {duration}
        realisations = 1
        seed = 11
        {warm_up}
        """


@pytest.mark.parametrize("count", [1, 3, 4, 5, 8])
@pytest.mark.parametrize("forward", [True, False])
def test_one_walker(count, forward, walker_of, prepared, full_run):
    """At every step on the deck: weight x harmonics x half wave; before and after, nothing.

    Every step sampled. Worst: 3e-7 of weight x sum of the load factors.
    """
    length = 40.0
    random = np.random.default_rng(count)
    walker = walker_of(
        pace=1.83, speed=1.31, harmonics=(0.4, 0.1, 0.08, 0.06, 0.05, 0.04, 0.03, 0.02)[:count],
        phases=tuple(random.uniform(0.0, 6.0, count).tolist()), phase=1.7, arrival=0.4567, forward=forward,
    )  # fmt: skip
    case = prepared(scenario_text(length, "vertical = { half_waves = 1 }", walker.stream(), 34.0))
    force = MASS * full_run(case, factor=1).response.history[:, 0]
    since = np.arange(case.recorder.total) * case.choice.time_step - walker.arrival
    on = (since >= 0.0) & (since <= length / walker.speed)
    exact = on * walker.force(since) * np.sin(np.pi * walker.place(since, length) / length)
    allowed = bound(case, walker, 1, length) * walker.weight * sum(walker.harmonics)
    assert np.abs(force - exact).max() < allowed


@pytest.mark.parametrize("factor", [2, 4])
def test_between_the_samples(factor, walker_of, prepared, full_run):
    """The steps between samples, away from the ends of the walk: the errors of the ordinates and of the rule.

    The rule reaches six samples; within those of the arrival and the leaving the kink of the force shows (elsewhere).
    """
    length = 60.0
    walker = walker_of(
        pace=1.9, speed=1.3, harmonics=(0.4, 0.1, 0.08, 0.06), phases=(0.0, 1.0, 2.0, 3.0), arrival=1.003
    )
    case = prepared(scenario_text(length, "vertical = { half_waves = 1 }", walker.stream(), 50.0))
    force = MASS * full_run(case, factor=factor).response.history[:, 0]
    since = np.arange(case.recorder.total) * case.choice.time_step - walker.arrival
    rim = 6.0 * factor * case.choice.time_step
    middle = (since > rim) & (since < length / walker.speed - rim)
    exact = walker.force(since) * np.sin(np.pi * walker.place(since, length) / length)
    allowed = (bound(case, walker, 1, length, factor) + RULE) * walker.weight * sum(walker.harmonics)
    assert np.abs(force - exact)[middle].max() < allowed


def test_twist_and_offset(walker_of, prepared, full_run):
    """Ordinate at the foot: vertical + e twist, e positive to the left towards growing s, whichever way one goes."""
    length, offset = 40.0, -1.3
    shapes = "vertical = { half_waves = 1, amplitude = 0.5 }\ntwist = { half_waves = 2, amplitude = -0.4 }"
    for forward in (True, False):
        walker = walker_of(pace=2.0, speed=1.4, phase=0.5, offset=offset, forward=forward)
        case = prepared(scenario_text(length, shapes, walker.stream(), 30.0))
        assert case.points[-1].name == "unit"
        force = MASS * full_run(case, factor=1).response.history[:, -1] / 0.5
        since = np.arange(case.recorder.total) * case.choice.time_step
        place = walker.place(since, length)
        ordinate = 0.5 * np.sin(np.pi * place / length) - 0.4 * offset * np.sin(2.0 * np.pi * place / length)
        exact = (since <= length / walker.speed) * walker.force(since) * ordinate
        allowed = bound(case, walker, 2, length) * walker.weight * sum(walker.harmonics)
    assert np.abs(force - exact).max() < allowed


CONSTANT = """
    [[stream]]
    name = "rounds"
    arrival = { constant = COUNT }
    forward_share = SHARE
    pace = { mean = 1.9, sd = 0.1, min = 1.5, max = 2.3 }
    step_length = { mean = 0.71, sd = 0.05, min = 0.5, max = 0.9 }
    weight = { mean = 750.0, sd = 100.0, min = 400.0, max = 1200.0 }
    load = { harmonics = [0.4, 0.1, 0.1], phases = [0.0, 1.0, 2.0] }
"""


def rounds(people, person, time, length):
    """Force x half wave of one of a constant crowd: s and phase run on, s starting afresh at the other end."""
    way = people.place[person] + people.direction[person] * people.speed[person] * time
    turn = 2.0 * np.pi * people.pace[person] * time + people.phase[person]
    force = sum(a * np.sin(k * turn + lag) for k, a, lag in ((1, 0.4, 0.0), (2, 0.1, 1.0), (3, 0.1, 2.0)))
    return people.weight[person] * force * np.sin(np.pi * np.mod(way, length) / length)


@pytest.mark.parametrize(("count", "share", "forward"), [(1, 1, 1), (1, 0, 0), (4, 0.5, 2), (5, 0.7, 4)])
def test_a_constant_crowd_goes_round(count, share, forward, walker_of, prepared, full_run):
    """Whoever leaves re-enters at the other end as the same person, the phase running on; round(share n) go forward.

    Five and more rounds. The persons' numbers are those drawn; tolerance as for one walker, for each of them.
    """
    length = 25.0
    stream = CONSTANT.replace("COUNT", str(count)).replace("SHARE", str(share))
    case = prepared(scenario_text(length, "vertical = { half_waves = 1 }", stream, 120.0, "warm_up = 0"))
    ((people, _),) = jobs.draw(case, 0)
    assert people.count == count
    assert int((people.direction > 0).sum()) == forward
    time = np.arange(case.recorder.total) * case.choice.time_step
    exact = sum(rounds(people, person, time, length) for person in range(count))
    force = MASS * full_run(case, factor=1).response.history[:, 0]
    fastest = walker_of(pace=people.pace.min(), speed=people.speed.max())
    allowed = bound(case, fastest, 1, length) * 0.6 * people.weight.sum()
    assert np.abs(force - exact).max() < allowed


def test_passages_of_a_constant_crowd_join_without_a_gap(prepared):
    """Each passage's place, phase and time follow from the person's own numbers, to rounding."""
    length = 25.0
    stream = CONSTANT.replace("COUNT", "6").replace("SHARE", "0.5")
    case = prepared(scenario_text(length, "vertical = { half_waves = 1 }", stream, 120.0, "warm_up = 0"))
    ((people, walks),) = jobs.draw(case, 0)
    for person in range(people.count):
        own = np.flatnonzero(walks.pace == people.pace[person])
        own = own[np.argsort(walks.enter[own])]
        assert own.size > 5
        assert walks.enter[own[0]] == 0.0
        np.testing.assert_allclose(walks.leave[own[:-1]], walks.enter[own[1:]], rtol=1e-13)
        assert walks.leave[own[-1]] >= case.end
        turns = (people.phase[person] / (2.0 * np.pi) + people.pace[person] * walks.enter[own]) % 1.0
        gap = np.abs((walks.turns[own] - turns + 0.5) % 1.0 - 0.5)
        assert gap.max() < 1e-12 * people.pace[person] * case.end
        start = 0.0 if people.direction[person] > 0 else length
        assert walks.place[own[0]] == people.place[person]
        np.testing.assert_allclose(walks.place[own[1:]], start)
        assert set(walks.velocity[own]) == {people.direction[person] * people.speed[person]}


@pytest.mark.parametrize("arrival", ["{ constant = 7 }", "{ per_hour = 1500 }"])
def test_persons_taken_span_by_span(arrival, prepared, full_run, monkeypatch):
    """Persons drawn for short spans of time give the bits of those drawn at once."""
    stream = CONSTANT.replace("{ constant = COUNT }", arrival).replace("SHARE", "0.5")
    text = scenario_text(25.0, "vertical = { half_waves = 1 }", stream, 600.0, "warm_up = 10\ntime_step = 0.01")
    case = prepared(text)
    whole = full_run(case, factor=2)
    monkeypatch.setattr(jobs, "SPAN", 4096)
    spans = full_run(case, factor=2)
    assert whole.crossings == spans.crossings
    np.testing.assert_array_equal(whole.response.history, spans.response.history)
    np.testing.assert_array_equal(whole.response.peak, spans.response.peak)
