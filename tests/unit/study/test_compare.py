"""Formulas beside the simulated numbers of the same case: what stands beside what, ratios, the leading mode."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from dataclasses import asdict, replace
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from crowdsim.results.reader import open_results
from crowdsim.results.summary import PointSummary, Summary, summarise
from crowdsim.scenario.reader import Scenario
from crowdsim.study.compare import Compared, Comparison, compare, compare_file, marks
from crowdsim.study.estimate import (
    CROSSING,
    DEFLECTION,
    NARROW_PEAK,
    NARROW_SD,
    PEAK,
    RMS,
    SQUARE_ROOT,
    STEADY,
    estimate,
)
from crowdsim.study.simulate import plan, simulate_to

COUNT = 80
SHAPE = "vertical = { half_waves = 1 }"
SECOND = '[[mode]]\nname = "V2"\nfrequency = 3.8\ndamping = 0.003\nmodal_mass = MASS\nvertical = { half_waves = 2 }\n'
CASES = '[[case]]\nname = "day"\ntarget = "CL1"\n[[case]]\nname = "people"\npeople = "mass"\n'
CHANGES = (
    ("duration = 900.0", "duration = 120.0"),
    (SHAPE, SHAPE + "\nlateral = { half_waves = 1, amplitude = 0.1 }"),
    ("", SECOND.replace("MASS", "4e4")),
    ("", '[[mode]]\nname = "V6"\nfrequency = 15\ndamping = 0.01\nmodal_mass = 4e4\nvertical = { half_waves = 6 }\n'),
    ("", CASES + "[comfort]\nwindow = 60\n"),
)


@pytest.fixture(scope="module")
def path(scenario: Callable[..., Scenario], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A results file of two cases."""
    out = tmp_path_factory.mktemp("compare") / "run.h5"
    simulate_to(plan(scenario(*CHANGES), realisations=COUNT), out)
    return out


@pytest.fixture(scope="module")
def said(path: Path) -> Comparison:
    return compare_file(path)


def row(rows: tuple[Compared, ...], name: str, mode: str = "V1") -> Compared:
    """The vertical one; with harmonics 1 to 3 only one reaches a mode here."""
    (found,) = [r for r in rows if (r.method.name, r.method.mode, r.method.direction) == (name, mode, "vertical")]
    return found


