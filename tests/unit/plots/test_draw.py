"""`draw`: what it refuses and how it says so, whole files only, equal bits, no pyplot, no trace in the settings."""

from __future__ import annotations

import ast
import sys
from collections.abc import Callable
from dataclasses import replace
from io import BytesIO
from pathlib import Path
from typing import Any

import h5py
import matplotlib
import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure

import crowdsim.plots
from crowdsim.errors import EXIT_INPUT, ResultsError
from crowdsim.plots import FIGURES, draw
from crowdsim.plots.envelope import envelope
from crowdsim.plots.exceedance import exceedance
from crowdsim.plots.history import history
from crowdsim.plots.style import home, styled
from crowdsim.results.reader import History, Results

ROOM = Path(crowdsim.plots.__file__).parent
SHARED = {"style", "labels", "strip", "save"}
FILES = {path.stem: path for path in ROOM.glob("*.py")}
OPENINGS = {"png": b"\x89PNG\r\n", "svg": b"<?xml", "pdf": b"%PDF-"}


@pytest.mark.parametrize(
    ("what", "ending"),
    [(what, "png") for what in ("history", "envelope", "exceedance", "modes", "people")]
    + [("exceedance", "svg"), ("exceedance", "pdf"), ("envelope", "PNG")],
)
def test_every_figure_is_saved_in_every_format(files: dict[str, Path], tmp_path: Path, what: str, ending: str) -> None:
    place = tmp_path / f"a figure.{ending}"
    assert draw(files["one-walker"], what, place, width=100.0) == place
    assert place.read_bytes().startswith(OPENINGS[ending.lower()])
    assert [p.name for p in tmp_path.iterdir()] == [place.name]


@pytest.mark.parametrize(
    ("wishes", "reason"),
    [
        ({"what": "piechart"}, "no figure is called 'piechart'; known: history, envelope, exceedance, modes, people"),
        ({"out": "a.jpg"}, "a.jpg: a figure ends in .png, .svg or .pdf"),
        ({"out": "figure"}, "figure: a figure ends in .png, .svg or .pdf"),
        ({"out": "nowhere/a.png"}, "there is no folder .*nowhere; make it first"),
        ({"width": 59.0}, "width 59 mm: 60 to 400 mm are possible"),
        ({"width": 401.0}, "width 401 mm"),
        ({"width": float("nan")}, "width nan mm"),
        ({"case": "night"}, "no case is called 'night'; cases in the file: 'weekday morning', 'quiet noon'"),
        ({"what": "history", "point": "bank"}, "no point is called 'bank'; points of case 'weekday morning': V1, V2"),
        ({"point": "V1"}, "a point is for the figure 'history', not 'envelope'"),
        ({"fit": "gumbel"}, "a fit and marks are for the figure 'exceedance', not 'envelope'"),
        ({"what": "exceedance", "fit": "weibull"}, "no law is called 'weibull'; known: gumbel, gev"),
    ],
)
def test_what_cannot_be_done_is_said(
    files: dict[str, Path], tmp_path: Path, wishes: dict[str, Any], reason: str
) -> None:
    asked: dict[str, Any] = {"what": "envelope", "out": "a.png", **wishes}
    what, out = asked.pop("what"), tmp_path / asked.pop("out")
    with pytest.raises(ResultsError, match=reason) as caught:
        draw(files["weekday-commuters"], what, out, **asked)
    assert caught.value.exit_status == EXIT_INPUT
    assert not list(tmp_path.iterdir())


def test_a_folder_and_a_file_that_is_none_of_ours(tmp_path: Path) -> None:
    (tmp_path / "a.png").mkdir()
    with pytest.raises(ResultsError, match="is a folder"):
        draw(tmp_path / "none.h5", "envelope", tmp_path / "a.png")
    with pytest.raises(ResultsError, match="no such file"):
        draw(tmp_path / "none.h5", "envelope", tmp_path / "b.png")


def test_the_second_case_is_drawn_where_it_is_named(files: dict[str, Path], tmp_path: Path) -> None:
    first = draw(files["weekday-commuters"], "envelope", tmp_path / "1.svg").read_bytes()
    named = draw(files["weekday-commuters"], "envelope", tmp_path / "2.svg", case="weekday morning").read_bytes()
    other = draw(files["weekday-commuters"], "envelope", tmp_path / "3.svg", case="quiet noon").read_bytes()
    assert first == named != other


def test_a_file_without_response_has_nothing_to_draw(read: dict[str, Results]) -> None:
    case = read["one-walker"].cases[0]
    still = replace(
        case, peak=0.0 * case.peak, envelope={"vertical": 0.0 * case.envelope["vertical"]},
        deck_window_peak={"vertical": 0.0 * case.deck_window_peak["vertical"]},
    )  # fmt: skip
    for function in (history, envelope, exceedance):
        with pytest.raises(ResultsError, match="the response is 0 everywhere: nothing to draw"):
            function(still)  # type: ignore[operator]
    none = replace(case, peak=case.peak[:0], envelope={"vertical": case.envelope["vertical"][:0]})
    for function in (history, envelope, exceedance):
        with pytest.raises(ResultsError, match="no realisation is in the file: nothing to draw"):
            function(none)  # type: ignore[operator]
    with pytest.raises(ResultsError, match="keeps no history: nothing to draw"):
        history(replace(case, histories={}))


