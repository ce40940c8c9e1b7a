"""A case of a results file, prepared again from the scenario inside it: what the file does not keep."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from crowdsim.dynamics.realisation import Passages
from crowdsim.errors import ResultsError
from crowdsim.results.reader import Results
from crowdsim.scenario.reader import parse_scenario
from crowdsim.study.jobs import draw
from crowdsim.study.prepare import Case, prepare
from crowdsim.study.situation import cases

Floats = NDArray[np.float64]


def case_again(results: Results, name: str) -> Case:
    """The case called `name` as it was simulated: modes, streams, seed.

    Persons of realisation k follow by `crowdsim.study.jobs.draw(case, k)`, the same as in the run.
    Raises ResultsError where the scenario in the file has no such case, InputError where this
    version no longer reads it.
    """
    scenario = parse_scenario(results.scenario, "the scenario in the results file")
    for table in cases(scenario):
        if table.name == name:
            return prepare(scenario, table, results.seed)
    raise ResultsError(f"the scenario in the results file has no case {name!r}")


def persons_on_deck(case: Case, number: int) -> tuple[Floats, NDArray[np.int64]]:
    """When the number of persons on the deck changes in realisation `number`, and to what.

    Times [s] grow from time 0 to the end of the record; the number holds from its time to the next.
    """
    return counted([walks for _, walks in draw(case, number)], case.end)


def counted(walks: list[Passages], end: float) -> tuple[Floats, NDArray[np.int64]]:
    """The same from the walks of every stream, to `end` [s]."""
    enter = np.concatenate([w.enter for w in walks])
    leave = np.concatenate([w.leave for w in walks])
    # who leaves a constant crowd re-enters at the same time: steps at equal times are summed
    times, which = np.unique(np.concatenate([[0.0], enter, leave]), return_inverse=True)
    change = np.concatenate([[0], np.ones(enter.size, np.int64), -np.ones(leave.size, np.int64)])
    number = np.cumsum(np.bincount(which, weights=change, minlength=times.size)).astype(np.int64)
    inside = times <= end
    times, number = times[inside], number[inside]
    kept = np.concatenate([[True], np.diff(number) != 0])
    return times[kept], number[kept]
