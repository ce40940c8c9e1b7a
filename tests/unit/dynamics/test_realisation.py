"""What the wrapper around the kernel refuses, and that a realisation may be advanced piece by piece."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from crowdsim.dynamics.newmark import Newmark, step_coefficients
from crowdsim.dynamics.realisation import (
    CELLS,
    FASTEST,
    Control,
    Deck,
    NotFiniteError,
    Passages,
    Realisation,
    Recorder,
    Response,
    aligned,
    deck_table,
    run,
    table_cells,
)

LENGTH, STEP = 40.0, 0.005
SAMPLE = 4 * STEP


def deck(modes: int = 2) -> Deck:
    before = table_cells(LENGTH, SAMPLE)
    s = (np.arange(CELLS + 2 * before + 2) - before) * LENGTH / CELLS
    return deck_table(
        np.stack([np.sin((n + 1) * np.pi * s / LENGTH) for n in range(modes)], axis=1), None, LENGTH, before
    )


def recorder(total: int = 20_001, warm: int = 2000) -> Recorder:
    points = np.array([[1.0, 0.0], [np.sqrt(0.5), 1.0]])
    stations = np.stack([np.sin(n * np.pi * np.linspace(0, 1, 9)) for n in (1, 2)], axis=1)
    return Recorder(points, stations, total, warm, 200, 4000)


COEFFICIENTS = step_coefficients(Newmark(), np.array([1.9, 4.1]), np.full(2, 0.01), np.full(2, 3e4), STEP)


def walks(count: int = 30, harmonics: int = 3, speed: float = 1.4) -> Passages:
    random = np.random.default_rng(1)
    enter = np.sort(random.uniform(0.0, 90.0, count))
    velocity = speed * random.choice([-1.0, 1.0], count)
    force = 700.0 * np.tile([0.4, 0.1, 0.1, 0.05, 0.02, 0.02, 0.01, 0.01, 0.01][:harmonics], (count, 1))
    return Passages(
        enter=enter, leave=enter + LENGTH / speed, place=np.where(velocity > 0, 0.0, LENGTH), velocity=velocity,
        offset=np.zeros(count), pace=random.uniform(1.5, 2.3, count), turns=random.random(count), cosine=force,
        sine=np.zeros_like(force),
    )  # fmt: skip


def whole(**options: Any) -> Realisation:
    values: dict[str, Any] = {"deck": deck(), "step": COEFFICIENTS, "recorder": recorder(), "time_step": STEP}
    return Realisation(**{**values, **options})


def same(a: Response, b: Response) -> None:
    for name in ("peak", "rms", "running_rms_max", "peak_time", "window_peak", "envelope", "history"):
        np.testing.assert_array_equal(getattr(a, name), getattr(b, name))


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"step": COEFFICIENTS[:1]}, r"step: \(1, 11\), not \(2, 11\)"),
        ({"step": COEFFICIENTS[:, :10]}, r"step: \(2, 10\)"),
        ({"recorder": replace(recorder(), points=np.ones((2, 3)))}, "points: one ordinate for each of the 2"),
        ({"recorder": replace(recorder(), stations=np.ones((2, 1)))}, "stations: one ordinate for each of the 2"),
        ({"block": 1000}, "block: a multiple of 512 up to 4096, not 1000"),
        ({"block": 8192}, "block: a multiple of 512"),
        ({"block": 0}, "block: a multiple of 512"),
        ({"factor": 3}, "factor: 1, 2 or 4, not 3"),
    ],
)
def test_arrays_that_do_not_fit_are_refused(options: dict[str, Any], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        whole(**options)


def test_more_harmonics_than_the_kernel_has_are_refused() -> None:
    with pytest.raises(ValueError, match="at most 8 harmonics, not 9"):
        whole().advance(walks(harmonics=9), 10_000)


def test_a_person_faster_than_the_table_reaches_is_refused() -> None:
    with pytest.raises(ValueError, match=f"faster than {FASTEST}"):
        whole().advance(walks(speed=1.3 * FASTEST), 10_000)
    assert whole().advance(walks(speed=0.99 * FASTEST), 10_000)


def test_a_response_is_there_at_the_end_only() -> None:
    half = whole()
    half.advance(walks(), 4096)
    with pytest.raises(ValueError, match="at sample 4096 of 5007"):
        half.response()


@pytest.mark.parametrize("factor", [1, 2, 4])
def test_pieces_give_the_bits_of_the_whole(factor: int) -> None:
    long = recorder(total=60_001)
    people = walks(90)
    keep = (0, 60_001)
    once = run(people, deck(), COEFFICIENTS, long, STEP, factor=factor, history=keep)
    assert once is not None
    pieces = whole(recorder=long, factor=factor, history=keep)
    for until in range(4096, pieces.samples + 4096, 4096):
        assert pieces.advance(people, until)
    same(once, pieces.response())


def test_a_stop_is_heard_and_progress_told() -> None:
    control = Control()
    assert run(walks(), deck(), COEFFICIENTS, recorder(), STEP, control=control) is not None
    assert control.progress[0] >= 20_001
    control.stop[0] = 1
    assert run(walks(), deck(), COEFFICIENTS, recorder(), STEP, control=control) is None


def test_a_motion_that_grows_without_end_is_said() -> None:
    growing = COEFFICIENTS.copy()
    growing[0, 0] = 3.0
    with pytest.raises(NotFiniteError, match="not finite"):
        run(walks(), deck(), growing, recorder(), STEP)


def test_nobody_gives_nought() -> None:
    quiet = run(walks(0), deck(), COEFFICIENTS, recorder(), STEP)
    assert quiet is not None
    assert not quiet.peak.any()
    assert not quiet.rms.any()
    assert not quiet.running_rms_max.any()


def test_the_order_of_the_passages_changes_roundings_only() -> None:
    people = walks()
    turned = np.arange(people.enter.size)[::-1]
    other = Passages(**{name: getattr(people, name)[turned] for name in Passages.__dataclass_fields__})
    a = run(people, deck(), COEFFICIENTS, recorder(), STEP)
    b = run(other, deck(), COEFFICIENTS, recorder(), STEP)
    assert a is not None
    assert b is not None
    same(a, b)  # arrivals differ from each other: they are put in order before the sum


def test_windows_are_the_peaks_of_their_parts_of_the_record() -> None:
    record = recorder(total=18_001, warm=2000)  # four windows of 4000 steps and nothing left
    response = run(walks(), deck(), COEFFICIENTS, record, STEP, history=(0, record.total))
    assert response is not None
    assert response.window_peak.shape == (4, 2)
    np.testing.assert_array_equal(response.window_peak.max(axis=0), response.peak)
    for w in range(4):
        part = np.abs(response.history[2000 + 4000 * w : 2000 + 4000 * (w + 1)])
        # a vertex lies above its samples by at most (omega dt)^2 / 8 of the fastest motion, some 8 Hz: 0.8 %
        assert np.all(response.window_peak[w] >= part.max(axis=0))
        assert np.all(response.window_peak[w] <= 1.008 * part.max(axis=0))


@pytest.mark.parametrize("count", [1, 7, 4096])
def test_work_arrays_begin_on_a_cache_line(count: int) -> None:
    array = aligned(count)
    assert array.size == count
    assert array.ctypes.data % 64 == 0
    assert not array.any()
