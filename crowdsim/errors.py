"""Errors with one root, and the exit status that each stands for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

EXIT_DONE = 0
EXIT_OTHER = 1
EXIT_INPUT = 2


class CrowdsimError(Exception):
    """Root of everything the program raises on purpose."""

    exit_status = EXIT_OTHER


@dataclass(frozen=True)
class Problem:
    """One thing that is wrong with the input.

    key : path of the key, as `stream[0].pace.sd`; what : what is wrong and what was given
    allowed : what would be right, or what to do; line : in the file, where known
    """

    key: str
    what: str
    allowed: str = ""
    line: int | None = None

    def text(self) -> str:
        """One line: place, key, what, allowed."""
        place = f"line {self.line}: " if self.line else ""
        key = f"{self.key}: " if self.key else ""
        allowed = f" ({self.allowed})" if self.allowed else ""
        return f"{place}{key}{self.what}{allowed}"


class InputError(CrowdsimError):
    """The input is at fault. Carries every problem found in one file."""

    exit_status = EXIT_INPUT

    def __init__(self, source: str, problems: Sequence[Problem]):
        self.source = source
        self.problems = tuple(problems)
        count = len(self.problems)
        head = f"{source}: {count} problem{'s' if count > 1 else ''}"
        super().__init__("\n".join([head, *(f"  {p.text()}" for p in self.problems)]))


class ResultsError(CrowdsimError):
    """A results file cannot be read or written as asked; the user can put it right."""

    exit_status = EXIT_INPUT


class RunError(CrowdsimError):
    """A run failed on the way."""


class InterruptedRunError(CrowdsimError):
    """The user stopped a run; what was finished is in the file `kept`, if any."""

    def __init__(self, message: str, kept: str | None = None):
        super().__init__(message)
        self.kept = kept
