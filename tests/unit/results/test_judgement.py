"""One direction of a case judged, on peaks built by hand.

100 realisations of one window: the 95 % value is the 95th, its interval reaches from the 90th to the 100th (computed,
see the test of the ranks). So the verdict hangs on the largest and on the 90th value alone, and is known beforehand.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from crowdsim.guides.catalogue import CRITERIA
from crowdsim.response.verdict import realisations_to_decide
from crowdsim.response.windows import window_exceedance, window_percentile
from crowdsim.results.judgement import Judgement, Question, asked, judge
from crowdsim.results.reader import open_results
from crowdsim.results.summary import summarise
from crowdsim.results.wording import buys
from crowdsim.scenario.reader import Scenario
from crowdsim.study.simulate import plan, simulate_to

Floats = NDArray[np.float64]
USUAL = Question()
SHAPE = "vertical = { half_waves = 1 }"


def attributes(**other: Any) -> dict[str, Any]:
    """Of a case in a results file."""
    return {"name": "market day", "duration": 240.0, "window": 240.0, "criterion": "eur-23984", **other}


def hundred(low: float, at_90: float, at_95: float, largest: float) -> Floats:
    """[realisation, 1] with these values at the ranks that count, the rest between them, shuffled."""
    values = np.concatenate([
        np.linspace(low, at_90, 90), np.linspace(at_90, at_95, 6)[1:], np.linspace(at_95, largest, 6)[1:],
    ])  # fmt: skip
    return np.random.default_rng(1).permutation(values)[:, None]


def judged(peaks: Floats, direction: str = "vertical", question: Question = USUAL, **other: Any) -> Judgement:
    return judge(attributes(**other), direction, peaks, peaks.max(axis=1), question)


# ---------------------------------------------------------------- verdicts against a class


def test_met() -> None:
    said = judged(hundred(0.4, 0.75, 0.8, 0.9), target="CL2")
    assert (said.value.value, said.value.low, said.value.high) == (0.8, 0.75, 0.9)
    assert (said.verdict, said.needed) == ("met", None)
    assert (said.class_name, said.class_words) == ("CL2", "medium comfort")
    assert (said.target, said.limit) == ("CL2", 1.0)
    assert said.limit_words == "upper bound of CL2, EUR 23984 (2009)"
    assert said.exceedance is not None
    assert said.exceedance.value == 0.0


def test_not_met() -> None:
    said = judged(hundred(0.8, 1.05, 1.2, 1.3), target="CL2")
    assert (said.verdict, said.needed) == ("not met", None)
    assert (said.class_name, said.class_words) == ("CL3", "minimum comfort")


def test_undecided_with_the_number_that_would_decide() -> None:
    """Four of a hundred above."""
    peaks = hundred(0.5, 0.9, 0.95, 1.2)
    assert int((peaks > 1.0).sum()) == 4
    said = judged(peaks, target="CL2")
    assert said.verdict == "undecided"
    assert said.class_name == "CL2"
    assert said.needed == realisations_to_decide(window_exceedance(peaks, 1.0), 100) == 2000
    assert "if 4.0 % of the windows stay above the limit, 2,000 realisations decide in about half of all" in said.note
    assert "a run that is extended until it decides is no longer 95 % sure" in said.note


def test_undecided_and_no_number_would_decide() -> None:
    peaks = hundred(0.5, 0.9, 1.0, 1.2)
    assert int((peaks > 1.0).sum()) == 5
    said = judged(peaks, target="CL2")
    assert (said.verdict, said.needed) == ("undecided", None)
    assert "5.0 % of the windows are above the limit: so near 5.0 % that no number in reach would decide" in said.note
    assert "realisations would decide" not in said.sentence


def test_the_upper_end_at_the_limit_is_met() -> None:
    assert judged(hundred(0.4, 0.75, 0.8, 1.0), target="CL2").verdict == "met"
    assert judged(hundred(0.4, 0.75, 0.8, np.nextafter(1.0, 2.0)), target="CL2").verdict == "undecided"


def test_the_lower_end_at_the_limit_is_not_exceeded() -> None:
    assert judged(hundred(0.4, 1.0, 1.2, 1.3), target="CL2").verdict == "undecided"
    assert judged(hundred(0.4, np.nextafter(1.0, 2.0), 1.2, 1.3), target="CL2").verdict == "not met"


@pytest.mark.parametrize(
    ("value", "name"),
    [(0.49999, "CL1"), (0.5, "CL2"), (0.99999, "CL2"), (1.0, "CL3"), (2.5, "CL4")],
)
def test_a_value_at_an_edge_belongs_to_the_worse_class(value: float, name: str) -> None:
    said = judged(hundred(0.1, 0.9 * value, value, 1.1 * value))
    assert said.value.value == value
    assert said.class_name == name
    assert f"class {name} of EUR 23984 (2009)" in said.sentence


def test_the_95th_value_is_judged_not_the_largest() -> None:
    said = judged(hundred(0.1, 0.3, 0.4, 9.0), target="CL1")
    assert said.class_name == "CL1"
    assert said.verdict == "undecided"


# ---------------------------------------------------------------- what is asked


def test_nothing_asked() -> None:
    said = judged(hundred(0.4, 0.75, 0.8, 0.9))
    assert (said.verdict, said.limit, said.target, said.needed, said.exceedance) == (None, None, None, None, None)
    assert said.class_name == "CL2"
    assert "limit" not in said.sentence
    assert said.sentence.endswith("class CL2 of EUR 23984 (2009).")


@pytest.mark.parametrize(
    ("direction", "limit", "at_95", "verdict"),
    [("vertical", 0.7, 0.6, "met"), ("vertical", 0.7, 0.9, "not met"), ("lateral", 0.2, 0.15, "met")],
)
def test_en_1990_has_a_limit_of_its_own(direction: str, limit: float, at_95: float, verdict: str) -> None:
    """No class, no chances of classes."""
    said = judged(hundred(0.1, 0.95 * at_95, at_95, 1.1 * at_95), direction, criterion="en-1990")
    assert (said.limit, said.verdict) == (limit, verdict)
    assert (said.class_name, said.class_words, said.chances) == (None, "", ())
    assert said.limit_words == "EN 1990 Annex A2"
    assert "class" not in said.sentence
    assert f"the limit of {limit:.3f} m/s2 (EN 1990 Annex A2) is {verdict}" in said.sentence


def test_the_owners_limit_in_place_of_that_of_en_1990() -> None:
    said = judged(hundred(0.1, 0.5, 0.55, 0.58), criterion="en-1990", limit=0.5)
    assert (said.limit, said.limit_words, said.verdict) == (0.5, "as specified", "undecided")


def test_the_owners_limit_beside_classes() -> None:
    """The class still stands, the verdict is of the limit."""
    said = judged(hundred(0.4, 0.75, 0.8, 0.9), limit=0.7)
    assert (said.class_name, said.target, said.limit, said.verdict) == ("CL2", None, 0.7, "not met")
    assert "the limit of 0.700 m/s2 (as specified) is not met" in said.sentence
    assert [name for name, _ in said.chances] == ["CL1", "CL2", "CL3", "CL4"]


def test_setra_2006() -> None:
    said = judged(hundred(0.1, 0.2, 0.28, 0.29), "longitudinal", criterion="setra-2006", target="range 2")
    assert (said.class_name, said.limit, said.verdict) == ("range 2", 0.30, "met")
    assert ", range 2 of Setra (2006); the limit of" in said.sentence
    lateral = judged(hundred(0.1, 0.2, 0.28, 0.29), "lateral", criterion="setra-2006", target="range 2")
    assert "0.10 m/s2 in every case, for lock-in" in lateral.note


def test_a_direction_of_which_the_source_says_nothing() -> None:
    """EUR 23984 has no longitudinal classes: no class, no limit, no verdict, and the note says so."""
    said = judged(hundred(0.1, 0.2, 0.3, 0.4), "longitudinal", target="CL2")
    assert (said.class_name, said.limit, said.verdict, said.chances) == (None, None, None, ())
    assert "EUR 23984 (2009) has nothing to say of the longitudinal direction" in said.note
    owner = judged(hundred(0.1, 0.2, 0.3, 0.4), "longitudinal", limit=0.5)
    assert (owner.class_name, owner.verdict) == (None, "met")


def test_asked() -> None:
    """Given beside the scenario, then the owner's, then the class's, then the criterion's own."""
    eur, en = CRITERIA["eur-23984"], CRITERIA["en-1990"]
    found = asked(attributes(target="CL1"), "vertical", 0.3)
    assert (found.criterion, found.target, found.limit, found.words) == (eur, None, 0.3, "as specified")
    assert asked(attributes(limit=0.6), "lateral").limit == 0.6
    assert asked(attributes(target="CL1"), "lateral").limit == 0.10
    assert asked(attributes(), "vertical").limit is None
    assert asked(attributes(criterion="en-1990"), "vertical").limit == en.limit("vertical")


