"""Classes and verdicts: of one case in words, of all cases in a table."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from crowdsim.console.base import Console, interval_text
from crowdsim.results.judgement import Judgement
from crowdsim.results.summary import CaseSummary, DeckSummary
from crowdsim.results.texts import number, percent, span
from crowdsim.results.wording import buys, class_text

if TYPE_CHECKING:
    from crowdsim.study.compare import Comparison


def incomplete(comparison: Comparison) -> str:
    """What is missing in a run that was stopped; empty for a whole one."""
    said = comparison.summary
    if said.complete:
        return ""
    there = {c.name for c in said.cases}
    missing = [now.name for now in comparison.estimates.situations if now.name not in there]
    text = (
        f"INCOMPLETE: {', '.join(f'{c.realisations:,} of {said.asked:,} realisations of {c.name}' for c in said.cases)}"
    )
    return text + (f"; not simulated: {', '.join(missing)}" if missing else "") + "."


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
    spare = (
        "direction",
        *(("window",) if len(windows) == 0 else ()),
        "chance of each class",
        "persons",
        "asked",
        "its 95 % interval",
    )
    console.table(f"Cases: largest peak anywhere on the deck in one {time}", columns, rows, spare)


def chances_text(judged: Judgement) -> str:
    """Chances in short."""
    return ", ".join(f"{name} {percent(p.value)}" for name, p in judged.chances if p.value > 0.0) or "-"


def place(deck: DeckSummary, lines: int) -> str:
    """Where the deck moves most, as far as this run can tell."""
    low, high = deck.s_within
    text = f"In this run the deck moves most at s = {number(deck.s)} m, e = {number(deck.e)} m"
    if high > low or len(deck.e_within) > 1:
        on = "" if lines == 1 else f" on e = {', '.join(number(e) for e in deck.e_within)} m"
        text += f"; the 95 % value lies within the interval of that from s = {number(low)} to {number(high)} m{on}"
    return text + "."


def asked_text(judged: Judgement) -> str:
    """What the case asks."""
    if judged.limit is None:
        return "nothing"
    return f"{judged.target}: {number(judged.limit)}" if judged.target else f"{number(judged.limit)} m/s2"


def verdict_text(judged: Judgement) -> str:
    """The verdict in short."""
    if judged.verdict is None:
        return "-"
    if judged.needed is None or judged.value.low is None:
        return judged.verdict
    return f"undecided; about {judged.needed:,} realisations may decide"
