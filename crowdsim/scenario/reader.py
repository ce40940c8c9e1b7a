"""Reads a scenario file; every problem in one message, with key, line, what is allowed."""

from __future__ import annotations

import difflib
import re
import tomllib
import types
import typing
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pydantic import BaseModel, ValidationError

from crowdsim.errors import InputError, Problem
from crowdsim.scenario.checks import cross_checks
from crowdsim.scenario.lines import key_lines, key_text, line_of
from crowdsim.scenario.schema import ScenarioFile

_LARGEST_FILE = 20_000_000
LATER = {"option": "retrofit options", "modes_from": "modes from tables or records"}


@dataclass(frozen=True)
class Scenario:
    """A scenario without a problem.

    source : the file's name as given; text : its content; file : its tables; notes : what was
    converted on reading, for the output
    """

    source: str
    text: str
    file: ScenarioFile
    notes: tuple[str, ...] = ()

    @property
    def title(self) -> str:
        """Title for the output."""
        return self.file.scenario.title


def read_scenario(path: str | Path) -> Scenario:
    """Reads and validates a scenario file. Raises InputError with every problem."""
    source = str(path)
    try:
        with open(path, "rb") as begin:
            if begin.read(8) == b"\x89HDF\r\n\x1a\n":
                hint = "crowdsim compare, plot; a scenario is a TOML file"
                raise InputError(source, [Problem("", "is a results file, no scenario", hint)])
        size = Path(path).stat().st_size
        if size > _LARGEST_FILE:
            raise InputError(source, [Problem("", f"{size / 1e6:.0f} MB", "a scenario is a text of some kilobytes")])
        data = Path(path).read_bytes()
    except FileNotFoundError:
        raise InputError(source, [Problem("", "no such file", "the path of a scenario")]) from None
    except IsADirectoryError:
        raise InputError(source, [Problem("", "is a folder", "the path of a scenario file")]) from None
    except OSError as error:
        raise InputError(source, [Problem("", f"cannot be read: {error.strerror}")]) from None
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise InputError(source, [Problem("", "is not UTF-8 text", "save it as UTF-8", line)]) from None
    return parse_scenario(text, source)


def parse_scenario(text: str, source: str = "scenario") -> Scenario:
    """The same for a text. Raises InputError."""
    try:
        raw = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError(source, [_syntax(str(error), text)]) from None
    except RecursionError:
        raise InputError(source, [Problem("", "tables nested too deeply")]) from None
    notes: list[str] = []
    lines = key_lines(text)
    try:
        file = ScenarioFile.model_validate(raw, context={"notes": notes})
    except ValidationError as error:
        problems = [_problem(e, raw, lines) for e in error.errors(include_url=False)]
        raise InputError(source, list(dict.fromkeys(problems))) from None
    found = [Problem(key_text(p), what, allowed, line_of(lines, p)) for p, what, allowed in cross_checks(file)]
    if found:
        raise InputError(source, found)
    return Scenario(source, text, file, tuple(dict.fromkeys(notes)))


def _syntax(message: str, text: str) -> Problem:
    """A syntax error with its line and, for the usual slips, what to write."""
    found = re.search(r"\(at line (\d+), column (\d+)\)", message)
    line = int(found.group(1)) if found else None
    written = text.splitlines()[line - 1] if line and line <= len(text.splitlines()) else ""
    hint = ""
    if re.search(r"=\s*[\d.]+\s*[A-Za-z%]", written):
        hint = 'a quantity with a unit stands in quotes: "48 m"'
    elif re.search(r"(?<![\d.])\.\d", written):
        hint = "a nought before the decimal point: 0.7, not .7"
    elif "overwrite" in message or "twice" in message:
        hint = "a key or table stands there twice"
    elif re.search(r"\d,\d", written) and "[" not in written:
        hint = "a decimal point, not a comma"
    return Problem("", f"not TOML: {message}", hint, line)


