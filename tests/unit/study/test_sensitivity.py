"""A sensitivity study: its base is what simulate gives, its changes go the known way, whoever the workers are."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from crowdsim.errors import InputError, RunError
from crowdsim.response.windows import window_percentile
from crowdsim.results.sensitivity import Sensitivity, Varied
from crowdsim.scenario.reader import Scenario
from crowdsim.study.executor import Halt, rows
from crowdsim.study.prepare import prepare
from crowdsim.study.progress import Progress
from crowdsim.study.sensitivity import observed_like, sensitivity
from crowdsim.study.simulate import simulate
from crowdsim.study.situation import cases

SHORT = ("duration = 900.0", "duration = 240.0")
FEW = ("realisations = 200", "realisations = 80")
PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
WINDOW = "[comfort]\nwindow = 120\n"
# one person in resonance, everything fixed: a closed, quick event
ALONE = (
    ("arrival = { per_hour = 900 }", "arrival = { times = [0.0] }"),
    (PACE, 'pace = { mean_at = "V1" }\nstep_length = 0.7\nweight = 700\nphase = 0'),
    ("duration = 900.0", "duration = 60.0"),
    ("realisations = 200", "realisations = 2"),
)

Read = Callable[..., Scenario]


def one(result: Sensitivity, subject: str, part: str) -> Varied:
    (found,) = [v for v in result.of(subject) if part in v.label]
    return found


def change(result: Sensitivity, subject: str, part: str) -> float:
    found = one(result, subject, part).change
    assert found is not None
    return found


class Watch(Progress):
    """Counts what it is told."""

    def __init__(self) -> None:
        self.names: list[str] = []
        self.rows = self.done = 0

    def case(self, name: str, realisations: int, person_steps: float) -> None:
        assert realisations == 80
        assert person_steps > 0.0
        self.names.append(name)

    def row(self, row: Any) -> None:
        self.rows += 1

    def case_done(self) -> None:
        self.done += 1


@pytest.fixture(scope="module")
def crowd(scenario: Read) -> tuple[Scenario, Sensitivity, Watch]:
    """A crowd of about nine, 80 realisations of two windows."""
    read, watch = scenario(SHORT, FEW, ("", WINDOW)), Watch()
    return read, sensitivity(read, workers=2, progress=watch), watch


@pytest.fixture(scope="module")
def alone(scenario: Read) -> Sensitivity:
    """One person in resonance."""
    return sensitivity(scenario(*ALONE))


def test_the_base_is_what_simulate_gives(crowd: tuple[Scenario, Sensitivity, Watch]) -> None:
    read, result, _ = crowd
    (case,) = simulate(read).cases
    value = window_percentile(case.deck_window_peak["vertical"])
    assert case.deck_window_peak["vertical"].shape == (80, 2)
    assert (result.base.value, result.base.low, result.base.high) == (value.value, value.low, value.high)
    assert (result.case, result.direction, result.window) == ("all streams", "vertical", 120.0)
    assert (result.realisations, result.seed, result.title) == (80, 7, "Weir Lane footbridge")


def test_a_variation_is_what_simulate_gives_from_the_same_moment_on(
    crowd: tuple[Scenario, Sensitivity, Watch], scenario: Read
) -> None:
    """A load set changes no warm-up, so a scenario with it written in gives the same."""
    _, result, _ = crowd
    other = scenario(SHORT, FEW, ("", WINDOW), ("load = { harmonics = [0.4, 0.1, 0.1] }", 'load = "kerr-1998"'))
    (case,) = simulate(other).cases
    expected = window_percentile(case.deck_window_peak["vertical"]).value
    assert one(result, "load set", "kerr-1998").value == expected


def test_values_changes_and_intervals_belong_together(crowd: tuple[Scenario, Sensitivity, Watch]) -> None:
    _, result, _ = crowd
    for v in result.variations:
        assert v.value is not None
        assert v.change == pytest.approx(v.value / result.base.value - 1.0, abs=1e-12)
        assert v.low is not None
        assert v.high is not None
        assert v.low <= v.change <= v.high


def test_subjects_are_ranked_by_their_largest_change(crowd: tuple[Scenario, Sensitivity, Watch]) -> None:
    _, result, _ = crowd
    weights = [max(abs(x) for x in result.reach(s) or (0.0,)) for s in result.order]
    assert weights == sorted(weights, reverse=True)
    assert [v.subject for v in result.variations] == [s for s in result.order for _ in result.of(s)]


def test_progress_hears_of_everything(crowd: tuple[Scenario, Sensitivity, Watch]) -> None:
    _, result, watch = crowd
    assert watch.names[0] == "as it stands"
    assert sorted(watch.names[1:]) == sorted(v.label for v in result.variations)
    assert watch.rows == 80 * len(watch.names)
    assert watch.done == len(watch.names)


def test_workers_change_no_number(scenario: Read) -> None:
    read = scenario(("duration = 900.0", "duration = 60.0"), ("realisations = 200", "realisations = 7"))
    assert sensitivity(read, workers=1) == sensitivity(read, workers=2)


def test_more_people_and_less_damping_raise_the_peak(crowd: tuple[Scenario, Sensitivity, Watch]) -> None:
    """About the square roots of 0.8 and 1.2 in the mean; damping the way it always goes."""
    _, result, _ = crowd
    assert change(result, "number of people", "+20 %") > 0.0 > change(result, "number of people", "-20 %")
    assert change(result, "damping", "half") > 0.1
    assert change(result, "damping", "double") < -0.1


def test_one_walker_in_resonance(alone: Sensitivity) -> None:
    """The steady state goes with 1/damping; a crossing of 37 s, seven time constants of 5.2 s at double the damping,
    comes near it, and less damping than the base gains less than in proportion. A frequency that the pace follows
    changes nothing: as many steps in a crossing, and the acceleration in resonance is force over damping and mass.
    Longer steps are fewer."""
    assert 0.1 < change(alone, "damping", "half") < 1.0
    assert -0.5 < change(alone, "damping", "double") < -0.1
    for v in alone.of("frequency"):
        assert v.change == pytest.approx(0.0, abs=1e-3)  # the time step's error is 1e-4
    assert change(alone, "step length", "-10 %") > 0.0 > change(alone, "step length", "+10 %")
    # the first harmonic is that of the base; the others, a quarter turn behind, are far from the mode
    assert change(alone, "load set", "setra-2006") == pytest.approx(0.0, abs=0.01)


def test_few_realisations_have_no_interval(alone: Sensitivity) -> None:
    assert alone.base.low is None
    assert alone.sampling is None
    assert all(v.low is None and v.high is None for v in alone.variations)
    assert "Chance" not in alone.text()


def test_weights_scale_everything_exactly(alone: Sensitivity, scenario: Read) -> None:
    """Twice the weight, twice the peak; the ratios stay. Where the people's mass counts, twice the mode's mass too."""
    heavy = sensitivity(scenario(*ALONE, ("weight = 700", "weight = 1400")))
    assert heavy.base.value == pytest.approx(2.0 * alone.base.value, rel=1e-12)
    for v in alone.variations:
        if v.subject != "people's effect":
            assert one(heavy, v.subject, v.label).change == pytest.approx(v.change, abs=1e-12)
    both = sensitivity(scenario(*ALONE, ("weight = 700", "weight = 1400"), ("38500.0", "77000.0")))
    assert both.base.value == pytest.approx(alone.base.value, rel=1e-12)
    assert change(both, "people's effect", "added") == pytest.approx(
        change(alone, "people's effect", "added"), abs=1e-9
    )


def test_the_same_as_the_base_is_said_and_not_run(scenario: Read) -> None:
    steel = (("width = 3.2", 'width = 3.2\nconstruction = "steel"'), ("damping = 0.005", "damping = 0.004"))
    watch = Watch()
    watch.case = lambda name, *_: watch.names.append(name)  # type: ignore[method-assign]
    result = sensitivity(scenario(*ALONE, *steel), progress=watch)
    mean = one(result, "damping", "mean for steel")
    assert (mean.value, mean.change, mean.note) == (None, None, "the same as the base")
    assert mean.label not in watch.names
    assert change(result, "damping", "minimum for steel") > 0.1


def test_what_cannot_be_built_stays_in_the_list(scenario: Read) -> None:
    """By a rule of the scenario, by a pace that a mode would pull out of its bounds, by a crowd that has no room."""
    tight = (PACE, 'pace = { mean_at = "V1", sd = 0.01, min = 1.85, max = 2.0 }')
    quick = (("duration = 900.0", "duration = 20.0"), ("realisations = 200", "realisations = 2"))
    result = sensitivity(scenario(tight, *quick))
    v = one(result, "frequency", "+10 %")
    assert v.value is None
    assert v.note.startswith("cannot be built")
    assert "of the probability" in v.note
    packed = scenario(("arrival = { per_hour = 900 }", "arrival = { constant = 800 }"), *quick)  # 5.2 persons/m2
    v = one(sensitivity(packed), "number of people", "+20 %")
    assert v.value is None
    assert "cannot stand there" in v.note


def test_without_a_whole_window_the_record_is_taken(scenario: Read) -> None:
    read = scenario(("duration = 900.0", "duration = 30.0"), ("realisations = 200", "realisations = 3"),
                    ("", "[comfort]\nwindow = 240\n"))  # fmt: skip
    result = sensitivity(read)
    (case,) = simulate(read).cases
    assert case.deck_window_peak["vertical"].shape == (3, 0)
    assert result.base.value == case.envelope["vertical"].max()
    assert result.window == 30.0


def test_the_same_persons_are_observed(scenario: Read) -> None:
    """Less damping wants a longer warm-up; observed from the base's on, a realisation has the same crossings."""
    read, lively = scenario(SHORT), scenario(SHORT, ("damping = 0.005", "damping = 0.0025"))
    base = prepare(read, cases(read)[0])
    own = prepare(lively, cases(lively)[0])
    moved = observed_like(own, base)
    assert own.warm_up > base.warm_up + 40.0
    assert moved.warm_up == base.warm_up
    assert moved.recorder.total - moved.recorder.warm == own.recorder.total - own.recorder.warm
    crossings = [[row.crossings for row in rows(c, 4, 1, Halt())] for c in (base, moved, own)]
    assert crossings[0] == crossings[1] != crossings[2]


