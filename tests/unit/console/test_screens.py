"""Every screen of every shipped scenario, narrow and wide: no number is cut, and what must be said is said."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import pytest

from crowdsim.console.base import CAUTION, FOLDED
from crowdsim.console.compare import compare
from crowdsim.console.fits import fits
from crowdsim.results.judgement import Judgement
from crowdsim.results.sensitivity import Sensitivity
from crowdsim.results.texts import number, percent, span
from crowdsim.study.compare import Comparison
from crowdsim.study.estimate import STEADY, WEIGHTS

from .conftest import NAMES, Recorder, Screen, Shown, Table

Show = Callable[[str, str, int], Screen]
COMMANDS = ("summary", "compare", "estimate", "sensitivity", "check")
WIDTHS = (60, 80, 100, 120)
ALIKE = (WEIGHTS.format("1"), WEIGHTS.format("2"))  # not shown where they say the same as the steady state
UNFOLDED = 10_000  # letters: every paragraph on one line


def whole(cell: str) -> str:
    """A pattern of the cell with nothing stuck to it."""
    return rf"(?<!\S){re.escape(cell)}(?!\S)"


def lost(table: Table) -> list[str]:
    """What of a table is not to be read in its lines: title, headings, cells in one line, numbers in folded ones."""
    text = "\n".join(table.lines)
    heading = next((line for line in table.lines if re.search(whole(table.columns[0][0]), line)), "")
    found = [] if " ".join(text.split()).startswith(table.title) else [table.title]
    found += [name for name, _ in table.columns if name not in table.spare and name not in text]
    keep = [i for i, (name, _) in enumerate(table.columns) if name not in table.spare or name in heading]
    for row in table.rows:
        one_line = [row[i] for i in keep if table.columns[i][1] != "l" and row[i]]
        if not re.search("[^\n]*?".join(whole(cell) for cell in one_line), text):
            found.append(" | ".join(one_line))
        folded = " ".join(row[i] for i in keep if table.columns[i][1] == "l").split()
        numbers = [word for word in folded if re.search(r"\d", word) and len(word) <= FOLDED]
        found += [word for word in numbers if not re.search(whole(word), text)]
    return found


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", COMMANDS)
def test_no_number_of_a_table_is_cut(show: Show, command: str, name: str, width: int) -> None:
    screen = show(command, name, width)
    assert screen.tables
    assert {table.title: found for table in screen.tables if (found := lost(table))} == {}


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", COMMANDS)
def test_no_line_is_longer_than_the_width(show: Show, command: str, name: str, width: int) -> None:
    """But for the path of the results file, which is to be copied in one piece."""
    for line in show(command, name, width).text.split("\n"):
        assert len(line) <= width or line.startswith("Results: "), line
        assert "\u2026" not in line


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", COMMANDS)
def test_running_text_is_whole_at_any_width(show: Show, command: str, name: str) -> None:
    """Word by word the same, narrow and wide."""
    narrow, wide = (" ".join(show(command, name, width).text.split()) for width in (60, UNFOLDED))
    for said in show(command, name, UNFOLDED).said:
        assert " ".join(said.split()) in wide
        # textwrap may part a word at its hyphen
        assert " ".join(said.split()).replace("-", "- ").replace(" ", "") in narrow.replace(" ", "")


@pytest.mark.parametrize("width", [60, 120])
@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", COMMANDS)
def test_every_screen_ends_with_the_caution(show: Show, command: str, name: str, width: int) -> None:
    """After it only where the results are."""
    text = re.sub(r"\nResults: [^\n]*\n$", "\n", show(command, name, width).text)
    assert " ".join(text.split()).endswith(" ".join(CAUTION.split()))


def judged(comparison: Comparison) -> list[Judgement]:
    return [d.judgement for c in comparison.summary.cases for d in c.deck if d.judgement is not None]


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", ["summary", "compare", "sensitivity"])
def test_a_window_stands_beside_every_probability(
    show: Show, comparisons: dict[str, Comparison], studies: dict[str, Sensitivity], command: str, name: str
) -> None:
    """A chance means nothing without the time that it is of."""
    if command == "sensitivity":
        times = {span(studies[name].window)}
    else:
        times = {span(j.window) for j in judged(comparisons[name])}
        times |= {span(c.duration) for c in comparisons[name].summary.cases}
    beside = re.compile("|".join(rf"\b(?:in|of) {t}\b" for t in times))
    screen = show(command, name, UNFOLDED)
    told = [s for s in screen.said if "%" in s and re.search(r"probability of|[Cc]hance|lies in", s)]
    for said in told:
        assert beside.search(said), said
    shares = 0
    for table in screen.tables:
        for i, (heading, _) in enumerate(table.columns):
            if "chance" in heading or any(re.search(r"\d % \(", row[i]) for row in table.rows):
                assert beside.search(table.title) or beside.search(heading), (table.title, heading)
                shares += 1
    assert told or all(j.limit is None for j in judged(comparisons[name]))
    if command == "compare":
        assert shares


@pytest.mark.parametrize("name", [n for n in NAMES if n != "joggers-among-walkers"])  # EN 1990 has no classes
@pytest.mark.parametrize("command", ["summary", "compare"])
def test_the_next_worse_class_is_shown_though_not_seen(
    show: Show, comparisons: dict[str, Comparison], command: str, name: str
) -> None:
    text = "\n".join(show(command, name, UNFOLDED).said)
    for one in judged(comparisons[name]):
        seen = [i for i, (_, p) in enumerate(one.chances) if p.value > 0.0]
        shown = [*seen, *([max(seen) + 1] if max(seen) + 1 < len(one.chances) else [])]
        parts = [
            f"{k} {percent(p.value)} ({percent(p.low)} to {percent(p.high)})"
            for k, p in (one.chances[i] for i in shown)
        ]
        assert f"The peak of one window of {span(one.window)} lies in {', '.join(parts)}.\n" in text


def test_a_class_that_was_not_seen_is_not_impossible(show: Show, comparisons: dict[str, Comparison]) -> None:
    """The commuters never reach the last class in 320 windows: 0 %, and an upper end above it."""
    morning = judged(comparisons["weekday-commuters"])[0]
    name, share = morning.chances[-1]
    assert (name, share.value) == ("CL4", 0.0)
    assert share.high > 0.005
    found = re.search(r"CL4 0 % \(0 % to ([0-9.]+) %\)\.", "\n".join(show("summary", "weekday-commuters", 120).said))
    assert found
    assert float(found[1]) == pytest.approx(100.0 * share.high, abs=0.05)


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", ["summary", "compare"])
def test_sentence_value_and_verdict_of_every_case(
    show: Show, comparisons: dict[str, Comparison], command: str, name: str, width: int
) -> None:
    screen = show(command, name, width)
    text = " ".join(screen.text.split())
    for one in judged(comparisons[name]):
        assert one.sentence in text
        assert one.shown in one.sentence
        assert one.sentence.endswith({"met": " is met.", "not met": " is not met.", None: "."}[one.verdict])


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("name", NAMES)
def test_the_table_of_cases_keeps_its_verdicts(
    show: Show, comparisons: dict[str, Comparison], name: str, width: int
) -> None:
    """What the table is for is never among what the terminal has no room for."""
    table = next(t for t in show("compare", name, width).tables if t.title.startswith("Cases: "))
    lines = "\n".join(table.lines)
    for heading in ("case", "95 % peak, m/s2", "verdict"):
        assert heading in lines
    for one in judged(comparisons[name]):
        assert re.search(rf"{whole(one.shown)}.*{whole(one.verdict or '-')}", lines)


@pytest.mark.parametrize("name", NAMES)
def test_numbers_shown_are_those_of_the_run(show: Show, comparisons: dict[str, Comparison], name: str) -> None:
    text = show("summary", name, UNFOLDED).text
    for case in comparisons[name].summary.cases:
        assert f"Case {case.name}: 80 realisations of {span(case.duration)}, " in text
        for point in case.points:
            p = point.peak.p95
            assert p.low is not None
            assert p.high is not None
            row = rf"{re.escape(point.name)} .*{whole(number(p.value))} +{number(p.low)} to {number(p.high)} "
            assert re.search(row, text)
        rows = {r.method.name: r for r in comparisons[name].leading(case.name) if r.ratio is not None}
        for row in rows.values():
            cells = [row.method.name, *(number(x or 0.0) for x in (row.method.value, row.simulated, row.ratio))]
            if row.method.name in ALIKE and row.method.value == pytest.approx(rows[STEADY].method.value, rel=1e-12):
                cells = ["By weights with C = 1 or 2: the same as the steady state."]
            assert re.search("[^\n]*".join(map(whole, cells)), text), cells


@pytest.mark.parametrize("name", NAMES)
def test_what_the_intervals_leave_out(
    show: Show, comparisons: dict[str, Comparison], studies: dict[str, Sensitivity], name: str
) -> None:
    """Without a study, that nothing was varied; with one in the file, what it found."""
    alone = "The intervals speak of the number of realisations alone."
    for command in ("summary", "compare"):
        (said,) = [s for s in show(command, name, 80).said if s.startswith(alone)]
        assert "Not varied: load set, pace, step length, damping, frequency, the people's effect, density" in said
        assert "crowdsim sensitivity" in said
    console = Recorder(80)
    compare(console, replace(comparisons[name], sensitivities=(studies[name],)))
    at = console.screen.said.index(f"{alone} A sensitivity study is in the file.")
    assert console.screen.said[at + 1] == f"{studies[name].text()} {studies[name].not_varied_text()}"
    assert console.screen.said[at + 1].startswith(f"The 95 % peak of {studies[name].case} in ")


@pytest.mark.parametrize("width", [60, 120])
@pytest.mark.parametrize("command", ["summary", "compare"])
def test_a_run_that_was_stopped_says_so_first(shown: Shown, command: str, width: int) -> None:
    """Below the title: how many of how many, and which case was not begun."""
    whole_run = shown.comparisons["weekday-commuters"]
    part = replace(whole_run.summary, cases=whole_run.summary.cases[:1], complete=False, asked=12_000)
    stopped = replace(shown, comparisons={"stopped": replace(whole_run, summary=part)})
    said = "INCOMPLETE: 80 of 12,000 realisations of weekday morning; not simulated: quiet noon."
    console = Recorder(width)
    stopped.on(console, command, "stopped")
    title, rest = console.text().split("\n", 1)
    assert title == part.title
    assert " ".join(rest.split()).startswith(said)
    console = Recorder(width)
    shown.on(console, command, "weekday-commuters")
    assert "INCOMPLETE" not in console.text()


@pytest.mark.parametrize("name", NAMES)
def test_fits_say_where_they_extrapolate(show: Show, comparisons: dict[str, Comparison], name: str) -> None:
    said = show("compare", name, 80).said
    for law in comparisons[name].fits:
        assert f"{law.case}, vertical, {span(law.window)}: {law.text}" in said
        (percentiles,) = [
            s for s in said[said.index(f"{law.case}, vertical, {span(law.window)}: {law.text}") :][:4]
            if s.startswith("Percentiles")
        ]  # fmt: skip
        marked = re.findall(r"([0-9.]+) %: [^;]* EXTRAPOLATED beyond the windows simulated", percentiles)
        assert marked == [f"{100 * q.share:g}" for q in law.quantiles if q.extrapolated]
        assert "99.9" in marked  # 80 realisations have at most 320 windows


def test_a_case_without_a_law_says_why(comparisons: dict[str, Comparison]) -> None:
    law = comparisons["one-walker"].fits[0]
    none = replace(law, text="", upper_end=None, statistic=None, p_value=None, correlation=None, quantiles=(),
                   trouble="all 80 values are equal (0.5): there is no spread to fit")  # fmt: skip
    console = Recorder(80)
    fits(console, [none, law, replace(law, p_value=0.03), replace(law, upper_end=1.5)])
    said = "\n".join(console.screen.said)
    assert f"{law.case}: no fit: all 80 values are equal (0.5): there is no spread to fit.\n" in said
    assert said.count("Percentiles") == 3
    assert said.count("fits badly: do not use it") == 1 + ((law.p_value or 0.0) < 0.05) * 2
    assert "The law has an upper end at 1.50 m/s2." in said


# ---------------------------------------------------------------- for programs, and quiet


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("command", COMMANDS)
def test_json(shown: Shown, command: str, name: str) -> None:
    """JSON alone, without NaN, with the very numbers."""
    console = Recorder(60, json=True)
    shown.on(console, command, name)
    read = json.loads(console.text(), parse_constant=lambda word: pytest.fail(word))
    if command == "check":
        assert [c["persons_on_deck"] for c in read["cases"]] == [c.persons for c in shown.plans[name].cases]
        return
    where: dict[str, Any] = {"estimate": shown.estimates, "sensitivity": shown.studies}
    assert read == json.loads(json.dumps(where.get(command, shown.comparisons)[name].as_dict()))


@pytest.mark.parametrize("command", ["summary", "sensitivity"])  # the commands that have --quiet
def test_quiet(shown: Shown, command: str) -> None:
    console = Recorder(60, quiet=True)
    shown.on(console, command, "one-walker")
    assert console.text() == ""
