"""A wrong scenario is refused with a message that names the key, whatever is wrong with it.

Every key of a scenario that uses them all is corrupted in every way that applies to it; hypothesis does the same to
scenarios of its own. A message names a key when a line of it begins with the key's path, or with the path of the table
around it and then speaks of the key.
"""

from __future__ import annotations

import copy
import math
import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import crowdsim
from crowdsim.errors import EXIT_INPUT, InputError

Path = tuple[str | int, ...]
Tables = dict[str, Any]
Writer = Callable[[Any], str]

EVERYTHING: Tables = {
    "scenario": {"title": "All keys", "note": "valid as it stands"},
    "deck": {"length": 40.0, "width": 3.0, "construction": "steel"},
    "mode": [
        {"name": "V1", "frequency": 1.9, "damping": 0.005, "modal_mass": 40000.0,
         "vertical": {"half_waves": 1, "amplitude": 1.0}},
        {"name": "T1", "frequency": 2.9, "damping": 0.006, "modal_mass": 30000.0,
         "vertical": {"s": [0, 10, 20, 30, 40], "value": [0.0, 0.7, 1.0, 0.7, 0.0], "interpolation": "spline"},
         "twist": {"half_waves": 2}, "lateral": {"half_waves": 1}, "longitudinal": {"half_waves": 1}},
    ],
    "stream": [
        {"name": "a", "gait": "walking", "arrival": {"per_hour": 500.0}, "forward_share": 0.5,
         "population": "zivanovic-2007",
         "pace": {"distribution": "normal", "mean": 1.87, "sd": 0.186, "min": 1.3, "max": 2.6},
         "step_length": {"mean": 0.71, "sd": 0.071, "min": 0.4, "max": 1.1},
         "weight": {"distribution": "lognormal", "mean": 750.0, "sd": 120.0, "min": 300.0, "max": 1500.0},
         "load": {"set": "kerr-1998", "scatter": True}, "phase": {"distribution": "uniform", "min": 0.0, "max": 1.0},
         "offset": {"mean": 0.1, "sd": 0.3, "min": -1.0, "max": 1.0}},
        {"name": "b", "gait": "jogging", "arrival": {"density": 0.01}, "speed": 2.7,
         "pace": {"mean_at": "V1", "harmonic": 1, "sd": 0.1}, "weight": "80 kg",
         "load": {"set": "half-sine", "contact_ratio": 0.6}, "phase": 0.3, "offset": 0.4},
        {"name": "c", "arrival": {"constant": 5}, "load": {"harmonics": [0.4, 0.1], "phases": [0.0, -1.5]},
         "pace": 1.9},
        {"name": "d", "arrival": {"times": [0.0, 1.5]}, "load": "setra-2006", "speed": {"mean": 1.4, "sd": 0.2}},
    ],
    "case": [
        {"name": "one", "streams": ["a", "b"], "people": "mass", "target": "CL2"},
        {"name": "two", "limit": 0.7},
    ],
    "point": [{"name": "bench", "s": 10.0, "e": 0.5, "direction": "vertical"}],
    "run": {"duration": 20.0, "realisations": 2, "seed": 3, "time_step": 0.01, "warm_up": 10.0,
            "integration": "fox-goodwin", "matched": True},
    "comfort": {"criterion": "eur-23984", "window": 10.0},
}  # fmt: skip

FIXED = settings(deadline=None, derandomize=True, database=None, suppress_health_check=[HealthCheck.too_slow])
KINDS = {
    "length": "length", "width": "length", "s": "length", "e": "length", "step_length": "length", "offset": "length",
    "frequency": "frequency", "pace": "frequency", "damping": "fraction", "forward_share": "fraction",
    "amplitude": "fraction", "value": "fraction", "harmonics": "fraction", "contact_ratio": "fraction",
    "modal_mass": "mass", "speed": "speed", "weight": "weight", "phase": "angle", "per_hour": "flow",
    "density": "density", "times": "time", "duration": "time", "time_step": "time", "warm_up": "time",
    "window": "time", "limit": "acceleration",
}  # fmt: skip
WRONG_UNITS = {
    "length": ["3 kg", "3 m2"], "frequency": ["3 m", "3 rad/s"], "fraction": ["3 m"], "mass": ["3 kN", "3 ton"],
    "speed": ["3 m"], "weight": ["3 m"], "angle": ["3 m"], "flow": ["3 m"], "density": ["3 kg"], "time": ["3 m"],
    "acceleration": ["3 m/s"],
}  # fmt: skip
RANDOM = ("pace", "step_length", "speed", "weight", "phase", "offset")
MOMENTS = ("mean", "sd", "min", "max")
WHOLE = ("half_waves", "constant", "realisations", "seed", "harmonic")
CHOICES = ("gait", "population", "set", "mean_at", "people", "target", "criterion", "integration", "interpolation",
           "direction", "distribution")  # fmt: skip
