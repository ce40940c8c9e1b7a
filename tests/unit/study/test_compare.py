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

from crowdsim.guides.narrow_band import vanmarcke
from crowdsim.response.statistics import MeanSquare, root_mean_square
from crowdsim.results.reader import open_results
from crowdsim.results.summary import CaseSummary, PointSummary, Summary, summarise
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
    STREAM_PEAK,
    STREAM_SD,
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


def test_root_mean_squares_stand_beside_that_of_all_realisations_at_the_modes_antinode(
    path: Path, said: Comparison
) -> None:
    """The root of the mean of the squares, which a formula's variance is; Student's interval is of the squares, too."""
    for name, stored in (("day", open_results(path).case("day")), ("people", open_results(path).case("people"))):
        for mode in ("V1", "V2"):
            square = stored.rms[:, stored.points.name.index(f"{mode} vertical")] ** 2
            low, high = stats.t.interval(0.95, COUNT - 1, loc=square.mean(), scale=stats.sem(square))
            value, low, high = math.sqrt(square.mean()), math.sqrt(low), math.sqrt(high)
            assert value > np.sqrt(square).mean() * 1.001  # another number than the mean of the rms
            for formula in (NARROW_SD, STREAM_SD):
                one = row(said.of(name), formula, mode)
                assert one.simulated == pytest.approx(value, rel=1e-14)
                assert one.simulated_low == pytest.approx(low, rel=1e-12)
                assert one.simulated_high == pytest.approx(high, rel=1e-12)
                assert one.method.value is not None
                assert one.ratio == pytest.approx(one.method.value / value, rel=1e-12)
                assert one.ratio_low == pytest.approx(one.method.value / high, rel=1e-12)
                assert one.ratio_high == pytest.approx(one.method.value / low, rel=1e-12)


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


def peak_factor(found: Comparison, case: str) -> float:
    """That of the random stream on V1, all paces."""
    peak, sd = (row(found.of(case), name).method.value for name in (STREAM_PEAK, STREAM_SD))
    assert peak is not None
    assert sd is not None
    return peak / sd


@pytest.mark.parametrize("percentile", [0.5, 0.9, 0.95])
def test_formulas_with_a_percentile_follow_it(path: Path, said: Comparison, percentile: float) -> None:
    """Vanmarcke's factor of the percentile in the window of 60 s; formulas without one stay."""
    found = compare_file(path, percentile=percentile)
    for now in found.estimates.situations:
        mode = now.model.mode("V1")
        factor = vanmarcke(percentile, mode.frequency, mode.damping, 60.0)
        assert peak_factor(found, now.name) == pytest.approx(factor, rel=1e-12)
        assert row(found.of(now.name), STREAM_PEAK).method.stands_for.startswith(f"{100 * percentile:g} % value")
        for name in (STEADY, CROSSING, SQUARE_ROOT, STREAM_SD, NARROW_SD):
            assert row(found.of(now.name), name).method == row(said.of(now.name), name).method
    assert (peak_factor(found, "day") < 0.99 * peak_factor(said, "day")) == (percentile < 0.95)


def test_a_record_shorter_than_the_window_goes_with_its_own_time(
    scenario: Callable[..., Scenario], tmp_path: Path
) -> None:
    """20 s observed, 60 s asked for: the simulated peak is that of 20 s, and so is the formula's."""
    out = tmp_path / "short.h5"
    short = (("duration = 900.0", "duration = 20.0"), ("", "[comfort]\nwindow = 60\n"))
    simulate_to(plan(scenario(*short), realisations=2), out)
    found = compare_file(out)
    judgement = found.summary.cases[0].deck[0].judgement
    assert judgement is not None
    assert (judgement.short, judgement.window, judgement.asked_window) == (True, 20.0, 60.0)
    assert peak_factor(found, "all streams") == pytest.approx(vanmarcke(0.95, 1.92, 0.005, 20.0), rel=1e-12)
    (alone,) = [m for m in estimate(scenario(*short)).methods if m.name == STREAM_PEAK]
    assert alone.value is not None
    assert row(found.rows, STREAM_PEAK).method.value < alone.value  # type: ignore[operator]


