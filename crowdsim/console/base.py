"""What every screen is made of: a title, a table, a list, running text, JSON."""

from __future__ import annotations

import json as json_module
import textwrap
from collections.abc import Sequence
from typing import Any

import rich.console
from rich.table import Table

from crowdsim.results.texts import number

CAUTION = (
    "Comfort only: this is no safety check of the structure. Lateral lock-in, deliberate jumping and panic are "
    "outside. Damping is uncertain until it is measured. The governing code, the owner's criteria and a licensed "
    "engineer decide."
)
WIDE = 110  # columns; a narrower terminal gets fewer columns, never a cut number


class Console:
    """Prints results on standard output, all else on standard error."""

    def __init__(self, *, quiet: bool = False, verbose: bool = False, json: bool = False):
        self.quiet, self.verbose, self.json = quiet, verbose, json
        self.out = rich.console.Console(highlight=False, markup=False)
        self.err = rich.console.Console(stderr=True, highlight=False, markup=False)
        if not self.out.is_terminal:
            self.out.width = 120

    @property
    def wide(self) -> bool:
        """Whether there is room for every column."""
        return self.out.width >= WIDE

    def note(self, text: str) -> None:
        """A line on standard error, unless quiet."""
        if not self.quiet:
            self.err.print(text)

    def heading(self, text: str) -> None:
        """A line that stands out."""
        self.out.print(text, style="bold")

    def line(self, text: str = "", indent: str = "") -> None:
        """Running text, folded to the width."""
        self.out.print(textwrap.fill(text, self.out.width, initial_indent=indent, subsequent_indent=indent))

    def table(self, title: str, columns: Sequence[tuple[str, str]], rows: Sequence[Sequence[str]]) -> None:
        """Rows under columns (name, "l" folds, "k" keeps, "r" keeps to the right)."""
        table = Table(title=title, title_justify="left", title_style="bold", box=None, pad_edge=False, padding=(0, 1))
        for i, (name, side) in enumerate(columns):
            whole = max([len(name), *(len(row[i]) for row in rows)]) if side != "l" else None
            table.add_column(
                name, justify="right" if side == "r" else "left", no_wrap=side != "l", min_width=whole, overflow="fold"
            )
        for row in rows:
            table.add_row(*row)
        self.out.print(table)

    def items(self, title: str, lines: Sequence[str]) -> None:
        """A list, nothing where it is empty."""
        if not lines:
            return
        self.heading(title)
        for line in lines:
            self.out.print(textwrap.fill(line, self.out.width - 2, initial_indent="  - ", subsequent_indent="    "))

    def data(self, value: Any) -> None:
        """JSON."""
        self.out.file.write(json_module.dumps(value, indent=2, allow_nan=False) + "\n")


def or_dash(value: float | None, digits: int = 3) -> str:
    """A number, or a dash for none."""
    return "-" if value is None else number(value, digits)


def interval_text(low: float | None, high: float | None, digits: int = 3) -> str:
    """From low to high."""
    if low is None or high is None:
        return "none"
    return f"{number(low, digits)} to {number(high, digits)}"
