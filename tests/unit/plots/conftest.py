"""Results files of the shipped scenarios, fewer and shorter realisations, and figures as `draw` makes them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from matplotlib.axes import Axes

import crowdsim
from crowdsim.plots.draw import FIGURES, Wish, _foot
from crowdsim.results.reader import Results, open_results
from crowdsim.scenario.reader import parse_scenario
from crowdsim.study.simulate import simulate

SCENARIOS = Path(crowdsim.__file__).parents[1] / "scenarios"
# what is changed so that the test is quick; 80 realisations are enough for an interval
SHORTER = {
    "market-day": (4, '"16 min"', '"2 min"'),
    "weekday-commuters": (80, '"16 min"', '"8 min"'),
    "one-walker": (80, "75.0", "75.0"),
    "joggers-among-walkers": (12, '"10 min"', '"10 min"'),
    "lantern-evening": (12, '"5 min"', '"5 min"'),
}
LAST = {"joggers-among-walkers"}  # the last of several cases is drawn: the first hardly moves

Draw = Callable[..., Axes]


@pytest.fixture(scope="session")
def files(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """A results file for each scenario."""
    folder = tmp_path_factory.mktemp("plots")
    made = {}
    for name, (count, old, new) in SHORTER.items():
        text = (SCENARIOS / f"{name}.toml").read_text(encoding="utf-8")
        assert old in text
        made[name] = folder / f"{name}.h5"
        simulate(parse_scenario(text.replace(old, new), name), out=made[name], realisations=count, workers=2)
    return made


@pytest.fixture(scope="session")
def read(files: dict[str, Path]) -> dict[str, Results]:
    """The same, read."""
    return {name: open_results(path) for name, path in files.items()}


@pytest.fixture(scope="session")
def drawn(read: dict[str, Results]) -> Draw:
    """Draws a figure as `draw` does, without saving it; once where nothing special is asked for."""
    kept: dict[tuple[str, str, float], Axes] = {}

    def one(name: str, what: str, width: float = 170.0, **wishes: Any) -> Axes:
        key = (name, what, width)
        if key in kept and not wishes:
            return kept[key]
        case = read[name].cases[-1 if name in LAST else 0]
        wish = {"point": None, "fit": None, "marks": (), **wishes}
        ax = FIGURES[what](Wish(results=read[name], case=case, width=width, foot=_foot(read[name], case), **wish))
        if not wishes:
            kept[key] = ax
        return ax

    return one