# ---------------------------------------------------------------- chances


def test_chances_of_the_classes() -> None:
    """Counted by hand: 50 below 0.5, 30 from there below 1, 15 from there below 2.5, 5 beyond."""
    values = np.repeat([0.3, 0.5, 1.0, 2.5], [50, 30, 15, 5]).astype(float)
    said = judged(values[:, None])
    assert [(name, p.value) for name, p in said.chances] == [("CL1", 0.5), ("CL2", 0.3), ("CL3", 0.15), ("CL4", 0.05)]
    assert sum(p.value for _, p in said.chances) == pytest.approx(1.0, abs=1e-15)
    for _, p in said.chances:
        assert p.low < p.value < p.high


# ---------------------------------------------------------------- few realisations, windows, short records


def test_fewer_than_72_realisations() -> None:
    peaks = np.linspace(0.2, 0.4, 71)[:, None]
    said = judged(peaks, target="CL2")
    assert (said.value.low, said.value.high, said.verdict, said.wanted) == (None, None, "undecided", None)
    assert said.class_name == "CL1"
    assert "no interval of the 95 % value, hence no verdict, below 72 realisations" in said.note
    assert "no confidence interval, from 71 simulated realisations" in said.sentence
    assert said.needed is not None
    assert said.needed >= 72
    assert buys(said) == "72 realisations give a first interval."
    enough = judged(np.linspace(0.2, 0.4, 72)[:, None], target="CL2")
    assert enough.verdict == "met"
    assert "below 72" not in enough.note


