"""Shared by the unit tests: a clean scenario, ways to change it, and Python in a process of its own."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

import crowdsim
from crowdsim.scenario.reader import Scenario, parse_scenario

CLEAN = """\
[scenario]
title = "Weir Lane footbridge"

[deck]
length = 48.0
width = 3.2

[[mode]]
name = "V1"
frequency = 1.92
damping = 0.005
modal_mass = 38500.0
vertical = { half_waves = 1 }

[[stream]]
name = "commuters"
arrival = { per_hour = 900 }
pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }
load = { harmonics = [0.4, 0.1, 0.1] }

[run]
duration = 900.0
realisations = 200
seed = 7
"""

Change = tuple[str, str]


@pytest.fixture(scope="session")
def clean() -> str:
    """A scenario without a problem and without a finding."""
    return CLEAN


@pytest.fixture(scope="session")
def changed() -> Callable[..., str]:
    """The clean scenario with (old, new) replaced once each; an empty `old` adds `new` at the end."""

    def change(*changes: Change) -> str:
        text = CLEAN
        for old, new in changes:
            assert text.count(old) >= 1, f"{old!r} is not in the scenario"
            text = text.replace(old, new, 1) if old else text + new
        return text

    return change


@pytest.fixture(scope="session")
def scenario(changed: Callable[..., str]) -> Callable[..., Scenario]:
    """The same, read."""

    def read(*changes: Change) -> Scenario:
        return parse_scenario(changed(*changes), "weir.toml")

    return read


@pytest.fixture(scope="session")
def python() -> Callable[..., str]:
    """Runs a program in a Python of its own, with environment variables set, and gives what it prints."""
    root = Path(crowdsim.__file__).parents[1]

    def run(program: str, **environment: str) -> str:
        inherited = {k: v for k, v in os.environ.items() if not k.startswith("NUMBA_")}
        done = subprocess.run(
            [sys.executable, "-c", program],
            env={**inherited, "PYTHONPATH": str(root), **environment},
            capture_output=True,
            text=True,
            check=False,
            timeout=300,
        )
        assert done.returncode == 0, done.stderr
        return done.stdout

    return run
