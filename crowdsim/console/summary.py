"""The summary of a run: what `crowdsim simulate` ends with."""

from __future__ import annotations

from crowdsim.console import formulas, verdicts
from crowdsim.console.base import CAUTION, Console, interval_text, or_dash
from crowdsim.results.summary import CaseSummary, DeckSummary
from crowdsim.results.texts import number, span
from crowdsim.study.compare import Comparison


def summary(console: Console, comparison: Comparison) -> None:
    """Every case with its verdict, the formulas beside it, what was assumed and what was not varied."""
    said = comparison.summary
    if console.json:
        console.data(comparison.as_dict())
        return
    if console.quiet:
        return
    console.heading(said.title)
    missing = verdicts.incomplete(comparison)
    if missing:
        console.heading(missing)
    console.items("Findings", said.findings)
    shared = [a for a in said.cases[0].assumptions if all(a in c.assumptions for c in said.cases)]
    if len(said.cases) > 1:
        console.line()
        verdicts.table(console, said.cases)
    for case in said.cases:
        _case(console, comparison, case, [a for a in case.assumptions if a not in shared])
    console.line()
    for line in not_varied(comparison):
        console.line(line)
    console.items("Assumed" if len(said.cases) == 1 else "Assumed in every case", shared)
    console.line()
    console.line(CAUTION)
    if missing:
        console.heading(missing)
    console.out.print(f"Results: {said.file} (seed {said.seed}, crowdsim {said.version})", soft_wrap=True)


def not_varied(comparison: Comparison) -> list[str]:
    """What the intervals leave out, and how much that weighs where a study of it is in the file."""
    alone = "The intervals speak of the number of realisations alone."
    known = [f"{s.text()} {s.not_varied_text()}".strip() for s in comparison.sensitivities]
    if known:
        return [f"{alone} A sensitivity study is in the file.", *known]
    return [
        f"{alone} Not varied: load set, pace, step length, damping, frequency, the people's effect, density; any of "
        "them can outweigh the interval. `crowdsim sensitivity` shows which matter most for this bridge."
    ]


def _case(console: Console, comparison: Comparison, case: CaseSummary, own: list[str]) -> None:
    console.line()
    warm = f"each after a warm-up of {span(case.warm_up)}" if case.warm_up else "each from rest"
    console.line(
        f"Case {case.name}: {case.realisations:,} realisation{'s' if case.realisations != 1 else ''} of "
        f"{span(case.duration)}, {warm}; {number(case.persons_on_deck)} persons on the deck on average, "
        f"{number(case.crossings_mean)} crossings a realisation."
    )
    mass = [m for m in case.modes if m["added_mass"] > 0.0]
    if mass:
        shifted = ", ".join(f"{m['name']} at {number(m['frequency'], 4)} Hz" for m in mass)
        console.line(f"With the people's mass: {shifted}.")
    for deck in case.deck:
        _direction(console, deck, case)
    points(console, case)
    rows = comparison.leading(case.name)
    if rows:
        formulas.beside(console, rows, title="Hand formulas beside it (more, and why they differ: crowdsim compare)")
    console.items("Assumed", own)


def _direction(console: Console, deck: DeckSummary, case: CaseSummary) -> None:
    if deck.judgement is None:
        if deck.peak.largest == 0.0:
            console.line(f"No {deck.direction} response: no force acts in that direction in this version.")
        else:
            console.line(
                f"The {deck.direction} response below comes from vertical forces alone: far too small, and no "
                "assessment."
            )
        return
    if deck.peak.largest == 0.0:
        console.line("No vertical response: nobody stepped on in time, or everybody walks where no mode moves.")
        return
    verdicts.verdict(console, deck.judgement)
    if not deck.judgement.whole:
        p = deck.peak.p95
        console.line(
            f"Over the whole {span(case.duration)} the 95 % value is {number(p.value)} m/s2 (95 % confidence interval "
            f"{interval_text(p.low, p.high)})."
        )
    console.line(verdicts.place(deck, case.lines))


def points(console: Console, case: CaseSummary) -> None:
    """Statistics where each mode moves most and at the scenario's own points."""
    rows = []
    for point in case.points:
        p = point.peak
        rows.append(
            [point.name, number(point.s), number(point.e), point.direction, number(p.mean), or_dash(p.sd),
             number(p.median), number(p.p95.value), interval_text(p.p95.low, p.p95.high), number(p.largest),
             number(point.rms_of_all.value), number(point.running_rms_max.p95.value)]
        )  # fmt: skip
    columns = [("at", "k"), ("s, m", "r"), ("e, m", "r"), ("direction", "k"), ("mean", "r"), ("sd", "r"),
               ("median", "r"), ("95 % value", "r"), ("its 95 % interval", "r"), ("largest", "r"),
               ("RMS", "r"), ("1 s RMS, 95 %", "r")]  # fmt: skip
    console.table(
        f"Peak acceleration of all modes together in {span(case.duration)}, m/s2, where each mode moves most",
        columns, rows, spare=("median", "sd", "1 s RMS, 95 %", "RMS", "mean", "direction", "largest", "e, m"),
    )  # fmt: skip
