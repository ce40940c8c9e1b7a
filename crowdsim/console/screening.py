"""Which modes lie in reach, as a table."""

from __future__ import annotations

from collections.abc import Sequence

from crowdsim.console.base import Console
from crowdsim.results.texts import number
from crowdsim.study.screening import Screened

_ORDINAL = {0: "", 1: "1st", 2: "2nd"}


def screening(console: Console, rows: Sequence[Screened]) -> None:
    """Mode by mode: frequency empty and with people, which harmonic reaches it, what to do."""
    cells = [
        [
            r.mode,
            r.direction,
            f"{number(r.empty, 4)}",
            f"{number(r.people, 4)}",
            f"{number(r.full, 4)}",
            f"{r.gait} {_ORDINAL[r.harmonic]}".strip() or "-",
            _verdict(r),
            r.why,
        ]
        for r in rows
    ]
    columns = [("mode", "k"), ("direction", "k"), ("empty, Hz", "r"), ("people", "r"), ("70 kg/m2", "r"),
               ("harmonic", "k"), ("simulate", "k"), ("why", "l")]  # fmt: skip
    if not console.wide:
        keep = (0, 2, 4, 5, 6, 7)
        columns, cells = [columns[i] for i in keep], [[row[i] for i in keep] for row in cells]
    console.table("Which modes lie in reach", columns, cells)
    console.line(
        "Frequencies: empty, with the mass of the most people that a case has on average, with one person of 70 kg "
        "a square metre. EN 1990 wants a check below 5 Hz (vertical), 2.5 Hz (horizontal).",
    )


def _verdict(row: Screened) -> str:
    if not row.simulate:
        return "no"
    return "yes" if row.direction == "vertical" else "not here"
