"""A figure of a results file, saved: checks what was asked, draws, moves the picture into place whole."""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from matplotlib.axes import Axes

from crowdsim.errors import ResultsError
from crowdsim.plots.envelope import envelope
from crowdsim.plots.exceedance import FAMILIES, exceedance
from crowdsim.plots.save import check_place, check_width, save
from crowdsim.plots.style import WIDTH, styled
from crowdsim.results.reader import CaseResults, Results, open_results


@dataclass(frozen=True)
class Wish:
    """What a figure is drawn from."""

    results: Results
    case: CaseResults
    point: str | None
    fit: str | None
    marks: Sequence[tuple[str, float]]
    width: float
    foot: str


def _history(wish: Wish) -> Axes:
    from crowdsim.plots.history import chosen, history
    from crowdsim.study.again import case_again, persons_on_deck

    realisation, _ = chosen(wish.case, None, wish.point)
    persons = persons_on_deck(case_again(wish.results, wish.case.name), realisation)
    return history(wish.case, persons, realisation=realisation, point=wish.point, width=wish.width, foot=wish.foot)


def _envelope(wish: Wish) -> Axes:
    return envelope(wish.case, width=wish.width, foot=wish.foot)


def _exceedance(wish: Wish) -> Axes:
    family = FAMILIES[wish.fit] if wish.fit else None
    return exceedance(wish.case, family=family, marks=wish.marks, width=wish.width, foot=wish.foot)


def _modes(wish: Wish) -> Axes:
    from crowdsim.plots.modes import modes
    from crowdsim.study.again import case_again

    return modes(case_again(wish.results, wish.case.name), width=wish.width, foot=wish.foot)


def _people(wish: Wish) -> Axes:
    from crowdsim.plots.people import people
    from crowdsim.study.again import case_again

    again = case_again(wish.results, wish.case.name)
    return people(again, wish.case.realisations, width=wish.width, foot=wish.foot)


FIGURES: dict[str, Callable[[Wish], Axes]] = {
    "history": _history,
    "envelope": _envelope,
    "exceedance": _exceedance,
    "modes": _modes,
    "people": _people,
}


def draw(
    path: str | Path,
    what: str,
    out: str | Path,
    *,
    case: str | None = None,
    point: str | None = None,
    fit: str | None = None,
    marks: Sequence[tuple[str, float]] = (),
    width: float = WIDTH,
) -> Path:
    """Draws the figure `what` of the results file `path` and saves it as `out`; gives where.

    Parameters
    ----------
    what : one of FIGURES; out : ends in png, svg or pdf, overwritten where it exists
    case : default the first; point : of the history, default that with the largest peak
    fit : "gumbel" or "gev", of the exceedance; marks : (name, m/s2) above the exceedance
    width : of the figure [mm], 60 to 400; the text keeps its size

    Raises ResultsError for anything of this that cannot be done; nothing half written stays behind.
    """
    place = Path(out)
    _check(what, place, point, fit, marks, width)
    results = open_results(path)
    chosen = _case(results, case)
    if point is not None and point not in chosen.points.name:
        known = ", ".join(chosen.points.name)
        raise ResultsError(f"no point is called {point!r}; points of case {chosen.name!r}: {known}")
    wish = Wish(results, chosen, point, fit, marks, width, _foot(results, chosen))
    with styled():
        save(FIGURES[what](wish), place, wish.foot)
    return place


def _check(
    what: str, place: Path, point: str | None, fit: str | None, marks: Sequence[tuple[str, float]], width: float
) -> None:
    if what not in FIGURES:
        raise ResultsError(f"no figure is called {what!r}; known: {', '.join(FIGURES)}")
    check_place(place)
    check_width(width)
    if point is not None and what != "history":
        raise ResultsError(f"a point is for the figure 'history', not {what!r}")
    if fit is not None and fit not in FAMILIES:
        raise ResultsError(f"no law is called {fit!r}; known: {', '.join(FAMILIES)}")
    if what != "exceedance" and (fit is not None or marks):
        raise ResultsError(f"a fit and marks are for the figure 'exceedance', not {what!r}")


def _case(results: Results, name: str | None) -> CaseResults:
    if not results.cases:
        raise ResultsError("no case is in the file: nothing to draw")
    if name is None:
        return results.cases[0]
    try:
        return results.case(name)
    except KeyError:
        known = ", ".join(repr(c.name) for c in results.cases)
        raise ResultsError(f"no case is called {name!r}; cases in the file: {known}") from None


def _foot(results: Results, case: CaseResults) -> str:
    title = tomllib.loads(results.scenario).get("scenario", {}).get("title", "untitled")
    count = case.realisations
    of = f"{count:,} realisation{'s' if count != 1 else ''}"
    if not results.run.get("complete", True):
        of = f"INCOMPLETE, {count:,} of {results.run.get('asked', 0):,} realisations"
    return f"{title} \u00b7 case {case.name} \u00b7 seed {results.seed} \u00b7 {of} \u00b7 crowdsim {results.version}"
