"""The measures of a realisation, computed anew in plain numpy from the history that it keeps.

The kernel works in blocks, carries sums over and leaves out stretches that cannot hold a larger value; all of that
must be exact. Both sides use the same samples, so they agree to the rounding of sums: 1e-12 of the value (a running
sum of squares over N steps rounds by at most N times 1e-16; here N < 3e4), peaks and windows to the last bits.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

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
name = "V2"
frequency = 3.7
damping = 0.006
modal_mass = 32000.0
vertical = { half_waves = 2 }
[[mode]]
name = "T1"
frequency = 4.4
damping = 0.01
modal_mass = 20000.0
vertical = { s = [0, 10, 20, 30, 40], value = [0, 0.1, 0.15, 0.1, 0] }
twist = { s = [0, 10, 20, 30, 40], value = [0, 0.35, 0.5, 0.35, 0] }
[[stream]]
name = "people"
arrival = { per_hour = 900 }
forward_share = 0.6
load = "young-2001-mean"
[run]
duration = DURATION
realisations = 3
seed = 20
TIMES
[comfort]
window = WINDOW
"""


def text(duration, window, times=""):
    return SCENARIO.replace("DURATION", str(duration)).replace("WINDOW", str(window)).replace("TIMES", times)


def trapezoid(squares, start, length):
    """Mean of sampled squares over `length` steps from `start`, ends counted half."""
    part = squares[start : start + length + 1]
    return (part[0] / 2 + part[1:-1].sum() + part[-1] / 2) / length


RUNS = {
    "windows fit": text(60.0, 20.0),
    "rest beyond the last window": text(50.0, 7.3),
    "no whole window": text(31.0, 40.0),
    "given step and warm-up": text(25.0, 5.0, "time_step = 0.004\nwarm_up = 3.333"),
    "no warm-up": text(45.0, 9.0, "warm_up = 0"),
    "average acceleration, plain": text(30.0, 10.0, 'integration = "average-acceleration"\nmatched = false'),
}


@pytest.fixture(params=list(RUNS))
def run(request, prepared, full_run):
    """(case, response, observed history [step, point])"""
    case = prepared(RUNS[request.param])
    response = full_run(case, 1).response
    assert np.abs(response.history).max() > 0.0
    return case, response, response.history[case.recorder.warm :]


def test_the_observed_time_is_what_was_asked(run):
    """Warm-up and duration in whole steps, step 0 at time 0, both ends counted."""
    case, response, observed = run
    per_second = case.choice.per_second
    assert response.history.shape == (case.recorder.total, len(case.points))
    assert observed.shape[0] == round(case.duration * per_second) + 1
    assert case.recorder.warm == round(case.warm_up * per_second)


def test_peak_and_its_time(run, vertex_peak):
    """Largest |acceleration| by parabolas within the observed time; the time is that of the sample at the vertex."""
    case, response, observed = run
    for j in range(len(case.points)):
        assert response.peak[j] == pytest.approx(vertex_peak(observed[:, j]), rel=ROUNDING)
        at = round((response.peak_time[j] - case.warm_up) * case.choice.per_second)
        around = observed[max(at - 1, 0) : at + 2, j]
        assert vertex_peak(around) == pytest.approx(response.peak[j], rel=ROUNDING)


def test_rms(run):
    """Trapezoidal rule over the observed time, mean not removed."""
    case, response, observed = run
    for j in range(len(case.points)):
        expected = np.sqrt(trapezoid(observed[:, j] ** 2, 0, observed.shape[0] - 1))
        assert response.rms[j] == pytest.approx(expected, rel=ROUNDING)


def test_running_rms(run):
    """Windows of exactly 1 s, by the trapezoidal rule, wholly inside the observed time."""
    case, response, observed = run
    second = case.choice.per_second
    for j in range(len(case.points)):
        squares = observed[:, j] ** 2
        largest = max(trapezoid(squares, start, second) for start in range(squares.size - second))
        assert response.running_rms_max[j] == pytest.approx(np.sqrt(largest), rel=ROUNDING)


