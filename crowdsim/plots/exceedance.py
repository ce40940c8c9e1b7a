"""How probable it is that the peak anywhere on the deck exceeds a level."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Literal

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import FuncFormatter, NullFormatter
from numpy.typing import NDArray

from crowdsim.errors import ResultsError
from crowdsim.plots.labels import Labels, settle
from crowdsim.plots.strip import strip
from crowdsim.plots.style import (
    BAND,
    BLACK,
    BLUE,
    DASHES,
    GREY,
    NARROW,
    UNIT,
    WIDTH,
    direction_of,
    figure,
    limit_text,
    plain,
    spans,
    styled,
    wanted,
    wrapped,
)
from crowdsim.response.extremes import ExtremeFit, fit, goodness
from crowdsim.response.windows import window_exceedance, window_percentile
from crowdsim.results.reader import CaseResults
from crowdsim.results.texts import number, percent, span

Floats = NDArray[np.float64]
Family = Literal["gumbel", "gev"]
FAMILIES: dict[str, Family] = {"gumbel": "gumbel", "gev": "gev"}
NAMES = {"gumbel": "Gumbel law", "gev": "GEV law"}
SHARE = 0.95
POOR = 0.05  # of the goodness of fit
STEPS_DRAWN = 1500
LEVELS = 160  # of the band


def peaks_of(case: CaseResults, direction: str) -> tuple[Floats, float, bool]:
    """Peaks [realisation, window] anywhere on the deck, the time of each [s], whether that is the whole record."""
    duration, window = float(case.attributes["duration"]), float(case.attributes["window"])
    values = case.deck_window_peak[direction]
    if values.shape[1]:
        return values, window, window >= duration - 1e-9
    return case.envelope[direction].max(axis=(1, 2))[:, None], duration, True


@styled()
def exceedance(
    case: CaseResults,
    *,
    direction: str | None = None,
    family: Family | None = None,
    marks: Sequence[tuple[str, float]] = (),
    width: float = WIDTH,
    foot: str = "",
    ax: Axes | None = None,
) -> Axes:
    """Probability that the peak in a comfort window exceeds a, against a [m/s2], with its 95 % interval.

    Parameters
    ----------
    direction : default the first with any response
    family : "gumbel" or "gev", a law of maxima fitted to the peaks and drawn beyond the sample
    marks : (name, m/s2) of hand formulas, named above the axes
    width : of the figure [mm]; ax : to draw in; None makes a figure

    Raises ResultsError where nothing moves, or where the law cannot be fitted.
    """
    direction = direction or direction_of(case)
    peaks, window, whole = peaks_of(case, direction)
    law = _fitted(peaks, family)
    time = span(window) + (" (the whole record)" if whole else "")
    own = ax is None
    if ax is None:
        title = f"Peak {direction} acceleration anywhere on the deck in {time}"
        fig = figure(width, 90.0 if width >= NARROW else 82.0, title, foot)
        ax = fig.subplots()
    top = _limits(ax, case, direction, peaks, law, marks)
    labels = Labels(ax)
    named = [(f"{name}: {number(value)}", value) for name, value in marks]
    asks = wanted(case, direction)
    if asks.limit is not None and asks.limit >= top:
        named.append((f"{limit_text(asks)} {UNIT}", asks.limit))
    _shade(ax, labels, case, direction, peaks, top, [min(v, top) for _, v in named])
    _sample(ax, labels, peaks, top)
    if law is not None and family is not None:
        _law(ax, labels, law, _name(family, law, peaks), top)
    _value(ax, labels, peaks)
    ax.set_xlabel(wrapped(f"peak {direction} acceleration a, {UNIT}" + ("" if own else f" in {time}"), width - 25.0))
    ax.set_ylabel(f"probability of exceeding a in {span(window)}")
    plain(ax, width)
    strip(ax, named, 4.6 if labels.edge["top"] else 0.8)
    settle([labels])
    return ax


def _fitted(peaks: Floats, family: Family | None) -> ExtremeFit | None:
    if family is None:
        return None
    if family not in FAMILIES:
        raise ResultsError(f"no law is called {family!r}; known: {', '.join(FAMILIES)}")
    try:
        return fit(peaks, family)
    except ValueError as error:
        raise ResultsError(f"the {NAMES[family]} cannot be fitted: {error}") from None


def _name(family: Family, law: ExtremeFit, peaks: Floats) -> str:
    try:
        p = goodness(law, peaks).p_value
        return f"{NAMES[family]} ({'poor fit' if p < POOR else 'goodness of fit'}, p = {p:.2g})"
    except ValueError:
        return NAMES[family]


def _limits(
    ax: Axes, case: CaseResults, direction: str, peaks: Floats, law: ExtremeFit | None,
    marks: Sequence[tuple[str, float]],
) -> float:  # fmt: skip
    """Sets the axes' limits and scale; gives the upper end of the acceleration."""
    largest = float(peaks.max())
    least = 0.3 / max(peaks.size, 20)
    top = 1.15 * largest
    if law is not None:
        least /= 10.0
        top = max(top, min(law.quantile(1.0 - 2.0 * least), 1.8 * largest))
    limit = wanted(case, direction).limit
    near = [v for v in (limit, *(value for _, value in marks)) if v is not None and v < 1.6 * largest]
    top = max([top, *(1.08 * v for v in near)])
    ax.set_yscale("log")
    ax.set_ylim(least, 1.15)  # the line at 100 % stays clear of the edge
    ax.set_xlim(0.0, top)
    ax.yaxis.set_major_formatter(FuncFormatter(lambda p, _: f"{100 * p:.4g} %"))
    ax.yaxis.set_minor_formatter(NullFormatter())
    return top


