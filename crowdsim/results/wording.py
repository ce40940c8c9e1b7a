"""A judgement in words: the sentence for a report, the remarks, what more realisations would buy."""

from __future__ import annotations

from typing import TYPE_CHECKING

from crowdsim.guides.criterion import Criterion
from crowdsim.response.statistics import least_for_interval, percentile_rank
from crowdsim.response.verdict import relative_half_width
from crowdsim.results.texts import number, percent, span

if TYPE_CHECKING:
    from crowdsim.results.judgement import Judgement


def sentence(found: Judgement) -> str:
    """Ready to paste: percentile, window, case, value, interval, class, limit, verdict."""
    value = found.value
    number_of = f"{found.realisations:,} simulated realisation{'s' if found.realisations != 1 else ''}"
    if found.windows > 1:
        number_of += f" of {found.windows} windows each"
    interval = (
        f"95 % confidence interval {number(value.low)} to {number(value.high)} m/s2"
        if value.low is not None and value.high is not None
        else "no confidence interval"
    )
    what = "largest" if _is_largest(found) else f"{100 * value.share:g} % value of the"
    text = (
        f"{found.case}: the {what} peak {found.direction} acceleration anywhere on the deck in {span(found.window)} is "
        f"{found.shown} m/s2 ({interval}, from {number_of}){_class(found)}"
    )
    if found.verdict is None:
        return text + "."
    if found.value.low is None:
        least = least_for_interval(found.value.share)
        limit = f"{number(found.limit or 0.0)} m/s2 ({found.limit_words})"
        return f"{text}; no verdict on the limit of {limit} below {least} realisations."
    state = {"met": "is met", "not met": "is not met"}.get(
        found.verdict, "is neither shown to be met nor to be exceeded"
    )
    text += f"; the limit of {number(found.limit or 0.0)} m/s2 ({found.limit_words}) {state}"
    if found.needed is not None:
        text += f" (about {found.needed:,} realisations would decide, as likely as not)"
    return text + "."


def class_text(found: Judgement) -> str:
    """The class in short: at best, where the record is shorter than the window."""
    return "-" if found.class_name is None else f"{'at best ' if found.short else ''}{found.class_name}"


def _class(found: Judgement) -> str:
    if found.class_name is None:
        return ""
    kind = "class " if found.class_name.startswith("CL") else ""
    text = f", {'at best ' if found.short else ''}{kind}{found.class_name} of {found.criterion}"
    ends = {c for c in (found.class_low, found.class_high) if c is not None} - {found.class_name}
    if ends:
        text += f" (the interval reaches into {' and '.join(sorted(ends))})"
    return text


def _is_largest(found: Judgement) -> bool:
    count = found.realisations * found.windows
    return percentile_rank(count, found.value.share) >= count


def note(found: Judgement, criterion: Criterion) -> str:
    """What goes with it: records too short, directions without classes, what would decide."""
    share = f"{100 * found.value.share:g} %"
    notes = []
    if found.short:
        notes.append(
            f"the record of {span(found.window)} is shorter than the comfort window of {span(found.asked_window)}, in "
            f"which peaks can only be higher: make duration at least {number(found.asked_window)} s"
        )
    if found.rest > 0.5:
        notes.append(f"the last {span(found.rest)} of each record are in no window")
    if found.direction not in criterion.bounds:
        notes.append(f"{criterion.title} has nothing to say of the {found.direction} direction")
    elif found.direction in criterion.notes:
        notes.append(f"{criterion.title}: {criterion.notes[found.direction]}")
    if found.value.low is None:
        least = least_for_interval(found.value.share)
        notes.append(f"no interval of the {share} value, hence no verdict, below {least} realisations")
    if _is_largest(found):
        notes.append(f"so few windows that their largest stands for the {share} value, which may well be higher")
    if found.class_name is None and criterion.classes and found.direction in criterion.bounds:
        notes.append("a class goes with the 95 % value")
    if (
        found.verdict == "undecided"
        and not found.short
        and found.value.low is not None
        and found.exceedance is not None
    ):
        notes.append(_undecided(found, percent(found.exceedance.value), percent(1.0 - found.value.share)))
    return "; ".join(notes)


def _undecided(found: Judgement, above: str, near: str) -> str:
    if found.needed is None:
        return f"{above} of the windows are above the limit: so near {near} that no number in reach would decide"
    return (
        f"if {above} of the windows stay above the limit, {found.needed:,} realisations decide in about half of all "
        "studies; a run that is extended until it decides is no longer 95 % sure"
    )


def buys(found: Judgement) -> str:
    """What more realisations would buy, as a sentence."""
    if found.value.low is None:
        return f"{least_for_interval(found.value.share)} realisations give a first interval."
    half = relative_half_width(found.value)
    share = f"{100 * found.value.share:g} %"
    if half is None:
        return f"The {share} value is 0: nobody moved the deck in that share of the windows."
    text = f"{found.realisations:,} realisations give +-{_percent(half)} on the {share} value"
    if half <= 0.03 or found.wanted is None:
        return text + "."
    return f"{text}; +-3 % needs about {found.wanted:,}."


def _percent(share: float) -> str:
    return f"{100 * share:.0f} %" if share >= 0.1 else f"{max(100 * share, 0.01):.2g} %"
