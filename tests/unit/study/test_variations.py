"""What a sensitivity study varies: one thing at a time, in the known amounts, and what it leaves alone."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

import crowdsim
from crowdsim.crowd.arrivals import ConstantNumber, PoissonArrivals
from crowdsim.crowd.populations import POPULATIONS
from crowdsim.guides.damping import EUR_23984_SOURCE
from crowdsim.loads import sets
from crowdsim.scenario.reader import Scenario, read_scenario
from crowdsim.study.prepare import Case, prepare
from crowdsim.study.situation import cases
from crowdsim.study.variations import ALWAYS_LEFT, UnbuildableError, Variation, changed, same, variations

SCENARIOS = sorted((Path(crowdsim.__file__).parents[1] / "scenarios").glob("*.toml"))
PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
LOAD = "load = { harmonics = [0.4, 0.1, 0.1] }"
ARRIVAL = "arrival = { per_hour = 900 }"
WIDTH = "width = 3.2"

Read = Callable[..., Scenario]


def made(read: Scenario, number: int = 0) -> tuple[Case, list[Variation], list[str]]:
    """The base case, its variations, and what is left alone."""
    table = cases(read)[number]
    base = prepare(read, table)
    return base, *variations(read, table, base)


def of(subject: str, found: list[Variation]) -> list[Variation]:
    chosen = [v for v in found if v.subject == subject]
    assert chosen, subject
    return chosen


def case_of(variation: Variation) -> Case:
    assert variation.scenario is not None, variation.problem
    (table,) = variation.scenario.file.case
    return prepare(variation.scenario, table)


def differences(a: Any, b: Any, path: str = "") -> set[str]:
    """Where two dumps of a scenario differ, list numbers left out."""
    if isinstance(a, dict) and isinstance(b, dict):
        return set().union(*(differences(a.get(k), b.get(k), f"{path}.{k}") for k in {*a, *b}))
    if isinstance(a, list) and isinstance(b, list) and len(a) == len(b):
        return set().union(*(differences(x, y, path) for x, y in zip(a, b, strict=True)), set())
    return set() if a == b else {path}


@pytest.mark.parametrize("path", SCENARIOS, ids=lambda p: p.stem)
def test_a_change_of_nothing_changes_nothing(path: Path) -> None:
    read = read_scenario(path)
    for table in cases(read):
        again = changed(read, table)
        assert again.file == read.file.model_copy(update={"case": [table]})
        assert same(prepare(again, table), prepare(read, table))


def test_one_thing_at_a_time(scenario: Read) -> None:
    read = scenario()
    _, found, _ = made(read)
    allowed = {
        "load set": ".stream.load", "pace": ".stream.pace", "step length": ".stream.step_length",
        "damping": ".mode.damping", "frequency": ".mode.frequency", "people's effect": ".case.people",
        "number of people": ".stream.arrival",
    }  # fmt: skip
    assert {v.subject for v in found} == set(allowed)
    before = read.file.model_copy(update={"case": cases(read)}).model_dump(mode="json")
    for v in found:
        assert v.scenario is not None
        where = differences(before, v.scenario.file.model_dump(mode="json"))
        assert where, v.label
        assert all(w.startswith(allowed[v.subject]) for w in where), (v.label, where)
        assert v.source
        assert not same(case_of(v), prepare(read, cases(read)[0]))


def test_every_other_load_set_of_the_gait(scenario: Read) -> None:
    _, found, _ = made(scenario())
    assert [v.label for v in of("load set", found)] == sets.names("walking")
    read = scenario((LOAD, 'load = "kerr-1998"'))
    base, found, _ = made(read)
    assert [v.label for v in of("load set", found)] == [n for n in sets.names("walking") if n != "kerr-1998"]
    for v in of("load set", found):
        (stream,) = case_of(v).streams
        assert stream.load.name == v.label
        assert stream.load.source == v.source
        assert stream.walkers == base.streams[0].walkers


def test_streams_of_a_gait_change_together_and_gaits_apart(scenario: Read) -> None:
    more = ('[[stream]]\nname = "back"\narrival = { per_hour = 90 }\nload = "kerr-1998"\n'
            '[[stream]]\nname = "club"\ngait = "jogging"\narrival = { per_hour = 9 }\n')  # fmt: skip
    base, found, left = made(scenario(("", more)))
    (kerr,) = [v for v in of("load set", found) if v.label == "walking: kerr-1998"]
    assert [s.load.name for s in case_of(kerr).streams] == ["kerr-1998", "kerr-1998", base.streams[2].load.name]
    jogging = [v.label for v in of("load set", found) if v.label.startswith("jogging")]
    assert jogging == ["jogging: bachmann-1995"]  # the other one is the default, the pulse needs a contact ratio
    assert any("half-sine" in text for text in left)
    assert any("pace of club" in text for text in left)


def test_scatter_that_goes_is_said(scenario: Read) -> None:
    _, found, _ = made(scenario((LOAD, 'load = "zivanovic-2007"')))
    assert all("scatter" in v.note for v in of("load set", found))


def test_pace_of_every_other_population(scenario: Read) -> None:
    _, found, _ = made(scenario((PACE, 'population = "caprani-2012"')))
    names = [n for n, p in POPULATIONS.items() if p.gait == "walking" and n != "caprani-2012"]
    for v, name in zip(of("pace", found), names, strict=True):
        walkers = case_of(v).streams[0].walkers
        assert walkers.pace == POPULATIONS[name].pace
        assert walkers.step_length == POPULATIONS["caprani-2012"].step_length
        assert walkers.weight == POPULATIONS["caprani-2012"].weight
        assert v.source == POPULATIONS[name].sources["pace"]


def test_a_pace_tied_to_a_mode_is_spread_and_follows_the_frequency(scenario: Read) -> None:
    read = scenario((PACE, 'pace = { mean_at = "V1", sd = 0.1, min = 1.3, max = 2.6 }'))
    _, found, _ = made(read)
    paces = [case_of(v).streams[0].walkers.pace for v in of("pace", found)]
    assert [p.sd for p in paces] == pytest.approx([0.07, 0.13], rel=1e-12)
    assert [p.mean for p in paces] == [1.92, 1.92]
    assert all("stays on the mode" in v.note for v in of("pace", found))
    for v, factor in zip(of("frequency", found), (0.90, 0.95, 1.05, 1.10), strict=True):
        assert case_of(v).streams[0].walkers.pace.mean == pytest.approx(factor * 1.92, rel=1e-12)
        assert "commuters follows the mode" in v.note


def test_a_pace_exactly_on_a_mode_is_left_alone(scenario: Read) -> None:
    _, found, left = made(scenario((PACE, 'pace = { mean_at = "V1" }')))
    assert not [v for v in found if v.subject == "pace"]
    assert any("exactly on a mode" in text for text in left)


@pytest.mark.parametrize(
    ("given", "subject", "kind"),
    [
        ("step_length = { mean = 0.7, sd = 0.05, min = 0.4, max = 1.0 }", "step length", "step_length"),
        ("speed = { mean = 1.3, sd = 0.1 }", "speed", "speed"),
        ("speed = 1.5", "speed", "speed"),
        ('speed = { distribution = "uniform", min = 1.2, max = 1.6 }', "speed", "speed"),
        ("", "step length", "step_length"),
    ],
)
def test_stride(scenario: Read, given: str, subject: str, kind: str) -> None:
    base, found, _ = made(scenario((PACE, f"{PACE}\n{given}")))
    now = getattr(base.streams[0].walkers, kind)
    for v, factor in zip(of(subject, found), (0.9, 1.1), strict=True):
        after = getattr(case_of(v).streams[0].walkers, kind)
        if now.kind == "uniform":
            assert (after.minimum, after.maximum) == pytest.approx((factor * now.minimum, factor * now.maximum))
        else:
            assert after.mean == pytest.approx(factor * now.mean, rel=1e-12)
            assert after.sd == now.sd


def test_stride_of_both_kinds(scenario: Read) -> None:
    more = '[[stream]]\nname = "back"\narrival = { per_hour = 90 }\nspeed = 1.4\n'
    _, found, _ = made(scenario(("", more)))
    assert len(of("step length and speed", found)) == 2


def test_damping_without_and_with_a_construction(scenario: Read) -> None:
    _, found, _ = made(scenario())
    assert [m.damping for v in of("damping", found) for m in case_of(v).bare.modes] == [0.0025, 0.01]
    assert all("construction is not given" in v.note for v in of("damping", found))
    _, found, _ = made(scenario((WIDTH, f'{WIDTH}\nconstruction = "timber"')))
    assert [m.damping for v in of("damping", found) for m in case_of(v).bare.modes] == [0.010, 0.015]
    assert all(v.source == EUR_23984_SOURCE and "timber" in v.label for v in of("damping", found))


def test_frequencies_of_all_modes(scenario: Read) -> None:
    mode = (
        '[[mode]]\nname = "V2"\nfrequency = 5.3\ndamping = 0.007\nmodal_mass = 38500\nvertical = { half_waves = 2 }\n'
    )
    base, found, _ = made(scenario(("", mode)))
    for v, factor in zip(of("frequency", found), (0.90, 0.95, 1.05, 1.10), strict=True):
        case = case_of(v)
        for now, before in zip(case.bare.modes, base.bare.modes, strict=True):
            assert now == replace(before, frequency=factor * before.frequency)
        assert case.streams[0].walkers == base.streams[0].walkers


@pytest.mark.parametrize(("now", "other"), [("none", "mass"), ("mass", "none")])
def test_effect_of_people(scenario: Read, now: str, other: str) -> None:
    _, found, _ = made(scenario(("", f'[[case]]\nname = "day"\npeople = "{now}"\n')))
    (v,) = of("people's effect", found)
    assert case_of(v).people == other
    assert (case_of(v).added_mass["V1"] > 0.0) == (other == "mass")


def test_number_of_people(scenario: Read) -> None:
    more = ('[[stream]]\nname = "back"\narrival = { density = 0.1 }\n'
            '[[stream]]\nname = "queue"\narrival = { constant = 12 }\n'
            '[[stream]]\nname = "school"\narrival = { times = [3.0, 4.0] }\n')  # fmt: skip
    base, found, left = made(scenario(("", more)))
    for v, factor, whole in zip(of("number of people", found), (0.8, 1.2), (10, 14), strict=True):
        streams = case_of(v).streams
        for now, before in zip(streams[:2], base.streams[:2], strict=True):
            assert isinstance(now.walkers.arrivals, PoissonArrivals)
            assert isinstance(before.walkers.arrivals, PoissonArrivals)
            assert now.walkers.arrivals.rate == pytest.approx(factor * before.walkers.arrivals.rate, rel=1e-12)
        assert streams[2].walkers.arrivals == ConstantNumber(whole)  # 9.6 and 14.4
        assert streams[3].walkers.arrivals == base.streams[3].walkers.arrivals
        assert "whole persons" in v.note
    assert any("number of people of school" in text for text in left)
    assert left[-len(ALWAYS_LEFT) :] == list(ALWAYS_LEFT)


def test_given_times_alone_are_left_alone(scenario: Read) -> None:
    _, found, left = made(scenario((ARRIVAL, "arrival = { times = [0.0] }")))
    assert not [v for v in found if v.subject == "number of people"]
    assert any("their times are given" in text for text in left)


def test_streams_of_other_cases_stay_out(scenario: Read) -> None:
    more = '[[stream]]\nname = "back"\narrival = { times = [1.0] }\n[[case]]\nname = "one"\nstreams = ["commuters"]\n'
    read = scenario(("", more))
    _, found, left = made(read)
    assert not any("back" in text for text in left)
    for v in found:
        assert v.scenario is not None
        assert v.scenario.file.stream[1] == read.file.stream[1]


def test_what_cannot_be_built_says_why(scenario: Read) -> None:
    narrow = "step_length = { mean = 0.7, sd = 0.005, min = 0.68, max = 0.72 }"
    _, found, _ = made(scenario((PACE, f"{PACE}\n{narrow}"), ("damping = 0.005", "damping = 0.15")))
    for v in of("step length", found):
        assert v.scenario is None
        assert "of the probability" in v.problem
    half, double = of("damping", found)
    assert half.scenario is not None
    assert double.scenario is None
    assert "at most 0.2" in double.problem


def test_a_bound_of_the_schema_says_which(scenario: Read) -> None:
    read = scenario()
    modes = [m.model_copy(update={"frequency": 200.0}) for m in read.file.mode]
    with pytest.raises(UnbuildableError, match=r"mode\[0\].frequency: should be less than or equal to 100"):
        changed(read, cases(read)[0], mode=modes)


def test_the_same_numbers_by_another_name(scenario: Read) -> None:
    written = "load = { harmonics = [0.4, 0.1, 0.1], phases = [0.0, -1.571, -1.571] }"
    base, found, _ = made(scenario((LOAD, written)))
    alike = {v.label: same(case_of(v), base) for v in of("load set", found)}
    assert alike.pop("setra-2006")
    assert not any(alike.values())
