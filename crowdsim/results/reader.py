"""Reads a results file into memory and closes it."""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from crowdsim.errors import ResultsError
from crowdsim.results.writer import FORMAT, FORMAT_VERSION

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class PointTable:
    """Where response was recorded."""

    name: tuple[str, ...]
    s: Floats
    e: Floats
    direction: tuple[str, ...]


@dataclass(frozen=True)
class History:
    """One kept realisation: time [s] from time 0, acceleration [step, point] [m/s2]."""

    time: Floats
    acceleration: Floats


@dataclass(frozen=True, repr=False)
class CaseResults:
    """One case.

    peak, rms, running_rms_max, peak_time : [realisation, point]
    window_peak : [realisation, window, point]; crossings : [realisation]
    envelope : by direction, [realisation, e, s]; deck_s, deck_e [m]
    deck_window_peak : by direction, [realisation, window], the largest anywhere on the deck
    """

    name: str
    attributes: dict[str, Any]
    assumptions: tuple[str, ...]
    points: PointTable
    peak: Floats
    rms: Floats
    running_rms_max: Floats
    peak_time: Floats
    window_peak: Floats
    crossings: NDArray[np.int64]
    deck_s: Floats
    deck_e: Floats
    envelope: dict[str, Floats]
    deck_window_peak: dict[str, Floats]
    histories: dict[int, History] = field(default_factory=dict)

    @property
    def realisations(self) -> int:
        """How many."""
        return int(self.peak.shape[0])

    def __repr__(self) -> str:
        return f"<case {self.name!r}: {self.realisations} realisations, points {', '.join(self.points.name)}>"


@dataclass(frozen=True, repr=False)
class Results:
    """A results file."""

    scenario: str
    seed: int
    version: str
    findings: tuple[str, ...]
    fingerprint: dict[str, str]
    run: dict[str, Any]
    cases: tuple[CaseResults, ...]

    def case(self, name: str) -> CaseResults:
        """The case called `name`. Raises KeyError."""
        for c in self.cases:
            if c.name == name:
                return c
        raise KeyError(f"no case {name!r}; there are {', '.join(repr(c.name) for c in self.cases)}")

    def __repr__(self) -> str:
        return f"<crowdsim results: {', '.join(map(repr, self.cases))}>"


def open_file(path: str | Path) -> Any:
    """The file, checked to be one of ours, open for reading. Raises ResultsError."""
    if not Path(path).is_file():
        raise ResultsError(f"{path}: no such file; a results file of crowdsim simulate is wanted")
    try:
        file = h5py.File(path, "r")
    except OSError as error:
        if str(path).lower().endswith(".toml"):
            raise ResultsError(f"{path}: a scenario, no results file; run simulate first") from None
        raise ResultsError(f"{path}: no HDF5 file, or a damaged one ({error})") from None
    if file.attrs.get("format") != FORMAT:
        file.close()
        raise ResultsError(f"{path}: not a results file of crowdsim")
    version = int(file.attrs.get("format_version", 0))
    if version < 1 or "cases" not in file:
        file.close()
        raise ResultsError(f"{path}: a damaged results file: format_version or cases are missing")
    if version > FORMAT_VERSION:
        file.close()
        raise ResultsError(
            f"{path}: written in format {version}; this program reads up to {FORMAT_VERSION}. Update crowdsim"
        )
    if any("criterion" not in case.attrs for case in file["cases"].values()):
        file.close()
        raise ResultsError(f"{path}: written by an earlier state of this version; run simulate again")
    return file


def _strings(data: Any) -> tuple[str, ...]:
    return tuple(v.decode() if isinstance(v, bytes) else str(v) for v in data[()])


def open_results(path: str | Path) -> Results:
    """Everything in a results file. Raises ResultsError for a file that is none of ours."""
    with open_file(path) as file:
        return Results(
            scenario=str(file.attrs["scenario"]),
            seed=int(file.attrs["seed"]),
            version=str(file.attrs["crowdsim_version"]),
            findings=tuple(json.loads(file.attrs["findings"])),
            fingerprint=json.loads(file.attrs["fingerprint"]),
            run={k: v.item() if hasattr(v, "item") else v for k, v in file["run"].attrs.items()},
            cases=tuple(_case(file["cases"][k]) for k in sorted(file["cases"], key=int)),
        )


def _case(group: Any) -> CaseResults:
    rows, deck = group["realisations"], group["deck"]
    directions = [k for k in deck if isinstance(deck[k], h5py.Group)]
    attributes = dict(group.attrs)
    return CaseResults(
        name=str(attributes["name"]),
        attributes=attributes,
        assumptions=tuple(json.loads(attributes["assumptions"])),
        points=PointTable(
            _strings(group["points/name"]), group["points/s"][()], group["points/e"][()],
            _strings(group["points/direction"]),
        ),
        peak=rows["peak"][()],
        rms=rows["rms"][()],
        running_rms_max=rows["running_rms_max"][()],
        peak_time=rows["peak_time"][()],
        window_peak=rows["window_peak"][()],
        crossings=rows["crossings"][()],
        deck_s=deck["s"][()],
        deck_e=deck["e"][()],
        envelope={d: deck[d]["peak_envelope"][()] for d in directions},
        deck_window_peak={d: deck[d]["window_peak"][()] for d in directions},
        histories={
            int(k): History(h["time"][()], h["acceleration"][()]) for k, h in group.get("histories", {}).items()
        },
    )  # fmt: skip
