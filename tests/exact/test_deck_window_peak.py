"""The largest acceleration anywhere on the deck in each comfort window.

Against the envelope and the points of the same run, which are sought by other loops, and against numpy on the history
of every station. The samples are the same on both sides and the sums over the modes run in the same order, so peaks
agree to the last bits: 1e-12, or exactly where nothing is summed anew.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from crowdsim.results.reader import open_results
from crowdsim.scenario.reader import parse_scenario
from crowdsim.study.jobs import run_realisation
from crowdsim.study.simulate import plan, simulate_to

ROUNDING = 1e-12

SCENARIO = """
[deck]
length = 40.0
width = 3.5
[[mode]]
name = "V1"
frequency = 1.95
damping = 0.005
modal_mass = 30000.0
vertical = { half_waves = 1 }
[[mode]]
name = "T1"
frequency = 3.6
damping = 0.006
modal_mass = 20000.0
vertical = { s = [0, 10, 20, 30, 40], value = [0, 0.4, 0.2, -0.3, 0] }
twist = { s = [0, 10, 20, 30, 40], value = [0, 0.35, 0.5, 0.35, 0] }
[[mode]]
name = "VL"
frequency = 2.3
damping = 0.01
modal_mass = 25000.0
vertical = { half_waves = 2, amplitude = 0.6 }
lateral = { half_waves = 1, amplitude = -0.4 }
[[stream]]
name = "people"
arrival = { per_hour = 900 }
forward_share = 0.6
load = "young-2001-mean"
[run]
duration = DURATION
realisations = 3
seed = 20
[comfort]
window = WINDOW
"""


def text(duration, window):
    return SCENARIO.replace("DURATION", str(duration)).replace("WINDOW", str(window))


def by_direction(case, envelope):
    """Largest over the stations of each direction."""
    ends = np.cumsum(case.recorder.directions)
    return np.array([part.max() for part in np.split(envelope, ends[:-1])])


def tops_of_steps(y):
    """|sample| of every step, or the vertex of the parabola through three samples where it is a local extremum."""
    tops = np.abs(y)
    before, middle, after = y[:-2], y[1:-1], y[2:]
    sign = np.where(middle > 0.0, 1.0, -1.0)
    rise, fall = sign * (middle - before), sign * (middle - after)
    i = np.flatnonzero((rise >= 0.0) & (fall >= 0.0) & (rise + fall > 0.0))
    tops[i + 1] = (sign * middle)[i] + (rise[i] - fall[i]) ** 2 / (8.0 * (rise[i] + fall[i]))
    return tops


def windows_of(tops, segment):
    """Largest of each whole window of `segment` steps; the very last step belongs to the last window."""
    whole = (tops.size - 1) // segment
    ends = [(k + 1) * segment + (((k + 1) * segment) == tops.size - 1) for k in range(whole)]
    return np.array([tops[k * segment : end].max() for k, end in enumerate(ends)])


def everywhere(case):
    """The case with every station a recorded point."""
    return replace(case, recorder=replace(case.recorder, points=case.recorder.stations))


def test_there_are_two_directions_and_a_twist(prepared):
    case = prepared(text(60.0, 20.0))
    assert case.model.directions == ("vertical", "lateral")
    assert case.model.edges == (-1.75, 0.0, 1.75)
    assert case.recorder.directions == (3 * case.deck_s.size,) * 2
    assert len({p.direction for p in case.points}) == 2


@pytest.mark.parametrize("number", [0, 1, 2])
@pytest.mark.parametrize(("duration", "window"), [(60.0, 20.0), (60.0, 60.0), (52.0, 13.0)])
def test_over_all_windows_it_is_the_envelopes_largest(duration, window, number, prepared, full_run):
    """Exactly, where the windows fill the record; the largest at any station, in either direction."""
    case = prepared(text(duration, window))
    response = full_run(case, number).response
    assert response.deck_window_peak.shape == (round(duration / window), 2)
    np.testing.assert_array_equal(response.deck_window_peak.max(axis=0), by_direction(case, response.envelope))
    assert response.deck_window_peak.min() > 0.0


def test_a_rest_beyond_the_last_window_is_left_out(prepared, full_run):
    """7.3 s in 50 s: six windows, 43.8 s; what comes later can only add to the envelope."""
    case = prepared(text(50.0, 7.3))
    response = full_run(case, 1).response
    assert response.deck_window_peak.shape == (6, 2)
    assert np.all(response.deck_window_peak.max(axis=0) <= by_direction(case, response.envelope))
    assert full_run(prepared(text(50.0, 60.0)), 1).response.deck_window_peak.shape == (0, 2)


@pytest.mark.parametrize("number", [0, 1, 2])
@pytest.mark.parametrize(("duration", "window"), [(60.0, 20.0), (50.0, 7.3), (45.0, 1.0)])
def test_no_point_on_the_deck_has_more(duration, window, number, prepared, full_run):
    """The recorded points stand among the stations, at the same ordinates up to rounding."""
    case = prepared(text(duration, window))
    response = full_run(case, number).response
    for j, point in enumerate(case.points):
        deck = response.deck_window_peak[:, case.model.directions.index(point.direction)]
        assert np.all(deck >= response.window_peak[:, j] * (1.0 - ROUNDING))


@pytest.mark.parametrize(("duration", "window"), [(60.0, 20.0), (50.0, 7.3), (45.0, 1.0)])
def test_a_deck_of_one_station_is_a_point(duration, window, prepared, full_run):
    """Each recorded point in turn as the only station of a direction: its window peaks, to the last bit."""
    case = prepared(text(duration, window))
    points = case.recorder.points
    alone = replace(case, recorder=replace(case.recorder, stations=points, directions=(1,) * points.shape[0]))
    response = full_run(alone, 1).response
    assert response.deck_window_peak.shape == (case.recorder.segments, points.shape[0])
    np.testing.assert_array_equal(response.deck_window_peak, response.window_peak)


def test_the_size_of_blocks_changes_no_bit(prepared):
    case = prepared(text(50.0, 7.3))
    found = [run_realisation(case, 2, block=block).response.deck_window_peak for block in (512, 1024, 2048, 4096)]
    for other in found[1:]:
        np.testing.assert_array_equal(other, found[0])


@pytest.mark.parametrize("number", [0, 1])
@pytest.mark.parametrize(("duration", "window"), [(50.0, 7.3), (30.0, 1.0), (24.0, 8.0)])
def test_against_the_history_of_every_station(duration, window, number, prepared, full_run):
    """Vertices of parabolas belong to the window of their middle sample, as at a point."""
    case = everywhere(prepared(text(duration, window)))
    response = full_run(case, number).response
    observed = response.history[case.recorder.warm :]
    stations = np.array([windows_of(tops_of_steps(y), case.recorder.segment) for y in observed.T])
    np.testing.assert_allclose(response.window_peak, stations.T, rtol=ROUNDING, atol=1e-15)
    ends = np.cumsum(case.recorder.directions)[:-1]
    expected = np.array([part.max(axis=0) for part in np.split(stations, ends)]).T
    np.testing.assert_allclose(response.deck_window_peak, expected, rtol=ROUNDING)


@pytest.mark.parametrize("block", [512, 4096])
@pytest.mark.parametrize("shift", [-2, -1, 0, 1, 2, 3])
def test_the_largest_peak_beside_a_border(shift, block, prepared, full_run, vertex_peak):
    """A border put `shift` steps from the step of the largest peak: it stays with the window of its own sample.

    One step too early and its vertex, which needs the sample beyond the border, would be lost or counted twice.
    """
    case = prepared(text(60.0, 60.0))
    first = full_run(case, 0).response
    j = int(np.argmax(first.peak))
    largest = round((first.peak_time[j] - case.warm_up) * case.choice.per_second)
    y = first.history[case.recorder.warm :, j]
    assert vertex_peak(y[largest - 1 : largest + 2]) == pytest.approx(first.peak[j], rel=ROUNDING)
    assert first.peak[j] > abs(y[largest])  # a vertex that lies above its sample
    border = largest + shift
    stations = case.recorder.points[j : j + 1]
    recorder = replace(case.recorder, segment=border, stations=stations, directions=(1,))
    response = run_realisation(replace(case, recorder=recorder), 0, block=block).response
    expected = windows_of(tops_of_steps(y), border)
    assert expected.size >= 1
    np.testing.assert_allclose(response.deck_window_peak[:, 0], expected, rtol=ROUNDING)
    np.testing.assert_array_equal(response.deck_window_peak[:, 0], response.window_peak[:, j])
    assert (response.deck_window_peak[0, 0] == pytest.approx(first.peak[j], rel=ROUNDING)) == (shift > 0)


def test_windows_of_a_few_steps(prepared, full_run):
    """Far shorter than the stretches that are left out together; every vertex is near a border."""
    case = prepared(text(20.0, 5.0))
    for segment in (1, 2, 3, 7, 127, 128, 129):
        short = replace(case, recorder=replace(case.recorder, segment=segment))
        response = full_run(everywhere(short), 0).response
        observed = response.history[case.recorder.warm :]
        stations = np.array([windows_of(tops_of_steps(y), segment) for y in observed.T[::29]])
        np.testing.assert_allclose(response.window_peak.T[::29], stations, rtol=ROUNDING, atol=1e-15)
        size = case.recorder.directions[0]
        np.testing.assert_array_equal(response.deck_window_peak[:, 0], response.window_peak[:, :size].max(axis=1))
        np.testing.assert_array_equal(response.deck_window_peak[:, 1], response.window_peak[:, size:].max(axis=1))


def test_from_the_results_file(tmp_path, prepared):
    """By direction, [realisation, window], as the realisations gave them."""
    scenario = text(40.0, 10.0)
    case = prepared(scenario)
    out = tmp_path / "run.h5"
    simulate_to(plan(parse_scenario(scenario), realisations=4), out)
    (stored,) = open_results(out).cases
    assert set(stored.deck_window_peak) == {"vertical", "lateral"}
    for number in range(4):
        response = run_realisation(case, number).response
        for d, direction in enumerate(case.model.directions):
            np.testing.assert_array_equal(stored.deck_window_peak[direction][number], response.deck_window_peak[:, d])
    for direction, peaks in stored.deck_window_peak.items():
        np.testing.assert_array_equal(peaks.max(axis=1), stored.envelope[direction].max(axis=(1, 2)))
