"""One realisation as a job: the walks of its people, its crossings and person-steps, the same bits each time."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from crowdsim.dynamics.realisation import Control, Response
from crowdsim.scenario.reader import Scenario
from crowdsim.study import jobs
from crowdsim.study.jobs import Row, draw, joined, run_realisation
from crowdsim.study.prepare import Case, prepare
from crowdsim.study.situation import cases

PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
LOAD = "load = { harmonics = [0.4, 0.1, 0.1] }"
ARRIVAL = "{ per_hour = 900 }"
SHORT = ("duration = 900.0", "duration = 240.0")
STEADY = (PACE, "pace = 2.0\nstep_length = 0.75\nweight = 700.0\nphase = 0.0")  # 1.5 m/s, 32 s on 48 m


@pytest.fixture
def case(scenario: Callable[..., Scenario]) -> Callable[..., Case]:
    """The first case of the clean scenario with changes."""

    def build(*changes: tuple[str, str]) -> Case:
        read = scenario(*changes)
        return prepare(read, cases(read)[0])

    return build


def run(case: Case, number: int = 0, **options: object) -> Row:
    row = run_realisation(case, number, **options)  # type: ignore[arg-type]
    assert row is not None
    return row


def test_a_passage_has_the_walk_and_the_force_of_its_person(case: Callable[..., Case]) -> None:
    load = "load = { harmonics = [0.4, 0.1], phases = [0.0, -0.5] }\noffset = 0.3"
    built = case(STEADY, ("phase = 0.0", "phase = 1.0"), (LOAD, load), (ARRIVAL, "{ times = [5.0] }"))
    ((people, walk),) = draw(built, 0)
    assert people.count == 1
    assert (walk.enter[0], walk.leave[0], walk.place[0], walk.velocity[0]) == (5.0, 5.0 + 32.0, 0.0, 1.5)
    assert (walk.offset[0], walk.pace[0]) == (0.3, 2.0)
    assert walk.turns[0] == pytest.approx(1.0 / (2 * np.pi), rel=1e-15)
    # 700 N: force sin(k theta + phase) = cosine sin(k theta) + sine cos(k theta)
    np.testing.assert_allclose(walk.cosine[0], [280.0, 70.0 * np.cos(0.5)], rtol=1e-15)
    np.testing.assert_allclose(walk.sine[0], [0.0, -70.0 * np.sin(0.5)], rtol=1e-15)


@pytest.mark.parametrize(("share", "direction", "again"), [(1.0, 1.0, 0.0), (0.0, -1.0, 48.0)])
def test_whoever_leaves_re_enters_at_the_other_end(
    case: Callable[..., Case], share: float, direction: float, again: float
) -> None:
    changes = [(ARRIVAL, "{ constant = 1 }"), (LOAD, LOAD + f"\nforward_share = {share}"), SHORT]
    built = case(STEADY, *changes, ("phase = 0.0", "phase = 1.0"))
    ((people, walk),) = draw(built, 0)
    start = people.place[0]
    assert 0.0 < start < 48.0
    first = (48.0 - start if direction > 0 else start) / 1.5
    count = walk.enter.size
    assert count == 1 + np.ceil((built.end - first) / 32.0)
    np.testing.assert_allclose(walk.leave, first + 32.0 * np.arange(count), rtol=1e-14)
    np.testing.assert_allclose(walk.enter[1:], walk.leave[:-1], rtol=1e-14)
    assert walk.enter[0] == 0.0
    np.testing.assert_array_equal(walk.place, [start] + [again] * (count - 1))
    np.testing.assert_array_equal(walk.velocity, [direction * 1.5] * count)
    # the phase runs on, 2 pi pace t + phase, whatever the entries
    np.testing.assert_allclose(walk.turns - 2.0 * walk.enter, [1.0 / (2 * np.pi)] * count, atol=1e-12)
    assert np.ptp(walk.cosine, axis=0).max() == 0.0


def test_walks_of_several_streams_are_joined_with_missing_harmonics_nought(case: Callable[..., Case]) -> None:
    more = '[[stream]]\nname = "joggers"\ngait = "jogging"\narrival = { per_hour = 60 }\nload = { harmonics = [1.4] }\n'
    parts = [p for _, p in draw(case(SHORT, ("", more)), 0)]
    whole = joined(parts)
    first = parts[0].enter.size
    assert whole.enter.size == first + parts[1].enter.size
    assert whole.cosine.shape[1] == 3
    np.testing.assert_array_equal(whole.cosine[:first], parts[0].cosine)
    np.testing.assert_array_equal(whole.cosine[first:, :1], parts[1].cosine)
    assert not whole.cosine[first:, 1:].any()
    assert not whole.sine[first:, 1:].any()


def test_crossings_and_person_steps_of_given_arrivals(case: Callable[..., Case]) -> None:
    built = case(STEADY, SHORT, (ARRIVAL, "{ times = [0, 10, 100, 230] }"))
    row = run(built)
    assert row.crossings == 3  # off at 32, 42, 132 and, after the end at 240, 262 s
    assert row.person_steps == pytest.approx((3 * 32 + 10) * built.choice.per_second, abs=1)  # cut to a whole number


def test_who_leaves_in_the_warm_up_is_no_crossing(case: Callable[..., Case]) -> None:
    built = case(STEADY, SHORT, (ARRIVAL, "{ times = [0, 10, 100, 230] }"), ("seed = 7", "warm_up = 40"))
    assert run(built).crossings == 3  # off at 42, 132, 262 within 40 to 280 s


def test_everybody_of_a_constant_number_counts_each_crossing(case: Callable[..., Case]) -> None:
    built = case(STEADY, SHORT, (ARRIVAL, "{ constant = 10 }"), ("seed = 7", "warm_up = 16"))
    row = run(built)
    # ten persons, one crossing each 32 s, 240 s: 7.5 each
    assert 70 <= row.crossings <= 80
    assert row.person_steps == pytest.approx(10 * 256 * built.choice.per_second, abs=1)


def same(a: Response, b: Response) -> None:
    for name in ("peak", "rms", "running_rms_max", "peak_time", "window_peak", "envelope"):
        np.testing.assert_array_equal(getattr(a, name), getattr(b, name))


def test_a_realisation_is_the_same_alone_and_after_others(case: Callable[..., Case]) -> None:
    built = case(SHORT)
    alone = run(built, 5)
    for number in range(3):
        run(built, number)
    same(alone.response, run(built, 5).response)
    assert not np.array_equal(alone.response.peak, run(built, 6).response.peak)


@pytest.mark.parametrize(
    "arrival",
    ["{ per_hour = 900 }", "{ density = 0.2 }", "{ constant = 9 }", "{ times = [0.0, 81.9, 81.92, 82.0, 163.8] }"],
)
def test_persons_drawn_in_pieces_are_the_same_persons(
    case: Callable[..., Case], monkeypatch: pytest.MonkeyPatch, arrival: str
) -> None:
    built = case(SHORT, (ARRIVAL, arrival), (LOAD, 'load = { set = "zivanovic-2007" }\nforward_share = 0.4'))
    whole = run(built)
    samples = built.recorder.total // built.choice.factor
    piece = 4096
    assert samples > 2 * piece
    monkeypatch.setattr(jobs, "SPAN", piece)
    pieces = run(built)
    same(whole.response, pieces.response)
    assert (whole.crossings, whole.person_steps) == (pieces.crossings, pytest.approx(pieces.person_steps, abs=1))


@pytest.mark.parametrize("block", [512, 2048, 4096])
def test_the_block_changes_no_bit(case: Callable[..., Case], block: int) -> None:
    built = case(SHORT)
    same(run(built).response, run(built, block=block).response)


def test_a_kept_history_changes_no_bit_and_holds_the_peak(case: Callable[..., Case]) -> None:
    built = case(SHORT)
    plain = run(built)
    kept = run(built, history=(0, built.recorder.total))
    same(plain.response, kept.response)
    history = kept.response.history
    assert history.shape == (built.recorder.total, 1)
    observed = np.abs(history[built.recorder.warm :, 0])
    top = int(np.argmax(observed)) + built.recorder.warm
    assert plain.response.peak_time[0] == pytest.approx(top * built.choice.time_step, abs=1.5 * built.choice.time_step)
    # the peak is the vertex of the parabola through the samples: above them by at most (omega dt)^2 / 8
    bound = 1 + (2 * np.pi * 1.92 * built.choice.time_step) ** 2 / 8
    assert observed.max() <= plain.response.peak[0] <= bound * observed.max()


def test_a_part_of_a_history_is_that_part(case: Callable[..., Case]) -> None:
    built = case(SHORT)
    whole = run(built, history=(0, built.recorder.total)).response.history
    begin, end = 5000, 6001
    np.testing.assert_array_equal(run(built, history=(begin, end)).response.history, whole[begin:end])


def test_a_stop_gives_no_row(case: Callable[..., Case]) -> None:
    control = Control()
    control.stop[0] = 1
    assert run_realisation(case(SHORT), 0, control=control) is None


def test_progress_counts_every_step(case: Callable[..., Case]) -> None:
    built = case(SHORT)
    control = Control()
    run(built, control=control)
    assert control.progress[0] >= built.recorder.total


def test_a_realisation_without_anybody_is_quiet(case: Callable[..., Case]) -> None:
    row = run(case(SHORT, (ARRIVAL, "{ per_hour = 1e-6 }")))
    assert (row.crossings, row.person_steps) == (0, 0)
    assert not row.response.peak.any()
    assert not row.response.envelope.any()
