"""Hand formulas, alone and beside simulated numbers."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from crowdsim.console.base import Console, interval_text, or_dash
from crowdsim.results.texts import number, span
from crowdsim.study.estimate import PEAK, STEADY, WEIGHTS, Method

if TYPE_CHECKING:  # `estimate` answers at once: nothing that opens a results file is loaded for it
    from crowdsim.study.compare import Compared

_ORDINAL = {None: "", 1: "1st", 2: "2nd", 3: "3rd"}


def harmonic(method: Method) -> str:
    """Which harmonic of whose pace, as a person says it."""
    if method.harmonic is None:
        return ""
    return _ORDINAL.get(method.harmonic, f"{method.harmonic}th")


def _who(method: Method) -> str:
    """The streams, or how many where their names are long."""
    many = method.stream.count("' and '") + 1
    return f"{many} streams" if many > 1 and len(method.stream) > 24 else method.stream or "all"


def formulas(console: Console, methods: Sequence[Method]) -> None:
    """What each formula gives."""
    rows = [
        [m.mode, harmonic(m), _who(m), m.name, m.measure.split()[0], or_dash(m.value), m.unit]
        for m in methods
        if m.value is not None
    ]
    columns = [("mode", "k"), ("harmonic", "k"), ("who", "l"), ("formula", "l"), ("measure", "k"), ("value", "r"),
               ("unit", "k")]  # fmt: skip
    console.table("Hand formulas", columns, rows, spare=("who", "measure", "harmonic"))
    nothing: dict[str, list[str]] = {}
    for m in methods:
        if m.value is None:
            nothing.setdefault(m.note, []).append(f"{m.name} ({m.mode})")
    console.items("No number", [f"{', '.join(names)}: {note}" for note, names in nothing.items()])


def meanings(methods: Sequence[Method]) -> list[str]:
    """What each formula stands for and assumes, by its first use."""
    seen: dict[str, str] = {}
    for m in methods:
        if m.value is not None:
            text = f"{m.name} ({m.case}, mode {m.mode}): {m.stands_for}; {m.assumes}. Source: {m.source}"
            seen.setdefault(m.name, text)
    return list(seen.values())


def beside(console: Console, rows: Sequence[Compared], *, title: str) -> None:
    """Formula, simulated, ratio with its interval."""
    steady = {(r.method.mode, r.method.harmonic): r.method.value for r in rows if r.method.name == STEADY}
    same = [r for r in rows if r.method.name in _ALIKE and _near(steady.get((r.method.mode, r.method.harmonic)), r)]
    cells = [
        [r.method.name, r.method.mode, harmonic(r.method), _who(r.method), or_dash(r.method.value),
         or_dash(r.simulated), "-" if r.ratio is None else f"{number(r.ratio)}",
         interval_text(r.ratio_low, r.ratio_high)]
        for r in rows
        if r.method.value is not None and r not in same
    ]  # fmt: skip
    columns = [("formula", "l"), ("mode", "k"), ("harmonic", "k"), ("who", "l"), ("gives, m/s2", "r"),
               ("simulated", "r"), ("ratio", "r"), ("its 95 % interval", "r")]  # fmt: skip
    console.table(title, columns, cells, spare=("who", "its 95 % interval", "harmonic", "mode"))
    windows = {r.method.window for r in rows if r.method.measure == PEAK and r.ratio is not None}
    time = f" in {span(windows.pop())}" if len(windows) == 1 else ""
    console.line(
        f"Simulated: for a peak, that judged above, of the whole deck and all modes{time}; for an rms, that of all "
        "modes over all realisations where the mode moves most."
        + (" By weights with C = 1 or 2: the same as the steady state." if same else "")
    )


_ALIKE = (WEIGHTS.format("1"), WEIGHTS.format("2"))


def _near(value: float | None, row: Compared) -> bool:
    return value is not None and row.method.value is not None and abs(row.method.value / value - 1.0) < 1e-9


def reasons(rows: Sequence[Compared]) -> list[str]:
    """Why each formula differs from the simulation."""
    return [
        f"{r.method.name} ({r.method.mode}): {r.method.stands_for}; {r.method.assumes}. Differs: {r.method.why}"
        for r in rows
        if r.method.value is not None
    ]
