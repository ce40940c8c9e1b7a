"""What `crowdsim compare` shows of a run: classes, windows, exceedance, every formula and why it differs."""

from __future__ import annotations

from crowdsim.console import formulas, verdicts
from crowdsim.console.base import CAUTION, Console, interval_text
from crowdsim.console.fits import fits
from crowdsim.console.screening import screening
from crowdsim.console.summary import not_varied
from crowdsim.response.windows import Proportion
from crowdsim.results.summary import CaseSummary, PointSummary
from crowdsim.results.texts import number, percent, span
from crowdsim.study.compare import Comparison


def compare(console: Console, comparison: Comparison) -> None:
    """Table of cases, then case by case the verdict, the points, the formulas."""
    if console.json:
        console.data(comparison.as_dict())
        return
    said = comparison.summary
    console.heading(said.title)
    missing = verdicts.incomplete(comparison)
    if missing:
        console.heading(missing)
    console.line()
    verdicts.table(console, said.cases)
    explained: set[tuple[str, str, int | None]] = set()
    for case in said.cases:
        console.line()
        console.heading(f"Case {case.name}")
        for deck in case.deck:
            if deck.judgement is not None:
                verdicts.verdict(console, deck.judgement)
                console.line(verdicts.place(deck, case.lines))
            else:
                console.line(f"{deck.direction}: no force acts in this direction in this version; not judged.")
        _points(console, case)
        rows = comparison.leading(case.name)
        if rows:
            formulas.beside(console, rows, title="Hand formulas beside the simulated numbers")
        kind = {(r.method.name, r.method.mode, r.method.harmonic) for r in rows}
        if not kind <= explained:  # what was said of another case holds here too
            console.items("What they stand for, and why they differ", formulas.reasons(rows))
            explained |= kind
    if comparison.fits:
        console.line()
        fits(console, comparison.fits)
    console.line()
    screening(console, comparison.estimates.screening)
    console.line()
    for line in not_varied(comparison):
        console.line(line)
    console.line(CAUTION)


def _points(console: Console, case: CaseSummary) -> None:
    judged = next((d.judgement for d in case.deck if d.judgement is not None), None)
    record, window = span(case.duration), span(judged.window) if judged else "a window"
    place = [("at", "k"), ("s, m", "r"), ("e, m", "r"), ("direction", "k")]
    rows = []
    for point in case.points:
        p, w = point.peak.p95, point.window_peak
        rows.append(
            [*_place(point), number(p.value), interval_text(p.low, p.high), "-" if w is None else number(w.value),
             "-" if w is None else interval_text(w.low, w.high)]
        )  # fmt: skip
    share = f"{100 * judged.value.share:g} %" if judged else "95 %"
    columns = [*place, (f"95 % in {record}", "r"), ("its interval", "r"), (f"{share} in {window}", "r"),
               ("interval", "r")]  # fmt: skip
    if share != "95 %":  # the record's stays the 95 % value: two percentiles in one table mislead
        columns, rows = columns[:4] + columns[6:], [row[:4] + row[6:] for row in rows]
    spare = ("direction", "e, m", "its interval", f"95 % in {record}")
    console.table("Peaks where each mode moves most, m/s2", columns, rows, spare)
    if judged is not None and judged.limit is not None:
        rows = [[*_place(p), _chance(p.exceedance), _chance(p.window_exceedance)] for p in case.points]
        columns = [*place, (f"in {record}", "r"), (f"in {window}", "r")]
        title = f"Chance of a peak above {number(judged.limit)} m/s2 there"
        console.table(title, columns, rows, spare=("direction", "e, m", "s, m", f"in {record}"))


def _place(point: PointSummary) -> list[str]:
    return [point.name, number(point.s), number(point.e), point.direction]


def _chance(share: Proportion | None) -> str:
    return "-" if share is None else f"{percent(share.value)} ({percent(share.low)} to {percent(share.high)})"