REQUIRED = ("length", "width", "name", "frequency", "damping", "modal_mass", "half_waves", "s", "value", "arrival",
            "per_hour", "density", "constant", "times", "harmonics", "set", "contact_ratio")  # fmt: skip


@dataclass(frozen=True)
class Corruption:
    """One change to a valid scenario: at `path`, `value` instead of what is there; `gone`: the key taken out."""

    kind: str
    path: Path
    value: Any = None
    gone: bool = False

    def of(self, tables: Tables) -> Tables:
        """The scenario with the change."""
        changed = copy.deepcopy(tables)
        place: Any = changed
        for part in self.path[:-1]:
            place = place[part]
        if self.gone:
            del place[self.path[-1]]
        else:
            place[self.path[-1]] = self.value
        return changed


def key_text(path: Path) -> str:
    """As a person writes it: stream[0].pace.sd."""
    return re.sub(r"\.(\[)", r"\1", ".".join(f"[{p}]" if isinstance(p, int) else p for p in path))


def last_key(path: Path) -> str:
    """The key, or that of the list that holds an element."""
    return next(p for p in reversed(path) if isinstance(p, str))


def walk(value: Any, path: Path = ()) -> Iterator[tuple[Path, Any]]:
    """Every table, list and leaf below `value`."""
    if path:
        yield path, value
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, item in items:
        yield from walk(item, (*path, key))


def is_quantity(path: Path, value: Any) -> str | None:
    """The kind of unit of a leaf, if it is a quantity."""
    key = last_key(path)
    if isinstance(value, dict | list) or (isinstance(value, str) and key in CHOICES):
        return None
    if key in MOMENTS:
        return KINDS[[p for p in path if isinstance(p, str)][-2]]
    return KINDS.get(key)


def signed(path: Path) -> bool:
    """Whether a negative number is right there."""
    words = [p for p in path if isinstance(p, str)]
    centred = words[-1] in ("offset", "phase") or (words[-1] != "sd" and words[-2] in ("offset", "phase"))
    return centred or words[-1] in ("amplitude", "value", "e")


def corruptions(tables: Tables) -> Iterator[Corruption]:
    """Everything that can be done to a valid scenario to make it wrong."""
    yield Corruption("unknown key", ("wether",), 1)
    names: dict[str, str] = {}
    for path, value in walk(tables):
        key = last_key(path)
        kind = is_quantity(path, value)
        if isinstance(value, dict):
            yield Corruption("unknown key", (*path, "wether"), 1)
            if key not in RANDOM:
                yield Corruption("wrong type", path, 3)
                yield Corruption("wrong type", path, [1.0])
        elif isinstance(value, list):
            yield Corruption("wrong type", path, 3)
            yield Corruption("wrong type", path, "three")
        elif kind:
            yield from (Corruption("wrong unit", path, text) for text in WRONG_UNITS[kind])
            yield from (Corruption("a word for a number", path, text) for text in ("three", "3 of them", "", "1,5 m"))
            yield from (Corruption("not finite", path, x) for x in (math.nan, math.inf, -math.inf))
            yield from (Corruption("wrong type", path, x) for x in (True, [1.0], [], {"value": 1.0}))
            if not signed(path):
                yield from (Corruption("negative", path, x) for x in (-1.0, -1))
        elif key == "phases":
            yield from (Corruption("wrong type", path, x) for x in (True, [0.0], {"value": 0.0}))
            yield from (Corruption("a word for a number", path, x) for x in ("three", "3", ""))
            yield from (Corruption("not finite", path, x) for x in (math.nan, math.inf, -math.inf))
        elif key in WHOLE:
            yield from (Corruption("wrong type", path, x) for x in (2.5, [1], {"value": 1}))
            yield from (Corruption("a word for a number", path, x) for x in ("three", "3 m", ""))
            yield Corruption("wrong type", path, True)
            yield Corruption("a word for a number", path, "3")
            yield from (Corruption("not finite", path, x) for x in (math.nan, math.inf))
            yield Corruption("negative", path, -1)
        elif isinstance(value, bool):
            yield from (Corruption("wrong type", path, x) for x in ("perhaps", 2.5, [True], {"value": True}))
        else:
            yield from (Corruption("wrong type", path, x) for x in (5, 1.5, True, [["x"]], {"value": "x"}))
            if key in CHOICES or key in ("streams", "load"):
                yield Corruption("no such name", path, "nobody-1999")
        if key == "name" and isinstance(value, str):
            around = str(path[0])
            if around in names:
                yield Corruption("the name of another", path, names[around])
            yield Corruption("an empty name", path, "")
            names[around] = value
        if isinstance(path[-1], str) and required(path, tables):
            yield Corruption("missing", path, gone=True)


