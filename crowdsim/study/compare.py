"""The hand formulas beside the simulated numbers of the same case: ratios with their intervals."""

from __future__ import annotations

from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

from crowdsim.response.extreme_likelihood import Family
from crowdsim.results.fits import FittedCase, fit_file
from crowdsim.results.reader import open_file
from crowdsim.results.sensitivity import Sensitivity, read_sensitivity
from crowdsim.results.summary import CaseSummary, PointSummary, Summary, summarise
from crowdsim.scenario.reader import Scenario, parse_scenario
from crowdsim.study.estimate import (
    CROSSING,
    PEAK,
    RMS,
    SQUARE_ROOT,
    STEADY,
    STREAM_PEAK,
    STREAM_SD,
    Estimates,
    Method,
    estimate,
)
from crowdsim.study.situation import Situation


@dataclass(frozen=True)
class Compared:
    """A formula and the simulated number that stands nearest to it, with its 95 % interval.

    simulated : the 95 % value of the peak anywhere on the deck in a comfort window, or the rms
    over all realisations at the mode's antinode; ratio : formula over simulated; None where one of them is missing
    """

    method: Method
    simulated: float | None
    simulated_low: float | None
    simulated_high: float | None
    ratio: float | None
    ratio_low: float | None
    ratio_high: float | None


@dataclass(frozen=True)
class Comparison:
    """A run in numbers, and the formulas beside it, case by case.

    fits : laws of the window peaks, where asked for; sensitivities : studies that the file holds
    """

    summary: Summary
    estimates: Estimates
    rows: tuple[Compared, ...]
    fits: tuple[FittedCase, ...] = ()
    sensitivities: tuple[Sensitivity, ...] = ()

    def of(self, case: str) -> tuple[Compared, ...]:
        """Those of one case."""
        return tuple(r for r in self.rows if r.method.case == case)

    def leading(self, case: str) -> tuple[Compared, ...]:
        """Those of the mode at whose antinode the peak is largest, with the harmonic of the largest crossing.

        And what the random stream gives of every other mode.
        """
        said = next((c for c in self.summary.cases if c.name == case), None)
        now = next((s for s in self.estimates.situations if s.name == case), None)
        if said is None or now is None:
            return ()
        here = [r for r in self.of(case) if r.method.value is not None and r.method.measure == PEAK]

        def largest(mode: str) -> float:
            point = antinode(now, said, mode, "vertical")
            return -1.0 if point is None else point.peak.p95.value

        mode = max(dict.fromkeys(r.method.mode for r in here), key=largest, default=None)
        if mode is None:
            return ()
        top = max((r.method for r in here if r.method.mode == mode and r.method.harmonic), key=_crossing, default=None)
        same = (None, "") if top is None else (top.harmonic, top.stream)
        own = [
            r
            for r in self.of(case)
            if (r.method.mode, r.method.direction) == (mode, "vertical")
            and r.method.measure in (PEAK, RMS)
            and (r.method.harmonic is None or (r.method.harmonic, r.method.stream) == same)
        ]
        others = [r for r in self.of(case) if r.method.name == STREAM_SD and r.method.mode != mode]
        return (*own, *others)

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return {
            **self.summary.as_dict(),
            "comparison": [
                {**asdict(r.method), **{k: v for k, v in asdict(r).items() if k != "method"}} for r in self.rows
            ],
            "screening": [asdict(s) for s in self.estimates.screening],
            "fits": [asdict(f) for f in self.fits],
            "sensitivities": [s.as_dict() for s in self.sensitivities],
        }


def _crossing(method: Method) -> float:
    return method.value if method.value is not None and method.name == CROSSING else -1.0


MARKED = {
    STEADY: "steady state",
    CROSSING: "one crossing",
    SQUARE_ROOT: "one crossing x √number",
    STREAM_PEAK: "random stream",
}


def marks(comparison: Comparison, case: str) -> list[tuple[str, float]]:
    """Formulas worth a mark on a figure of the peak, [m/s2]."""
    return [
        (f"{MARKED[r.method.name]}, {r.method.mode}", r.method.value)
        for r in comparison.leading(case)
        if r.method.name in MARKED and r.method.value is not None
    ]


def compare(summary: Summary, scenario: Scenario, *, percentile: float = 0.95) -> Comparison:
    """Puts the formulas for `scenario` beside the numbers of a run of it, for the same percentile and time."""
    judged = {c.name: d.judgement.window for c in summary.cases for d in c.deck if d.judgement is not None}
    estimates = estimate(scenario, share=percentile, windows=judged)
    by_name = {c.name: c for c in summary.cases}
    now = {s.name: s for s in estimates.situations}
    rows = [_compared(m, now[m.case], by_name[m.case]) for m in estimates.methods if m.case in by_name]
    return Comparison(summary, estimates, tuple(rows))


def compare_file(
    path: str | Path, *, percentile: float = 0.95, limit: float | None = None, family: Family | None = None
) -> Comparison:
    """The same for a results file, whose scenario it holds.

    percentile, limit : in place of 95 % and of what the cases ask
    family : law to fit to the window peaks, none by default

    Raises ResultsError for a file that is none of ours, InputError where its scenario cannot be read any more.
    """
    with open_file(path) as file:
        scenario = parse_scenario(str(file.attrs["scenario"]), f"scenario within {path}")
    comparison = compare(
        summarise(path, scenario.title, percentile=percentile, limit=limit), scenario, percentile=percentile
    )
    fits = () if family is None else fit_file(path, family)
    return replace(comparison, fits=fits, sensitivities=read_sensitivity(path))


def _compared(method: Method, now: Situation, case: CaseSummary) -> Compared:
    simulated, low, high = _simulated(method, now, case)
    value = method.value
    if value is None or not simulated:
        return Compared(method, simulated, low, high, None, None, None)
    return Compared(
        method, simulated, low, high, value / simulated,
        value / high if high else None, value / low if low is not None and low > 0.0 else None,
    )  # fmt: skip


def _simulated(method: Method, now: Situation, case: CaseSummary) -> tuple[float | None, float | None, float | None]:
    if method.measure == PEAK:
        for deck in case.deck:
            if deck.direction == method.direction and deck.judgement is not None:
                value = deck.judgement.value
                return value.value, value.low, value.high
    if method.measure == RMS:
        point = antinode(now, case, method.mode, method.direction)
        if point is not None:
            return point.rms_of_all.value, point.rms_of_all.low, point.rms_of_all.high
    return None, None, None


def antinode(now: Situation, case: CaseSummary, mode: str, direction: str) -> PointSummary | None:
    """Where a mode moves most in a direction, among the recorded points."""
    s, e, _ = now.model.largest(now.model.mode(mode), direction)
    for point in case.points:
        if point.direction == direction and abs(point.s - s) < 1e-6 * now.model.length and abs(point.e - e) < 1e-9:
            return point
    return None