def _sample(ax: Axes, labels: Labels, peaks: Floats, top: float) -> None:
    """The share of windows above a, and Wilson's interval with the effective number of windows."""
    ordered = np.sort(peaks, axis=None)
    share = 1.0 - np.arange(1, ordered.size + 1) / ordered.size
    x = np.concatenate([[0.0], ordered])
    y = np.concatenate([[1.0], share])
    keep = np.append(np.diff(x) > 0.0, True)  # of equal peaks the last: the share above them all
    keep[-1] = False  # nothing is above the largest
    x, y = x[keep], y[keep]
    if x.size > 2 * STEPS_DRAWN:
        # finer than a pixel, and every step of the tail
        ranks = np.concatenate(
            [np.linspace(0, x.size - 1, STEPS_DRAWN).astype(np.intp), np.arange(x.size - STEPS_DRAWN, x.size)]
        )
        x, y = x[np.unique(ranks)], y[np.unique(ranks)]
    levels = np.linspace(0.0, top, LEVELS)
    found = [window_exceedance(peaks, float(a)) for a in levels]
    bottom = ax.get_ylim()[0]
    low = np.maximum([p.low for p in found], 0.1 * bottom)
    ax.fill_between(levels, low, [p.high for p in found], gid="interval", **BAND)
    # ends at the largest peak, above which the share is 0: beyond a logarithmic axis
    ax.plot(np.append(x, ordered[-1]), np.append(y, y[-1]), drawstyle="steps-post", color=BLACK, lw=1.1, gid="share")
    ax.plot([ordered[-1]], [y[-1]], "|", ms=5, color=BLACK, gid="largest")
    labels.line(
        np.append(x, ordered[-1])[1:], np.append(y, y[-1])[1:], f"simulated, {_count(peaks)}, with 95 % interval"
    )


def _count(peaks: Floats) -> str:
    return f"{peaks.size:,} window{'s' if peaks.size != 1 else ''}"


def _value(ax: Axes, labels: Labels, peaks: Floats) -> None:
    """The 5 % line and the 95 % value with its interval."""
    value = window_percentile(peaks, SHARE)
    level = 1.0 - SHARE
    ax.axhline(level, color=GREY, lw=0.6, ls=DASHES[1], gid="level")
    labels.right(level, "5 %", GREY)
    words = f"95 % value {number(value.value)} {UNIT}"
    if value.low is not None and value.high is not None:
        ax.plot(
            [value.low, value.high], [level, level], color=BLACK, lw=2.4, solid_capstyle="butt", gid="value interval"
        )
        words += f"\n({number(value.low)} to {number(value.high)})"
    ax.plot([value.value], [level], "o", ms=4.0, mfc="white", mec=BLACK, mew=0.9, zorder=5, gid="value")
    labels.point(value.value, level, words)


def _law(ax: Axes, labels: Labels, law: ExtremeFit, name: str, top: float) -> None:
    """The fitted law: whole within the sample, dashed where it extrapolates."""
    least = ax.get_ylim()[0]
    end = min(top, 0.999999 * law.upper_end if math.isfinite(law.upper_end) else top)
    x = np.linspace(min(max(law.quantile(0.001), 0.0), end), end, 400)
    y = np.asarray(law.exceedance(x))
    edge = law.quantile(1.0 - 1.0 / law.count)
    seen = (x <= edge) & (y > least)
    beyond = (x >= edge) & (y > 0.5 * least)
    ax.plot(x[seen], y[seen], color=BLUE, lw=1.0, gid="law")
    ax.plot(x[beyond], y[beyond], color=BLUE, lw=1.0, ls=DASHES[1], gid="law extrapolated")
    low, high = law.exceedance_interval(x)
    if np.all(np.isfinite(low)) and np.all(np.isfinite(high)):
        for side in (low, high):
            ax.plot(x, np.maximum(side, 0.1 * least), color=BLUE, lw=0.5, ls=DASHES[2], gid="law interval")
    if seen.any():
        labels.line(x[seen], y[seen], name, BLUE)
    if beyond.sum() > 1:
        labels.line(x[beyond], y[beyond], "extrapolated", BLUE)


def _shade(
    ax: Axes, labels: Labels, case: CaseResults, direction: str, peaks: Floats, top: float, marks: Sequence[float]
) -> None:
    wants = wanted(case, direction)
    for name, low, high, colour in spans(wants.criterion, direction, top):
        ax.axvspan(low, high, color=colour, lw=0, zorder=0)
        labels.top(low, high, name, GREY, marks)
    if wants.limit is None or wants.limit >= top:
        return
    above = window_exceedance(peaks, wants.limit)
    ax.axvline(wants.limit, color=BLACK, lw=0.8, ls=DASHES[3], gid="limit")
    interval = f"({percent(above.low)} to {percent(above.high)})"
    words = f"{limit_text(wants)} {UNIT}\nexceeded in {percent(above.value)}\n{interval}"
    low, high = math.log(ax.get_ylim()[0]), -0.5
    y = np.exp(np.linspace(low, high, 50))
    labels.line(np.full(50, wants.limit), y, words)
