"""A case prepared again from a results file is the case that was simulated."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from crowdsim.errors import InputError, ResultsError
from crowdsim.results.reader import Results
from crowdsim.scenario.reader import Scenario
from crowdsim.study.again import case_again, persons_on_deck
from crowdsim.study.jobs import draw, run_realisation
from crowdsim.study.simulate import simulate

SHORT = ("duration = 900.0\nrealisations = 200\nseed = 7", "duration = 60.0\nrealisations = 3\nseed = 7")


@pytest.fixture(scope="module")
def results(scenario: Callable[..., Scenario]) -> Results:
    """With a seed that is not the scenario's."""
    return simulate(scenario(SHORT), seed=99)


def test_a_realisation_comes_out_the_same_to_the_last_bit(results: Results) -> None:
    case = case_again(results, "all streams")
    assert case.seed == 99
    for number in range(3):
        row = run_realisation(case, number)
        assert row is not None
        np.testing.assert_array_equal(row.response.peak, results.cases[0].peak[number])
        assert row.crossings == results.cases[0].crossings[number]


def test_the_number_on_the_deck_is_counted(results: Results) -> None:
    case = case_again(results, "all streams")
    times, count = persons_on_deck(case, 1)
    assert (times[0], count[0]) == (0.0, 0)
    assert np.all(np.diff(times) > 0.0)
    assert np.all(np.diff(count) != 0)
    walks = [w for _, w in draw(case, 1)]
    for t, n in zip(times, count, strict=True):
        assert n == sum(int(np.sum((w.enter <= t) & (t < w.leave))) for w in walks)


def test_a_constant_crowd_keeps_its_number(scenario: Callable[..., Scenario]) -> None:
    made = simulate(scenario(SHORT, ("arrival = { per_hour = 900 }", "arrival = { constant = 17 }")), realisations=1)
    times, count = persons_on_deck(case_again(made, "all streams"), 0)
    assert times.tolist() == [0.0]
    assert count.tolist() == [17]


def test_what_is_not_there_is_said(results: Results) -> None:
    with pytest.raises(ResultsError, match="has no case 'night'"):
        case_again(results, "night")
    with pytest.raises(InputError, match="the scenario in the results file"):
        case_again(replace(results, scenario="[deck]\n"), "all streams")
