"""Where a key stands in a TOML file, for error messages."""

from __future__ import annotations

import re

Path = tuple[str | int, ...]
_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\[\]]+?)\s*\]\]?\s*(?:#.*)?$")
_QUOTES = re.compile(r'"""|' + "'''")
_KEY = re.compile(r"^\s*([A-Za-z0-9_.\"'-]+)\s*=")


def key_lines(text: str) -> dict[Path, int]:
    """Line (from 1) of every table header and of every key at the start of a line.

    Keys inside inline tables are not listed; `line_of` then gives the line of what holds them.
    """
    lines: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    table: Path = ()
    within = ""  # the quotes of a string that runs over several lines
    for number, line in enumerate(text.splitlines(), start=1):
        before = within
        for quotes in _QUOTES.findall(line):
            within = "" if within == quotes else within or quotes
        if before:
            continue
        header = _HEADER.match(line)
        if header:
            table = ()
            parts = _parts(header.group(2))
            for i, part in enumerate(parts):
                table = (*table, part)
                last = i == len(parts) - 1
                if last and header.group(1) == "[[":
                    lines.setdefault(table, number)
                    counts[table] = counts.get(table, -1) + 1
                    table = (*table, counts[table])
                elif table in counts:
                    table = (*table, counts[table])
            lines.setdefault(table, number)
            continue
        key = _KEY.match(line)
        if key:
            lines.setdefault((*table, *_parts(key.group(1))), number)
    return lines


def _parts(dotted: str) -> list[str]:
    return [p.strip().strip("\"'") for p in dotted.split(".")]


def line_of(lines: dict[Path, int], path: Path) -> int | None:
    """Line of the key, or of the nearest table around it."""
    for end in range(len(path), 0, -1):
        if path[:end] in lines:
            return lines[path[:end]]
    return None


def key_text(path: Path) -> str:
    """As a person writes it: `stream[0].pace.sd`."""
    text = ""
    for part in path:
        text += f"[{part}]" if isinstance(part, int) else f".{part}" if text else part
    return text