def test_one_realisation_reads_as_one() -> None:
    said = judged(np.array([[0.42]]), target="CL1")
    assert "the largest peak vertical acceleration" in said.sentence
    assert "from 1 simulated realisation)" in said.sentence
    assert (said.value.value, said.verdict) == (0.42, "undecided")


@pytest.mark.parametrize(("count", "words"), [(19, "the largest peak"), (20, "the 95 % value of the peak")])
def test_below_twenty_windows_the_95_percent_value_is_the_largest(count: int, words: str) -> None:
    values = np.linspace(0.1, 0.4, count)
    said = judged(values[:, None])
    assert said.value.value == values[-1 if count == 19 else -2]
    assert words in said.sentence


def test_several_windows_a_realisation() -> None:
    peaks = np.random.default_rng(2).gumbel(0.6, 0.1, (100, 3))
    said = judge(attributes(duration=750.0, target="CL2"), "vertical", peaks, peaks.max(axis=1))
    assert (said.realisations, said.windows, said.window) == (100, 3, 240.0)
    assert (said.whole, said.short) == (False, False)
    assert said.value == window_percentile(peaks)
    assert said.exceedance == window_exceedance(peaks, 1.0)
    assert "anywhere on the deck in 4 min is" in said.sentence
    assert "from 100 simulated realisations of 3 windows each" in said.sentence


def test_the_whole_record_as_window() -> None:
    said = judge(attributes(duration=100.0, window=100.0), "vertical", np.ones((80, 1)), np.ones(80))
    assert (said.whole, said.short, said.window) == (True, False, 100.0)
    assert (said.asked_window, said.rest) == (100.0, 0.0)
    assert "in 100 s is" in said.sentence


def short(values: Floats, **other: Any) -> Judgement:
    """No whole window of 240 s in a record of 60 s."""
    return judge(attributes(duration=60.0, **other), "vertical", np.zeros((values.shape[0], 0)), values[:, 0])


def test_a_record_shorter_than_the_window_is_never_met() -> None:
    """A peak in a longer time can only be higher."""
    said = short(hundred(0.1, 0.2, 0.3, 0.4), target="CL2")
    assert (said.short, said.whole, said.window, said.windows) == (True, True, 60.0, 1)
    assert (said.asked_window, said.rest) == (240.0, 0.0)  # the record is judged whole
    assert (said.verdict, said.needed) == ("undecided", None)
    assert "the record of 60 s is shorter than the comfort window of 4 min" in said.note
    assert "make duration at least 240 s" in said.note
    assert "would decide" not in said.note
    assert said.value.value == 0.3


def test_a_record_shorter_than_the_window_can_be_not_met() -> None:
    said = short(hundred(0.1, 1.1, 1.3, 1.4), target="CL2")
    assert said.verdict == "not met"


def test_an_undecided_short_record_names_no_number() -> None:
    """More realisations of it could never show the limit to be met."""
    said = short(hundred(0.1, 0.9, 0.95, 1.2), target="CL2")
    assert (said.verdict, said.needed) == ("undecided", None)


