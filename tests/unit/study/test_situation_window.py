"""The comfort window in force, and what is said of it before a run."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from crowdsim.scenario.reader import Scenario
from crowdsim.study.prepare import Case
from crowdsim.study.sanity import Finding
from crowdsim.study.simulate import plan
from crowdsim.study.situation import DEFAULT_WINDOW, cases, situation

ARRIVAL = "{ per_hour = 900 }"
TIMES = "{ times = [0.0, 5.0, 9.0] }"
MORE = '[[stream]]\nname = "guests"\narrival = { times = [3.0] }\n'


def changes(duration: float, window: float | None, *other: tuple[str, str]) -> list[tuple[str, str]]:
    asked = [] if window is None else [("", f"[comfort]\nwindow = {window}\n")]
    return [("duration = 900.0", f"duration = {duration}"), *other, *asked]


def about_windows(scenario: Scenario) -> tuple[Case, list[Finding]]:
    planned = plan(scenario)
    return planned.cases[0], [f for f in planned.findings if f.key in ("comfort.window", "run.duration")]


@pytest.mark.parametrize(
    ("duration", "given", "timed", "window", "windows"),
    [
        (900.0, None, False, 240.0, 3),  # the usual one
        (240.0, None, False, 240.0, 1),
        (100.0, None, False, 100.0, 1),  # the whole record where that is shorter
        (900.0, 60.0, False, 60.0, 15),
        (100.0, 60.0, False, 60.0, 1),
        (100.0, 240.0, False, 240.0, 0),  # asked for and too long: kept, none fits
        (100.0, 100.0, False, 100.0, 1),
        (900.0, None, True, 240.0, 3),  # given arrivals: never longer than the record
        (100.0, None, True, 100.0, 1),
        (900.0, 60.0, True, 60.0, 15),
        (100.0, 240.0, True, 100.0, 1),
    ],
)
def test_window_in_force(
    scenario: Callable[..., Scenario], duration: float, given: float | None, timed: bool, window: float, windows: int
) -> None:
    read = scenario(*changes(duration, given, *([(ARRIVAL, TIMES)] if timed else [])))
    now = situation(read, cases(read)[0])
    assert (now.window, now.duration, now.event) == (window, duration, timed)
    case, _ = about_windows(read)
    assert case.window == window
    assert case.recorder.segments == windows
    assert case.recorder.segment == round(window * case.choice.per_second)


def test_the_usual_window_is_four_minutes() -> None:
    assert DEFAULT_WINDOW == 240.0


def test_arrivals_of_both_kinds_are_a_stream(scenario: Callable[..., Scenario]) -> None:
    """One Poisson stream among given arrivals, and the window that was asked for is kept."""
    read = scenario(*changes(100.0, 240.0, ("", MORE)))
    now = situation(read, cases(read)[0])
    assert (now.window, now.event) == (240.0, False)


def test_each_case_has_its_own(scenario: Callable[..., Scenario]) -> None:
    two = '[[case]]\nname = "walk"\nstreams = ["commuters"]\n[[case]]\nname = "guests"\nstreams = ["guests"]\n'
    read = scenario(*changes(100.0, 240.0, ("", MORE + two)))
    assert [situation(read, t).window for t in cases(read)] == [240.0, 100.0]


# ---------------------------------------------------------------- findings


@pytest.mark.parametrize(
    ("duration", "given", "key", "parts"),
    [
        (100.0, 240.0, "comfort.window", ["240 s is longer than the observed 100 s", "no whole window fits",
                                                 "not met but never met", "make duration at least as long"]),
        (100.0, None, "run.duration", ["100 s is shorter than the usual comfort window of 240 s",
                                              "the whole record of 100 s", "a longer window has higher peaks"]),
    ],
)  # fmt: skip
def test_what_is_said(
    scenario: Callable[..., Scenario], duration: float, given: float | None, key: str, parts: list[str]
) -> None:
    _, (finding,) = about_windows(scenario(*changes(duration, given)))
    assert (finding.level, finding.key) == ("warning", key)
    for part in parts:
        assert part in finding.text


@pytest.mark.parametrize(
    ("duration", "given", "timed"),
    [
        (900.0, None, False), (240.0, None, False), (100.0, 100.0, False), (100.0, 60.0, False), (240.0, 240.0, False),
        (100.0, None, True), (100.0, 240.0, True),  # an event: the record holds all of it
    ],
)  # fmt: skip
def test_where_nothing_is_to_be_said(
    scenario: Callable[..., Scenario], duration: float, given: float | None, timed: bool
) -> None:
    _, found = about_windows(scenario(*changes(duration, given, *([(ARRIVAL, TIMES)] if timed else []))))
    assert found == []


@pytest.mark.parametrize("duration", [100.001, 100.004, 123.4567])
def test_a_duration_that_is_no_whole_number_of_steps(scenario: Callable[..., Scenario], duration: float) -> None:
    """The record is rounded to steps, and so is a window as long as the record: it fits, and nothing else is said."""
    case, found = about_windows(scenario(*changes(duration, duration)))
    assert case.recorder.segments == 1
    assert found == []
    _, (finding,) = about_windows(scenario(*changes(duration, None)))
    assert finding.key == "run.duration"
