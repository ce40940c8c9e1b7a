"""The main job: what is asked wins over the scenario, rows and kept histories, a stop in the middle, errors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from crowdsim.errors import EXIT_OTHER, InputError, InterruptedRunError, ResultsError, RunError
from crowdsim.results.reader import Results, open_results
from crowdsim.scenario.reader import Scenario
from crowdsim.study.jobs import run_realisation
from crowdsim.study.progress import Progress
from crowdsim.study.simulate import AROUND_PEAK, LONG_RECORD, plan, simulate, simulate_to

PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
SHORT = ("duration = 900.0", "duration = 240.0")
TWO_CASES = ("", '[[case]]\nname = "day"\n[[case]]\nname = "people"\npeople = "mass"\n')


class Stop(Progress):
    """Stops a run as the user would, after so many rows of the case of that number."""

    def __init__(self, case: int, rows: int):
        self.cases, self.rows = case, rows

    def case(self, name: str, realisations: int, person_steps: float) -> None:
        self.cases -= 1
        if self.cases < 0 and self.rows == 0:
            raise KeyboardInterrupt

    def row(self, row: Any) -> None:
        if self.cases < 0:
            self.rows -= 1
            if self.rows <= 0:
                raise KeyboardInterrupt


def test_what_is_asked_wins_over_the_scenario(scenario: Callable[..., Scenario]) -> None:
    read = scenario(TWO_CASES)
    whole = plan(read)
    assert ([c.name for c in whole.cases], whole.realisations, whole.seed) == (["day", "people"], 200, 7)
    asked = plan(read, case="people", realisations=90, seed=0)
    assert ([c.name for c in asked.cases], asked.realisations, asked.seed) == (["people"], 90, 0)
    assert asked.cases[0].seed == 0


def test_an_unknown_case_is_refused_with_the_names(scenario: Callable[..., Scenario]) -> None:
    with pytest.raises(InputError, match=r"no case is called 'night' \(cases here: day, people\)"):
        plan(scenario(TWO_CASES), case="night")
    with pytest.raises(InputError, match="cases here: all streams"):
        plan(scenario(), case="night")


def test_the_expected_person_steps_of_a_realisation(scenario: Callable[..., Scenario]) -> None:
    made = plan(scenario(SHORT))
    (case,) = made.cases
    steps = [run_realisation(case, k) for k in range(40)]
    mean = np.mean([row.person_steps for row in steps if row is not None])
    # the deck fills in the first crossing (about 37 of 349 s, half of them missing), and 40 Poisson counts of about
    # 87 arrivals scatter by 1.7 %
    assert 0.85 < mean / made.person_steps(case) < 1.05


@pytest.fixture(scope="module")
def results(scenario: Callable[..., Scenario]) -> Results:
    """Six realisations of two cases."""
    return simulate(scenario(SHORT, TWO_CASES), realisations=6, workers=2)


def test_every_row_is_the_realisation_of_its_number(results: Results, scenario: Callable[..., Scenario]) -> None:
    for case in plan(scenario(SHORT, TWO_CASES)).cases:
        kept = results.case(case.name)
        assert kept.realisations == 6
        for k in range(6):
            row = run_realisation(case, k)
            assert row is not None
            np.testing.assert_array_equal(kept.peak[k], row.response.peak)
            np.testing.assert_array_equal(kept.rms[k], row.response.rms)
            np.testing.assert_array_equal(kept.running_rms_max[k], row.response.running_rms_max)
            np.testing.assert_array_equal(kept.peak_time[k], row.response.peak_time)
            np.testing.assert_array_equal(kept.window_peak[k], row.response.window_peak)
            np.testing.assert_array_equal(kept.envelope["vertical"][k].ravel(), row.response.envelope)
            assert kept.crossings[k] == row.crossings


def test_workers_change_no_number(results: Results, scenario: Callable[..., Scenario]) -> None:
    other = simulate(scenario(SHORT, TWO_CASES), realisations=6, workers=1)
    for a, b in zip(results.cases, other.cases, strict=True):
        for name in ("peak", "rms", "running_rms_max", "peak_time", "window_peak", "crossings"):
            np.testing.assert_array_equal(getattr(a, name), getattr(b, name))
        np.testing.assert_array_equal(a.envelope["vertical"], b.envelope["vertical"])


def test_the_first_and_the_largest_history_are_kept_whole(results: Results) -> None:
    for case in results.cases:
        largest = int(np.argmax(case.peak.max(axis=1)))
        assert set(case.histories) == {0, largest}
        for number, history in case.histories.items():
            step, warm_up = case.attributes["time_step"], case.attributes["warm_up"]
            assert history.time[0] == 0.0
            assert history.time[-1] == pytest.approx(warm_up + 240.0, abs=1e-9)
            np.testing.assert_allclose(np.diff(history.time), step, rtol=1e-9)
            observed = np.abs(history.acceleration[history.time > warm_up - 0.5 * step])
            # a vertex lies above the samples by at most (omega dt)^2 / 8 = 4.6e-4 at 200 steps a second
            assert observed.max() <= case.peak[number, 0] <= (1 + 4.6e-4) * observed.max()


def test_of_a_long_record_the_surroundings_of_the_peak_are_kept(scenario: Callable[..., Scenario]) -> None:
    long = scenario(("duration = 900.0", "duration = 3700.0"), ("per_hour = 900", "per_hour = 100"))
    (case,) = simulate(long, realisations=2).cases
    assert case.attributes["duration"] > LONG_RECORD
    assert set(case.histories) == {0, int(np.argmax(case.peak[:, 0]))}
    end = case.attributes["warm_up"] + case.attributes["duration"]
    for number, history in case.histories.items():
        peak_time = case.peak_time[number, 0]
        step = case.attributes["time_step"]
        assert history.time[0] == pytest.approx(max(peak_time - AROUND_PEAK, case.attributes["warm_up"]), abs=step)
        assert history.time[-1] == pytest.approx(min(peak_time + AROUND_PEAK, end), abs=step)
        at = history.time[np.argmax(np.abs(history.acceleration[:, 0]))]
        assert at == pytest.approx(peak_time, abs=1.5 * step)
        assert np.abs(history.acceleration).max() == pytest.approx(case.peak[number, 0], rel=4.6e-4)  # vertex, as above


def test_a_record_shorter_than_the_comfort_window_has_no_windows(scenario: Callable[..., Scenario]) -> None:
    asked = (("duration = 900.0", "duration = 120.0"), ("", "[comfort]\nwindow = 240\n"))
    (case,) = simulate(scenario(*asked), realisations=2).cases
    assert case.window_peak.shape == (2, 0, 1)
    assert case.deck_window_peak["vertical"].shape == (2, 0)
    assert np.all(case.peak > 0.0)


def test_nobody_walks_faster_than_the_kernel_reaches(scenario: Callable[..., Scenario]) -> None:
    with pytest.raises(InputError, match="m/s"):
        plan(scenario((PACE, "pace = 6\nstep_length = 2.9"), ("length = 48.0", "length = 500.0")))


def test_a_stop_keeps_the_rows_that_are_finished(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    out = tmp_path / "run.h5"
    made = plan(scenario(SHORT, TWO_CASES), realisations=50)
    with pytest.raises(
        InterruptedRunError, match=r"stopped: 4 of 50 written of case 'day'; 1 case not begun"
    ) as caught:
        simulate_to(made, out, workers=2, progress=Stop(0, 4))
    assert caught.value.exit_status == EXIT_OTHER
    kept = open_results(out)
    assert [c.name for c in kept.cases] == ["day"]
    assert kept.cases[0].realisations == 4
    assert not kept.run["complete"]
    row = run_realisation(made.cases[0], 3)
    assert row is not None
    np.testing.assert_array_equal(kept.cases[0].peak[3], row.response.peak)
    assert list(tmp_path.iterdir()) == [out]


def test_a_stop_in_the_second_case_keeps_the_first(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    out = tmp_path / "run.h5"
    with pytest.raises(InterruptedRunError, match="2 of 5 written of case 'people'"):
        simulate_to(plan(scenario(SHORT, TWO_CASES), realisations=5), out, progress=Stop(1, 2))
    assert [(c.name, c.realisations) for c in open_results(out).cases] == [("day", 5), ("people", 2)]


def test_a_finding_that_is_an_error_stops_before_a_file_is_made(
    scenario: Callable[..., Scenario], tmp_path: Path
) -> None:
    bad = plan(scenario(("seed = 7", "time_step = 0.04"), ("1.92", "12.0")))
    with pytest.raises(InputError, match="unstable"):
        simulate_to(bad, tmp_path / "run.h5")
    assert list(tmp_path.iterdir()) == []


def test_a_motion_that_is_not_finite_is_an_error_and_leaves_no_file(
    scenario: Callable[..., Scenario], tmp_path: Path
) -> None:
    made = plan(scenario(SHORT), realisations=3)
    (case,) = made.cases
    growing = case.coefficients.copy()
    growing[:, 0] = 3.0  # displacement times three at every step
    broken = replace(made, cases=(replace(case, coefficients=growing),))
    with pytest.raises(RunError, match="not finite"):
        simulate_to(broken, tmp_path / "run.h5")
    assert list(tmp_path.iterdir()) == []


def test_an_existing_file_is_kept_unless_forced(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    out = tmp_path / "run.h5"
    out.write_text("mine")
    made = plan(scenario(SHORT), realisations=2)
    with pytest.raises(ResultsError, match="exists already"):
        simulate_to(made, out)
    assert out.read_text() == "mine"
    simulate_to(made, out, force=True)
    assert open_results(out).cases[0].realisations == 2
    assert list(tmp_path.iterdir()) == [out]


def test_results_without_a_file_leave_none(
    scenario: Callable[..., Scenario], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    simulate(scenario(SHORT), realisations=2)
    assert list(tmp_path.iterdir()) == []


def test_the_file_says_what_was_taken_for_granted(results: Results) -> None:
    day, people = results.cases
    said = " | ".join(day.assumptions)
    for part in ("Poisson arrivals, 900 per hour", "zivanovic-2007", "effect on the modes is left out", "Newmark"):
        assert part in said
    assert any("people add their mass" in a and "V1 +" in a for a in people.assumptions)
    assert any("too few" in f or "from 72 on" in f for f in results.findings)
