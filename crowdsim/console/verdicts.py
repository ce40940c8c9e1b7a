"""Classes and verdicts: of one case in words, of all cases in a table."""

from __future__ import annotations

from collections.abc import Sequence

from crowdsim.console.base import Console, interval_text
from crowdsim.results.judgement import Judgement
from crowdsim.results.summary import CaseSummary
from crowdsim.results.texts import number, percent, span
from crowdsim.results.wording import buys, class_text


def verdict(console: Console, judged: Judgement) -> None:
    """The sentence for a report, the chances, what would decide."""
    console.line(judged.sentence, "  ")
    if judged.chances:
        seen = [i for i, (_, p) in enumerate(judged.chances) if p.value > 0.0]
        parts = [  # and the next worse one: not seen is not impossible
            f"{name} {percent(p.value)} ({percent(p.low)} to {percent(p.high)})"
            for i, (name, p) in enumerate(judged.chances)
            if i in seen or i == max(seen) + 1
        ]
        console.line(f"The peak of one window of {span(judged.window)} lies in {', '.join(parts)}.")
    if judged.exceedance is not None:
        p = judged.exceedance
        console.line(
            f"It exceeds {number(judged.limit or 0.0)} m/s2 with a probability of {percent(p.value)} "
            f"({percent(p.low)} to {percent(p.high)}) in {span(judged.window)}."
        )
    console.line(buys(judged) + (f" {judged.note[:1].upper()}{judged.note[1:]}." if judged.note else ""))


def table(console: Console, cases: Sequence[CaseSummary]) -> None:
    """Case by case: persons, 95 % peak, class, chances, what was asked, verdict."""
    rows = []
    for case in cases:
        for deck in case.deck:
            judged = deck.judgement
            if judged is None:
                continue
            rows.append([
                case.name, judged.direction, number(case.persons_on_deck), span(judged.window),
                judged.shown, interval_text(judged.value.low, judged.value.high),
                class_text(judged), chances_text(judged), asked_text(judged), verdict_text(judged),
            ])  # fmt: skip
    share = f"{100 * next(d.judgement.value.share for c in cases for d in c.deck if d.judgement):g} %" if rows else ""
    windows = {row[3] for row in rows}
    time = f"window of {windows.pop()}" if len(windows) == 1 else "window"
    columns = [("case", "l"), ("direction", "k"), ("persons", "r"), ("window", "r"), (f"{share} peak, m/s2", "r"),
               ("its 95 % interval", "r"), ("class", "k"), ("chance of each class", "l"), ("asked", "l"),
               ("verdict", "l")]  # fmt: skip
    spare = ("direction", *(("window",) if len(windows) == 0 else ()), "chance of each class", "persons")
    console.table(f"Cases: largest peak anywhere on the deck in one {time}", columns, rows, spare)


def chances_text(judged: Judgement) -> str:
    """Chances in short."""
    return ", ".join(f"{name} {percent(p.value)}" for name, p in judged.chances if p.value > 0.0) or "-"


def asked_text(judged: Judgement) -> str:
    """What the case asks."""
    if judged.limit is None:
        return "nothing"
    return f"{judged.target}: {number(judged.limit)}" if judged.target else f"{number(judged.limit)} m/s2"


def verdict_text(judged: Judgement) -> str:
    """The verdict in short."""
    if judged.verdict is None:
        return "-"
    return f"undecided (about {judged.needed:,} may)" if judged.needed is not None else judged.verdict
