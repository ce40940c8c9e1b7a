"""A scenario as understood: what `crowdsim check` shows."""

from __future__ import annotations

from dataclasses import asdict
from math import isfinite
from typing import Any

from crowdsim.console.base import CAUTION, Console
from crowdsim.console.screening import screening
from crowdsim.guides.catalogue import CRITERIA
from crowdsim.results.judgement import LOADED
from crowdsim.results.judgement import asked as asked_of
from crowdsim.results.texts import number, span
from crowdsim.study.executor import default_workers
from crowdsim.study.prepare import Case
from crowdsim.study.screening import screen
from crowdsim.study.simulate import Plan

# measured on one core; says how long a run takes, decides nothing
_PER_PERSON_STEP = 0.5e-9
_PER_STEP = 12e-9
_START = 1.0


def check(console: Console, plan: Plan) -> None:
    """A scenario as understood."""
    if console.json:
        console.data(check_dict(plan))
        return
    model = plan.cases[0].bare
    console.heading(plan.scenario.title)
    if plan.scenario.file.scenario.note:
        console.line(plan.scenario.file.scenario.note)
    console.out.print(f"Deck {number(model.length)} m long, {number(model.width)} m wide")
    rows = []
    for m in model.modes:
        shapes = [
            f"{d}: {getattr(m, d).text()}"
            for d in ("vertical", "lateral", "longitudinal", "twist")
            if getattr(m, d) is not None
        ]
        rows.append([m.name, f"{number(m.frequency, 4)} Hz", f"{number(100 * m.damping)} %",
                     f"{number(m.modal_mass, 4)} kg", span(m.time_constant), "; ".join(shapes)])  # fmt: skip
    columns = [("mode", "l"), ("frequency", "r"), ("damping", "r"), ("modal mass", "r"), ("1/(zeta omega)", "r"),
               ("ordinates", "l")]  # fmt: skip
    console.table("Modes", columns, rows, spare=("1/(zeta omega)", "modal mass"))
    screening(console, tuple(screen(plan.cases)))
    for case in plan.cases:
        _case(console, plan, case)
    console.items("Findings", [f"{f.level}: {f.line()}" for f in plan.findings])
    if not plan.findings:
        console.out.print("No findings.")
    console.line(CAUTION)


def _case(console: Console, plan: Plan, case: Case) -> None:
    console.out.print()
    console.heading(f"Case {case.name}")
    density = case.persons / (case.bare.length * case.bare.width)
    console.out.print(f"{number(case.persons)} persons on the deck on average, {number(density)} per m2")
    console.line(_asked(case))
    rows = [
        [s.walkers.name, s.walkers.pace.text("Hz"), f"{number(1.0 / s.inverse_speed)} m/s",
         s.walkers.weight.text("N"), s.load.name, number(s.persons)]
        for s in case.streams
    ]  # fmt: skip
    columns = [("stream", "l"), ("pace", "l"), ("speed, mean on deck", "r"), ("weight", "l"), ("load", "l"),
               ("on deck", "r")]  # fmt: skip
    console.table("Streams", columns, rows, spare=("weight", "speed, mean on deck"))
    c = case.choice
    console.out.print(
        f"Time step 1/{c.per_second} s, force sampled at every {_ordinal(c.factor)}step, "
        f"expected error of a resonant peak {100 * c.expected_error:.3g} %; warm-up {span(case.warm_up)}"
    )
    steps = plan.person_steps(case)
    seconds = run_time(plan, case, default_workers())
    console.out.print(
        f"{plan.realisations:,} realisations of {span(case.duration)}: "
        f"{plan.realisations * steps:.2g} person-steps, about {span(seconds)} with {default_workers()} workers"
    )
    if console.verbose:
        console.out.print(
            f"Errors: peak by parabola {c.peak_error:.1e}, integration {c.history_error:.1e}, ordinates between "
            f"table values {c.ordinate_error:.1e}, force between samples {c.sampling_error:.1e}"
        )
        rows = [[p.name, number(p.s), number(p.e), p.direction] for p in case.points]
        console.table("Recorded", [("at", "l"), ("s, m", "r"), ("e, m", "r"), ("direction", "l")], rows)
    from crowdsim.study.assumptions import assumptions

    console.items("Assumed", assumptions(plan.scenario, case))


def _asked(case: Case) -> str:
    criterion = CRITERIA[case.criterion]
    asked = {"name": case.name, "criterion": case.criterion, "target": case.target, "limit": case.limit}
    wants = [
        f"{direction} {number(limit.limit)} m/s2 ({limit.words})"
        for direction in case.model.directions
        if direction in LOADED
        and (limit := asked_of({k: v for k, v in asked.items() if v is not None}, direction)).limit is not None
    ]
    kind = "classes" if criterion.classes else "limits"
    return (
        f"Asked: {', '.join(wants) or 'no limit'}; {kind} of {criterion.title}; peaks in {span(case.window)}; seed "
        f"{case.seed}"
    )


def _ordinal(factor: int) -> str:
    return {1: "", 2: "second ", 4: "fourth "}[factor]


def run_time(plan: Plan, case: Case, workers: int) -> float:
    """Rough seconds of a case, from figures measured on one core of a server."""
    one: float = plan.person_steps(case) * _PER_PERSON_STEP + case.recorder.total * _PER_STEP * (
        1 + len(case.driven) / 4
    )
    return _START + plan.realisations * (one + 4e-4) / workers


def check_dict(plan: Plan) -> dict[str, Any]:
    """A scenario as understood, for programs."""
    model = plan.cases[0].bare
    return {
        "title": plan.scenario.title,
        "deck": {"length": model.length, "width": model.width},
        "modes": [
            {"name": m.name, "frequency": m.frequency, "damping": m.damping, "modal_mass": m.modal_mass}
            for m in model.modes
        ],
        "cases": [
            {
                "name": case.name,
                "persons_on_deck": case.persons,
                "time_step": case.choice.time_step,
                "expected_error": case.choice.expected_error if isfinite(case.choice.expected_error) else None,
                "warm_up": case.warm_up,
                "duration": case.duration,
                "person_steps": plan.realisations * plan.person_steps(case),
                "run_time": run_time(plan, case, default_workers()),
                "modes": [
                    {"name": m.name, "frequency": m.frequency, "modal_mass": m.modal_mass} for m in case.model.modes
                ],
                "points": [{"name": p.name, "s": p.s, "e": p.e, "direction": p.direction} for p in case.points],
            }
            for case in plan.cases
        ],
        "screening": [asdict(s) for s in screen(plan.cases)],
        "realisations": plan.realisations,
        "findings": [{"level": f.level, "key": f.key, "text": f.text} for f in plan.findings],
        "notes": list(plan.scenario.notes),
    }
