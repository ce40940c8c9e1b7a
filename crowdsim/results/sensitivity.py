"""What the 95 % peak hangs on: the numbers of a sensitivity study, and their place in a results file."""

from __future__ import annotations

import json
import math
import os
import shutil
from collections.abc import Iterable
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from crowdsim.errors import ResultsError
from crowdsim.results.reader import _strings, open_file
from crowdsim.results.texts import number, span
from crowdsim.results.writer import _numbers, _text

GROUP = "sensitivity"
_COLUMNS = (("value", "m/s2"), ("change", "1"), ("low", "1"), ("high", "1"))
_WORDS = ("subject", "label", "source", "note")


@dataclass(frozen=True)
class Base:
    """The 95 % peak [m/s2] of the scenario as it stands; `low` and `high` None where there is no interval."""

    value: float
    low: float | None
    high: float | None


@dataclass(frozen=True)
class Varied:
    """The 95 % peak after one change.

    subject, label : what was changed, and how; source : where the other value comes from
    value : m/s2; change : relative to the base, 0.1 is 10 % more; low, high : its interval, realisation by realisation
    note : what else follows, or why there is no value (None)
    """

    subject: str
    label: str
    source: str
    value: float | None
    change: float | None
    low: float | None
    high: float | None
    note: str


@dataclass(frozen=True)
class Sensitivity:
    """One case in one direction, one change at a time.

    window : of the peaks [s]; variations : subject by subject, the weightiest first, as in `order`
    not_varied : what was left alone, and why
    """

    title: str
    case: str
    direction: str
    window: float
    realisations: int
    seed: int
    version: str
    base: Base
    variations: tuple[Varied, ...]
    order: tuple[str, ...]
    not_varied: tuple[str, ...]

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return {**asdict(self), "text": self.text()}

    def of(self, subject: str) -> tuple[Varied, ...]:
        """The variations of a subject."""
        return tuple(v for v in self.variations if v.subject == subject)

    def reach(self, subject: str) -> tuple[float, float] | None:
        """Least and largest change of a subject; None where nothing of it could be run."""
        changes = [v.change for v in self.of(subject) if v.change is not None]
        return (min(changes), max(changes)) if changes else None

    @property
    def sampling(self) -> tuple[float, float] | None:
        """The interval of the base relative to it: all that more realisations could remove."""
        if self.base.low is None or self.base.high is None:
            return None
        return self.base.low / self.base.value - 1.0, self.base.high / self.base.value - 1.0

    def text(self) -> str:
        """What the 95 % peak most depends on, in a sentence or two."""
        reached = {s: r for s in self.order if (r := self.reach(s)) is not None}
        if not reached:
            return f"{self.case}: no variation could be run."
        band = self.sampling
        small = 0.0 if band is None else 0.5 * (band[1] - band[0])
        heavy = [s for s, r in reached.items() if max(map(abs, r)) > small] or list(reached)[:1]
        light = [s for s in reached if s not in heavy]
        text = (
            f"The 95 % peak of {self.case} in {span(self.window)}, {number(self.base.value)} m/s2 from "
            f"{self.realisations:,} realisations, most depends on: "
            f"{', '.join(f'{s} ({span_of_change(reached[s])})' for s in heavy)}."
        )
        if light:
            text += (
                " Smaller than what chance leaves in it: "
                f"{', '.join(f'{s} ({span_of_change(reached[s])})' for s in light)}."
            )
        if band is not None:
            text += f" Chance leaves {span_of_change(band)}, all that more realisations could remove."
        return text

    def not_varied_text(self) -> str:
        """What was left alone, in a sentence."""
        return f"Not varied: {'; '.join(self.not_varied)}." if self.not_varied else ""


def ranked(variations: Iterable[Varied]) -> tuple[tuple[Varied, ...], tuple[str, ...]]:
    """The variations subject by subject, and the subjects, that with the largest change first.

    Subjects without a value come last; within a subject the order is kept.
    """
    variations = tuple(variations)
    weight: dict[str, float] = {}
    for v in variations:
        here = -1.0 if v.change is None else abs(v.change)
        weight[v.subject] = max(here, weight.get(v.subject, -1.0))
    order = tuple(sorted(weight, key=lambda s: -weight[s]))
    return tuple(v for s in order for v in variations if v.subject == s), order


