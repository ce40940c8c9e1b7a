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
from matplotlib.patheffects import withStroke
from matplotlib.text import Annotation, Text
from matplotlib.transforms import Bbox
from numpy.typing import NDArray

from crowdsim.plots.style import BLACK, GREY, SMALL, home

Floats = NDArray[np.float64]
Side = Literal["right", "top"]
_HALO = [withStroke(linewidth=1.8, foreground="white")]
_GAP = 1.5  # pt kept free around a label
_NEAR = 5.0  # pt, up to which a label stands beside what it names and needs no leader
_ANCHORS = 60


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

    def top(self, x: float, text: str, color: str = BLACK) -> None:
        """Names a place, above the top edge."""
        where = self.ax.get_xaxis_transform()
        made = self.ax.text(x, 1.02, text, transform=where, size=SMALL, color=color, va="bottom", ha="center")
        self.edge["top"].append((x, made))


def settle(labels: Iterable[Labels]) -> None:
    """Places all labels of a figure and fixes its layout."""
    wanted = list(labels)
    fig = home(wanted[0].ax)
    fig.draw_without_rendering()
    for group in wanted:
        for side in ("right", "top"):
            _spread(group, side)  # type: ignore[arg-type]
        _Room(group.ax).place(group.inside)
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
    slack = max(reach, 0.0) + (0.0 if along else 20.0 * point)
    for (_, text), was, now in zip(items, at, apart(at, sizes, low - slack, high + slack), strict=True):
        text.set_transform(ax.transAxes)
        share = (now - low) / (high - low)
        if abs(now - was) > 2.0 * point:
            away = 5.0 * point / (box.width if along else box.height)
            out = 1.005 + away
            begin = (was - low) / (high - low)
            ends = ([1.0, out], [begin, share]) if along else ([begin, share], [1.0, out])
            leader = Line2D(*ends, transform=ax.transAxes, color=GREY, lw=0.4, clip_on=False, gid="leader")
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
        self.origin = np.array([box.x0, box.y0])
        self.width, self.height = max(int(box.width / self.point), 1), max(int(box.height / self.point), 1)
        self.lines = np.zeros((self.height, self.width))
        self.hard = np.zeros((self.height, self.width))
        for line in ax.lines:
            self._draw(line)
        for text in ax.texts:
            if text.get_text() and text.get_visible():
                self._block(text.get_window_extent())

    def cells(self, display: Floats) -> Floats:
        """From pixels to cells."""
        return (display - self.origin) / self.point

    def _draw(self, line: Line2D) -> None:
        vertices = line.get_transform().transform_path(line.get_path()).vertices
        p = self.cells(np.asarray(vertices, dtype=np.float64))
        p = p[np.all(np.isfinite(p), axis=1)]
        if p.size == 0:
            return
        p = np.clip(p, -50.0, np.array([self.width, self.height]) + 50.0)
        if line.get_marker() not in ("None", "none", None, "", " "):
            for x, y in p:
                self._fill(self.hard, x - 3.0, y - 3.0, x + 3.0, y + 3.0)
        if line.get_linestyle() in ("None", "none", "", " ") or len(p) < 2:
            return
        if line.get_drawstyle() == "steps-post":
            p = np.repeat(p, 2, axis=0)
            p = np.column_stack([p[1:, 0], p[:-1, 1]])
        length = np.maximum(np.ceil(np.abs(np.diff(p, axis=0)).max(axis=1)), 1.0).astype(np.intp)
        which = np.repeat(np.arange(length.size), length)
        share = (np.arange(which.size) - np.repeat(np.cumsum(length) - length, length)) / length[which]
        fine = p[which] + share[:, None] * (p[which + 1] - p[which])
        self._mark(self.lines, fine)

    def _mark(self, grid: Floats, p: Floats) -> None:
        i = np.floor(p).astype(np.intp)
        inside = (i[:, 0] >= 0) & (i[:, 0] < self.width) & (i[:, 1] >= 0) & (i[:, 1] < self.height)
        grid[i[inside, 1], i[inside, 0]] = 1.0

    @staticmethod
    def _fill(grid: Floats, x0: float, y0: float, x1: float, y1: float) -> None:
        rows, columns = grid.shape
        grid[max(int(y0), 0) : min(int(y1) + 1, rows), max(int(x0), 0) : min(int(x1) + 1, columns)] = 1.0

    def _block(self, box: Bbox) -> None:
        (x0, y0), (x1, y1) = self.cells(np.array([[box.x0, box.y0], [box.x1, box.y1]]))
        if x1 > 0 and y1 > 0:
            self._fill(self.hard, x0, y0, x1, y1)

    def place(self, wanted: Sequence[tuple[Floats, Floats, str, str]]) -> None:
        """Finds a place for every label, the most constrained (points) first."""
        for x, y, text, color in sorted(wanted, key=lambda w: w[0].size > 1):
            made = self.ax.annotate(
                text, (0.5, 0.5), xytext=(0.5, 0.5), xycoords="axes fraction", textcoords="axes fraction", size=SMALL,
                color=color, ha="left", va="bottom", path_effects=_HALO, linespacing=1.1, zorder=6, gid="label",
            )  # fmt: skip
            made.set_in_layout(False)
            self._place(made, self._anchors(x, y))

    def _anchors(self, x: Floats, y: Floats) -> Floats:
        at = self.cells(np.asarray(self.ax.transData.transform(np.column_stack([x, y])), dtype=np.float64))
        inside = (at >= -1.0).all(axis=1) & (at <= [self.width + 1.0, self.height + 1.0]).all(axis=1)
        at = at[inside] if inside.any() else np.clip(at, 0.0, [self.width, self.height])
        if 1 < len(at):
            way = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(at, axis=0).T))])
            even = np.linspace(0.04, 0.96, _ANCHORS) * way[-1]
            at = np.column_stack([np.interp(even, way, at[:, k]) for k in (0, 1)])
        return at

    def _place(self, made: Annotation, anchors: Floats) -> None:
        box = made.get_window_extent()
        w, h = box.width / self.point, box.height / self.point
        rows, columns = self.height - int(h) - 2, self.width - int(w) - 2
        if rows < 1 or columns < 1:
            rows, columns = max(rows, 1), max(columns, 1)
        i, j = np.arange(rows)[:, None], np.arange(columns)[None, :]
        lines, hard = (self._inside(g, i, j, w, h) for g in (self.lines, self.hard))
        cost = 3.0 * lines + 1e4 * hard + 40.0 * (lines > 0)
        dx = np.maximum(np.maximum(j[..., None] - anchors[:, 0], anchors[:, 0] - (j[..., None] + w)), 0.0)
        dy = np.maximum(np.maximum(i[..., None] - anchors[:, 1], anchors[:, 1] - (i[..., None] + h)), 0.0)
        # the square root of a table of all places and anchors is the slow part: squares do for the choice
        square = np.empty((rows, columns))
        nearest = np.empty((rows, columns), dtype=np.intp)
        for row in range(rows):
            d2 = dx[0] ** 2 + dy[row] ** 2
            nearest[row] = d2.argmin(axis=1)
            square[row] = np.take_along_axis(d2, nearest[row][:, None], axis=1)[:, 0]
        distance = np.sqrt(square)
        cost += distance + 6.0 * (distance > _NEAR) + 4.0 * np.maximum(2.0 - distance, 0.0)
        best = int(np.argmin(cost))
        row, column = divmod(best, columns)
        self._set(made, (column + 0.5, row + 0.5), (w, h), anchors[nearest[row, column]], float(distance.flat[best]))

    def _inside(self, grid: Floats, i: Any, j: Any, w: float, h: float) -> Floats:
        total = np.zeros((self.height + 1, self.width + 1))
        total[1:, 1:] = grid.cumsum(axis=0).cumsum(axis=1)
        y0, x0 = np.maximum(i - int(_GAP), 0), np.maximum(j - int(_GAP), 0)
        y1 = np.minimum(i + int(np.ceil(h + _GAP)), self.height)
        x1 = np.minimum(j + int(np.ceil(w + _GAP)), self.width)
        return np.asarray(total[y1, x1] - total[y0, x1] - total[y1, x0] + total[y0, x0])

    def _set(
        self, made: Annotation, at: tuple[float, float], size: tuple[float, float], anchor: Floats, distance: float
    ) -> None:
        share = np.array([self.width, self.height]) * self.point
        scale = np.array([self.ax.get_window_extent().width, self.ax.get_window_extent().height])
        x, y = np.array(at) * self.point / scale
        made.set_position((float(x), float(y)))
        self._fill(self.hard, at[0], at[1], at[0] + size[0], at[1] + size[1])
        if distance <= _NEAR:
            return
        end = np.clip(anchor, at, np.array(at) + size)
        ends = np.stack([anchor, end]) * self.point / scale
        leader = Line2D(ends[:, 0], ends[:, 1], transform=self.ax.transAxes, color=GREY, lw=0.4, zorder=5, gid="leader")
        leader.set_in_layout(False)
        self.ax.add_artist(leader)
        del share
