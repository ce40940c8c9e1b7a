"""crowdsim: will people find a footbridge too lively, how sure is that, what damping would cure it.

The data flow one way::

    scenario.toml --read--> Scenario --plan--> Case        what vibrates, who walks, which step
    Case, number --draw---> People, Passages               the only random stage
    Passages -------------> modal force --> modal motion   the kernels
    motion ---------------> measures, a row a realisation
    rows -----------------> results.h5 --> Results, Summary, Judgement, Comparison --> figures, screens

Rooms: errors; scenario, bridge, crowd, loads, dynamics, response, guides, study, results; plots, console
and cli on top. See DEVELOPERS.md. Names below are loaded when they are first used.
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
    from crowdsim.guides.criterion import Criterion
    from crowdsim.loads.sets import load_set
    from crowdsim.plots.draw import draw
    from crowdsim.results.judgement import Judgement
    from crowdsim.results.reader import Results, open_results
    from crowdsim.results.summary import CaseSummary, summarise
    from crowdsim.scenario.reader import Scenario, parse_scenario, read_scenario
    from crowdsim.study.compare import Comparison, compare_file
    from crowdsim.study.estimate import Estimates, estimate
    from crowdsim.study.sensitivity import sensitivity
    from crowdsim.study.simulate import plan, simulate

_HOMES = {
    "CaseSummary": "results.summary",
    "Comparison": "study.compare",
    "Criterion": "guides.criterion",
    "CrowdsimError": "errors",
    "Estimates": "study.estimate",
    "HalfWaves": "bridge.ordinates",
    "InputError": "errors",
    "Judgement": "results.judgement",
    "ModalModel": "bridge.modal",
    "Mode": "bridge.modal",
    "Newmark": "dynamics.newmark",
    "People": "crowd.people",
    "Point": "bridge.modal",
    "Results": "results.reader",
    "Scenario": "scenario.reader",
    "Table": "bridge.ordinates",
    "Walkers": "crowd.people",
    "compare_file": "study.compare",
    "draw": "plots.draw",
    "draw_people": "crowd.people",
    "estimate": "study.estimate",
    "load_set": "loads.sets",
    "open_results": "results.reader",
    "parse_scenario": "scenario.reader",
    "plan": "study.simulate",
    "read_scenario": "scenario.reader",
    "sensitivity": "study.sensitivity",
    "simulate": "study.simulate",
    "summarise": "results.summary",
}

__all__ = [
    "CaseSummary",
    "Comparison",
    "Criterion",
    "CrowdsimError",
    "Estimates",
    "HalfWaves",
    "InputError",
    "Judgement",
    "ModalModel",
    "Mode",
    "Newmark",
    "People",
    "Point",
    "Results",
    "Scenario",
    "Table",
    "Walkers",
    "compare_file",
    "draw",
    "draw_people",
    "estimate",
    "load_set",
    "open_results",
    "parse_scenario",
    "plan",
    "read_scenario",
    "sensitivity",
    "simulate",
    "summarise",
]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        from importlib import import_module

        return getattr(import_module(f"crowdsim.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'crowdsim' has no attribute {name!r}")