@pytest.mark.parametrize("error", [OSError(28, "No space left on device"), RuntimeError("a bug")])
def test_nothing_half_written(
    files: dict[str, Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch, error: Exception
) -> None:
    place = tmp_path / "a.png"
    place.write_bytes(b"the figure of before")

    def broken(self: Figure, path: Path, **_: Any) -> None:
        path.write_bytes(b"half")
        raise error

    monkeypatch.setattr(Figure, "savefig", broken)
    with pytest.raises(ResultsError if isinstance(error, OSError) else RuntimeError) as caught:
        draw(files["one-walker"], "envelope", place)
    if isinstance(error, OSError):
        assert "cannot be written" in str(caught.value)
        assert "No space left" in str(caught.value)
    assert place.read_bytes() == b"the figure of before"
    assert list(tmp_path.iterdir()) == [place]


@pytest.mark.parametrize("ending", ["png", "svg", "pdf"])
def test_equal_inputs_give_equal_bits(files: dict[str, Path], tmp_path: Path, ending: str) -> None:
    one, two = (
        draw(files["one-walker"], "envelope", tmp_path / f"{n}.{ending}", width=60.0).read_bytes() for n in (1, 2)
    )
    assert one == two


def test_an_hour_stays_a_small_picture(read: dict[str, Results]) -> None:
    """720,000 samples at 170 mm: below 1 MB as svg and pdf, and the extremes are all there."""
    case = read["weekday-commuters"].cases[0]
    time = np.arange(720_001) * 0.005
    noise = np.random.default_rng(3).normal(size=time.size)
    long = replace(
        case, histories={0: History(time, np.column_stack([noise, noise]))},
        peak=np.full((1, 2), np.abs(noise).max()), peak_time=np.full((1, 2), time[np.argmax(np.abs(noise))]),
        attributes={**case.attributes, "warm_up": 0.0, "duration": 3600.0, "time_step": 0.005},
    )  # fmt: skip
    with styled():
        ax = history(long)
        shown = next(np.asarray(one.get_ydata()) for one in ax.lines if one.get_gid() == "acceleration")
        assert (shown.min(), shown.max()) == (noise.min(), noise.max())
        for ending in ("svg", "pdf"):
            out = BytesIO()
            home(ax).savefig(out, format=ending)
            assert len(out.getvalue()) < 1_000_000


def test_a_title_with_dollars_foreign_letters_and_no_end(files: dict[str, Path], tmp_path: Path) -> None:
    path = tmp_path / "odd.h5"
    path.write_bytes(files["one-walker"].read_bytes())
    with h5py.File(path, "a") as file:
        odd = "one $x^2 and \u6a4b " + "a title without an end " * 60
        file.attrs["scenario"] = str(file.attrs["scenario"]).replace("Weir Lane footbridge", odd)
    text = draw(path, "envelope", tmp_path / "odd.svg", width=60.0).read_text(encoding="utf-8")
    assert "$x^2" in text  # in the svg's own title, as written


def test_the_settings_of_the_user_stay_and_do_not_matter(
    files: dict[str, Path], tmp_path: Path, drawn: Callable[..., Axes]
) -> None:
    first = draw(files["one-walker"], "envelope", tmp_path / "1.svg").read_bytes()
    with matplotlib.rc_context({"font.size": 20.0, "axes.facecolor": "black", "figure.dpi": 50.0}):
        before = dict(matplotlib.rcParams)
        second = draw(files["one-walker"], "envelope", tmp_path / "2.svg").read_bytes()
        assert dict(matplotlib.rcParams) == before
    assert first == second


PROGRAM = """
import sys
import crowdsim.cli
assert "matplotlib" not in sys.modules
from crowdsim.plots import draw
draw({path!r}, "envelope", {out!r})
print("matplotlib.pyplot" in sys.modules, "numba" in sys.modules)
"""


def test_no_pyplot_and_no_kernels_for_what_is_in_the_file(
    python: Callable[..., str], files: dict[str, Path], tmp_path: Path
) -> None:
    out = tmp_path / "a.png"
    # a backend that needs a screen: never asked for
    said = python(PROGRAM.format(path=str(files["one-walker"]), out=str(out)), MPLBACKEND="qtagg", DISPLAY="")
    assert said.split() == ["False", "False"]
    assert out.exists()


def imports(path: Path) -> set[str]:
    found = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            found.add(str(node.module))
    return found


@pytest.mark.parametrize("stem", sorted(set(FILES) - {"__init__", "draw"}))
def test_a_figure_file_imports_no_other_and_no_pyplot(stem: str) -> None:
    seen = imports(FILES[stem])
    inside = {name.removeprefix("crowdsim.plots.") for name in seen if name.startswith("crowdsim.plots")}
    assert inside <= SHARED
    assert not {name for name in seen if "pyplot" in name}
    assert not {name for name in seen if name.startswith(("crowdsim.console", "crowdsim.cli"))}


def test_matplotlib_stands_in_this_room_alone() -> None:
    package = ROOM.parent
    users = {p for p in package.rglob("*.py") if any(name.split(".")[0] == "matplotlib" for name in imports(p))}
    assert users
    assert {p.parent for p in users} == {ROOM}


def test_figures_are_known_by_name() -> None:
    assert list(FIGURES)[:5] == ["history", "envelope", "exceedance", "modes", "people"]
    assert sys.modules["crowdsim.plots.draw"].draw is draw