def _problem(error: Any, raw: dict[str, Any], lines: dict[Any, int]) -> Problem:
    path = _written_path(error["loc"], raw)
    line = line_of(lines, path)
    kind, given, context = error["type"], error.get("input"), error.get("ctx", {})
    if kind == "missing":
        needed = {
            "deck": "[deck] with length and width",
            "mode": "at least one [[mode]]",
            "stream": "at least one [[stream]]",
        }
        return Problem(key_text(path), "missing", needed.get(str(path[-1])) or _about(path), line)
    if kind == "list_type" and len(path) == 1:
        return Problem(key_text(path), "one table where several may stand", f"two brackets: [[{path[0]}]]", line)
    if kind == "extra_forbidden":
        if path[0] in LATER:
            return Problem(key_text(path[:1]), f"{LATER[path[0]]}: not in this version", "leave it out for now", line)
        known = _known_keys(path[:-1])
        near = difflib.get_close_matches(str(path[-1]), known, 1, 0.6)
        allowed = (f"did you mean {near[0]}? " if near else "") + "known here: " + ", ".join(known)
        return Problem(key_text(path), "unknown key", allowed, line)
    if kind == "crowdsim":
        return Problem(key_text(path), context["what"], context["allowed"], line)
    bounds = {"greater_than": "above {gt}", "greater_than_equal": "at least {ge}", "less_than": "below {lt}",
              "less_than_equal": "at most {le}"}  # fmt: skip
    if kind == "less_than_equal" and path[-1] == "forward_share":
        return Problem(key_text(path), f"{_short(given)} given", f'at most 1: a share; or "{given} %" in quotes', line)
    if kind == "less_than_equal" and "pace" in path:
        hint = f'at most 6: steps per second; or "{given} per minute" in quotes'
        return Problem(key_text(path), f"{_short(given)} given", hint, line)
    if kind in bounds:
        return Problem(key_text(path), f"{_short(given)} given", bounds[kind].format(**context), line)
    if kind == "literal_error":
        expected = context["expected"].replace(" or ", ", ").replace("'", "")
        near = difflib.get_close_matches(str(given), expected.split(", "), 1, 0.6)
        allowed = (f"did you mean {near[0]}? " if near else "") + f"one of {expected}"
        return Problem(key_text(path), f"{_short(given)} given", allowed, line)
    message = error["msg"].replace("Input should be", "should be").replace("valid dictionary or instance of ", "table ")
    message = re.sub(r"a table \w+$", "a table { ... }", message)
    return Problem(key_text(path), f"{_short(given)} given", message[:1].lower() + message[1:], line)


def _short(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."


def _written_path(loc: tuple[Any, ...], raw: Any) -> tuple[Any, ...]:
    """The part of pydantic's place that the file really has (a plain number has no .mean)."""
    path: list[Any] = []
    for part in loc:
        if isinstance(raw, dict):
            path.append(part)
            raw = raw.get(part)
        elif isinstance(raw, list) and isinstance(part, int) and part < len(raw):
            path.append(part)
            raw = raw[part]
        else:
            break
    return tuple(path)


def _table(path: tuple[Any, ...]) -> type[BaseModel] | None:
    found: Any = ScenarioFile
    for part in path:
        if isinstance(part, int):
            continue
        field = found.model_fields.get(part) if isinstance(found, type) and issubclass(found, BaseModel) else None
        if field is None:
            return None
        found = _model_in(field.annotation)
    return found if isinstance(found, type) and issubclass(found, BaseModel) else None


def _model_in(annotation: Any) -> Any:
    if isinstance(annotation, type) and not isinstance(annotation, types.GenericAlias):
        return annotation
    for argument in typing.get_args(annotation):
        inner = _model_in(argument)
        if isinstance(inner, type) and issubclass(inner, BaseModel):
            return inner
    return None


def _known_keys(path: tuple[Any, ...]) -> list[str]:
    table = _table(path)
    return list(table.model_fields) if table else []


def _about(path: tuple[Any, ...]) -> str:
    table = _table(path[:-1])
    field = table.model_fields.get(str(path[-1])) if table else None
    return field.description or "" if field else ""
