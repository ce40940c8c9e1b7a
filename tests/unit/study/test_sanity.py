"""Findings before a run: each provoked once, with its numbers in the text, and none in a clean scenario."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from crowdsim.errors import InputError
from crowdsim.scenario.reader import Scenario
from crowdsim.study.sanity import Finding
from crowdsim.study.simulate import plan, refuse_errors

SHAPE = "vertical = { half_waves = 1 }"
ARRIVAL = "{ per_hour = 900 }"
LOAD = "load = { harmonics = [0.4, 0.1, 0.1] }"
LATERAL = '[[mode]]\nname = "L1"\nfrequency = 0.9\ndamping = 0.01\nmodal_mass = 4e4\nlateral = { half_waves = 1 }\n'
HIGH = ("", '[[mode]]\nname = "V2"\nfrequency = 4\ndamping = 0.01\nmodal_mass = 4e4\nvertical = { half_waves = 2 }\n')


def found(scenario: Scenario) -> tuple[Finding, ...]:
    return plan(scenario).findings


def test_the_clean_scenario_has_none(scenario: Callable[..., Scenario]) -> None:
    assert found(scenario()) == ()


# changes; level; key; parts of the text: the number found, the rule, the remedy
SINGLE = {
    "damping as a percentage": (
        [("damping = 0.005", "damping = 0.05")], "warning", "mode V1", ["5 % of critical", "0.2 to 2 %", '"0.5 %"'],
    ),
    "mass too small": (
        # 385 kg on 48 x 3.2 m
        [("38500.0", "385.0")], "warning", "mode V1",
        ["385 kg", "2.51 kg per m2", "15 to 1500", "t or kN taken for kg?"],
    ),
    "mass too large": (
        [("38500.0", "3.85e6")], "warning", "mode V1", ["3.85e+06 kg", "2.51e+04 kg per m2", "N or g taken for kg?"],
    ),
    "ordinates not about one": (
        [(SHAPE, "vertical = { half_waves = 1, amplitude = 0.1 }"), ("38500.0", "385.0")], "warning", "mode V1",
        ["largest ordinate 0.1", "nothing is rescaled"],
    ),
    "ordinate at an end": (
        [(SHAPE, "vertical = { s = [0, 24, 48], value = [0.3, 1, 0] }")], "warning", "mode V1",
        ["vertical ordinate 0.3 at an end", "free or sprung end"],
    ),
    "spline leaves its table": (
        [(SHAPE, "vertical = { s = [0, 10, 20, 28, 38, 48], value = [0, 0, 1, 1, 0, 0] }")], "warning", "mode V1",
        ["spline through the vertical table", "of the largest", 'interpolation = "monotone"'],
    ),
    "a lateral mode": (
        [("", LATERAL)],
        "warning", "mode L1", ["in the lateral direction", "vertical forces alone", "far too small"],
    ),
    "no mode that could be driven": (
        [(SHAPE, "lateral = { half_waves = 1 }")], "error", "mode", ["no mode has a vertical or twist ordinate"],
    ),
    "an unstable step": (
        # 2 pi 12 x 0.04 = 3.02 above 2.449
        [("seed = 7", "time_step = 0.04"), ("1.92", "12.0")], "error", "run.time_step",
        ["0.04 s", "omega dt = 3.02", "fox-goodwin unstable", "leave time_step out"],
    ),
    "a coarse step": (
        # 2 pi 1.92 x 0.05 = 0.60
        [("seed = 7", "time_step = 0.05")], "warning", "run.time_step",
        ["0.05 s", "omega dt = 0.6 ", "expected error", "leave time_step out"],
    ),
    "nobody reaches a mode": (
        [("1.92", "12.0")], "warning", "case all streams",
        ["no harmonic of any stream reaches", "12 Hz", "quasi-static"],
    ),
    "paces outside the load set": (
        [(LOAD, 'load = "bachmann-ammann-1987"')], "warning", "stream commuters",
        ["have a pace outside 1.6 to 2.4 Hz", "bachmann-ammann-1987", "held at the limit"],
    ),
    "given arrivals beyond the end": (
        # 48 m at 0.5 m/s: 96 s after 850 s
        [(ARRIVAL, "{ times = [0, 850] }"), (LOAD, LOAD + "\nspeed = 0.5")], "warning", "run.duration",
        ["ends at 900 s", "may walk until 946 s", "a duration of 946 s"],
    ),
    "warm-up too short": (
        [("seed = 7", "warm_up = 10")], "warning", "run.warm_up",
        ["10 s is shorter than the slowest crossing plus three time constants", "leave warm_up out"],
    ),
    "a crowd that would slow down": (
        # 0.35 persons/m2, with people = mass so that their effect is not left out
        [(ARRIVAL, "{ density = 0.35 }"), ("", '[[case]]\nname = "fair"\npeople = "mass"\n')], "warning", "case fair",
        ["0.35 persons/m2", "above about 0.3", "slow each other down"],
    ),
    "people left out": (
        [(ARRIVAL, "{ density = 0.25 }")], "warning", "case all streams",
        ['0.25 persons/m2 and people = "none"', 'people = "mass" adds the mass'],
    ),
    "no whole comfort window": (
        [("duration = 900.0", "duration = 200.0"), ("", "[comfort]\nwindow = 240.0\n")], "warning", "comfort.window",
        ["240 s is longer than the observed 200 s", "make duration at least as long"],
    ),
    "too few realisations": (
        [("realisations = 200", "realisations = 71")], "warning", "run.realisations",
        ["71 realisations", "from 72 on"],
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", SINGLE)
def test_a_doubtful_scenario_has_one_finding(scenario: Callable[..., Scenario], name: str) -> None:
    changes, level, key, parts = SINGLE[name]
    matching = [f for f in found(scenario(*changes)) if f.key == key and parts[0] in f.text]
    (finding,) = matching
    assert finding.level == level
    for part in parts:
        assert part in finding.text
    assert finding.line() == f"{key}: {finding.text}"


# changes that stay just on the good side of a rule
FINE = {
    "3 % of damping": [("damping = 0.005", "damping = 0.03")],
    "a light deck": [("38500.0", "2400.0")],  # 15.6 kg/m2
    "a heavy deck": [("38500.0", "2.2e5")],  # 1432 kg/m2
    "a table that a half wave fits": [
        (SHAPE, "vertical = { s = [0, 12, 24, 36, 48], value = [0, 0.7071, 1, 0.7071, 0] }")
    ],
    "the monotone curve": [
        (
            SHAPE,
            "vertical = { s = [0, 10, 20, 28, 38, 48], value = [0, 0, 1, 1, 0, 0], interpolation = 'monotone' }",
        )
    ],
    "a fine step": [("seed = 7", "time_step = 0.005")],
    "everybody gets off": [(ARRIVAL, "{ times = [0, 850] }"), (LOAD, LOAD + "\nspeed = 1.0")],
    "the people's mass": [(ARRIVAL, "{ density = 0.25 }"), ("", '[[case]]\nname = "fair"\npeople = "mass"\n')],
    "one whole window": [("duration = 900.0", "duration = 240.0")],
    "enough realisations": [("realisations = 200", "realisations = 72")],
    "paces within the set": [(LOAD, 'load = "young-2001-mean"')],
    "a second mode": [HIGH],
}


@pytest.mark.parametrize("name", FINE)
def test_a_scenario_on_the_good_side_of_a_rule_has_none(scenario: Callable[..., Scenario], name: str) -> None:
    assert found(scenario(*FINE[name])) == ()


def test_the_share_outside_a_load_set_is_the_truncated_probability(scenario: Callable[..., Scenario]) -> None:
    from scipy import stats

    (finding,) = found(scenario((LOAD, 'load = "bachmann-ammann-1987"')))
    paces = stats.truncnorm((1.3 - 1.87) / 0.186, (2.6 - 1.87) / 0.186, 1.87, 0.186)
    outside = paces.cdf(1.6) + paces.sf(2.4)
    said = float(finding.text.split(" %")[0])
    assert said == pytest.approx(100 * outside, abs=0.06)  # 3 digits printed, share counted in steps of 0.005 %


def test_a_finding_that_two_cases_share_is_said_once(scenario: Callable[..., Scenario]) -> None:
    twice = scenario(("damping = 0.005", "damping = 0.05"), ("", '[[case]]\nname = "a"\n[[case]]\nname = "b"\n'))
    assert [f.key for f in found(twice)] == ["mode V1"]


def test_an_error_stops_a_run_and_a_warning_does_not(scenario: Callable[..., Scenario]) -> None:
    refuse_errors(plan(scenario(("damping = 0.005", "damping = 0.05"))))
    bad = plan(scenario(("seed = 7", "time_step = 0.04"), ("1.92", "12.0")))
    assert [f.key for f in bad.errors] == ["run.time_step"]
    with pytest.raises(InputError, match=r"run\.time_step: 0\.04 s"):
        refuse_errors(bad)
