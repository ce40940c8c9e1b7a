"""What the 95 % peak hangs on: a bar for every change, the subject with the largest first."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

from matplotlib.axes import Axes
from matplotlib.patheffects import withStroke
from matplotlib.ticker import MaxNLocator

from crowdsim.plots.save import check_place, check_width, save
from crowdsim.plots.style import (
    BAND,
    BLACK,
    BLUE,
    FOOT,
    GREY,
    NARROW,
    SMALL,
    STEPS,
    UNIT,
    WIDTH,
    figure,
    styled,
    text_width,
    tied,
    wrapped,
)
from crowdsim.results.sensitivity import Sensitivity, Varied, change_text, span_of_change
from crowdsim.results.texts import number, span

ROW = 3.7  # mm a line
GAP = 0.45  # lines between subjects
LEAST_REACH = 5.0  # per cent either side of the base that the axis shows at least
NUMBER = 13.0  # mm for a change and the gap before it
NARROWEST = 110.0  # mm, for the labels beside the bars
LABEL_SHARE = 0.34  # of the figure's width, for the labels
BOLD = 1.12  # bold type is wider
_POINT = 25.4 / 72.0  # mm
_HALO = [withStroke(linewidth=1.8, foreground="white")]
_LONGER, _SHORTER = BLUE, STEPS[3]


@styled()
def sensitivity(result: Sensitivity, *, width: float = WIDTH) -> Axes:
    """Change of the 95 % peak for every variation, with its interval, and its value at the right edge.

    width : of the figure [mm]. The band around 0 is the interval of the base, all that more realisations could remove.
    """
    rows, places, heads, height = _places(result)
    foot = (
        f"{result.title} \u00b7 case {result.case} \u00b7 {result.direction}, 95 % value of the peak anywhere on the "
        f"deck in {span(result.window)} \u00b7 seed {result.seed} \u00b7 {result.realisations:,} realisations \u00b7 "
        f"crowdsim {result.version} \u00b7 one change at a time, the same random numbers; whiskers: 95 % interval"
    )
    title = f"{result.case}: what the 95 % peak of {number(result.base.value)} {UNIT} hangs on"
    made = figure(width, ROW * height + 16.0, title, tied(foot))
    ax = made.add_subplot()
    ax.set_ylim(height - 0.5, -0.6)
    beside = _labels(ax, rows, places, heads, width)
    _axis(ax, result, width, beside)
    for row, y in zip(rows, places, strict=True):
        _row(ax, row, y, width)
    return ax


def draw_sensitivity(result: Sensitivity, out: str | Path, *, width: float = WIDTH) -> Path:
    """Saves the figure as `out`, which ends in .png, .svg or .pdf, and gives where.

    Raises ResultsError where that cannot be done; nothing half written stays behind.
    """
    place = Path(out)
    check_place(place)
    check_width(width, NARROWEST)
    with styled():
        save(sensitivity(result, width=width), place, f"{result.title}, {result.case}: sensitivity")
    return place


def _places(result: Sensitivity) -> tuple[list[Varied], list[float], list[tuple[str, float]], float]:
    """Variations and their heights, subjects and theirs, in lines from the top; number of lines."""
    rows, places, heads, y = [], [], [], 0.0
    for subject in result.order:
        heads.append((subject, y))
        y += 1.0
        for varied in result.of(subject):
            rows.append(varied)
            places.append(y)
            y += 1.0
        y += GAP
    return rows, places, heads, max(y - GAP, 1.0)


def _axis(ax: Axes, result: Sensitivity, width: float, beside: float) -> None:
    """The change at the bottom, the acceleration that it means at the top, the band of the base between.

    beside : taken by labels and values [mm]
    """
    band = result.sampling
    reached = [x for v in result.variations for x in (v.change, v.low, v.high) if x is not None]
    reached += band or ()
    low = min(-LEAST_REACH, 100.0 * min(reached, default=0.0))
    high = max(LEAST_REACH, 100.0 * max(reached, default=0.0))
    free = max(width - beside, 3.0 * NUMBER)
    room = NUMBER / (free - 2.0 * NUMBER) * (high - low)  # beyond the bars, for their numbers
    ax.set_xlim(low - room, high + room)
    ax.set_xlabel("change of the 95 % peak, %")
    value = result.base.value

    def above(change: Any) -> Any:
        return value * (1.0 + change / 100.0)

    def below(acceleration: Any) -> Any:
        return 100.0 * (acceleration / value - 1.0)

    top = ax.secondary_xaxis("top", functions=(above, below))
    top.set_xlabel(f"95 % peak, {UNIT}")
    if width < NARROW:
        for axis in (ax.xaxis, top.xaxis):
            axis.set_major_locator(MaxNLocator(4))
    ax.axvline(0.0, color=BLACK, lw=0.6, zorder=3)
    if band is None:
        text = "no intervals: too few realisations"
    else:
        by_chance = _minus(span_of_change(band))
        text = f"grey: {by_chance} by chance in the base; this is all that more realisations could remove"
        ax.axvspan(100.0 * band[0], 100.0 * band[1], **BAND, zorder=0, gid="band")
    ax.set_title(wrapped(text, free, FOOT, 3), size=FOOT, color=GREY, loc="left")


def _labels(ax: Axes, rows: list[Varied], places: list[float], heads: list[tuple[str, float]], width: float) -> float:
    """Subjects and labels to the left, values to the right; the width that they take [mm]."""
    room = LABEL_SHARE * width
    texts = {y: wrapped(subject, room / BOLD, SMALL, 1) for subject, y in heads}
    widest = max((BOLD * text_width(t, SMALL) for t in texts.values()), default=0.0)
    texts |= {y: f"  {_minus(wrapped(row.label, room, SMALL, 1))}" for row, y in zip(rows, places, strict=True)}
    widest = max([widest, *(text_width(t, SMALL) for t in texts.values())])
    order = sorted(texts)
    ax.set_yticks(order, [texts[y] for y in order])
    ax.tick_params(axis="y", length=0, pad=widest / _POINT + 3.0)
    subjects = {y for _, y in heads}
    for y, tick in zip(order, ax.get_yticklabels(), strict=True):
        tick.set_horizontalalignment("left")
        if y in subjects:
            tick.set_fontweight("bold")
    ax.spines["left"].set_visible(False)
    right = ax.get_yaxis_transform()
    values = {y: number(row.value) for row, y in zip(rows, places, strict=True) if row.value is not None}
    for y, text in values.items():
        ax.text(1.012, y, text, transform=right, size=SMALL, va="center", gid="value")
    if heads:
        ax.text(1.012, heads[0][1], UNIT, transform=right, size=SMALL, va="center", color=GREY)
    return widest + max(text_width(t, SMALL) for t in (UNIT, *values.values())) + 8.0


def _minus(text: str) -> str:
    """With the sign that numbers on an axis have."""
    return re.sub(r"(?<![^ ])-(?=\d)", "\u2212", text)


def _row(ax: Axes, row: Varied, y: float, width: float) -> None:
    """The bar, its interval and its number; or why there is none."""
    if row.change is None:
        why = wrapped(row.note, 0.4 * (1.0 - LABEL_SHARE) * width, FOOT, 1)
        ax.text(
            0.0, y, f" {why}", size=FOOT, color=GREY, va="center", ha="left", style="italic", path_effects=_HALO,
            gid="reason",
        )  # fmt: skip
        return
    change = 100.0 * row.change
    bars = ax.barh(y, change, 0.66, color=_LONGER if change > 0.0 else _SHORTER, edgecolor=BLUE, lw=0.5, zorder=2)
    bars[0].set_gid("bar")
    ends = [change]
    if row.low is not None and row.high is not None:
        ends = [100.0 * row.low, 100.0 * row.high]
        ax.plot(ends, [y, y], color="white", lw=1.8, zorder=3.5, solid_capstyle="butt")
        ax.plot(ends, [y, y], color=BLACK, lw=0.9, marker="|", ms=3.2, mew=0.9, zorder=4, gid="interval")
    right = change > 0.0
    end = max(*ends, 0.0) if right else min(*ends, 0.0)
    ax.annotate(
        _minus(change_text(row.change)), (end, y), xytext=(3.0 if right else -3.0, 0.0),
        textcoords="offset points", size=SMALL, va="center", ha="left" if right else "right", path_effects=_HALO,
        zorder=5, gid="change",
    )  # fmt: skip
