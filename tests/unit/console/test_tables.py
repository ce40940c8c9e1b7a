"""Tables give up what may be spared, in order, and keep the rest whole; lines, lists, JSON and notes."""

from __future__ import annotations

import io
import json
import math

import pytest

from crowdsim.console.base import FOLDED, Console, interval_text, or_dash

from .conftest import Recorder

# widths of the columns: 8, 9, 7, 17, 7; with two between them 56
COLUMNS = [("at", "k"), ("direction", "k"), ("mean", "r"), ("its 95 % interval", "r"), ("verdict", "k")]
ROWS = [
    ["midspan", "vertical", "0.1234", "0.123 to 1.23", "met"],
    ["abutment", "vertical", "1,234.5", "1,234 to 5,678", "not met"],
]
SPARE = ("mean", "direction")


def printed(width: int, columns=COLUMNS, rows=ROWS, spare=SPARE) -> list[str]:  # type: ignore[no-untyped-def]
    console = Recorder(width)
    console.table("A title", columns, rows, spare)
    return [line.rstrip() for line in console.text().split("\n")]


@pytest.mark.parametrize(
    ("width", "kept"),
    [
        (120, "at direction mean its 95 % interval verdict"),
        (56, "at direction mean its 95 % interval verdict"),  # just
        (55, "at direction its 95 % interval verdict"),  # the first to be spared goes first
        (47, "at direction its 95 % interval verdict"),
        (46, "at its 95 % interval verdict"),
        (36, "at its 95 % interval verdict"),
    ],
)
def test_spare_columns_go_in_their_order(width: int, kept: str) -> None:
    title, heading, *rows = printed(width)
    assert title == "A title"
    assert " ".join(heading.split()) == kept
    names = [name for name, _ in COLUMNS if name in heading]
    for row, line in zip(ROWS, rows, strict=False):
        cells = [cell for (name, _), cell in zip(COLUMNS, row, strict=True) if name in names]
        assert " ".join(line.split()) == " ".join(cells)
    assert max(map(len, [title, heading, *rows])) <= width


def test_a_spare_column_may_fit_after_a_later_one_would_have_gone() -> None:
    """Only what must go goes: the first is wide enough."""
    assert " ".join(printed(50, spare=("its 95 % interval", "mean"))[1].split()) == "at direction mean verdict"


def test_without_spare_columns_all_stay() -> None:
    assert " ".join(printed(56, spare=())[1].split()) == "at direction mean its 95 % interval verdict"


def test_sides() -> None:
    """Numbers end below each other, words begin so."""
    _, heading, first, second, *_ = printed(120)
    assert first.index("vertical") == second.index("vertical") == heading.index("direction")
    assert first.index("0.1234") + 6 == second.index("1,234.5") + 7 == heading.index("mean") + 4


def test_a_folding_column_keeps_sixteen_letters_and_every_word() -> None:
    columns = [("case", "l"), ("peak, m/s2", "r"), ("verdict", "k")]
    rows = [["the morning after the night before", "1,234.5", "not met"]]
    least = FOLDED + 10 + 7 + 4
    for width in range(least, least + 40):
        lines = printed(width, columns, rows, ())
        assert max(map(len, lines)) <= width
        assert "1,234.5  not met" in lines[2]
        words = " ".join(line[: line.find("  ")] if "  " in line else line for line in lines[2:]).split()
        assert words == rows[0][0].split()


def test_a_word_longer_than_its_column_is_folded_not_cut() -> None:
    columns, rows = [("at", "l"), ("value", "r")], [["x" * 50, "1.00"]]
    lines = printed(30, columns, rows, ())
    assert "".join(lines[2:]).count("x") == 50
    assert max(map(len, lines)) <= 30


def test_a_short_folding_column_takes_no_more_than_it_needs() -> None:
    assert len(printed(25, [("at", "l"), ("value", "r")], [["V1", "1.00"]], ())[1]) == len("at  value")


def test_no_rows() -> None:
    assert printed(80, rows=[])[1].split()[:2] == ["at", "direction"]


def test_brackets_are_text() -> None:
    """A name may look like a style."""
    lines = printed(80, [("at", "k"), ("value", "r")], [["[bold]V1[/bold]", "1.00"]], ())
    assert "[bold]V1[/bold]" in lines[2]


# ---------------------------------------------------------------- lines, lists, notes, JSON


@pytest.mark.parametrize("width", [30, 60, 120])
def test_lines_and_lists_are_folded_between_words(width: int) -> None:
    text = "it exceeds 0.700 m/s2 with a probability of 76 % (69 % to 82 %) in 5 min, [italic] and so on"
    console = Recorder(width)
    console.line(text, "  ")
    assert all(line.startswith("  ") for line in console.text().splitlines())
    console.items("Found", [text, text])
    console.items("Nothing", [])
    lines = console.text().splitlines()
    assert max(map(len, lines)) <= width
    assert " ".join(console.text().split()) == f"{text} Found - {text} - {text}"


def test_json_holds_no_nan() -> None:
    console = Recorder(40, json=True)
    with pytest.raises(ValueError, match="not JSON compliant"):
        console.data({"value": math.nan})
    assert console.text() == ""
    console.data({"name": "\u00e4 [bold]" + "x" * 100, "value": 0.1})
    assert json.loads(console.text()) == {"name": "\u00e4 [bold]" + "x" * 100, "value": 0.1}


def test_notes_go_to_standard_error(capsys: pytest.CaptureFixture[str]) -> None:
    Console().note("kept in run.h5")
    Console(quiet=True).note("drawn")
    assert capsys.readouterr() == ("", "kept in run.h5\n")


def test_where_there_is_no_terminal_lines_have_120_letters(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "50")
    monkeypatch.setattr("sys.stdout", io.StringIO())
    assert Console().out.width == 120


def test_dashes_and_intervals() -> None:
    assert (or_dash(None), or_dash(0.0), or_dash(1.9204, 4)) == ("-", "0", "1.920")
    assert interval_text(0.5, 1.25) == "0.500 to 1.25"
    assert interval_text(None, 1.0) == interval_text(0.5, None) == interval_text(None, None) == "none"
    assert interval_text(0.0, 0.016, 2) == "0 to 0.016"