def test_the_sentence_of_a_short_record_says_which_percentile() -> None:
    """100 records: the 95th of them is judged, and the largest is another."""
    said = short(hundred(0.1, 0.2, 0.3, 0.4))
    assert (
        "the 95 % value of the peak vertical acceleration anywhere on the deck in 60 s is 0.300 m/s2" in said.sentence
    )


# ---------------------------------------------------------------- the sentence


def test_the_sentence_has_everything() -> None:
    assert judged(hundred(0.4, 0.75, 0.8, 0.9), target="CL2").sentence == (
        "market day: the 95 % value of the peak vertical acceleration anywhere on the deck in 4 min is 0.800 m/s2 "
        "(95 % confidence interval 0.750 to 0.900 m/s2, from 100 simulated realisations), class CL2 of EUR 23984 "
        "(2009); the limit of 1.00 m/s2 (upper bound of CL2, EUR 23984 (2009)) is met."
    )
    undecided = judged(hundred(0.5, 0.9, 0.95, 1.2), target="CL2").sentence
    assert undecided.endswith(
        "is neither shown to be met nor to be exceeded (about 2,000 realisations would decide, as likely as not)."
    )
    for part in ("market day", "95 % value", "4 min", "0.950 m/s2", "0.900 to 1.20 m/s2", "class CL2", "1.00 m/s2"):
        assert part in undecided


# ---------------------------------------------------------------- what is shown, classes of the interval's ends


@pytest.mark.parametrize(
    ("value", "other", "shown"),
    [
        (0.49996, {}, "0.49996"),  # 0.500 would read as class 2
        (0.5, {}, "0.500"),  # at the bound, and shown so
        (0.4912, {}, "0.491"),
        (0.99996, {}, "0.99996"),
        (0.69972, {"limit": 0.7}, "0.6997"),  # the owner's limit counts like a bound
        (0.69972, {}, "0.700"),
        (0.69999, {"criterion": "en-1990"}, "0.69999"),
    ],
)
def test_a_value_is_shown_apart_from_a_bound(value: float, other: dict[str, Any], shown: str) -> None:
    said = judged(hundred(0.1, 0.9 * value, value, 1.1 * value), **other)
    assert said.value.value == value
    assert said.shown == shown
    assert f" is {shown} m/s2 (95 % confidence" in said.sentence


@pytest.mark.parametrize(
    ("at_90", "at_95", "largest", "classes"),
    [
        (0.6, 0.7, 0.8, ("CL2", "CL2", "CL2")),
        (0.6, 0.7, 1.0, ("CL2", "CL2", "CL3")),  # at the edge: the worse one
        (0.49, 0.7, 0.99, ("CL1", "CL2", "CL2")),
        (0.4, 0.7, 2.6, ("CL1", "CL2", "CL4")),
    ],
)
def test_classes_of_the_ends_of_the_interval(
    at_90: float, at_95: float, largest: float, classes: tuple[str, str, str]
) -> None:
    said = judged(hundred(0.1, at_90, at_95, largest))
    assert (said.value.low, said.value.value, said.value.high) == (at_90, at_95, largest)
    assert (said.class_low, said.class_name, said.class_high) == classes


def test_no_classes_of_ends_that_are_not_there() -> None:
    few = judged(np.linspace(0.2, 0.4, 71)[:, None])
    assert (few.class_low, few.class_name, few.class_high) == (None, "CL1", None)
    other = judged(hundred(0.1, 0.6, 0.7, 0.8), question=Question(0.9, None))
    assert (other.class_low, other.class_name, other.class_high) == (None, None, None)


@pytest.mark.parametrize(
    ("duration", "windows", "rest"), [(750.0, 3, 30.0), (720.0, 3, 0.0), (900.0, 3, 180.0), (240.0, 1, 0.0)]
)
def test_what_is_left_of_a_record(duration: float, windows: int, rest: float) -> None:
    peaks = np.random.default_rng(2).gumbel(0.6, 0.1, (100, windows))
    said = judge(attributes(duration=duration), "vertical", peaks, peaks.max(axis=1))
    assert (said.asked_window, said.window, said.rest) == (240.0, 240.0, rest)


# ---------------------------------------------------------------- another question


