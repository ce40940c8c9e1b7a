"""Writes the results file: under a temporary name, moved into place whole."""

from __future__ import annotations

import json
import os
import platform
import socket
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from types import TracebackType
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

import crowdsim
from crowdsim.errors import ResultsError

Floats = NDArray[np.float64]
FORMAT = "crowdsim results"
FORMAT_VERSION = 1
_BUFFER = 256  # rows
_BUFFER_BYTES = 16_000_000
_ACCELERATION = "m/s2"


@dataclass(frozen=True)
class CaseHead:
    """What the file says of a case beside its numbers.

    points : (name, s, e, direction); the envelope runs over directions, deck_e and deck_s
    modes : (name, frequency, damping, modal mass as simulated, added mass)
    """

    name: str
    time_step: float
    warm_up: float
    duration: float
    window: float
    windows: int
    criterion: str
    people: str
    persons: float
    points: Sequence[tuple[str, float, float, str]]
    directions: Sequence[str]
    deck_s: Floats
    deck_e: Sequence[float]
    modes: Sequence[tuple[str, float, float, float, float]]
    assumptions: Sequence[str]
    target: str | None
    limit: float | None
    step: dict[str, float]


def fingerprint() -> dict[str, str]:
    """What the last bit of a number depends on beside the scenario and the seed."""
    import llvmlite
    import llvmlite.binding
    import numba

    features = llvmlite.binding.get_host_cpu_features()
    return {
        "machine": platform.machine(),
        "fused_multiply_add": str(
            bool(features.get("fma", False)) or platform.machine().lower() in ("aarch64", "arm64")
        ),
        "numpy": np.__version__,
        "numba": numba.__version__,
        "llvmlite": llvmlite.__version__,
    }


def _text(group: Any, name: str, values: Sequence[str]) -> None:
    data = group.create_dataset(name, data=list(values), dtype=h5py.string_dtype())
    data.attrs["units"] = ""


def _numbers(group: Any, name: str, values: Any, units: str) -> None:
    data = group.create_dataset(name, data=np.asarray(values))
    data.attrs["units"] = units


