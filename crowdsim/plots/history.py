"""A kept realisation: acceleration, its running RMS, the persons on the deck, ten seconds about the peak."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator
from numpy.typing import NDArray

from crowdsim.errors import ResultsError
from crowdsim.plots.labels import Labels, settle
from crowdsim.plots.style import (
    BLACK,
    GREY,
    NARROW,
    PALE,
    STEPS,
    UNIT,
    WIDTH,
    columns_of,
    decimated,
    direction_of,
    figure,
    level,
    limit_text,
    plain,
    styled,
    wanted,
)
from crowdsim.results.reader import CaseResults
from crowdsim.results.texts import number

Floats = NDArray[np.float64]
ABOUT = 10.0  # s shown about the peak
RMS_WINDOW = 1.0  # s, as for the measure in the file


def running_rms(acceleration: Floats, window: int) -> Floats:
    """RMS over every `window` steps, by the trapezoidal rule, mean kept; `window` values fewer than given.

    >>> running_rms(np.array([1.0, 1.0, 1.0, 1.0]), 2)
    array([1., 1.])
    """
    square = np.asarray(acceleration, dtype=np.float64) ** 2
    total = np.concatenate([[0.0], np.cumsum(square)])
    whole = total[window + 1 :] - total[: -window - 1] - 0.5 * (square[:-window] + square[window:])
    return np.asarray(np.sqrt(np.maximum(whole, 0.0) / window))


@styled()
def history(
    case: CaseResults,
    persons: tuple[Floats, NDArray[np.int64]] | None = None,
    *,
    realisation: int | None = None,
    point: str | None = None,
    width: float = WIDTH,
    foot: str = "",
    ax: Axes | None = None,
) -> Axes:
    """Acceleration [m/s2] against time [s] at a point of a kept realisation.

    Parameters
    ----------
    persons : times [s] and the number on the deck from each on, of the same realisation, as
        `crowdsim.study.again.persons_on_deck` gives; None leaves that panel out
    realisation, point : default those with the largest peak
    width : of the figure [mm]
    ax : takes the main panel alone; None makes a figure with all of them

    Raises ResultsError for a realisation or point that is not in the file.
    """
    number_of, place = chosen(case, realisation, point)
    kept = case.histories[number_of]
    a = np.asarray(kept.acceleration[:, place])
    dt = float(case.attributes["time_step"])
    first = int(np.searchsorted(kept.time, float(case.attributes["warm_up"]) - 0.5 * dt))
    time, a = kept.time[first:], a[first:]
    if not np.any(a):
        raise ResultsError(f"case {case.name!r}: the response at {case.points.name[place]!r} is 0: nothing to draw")
    title = (
        f"{case.points.direction[place].capitalize()} acceleration at point {case.points.name[place]} "
        f"({_place(case, place)}), realisation {number_of}{_why(case, number_of)}"
    )
    peak, at = float(case.peak[number_of, place]), float(case.peak_time[number_of, place])
    if ax is not None:
        settle([_main(ax, case, place, time, a, dt, peak, at, width)])
        return ax
    fig = figure(width, 128.0 if persons is not None else 96.0, title, foot)
    main, deck, close = _panels(fig, persons is not None)
    labels = [_main(main, case, place, time, a, dt, peak, at, width), _close(close, time, a, peak, at, width)]
    main.axvspan(at - 0.5 * ABOUT, at + 0.5 * ABOUT, color=STEPS[1], lw=0, zorder=0)
    span = f" ({_kept(case, time, dt)})" if width >= NARROW and time[0] > 0.0 else ""
    if deck is not None and persons is not None:
        _deck(deck, persons, (float(time[0]), float(time[-1])), width)
        main.tick_params(labelbottom=False)
        main.set_xlabel("")
    low = deck or main
    low.set_xlabel("time, s" + span)
    fig.align_ylabels()
    settle(labels)
    return main


def chosen(case: CaseResults, realisation: int | None, point: str | None) -> tuple[int, int]:
    """Realisation and point to draw. Raises ResultsError for one that is not there."""
    direction_of(case)
    if not case.histories:
        raise ResultsError(f"case {case.name!r}: the file keeps no history: nothing to draw")
    if realisation is None:
        realisation = max(case.histories, key=lambda k: float(case.peak[k].max()))
    if realisation not in case.histories:
        kept = ", ".join(map(str, sorted(case.histories)))
        raise ResultsError(f"case {case.name!r}: realisation {realisation} is not kept; kept: {kept}")
    if point is None:
        return realisation, int(np.argmax(case.peak[realisation]))
    if point not in case.points.name:
        raise ResultsError(f"no point is called {point!r}; points of case {case.name!r}: {', '.join(case.points.name)}")
    return realisation, case.points.name.index(point)


def _kept(case: CaseResults, time: Floats, dt: float) -> str:
    """What the time axis begins with: the observed time, or what a long record keeps."""
    warm_up = float(case.attributes["warm_up"])
    if time[0] > warm_up + dt:
        return f"of {number(warm_up)} to {number(warm_up + float(case.attributes['duration']))} s, about the peak"
    return f"observed time begins at {number(warm_up)} s"


def _why(case: CaseResults, number_of: int) -> str:
    """Which of the kept realisations it is."""
    if case.realisations == 1:
        return ""
    return ", that with the largest peak of all points" if number_of == int(case.peak.max(axis=1).argmax()) else ""


def _place(case: CaseResults, place: int) -> str:
    e = float(case.points.e[place])
    across = f", e = {e:.4g} m".replace("-", "\u2212") if e else ""
    return f"s = {float(case.points.s[place]):.4g} m{across}"


def _panels(fig: Figure, with_deck: bool) -> tuple[Axes, Axes | None, Axes]:
    grid = fig.add_gridspec(3 if with_deck else 2, 1, height_ratios=(46, 20, 34) if with_deck else (50, 36))
    main = fig.add_subplot(grid[0])
    deck = fig.add_subplot(grid[1], sharex=main) if with_deck else None
    return main, deck, fig.add_subplot(grid[-1])


def _main(
    ax: Axes, case: CaseResults, place: int, time: Floats, a: Floats, dt: float, peak: float, at: float, width: float
) -> Labels:
    labels = Labels(ax)
    columns = columns_of(width)
    ax.plot(*decimated(time, a, columns), color=PALE, lw=0.5, gid="acceleration")
    window = round(RMS_WINDOW / dt)
    if a.size > window:
        rms = running_rms(a, window)
        # at the middle of the window that it belongs to
        middle = time[: rms.size] + 0.5 * window * dt
        ax.plot(*decimated(middle, rms, columns), color=BLACK, lw=0.9, gid="running RMS")
        labels.line(*decimated(middle, rms, 200), "running RMS, 1 s")
    _mark(ax, labels, time, a, peak, at, True)
    top = 1.45 * peak
    ax.set_ylim(-top, top)
    ax.set_xlim(float(time[0]), float(time[-1]))
    ax.set_ylabel(f"acceleration, {UNIT}")
    ax.set_xlabel("time, s")
    _bounds(ax, labels, case, case.points.direction[place], top, width)
    plain(ax, width)
    return labels


def _mark(ax: Axes, labels: Labels, time: Floats, a: Floats, peak: float, at: float, timed: bool) -> None:
    """The peak with value and time; it is between two samples, its sign that of the nearest."""
    sign = 1.0 if a[min(int(np.searchsorted(time, at)), a.size - 1)] >= 0.0 else -1.0
    ax.plot([at], [sign * peak], "o", ms=3.2, mfc="white", mec=BLACK, mew=0.8, gid="peak", zorder=4)
    labels.point(at, sign * peak, f"peak {number(peak)} {UNIT}" + (f" at\u00a0{at:,.2f} s" if timed else ""))


def _bounds(ax: Axes, labels: Labels, case: CaseResults, direction: str, top: float, width: float) -> None:
    """Class bounds and the limit on both sides, named on the upper."""
    wants = wanted(case, direction)
    named: dict[float, str] = {}
    if wants.criterion.classes:
        for name, bound in zip(wants.criterion.classes, wants.criterion.bounds.get(direction, ()), strict=False):
            named[bound] = f"{name} {'below ' if width >= NARROW else ''}{level(bound)}"
    if wants.limit is not None:
        named[wants.limit] = limit_text(wants) if width >= NARROW else f"{wants.target or 'limit'} {level(wants.limit)}"
    for bound, words in named.items():
        strong = bound == wants.limit
        if bound >= top:
            if strong:
                labels.right(top, f"{words} \u25b4")
            continue
        for side in (bound, -bound):
            ax.axhline(side, color=BLACK if strong else GREY, lw=0.9 if strong else 0.5, dashes=(5, 2), zorder=1)
        labels.right(bound, words, BLACK if strong else GREY)


def _deck(ax: Axes, persons: tuple[Floats, NDArray[np.int64]], span: tuple[float, float], width: float) -> None:
    times, count = persons
    begin = max(int(np.searchsorted(times, span[0], side="right")) - 1, 0)
    end = int(np.searchsorted(times, span[1], side="right"))
    t = np.concatenate([[span[0]], times[begin + 1 : end], [span[1]]])
    n = count[begin:end].astype(np.float64)
    n = np.append(n, n[-1])
    ax.plot(*decimated(t, n, columns_of(width)), drawstyle="steps-post", color=BLACK, lw=0.8, gid="persons")
    ax.set_ylim(0.0, max(1.12 * float(n.max()), 1.2))
    ax.set_ylabel("persons\non the deck")
    plain(ax, width)
    ax.yaxis.set_major_locator(MaxNLocator(4, integer=True))


def _close(ax: Axes, time: Floats, a: Floats, peak: float, at: float, width: float) -> Labels:
    inside = np.abs(time - at) <= 0.5 * ABOUT
    x, y = decimated(time[inside], a[inside], columns_of(width))
    ax.plot(x, y, color=BLACK, lw=0.7, gid="close")
    labels = Labels(ax)
    _mark(ax, labels, time, a, peak, at, False)
    ax.set_ylim(-1.5 * peak, 1.5 * peak)
    ax.set_xlim(at - 0.5 * ABOUT, at + 0.5 * ABOUT)
    ax.set_facecolor("#f8fbfd")
    ax.set_ylabel(f"acceleration, {UNIT}")
    ax.set_xlabel(f"time, s: {ABOUT:.0f} s about the peak")
    plain(ax, width)
    return labels
