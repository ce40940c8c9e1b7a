"""What the 95 % peak hangs on, as a table."""

from __future__ import annotations

from crowdsim.console.base import CAUTION, Console, interval_text
from crowdsim.results.sensitivity import Sensitivity, change_text
from crowdsim.results.texts import number, span


def sensitivity(console: Console, result: Sensitivity) -> None:
    """Base, one change a row, what matters most, what was left alone."""
    if console.json:
        console.data(result.as_dict())
        return
    if console.quiet:
        return
    console.heading(result.title)
    console.line(
        f"Case {result.case}, {result.realisations:,} realisations with the same random numbers each; 95 % value of "
        f"the peak {result.direction} acceleration anywhere on the deck in {span(result.window)}: "
        f"{number(result.base.value)} m/s2 (95 % confidence interval "
        f"{interval_text(result.base.low, result.base.high)})."
    )
    rows = []
    remarks: dict[str, list[str]] = {}
    subject = ""
    for v in result.variations:
        change = "-" if v.change is None else change_text(v.change)
        between = "none" if v.low is None or v.high is None else f"{change_text(v.low)} to {change_text(v.high)}"
        value = "-" if v.value is None else number(v.value)
        rows.append(["" if v.subject == subject else v.subject, v.label, value, change, between])
        subject = v.subject
        for said in (v.source, *v.note.split("; ")):
            if said:
                remarks.setdefault(said, []).append(v.label)
    columns = [("of", "l"), ("changed to", "l"), ("95 % peak, m/s2", "r"), ("change", "r"), ("95 % interval", "r")]
    console.table("One change at a time", columns, rows, spare=("95 % peak, m/s2",))
    console.items("Where the other values come from", [f"{', '.join(of)}: {said}" for said, of in remarks.items()])
    console.line(result.text())
    if result.not_varied:
        console.line(result.not_varied_text())
    console.line(CAUTION)