class CaseWriter:
    """Appends the rows of one case in the order of the realisations."""

    def __init__(self, group: Any, head: CaseHead):
        self.group, self.head = group, head
        self.count = 0
        self._rows: list[tuple[Any, ...]] = []
        self._bytes = 0
        points = len(head.points)
        windows = head.windows
        attributes: dict[str, Any] = {
            "name": head.name, "time_step": head.time_step, "warm_up": head.warm_up, "duration": head.duration,
            "window": head.window, "criterion": head.criterion, "people": head.people, "persons_on_deck": head.persons,
            "assumptions": json.dumps(list(head.assumptions)), "step": json.dumps(head.step),
        }  # fmt: skip
        if head.target is not None:
            attributes["target"] = head.target
        if head.limit is not None:
            attributes["limit"] = head.limit
        group.attrs.update(attributes)
        place = group.create_group("points")
        _text(place, "name", [p[0] for p in head.points])
        _numbers(place, "s", [p[1] for p in head.points], "m")
        _numbers(place, "e", [p[2] for p in head.points], "m")
        _text(place, "direction", [p[3] for p in head.points])
        modes = group.create_group("modes")
        _text(modes, "name", [m[0] for m in head.modes])
        for i, (name, unit) in enumerate(
            (("frequency", "Hz"), ("damping", "1"), ("modal_mass", "kg"), ("added_mass", "kg")), start=1
        ):
            _numbers(modes, name, [m[i] for m in head.modes], unit)
        deck = group.create_group("deck")
        _numbers(deck, "s", head.deck_s, "m")
        _numbers(deck, "e", list(head.deck_e), "m")
        rows = group.create_group("realisations")
        self._sets = [
            self._growing(rows, name, (points,), units)
            for name, units in (
                ("peak", _ACCELERATION),
                ("rms", _ACCELERATION),
                ("running_rms_max", _ACCELERATION),
                ("peak_time", "s"),
            )
        ]
        self._windows = self._growing(rows, "window_peak", (windows, points), _ACCELERATION)
        self._crossings = self._growing(rows, "crossings", (), "1", np.int64)
        self._shape = (len(head.deck_e), head.deck_s.size)
        groups = [deck.create_group(direction) for direction in head.directions]
        self._envelopes = [self._growing(g, "peak_envelope", self._shape, _ACCELERATION) for g in groups]
        self._deck_windows = [self._growing(g, "window_peak", (windows,), _ACCELERATION) for g in groups]

    @staticmethod
    def _growing(group: Any, name: str, shape: tuple[int, ...], units: str, kind: Any = np.float64) -> Any:
        size = 8 * max(int(np.prod(shape)), 1)
        rows = int(max(16, min(_BUFFER * 4, 262_144 // size)))
        data = group.create_dataset(
            name,
            shape=(0, *shape),
            maxshape=(None, *(n or None for n in shape)),
            chunks=(rows, *(max(n, 1) for n in shape)),
            dtype=kind,
        )
        data.attrs["units"] = units
        return data

    def append(self, response: Any, crossings: int) -> None:
        """Adds the row of the next realisation."""
        self._rows.append(
            (response.peak, response.rms, response.running_rms_max, response.peak_time, response.window_peak,
             crossings, response.envelope, response.deck_window_peak)
        )  # fmt: skip
        self._bytes += response.window_peak.nbytes + response.envelope.nbytes + response.deck_window_peak.nbytes
        if len(self._rows) >= _BUFFER or self._bytes > _BUFFER_BYTES:
            self.flush()

    def flush(self) -> None:
        """Puts what is buffered into the file."""
        if not self._rows:
            return
        begin, end = self.count, self.count + len(self._rows)
        columns = list(zip(*self._rows, strict=True))
        envelopes = np.stack(columns[6])
        targets = [*self._sets, self._windows, self._crossings]
        for data, values in zip(targets, [*columns[:5], columns[5]], strict=True):
            data.resize(end, axis=0)
            data[begin:end] = np.stack(values) if np.ndim(values[0]) else np.array(values)
        whole = envelopes.reshape(envelopes.shape[0], len(self._envelopes), *self._shape)
        anywhere = np.stack(columns[7])
        for i, (data, windows) in enumerate(zip(self._envelopes, self._deck_windows, strict=True)):
            data.resize(end, axis=0)
            data[begin:end] = whole[:, i]
            windows.resize(end, axis=0)
            windows[begin:end] = anywhere[:, :, i]
        self.count = end
        self._rows.clear()
        self._bytes = 0

    def history(self, number: int, start: int, acceleration: Floats) -> None:
        """Keeps the history of realisation `number`, whose first row is step `start`."""
        group = self.group.require_group("histories").create_group(str(number))
        time = (start + np.arange(acceleration.shape[0])) * self.head.time_step
        _numbers(group, "time", time, "s")
        _numbers(group, "acceleration", acceleration, _ACCELERATION)


class ResultsWriter:
    """A results file in the making. As a context: nothing stays behind unless `finish` is reached."""

    def __init__(self, path: Path, scenario: str, seed: int, findings: Sequence[str], *, force: bool = False):
        self.path = path
        if path.is_dir():
            raise ResultsError(f"{path}: is a folder; --out takes the name of a file")
        if path.exists() and not force:
            raise ResultsError(f"{path}: exists already; --force overwrites it, or choose another --out")
        if not path.parent.is_dir():
            raise ResultsError(f"{path}: there is no folder {path.parent}; make it first")
        self.temporary = path.with_name(f".{path.name}.{os.getpid()}.part")
        try:
            self.file = h5py.File(self.temporary, "w", libver=("v110", "v110"))
        except OSError as error:
            raise ResultsError(
                f"{path}: cannot be written in {path.parent.resolve()} ({error.strerror or 'not possible'})"
            ) from None
        self.file.attrs.update(
            {
                "format": FORMAT,
                "format_version": FORMAT_VERSION,
                "crowdsim_version": crowdsim.__version__,
                "scenario": scenario,
                "seed": seed,
                "fingerprint": json.dumps(fingerprint()),
                "findings": json.dumps(list(findings)),
            }
        )
        self._cases = self.file.create_group("cases")
        self._done = False

    def case(self, head: CaseHead) -> CaseWriter:
        """Begins the next case."""
        return CaseWriter(self._cases.create_group(str(len(self._cases))), head)

    def drop_last_case(self) -> None:
        """Takes the last case out again: nothing of it was finished."""
        del self._cases[str(len(self._cases) - 1)]

    def finish(self, facts: dict[str, Any], *, complete: bool = True) -> Path:
        """Adds the facts of this run, closes the file, moves it into place and says where.

        A run that was stopped never takes the place of a file that is there: it goes beside it.
        """
        place = self.path
        if not complete and place.exists():
            place = place.with_name(f"{place.stem}.partial{place.suffix}")
        run = self.file.create_group("run")
        run.attrs.update(
            {
                "date": datetime.now(UTC).isoformat(timespec="seconds"),
                "host": socket.gethostname(),
                "python": platform.python_version(),
                "resumed": False,
                "complete": complete,
                **facts,
            }
        )
        self.file.close()
        os.replace(self.temporary, place)
        self._done = True
        return place

    def __enter__(self) -> ResultsWriter:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if not self._done:
            self.file.close()
            self.temporary.unlink(missing_ok=True)
