"""Errors: one root, the exit status that each stands for, the one line of a problem."""

from __future__ import annotations

import inspect

from crowdsim import errors
from crowdsim.errors import CrowdsimError, InputError, Problem, ResultsError, RunError


def test_every_error_has_the_root_and_a_status() -> None:
    found = [c for _, c in inspect.getmembers(errors, inspect.isclass) if issubclass(c, Exception)]
    assert len(found) >= 5
    assert all(issubclass(c, CrowdsimError) for c in found)
    assert {c.exit_status for c in found} == {1, 2}


def test_what_the_user_can_put_right_is_status_2_the_rest_1() -> None:
    assert (errors.EXIT_DONE, errors.EXIT_OTHER, errors.EXIT_INPUT) == (0, 1, 2)
    assert InputError.exit_status == ResultsError.exit_status == 2
    assert RunError.exit_status == CrowdsimError.exit_status == 1


def test_a_problem_is_one_line_of_place_key_fault_and_remedy() -> None:
    assert Problem("run.seed", "-7 given", "at least 0", 24).text() == "line 24: run.seed: -7 given (at least 0)"
    assert Problem("deck", "missing").text() == "deck: missing"
    assert Problem("", "no such file", "the path of a scenario").text() == "no such file (the path of a scenario)"


def test_an_input_error_counts_its_problems_and_names_the_file() -> None:
    one = InputError("weir.toml", [Problem("deck", "missing")])
    assert str(one) == "weir.toml: 1 problem\n  deck: missing"
    assert str(InputError("weir.toml", [Problem("a", "b"), Problem("c", "d")])).startswith("weir.toml: 2 problems\n")