def change_text(change: float) -> str:
    """A relative change in whole per cent, one digit more below one.

    >>> change_text(-0.447), change_text(0.12), change_text(0.004), change_text(-0.0001), change_text(1.5)
    ('-45 %', '+12 %', '+0.4 %', '0 %', '+150 %')
    """
    per_cent = 100.0 * change
    if abs(per_cent) < 0.05:
        return "0 %"
    return f"{per_cent:+.0f} %" if abs(per_cent) >= 0.95 else f"{per_cent:+.1f} %"


def span_of_change(reach: tuple[float, float]) -> str:
    """From the least to the largest change.

    >>> span_of_change((-0.447, 0.12)), span_of_change((0.12, 0.12))
    ('-45 to +12 %', '+12 %')
    """
    low, high = (change_text(x) for x in reach)
    return low if low == high else f"{low.removesuffix(' %')} to {high}"


def cases_for(path: str | Path, scenario: str) -> dict[str, str]:
    """Cases of a results file by name, with their keys; ResultsError where it is not of the scenario text given."""
    with open_file(path) as file:
        if str(file.attrs["scenario"]) != scenario:
            raise ResultsError(
                f"{path}: holds results of another scenario; run simulate with this one, or name its file"
            )
        return {str(group.attrs["name"]): key for key, group in file["cases"].items()}


def write_sensitivity(path: str | Path, scenario: str, result: Sensitivity) -> None:
    """Puts `result` into the results file at `path`, in place of an earlier one of the same case.

    scenario : the text of the scenario file that the study was run from

    The file is copied, the copy changed and moved into its place: it is whole at any time. Raises ResultsError for a
    file that is none of ours, of another scenario, without the case, or that cannot be written.
    """
    path = Path(path)
    names = cases_for(path, scenario)
    if result.case not in names:
        raise ResultsError(f"{path}: has no case {result.case!r}; cases there: {', '.join(names)}")
    temporary = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        shutil.copy(path, temporary)
        with h5py.File(temporary, "r+", libver=("v110", "v110")) as file:
            _write(file.require_group(GROUP), names[result.case], result)
        os.replace(temporary, path)
    except OSError as error:
        raise ResultsError(
            f"{path}: cannot be written in {path.parent.resolve()} ({error.strerror or 'not possible'})"
        ) from None
    finally:
        temporary.unlink(missing_ok=True)


def _write(parent: Any, key: str, result: Sensitivity) -> None:
    if key in parent:
        del parent[key]
    group = parent.create_group(key)
    group.attrs.update(
        {
            "title": result.title, "case": result.case, "direction": result.direction, "window": result.window,
            "realisations": result.realisations, "seed": result.seed, "crowdsim_version": result.version,
            "order": json.dumps(list(result.order)), "not_varied": json.dumps(list(result.not_varied)),
        }
    )  # fmt: skip
    base = result.base
    _numbers(group, "base", [_nan(x) for x in (base.value, base.low, base.high)], "m/s2")
    for name in _WORDS:
        _text(group, name, [getattr(v, name) for v in result.variations])
    for name, units in _COLUMNS:
        _numbers(group, name, np.array([_nan(getattr(v, name)) for v in result.variations], dtype=np.float64), units)


def _nan(value: float | None) -> float:
    return math.nan if value is None else value


def _none(value: float) -> float | None:
    return None if math.isnan(value) else float(value)


def read_sensitivity(path: str | Path) -> tuple[Sensitivity, ...]:
    """The sensitivity studies in a results file, in the order of its cases; none: an empty tuple.

    Raises ResultsError for a file that is none of ours.
    """
    with open_file(path) as file:
        studies = file.get(GROUP, {})
        return tuple(_read(studies[key]) for key in sorted(studies, key=int))


def _read(group: Any) -> Sensitivity:
    a = group.attrs
    words = [_strings(group[name]) for name in _WORDS]
    columns = [[_none(x) for x in group[name][()]] for name, _ in _COLUMNS]
    value, low, high = group["base"][()]
    return Sensitivity(
        title=str(a["title"]),
        case=str(a["case"]),
        direction=str(a["direction"]),
        window=float(a["window"]),
        realisations=int(a["realisations"]),
        seed=int(a["seed"]),
        version=str(a["crowdsim_version"]),
        base=Base(float(value), _none(low), _none(high)),
        variations=tuple(
            Varied(subject, label, source, number, change, lower, upper, note)
            for subject, label, source, note, number, change, lower, upper in zip(*words, *columns, strict=True)
        ),
        order=tuple(json.loads(a["order"])),
        not_varied=tuple(json.loads(a["not_varied"])),
    )
