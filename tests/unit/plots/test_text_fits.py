"""No text leaves the figure, no two texts overlap: measured by the renderer, wide and narrow."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Iterator
from typing import Any

import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text
from matplotlib.transforms import Bbox

from crowdsim.plots.style import DPI, home

WHAT = ("history", "envelope", "exceedance", "modes", "people")
NAMES = ("market-day", "weekday-commuters", "one-walker", "joggers-among-walkers", "lantern-evening")
MARKS = (("equivalent number of people", 0.9), ("resonance formula", 1.3), ("narrow band", 1.1), ("far off", 30.0))
HAIR = 0.15 * DPI / 25.4  # px: a text's box holds its descenders; boxes may touch by 0.15 mm


def shown(fig: Figure) -> Iterator[Text]:
    """Every text that is drawn."""
    yield from fig.texts
    for legend in fig.legends:
        yield from legend.get_texts()
    axes = list(fig.axes)
    while axes:
        ax = axes.pop()
        axes += ax.child_axes
        if not ax.get_visible():
            continue
        yield from ax.texts
        if not ax.axison:
            continue
        yield from (ax.title, ax._left_title, ax._right_title)  # type: ignore[attr-defined]
        for axis in (ax.xaxis, ax.yaxis):
            yield axis.label
            low, high = sorted(axis.get_view_interval())
            for tick in axis.get_major_ticks():
                if low - 1e-9 <= tick.get_loc() <= high + 1e-9 and tick.label1.get_visible():
                    yield tick.label1


def boxes(fig: Figure) -> list[tuple[str, Bbox]]:
    """Where every text is; the figures were laid out when they were drawn, and their layout is fixed."""
    return [(t.get_text(), t.get_window_extent()) for t in shown(fig) if t.get_text().strip() and t.get_visible()]


def overlapping(found: list[tuple[str, Bbox]]) -> list[tuple[str, str]]:
    return [
        (a, b)
        for (a, p), (b, q) in itertools.combinations(found, 2)
        if min(p.x1, q.x1) - max(p.x0, q.x0) > HAIR and min(p.y1, q.y1) - max(p.y0, q.y0) > HAIR
    ]


def outside(fig: Figure, found: list[tuple[str, Bbox]]) -> list[str]:
    edge = fig.bbox
    return [t for t, b in found if b.x0 < -1 or b.y0 < -1 or b.x1 > edge.x1 + 1 or b.y1 > edge.y1 + 1]


def test_the_measure_sees_an_overlap_and_a_text_outside() -> None:
    fig = Figure(figsize=(2.0, 2.0), dpi=DPI)
    fig.text(0.5, 0.5, "one")
    fig.text(0.52, 0.5, "two")
    fig.text(0.95, 0.1, "three")
    found = boxes(fig)
    assert overlapping(found) == [("one", "two")]
    assert outside(fig, found) == ["three"]


@pytest.mark.parametrize("width", [170.0, 80.0])
@pytest.mark.parametrize("what", WHAT)
@pytest.mark.parametrize("name", NAMES)
def test_texts_stay_apart_and_inside(drawn: Callable[..., Axes], name: str, what: str, width: float) -> None:
    extra: dict[str, Any] = {}
    if what == "exceedance" and name in ("one-walker", "market-day"):
        extra["marks"] = MARKS
    if what == "exceedance" and name == "weekday-commuters":
        extra["fit"] = "gumbel"
    fig = home(drawn(name, what, width, **extra))
    found = boxes(fig)
    assert not overlapping(found)
    assert not outside(fig, found)
    assert fig.get_figwidth() * 25.4 == pytest.approx(width)
    words = " ".join(t for t, _ in found).replace("\n", " ")
    for part in ("Oxmere", "seed", "realisations", "crowdsim 0"):
        assert part in words


@pytest.mark.parametrize("width", [170.0, 80.0])
def test_text_keeps_its_size_whatever_the_width(drawn: Callable[..., Axes], width: float) -> None:
    sizes = {t.get_fontsize() for t in shown(home(drawn("one-walker", "envelope", width))) if t.get_text().strip()}
    assert sizes == {6.5, 7.5, 8.0, 9.0}  # foot; ticks and labels; axes; title


@pytest.mark.parametrize(
    ("what", "wanted"),
    [
        (
            "history",
            ("acceleration, m/s²", "time, s: 10 s about the peak", "persons\non the deck", "running RMS, 1\u00a0s"),
        ),
        ("envelope", ("peak acceleration, m/s²", "s along the deck, m", "median", "95\u00a0% value", "largest", "CL1")),
        ("exceedance", ("peak vertical acceleration a, m/s²", "probability of exceeding a in 4 min", "5 %", "CL2")),
        ("modes", ("ordinate", "s along the deck, m", "V1: 1.91 Hz\ndamping 0.5 %, mass 38.8 t")),
        ("people", ("pace, Hz", "probability density, 1/Hz", "persons on the deck", "V1", "V2, 2nd harmonic")),
    ],
)
def test_quantities_units_and_names_are_there(drawn: Callable[..., Axes], what: str, wanted: tuple[str, ...]) -> None:
    words = {t for t, _ in boxes(home(drawn("weekday-commuters", what)))}
    assert words >= set(wanted)