def test_a_case_that_was_not_run_is_left_out(path: Path, scenario: Callable[..., Scenario]) -> None:
    summary = summarise(path, "Weir Lane")
    alone = compare(replace(summary, cases=summary.cases[1:]), scenario(*CHANGES))
    assert {r.method.case for r in alone.rows} == {"people"}


def test_without_an_interval_the_ratio_has_none(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    out = tmp_path / "few.h5"
    simulate_to(plan(scenario(*CHANGES), realisations=1), out)
    few = compare_file(out)
    for name in (STEADY, NARROW_SD, STREAM_SD):
        one = row(few.of("day"), name)
        assert one.ratio is not None
        assert (one.simulated_low, one.simulated_high, one.ratio_low, one.ratio_high) == (None,) * 4
    assert json.dumps(few.as_dict(), allow_nan=False)


# ---------------------------------------------------------------- the leading mode


def recorded(said: Comparison, case: str) -> dict[str, float]:
    """95 % value of the peak at the antinodes of V1 and V2."""
    points = {p.name: p for c in said.summary.cases if c.name == case for p in c.points}
    return {mode: points[f"{mode} vertical"].peak.p95.value for mode in ("V1", "V2")}


def leading_modes(rows: tuple[Compared, ...]) -> set[str]:
    """Modes of the rows; of the others stands what the random stream gives, at the end."""
    return {r.method.mode for r in rows if r.method.name != STREAM_SD} | {rows[0].method.mode}


def test_the_leading_mode_is_that_with_the_largest_recorded_peak(said: Comparison) -> None:
    """V1 with the first harmonic: 0.4 against 0.1 of the weight on V2."""
    for case in ("day", "people"):
        peaks = recorded(said, case)
        assert peaks["V1"] > peaks["V2"]
        leading = said.leading(case)
        assert leading_modes(leading) == {"V1"}
        assert {r.method.case for r in leading} == {case}
        names = [r.method.name for r in leading if r.method.direction == "vertical" and r.method.mode == "V1"]
        assert len(names) == len(set(names))
        assert {STEADY, CROSSING, SQUARE_ROOT, STREAM_SD, STREAM_PEAK, NARROW_SD, NARROW_PEAK} <= set(names)
        assert {r.method.measure for r in leading} == {PEAK, RMS}
        values = {r.method.name: r.method.value for r in leading if r.method.value is not None}
        assert [value for _, value in marks(said, case)] == [
            values[n] for n in (STEADY, CROSSING, SQUARE_ROOT, STREAM_PEAK)
        ]
    assert marks(said, "nobody") == []


def test_the_second_mode_leads_where_it_is_light(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    """A twentieth of the mass: run, and with the harmonic that reaches it."""
    out = tmp_path / "light.h5"
    light = scenario(*CHANGES[:2], ("", SECOND.replace("MASS", "2e3")), *CHANGES[3:])
    simulate_to(plan(light, realisations=5), out)
    found = compare_file(out)
    assert recorded(found, "day")["V2"] > recorded(found, "day")["V1"]
    leading = found.leading("day")
    assert leading_modes(leading) == {"V2"}
    assert {r.method.harmonic for r in leading} == {2, None}
    assert {STEADY, CROSSING, STREAM_SD} <= {r.method.name for r in leading}


def test_the_record_decides_which_mode_leads_not_the_formula(
    said: Comparison, scenario: Callable[..., Scenario]
) -> None:
    """One crossing is larger on V1; with a larger recorded peak V2 leads, whatever the peak at other points."""
    case = said.summary.cases[0]
    crossings = {r.method.mode: r.method.value for r in said.of(case.name) if r.method.name == CROSSING}
    assert crossings["V1"] > crossings["V2"]
    top = recorded(said, case.name)["V1"]
    for name, leads in (("V2 vertical", "V2"), ("V1 lateral", "V1"), ("V6 vertical", "V1")):
        points = tuple(
            replace(p, peak=replace(p.peak, p95=replace(p.peak.p95, value=1.01 * top))) if p.name == name else p
            for p in case.points
        )
        assert points != case.points
        summary = replace(said.summary, cases=(replace(case, points=points), *said.summary.cases[1:]))
        found = compare(summary, scenario(*CHANGES))
        assert leading_modes(found.leading(case.name)) == {leads}
        assert leading_modes(found.leading("people")) == {"V1"}


def test_the_harmonic_is_that_of_the_largest_crossing(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    """Joggers' first harmonic and walkers' second, both on V2 at 3.8 Hz: either may be the larger one."""
    lead = replace(said.summary, cases=(led_by_v2(said), *said.summary.cases[1:]))
    for factor, expected in ((1.3, ("run", 1)), (0.01, ("commuters", 2))):
        run = (
            '[[stream]]\nname = "run"\ngait = "jogging"\narrival = { per_hour = 30 }\nspeed = 3\n'
            f"pace = {{ mean = 3.6, sd = 0.1, min = 3.2, max = 4.0 }}\nload = {{ harmonics = [{factor}] }}\n"
        )
        leading = compare(lead, scenario(*CHANGES, ("", run))).leading("day")
        assert leading_modes(leading) == {"V2"}
        assert {(r.method.stream, r.method.harmonic) for r in leading if r.method.harmonic} == {expected}
        assert [r.method.name for r in leading].count(CROSSING) == 1


def led_by_v2(said: Comparison) -> CaseSummary:
    """The first case with a peak of 9 m/s2 at the antinode of V2."""
    case = said.summary.cases[0]
    points = tuple(
        replace(p, peak=replace(p.peak, p95=replace(p.peak.p95, value=9.0))) if p.name == "V2 vertical" else p
        for p in case.points
    )
    return replace(case, points=points)


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
    assert row(found.rows, NARROW_SD, name).simulated == found.summary.cases[0].points[0].rms_of_all.value
    assert {r.method.mode for r in found.leading("all streams")} == {name}


def test_two_modes_at_one_place_share_it(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    third = '[[mode]]\nname = "V3"\nfrequency = 5.5\ndamping = 0.01\nmodal_mass = 4e4\nvertical = { half_waves = 3 }\n'
    out = tmp_path / "shared.h5"
    simulate_to(plan(scenario(("", third), ("duration = 900.0", "duration = 20.0")), realisations=2), out)
    found = compare_file(out)
    assert found.summary.cases[0].points[0].name == "V1+V3"
    value = found.summary.cases[0].points[0].rms_of_all.value
    assert row(found.rows, STREAM_SD, "V1").simulated == row(found.rows, STREAM_SD, "V3").simulated == value


def with_rms(summary: Summary, found: MeanSquare) -> Summary:
    """The first case with these numbers at its first point."""
    case = summary.cases[0]
    point: PointSummary = replace(case.points[0], rms_of_all=found)
    return replace(summary, cases=(replace(case, points=(point, *case.points[1:])), *summary.cases[1:]))


def test_the_interval_of_a_ratio_holds_the_ratio(said: Comparison, scenario: Callable[..., Scenario]) -> None:
    """Two realisations that differ much: the lower end of the mean square is nought, and a ratio has no upper end."""
    two = root_mean_square(np.array([0.05, 0.15]))
    assert two.low == 0.0
    for found, upper in ((two, False), (MeanSquare(0.1, 0.02, 0.14), True)):
        one = row(compare(with_rms(said.summary, found), scenario(*CHANGES)).of("day"), NARROW_SD)
        assert one.simulated == found.value
        assert one.ratio is not None
        assert one.ratio_low is not None
        assert one.ratio_low < one.ratio
        assert (one.ratio_high is not None) == upper
        assert one.ratio_high is None or one.ratio_high > one.ratio


def test_json(said: Comparison) -> None:
    data = json.loads(json.dumps(said.as_dict(), allow_nan=False))
    assert len(data["comparison"]) == len(said.rows)
    for told, one in zip(data["comparison"], said.rows, strict=True):
        assert told == {**asdict(one.method), **{k: v for k, v in asdict(one).items() if k != "method"}}
        assert {"name", "source", "case", "value", "simulated", "ratio", "ratio_low", "ratio_high"} <= set(told)
    assert data["cases"][0]["name"] == "day"
    assert data["screening"]