def test_pairing_helps(crowd: tuple[Scenario, Sensitivity, Watch]) -> None:
    """Other damping keeps the persons: its intervals are narrower than the sampling interval of the base alone."""
    _, result, _ = crowd
    band = result.sampling
    assert band is not None
    for v in result.of("damping"):
        assert v.low is not None
        assert v.high is not None
        assert v.change is not None
        assert (v.high - v.low) / (1.0 + v.change) < 0.7 * (band[1] - band[0])


def test_errors(scenario: Read) -> None:
    two = '[[case]]\nname = "day"\n[[case]]\nname = "night"\n'
    with pytest.raises(InputError, match=r"case: 2 cases \(name one with --case: day, night\)"):
        sensitivity(scenario(("", two)))
    with pytest.raises(InputError, match="no case is called 'noon'"):
        sensitivity(scenario(("", two)), case="noon")
    late = ("arrival = { per_hour = 900 }", "arrival = { times = [500.0] }")
    with pytest.raises(RunError, match="the 95 % peak is 0"):
        sensitivity(scenario(late, ("duration = 900.0", "duration = 60.0")), realisations=2)


def test_a_stop_goes_through(scenario: Read) -> None:
    class Stop(Progress):
        def row(self, row: Any) -> None:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        sensitivity(scenario(SHORT), progress=Stop())


def test_for_json(alone: Sensitivity) -> None:
    import json

    told = json.loads(json.dumps(alone.as_dict(), allow_nan=False))
    assert {"case", "direction", "window", "realisations", "base", "variations", "order", "not_varied"} <= set(told)
    assert set(told["base"]) == {"value", "low", "high"}
    keys = {"subject", "label", "source", "value", "change", "low", "high", "note"}
    assert all(set(v) == keys for v in told["variations"])
    assert np.isfinite([v["change"] for v in told["variations"] if v["change"] is not None]).all()
