"""The people as drawn: their paces against the modes' frequencies, and how many are on the deck."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import MaxNLocator
from numpy.typing import NDArray

from crowdsim.errors import ResultsError
from crowdsim.plots.labels import Labels, settle
from crowdsim.plots.strip import strip
from crowdsim.plots.style import (
    BLACK,
    BLUE,
    DASHES,
    GREY,
    NARROW,
    STEPS,
    WIDTH,
    figure,
    plain,
    styled,
    wrapped,
)
from crowdsim.results.texts import number
from crowdsim.study.again import counted
from crowdsim.study.jobs import draw
from crowdsim.study.prepare import Case

Floats = NDArray[np.float64]
REALISATIONS = 50
PERSONS = 5000
NARROWEST = 0.02  # Hz, of a bar


@dataclass(frozen=True)
class Crowd:
    """Of the first `realisations`: paces [Hz] by stream, and the share of the observed time by number on the deck."""

    realisations: int
    paces: dict[str, Floats]
    share: Floats

    @property
    def persons(self) -> int:
        """Whose pace is known."""
        return sum(p.size for p in self.paces.values())

    @property
    def mean(self) -> float:
        """Persons on the deck, over the observed time."""
        return float(np.sum(self.share * np.arange(self.share.size)))


def crowd_of(case: Case, realisations: int) -> Crowd:
    """Draws up to 50 realisations or 5,000 persons who step on in the observed time, or are there throughout."""
    paces: dict[str, list[Floats]] = {s.walkers.name: [] for s in case.streams}
    share = np.zeros(1)
    drawn = total = 0
    while drawn < min(realisations, REALISATIONS) and (drawn == 0 or total < PERSONS):
        walks = draw(case, drawn)
        for stream, (people, _) in zip(case.streams, walks, strict=True):
            here = (people.enter >= case.warm_up) | people.returns
            paces[stream.walkers.name].append(people.pace[here])
            total += int(np.count_nonzero(here))
        times, number_of = counted([passages for _, passages in walks], case.end)
        begin = np.clip(times, case.warm_up, case.end)
        spent = np.bincount(number_of, weights=np.diff(np.append(begin, case.end)))
        size = max(share.size, spent.size)
        share = np.pad(share, (0, size - share.size)) + np.pad(spent, (0, size - spent.size))
        drawn += 1
    if not drawn:
        raise ResultsError(f"case {case.name!r}: no realisation is in the file: nothing to draw")
    return Crowd(drawn, {k: np.concatenate(v) for k, v in paces.items()}, share / share.sum())


@styled()
def people(case: Case, realisations: int, *, width: float = WIDTH, foot: str = "", ax: Axes | None = None) -> Axes:
    """Density of the pace of those who step on, the modes' frequencies and half-power bands, numbers on the deck.

    Parameters
    ----------
    case : as prepared, or as `crowdsim.study.again.case_again` gives
    realisations : that were run; up to 50 of them are drawn again
    width : of the figure [mm]; ax : takes the paces alone; None makes a figure

    Raises ResultsError where nobody steps on.
    """
    crowd = crowd_of(case, realisations)
    if not crowd.persons:
        raise ResultsError(f"case {case.name!r}: nobody steps on in the observed time: nothing to draw")
    if ax is not None:
        settle([_paces(ax, case, crowd, width)])
        return ax
    over = f"{crowd.realisations} realisation{'s' if crowd.realisations > 1 else ''}"
    title = f"Pace of {crowd.persons:,} persons in {over}, shaded: half-power bands of the modes; persons on the deck"
    beside = width >= NARROW
    fig = figure(width, 84.0 if beside else 136.0, title, foot)
    across = fig.add_gridspec(1, 2, width_ratios=(62, 38)) if beside else None
    grid = across or fig.add_gridspec(2, 1, height_ratios=(60, 40))
    main, deck = fig.add_subplot(grid[0]), fig.add_subplot(grid[1])
    labels = [_deck(deck, case, crowd, width), _paces(main, case, crowd, width)]
    settle(labels)
    return main


def _paces(ax: Axes, case: Case, crowd: Crowd, width: float) -> Labels:
    labels = Labels(ax)
    pooled = np.concatenate(list(crowd.paces.values()))
    low, high = float(pooled.min()), float(pooled.max())
    wide = float(np.subtract(*np.percentile(pooled, [75, 25])))
    bar = max(NARROWEST, min(2.0 * wide / max(pooled.size, 1) ** (1 / 3), 0.1))
    edges = bar * np.arange(np.floor(low / bar) - 1, np.ceil(high / bar) + 3)
    if high - low < NARROWEST:
        edges = low + NARROWEST * (np.arange(6) - 2.5)
    top = 0.0
    for i, (name, paces) in enumerate(crowd.paces.items()):
        if not paces.size:
            continue
        density, _ = np.histogram(paces, edges, density=True)
        top = max(top, float(density.max()))
        dash = DASHES[i % len(DASHES)]
        ax.stairs(density, edges, color=BLACK, ls=dash, lw=1.1, gid=name, fill=False)
        x, y = np.repeat(edges, 2)[1:-1], np.repeat(density, 2)
        labels.line(x[y > 0.25 * density.max()], y[y > 0.25 * density.max()], f"{name} ({paces.size:,})")
    margin = max(0.12 * (edges[-1] - edges[0]), 0.05)
    ax.set_xlim(edges[0] - margin, edges[-1] + margin)
    ax.set_ylim(0.0, 1.2 * top)
    ax.set_xlabel("pace, Hz")
    ax.set_ylabel("probability density, 1/Hz")
    plain(ax, width)
    strip(ax, _reach(ax, case))
    return labels


def _reach(ax: Axes, case: Case) -> list[tuple[str, float]]:
    """Draws the paces at which a harmonic meets a mode, and their bands; gives their names and places."""
    low, high = ax.get_xlim()
    marks = []
    for harmonic in (1, 2):
        for mode in case.model.modes:
            pace = mode.frequency / harmonic
            if not low < pace < high:
                continue
            half = mode.damping * pace  # half-power band of the mode: 2 zeta f wide in frequency
            ax.axvspan(pace - half, pace + half, color=STEPS[3], lw=0, zorder=0, gid="band")
            ax.axvline(pace, color=BLUE, lw=0.7, ls=DASHES[0] if harmonic == 1 else DASHES[1], gid="mode")
            marks.append((mode.name + ("" if harmonic == 1 else ", 2nd harmonic"), pace))
    return marks


def _deck(ax: Axes, case: Case, crowd: Crowd, width: float) -> Labels:
    """Share of the observed time by number on the deck."""
    labels = Labels(ax)
    seen = np.flatnonzero(crowd.share)
    first, last = int(seen[0]), int(seen[-1])
    bars = 30 if width >= NARROW else 24
    step = max(1, -(-(last - first + 1) // bars))
    edges = np.arange(first, last + step + 1, step)
    share = np.array([crowd.share[a : a + step].sum() for a in edges[:-1]])
    ax.stairs(100.0 * share, edges - 0.5, fill=True, color=STEPS[3], ec=GREY, lw=0.6, gid="share")
    mean, height = crowd.mean, 130.0 * float(share.max())
    ax.axvline(mean, color=BLACK, lw=0.8, ls=DASHES[1], gid="mean")
    area = case.model.length * case.model.width
    labels.line(
        np.full(30, mean), np.linspace(0.05, 0.98, 30) * height,
        f"mean of these {number(mean)}\n({number(mean / area, 2)} persons/m\u00b2)",
    )  # fmt: skip
    room = max(0.06 * (last - first), 1.5)
    ax.set_xlim(max(first - room, -0.7), edges[-1] - 1.0 + room)
    ax.set_ylim(0.0, height)
    ax.set_xlabel("persons on the deck" + ("" if step == 1 else f", in steps of {step}"))
    ax.set_ylabel(wrapped("share of the observed time, %", 60.0))
    plain(ax, width)
    ax.xaxis.set_major_locator(MaxNLocator(6 if width >= NARROW else 5, integer=True))
    return labels
