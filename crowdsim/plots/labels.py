"""Direct labels that overlap neither one another nor, where there is room, any line.

Labels are asked for while a figure is drawn and placed by `settle` when the layout is known: beside
what they name, or away from it with a thin leader. Lengths are points, places those of the axes.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patheffects import AbstractPathEffect, withStroke
from matplotlib.text import Annotation, Text
from matplotlib.transforms import Bbox
from numpy.typing import NDArray

from crowdsim.plots.style import BLACK, GREY, MM, SMALL, home, ours, text_width, tied, wrapped

Floats = NDArray[np.float64]
Side = Literal["right", "top"]
_HALO: list[AbstractPathEffect] = [withStroke(linewidth=1.6, foreground="white")]
_GAP = 2  # pt kept free around a label
_NEAR = 5.0  # pt, up to which a label stands beside what it names and needs no leader
_ANCHORS = 60
_TRIALS = 3000  # places looked at in the order of their cost


@dataclass
class Labels:
    """Labels wanted in one axes."""

    ax: Axes
    inside: list[tuple[Floats, Floats, str, str]] = field(default_factory=list)
    edge: dict[Side, list[tuple[float, Text]]] = field(default_factory=lambda: {"right": [], "top": []})

    def line(self, x: Floats, y: Floats, text: str, color: str = BLACK) -> None:
        """Names a line, anywhere along it (in data)."""
        self.inside.append((np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64), text, color))

    def point(self, x: float, y: float, text: str, color: str = BLACK) -> None:
        """Names a point (in data)."""
        self.line(np.array([x]), np.array([y]), text, color)

    def right(self, y: float, text: str, color: str = BLACK) -> None:
        """Names a level, outside the right edge."""
        where = self.ax.get_yaxis_transform()
        made = self.ax.text(1.015, y, text, transform=where, size=SMALL, color=color, va="center", ha="left")
        self.edge["right"].append((y, made))

    def top(self, low: float, high: float, text: str, color: str = BLACK, marks: Sequence[float] = ()) -> None:
        """Names a span, above the top edge, clear of `marks` where it can be. Limits of the axis are set before."""
        begin, end = self.ax.get_xlim()
        # the panel is about as wide as the figure without the room for its labels
        half = 0.5 * (text_width(text, SMALL) + 1.5) * (end - begin) / (home(self.ax).get_figwidth() / MM - 30.0)
        middle = 0.5 * (low + high)
        tried = np.linspace(middle, low + half, 12), np.linspace(middle, high - half, 12)
        clear = [t for pair in zip(*tried, strict=True) for t in pair if all(abs(t - m) > half for m in marks)]
        x = float(clear[0]) if clear and high - low > 2.0 * half else middle
        where = self.ax.get_xaxis_transform()
        made = self.ax.text(x, 1.02, text, transform=where, size=SMALL, color=color, va="bottom", ha="center")
        self.edge["top"].append((x, made))


def settle(labels: Iterable[Labels]) -> None:
    """Places all labels of a figure; the layout of a figure of ours is fixed then."""
    wanted = list(labels)
    fig = home(wanted[0].ax)
    fig.draw_without_rendering()
    for group in wanted:
        for side in ("right", "top"):
            _spread(group, side)
        _Room(group.ax).place(group.inside)
    if ours(fig):
        fig.set_layout_engine("none")


def apart(wanted: Sequence[float], sizes: Sequence[float], low: float, high: float) -> list[float]:
    """Centres nearest to `wanted` with which pieces of these `sizes` do not overlap within [low, high].

    >>> apart([1.0, 1.5, 9.9], [2.0, 2.0, 2.0], 0.0, 10.0)
    [1.0, 3.0, 9.0]
    """
    order = sorted(range(len(wanted)), key=lambda i: wanted[i])
    blocks: list[list[Any]] = []  # [begin, length, members]; a block is as near as it can to what its members want
    for i in order:
        blocks.append([wanted[i] - 0.5 * sizes[i], sizes[i], [i]])
        blocks[-1][0] = min(max(blocks[-1][0], low), high - sizes[i])
        while len(blocks) > 1 and blocks[-2][0] + blocks[-2][1] > blocks[-1][0]:
            _, length, members = blocks.pop()
            joined = [*blocks[-1][2], *members]
            whole = blocks[-1][1] + length
            before, shifts = 0.0, []
            for j in joined:
                shifts.append(wanted[j] - 0.5 * sizes[j] - before)
                before += sizes[j]
            begin = min(max(sum(shifts) / len(shifts), low), high - whole)
            blocks[-1] = [begin, whole, joined]
    centres = [0.0] * len(wanted)
    for begin, _, members in blocks:
        for i in members:
            centres[i] = begin + 0.5 * sizes[i]
            begin += sizes[i]
    return centres


def _spread(group: Labels, side: Side) -> None:
    """Moves labels outside an edge apart, with a short leader where one had to move."""
    items = group.edge[side]
    if not items:
        return
    ax, along = group.ax, int(side == "right")
    point = home(ax).dpi / 72.0
    box = ax.get_window_extent()
    low, high = ((box.x0, box.x1), (box.y0, box.y1))[along]
    extents = [t.get_window_extent() for _, t in items]
    sizes = [(e.height if along else e.width + 3.0 * point) + 0.6 * point for e in extents]
    data = np.array([(0.0, v) if along else (v, 0.0) for v, _ in items])
    at = [float(v) for v in ax.transData.transform(data)[:, along]]
    reach = sum(sizes) - (high - low)
    slack = max(reach, 0.0) + (0.5 * max(sizes) if along else 20.0 * point)
    for (_, text), was, now in zip(items, at, apart(at, sizes, low - slack, high + slack), strict=True):
        text.set_transform(ax.transAxes)
        share = (now - low) / (high - low)
        if abs(now - was) > 2.0 * point:
            away = 5.0 * point / (box.width if along else box.height)
            out = 1.005 + away
            begin = (was - low) / (high - low)
            ends = ([1.0, out], [begin, share]) if along else ([begin, share], [1.0, out])
            leader = Line2D(*ends, transform=ax.transAxes, color=GREY, lw=0.5, clip_on=False, gid="leader")
            leader.set_in_layout(False)
            ax.add_artist(leader)
        text.set_position((1.015 + (away if abs(now - was) > 2.0 * point else 0.0), share) if along else (share, 1.02))
        if not along and abs(now - was) > 2.0 * point:
            text.set_position((share, out + 0.005))


class _Room:
    """The free room in an axes, in cells of one point."""

    def __init__(self, ax: Axes):
        self.ax = ax
        self.point = home(ax).dpi / 72.0
        box = ax.get_window_extent()
        self.origin, self.scale = np.array([box.x0, box.y0]), np.array([box.width, box.height]) / self.point
        self.width, self.height = max(int(self.scale[0]), 1), max(int(self.scale[1]), 1)
        self.lines = np.zeros((self.height, self.width))
        self.hard = np.zeros((self.height, self.width))
        for line in ax.lines:
            self._draw(line)
        for patch in ax.patches:
            if patch.get_linewidth() > 0.0:
                self._path(patch.get_transform().transform_path(patch.get_path()).vertices)
        for text in ax.texts:
            if text.get_text() and text.get_visible():
                self._block(text.get_window_extent())

    def cells(self, display: Any) -> Floats:
        """From pixels to cells."""
        return np.asarray((np.asarray(display, dtype=np.float64) - self.origin) / self.point)

    def _draw(self, line: Line2D) -> None:
        vertices = np.asarray(line.get_transform().transform_path(line.get_path()).vertices, dtype=np.float64)
        if line.get_marker() not in ("None", "none", None, "", " "):
            for x, y in self.cells(vertices):
                _fill(self.hard, x - 3.0, y - 3.0, x + 3.0, y + 3.0)
        if line.get_linestyle() not in ("None", "none", "", " "):
            if line.get_drawstyle() == "steps-post" and len(vertices) > 1:
                twice = np.repeat(vertices, 2, axis=0)
                vertices = np.column_stack([twice[1:, 0], twice[:-1, 1]])
            self._path(vertices)

    def _path(self, vertices: Any) -> None:
        i = self._on(self.cells(vertices))
        self.lines[i[:, 1], i[:, 0]] = 1.0

    def _on(self, p: Floats) -> NDArray[np.intp]:
        """Cells that the straight lines through `p` touch."""
        p = p[np.all(np.isfinite(p), axis=1)]
        if len(p) < 2:
            return np.zeros((0, 2), dtype=np.intp)
        p = np.clip(p, -50.0, np.array([self.width, self.height]) + 50.0)
        length = np.maximum(np.ceil(np.abs(np.diff(p, axis=0)).max(axis=1)), 1.0).astype(np.intp)
        which = np.repeat(np.arange(length.size), length)
        share = (np.arange(which.size) - np.repeat(np.cumsum(length) - length, length)) / length[which]
        i = np.floor(p[which] + share[:, None] * (p[which + 1] - p[which])).astype(np.intp)
        inside = (i >= 0).all(axis=1) & (i < [self.width, self.height]).all(axis=1)
        return np.asarray(i[inside])

    def _block(self, box: Bbox) -> None:
        (x0, y0), (x1, y1) = self.cells([[box.x0, box.y0], [box.x1, box.y1]])
        if x1 > 0 and y1 > 0:
            _fill(self.hard, x0, y0, x1, y1)

    def place(self, wanted: Sequence[tuple[Floats, Floats, str, str]]) -> None:
        """Finds a place for every label, the most constrained (points) first."""
        wanted = [label for label in wanted if label[0].size]  # nothing drawn needs no name
        anchors = [self._anchors(x, y) for x, y, _, _ in wanted]
        widest = max(0.45 * self.scale[0], 76.0) * 25.4 / 72.0
        for i in sorted(range(len(wanted)), key=lambda i: wanted[i][0].size > 1):
            _, _, text, color = wanted[i]
            held = tied(text)
            room = max(widest, *(text_width(word, SMALL) + 0.1 for word in held.replace("\n", " ").split(" ")))
            broken = "\n".join(wrapped(line, room, SMALL) for line in held.split("\n"))
            made = self.ax.annotate(
                broken, (0.5, 0.5), xytext=(0.5, 0.5), xycoords="axes fraction", textcoords="axes fraction", size=SMALL,
                color=color, ha="left", va="bottom", linespacing=1.1, zorder=6, gid="label",
            )  # fmt: skip
            made.set_in_layout(False)
            others = [a for j, a in enumerate(anchors) if j != i]
            self._place(made, anchors[i], np.concatenate(others) if others else None)

    def _anchors(self, x: Floats, y: Floats) -> Floats:
        at = self.cells(self.ax.transData.transform(np.column_stack([x, y])))
        inside = (at >= -1.0).all(axis=1) & (at <= [self.width + 1.0, self.height + 1.0]).all(axis=1)
        at = at[inside] if inside.any() else np.clip(at, 0.0, [self.width, self.height])
        if len(at) > 1:
            way = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(at, axis=0).T))])
            even = np.linspace(0.04, 0.96, _ANCHORS) * way[-1]
            at = np.column_stack([np.interp(even, way, at[:, k]) for k in (0, 1)])
        return at

    def _place(self, made: Annotation, anchors: Floats, others: Floats | None) -> None:
        box = made.get_window_extent()
        size = np.array([box.width, box.height]) / self.point
        rows, columns = max(self.height - int(size[1]) - 2, 1), max(self.width - int(size[0]) - 2, 1)
        lines, hard = (self._inside(g, rows, columns, size) for g in (self.lines, self.hard))
        distance, nearest = _distance(anchors, rows, columns, size)
        away = distance > _NEAR
        if others is not None:
            # what stands as near to another line as to its own needs a leader
            other, _ = _distance(others, rows, columns, size)
            away |= other < distance + 3.0
        cost = 1.5 * lines + 1e4 * hard + 25.0 * (lines > 0) + distance + 8.0 * away
        cost += 4.0 * np.maximum(2.0 - distance, 0.0)
        best, least = 0, np.inf
        for trial in np.argsort(cost, axis=None, kind="stable")[:_TRIALS]:
            if cost.flat[trial] >= least:
                break
            corner = np.array(divmod(int(trial), columns)[::-1], dtype=np.float64) + 0.5
            crossed = 0.0
            if away.flat[trial]:
                i = self._on(np.stack([anchors[nearest.flat[trial]], _end(anchors[nearest.flat[trial]], corner, size)]))
                crossed = 30.0 * max(float(self.hard[i[:, 1], i[:, 0]].sum()) - 5.0, 0.0)  # its own marker is no hurdle
            if cost.flat[trial] + crossed < least:
                best, least = int(trial), float(cost.flat[trial] + crossed)
        corner = np.array(divmod(best, columns)[::-1], dtype=np.float64) + 0.5
        if lines.flat[best] > 0:
            made.set_path_effects(_HALO)
        self._set(made, corner, size, anchors[nearest.flat[best]] if away.flat[best] else None)

    def _inside(self, grid: Floats, rows: int, columns: int, size: Floats) -> Floats:
        """What of `grid` a text of `size` would cover, by its lower left corner."""
        total = np.zeros((self.height + 1, self.width + 1))
        total[1:, 1:] = grid.cumsum(axis=0).cumsum(axis=1)
        i, j = np.arange(rows)[:, None], np.arange(columns)[None, :]
        y0, x0 = np.maximum(i - _GAP, 0), np.maximum(j - _GAP, 0)
        y1 = np.minimum(i + int(np.ceil(size[1])) + _GAP, self.height)
        x1 = np.minimum(j + int(np.ceil(size[0])) + _GAP, self.width)
        return np.asarray(total[y1, x1] - total[y0, x1] - total[y1, x0] + total[y0, x0])

    def _set(self, made: Annotation, corner: Floats, size: Floats, anchor: Floats | None) -> None:
        x, y = corner / self.scale
        made.set_position((float(x), float(y)))
        _fill(self.hard, *corner, *(corner + size))
        if anchor is None:
            return
        ends = np.stack([anchor, _end(anchor, corner, size)])
        i = self._on(ends)
        self.hard[i[:, 1], i[:, 0]] = 1.0
        shares = ends / self.scale
        leader = Line2D(shares[:, 0], shares[:, 1], transform=self.ax.transAxes, color=GREY, lw=0.5, zorder=5)
        leader.set_gid("leader")
        leader.set_in_layout(False)
        self.ax.add_artist(leader)


def _fill(grid: Floats, x0: float, y0: float, x1: float, y1: float) -> None:
    rows, columns = grid.shape
    grid[max(int(y0), 0) : min(int(y1) + 1, rows), max(int(x0), 0) : min(int(x1) + 1, columns)] = 1.0


def _end(anchor: Floats, corner: Floats, size: Floats) -> Floats:
    """The point of a text nearest to what it names."""
    return np.asarray(np.clip(anchor, corner, corner + size))


def _distance(anchors: Floats, rows: int, columns: int, size: Floats) -> tuple[Floats, NDArray[np.intp]]:
    """From a text of `size` to the nearest anchor, and which, by the text's lower left corner."""
    i, j = np.arange(rows)[:, None], np.arange(columns)[:, None]
    dx = np.maximum(np.maximum(j - anchors[:, 0], anchors[:, 0] - (j + size[0])), 0.0) ** 2
    dy = np.maximum(np.maximum(i - anchors[:, 1], anchors[:, 1] - (i + size[1])), 0.0) ** 2
    square, nearest = np.empty((rows, columns)), np.empty((rows, columns), dtype=np.intp)
    for row in range(rows):
        total = dx + dy[row]
        nearest[row] = total.argmin(axis=1)
        square[row] = np.take_along_axis(total, nearest[row][:, None], axis=1)[:, 0]
    return np.sqrt(square), nearest
