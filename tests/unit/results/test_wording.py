"""A judgement in words: every remark where it is due and nowhere else, and the numbers within them.

The judgements are made by hand; those of `judge` are in test_judgement.py.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from crowdsim.guides.catalogue import CRITERIA
from crowdsim.response.statistics import Percentile
from crowdsim.response.windows import Proportion
from crowdsim.results.judgement import Judgement
from crowdsim.results.texts import apart, number, percent, span
from crowdsim.results.wording import buys, class_text, note, sentence

EUR = CRITERIA["eur-23984"]


def judgement(**changes: Any) -> Judgement:
    """100 realisations of 3 windows, CL2 met."""
    made = Judgement(
        case="market day", direction="vertical", realisations=100, windows=3, window=240.0, whole=False, short=False,
        asked_window=240.0, rest=0.0, value=Percentile(0.95, 0.8, 0.75, 0.9, 250.0), shown="0.800",
        criterion=EUR.title, class_name="CL2", class_words="medium comfort", class_low="CL2", class_high="CL2",
        chances=(), target="CL2", limit=1.0, limit_words="upper bound of CL2, EUR 23984 (2009)",
        exceedance=Proportion(0.01, 0.004, 0.03, 250.0), verdict="met", needed=None, wanted=980, note="", sentence="",
    )  # fmt: skip
    return replace(made, **changes)


def valued(low: float | None, high: float | None, value: float = 0.8, share: float = 0.95) -> dict[str, Percentile]:
    return {"value": Percentile(share, value, low, high, 250.0)}


# ---------------------------------------------------------------- the sentence


def test_the_sentence() -> None:
    assert sentence(judgement()) == (
        "market day: the 95 % value of the peak vertical acceleration anywhere on the deck in 4 min is 0.800 m/s2 (95 "
        "% confidence interval 0.750 to 0.900 m/s2, from 100 simulated realisations of 3 windows each), class CL2 of "
        "EUR 23984 (2009); the limit of 1.00 m/s2 (upper bound of CL2, EUR 23984 (2009)) is met."
    )


def test_the_sentence_shows_what_is_to_be_shown() -> None:
    """Not a number rounded once more."""
    assert " is 0.49996 m/s2 (" in sentence(judgement(**valued(0.4, 0.6, 0.49996), shown="0.49996"))


@pytest.mark.parametrize(
    ("verdict", "needed", "end"),
    [
        ("met", None, " is met."),
        ("not met", None, " is not met."),
        ("undecided", None, " is neither shown to be met nor to be exceeded."),
        (
            "undecided",
            12000,
            " is neither shown to be met nor to be exceeded (about 12,000 realisations would decide, as likely as "
            "not).",
        ),
    ],
)
def test_how_the_sentence_ends(verdict: Any, needed: int | None, end: str) -> None:
    assert sentence(judgement(verdict=verdict, needed=needed)).endswith("upper bound of CL2, EUR 23984 (2009))" + end)


def test_nothing_asked_and_no_interval() -> None:
    text = sentence(judgement(**valued(None, None), verdict=None, limit=None, class_low=None, class_high=None))
    assert "(no confidence interval, from 100 simulated realisations of 3 windows each)" in text
    assert text.endswith(", class CL2 of EUR 23984 (2009).")
    assert "reaches" not in text


def test_no_verdict_without_an_interval() -> None:
    """Nor a number of realisations that would decide: it would rest on next to nothing."""
    few = judgement(**valued(None, None), verdict="undecided", needed=93, class_low=None, class_high=None)
    assert sentence(few).endswith(
        "; no verdict on the limit of 1.00 m/s2 (upper bound of CL2, EUR 23984 (2009)) below 72 realisations."
    )
    assert "93" not in sentence(few)
    assert note(few, EUR) == "no interval of the 95 % value, hence no verdict, below 72 realisations"
    tenth = replace(few, **valued(None, None, share=0.9))
    assert sentence(tenth).endswith(" below 36 realisations.")


@pytest.mark.parametrize(
    ("low", "high", "words"),
    [
        ("CL2", "CL2", ""),
        ("CL2", "CL3", " (the interval reaches into CL3)"),
        ("CL1", "CL2", " (the interval reaches into CL1)"),
        ("CL1", "CL3", " (the interval reaches into CL1 and CL3)"),
        ("CL1", "CL4", " (the interval reaches into CL1 and CL4)"),
    ],
)
def test_an_interval_that_leaves_the_class(low: str, high: str, words: str) -> None:
    text = sentence(judgement(class_low=low, class_high=high))
    assert f", class CL2 of EUR 23984 (2009){words}; the limit" in text


def test_ranges_are_not_called_classes() -> None:
    text = sentence(
        judgement(criterion="Setra (2006)", class_name="range 2", class_low="range 2", class_high="range 3")
    )
    assert ", range 2 of Setra (2006) (the interval reaches into range 3); the limit" in text
    assert "class" not in text


def test_the_class_of_a_short_record_is_the_best_there_may_be() -> None:
    short = judgement(short=True, whole=True, windows=1, window=60.0)
    assert ", at best class CL2 of EUR 23984 (2009);" in sentence(short)
    assert class_text(short) == "at best CL2"
    assert class_text(judgement()) == "CL2"
    assert class_text(judgement(class_name=None)) == "-"
    assert "at best" not in sentence(judgement())


@pytest.mark.parametrize(
    ("realisations", "windows", "share", "largest"),
    [
        (19, 1, 0.95, True),  # ceil(0.95 x 19) = 19
        (20, 1, 0.95, False),  # ceil(0.95 x 20) = 19
        (6, 3, 0.95, True),  # 18 windows
        (7, 3, 0.95, False),  # 21 windows
        (99, 1, 0.99, True),
        (100, 1, 0.99, False),
        (1, 1, 0.5, True),
        (2, 1, 0.5, False),
    ],
)
def test_the_largest_is_named_as_such(realisations: int, windows: int, share: float, largest: bool) -> None:
    few = judgement(realisations=realisations, windows=windows, **valued(None, None, share=share))
    usual = f"the {100 * share:g} % value of the peak"
    assert ("the largest peak" in sentence(few), usual in sentence(few)) == (largest, not largest)
    remark = f"so few windows that their largest stands for the {100 * share:g} % value, which may well be higher"
    assert (remark in note(few, EUR)) == largest


# ---------------------------------------------------------------- remarks


def test_no_remark_without_need() -> None:
    assert note(judgement(), EUR) == ""


@pytest.mark.parametrize(
    ("rest", "words"), [(180.0, "3 min"), (100.0, "100 s"), (0.51, "0.51 s"), (0.5, None), (0.0, None)]
)
def test_what_lies_in_no_window(rest: float, words: str | None) -> None:
    expected = "" if words is None else f"the last {words} of each record are in no window"
    assert note(judgement(rest=rest), EUR) == expected


def test_a_short_record() -> None:
    said = note(judgement(short=True, whole=True, window=60.0, verdict="undecided"), EUR)
    assert said == (
        "the record of 60 s is shorter than the comfort window of 4 min, in which peaks can only be higher: make "
        "duration at least 240 s"
    )


def test_too_few_realisations() -> None:
    said = note(judgement(realisations=71, **valued(None, None)), EUR)
    assert said == "no interval of the 95 % value, hence no verdict, below 72 realisations"
    # 0.99^368 = 0.0248 <= 0.025 < 0.99^367 = 0.0250 (computed)
    assert "99 % value, hence no verdict, below 368" in note(judgement(**valued(None, None, share=0.99)), EUR)
    assert 0.99**368 <= 0.025 < 0.99**367


def test_directions_and_other_percentiles() -> None:
    none = note(judgement(direction="longitudinal", class_name=None, limit=None, verdict=None, exceedance=None), EUR)
    assert none == "EUR 23984 (2009) has nothing to say of the longitudinal direction"
    median = note(judgement(**valued(0.7, 0.9, share=0.5), class_name=None), EUR)
    assert median == "a class goes with the 95 % value"
    assert note(judgement(criterion="EN 1990 Annex A2", class_name=None), CRITERIA["en-1990"]) == ""
    setra = note(judgement(direction="lateral", class_name="range 2"), CRITERIA["setra-2006"])
    assert setra == f"Setra (2006): {CRITERIA['setra-2006'].notes['lateral']}"


def test_undecided() -> None:
    share = Proportion(0.04, 0.02, 0.07, 250.0)
    assert note(judgement(verdict="undecided", needed=2000, exceedance=share), EUR) == (
        "if 4.0 % of the windows stay above the limit, 2,000 realisations decide in about half of all studies; a run "
        "that is extended until it decides is no longer 95 % sure"
    )
    near = judgement(verdict="undecided", exceedance=replace(share, value=0.05))
    assert note(near, EUR) == (
        "5.0 % of the windows are above the limit: so near 5.0 % that no number in reach would decide"
    )
    fifth = judgement(verdict="undecided", exceedance=replace(share, value=0.21), **valued(0.7, 1.1, share=0.8))
    assert "21 % of the windows are above the limit: so near 20 % that" in note(fifth, EUR)


def test_remarks_stand_one_after_another() -> None:
    few = judgement(realisations=5, windows=3, rest=30.0, **valued(None, None))
    parts = note(few, EUR).split("; ")
    assert [p.split()[0] for p in parts] == ["the", "no", "so"]


# ---------------------------------------------------------------- what more realisations buy


@pytest.mark.parametrize(
    ("value", "low", "high", "wanted", "words"),
    [
        (0.8, 0.75, 0.9, 980, "100 realisations give +-9.4 % on the 95 % value; +-3 % needs about 980."),
        (0.8, 0.656, 0.944, 3600, "100 realisations give +-18 % on the 95 % value; +-3 % needs about 3,600."),
        (0.8, 0.72, 0.88, 1200, "100 realisations give +-10 % on the 95 % value; +-3 % needs about 1,200."),
        (0.8, 0.01, 2.4, 250000, "100 realisations give +-149 % on the 95 % value; +-3 % needs about 250,000."),
        (0.8, 0.79, 0.81, 100, "100 realisations give +-1.3 % on the 95 % value."),
        (0.8, 0.79991, 0.80009, 72, "100 realisations give +-0.011 % on the 95 % value."),
    ],
)
def test_widths_have_no_power_of_ten(value: float, low: float, high: float, wanted: int, words: str) -> None:
    assert buys(judgement(**valued(low, high, value), wanted=wanted)) == words


def test_a_value_of_nothing() -> None:
    """Nobody on the deck in 95 % of the windows: no width relative to nothing."""
    none = buys(judgement(**valued(0.0, 0.0, 0.0), wanted=None))
    assert none == "The 95 % value is 0: nobody moved the deck in that share of the windows."
    median = buys(judgement(**valued(0.0, 0.2, 0.0, share=0.5), wanted=None))
    assert median.startswith("The 50 % value is 0:")


def test_a_first_interval() -> None:
    assert buys(judgement(**valued(None, None))) == "72 realisations give a first interval."
    assert buys(judgement(**valued(None, None, share=0.5))) == "6 realisations give a first interval."


# ---------------------------------------------------------------- numbers, shares, durations


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"), (-0.0, "0"), (0.1, "0.100"), (99.94, "99.9"), (999.6, "1,000"), (123456.0, "123,456"),
        (999999.0, "999,999"), (1e6, "1.00e+06"), (1e-4, "0.000100"), (9.99e-5, "9.99e-05"), (-0.5, "-0.500"),
    ],
)  # fmt: skip
def test_number(value: float, text: str) -> None:
    assert number(value) == text


@pytest.mark.parametrize(
    ("share", "text"),
    [
        (0.0, "0 %"), (1e-9, "under 0.01 %"), (0.99e-4, "under 0.01 %"), (1e-4, "0.010 %"), (0.001, "0.10 %"),
        (0.0099, "0.99 %"), (0.01, "1.0 %"), (0.0994, "9.9 %"), (0.1, "10 %"), (0.5, "50 %"), (0.989, "99 %"),
        (0.9895, "99.0 %"), (0.992, "99.2 %"), (0.999, "99.9 %"), (0.9991, "over 99.9 %"), (1.0, "100 %"),
    ],
)  # fmt: skip
def test_percent(share: float, text: str) -> None:
    assert percent(share) == text


def test_rounding_up_to_the_next_power_of_ten_adds_no_digit() -> None:
    assert [number(x) for x in (0.9996, 9.996, 99.96, 1.0, 10.0, 100.0)] == ["1.00", "10.0", "100"] * 2
    assert [percent(x) for x in (0.00996, 0.0996, 1.0 - 0.9)] == ["1.0 %", "10 %", "10 %"]


def test_percent_of_a_share_that_is_neither_never_reads_0_or_100() -> None:
    for power in range(1, 17):
        for share in (10.0**-power, 1.0 - 10.0**-power, 3.0 * 10.0**-power):
            assert percent(share) not in ("0 %", "100 %", "0.0 %", "100.0 %"), share


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (0.0, "0 s"), (0.25, "0.25 s"), (60.0, "60 s"), (89.9, "89.9 s"), (90.0, "90 s"), (120.0, "2 min"),
        (150.0, "150 s"), (599.0, "599 s"), (600.0, "10 min"), (750.0, "12.5 min"), (3600.0, "60 min"),
        (5400.0, "1.5 h"), (86400.0, "24 h"),
    ],
)  # fmt: skip
def test_span(seconds: float, text: str) -> None:
    assert span(seconds) == text


@pytest.mark.parametrize(
    ("value", "others", "text"),
    [
        (0.4912, (), "0.491"),
        (0.49996, (0.5,), "0.49996"),
        (0.4996, (0.5,), "0.4996"),  # as many as it takes, no more
        (0.500004, (0.5,), "0.500004"),
        (0.5, (0.5,), "0.500"),  # it is the bound
        (2.4999, (0.5, 1.0, 2.5), "2.4999"),
        (0.69996, (0.5, 1.0, 2.5, 0.7), "0.69996"),
    ],
)
def test_apart(value: float, others: tuple[float, ...], text: str) -> None:
    assert apart(value, others) == text
    assert apart(value, iter(others)) == text


def test_apart_where_rounding_up_reaches_the_next_power_of_ten() -> None:
    """1.000 beside 1.00 would be the same number in one digit more."""
    assert apart(0.99996, [0.5, 1.0, 2.5]) == "0.99996"
    assert apart(0.9996, [1.0]) == "0.9996"
    assert apart(9.9996, [10.0]) == "9.9996"


def test_apart_ends_at_six_digits() -> None:
    assert apart(0.499999999, [0.5]) == "0.500000"
    assert apart(0.499999, [0.5]) == "0.499999"
