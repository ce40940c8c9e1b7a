"""What a single table cannot know: names that refer to each other, places on the deck, loads."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Iterator
from typing import Any

from crowdsim.crowd.populations import POPULATIONS
from crowdsim.guides.catalogue import CRITERIA
from crowdsim.loads import sets
from crowdsim.scenario.quantities import FLOORS, Random
from crowdsim.scenario.schema import ScenarioFile, StreamTable

Found = tuple[tuple[str | int, ...], str, str]

LARGEST_DAMPING = 0.2
FASTEST = 12.0  # m/s


def _choice(given: str, names: Iterable[str]) -> str:
    known = list(names)
    near = difflib.get_close_matches(given, known, 1, 0.5)
    return (f"did you mean {near[0]}? " if near else "") + "known: " + ", ".join(known)


def _unique(key: str, names: list[str]) -> Iterator[Found]:
    for i, name in enumerate(names):
        if name in names[:i]:
            yield (key, i, "name"), f"{name!r} is there already", "names differ"


def cross_checks(file: ScenarioFile) -> list[Found]:
    """(key, what is wrong, what is allowed) of everything that does not fit together."""
    return [
        *_unique("mode", [m.name for m in file.mode]),
        *_unique("stream", [s.name for s in file.stream]),
        *_unique("case", [c.name for c in file.case]),
        *_unique("point", [p.name for p in file.point]),
        *_modes(file),
        *_streams(file),
        *_cases(file),
        *_points(file),
        *_run(file),
    ]


def _modes(file: ScenarioFile) -> Iterator[Found]:
    length = file.deck.length
    for i, mode in enumerate(file.mode):
        if mode.damping > LARGEST_DAMPING:
            yield (
                ("mode", i, "damping"),
                f"{mode.damping:g} of critical",
                f"at most {LARGEST_DAMPING:g}; a percentage is written {mode.damping:g} % in quotes",
            )
        for direction in ("vertical", "lateral", "longitudinal", "twist"):
            shape = getattr(mode, direction)
            if shape is None or shape.s is None:
                continue
            key = ("mode", i, direction, "s")
            first, last = shape.s[0], shape.s[-1]
            if abs(first) > 1e-6 * length or abs(last - length) > 1e-6 * length:
                yield key, f"reaches from {first:g} to {last:g} m", f"from 0 to the deck's length, {length:g} m"


def _streams(file: ScenarioFile) -> Iterator[Found]:
    modes = [m.name for m in file.mode]
    half = 0.5 * file.deck.width
    for i, stream in enumerate(file.stream):
        key: tuple[str | int, ...] = ("stream", i)
        if stream.step_length is not None and stream.speed is not None:
            yield (*key, "speed"), "step_length and speed given", "one of the two; the other follows from the pace"
        if stream.population is not None:
            fitting = [n for n, p in POPULATIONS.items() if p.gait == stream.gait]
            if stream.population not in fitting:
                yield (*key, "population"), f"{stream.population!r} given", _choice(stream.population, fitting)
        if stream.pace is not None and stream.pace.mean_at is not None:
            yield from _mean_at(file, stream, (*key, "pace", "mean_at"), modes)
        if stream.load is not None and stream.load.set is not None:
            yield from _load(stream, (*key, "load"))
        for name in ("pace", "step_length", "speed", "weight"):
            given = getattr(stream, name)
            if given is not None and getattr(given, "mean_at", None) is None:
                yield from _buildable(given, (*key, name), *FLOORS[name])
        offset = stream.offset
        if offset is not None and offset.distribution == "fixed":
            if abs(offset.mean or 0.0) > half:
                yield (*key, "offset"), f"{offset.mean:g} m", f"within the width: -{half:g} to {half:g} m"
        elif offset is not None:
            low = max(-half, -half if offset.min is None else offset.min)
            high = min(half, half if offset.max is None else offset.max)
            cut = offset.model_copy(update={"min": low, "max": high})
            yield from _buildable(cut, (*key, "offset"), -half, half)
        if stream.pace is not None and stream.step_length is not None:
            pace, step = (q.max if q.max is not None else q.mean or 0.0 for q in (stream.pace, stream.step_length))
            if stream.pace.distribution == stream.step_length.distribution == "fixed" and pace * step > FASTEST:
                yield (*key, "step_length"), f"{pace * step:.3g} m/s with this pace", f"at most {FASTEST:g} m/s"


def _buildable(given: Random, key: tuple[str | int, ...], low: float, high: float) -> Iterator[Found]:
    try:
        given.build(low, high)
    except ValueError as error:
        yield key, str(error), f"values from {low:g} to {high:g} are possible here"


def _mean_at(file: ScenarioFile, stream: StreamTable, key: tuple[str | int, ...], modes: list[str]) -> Iterator[Found]:
    assert stream.pace is not None
    assert stream.pace.mean_at is not None
    name = stream.pace.mean_at
    if name not in modes:
        yield key, f"no mode is called {name!r}", _choice(name, modes)
        return
    mean = file.mode[modes.index(name)].frequency / stream.pace.harmonic
    if not 0.8 <= mean <= 5.0:
        yield key, f"puts the mean pace on {mean:.3g} Hz", "a pace of 0.8 to 5 Hz; harmonic = 2 puts it on half, say"
        return
    try:
        stream.pace.build(0.3, 6.0, mean)
    except ValueError as error:
        yield key, f"with the mean on {mean:.3g} Hz: {error}", "other min and max"


def _load(stream: StreamTable, key: tuple[str | int, ...]) -> Iterator[Found]:
    load: Any = stream.load
    if load.set not in sets.names(stream.gait):
        other = "jogging" if stream.gait == "walking" else "walking"
        hint = f"; it is a set for {other}" if load.set in sets.names(other) else ""
        yield key, f"no {stream.gait} set is called {load.set!r}{hint}", _choice(load.set, sets.names(stream.gait))
        return
    try:
        sets.load_set(stream.gait, load.set, scatter=load.scatter, contact_ratio=load.contact_ratio)
    except ValueError as error:
        yield key, str(error), "as in the README, or another set"


def _cases(file: ScenarioFile) -> Iterator[Found]:
    streams = [s.name for s in file.stream]
    classes = CRITERIA[file.comfort.criterion].reachable
    for i, case in enumerate(file.case):
        for j, name in enumerate(case.streams or []):
            if name not in streams:
                yield ("case", i, "streams", j), f"no stream is called {name!r}", _choice(name, streams)
        if case.streams and len(set(case.streams)) < len(case.streams):
            yield ("case", i, "streams"), "a stream stands twice", "each name once"
        if case.target is not None and case.target not in classes:
            allowed = f"one of {', '.join(classes)}" if classes else "this criterion has a limit, no classes"
            yield ("case", i, "target"), f"{case.target!r} is no class of {file.comfort.criterion}", allowed
        if case.target is not None and case.limit is not None:
            yield ("case", i, "limit"), "target and limit given", "one of the two"


def _points(file: ScenarioFile) -> Iterator[Found]:
    half = 0.5 * file.deck.width
    for i, point in enumerate(file.point):
        if point.s > file.deck.length:
            yield ("point", i, "s"), f"{point.s:g} m", f"0 to {file.deck.length:g} m"
        if abs(point.e) > half:
            yield ("point", i, "e"), f"{point.e:g} m", f"within the width: -{half:g} to {half:g} m"


def _run(file: ScenarioFile) -> Iterator[Found]:
    step = file.run.time_step
    if step is not None:
        n = round(1.0 / step)
        if abs(1.0 / step - n) > 0.01:
            yield ("run", "time_step"), f"{step:g} s", f"1/n s with n whole: 1/{n} s = {1 / n:.6g}, say"