def required(path: Path, tables: Tables) -> bool:
    """Whether the key must be there."""
    key = path[-1]
    if len(path) == 1:
        return key in ("deck", "mode", "stream")
    table: Any = tables
    for part in path[:-1]:
        table = table[part]
    if path[-2] not in RANDOM:
        return key in REQUIRED
    if table.get("distribution") == "uniform":
        return key in ("min", "max")
    return "mean_at" not in table and key in ("mean", "sd")


def names_key(error: InputError, path: Path) -> bool:
    """Whether a line of the message is about the key."""
    for line in str(error).splitlines()[1:]:
        text = re.sub(r"^\s*(line \d+: )?", "", line)
        for end in range(len(path), -1, -1):
            prefix = key_text(path[:end])
            if end == len(path) and text.startswith(f"{prefix}:"):
                return True
            rest = text.removeprefix(f"{prefix}:") if prefix else text
            if text.startswith(f"{prefix}:") and re.search(rf"\b{re.escape(last_key(path))}\b", rest):
                return True
            if text.startswith(f"{prefix}.") and isinstance(path[-1], str) and prefix == key_text(path):
                return True  # a key inside of what was to be a plain value
    return False


def refusal(corruption: Corruption, tables: Tables, toml: Writer) -> str | None:
    """What is wrong with the refusal, or None."""
    try:
        crowdsim.parse_scenario(toml(corruption.of(tables)), "bridge.toml")
    except InputError as error:
        if error.exit_status != EXIT_INPUT:
            return f"{corruption}: exit status {error.exit_status}"
        if not str(error).startswith("bridge.toml"):
            return f"{corruption}: the file is not named"
        return None if names_key(error, corruption.path) else f"{corruption}: {error}"
    return f"{corruption}: accepted"


ALL = list(corruptions(EVERYTHING))


def test_the_scenario_with_every_key_is_valid(toml: Writer) -> None:
    """Or the corruptions would prove nothing; and every key of the schema is in it."""
    from crowdsim.scenario.schema import ScenarioFile

    file = crowdsim.parse_scenario(toml(EVERYTHING)).file
    assert file.model_dump(exclude_unset=True).keys() == EVERYTHING.keys() == ScenarioFile.model_fields.keys()
    for name in ("deck", "mode", "stream", "case", "point", "run", "comfort"):
        table = getattr(file, name)
        rows = table if isinstance(table, list) else [table]
        assert {k for row in rows for k in row.model_fields_set} == set(type(rows[0]).model_fields), name


@pytest.mark.parametrize("kind", sorted({c.kind for c in ALL}))
def test_every_corruption_of_every_key_is_refused_by_name(kind: str, toml: Writer) -> None:
    """All of one kind."""
    chosen = [c for c in ALL if c.kind == kind]
    assert len(chosen) >= 2
    wrong = [said for c in chosen if (said := refusal(c, EVERYTHING, toml)) is not None]
    assert not wrong, "\n".join(wrong)


@settings(FIXED, max_examples=300)
@given(data=st.data())
def test_any_corruption_of_any_scenario_is_refused_by_name(
    valid_tables: st.SearchStrategy[Tables], toml: Writer, data: st.DataObject
) -> None:
    """One change to a scenario of hypothesis' own."""
    tables = data.draw(valid_tables)
    corruption = data.draw(st.sampled_from(list(corruptions(tables))))
    assert refusal(corruption, tables, toml) is None


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("[deck\nlength = 1", "not TOML"),
        ("deck = { length = 1, length = 2 }", "not TOML"),
        ("\x00", "not TOML"),
        ("", "deck"),
        ("[[deck]]\nlength = 1.0", "deck"),
        ("a = " + "[" * 5000 + "]" * 5000, ""),
    ],
)
def test_what_is_no_scenario_at_all(text: str, says: str) -> None:
    """Broken TOML, an empty file, tables where there should be none, depth."""
    with pytest.raises(InputError) as caught:
        crowdsim.parse_scenario(text, "bridge.toml")
    assert says in str(caught.value)
