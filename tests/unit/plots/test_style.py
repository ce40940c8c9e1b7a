"""What the figures share: texts that fit, records made short, labels and marks kept apart."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from crowdsim.plots.labels import apart
from crowdsim.plots.strip import _clash, _rows
from crowdsim.plots.style import STEPS, decimated, level, text_width, tied, wrapped


@given(st.integers(1, 3000), st.integers(1, 400), st.integers(0, 2**31))
@settings(max_examples=60, deadline=None)
def test_a_short_record_keeps_order_ends_and_extremes(count: int, columns: int, seed: int) -> None:
    x = np.arange(count, dtype=np.float64)
    y = np.random.default_rng(seed).normal(size=count)
    a, b = decimated(x, y, columns)
    assert a.size <= max(3 * columns, 4 * columns + 6)
    assert np.all(np.diff(a) > 0.0)
    assert (a[0], a[-1]) == (x[0], x[-1])
    assert (b.min(), b.max()) == (y.min(), y.max())
    np.testing.assert_array_equal(b, y[a.astype(int)])


def test_the_extremes_of_every_column_are_kept() -> None:
    y = np.random.default_rng(4).normal(size=10_000)
    a, b = decimated(np.arange(10_000.0), y, 100)
    for k in range(100):
        inside = (a >= 100 * k) & (a < 100 * (k + 1))
        assert b[inside].max() == y[100 * k : 100 * (k + 1)].max()
        assert b[inside].min() == y[100 * k : 100 * (k + 1)].min()


@given(st.text(st.characters(codec="utf-8", exclude_categories=("Cs", "Cc")), max_size=120), st.floats(15.0, 100.0))
@settings(max_examples=40, deadline=None)
@pytest.mark.filterwarnings("ignore:Glyph")
def test_wrapped_text_fits(text: str, width: float) -> None:
    lines = wrapped(text, width, lines=3).split("\n")
    assert len(lines) <= 3
    assert all(text_width(line) <= width or len(line) <= 2 for line in lines)


def test_wrapped_text_loses_nothing_and_says_when_it_does() -> None:
    text = "one two three four five"
    assert wrapped(text, 20.0, lines=9).replace("\n", " ") == text
    assert wrapped(text, 12.0, lines=2).endswith("\u2026")
    assert wrapped("12\u00a0m and 12\u00a0m", 1.2 * text_width("12\u00a0m and")).split("\n") == [
        "12\u00a0m and", "12\u00a0m",
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        ("in 4 min at s = 21 m", "in_4_min at s_=_21_m"),
        ("95 % value 1.2 m/s²", "95_% value 1.2_m/s²"),
        ("3 modes, 2 tonnes", "3 modes, 2 tonnes"),
    ],
)
def test_numbers_hold_their_units(text: str, wanted: str) -> None:
    # an underscore stands for the no-break space here
    held = tied(text).replace("\u00a0", "_")
    assert held.replace("in_", "in ") == wanted.replace("in_", "in ")


def test_bounds_as_a_source_writes_them() -> None:
    assert [level(v) for v in (0.5, 1.0, 2.5, 0.125)] == ["0.50", "1.00", "2.50", "0.125"]


@given(st.lists(st.tuples(st.floats(-5.0, 105.0), st.floats(0.5, 12.0)), min_size=1, max_size=8))
def test_labels_on_an_edge_are_moved_apart_and_no_further(items: list[tuple[float, float]]) -> None:
    wanted, sizes = [w for w, _ in items], [s for _, s in items]
    at = apart(wanted, sizes, 0.0, 100.0)
    for (a, p), (b, q) in itertools.combinations(zip(at, sizes, strict=True), 2):
        assert abs(a - b) >= 0.5 * (p + q) - 1e-9
    for a, p in zip(at, sizes, strict=True):
        assert a - 0.5 * p >= -1e-9
        assert a + 0.5 * p <= 100.0 + 1e-9
    free = [0.5 * s <= w <= 100.0 - 0.5 * s for w, s in items]
    lonely = all(abs(a - b) >= 0.5 * (p + q) for (a, p), (b, q) in itertools.combinations(items, 2))
    if lonely and all(free):
        assert at == pytest.approx(wanted)


@given(st.lists(st.tuples(st.floats(5.0, 30.0), st.floats(0.0, 140.0)), min_size=1, max_size=6))
@settings(deadline=None)
def test_marks_above_a_panel_do_not_cross(names: list[tuple[float, float]]) -> None:
    put = _rows(names, 140.0)
    if put is None:
        return
    assert sorted(p.which for p in put) == list(range(len(names)))
    for a, b in itertools.combinations(put, 2):
        assert not _clash(a, b)
    for p in put:
        assert -0.5 <= p.begin <= p.end <= 140.5


def test_marks_apart_share_a_row_and_close_ones_do_not() -> None:
    rows = {p.which: p.row for p in _rows([(20.0, 10.0), (20.0, 80.0)], 140.0) or []}
    assert rows == {0: 0, 1: 0}
    close = _rows([(40.0, 50.0), (40.0, 51.0), (40.0, 52.0)], 140.0)
    assert close is not None
    assert max(p.row for p in close) >= 1
    assert _rows([(100.0, 70.0)], 140.0) is None  # fits on neither side


def test_classes_are_one_hue_and_grow_darker_in_print() -> None:
    def grey(colour: str) -> float:
        r, g, b = (int(colour[i : i + 2], 16) for i in (1, 3, 5))
        return 0.299 * r + 0.587 * g + 0.114 * b

    shades = [grey(c) for c in STEPS]
    # steps of 8 in 255 and more are told apart on paper (common practice)
    assert all(a - b > 8.0 for a, b in itertools.pairwise(shades))
