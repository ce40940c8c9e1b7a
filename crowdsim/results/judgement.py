"""From the peaks of a case to its class, verdict and the sentence for a report."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from crowdsim.guides.catalogue import CRITERIA
from crowdsim.guides.criterion import Criterion
from crowdsim.response.statistics import Percentile
from crowdsim.response.verdict import Verdict, realisations_for_width, realisations_to_decide, verdict
from crowdsim.response.windows import Proportion, window_exceedance, window_percentile, window_share
from crowdsim.results import wording
from crowdsim.results.texts import apart

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
    asked_window : the comfort window of the case; rest : of each record in no window [s]
    shown : the value in as many digits as keep it apart from bounds
    class_name : of the criterion, None where the source has none for this direction; class_low and
    class_high : those of the interval's ends
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
    asked_window: float
    rest: float
    value: Percentile
    shown: str
    criterion: str
    class_name: str | None
    class_words: str
    class_low: str | None
    class_high: str | None
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
        return Asked(criterion, None, limit, "as specified")
    if "limit" in attributes:
        return Asked(criterion, None, float(attributes["limit"]), "as specified")
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
    criterion = wants.criterion
    judged = value.share == CLASS_SHARE
    name = criterion.classify(value.value, direction) if judged else None
    low, high = (
        criterion.classify(end, direction) if judged and end is not None else None for end in (value.low, value.high)
    )
    bounds = (*criterion.bounds.get(direction, ()), *(() if wants.limit is None else (wants.limit,)))
    found = Judgement(
        case=str(attributes["name"]), direction=direction, realisations=count, windows=peaks.shape[1],
        window=duration if short else window, whole=short or window >= duration - 1e-9, short=short,
        asked_window=window, rest=0.0 if short else max(0.0, duration - peaks.shape[1] * window),
        value=value, shown=apart(value.value, bounds),
        criterion=criterion.title, class_name=name,
        class_words=criterion.words[criterion.classes.index(name)] if name else "", class_low=low, class_high=high,
        chances=chances(criterion, direction, peaks), target=wants.target, limit=wants.limit,
        limit_words=wants.words, exceedance=exceedance, verdict=says, needed=needed,
        wanted=realisations_for_width(value, count, 0.03), note="", sentence="",
    )  # fmt: skip
    return replace(found, note=wording.note(found, criterion), sentence=wording.sentence(found))


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
