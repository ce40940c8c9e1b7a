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
    "Comfort only, and vertical only: this is no safety check of the structure. Lateral and longitudinal comfort, "
    "lateral lock-in, deliberate jumping and panic are outside. Damping is uncertain until it is measured. The "
    "governing code, the owner's criteria and a licensed engineer decide."
)
FOLDED = 16  # letters that a folding column keeps at least


class Console:
    """Prints results on standard output, all else on standard error."""

    def __init__(self, *, quiet: bool = False, verbose: bool = False, json: bool = False):
        self.quiet, self.verbose, self.json = quiet, verbose, json
        self.out = rich.console.Console(highlight=False, markup=False)
        self.err = rich.console.Console(stderr=True, highlight=False, markup=False)
        if not self.out.is_terminal:
            self.out.width = 120

    def note(self, text: str) -> None:
        """A line on standard error, unless quiet."""
        if not self.quiet:
            self.err.print(text)

    def path(self, text: str) -> None:
        """A line with a path, on standard error and never folded, unless quiet."""
        if not self.quiet:
            self.err.print(text, soft_wrap=True)

    def heading(self, text: str) -> None:
        """A line that stands out."""
        self.out.print(text, style="bold")

    def line(self, text: str = "", indent: str = "") -> None:
        """Running text, folded to the width."""
        self.out.print(textwrap.fill(text, self.out.width, initial_indent=indent, subsequent_indent=indent))

    def table(
        self,
        title: str,
        columns: Sequence[tuple[str, str]],
        rows: Sequence[Sequence[str]],
        spare: Sequence[str] = (),
    ) -> None:
        """Rows under columns (name, "l" folds, "k" keeps, "r" keeps to the right).

        spare : columns that are left out, the first first, where the terminal is too narrow; what stays is whole
        """
        keep = list(range(len(columns)))
        widths = [_least(name, side, [row[i] for row in rows]) for i, (name, side) in enumerate(columns)]
        for name in spare:
            if sum(widths[i] + 2 for i in keep) - 2 <= self.out.width:
                break
            keep = [i for i in keep if columns[i][0] != name]
        table = Table(title=title, title_justify="left", title_style="bold", box=None, pad_edge=False, padding=(0, 1))
        for i in keep:
            name, side = columns[i]
            table.add_column(
                name, justify="right" if side == "r" else "left", no_wrap=side != "l", min_width=widths[i],
                overflow="fold",
            )  # fmt: skip
        for row in rows:
            table.add_row(*(row[i] for i in keep))
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


def _least(name: str, side: str, cells: Sequence[str]) -> int:
    """Letters that a column needs: all of its longest cell, or what a folding one keeps."""
    longest = max([len(name), *map(len, cells)])
    return min(longest, FOLDED) if side == "l" else longest


def or_dash(value: float | None, digits: int = 3) -> str:
    """A number, or a dash for none."""
    return "-" if value is None else number(value, digits)


def interval_text(low: float | None, high: float | None, digits: int = 3) -> str:
    """From low to high."""
    if low is None or high is None:
        return "none"
    return f"{number(low, digits)} to {number(high, digits)}"
