"""The largest acceleration along the deck: median, 95 % value with its interval, largest."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from numpy.typing import NDArray

from crowdsim.plots.labels import Labels, settle
from crowdsim.plots.style import (
    BAND,
    BLACK,
    DASHES,
    GREY,
    NARROW,
    UNIT,
    WIDTH,
    direction_of,
    figure,
    level,
    limit_text,
    plain,
    spans,
    styled,
    wanted,
)
from crowdsim.response.statistics import interval_ranks, percentile_rank
from crowdsim.results.reader import CaseResults
from crowdsim.results.texts import span

Floats = NDArray[np.float64]
SHARE = 0.95


@styled()
def envelope(
    case: CaseResults,
    *,
    direction: str | None = None,
    e: float | None = None,
    width: float = WIDTH,
    foot: str = "",
    ax: Axes | None = None,
) -> Axes:
    """Peak acceleration of the whole record [m/s2] against s [m], over the realisations.

    Parameters
    ----------
    direction : default the first with any response
    e : offset [m] of the only line to draw; default all that the file has (edges and centre line
        where the deck twists), or the centre line where `ax` is given
    width : of the figure [mm]; ax : takes one line; None makes a figure with a panel for each

    Raises ResultsError where nothing moves.
    """
    direction = direction or direction_of(case)
    offsets = [float(v) for v in case.deck_e]
    values = case.envelope[direction]
    top = _top(case, direction)
    if ax is not None:
        i = offsets.index(e) if e is not None else len(offsets) // 2
        settle([_panel(ax, case, direction, values[:, i], top, width)])
        return ax
    lines = sorted(range(len(offsets)) if e is None else [offsets.index(e)], key=lambda i: -offsets[i])
    what = f"{direction.capitalize()} peak acceleration along the deck"
    count = f"{case.realisations:,} realisation{'s' if case.realisations > 1 else ''}"
    time = span(float(case.attributes["duration"]))
    title = f"{what}: largest in the observed {time}, {count}"
    window = float(case.attributes["window"])
    if window < float(case.attributes["duration"]) - 1e-9:
        title += f". Classes and limits speak of {span(window)}, in which peaks are lower"
    beside = width >= NARROW
    rows, columns = (1, len(lines)) if beside else (len(lines), 1)
    fig = figure(width, 76.0 if beside else max(62.0, 48.0 * len(lines)), title, foot)
    panels = fig.subplots(rows, columns, sharex=True, sharey=True, squeeze=False).ravel()
    labels = []
    for n, (panel, i) in enumerate(zip(panels, lines, strict=True)):
        last = n == len(lines) - 1
        labels.append(_panel(panel, case, direction, values[:, i], top, width, named=n == 0, bounds=last or not beside))
        if len(lines) > 1:
            panel.set_title(_line(offsets[i]), loc="left", pad=2.5)
            panel.label_outer()
    settle(labels)
    first: Axes = panels[0]
    return first


def _line(e: float) -> str:
    if e == 0.0:
        return "centre line"
    side, sign = ("left", "+") if e > 0.0 else ("right", "\u2212")
    return f"{side} edge, e = {sign}{abs(e):.4g} m"


def _top(case: CaseResults, direction: str) -> float:
    """Upper end of the axis: room above the largest, and the limit where it is not far."""
    largest = float(case.envelope[direction].max())
    limit = wanted(case, direction).limit
    reach = 1.18 * largest
    return max(reach, 1.12 * limit) if limit is not None and limit < 2.0 * largest else reach


def _panel(
    ax: Axes, case: CaseResults, direction: str, values: Floats, top: float, width: float,
    *, named: bool = True, bounds: bool = True,
) -> Labels:  # fmt: skip
    """Lines over `values` [realisation, s]; named: with their names; bounds: with those of the classes."""
    labels, s, count = Labels(ax), case.deck_s, values.shape[0]
    ordered = np.sort(values, axis=0)
    ax.set_xlim(float(s[0]), float(s[-1]))
    ax.set_ylim(0.0, top)
    _shade(ax, labels, case, direction, top, bounds, width >= NARROW)
    if count == 1:
        ax.plot(s, ordered[0], color=BLACK, gid="largest")
        if named:
            labels.line(s, ordered[0], "the one realisation")
    else:
        _lines(ax, labels, s, ordered, named)
    ax.set_xlabel("s along the deck, m")
    ax.set_ylabel(f"peak acceleration, {UNIT}")
    plain(ax, width)
    return labels


def _lines(ax: Axes, labels: Labels, s: Floats, ordered: Floats, named: bool) -> None:
    count = ordered.shape[0]
    value = ordered[percentile_rank(count, SHARE) - 1]
    ranks = interval_ranks(count, SHARE)
    if ranks is not None:
        low, high = ordered[ranks[0] - 1], ordered[ranks[1] - 1]
        ax.fill_between(s, low, high, gid="interval", **BAND)
        if named:
            high_up = high > 0.6 * high.max()
            labels.line(s[high_up], high[high_up], "interval of the 95 % value")
    median = np.median(ordered, axis=0)
    alike = percentile_rank(count, SHARE) == count
    lines = [
        (ordered[-1], DASHES[2], "largest", 1.0),
        (value, DASHES[0], "95 % value, the largest" if alike else "95 % value", 1.4),
        (median, DASHES[1], "median", 1.0),
    ]
    for y, dash, name, weight in lines[1:] if alike else lines:
        ax.plot(s, y, color=BLACK, ls=dash, lw=weight, gid=name.split(",")[0])
        if named:
            # where the lines are apart, not where they meet at the ends
            labels.line(s[y > 0.6 * y.max()], y[y > 0.6 * y.max()], name)


def _shade(ax: Axes, labels: Labels, case: CaseResults, direction: str, top: float, named: bool, wide: bool) -> None:
    wants = wanted(case, direction)
    for name, low, high, colour in spans(wants.criterion, direction, top):
        ax.axhspan(low, high, color=colour, lw=0, zorder=0)
        if named:
            labels.right(0.5 * (low + high), name, GREY)
    if wants.limit is None:
        return
    beyond = wants.limit >= top
    if not beyond:
        ax.axhline(wants.limit, color=BLACK, lw=0.8, ls=DASHES[3], gid="limit")
    if named:
        words = limit_text(wants) if wide else level(wants.limit)
        labels.right(min(wants.limit, top), words + (" \u25b4" if beyond else ""))
