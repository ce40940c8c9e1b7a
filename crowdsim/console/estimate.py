"""What `crowdsim estimate` shows: the screening, then the formulas case by case."""

from __future__ import annotations

from crowdsim.console.base import CAUTION, Console
from crowdsim.console.formulas import formulas, meanings
from crowdsim.console.screening import screening
from crowdsim.results.texts import number, span
from crowdsim.study.estimate import Estimates


def estimate(console: Console, estimates: Estimates) -> None:
    """Screening and formulas."""
    if console.json:
        console.data(estimates.as_dict())
        return
    console.heading(estimates.title)
    console.line()
    screening(console, estimates.screening)
    for now in estimates.situations:
        console.line()
        console.heading(f"Case {now.name}")
        console.line(
            f"{number(now.persons)} persons on the deck on average; the peak of a random stream is that in "
            f"{span(now.window)}."
        )
        formulas(console, estimates.of(now.name))
    console.line()
    console.items("What they stand for, each at its first use", meanings(estimates.methods))
    console.line(
        "Hand formulas stand for what their line says, no more; a simulation of the case is beside them in "
        "crowdsim simulate and crowdsim compare."
    )
    console.line(CAUTION)
