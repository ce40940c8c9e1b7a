"""crowdsim: will people find a footbridge too lively, how sure is that, what damping would cure it.

The data flow one way::

    scenario.toml --read--> Scenario --plan--> Case        what vibrates, who walks, which step
    Case, number --draw---> People, Passages               the only random stage
    Passages -------------> modal force --> modal motion   the kernels
    motion ---------------> measures, a row a realisation
    rows -----------------> results.h5 --> Results, Summary

Rooms: errors; scenario, bridge, crowd, loads, dynamics, response, study, results; console and cli
on top. See DEVELOPERS.md. Names below are loaded when they are first used.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

if TYPE_CHECKING:
    from crowdsim.bridge.modal import ModalModel, Mode, Point
    from crowdsim.bridge.ordinates import HalfWaves, Table
    from crowdsim.crowd.people import People, Walkers, draw_people
    from crowdsim.dynamics.newmark import Newmark
    from crowdsim.errors import CrowdsimError, InputError
    from crowdsim.loads.sets import load_set
    from crowdsim.results.reader import Results, open_results
    from crowdsim.results.summary import summarise
    from crowdsim.scenario.reader import Scenario, parse_scenario, read_scenario
    from crowdsim.study.simulate import plan, simulate

_HOMES = {
    "CrowdsimError": "errors",
    "HalfWaves": "bridge.ordinates",
    "InputError": "errors",
    "ModalModel": "bridge.modal",
    "Mode": "bridge.modal",
    "Newmark": "dynamics.newmark",
    "People": "crowd.people",
    "Point": "bridge.modal",
    "Results": "results.reader",
    "Scenario": "scenario.reader",
    "Table": "bridge.ordinates",
    "Walkers": "crowd.people",
    "draw_people": "crowd.people",
    "load_set": "loads.sets",
    "open_results": "results.reader",
    "parse_scenario": "scenario.reader",
    "plan": "study.simulate",
    "read_scenario": "scenario.reader",
    "simulate": "study.simulate",
    "summarise": "results.summary",
}

__all__ = [
    "CrowdsimError",
    "HalfWaves",
    "InputError",
    "ModalModel",
    "Mode",
    "Newmark",
    "People",
    "Point",
    "Results",
    "Scenario",
    "Table",
    "Walkers",
    "draw_people",
    "load_set",
    "open_results",
    "parse_scenario",
    "plan",
    "read_scenario",
    "simulate",
    "summarise",
]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        from importlib import import_module

        return getattr(import_module(f"crowdsim.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'crowdsim' has no attribute {name!r}")
