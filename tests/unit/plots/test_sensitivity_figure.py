"""The bar figure of a sensitivity study: bars, intervals and words as in the study, nothing over anything else."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations
from pathlib import Path
from typing import Any

import pytest
from matplotlib.axes import Axes
from matplotlib.colors import to_rgb
from matplotlib.text import Text
from matplotlib.transforms import Bbox

from crowdsim.errors import ResultsError
from crowdsim.plots.sensitivity import draw_sensitivity, sensitivity
from crowdsim.plots.style import MM, home
from crowdsim.results.sensitivity import Base, Sensitivity, Varied, ranked


def varied(subject: str, label: str, change: float | None, note: str = "") -> Varied:
    if change is None:
        return Varied(subject, label, "a source", None, None, None, None, note)
    return Varied(subject, label, "a source", 2.26 * (1 + change), change, change - 0.04, change + 0.06, note)


@pytest.fixture
def study() -> Sensitivity:
    variations, order = ranked(
        [
            varied("damping", "minimum of a stress ribbon, for a label that has no room in the figure at all", 1.38),
            varied("damping", "0.6 %, mean for composite", None, "the same as the base"),
            varied("pace", "matsumoto-1978, 1.99 Hz, sd 0.173", 0.08),
            varied("pace", "caprani-2012, 1.96 Hz, sd 0.209", -0.003),
            varied("load set", "jogging: bachmann-1995", -0.42),
            varied("step length and speed", "mean step length and speed -10 %", None, "cannot be built: " + "x " * 90),
        ]
    )
    return Sensitivity(
        title="Mill Race footbridge, Oxmere: market day", case="market day", direction="vertical", window=240.0,
        realisations=200, seed=5, version="0.1.0", base=Base(2.26, 2.17, 2.34), variations=variations, order=order,
        not_varied=(),
    )  # fmt: skip


def found(ax: Axes, gid: str) -> list[Any]:
    return ax.findobj(lambda artist: artist.get_gid() == gid)


def test_bars_and_intervals_are_those_of_the_study(study: Sensitivity) -> None:
    ax = sensitivity(study)
    valued = [v for v in study.variations if v.change is not None]
    assert [bar.get_width() for bar in found(ax, "bar")] == pytest.approx([100.0 * v.change for v in valued])  # type: ignore[operator]
    spans = [line.get_xdata() for line in found(ax, "interval")]
    assert spans == [pytest.approx([100.0 * v.low, 100.0 * v.high]) for v in valued]  # type: ignore[operator]
    assert [t.get_text() for t in found(ax, "change")] == ["+138 %", "\u221242 %", "+8 %", "\u22120.3 %"]
    assert [t.get_text() for t in found(ax, "value")] == ["5.38", "1.31", "2.44", "2.25"]
    (band,) = found(ax, "band")
    assert (band.get_x(), band.get_x() + band.get_width()) == pytest.approx(
        (100 * (2.17 / 2.26 - 1), 100 * (2.34 / 2.26 - 1))
    )
    assert [t.get_text().strip()[:12] for t in found(ax, "reason")] == ["the same as ", "cannot be bu"]


def test_subjects_stand_in_the_order_of_their_weight(study: Sensitivity) -> None:
    ax = sensitivity(study)
    bold = [t.get_text() for t in ax.get_yticklabels() if t.get_fontweight() == "bold"]
    assert bold == ["damping", "load set", "pace", "step length and speed"] == list(study.order)
    lower, upper = ax.get_ylim()
    assert lower > upper  # the first on top


def shown(ax: Axes) -> list[Text]:
    """Every text that is drawn: ticks beyond the ends of an axis are not."""
    (top,) = ax.child_axes
    texts = [*home(ax).texts, *ax.texts, *ax.findobj(lambda a: a is ax.xaxis.label or a is top.xaxis.label)]
    texts += [ax.title, ax._left_title, *ax.get_yticklabels()]  # type: ignore[attr-defined]
    for axes in (ax, top):
        low, high = axes.get_xlim()
        texts += [t for at, t in zip(axes.get_xticks(), axes.get_xticklabels(), strict=True) if low <= at <= high]
    return [t for t in texts if t.get_text().strip()]


@pytest.mark.parametrize("width", [90.0, 120.0, 170.0])
def test_no_text_over_another_and_none_cut(study: Sensitivity, width: float) -> None:
    ax = sensitivity(study, width=width)
    fig = home(ax)
    fig.draw_without_rendering()
    assert fig.get_figwidth() == pytest.approx(width * MM)
    boxes = [(t.get_text(), t.get_window_extent()) for t in shown(ax)]
    assert len(boxes) > 25
    page = fig.bbox
    for text, box in boxes:
        assert page.x0 - 1 <= box.x0, text
        assert box.x1 <= page.x1 + 1, text
        assert page.y0 - 1 <= box.y0, text
        assert box.y1 <= page.y1 + 1, text
    for (a, first), (b, second) in combinations(boxes, 2):
        shared = Bbox.intersection(first.padded(-2.0), second.padded(-2.0))
        assert shared is None or shared.width <= 0 or shared.height <= 0, (a, b)


def test_up_and_down_differ_in_grey(study: Sensitivity) -> None:
    ax = sensitivity(study)
    grey = {
        bar.get_width() > 0: sum(w * c for w, c in zip((0.299, 0.587, 0.114), to_rgb(bar.get_facecolor()), strict=True))
        for bar in found(ax, "bar")
    }
    assert grey[False] - grey[True] > 0.3


def test_without_intervals(study: Sensitivity) -> None:
    few = replace(
        study, base=Base(2.26, None, None),
        variations=tuple(replace(v, low=None, high=None) for v in study.variations),
    )  # fmt: skip
    ax = sensitivity(few)
    assert not found(ax, "band")
    assert not found(ax, "interval")
    assert len(found(ax, "bar")) == 4


# a study without a variation leaves no room for the labels above and below an empty field: nothing to lay out
@pytest.mark.filterwarnings("ignore:constrained_layout not applied:UserWarning")
def test_nothing_that_could_be_run(study: Sensitivity) -> None:
    left = tuple(v for v in study.variations if v.change is None)
    assert not found(sensitivity(replace(study, variations=left)), "bar")
    sensitivity(replace(study, variations=(), order=())).figure.draw_without_rendering()


@pytest.mark.parametrize("ending", ["png", "svg", "pdf"])
def test_saved_with_the_same_bits(study: Sensitivity, tmp_path: Path, ending: str) -> None:
    first, second = (draw_sensitivity(study, tmp_path / f"{name}.{ending}") for name in "ab")
    assert first.stat().st_size > 5000
    assert first.read_bytes() == second.read_bytes()
    assert len(list(tmp_path.iterdir())) == 2


def test_refused(study: Sensitivity, tmp_path: Path) -> None:
    with pytest.raises(ResultsError, match=r"ends in .png, .svg or .pdf"):
        draw_sensitivity(study, tmp_path / "figure.jpg")
    with pytest.raises(ResultsError, match="there is no folder"):
        draw_sensitivity(study, tmp_path / "none" / "figure.png")
    (tmp_path / "folder.png").mkdir()
    with pytest.raises(ResultsError, match="is a folder"):
        draw_sensitivity(study, tmp_path / "folder.png")