def test_the_methods_are_those_of_the_scenario(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    """Read from within the file, every case with its own."""
    expected = estimate(scenario(*CHANGES))
    assert tuple(r.method for r in said.rows) == expected.methods
    assert said.estimates.screening == expected.screening
    assert {r.method.case for r in said.of("day")} == {"day"}
    assert said.of("day") + said.of("people") == said.rows
    assert said.of("nobody") == ()


def test_peaks_stand_beside_the_judged_value(path: Path, said: Comparison) -> None:
    """The 95 % value of the peak anywhere on the deck in a window, whose interval turns round in the ratio."""
    for case, stored in zip(said.summary.cases, open_results(path).cases, strict=True):
        value = case.deck[0].judgement.value  # type: ignore[union-attr]
        pooled = np.sort(stored.deck_window_peak["vertical"], axis=None)
        assert pooled.size == 2 * COUNT
        assert value.value == pooled[math.ceil(0.95 * pooled.size) - 1]
        assert value.low is not None
        found = [r for r in said.of(case.name) if r.method.measure == PEAK and r.method.direction == "vertical"]
        assert len(found) > 5
        for one in found:
            assert (one.simulated, one.simulated_low, one.simulated_high) == (value.value, value.low, value.high)
            if one.method.value is None:
                assert (one.ratio, one.ratio_low, one.ratio_high) == (None, None, None)
                continue
            assert one.ratio == one.method.value / value.value
            assert (one.ratio_low, one.ratio_high) == (one.method.value / value.high, one.method.value / value.low)
            assert one.ratio_low <= one.ratio <= one.ratio_high


def test_root_mean_squares_stand_beside_the_mean_at_the_modes_antinode(path: Path, said: Comparison) -> None:
    """With the standard error of the mean and Student's distribution."""
    for name, stored in (("day", open_results(path).case("day")), ("people", open_results(path).case("people"))):
        for mode in ("V1", "V2"):
            one = row(said.of(name), NARROW_SD, mode)
            rms = stored.rms[:, stored.points.name.index(f"{mode} vertical")]
            half = stats.t.ppf(0.975, COUNT - 1) * rms.std(ddof=1) / math.sqrt(COUNT)
            assert one.simulated == pytest.approx(rms.mean(), rel=1e-14)
            assert one.simulated_low == pytest.approx(rms.mean() - half, rel=1e-12)
            assert one.simulated_high == pytest.approx(rms.mean() + half, rel=1e-12)
            assert one.method.value is not None
            assert one.ratio == pytest.approx(one.method.value / rms.mean(), rel=1e-12)
            assert one.ratio_low == pytest.approx(one.method.value / (rms.mean() + half), rel=1e-12)
            assert one.ratio_high == pytest.approx(one.method.value / (rms.mean() - half), rel=1e-12)


def test_what_has_no_simulated_number(said: Comparison) -> None:
    """A static deflection; a direction in which no force acts."""
    sag = row(said.of("day"), DEFLECTION)
    assert (sag.simulated, sag.ratio) == (None, None)
    (lateral,) = [r for r in said.of("day") if r.method.direction == "lateral"]
    assert lateral.method.value is None
    assert (lateral.simulated, lateral.ratio) == (None, None)
    (out,) = [r for r in said.of("day") if r.method.mode == "V6"]
    assert out.method.value is None
    assert out.simulated is not None
    assert out.ratio is None


def test_another_percentile_stands_beside_the_formulas(path: Path) -> None:
    found = compare_file(path, percentile=0.5, limit=0.3)
    value = found.summary.cases[0].deck[0].judgement.value  # type: ignore[union-attr]
    assert value.share == 0.5
    assert row(found.of("day"), STEADY).simulated == value.value


def test_a_case_that_was_not_run_is_left_out(path: Path, scenario: Callable[..., Scenario]) -> None:
    summary = summarise(path, "Weir Lane")
    alone = compare(replace(summary, cases=summary.cases[1:]), scenario(*CHANGES))
    assert {r.method.case for r in alone.rows} == {"people"}


def test_without_an_interval_the_ratio_has_none(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    out = tmp_path / "few.h5"
    simulate_to(plan(scenario(*CHANGES), realisations=1), out)
    few = compare_file(out)
    for name in (STEADY, NARROW_SD):
        one = row(few.of("day"), name)
        assert one.ratio is not None
        assert (one.simulated_low, one.simulated_high, one.ratio_low, one.ratio_high) == (None,) * 4
    assert json.dumps(few.as_dict(), allow_nan=False)


# ---------------------------------------------------------------- the leading mode


def test_the_leading_mode_is_that_of_the_largest_crossing(said: Comparison) -> None:
    """V1 with the first harmonic: 0.4 against 0.1 of the weight on V2."""
    for case in ("day", "people"):
        crossings = {r.method.mode: r.method.value for r in said.of(case) if r.method.name == CROSSING}
        assert crossings["V1"] > crossings["V2"]
        leading = said.leading(case)
        assert {r.method.mode for r in leading} == {"V1"}
        assert {r.method.case for r in leading} == {case}
        names = [r.method.name for r in leading if r.method.direction == "vertical"]
        assert len(names) == len(set(names))
        assert {STEADY, CROSSING, SQUARE_ROOT, NARROW_SD, NARROW_PEAK} <= set(names)
        assert {r.method.measure for r in leading} == {PEAK, RMS}
        values = {r.method.name: r.method.value for r in leading if r.method.value is not None}
        assert [value for _, value in marks(said, case)] == [
            values[n] for n in (STEADY, CROSSING, SQUARE_ROOT, NARROW_PEAK)
        ]
    assert marks(said, "nobody") == []


def test_the_second_mode_leads_where_it_is_light(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    light = (*CHANGES[:2], ("", SECOND.replace("MASS", "2e3")), *CHANGES[3:])
    leading = compare(said.summary, scenario(*light)).leading("day")
    assert {r.method.mode for r in leading} == {"V2"}
    assert {r.method.harmonic for r in leading} == {2, None}


def test_nothing_leads_where_nobody_reaches_a_mode(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    quiet = (("frequency = 1.92", "frequency = 12.0"), ("", CASES))
    assert compare(said.summary, scenario(*quiet)).leading("day") == ()
    assert said.leading("nobody") == ()


def test_heavier_people_lead_where_two_kinds_walk(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    """One set of single-person formulas, not both."""
    movers = (
        '[[stream]]\nname = "movers"\narrival = { per_hour = 90 }\nweight = 1400\n'
        "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }\nload = { harmonics = [0.4, 0.1, 0.1] }\n"
    )
    leading = compare(said.summary, scenario(*CHANGES[:2], ("", movers), CHANGES[4])).leading("day")
    assert {r.method.stream for r in leading} == {"movers", ""}
    assert [r.method.name for r in leading if r.method.direction == "vertical"].count(STEADY) == 1


# ---------------------------------------------------------------- names, JSON


@pytest.mark.parametrize("name", ["first vertical", "V1+T1", "vertical"])
def test_a_mode_of_any_name_finds_its_antinode(scenario: Callable[..., Scenario], tmp_path: Path, name: str) -> None:
    """A name may end like a direction, or hold the sign that joins two names at one place."""
    out = tmp_path / "named.h5"
    read = scenario(('name = "V1"', f'name = "{name}"'), ("duration = 900.0", "duration = 20.0"))
    simulate_to(plan(read, realisations=2), out)
    found = compare_file(out)
    assert row(found.rows, NARROW_SD, name).simulated == found.summary.cases[0].points[0].rms.mean


def test_two_modes_at_one_place_share_it(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    third = '[[mode]]\nname = "V3"\nfrequency = 5.5\ndamping = 0.01\nmodal_mass = 4e4\nvertical = { half_waves = 3 }\n'
    out = tmp_path / "shared.h5"
    simulate_to(plan(scenario(("", third), ("duration = 900.0", "duration = 20.0")), realisations=2), out)
    found = compare_file(out)
    assert found.summary.cases[0].points[0].name == "V1+V3"
    mean = found.summary.cases[0].points[0].rms.mean
    assert row(found.rows, NARROW_SD, "V1").simulated == row(found.rows, NARROW_SD, "V3").simulated == mean


def with_rms(summary: Summary, mean: float, sd: float, count: int) -> Summary:
    """The first case with these numbers at its first point."""
    case = summary.cases[0]
    point: PointSummary = replace(case.points[0], rms=replace(case.points[0].rms, mean=mean, sd=sd, count=count))
    return replace(summary, cases=(replace(case, points=(point, *case.points[1:])), *summary.cases[1:]))


def test_the_interval_of_a_ratio_holds_the_ratio(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    """Two realisations that differ much: the lower end of the mean is below nought, and a ratio has no upper end."""
    summary = with_rms(said.summary, 0.1, 0.08, 2)
    one = row(compare(summary, scenario(*CHANGES)).of("day"), NARROW_SD)
    assert 0.1 - 1.959964 * 0.08 / math.sqrt(2) < 0.0
    assert one.ratio is not None
    assert one.ratio_low is not None
    assert one.ratio_low < one.ratio
    assert one.ratio_high is None or one.ratio_high > one.ratio


def test_json(said: Comparison) -> None:
    data = json.loads(json.dumps(said.as_dict(), allow_nan=False))
    assert len(data["comparison"]) == len(said.rows)
    for told, one in zip(data["comparison"], said.rows, strict=True):
        assert told == {**asdict(one.method), **{k: v for k, v in asdict(one).items() if k != "method"}}
        assert {"name", "source", "case", "value", "simulated", "ratio", "ratio_low", "ratio_high"} <= set(told)
    assert data["cases"][0]["name"] == "day"
    assert data["screening"]