def test_another_percentile() -> None:
    """The 90 % value of a hundred is the 90th; its interval from the 84th to the 96th, by the binomial distribution:
    P(B <= 83) = 0.021, P(B <= 84) = 0.040; P(B <= 94) = 0.942, P(B <= 95) = 0.976 (computed).
    """
    values = np.random.default_rng(3).permutation(np.arange(1, 101) / 100.0)[:, None]
    said = judged(values, question=Question(0.9, None), target="CL2")
    assert (said.value.value, said.value.low, said.value.high) == (0.9, 0.84, 0.96)
    assert said.verdict == "met"
    assert "the 90 % value of the peak" in said.sentence
    assert said.class_name is None  # a class is that of the 95 % value
    assert "a class goes with the 95 % value" in said.note
    assert buys(said).startswith("100 realisations give +-")
    assert "on the 90 % value" in buys(said)


def test_another_percentile_needs_other_numbers() -> None:
    """36 realisations for the 90 % value: 0.9^36 <= 0.025 < 0.9^35 (computed)."""
    few = judged(np.linspace(0.1, 0.4, 35)[:, None], question=Question(0.9, 1.0))
    assert 0.9**36 <= 0.025 < 0.9**35
    assert few.verdict == "undecided"
    assert "no interval of the 90 % value, hence no verdict, below 36 realisations" in few.note
    assert judged(np.linspace(0.1, 0.4, 36)[:, None], question=Question(0.9, 1.0)).verdict == "met"


def test_a_median_of_few_windows_is_not_called_the_largest() -> None:
    values = np.arange(1, 12) / 10.0
    said = judged(values[:, None], question=Question(0.5, None))
    assert said.value.value == 0.6
    assert "the 50 % value of the peak vertical acceleration" in said.sentence


def test_another_limit() -> None:
    """In place of the target; the class stays."""
    peaks = hundred(0.4, 0.75, 0.8, 0.9)
    said = judged(peaks, question=Question(limit=0.85), target="CL2")
    assert (said.target, said.limit, said.limit_words, said.class_name) == (None, 0.85, "as specified", "CL2")
    assert said.verdict == "undecided"
    assert said.exceedance == window_exceedance(peaks, 0.85)
    assert "the limit of 0.850 m/s2 (as specified)" in said.sentence
    assert judged(peaks, question=Question(limit=0.9), target="CL2").verdict == "met"


# ---------------------------------------------------------------- what more realisations buy


def test_realisations_for_three_per_cent() -> None:
    """Half width (0.9 - 0.75)/2/0.8 = 9.375 %; 100 x 3.125^2 = 976.6, in two digits 980."""
    said = judged(hundred(0.4, 0.75, 0.8, 0.9))
    assert said.wanted == 980
    assert buys(said) == "100 realisations give +-9.4 % on the 95 % value; +-3 % needs about 980."
    sharp = judged(hundred(0.4, 0.784, 0.8, 0.816))
    assert buys(sharp) == "100 realisations give +-2 % on the 95 % value."


# ---------------------------------------------------------------- from a file


def test_the_summary_judges_the_window_peaks_of_the_deck(scenario: Callable[..., Scenario], tmp_path: Path) -> None:
    """`judge` on the arrays of the file, with its attributes; a lateral direction is not judged, nothing acts there."""
    read = scenario(
        ("duration = 900.0", "duration = 100.0"),
        (SHAPE, SHAPE + "\nlateral = { half_waves = 1, amplitude = 0.2 }"),
        ("", '[[case]]\nname = "day"\ntarget = "CL1"\n[comfort]\nwindow = 30\n'),
    )  # fmt: skip
    out = tmp_path / "run.h5"
    simulate_to(plan(read, realisations=80), out)
    (case,) = open_results(out).cases
    for kwargs in ({}, {"percentile": 0.9}, {"limit": 0.4}):
        (said,) = summarise(out, "Weir Lane", **kwargs).cases
        vertical, lateral = said.deck
        assert (vertical.direction, lateral.direction) == ("vertical", "lateral")
        assert lateral.judgement is None
        peaks = case.deck_window_peak["vertical"]
        assert peaks.shape == (80, 3)
        record = case.envelope["vertical"].max(axis=(1, 2))
        question = Question(kwargs.get("percentile", 0.95), kwargs.get("limit"))
        assert vertical.judgement == judge(case.attributes, "vertical", peaks, record, question)
        (point,) = [p for p in said.points if p.direction == "vertical"]
        limit = kwargs.get("limit", 0.5)
        windows = case.window_peak[:, :, list(case.points.direction).index("vertical")]
        assert point.window_peak == window_percentile(windows, question.percentile)
        assert point.window_exceedance == window_exceedance(windows, limit)
        assert all(p.window_exceedance is None for p in said.points if p.direction == "lateral")
