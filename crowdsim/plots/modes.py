"""Mode shapes as simulated, people's mass included."""

from __future__ import annotations

import math

import numpy as np
from matplotlib.axes import Axes
from numpy.typing import NDArray

from crowdsim.bridge.modal import DIRECTIONS, Mode
from crowdsim.plots.labels import Labels, settle
from crowdsim.plots.style import BLACK, DASHES, GREY, NARROW, WIDTH, figure, plain, styled, wrapped
from crowdsim.results.texts import number
from crowdsim.study.prepare import Case

Floats = NDArray[np.float64]
FINE = 241


@styled()
def modes(case: Case, *, mode: str | None = None, width: float = WIDTH, foot: str = "", ax: Axes | None = None) -> Axes:
    """Ordinates against s [m], a panel a mode; circles mark the points of record.

    Parameters
    ----------
    case : as prepared, or as `crowdsim.study.again.case_again` gives
    mode : name of the only one to draw; default all, or the first where `ax` is given
    width : of the figure [mm]; ax : takes one mode; None makes a figure

    Raises KeyError for a mode that is none.
    """
    chosen = [case.model.mode(mode)] if mode is not None else list(case.model.modes)
    if ax is not None:
        settle([_panel(ax, case, chosen[0], width)])
        return ax
    most = 3 if width >= 150.0 else 2 if width >= NARROW else 1
    columns = min(most, len(chosen)) if len(chosen) != 4 else min(most, 2)
    rows = math.ceil(len(chosen) / columns)
    mass = ", the people's mass included" if case.people == "mass" else ""
    title = f"Mode shapes as simulated{mass}; circles: points of record"
    fig = figure(width, max(rows * (42.0 if rows > 1 else 56.0), 52.0), title, foot)
    panels = fig.subplots(rows, columns, sharex=True, squeeze=False)
    labels = []
    for panel, shape in zip(panels.ravel(), chosen, strict=False):
        labels.append(_panel(panel, case, shape, width, (width - 14.0 * columns) / columns))
    for n, panel in enumerate(panels.ravel()):
        if n >= len(chosen):
            panel.set_visible(False)
        below = n + columns < len(chosen)
        panel.tick_params(labelbottom=not below)
        panel.set_xlabel("" if below else "s along the deck, m")
        panel.set_ylabel("ordinate" if n % columns == 0 else "")
    settle(labels)
    first: Axes = panels[0, 0]
    return first


def _lines(case: Case, mode: Mode, s: Floats) -> list[tuple[str, Floats]]:
    """What the mode does to the deck: name and ordinates of every line."""
    lines = []
    half = 0.5 * case.model.width
    for direction in mode.directions:
        if direction == "vertical" and mode.twist is not None:
            lines.append(("left edge, vertical", mode.ordinate(direction, s, half)))
            if mode.vertical is not None:
                lines.append(("vertical", mode.ordinate(direction, s)))
            lines.append(("right edge, vertical", mode.ordinate(direction, s, -half)))
        else:
            lines.append((direction, mode.ordinate(direction, s)))
    return lines


def _panel(ax: Axes, case: Case, mode: Mode, width: float, room: float = 100.0) -> Labels:
    labels = Labels(ax)
    s = np.linspace(0.0, case.model.length, FINE)
    lines = _lines(case, mode, s)
    ax.axhline(0.0, color=GREY, lw=0.4, zorder=1)
    dashes = {"vertical": 0, "left edge, vertical": 1, "right edge, vertical": 2, "lateral": 3, "longitudinal": 4}
    reach = 0.0
    for name, y in lines:
        ax.plot(s, y, color=BLACK, ls=DASHES[dashes[name]], gid=name)
        reach = max(reach, float(np.abs(y).max()))
        labels.line(s, y, name.removesuffix(", vertical") if len(lines) > 1 else name)
    points = [p for p in case.points if p.direction in mode.directions and p.direction in DIRECTIONS]
    at = [float(mode.ordinate(p.direction, p.s, p.e)) for p in points]
    ax.plot([p.s for p in points], at, "o", ms=3.2, mfc="white", mec=BLACK, mew=0.8, ls="none", gid="points")
    ax.set_xlim(0.0, case.model.length)
    ax.set_ylim(-1.3 * reach, 1.3 * reach)
    title = "\n".join(wrapped(line, room, lines=1) for line in _title(mode).split("\n"))
    ax.set_title(title, loc="left", pad=3.0, linespacing=1.1)
    ax.set_xlabel("s along the deck, m")
    ax.set_ylabel("ordinate")
    plain(ax, 80.0 if room < 60.0 else width)
    return labels


def _title(mode: Mode) -> str:
    mass = f"{number(mode.modal_mass / 1000)} t" if mode.modal_mass >= 1000.0 else f"{number(mode.modal_mass)} kg"
    return f"{mode.name}: {number(mode.frequency)} Hz\ndamping {100 * mode.damping:.3g} %, mass {mass}"
