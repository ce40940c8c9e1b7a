"""What the figures share: print size, type, one hue in steps, greys and dashes, foot line, long records.

Text keeps its size whatever the width of the figure. Figures are made without pyplot: no window,
no state shared with a program that draws figures of its own.
"""

from __future__ import annotations

import re
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties
from matplotlib.textpath import text_to_path
from matplotlib.transforms import ScaledTranslation
from numpy.typing import NDArray

from crowdsim.bridge.modal import DIRECTIONS
from crowdsim.errors import ResultsError
from crowdsim.guides.criterion import Criterion
from crowdsim.results.judgement import Asked, asked
from crowdsim.results.reader import CaseResults

Floats = NDArray[np.float64]
WIDTH = 170.0  # mm, the text width of an A4 page
NARROW = 120.0  # mm, below which legends go below and ticks are fewer
MM = 1.0 / 25.4  # inch
DPI = 300
TEXT, SMALL, FOOT = 8.0, 7.5, 6.5  # pt
UNIT = "m/s\u00b2"

BLACK, GREY, PALE = "#000000", "#6e6e6e", "#ababab"
BLUE = "#1f4e79"
STEPS = ("#f3f8fc", "#dfebf6", "#c6dbee", "#a8c8e3")  # one hue, darker with every class
BAND: dict[str, Any] = {"color": "#6a6a6a", "alpha": 0.33, "lw": 0.0}  # darker than any class, in print too
DASHES: tuple[Any, ...] = ("-", (0, (5, 2)), (0, (1, 1.5)), (0, (6, 2, 1, 2)), (0, (3, 1.5, 1, 1.5, 1, 1.5)))

_OURS = "crowdsim"
_RC: dict[Any, Any] = {
    "font.family": "sans-serif", "font.sans-serif": ["DejaVu Sans"], "font.size": TEXT,
    "axes.titlesize": TEXT, "axes.labelsize": TEXT, "xtick.labelsize": SMALL, "ytick.labelsize": SMALL,
    "legend.fontsize": SMALL, "figure.titlesize": 9.0, "figure.dpi": DPI,
    "axes.linewidth": 0.6, "xtick.major.width": 0.6, "ytick.major.width": 0.6, "xtick.minor.width": 0.4,
    "ytick.minor.width": 0.4, "xtick.major.size": 2.5, "ytick.major.size": 2.5, "xtick.minor.size": 1.5,
    "ytick.minor.size": 1.5, "lines.linewidth": 1.1, "axes.spines.top": False, "axes.spines.right": False,
    "axes.unicode_minus": True, "legend.frameon": False, "text.parse_math": False, "text.hinting": "none",
    "pdf.fonttype": 42, "svg.hashsalt": "crowdsim", "hatch.linewidth": 0.4, "path.simplify": True,
}  # fmt: skip


_UNITS = re.compile(r"(?<=\d) (?=%|m/s|s\b|min\b|h\b|m\b|Hz\b|kg\b|t\b|persons/)|(?<==) | (?==)")


@contextmanager
def styled() -> Iterator[None]:
    """The style of the figures, whatever the settings of the user; put back afterwards.

    Serves as a decorator too.
    """
    with matplotlib.rc_context(), warnings.catch_warnings():
        # of a script that the typeface lacks the letters become boxes, and that is seen
        warnings.filterwarnings("ignore", message=r"Glyph .* missing")
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_RC)
        yield


def text_width(text: str, size: float = TEXT) -> float:
    """Width of a text of `size` points [mm]."""
    width, _, _ = text_to_path.get_text_width_height_descent(
        text, FontProperties(family="DejaVu Sans", size=size), False
    )
    return float(width) * 25.4 / 72.0


def tied(text: str) -> str:
    """`text` with numbers held to their units.

    >>> tied("peak 0.95 m/s\u00b2 at 3 s").split(" ")
    ['peak', '0.95\\xa0m/s\u00b2', 'at', '3\\xa0s']
    """
    return _UNITS.sub("\u00a0", text)


def wrapped(text: str, width: float, size: float = TEXT, lines: int = 3) -> str:
    """`text` broken at its spaces (no-break ones hold) at `width` [mm], cut with an ellipsis after `lines` lines."""
    out: list[str] = []
    for word in text.replace("\n", " ").split(" "):
        if out and text_width(f"{out[-1]} {word}", size) <= width:
            out[-1] += f" {word}"
            continue
        while text_width(word, size) > width and len(word) > 1:
            fits = next((n for n in range(len(word) - 1, 0, -1) if text_width(word[:n], size) <= width), 1)
            out.append(word[:fits])
            word = word[fits:]
        out.append(word)
    if len(out) > lines:
        last = out[lines - 1]
        while last and text_width(last + "\u2026", size) > width:
            last = last[:-1]
        out = [*out[: lines - 1], last.rstrip() + "\u2026"]
    return "\n".join(out)


