"""The summary of a results file, computed from the file piece by piece: memory does not grow with it."""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from crowdsim.response.statistics import (
    Distribution1D,
    MeanSquare,
    Percentile,
    describe,
    percentile_rank,
    root_mean_square,
)
from crowdsim.response.windows import Proportion, window_exceedance, window_percentile
from crowdsim.results.judgement import LOADED, Judgement, Question, asked, judge
from crowdsim.results.reader import _strings, open_file

_SLAB = 2_000_000  # numbers of the envelope in memory at a time


@dataclass(frozen=True)
class PointSummary:
    """Response at one recorded point.

    peak, rms, running_rms_max : over the whole record; rms_of_all: over all records together
    window_peak : in a comfort window
    exceedance, window_exceedance : of the limit that the case asks for, None without one
    """

    name: str
    s: float
    e: float
    direction: str
    peak: Distribution1D
    rms: Distribution1D
    rms_of_all: MeanSquare
    running_rms_max: Distribution1D
    window_peak: Percentile | None
    exceedance: Proportion | None
    window_exceedance: Proportion | None


@dataclass(frozen=True)
class DeckSummary:
    """The largest peak anywhere on the deck in one direction.

    s, e : where the 95 % value of the peak is largest in this run; s_within, e_within: from where to where along the
    deck, and on which lines, it lies within the interval of that
    judgement : class and verdict; None in a direction in which no force acts
    """

    direction: str
    s: float
    e: float
    s_within: tuple[float, float]
    e_within: tuple[float, ...]
    peak: Distribution1D
    judgement: Judgement | None


@dataclass(frozen=True)
class CaseSummary:
    """One case in numbers. lines : along the deck, on which the response was sought."""

    name: str
    realisations: int
    duration: float
    warm_up: float
    time_step: float
    target: str | None
    limit: float | None
    persons_on_deck: float
    lines: int
    crossings_mean: float
    points: tuple[PointSummary, ...]
    deck: tuple[DeckSummary, ...]
    modes: tuple[dict[str, Any], ...]
    assumptions: tuple[str, ...]


@dataclass(frozen=True)
class Summary:
    """A run in numbers. complete, asked : whether it was finished, and how many realisations were asked for."""

    title: str
    seed: int
    version: str
    file: str
    findings: tuple[str, ...]
    cases: tuple[CaseSummary, ...]
    complete: bool
    asked: int

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return asdict(self)


def summarise(path: str | Path, title: str, *, percentile: float = 0.95, limit: float | None = None) -> Summary:
    """The summary of the results file at `path`. Raises ResultsError.

    percentile : of the judged peak, in place of 95 %; limit [m/s2] : in place of what the cases ask
    """
    question = Question(percentile, limit)
    with open_file(path) as file:
        return Summary(
            title=title,
            seed=int(file.attrs["seed"]),
            version=str(file.attrs["crowdsim_version"]),
            file=str(path),
            findings=tuple(json.loads(file.attrs["findings"])),
            cases=tuple(_case(file["cases"][k], question) for k in sorted(file["cases"], key=int)),
            complete=bool(file["run"].attrs.get("complete", True)),
            asked=int(file["run"].attrs.get("asked", 0)),
        )


def _case(group: Any, question: Question) -> CaseSummary:
    rows, place = group["realisations"], group["points"]
    names, directions = _strings(place["name"]), _strings(place["direction"])
    modes = group["modes"]
    keys = ("frequency", "damping", "modal_mass", "added_mass")
    return CaseSummary(
        name=str(group.attrs["name"]),
        realisations=int(rows["peak"].shape[0]),
        duration=float(group.attrs["duration"]),
        warm_up=float(group.attrs["warm_up"]),
        time_step=float(group.attrs["time_step"]),
        target=str(group.attrs["target"]) if "target" in group.attrs else None,
        limit=float(group.attrs["limit"]) if "limit" in group.attrs else None,
        persons_on_deck=float(group.attrs["persons_on_deck"]),
        lines=int(group["deck/e"].shape[0]),
        crossings_mean=float(np.mean(rows["crossings"][()])),
        points=tuple(_point(group, question, i, names[i], directions[i]) for i in range(len(names))),
        deck=tuple(
            _deck(d, group, question) for d in dict.fromkeys(directions) if isinstance(group["deck"].get(d), h5py.Group)
        ),
        modes=tuple(
            {"name": n, **{k: float(modes[k][i]) for k in keys}} for i, n in enumerate(_strings(modes["name"]))
        ),
        assumptions=tuple(json.loads(group.attrs["assumptions"])),
    )  # fmt: skip


def _point(group: Any, question: Question, i: int, name: str, direction: str) -> PointSummary:
    rows, place = group["realisations"], group["points"]
    peak, windows = rows["peak"][:, i], rows["window_peak"][:, :, i]
    limit = asked(dict(group.attrs), direction, question.limit).limit if direction in LOADED else None
    return PointSummary(
        name=name,
        s=float(place["s"][i]),
        e=float(place["e"][i]),
        direction=direction,
        peak=describe(peak),
        rms=describe(rows["rms"][:, i]),
        rms_of_all=root_mean_square(rows["rms"][:, i]),
        running_rms_max=describe(rows["running_rms_max"][:, i]),
        window_peak=window_percentile(windows, question.percentile) if windows.size else None,
        exceedance=None if limit is None else window_exceedance(peak, limit),
        window_exceedance=window_exceedance(windows, limit) if limit is not None and windows.size else None,
    )


def _deck(direction: str, group: Any, question: Question) -> DeckSummary:
    deck = group["deck"]
    data = deck[direction]["peak_envelope"]
    count, across, along = data.shape
    largest = np.zeros(count)
    rank = percentile_rank(count, 0.95) - 1
    values = np.zeros((across, along))
    columns = max(1, _SLAB // max(count, 1))
    for e in range(across):
        for s in range(0, along, columns):
            slab = data[:, e, s : s + columns]
            largest = np.maximum(largest, slab.max(axis=1))
            values[e, s : s + columns] = np.partition(slab, rank, axis=0)[rank]
    i, j = np.unravel_index(int(np.argmax(values)), values.shape)
    low = describe(data[:, int(i), int(j)]).p95.low
    lines, places = np.nonzero(values >= (values[i, j] if low is None else low))
    s, e = deck["s"][()], deck["e"][()]
    judged = None
    if direction in LOADED:
        judged = judge(dict(group.attrs), direction, deck[direction]["window_peak"][()], largest, question)
    return DeckSummary(
        direction, float(s[j]), float(e[i]), (float(s[places].min()), float(s[places].max())),
        tuple(float(x) for x in e[np.unique(lines)]), describe(largest), judged,
    )  # fmt: skip
