"""Which modes lie in reach, as a table."""

from __future__ import annotations

from collections.abc import Sequence

from crowdsim.console.base import Console
from crowdsim.results.texts import number
from crowdsim.study.screening import Screened

_ORDINAL = {1: "1st", 2: "2nd", 3: "3rd"}


def screening(console: Console, rows: Sequence[Screened]) -> None:
    """Mode by mode: frequency empty and with people, which harmonic reaches it, what to do."""
    cells = [
        [r.mode, r.direction, number(r.empty, 4), number(r.people, 4), number(r.full, 4), _harmonic(r), _verdict(r),
         r.why]
        for r in rows
    ]  # fmt: skip
    columns = [("mode", "k"), ("direction", "k"), ("empty, Hz", "r"), ("people", "r"), ("70 kg/m2", "r"),
               ("harmonic", "k"), ("simulate", "k"), ("why", "l")]  # fmt: skip
    console.table("Which modes lie in reach", columns, cells, spare=("people", "direction", "70 kg/m2"))
    console.line(
        "Frequencies: empty, with the mass of the most people that a case has on average, with one person of 70 kg "
        "a square metre. EN 1990 wants a check below 5 Hz (vertical), 2.5 Hz (horizontal and torsional)."
    )


def _harmonic(row: Screened) -> str:
    if not row.harmonic:
        return "-"
    half = " half pace" if row.direction == "lateral" else ""
    return f"{row.gait}{half} {_ORDINAL.get(row.harmonic, f'{row.harmonic}th')}"


def _verdict(row: Screened) -> str:
    if not row.simulate:
        return "no"
    return "yes" if row.direction == "vertical" else "not here"