def figure(width: float, height: float, title: str, foot: str) -> Figure:
    """An empty figure [mm] with its title above and the foot line small at the bottom.

    Panels are laid out between the two. `height` is without them.
    """
    inner = width - 4.0
    head = wrapped(tied(title), inner, 9.0, 3)
    low = wrapped(foot, inner, FOOT, 3)
    top = 4.4 * (head.count("\n") + 1) + 1.5 if head else 1.0
    bottom = 3.1 * (low.count("\n") + 1) + 2.0 if low else 1.0
    whole = height + top + bottom
    made = Figure(figsize=(width * MM, whole * MM), layout="constrained", dpi=DPI)
    made.set_gid(_OURS)
    engine: Any = made.get_layout_engine()
    engine.set(
        rect=(2.0 / width, bottom / whole, 1.0 - 4.0 / width, height / whole),
        w_pad=0.6 * MM, h_pad=0.8 * MM, wspace=0.02, hspace=0.02,
    )  # fmt: skip
    # held to the corners in millimetres, so that the figure may still grow
    if head:
        corner = made.transFigure + ScaledTranslation(2.0 * MM, -1.2 * MM, made.dpi_scale_trans)
        made.text(0.0, 1.0, head, size=9.0, va="top", ha="left", linespacing=1.15, gid="title", transform=corner)
    if low:
        corner = made.transFigure + ScaledTranslation(2.0 * MM, 1.2 * MM, made.dpi_scale_trans)
        made.text(0.0, 0.0, low, size=FOOT, color=GREY, va="bottom", ha="left", gid="foot", transform=corner)
    return made


def ours(fig: Figure) -> bool:
    """Whether `figure` made it."""
    return fig.get_gid() == _OURS


def grow(fig: Figure, panels: float = 0.0, below: float = 0.0) -> tuple[float, float, float, float]:
    """Makes a figure of ours higher: room for the panels, and under them [mm]. Gives the box of the latter."""
    engine: Any = fig.get_layout_engine()
    x, y, w, h = engine.get()["rect"]
    before = fig.get_figheight() / MM
    whole = before + panels + below
    fig.set_figheight(whole * MM)
    engine.set(rect=(x, (y * before + below) / whole, w, (h * before + panels) / whole))
    return x, y * before / whole, w, below / whole


def home(ax: Axes) -> Figure:
    """The figure that holds `ax`."""
    found = ax.get_figure(root=True)
    assert isinstance(found, Figure)
    return found


def plain(ax: Axes, width: float) -> None:
    """Few ticks where the figure is narrow."""
    if width < NARROW and ax.get_xscale() == "linear":
        ax.locator_params(axis="x", nbins=5 if width > 75.0 else 3)
    if ax.get_yscale() == "linear":
        ax.locator_params(axis="y", nbins=5)


def decimated(x: Floats, y: Floats, columns: int) -> tuple[Floats, Floats]:
    """The least and the largest of every run of samples, in their order: looks the same at `columns` a width."""
    run = x.size // columns
    if run < 3:
        return x, y
    whole = x.size // run * run
    rows = y[:whole].reshape(-1, run)
    low, high = rows.argmin(axis=1), rows.argmax(axis=1)
    base = np.arange(rows.shape[0]) * run
    kept = np.stack([base + np.minimum(low, high), base + np.maximum(low, high)], axis=1).ravel()
    rest = y[whole:]
    tail = [whole + int(rest.argmin()), whole + int(rest.argmax())] if rest.size else []
    at = np.unique(np.concatenate([[0], kept, tail, [x.size - 1]]).astype(np.intp))
    return x[at], y[at]


def columns_of(width: float) -> int:
    """Columns of pixels in a figure of `width` [mm]."""
    return int(width * MM * DPI)


def direction_of(case: CaseResults) -> str:
    """The first direction with any response. Raises ResultsError where nothing moves."""
    if not case.realisations:
        raise ResultsError(f"case {case.name!r}: no realisation is in the file: nothing to draw")
    for direction in DIRECTIONS:
        values = case.envelope.get(direction)
        if values is not None and values.size and float(values.max()) > 0.0:
            return direction
    raise ResultsError(f"case {case.name!r}: the response is 0 everywhere: nothing to draw")


def wanted(case: CaseResults, direction: str) -> Asked:
    """What the case asks of a direction."""
    return asked(case.attributes, direction)


def level(value: float) -> str:
    """A bound or limit [m/s2] as a source writes it: two decimals, more where it has more.

    >>> level(0.5), level(0.125)
    ('0.50', '0.125')
    """
    return f"{value:.2f}" if abs(round(value, 2) - value) < 1e-12 else f"{value:g}"


def limit_text(wants: Asked) -> str:
    """Label of the limit."""
    if wants.limit is None:
        return ""
    return f"{f'target {wants.target}' if wants.target else 'limit'} {level(wants.limit)}"


def spans(criterion: Criterion, direction: str, top: float) -> list[tuple[str, float, float, str]]:
    """Name, lower and upper bound and colour of the classes that begin below `top`; none without classes."""
    bounds = criterion.bounds.get(direction, ())
    if not criterion.classes or not bounds:
        return []
    edges = (0.0, *bounds, np.inf)
    steps = [STEPS[min(i, len(STEPS) - 1)] for i in range(len(criterion.classes))]
    return [
        (name, low, min(high, top), colour)
        for name, low, high, colour in zip(criterion.classes, edges[:-1], edges[1:], steps, strict=True)
        if low < top
    ]
