"""From the peaks of a case to its class, verdict and the sentence for a report."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from crowdsim.guides.catalogue import CRITERIA
from crowdsim.guides.criterion import Criterion
from crowdsim.response.statistics import Percentile, least_for_interval, percentile_rank
from crowdsim.response.verdict import (
    Verdict,
    realisations_for_width,
    realisations_to_decide,
    relative_half_width,
    verdict,
)
from crowdsim.response.windows import Proportion, window_exceedance, window_percentile, window_share
from crowdsim.results.texts import number, percent, span

Floats = NDArray[np.float64]
CLASS_SHARE = 0.95  # the percentile of the peak whose class is the case's
LOADED = ("vertical",)  # directions in which forces act in this version; others are not judged


@dataclass(frozen=True)
class Asked:
    """What a case asks of one direction.

    limit [m/s2], None: nothing is asked, or the source has nothing to say; words: whose limit
    """

    criterion: Criterion
    target: str | None
    limit: float | None
    words: str


@dataclass(frozen=True)
class Question:
    """What is asked beside the scenario: another percentile, another limit [m/s2]."""

    percentile: float = 0.95
    limit: float | None = None


@dataclass(frozen=True)
class Judgement:
    """One case in one direction: the peak anywhere on the deck in a comfort window, judged.

    value : 95 % value of the peak in `window` [s], m/s2; `whole`: the window is the whole record
    short : no whole window fits the record, which is judged instead: a peak can only be higher
    class_name : of the criterion, None where the source has none for this direction
    chances : share of windows whose peak lies in each class; exceedance: of the limit
    needed : realisations that would decide; wanted : those for an interval of +-3 %
    """

    case: str
    direction: str
    realisations: int
    windows: int
    window: float
    whole: bool
    short: bool
    value: Percentile
    criterion: str
    class_name: str | None
    class_words: str
    chances: tuple[tuple[str, Proportion], ...]
    target: str | None
    limit: float | None
    limit_words: str
    exceedance: Proportion | None
    verdict: Verdict | None
    needed: int | None
    wanted: int | None
    note: str
    sentence: str


def asked(attributes: dict[str, Any], direction: str, limit: float | None = None) -> Asked:
    """What the attributes of a case ask of a direction; `limit` [m/s2] in place of that."""
    criterion = CRITERIA[str(attributes["criterion"])]
    target = str(attributes["target"]) if "target" in attributes else None
    if limit is not None:
        return Asked(criterion, None, limit, "given")
    if "limit" in attributes:
        return Asked(criterion, None, float(attributes["limit"]), "the owner's")
    if target is not None:
        bound = criterion.limit(direction, target)
        return Asked(criterion, target, bound, f"upper bound of {target}, {criterion.title}")
    if not criterion.classes:
        return Asked(criterion, None, criterion.limit(direction), criterion.title)
    return Asked(criterion, None, None, "")


def judge(
    attributes: dict[str, Any],
    direction: str,
    window_peaks: Floats,
    record_peaks: Floats,
    question: Question = Question(),
) -> Judgement:
    """Judges one direction of a case.

    Parameters
    ----------
    attributes : of the case in the results file
    window_peaks : [realisation, window] largest anywhere on the deck; no column where none fits
    record_peaks : [realisation] the same over the whole record
    """
    short = window_peaks.shape[1] == 0
    peaks = record_peaks[:, None] if short else window_peaks
    duration, window = float(attributes["duration"]), float(attributes["window"])
    wants = asked(attributes, direction, question.limit)
    value = window_percentile(peaks, question.percentile)
    count = peaks.shape[0]
    exceedance = None if wants.limit is None else window_exceedance(peaks, wants.limit)
    says, needed = _verdict(value, wants.limit, exceedance, count, short)
    name = wants.criterion.classify(value.value, direction) if value.share == CLASS_SHARE else None
    notes = _notes(wants, direction, short, duration, window, exceedance, value, says, needed, count)
    common: dict[str, Any] = {
        "case": str(attributes["name"]), "direction": direction, "realisations": count, "windows": peaks.shape[1],
        "window": duration if short else window, "whole": short or window >= duration - 1e-9, "short": short,
    }  # fmt: skip
    return Judgement(
        **common,
        value=value,
        criterion=wants.criterion.title,
        class_name=name,
        class_words=wants.criterion.words[wants.criterion.classes.index(name)] if name else "",
        chances=chances(wants.criterion, direction, peaks),
        target=wants.target,
        limit=wants.limit,
        limit_words=wants.words,
        exceedance=exceedance,
        verdict=says,
        needed=needed,
        wanted=realisations_for_width(value, count, 0.03),
        note="; ".join(notes),
        sentence=_sentence(common, value, name, wants, says, needed),
    )


def chances(criterion: Criterion, direction: str, peaks: Floats) -> tuple[tuple[str, Proportion], ...]:
    """The share of windows whose peak lies in each class; none where the source has no classes."""
    if not criterion.classes or direction not in criterion.bounds:
        return ()
    edges = (0.0, *criterion.bounds[direction], np.inf)
    return tuple(
        (name, window_share(peaks, low, high))
        for name, low, high in zip(criterion.classes, edges[:-1], edges[1:], strict=True)
    )


def _verdict(
    value: Percentile, limit: float | None, exceedance: Proportion | None, count: int, short: bool
) -> tuple[Verdict | None, int | None]:
    if limit is None or exceedance is None:
        return None, None
    says = verdict(value, limit)
    if short and says == "met":
        return "undecided", None
    if says != "undecided":
        return says, None
    return says, None if short else realisations_to_decide(exceedance, count, value.share)


def _notes(
    wants: Asked, direction: str, short: bool, duration: float, window: float, exceedance: Proportion | None,
    value: Percentile, says: Verdict | None, needed: int | None, count: int,
) -> list[str]:  # fmt: skip
    notes = []
    if short:
        notes.append(
            f"the record of {span(duration)} is shorter than the comfort window of {span(window)}, in which peaks can "
            f"only be higher: make duration at least {number(window)} s"
        )
    if direction not in wants.criterion.bounds:
        notes.append(f"{wants.criterion.title} has nothing to say of the {direction} direction")
    elif direction in wants.criterion.notes:
        notes.append(f"{wants.criterion.title}: {wants.criterion.notes[direction]}")
    least = least_for_interval(value.share)
    if count < least:
        notes.append(f"no interval of the {100 * value.share:g} % value, hence no verdict, below {least} realisations")
    if value.share != CLASS_SHARE and direction in wants.criterion.bounds and wants.criterion.classes:
        notes.append(f"a class goes with the {100 * CLASS_SHARE:g} % value")
    if says == "undecided" and not short and exceedance is not None:
        above, near = percent(exceedance.value), percent(1.0 - value.share)
        notes.append(
            f"about {needed:,} realisations would decide, if {above} of the windows stay above the limit"
            if needed is not None
            else f"{above} of the windows are above the limit: so near {near} that no number in reach would decide"
        )
    return notes


def _sentence(
    common: dict[str, Any], value: Percentile, name: str | None, wants: Asked, says: Verdict | None, needed: int | None
) -> str:
    """Ready to paste: percentile, window, case, value, interval, class, limit, verdict."""
    count = common["realisations"] * common["windows"]
    many = percentile_rank(count, value.share) < count
    number_of = f"{common['realisations']:,} simulated realisation{'s' if common['realisations'] != 1 else ''}"
    if common["windows"] > 1:
        number_of += f" of {common['windows']} windows each"
    interval = (
        f"95 % confidence interval {number(value.low)} to {number(value.high)} m/s2"
        if value.low is not None and value.high is not None
        else "no confidence interval"
    )
    what = f"{100 * value.share:g} % value of the" if many else "largest"
    text = (
        f"{common['case']}: the {what} peak {common['direction']} acceleration anywhere on the deck in "
        f"{span(common['window'])} is {number(value.value)} m/s2 ({interval}, from {number_of})"
    )
    if name:
        text += f", {'class ' if name.startswith('CL') else ''}{name} of {wants.criterion.title}"
    if says is None:
        return text + "."
    state = {"met": "is met", "not met": "is not met"}.get(says, "is neither shown to be met nor to be exceeded")
    text += f"; the limit of {number(wants.limit or 0.0)} m/s2 ({wants.words}) {state}"
    if needed is not None:
        text += f" (about {needed:,} realisations would decide)"
    return text + "."


def buys(judgement: Judgement) -> str:
    """What more realisations would buy, as a sentence."""
    half = relative_half_width(judgement.value)
    if half is None:
        return f"{least_for_interval(judgement.value.share)} realisations give a first interval."
    share = f"{100 * judgement.value.share:g} %"
    text = f"{judgement.realisations:,} realisations give +-{100 * half:.2g} % on the {share} value"
    if half <= 0.03 or judgement.wanted is None:
        return text + "."
    return f"{text}; +-3 % needs about {judgement.wanted:,}."
