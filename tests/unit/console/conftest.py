"""Screens as text: results of the shipped scenarios, made once, and what every screen shows of them at any width."""

from __future__ import annotations

import io
from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path

import numpy as np
import pytest

import crowdsim
from crowdsim.console.base import Console
from crowdsim.console.check import check
from crowdsim.console.compare import compare
from crowdsim.console.estimate import estimate
from crowdsim.console.sensitivity import sensitivity
from crowdsim.console.summary import summary
from crowdsim.results.sensitivity import Base, Sensitivity, Varied, ranked
from crowdsim.scenario.reader import Scenario, read_scenario
from crowdsim.study import estimate as hand
from crowdsim.study.compare import Comparison, compare_file
from crowdsim.study.estimate import Estimates
from crowdsim.study.simulate import Plan, plan, simulate
from crowdsim.study.situation import cases
from crowdsim.study.variations import variations

SCENARIOS = Path(crowdsim.__file__).parents[1] / "scenarios"
NAMES = ("joggers-among-walkers", "lantern-evening", "market-day", "one-walker", "weekday-commuters")
ENOUGH = 80  # realisations, for intervals


@dataclass
class Table:
    """A table as asked for, and the lines that it became."""

    title: str
    columns: list[tuple[str, str]]
    rows: list[list[str]]
    spare: tuple[str, ...]
    lines: list[str]


@dataclass
class Screen:
    """What was printed; running text and tables as they were handed over."""

    text: str = ""
    tables: list[Table] = field(default_factory=list)
    said: list[str] = field(default_factory=list)


class Recorder(Console):
    """A console of any width that prints into memory and remembers what it was asked for."""

    def __init__(self, width: int, **options: bool):
        super().__init__(**options)
        self.out.file, self.out.width = io.StringIO(), width
        self.screen = Screen()

    def text(self) -> str:
        return self.out.file.getvalue()  # type: ignore[attr-defined, no-any-return]

    def table(self, title, columns, rows, spare=()):  # type: ignore[no-untyped-def]
        before = len(self.text())
        super().table(title, columns, rows, spare)
        lines = self.text()[before:].split("\n")
        self.screen.tables.append(Table(title, list(columns), [list(r) for r in rows], tuple(spare), lines))

    def line(self, text: str = "", indent: str = "") -> None:
        self.screen.said.append(text)
        super().line(text, indent)


@pytest.fixture(scope="session")
def scenarios() -> dict[str, Scenario]:
    return {name: read_scenario(SCENARIOS / f"{name}.toml") for name in NAMES}


@pytest.fixture(scope="session")
def plans(scenarios: dict[str, Scenario]) -> dict[str, Plan]:
    return {name: plan(read) for name, read in scenarios.items()}


@pytest.fixture(scope="session")
def estimates(scenarios: dict[str, Scenario]) -> dict[str, Estimates]:
    return {name: hand.estimate(read) for name, read in scenarios.items()}


@pytest.fixture(scope="session")
def comparisons(scenarios: dict[str, Scenario], tmp_path_factory: pytest.TempPathFactory) -> dict[str, Comparison]:
    """A run of each scenario with its formulas and a fitted law."""
    folder = tmp_path_factory.mktemp("console")
    made = {}
    for name, read in scenarios.items():
        simulate(read, out=folder / f"{name}.h5", realisations=ENOUGH, workers=2)
        made[name] = compare_file(folder / f"{name}.h5", family="gumbel")
    return made


@pytest.fixture(scope="session")
def studies(scenarios: dict[str, Scenario]) -> dict[str, Sensitivity]:
    """Variations of the last case as they are, with numbers made up: a screen does not know the difference."""
    made = {}
    for name, read in scenarios.items():
        table = cases(read)[-1]
        (base,) = plan(read, case=table.name).cases
        changes, left = variations(read, table, base)
        numbers = np.random.default_rng(1).normal(0.0, 0.4, len(changes))
        varied, order = ranked(
            Varied(v.subject, v.label, v.source, 1.234 * (1.0 + x), x, x - 0.123, x + 0.234, v.note)
            if v.scenario is not None
            else Varied(v.subject, v.label, v.source, None, None, None, None, v.problem)
            for v, x in zip(changes, numbers.tolist(), strict=True)
        )
        made[name] = Sensitivity(
            title=read.title, case=base.name, direction="vertical", window=base.window, realisations=ENOUGH, seed=7,
            version="0.1.0", base=Base(1.234, 1.123, 1.345), variations=varied, order=order, not_varied=tuple(left),
        )  # fmt: skip
    return made


@dataclass(frozen=True)
class Shown:
    """What a command shows of a scenario."""

    plans: dict[str, Plan]
    estimates: dict[str, Estimates]
    comparisons: dict[str, Comparison]
    studies: dict[str, Sensitivity]

    def on(self, console: Console, command: str, name: str) -> None:
        if command == "estimate":
            estimate(console, self.estimates[name])
        elif command == "check":
            check(console, self.plans[name])
        elif command == "sensitivity":
            sensitivity(console, self.studies[name])
        else:
            {"summary": summary, "compare": compare}[command](console, self.comparisons[name])


@pytest.fixture(scope="session")
def shown(
    plans: dict[str, Plan], estimates: dict[str, Estimates], comparisons: dict[str, Comparison],
    studies: dict[str, Sensitivity],
) -> Shown:  # fmt: skip
    return Shown(plans, estimates, comparisons, studies)


@pytest.fixture(scope="session")
def show(shown: Shown) -> Callable[[str, str, int], Screen]:
    """The screen of a command for a scenario, at a width; each once."""

    @cache
    def one(command: str, name: str, width: int) -> Screen:
        console = Recorder(width)
        shown.on(console, command, name)
        console.screen.text = console.text()
        return console.screen

    return one
