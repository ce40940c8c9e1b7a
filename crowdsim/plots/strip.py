"""Marks above a panel: named places on its horizontal axis, in as few rows as keep the names apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from crowdsim.plots.style import BLACK, MM, SMALL, grow, home, ours, text_width

ROW = 3.7  # mm
LINE = 3.6  # mm, of the key below
_DOT = 1.3  # mm from a mark to its name
_BETWEEN = 1.0  # mm between two names of a row
_TRIALS = 4000


@dataclass(frozen=True)
class _Put:
    """A mark at x [mm] in a row, its name from begin to end."""

    which: int
    x: float
    row: int
    begin: float
    end: float


def strip(ax: Axes, marks: Sequence[tuple[str, float]], clear: float = 0.8) -> Axes | None:
    """Marks (name, place) above `ax`, `clear` mm from it; beyond the axis with an arrow at its edge.

    Call it when the limits of the axis are set, before the labels are settled.
    """
    if not marks:
        return None
    fig = home(ax)
    fig.draw_without_rendering()
    box = ax.get_window_extent()
    width, height = (v / fig.dpi / MM for v in (box.width, box.height))
    low, high = ax.get_xlim()
    named = []
    for name, value in sorted(marks, key=lambda mark: mark[1]):
        inside = min(max(value, low), high)
        arrow = "" if inside == value else " \u25b8" if value > high else " \u25c2"
        named.append((name + arrow, width * (inside - low) / (high - low)))
    placed = _rows([(text_width(name, SMALL), x) for name, x in named], width)
    if placed is None:
        letters = [chr(ord("A") + i % 26) + (str(i // 26) if i >= 26 else "") for i in range(len(named))]
        _key(ax, [f"{letter}  {name}" for letter, (name, _) in zip(letters, named, strict=True)])
        named = [(letter, x) for letter, (_, x) in zip(letters, named, strict=True)]
        placed = _rows([(text_width(name, SMALL), x) for name, x in named], width) or _stacked(named, width)
    rows = 1 + max(p.row for p in placed)
    if ours(fig):
        grow(fig, panels=rows * ROW + clear)
        height += rows * ROW + clear
    left = max(height - rows * ROW - clear, 0.3 * height)
    above = ax.inset_axes((0.0, 1.0 + clear / left, 1.0, rows * ROW / left))
    above.set_xlim(0.0, width)
    above.set_ylim(-0.5, rows - 0.5)
    above.patch.set_alpha(0.0)
    above.set_axis_off()
    for p in placed:
        above.plot([p.x, p.x], [-0.5 - clear / ROW, p.row], color=BLACK, lw=0.4, clip_on=False)
        above.plot([p.x], [p.row], "o", ms=2.0, color=BLACK, clip_on=False)
        above.text(
            p.begin, p.row, named[p.which][0], size=SMALL, va="center", ha="left", gid="label",
            bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.3},
        )  # fmt: skip
    return above


def _key(ax: Axes, names: Sequence[str]) -> None:
    """What the letters stand for, below the figure (or in a panel of somebody else's)."""
    fig = home(ax)
    handles = [Line2D([], [], ls="none") for _ in names]
    style: dict[str, Any] = {"handlelength": 0.0, "handletextpad": 0.0, "fontsize": SMALL, "borderpad": 0.2}
    if not ours(fig):
        ax.legend(handles, names, loc="best", **style)
        return
    # not by "outside", which would put it over the foot line
    columns = max(1, int((fig.get_figwidth() / MM - 8.0) / max(text_width(name, SMALL) + 4.0 for name in names)))
    box = grow(fig, below=-(-len(names) // columns) * LINE + 1.5)
    made = fig.legend(
        handles, names, loc="lower left", bbox_to_anchor=box, ncols=columns, borderaxespad=0.0,
        labelspacing=0.25, columnspacing=1.5, **style,
    )  # fmt: skip
    made.set_in_layout(False)
    made.set_gid("key")


def _rows(names: Sequence[tuple[float, float]], width: float) -> list[_Put] | None:
    """Rows for names (width, x) [mm], the fewest found without a crossing.

    None where a name fits on neither side of its mark, or where nothing was found.
    """
    sides = [_sides(name, width) for name in names]
    if not all(sides):
        return None
    order = sorted(range(len(names)), key=lambda i: names[i][1])
    for rows in range(1, len(names) + 1):
        for way in (order[::-1], order):
            put: list[_Put] = []
            if _search(names, sides, way, rows, put, [_TRIALS]):
                return put
    return None


def _stacked(named: Sequence[tuple[str, float]], width: float) -> list[_Put]:
    """A row each, from the right upwards; the names stand on white, should a line pass behind."""
    order = sorted(range(len(named)), key=lambda i: -named[i][1])
    size = {i: text_width(named[i][0], SMALL) for i in order}
    begin = {i: min(named[i][1] + _DOT, width - size[i]) for i in order}
    return [_Put(i, named[i][1], row, begin[i], begin[i] + size[i]) for row, i in enumerate(order)]


def _sides(name: tuple[float, float], width: float) -> list[tuple[float, float]]:
    """Where a name may stand: right of its mark, left of it."""
    size, x = name
    right, left = (x + _DOT, x + _DOT + size), (x - _DOT - size, x - _DOT)
    return [side for side in (right, left) if side[0] >= -0.5 and side[1] <= width + 0.5]


def _search(
    names: Sequence[tuple[float, float]], sides: Sequence[Sequence[tuple[float, float]]], order: Sequence[int],
    rows: int, put: list[_Put], left: list[int],
) -> bool:  # fmt: skip
    """Puts the names from len(put) on, with a way back; gives up when no trials are left."""
    if len(put) == len(order):
        return True
    i = order[len(put)]
    for row in range(rows):
        for side in sides[i]:
            left[0] -= 1
            new = _Put(i, names[i][1], row, *side)
            if left[0] < 0:
                return False
            if any(_clash(new, p) for p in put):
                continue
            put.append(new)
            if _search(names, sides, order, rows, put, left):
                return True
            put.pop()
    return False


def _clash(a: _Put, b: _Put) -> bool:
    # name and dot together
    first, last = ((min(p.begin, p.x - 0.6), max(p.end, p.x + 0.6)) for p in (a, b))
    if a.row == b.row and first[0] < last[1] + _BETWEEN and last[0] < first[1] + _BETWEEN:
        return True
    return any(
        p.row >= q.row and q.begin - 0.6 < p.x < q.end + 0.6 and (p.row, p.x) != (q.row, q.x)
        for p, q in ((a, b), (b, a))
    )
