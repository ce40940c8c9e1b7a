"""The comfort window in force, and what is said of it before a run."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from crowdsim.results.judgement import Judgement
from crowdsim.results.summary import summarise
from crowdsim.scenario.reader import Scenario
from crowdsim.study.prepare import Case
from crowdsim.study.sanity import Finding
from crowdsim.study.simulate import plan, simulate_to
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
        (900.0, None, True, 900.0, 1),  # given arrivals: the whole event
        (3600.0, None, True, 3600.0, 1),
        (100.0, None, True, 100.0, 1),
        (900.0, 60.0, True, 60.0, 15),
        (100.0, 240.0, True, 100.0, 1),  # never longer than the record
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


@pytest.mark.parametrize(("given", "windows"), [(60.0, 15), (240.0, 3), (450.0, 2)])
def test_windows_that_cut_an_event_are_said_to_differ(
    scenario: Callable[..., Scenario], given: float, windows: int
) -> None:
    """A shorter window is kept as given."""
    case, (finding,) = about_windows(scenario(*changes(900.0, given, (ARRIVAL, TIMES))))
    assert (case.window, case.recorder.segments) == (given, windows)
    assert (finding.level, finding.key) == ("warning", "comfort.window")
    for part in (f"{given:g} s cuts a record of given arrivals", f"{windows} windows that are not alike",
                 "leave window out to judge the whole event"):  # fmt: skip
        assert part in finding.text


@pytest.mark.parametrize(
    ("duration", "given", "timed"),
    [
        (900.0, None, False), (240.0, None, False), (100.0, 100.0, False), (100.0, 60.0, False), (240.0, 240.0, False),
        (100.0, None, True), (100.0, 240.0, True), (900.0, None, True), (900.0, 900.0, True),  # an event, whole
        (3600.0, None, True),
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


# ---------------------------------------------------------------- what an event is judged by

TEN = "{ times = [0, 2, 4, 5, 7, 9, 11, 14, 16, 20] }"
WITH_PEOPLE = '[[case]]\nname = "guild walk"\npeople = "mass"\ntarget = "CL1"\n'


def judged(scenario: Callable[..., Scenario], out: Path, duration: float, window: float | None) -> Judgement:
    read = scenario(*changes(duration, window, (ARRIVAL, TEN), ("", WITH_PEOPLE)))
    simulate_to(plan(read, realisations=80), out)
    (deck,) = summarise(out, "Weir Lane").cases[0].deck
    assert deck.judgement is not None
    return deck.judgement


def test_an_event_is_judged_the_same_however_long_it_is_observed(
    scenario: Callable[..., Scenario], tmp_path: Path
) -> None:
    """Ten walkers, the last of whom has left by 20 + 48 m / (0.5 m/s) = 116 s, observed for 120, 900 and 3600 s.

    Same draws, same step: the same peaks but for rounding, 1e-12; the class, its interval and the verdict likewise.
    Windows of 240 s are another matter: two of three in 900 s hold nobody, so fewer peaks count.
    """
    found = [judged(scenario, tmp_path / f"{d:g}.h5", d, None) for d in (120.0, 900.0, 3600.0)]
    first = found[0]
    assert first.value.low is not None
    assert first.value.value > 0.1
    for duration, other in zip((120.0, 900.0, 3600.0), found, strict=True):
        assert (other.window, other.windows, other.whole, other.short) == (duration, 1, True, False)
        assert other.value.value == pytest.approx(first.value.value, rel=1e-12)
        assert other.value.low == pytest.approx(first.value.low, rel=1e-12)
        assert other.value.high == pytest.approx(first.value.high, rel=1e-12)
        assert (other.class_name, other.verdict) == (first.class_name, first.verdict)
    cut = judged(scenario, tmp_path / "cut.h5", 900.0, 240.0)
    assert cut.windows == 3
    assert cut.value.value < first.value.value


@pytest.mark.parametrize("duration", [120.0, 900.0, 3600.0])
def test_the_mass_of_an_event_is_the_same_however_long_it_is_observed(
    scenario: Callable[..., Scenario], duration: float
) -> None:
    """Exactly: nothing of the duration goes into it."""

    def case(seconds: float) -> Case:
        return plan(scenario(*changes(seconds, None, (ARRIVAL, TEN), ("", WITH_PEOPLE)))).cases[0]

    assert case(duration).added_mass == case(240.0).added_mass
    assert case(duration).added_mass["V1"] > 0.0
    assert case(duration).model == case(240.0).model
    assert case(duration).persons == case(240.0).persons