def test_window_peaks(run, vertex_peak):
    """Peak of each consecutive comfort window; a vertex belongs to the window of its sample."""
    case, response, observed = run
    steps = round(case.window * case.choice.per_second)
    whole = (observed.shape[0] - 1) // steps
    assert response.window_peak.shape == (whole, len(case.points))
    for j in range(len(case.points)):
        y = observed[:, j]
        tops = np.abs(y)
        for i in range(1, y.size - 1):
            tops[i] = vertex_peak(y[i - 1 : i + 2]) if abs(y[i]) >= max(abs(y[i - 1]), abs(y[i + 1])) else tops[i]
        for k in range(whole):
            end = (k + 1) * steps
            end += end == y.size - 1  # the very last step belongs to the last window
            assert response.window_peak[k, j] == pytest.approx(tops[k * steps : end].max(), rel=ROUNDING)


@pytest.mark.parametrize("number", [0, 1, 2])
def test_envelope(number, prepared, full_run, vertex_peak):
    """At every station the largest over the history at the same place: what is left out changes nothing.

    Every station is made a recorded point; the envelope skips stretches by a bound, the points do not.
    """
    case = prepared(RUNS["windows fit"])
    everywhere = replace(case, recorder=replace(case.recorder, points=case.recorder.stations))
    response = full_run(everywhere, number).response
    assert response.envelope.size == 3 * case.deck_s.size
    observed = response.history[case.recorder.warm :]
    expected = np.array([vertex_peak(column) for column in observed.T])
    np.testing.assert_allclose(response.envelope, expected, rtol=ROUNDING, atol=1e-15)
    np.testing.assert_allclose(response.envelope, response.peak, rtol=ROUNDING, atol=1e-15)
    for j, point in enumerate(case.points):
        edge = case.model.edges.index(point.e)
        station = edge * case.deck_s.size + int(np.argmin(np.abs(case.deck_s - point.s)))
        assert response.envelope[station] == pytest.approx(full_run(case, number).response.peak[j], rel=1e-9)


def test_a_point_of_ones_own_is_the_sum_of_modal_motions(prepared, full_run):
    """History at (s, e): vertical + e x twist of each mode times its motion, recorded at points of single modes."""
    own = "".join(
        f'[[point]]\nname = "{name}"\ns = {s}\ne = {e}\n' for name, s, e in (("a", 13.3, 1.1), ("b", 27.0, -1.75))
    )
    case = prepared(RUNS["windows fit"] + own)
    modal = replace(case, recorder=replace(case.recorder, points=np.eye(len(case.driven))))
    motion = full_run(modal).response.history
    history = full_run(case).response.history
    for j, point in enumerate(case.points):
        ordinates = [float(m.ordinate("vertical", point.s, point.e)) for m in case.driven]
        expected = motion @ np.array(ordinates)
        np.testing.assert_allclose(history[:, j], expected, rtol=0.0, atol=ROUNDING * np.abs(expected).max())
    assert [p.name for p in case.points[-2:]] == ["a", "b"]


@pytest.mark.parametrize(("warm_up", "duration", "expected"), [(10.0, 30.0, 4), (10.0, 29.5, 3), (27.0, 12.5, 1)])
def test_crossings_and_person_steps(warm_up, duration, expected, prepared, full_run):
    """Persons who step off within the observed time, counted by hand; person-steps to one step a passage.

    20 s to cross: off at 20, 25, 29 and 40 s.
    """
    scenario = text(duration, 10.0, f"warm_up = {warm_up}").replace("per_hour = 900", "times = [0.0, 5.0, 9.0, 20.0]")
    case = prepared(scenario.replace("load = ", "pace = 2.0\nspeed = 2.0\nload = "))
    row = full_run(case)
    assert row.crossings == expected
    seconds = 60.0 + min(20.0, warm_up + duration - 20.0)
    assert abs(row.person_steps - seconds * case.choice.per_second) <= 4
