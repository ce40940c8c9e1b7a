"""What a case takes for granted, in sentences for the output."""

from __future__ import annotations

from crowdsim.crowd.arrivals import ConstantNumber, GivenArrivals, PoissonArrivals
from crowdsim.scenario.reader import Scenario
from crowdsim.study.prepare import Case


def assumptions(scenario: Scenario, case: Case) -> list[str]:
    """Every default and simplification behind the numbers of `case`."""
    run = scenario.file.run
    said: list[str] = []
    for stream in case.streams:
        walkers = stream.walkers
        name = walkers.name
        arrivals = walkers.arrivals
        if isinstance(arrivals, PoissonArrivals):
            said.append(f"{name}: Poisson arrivals, {3600 * arrivals.rate:.4g} per hour in all")
        elif isinstance(arrivals, ConstantNumber):
            said.append(f"{name}: {arrivals.count} on the deck at all times; whoever leaves re-enters at the other end")
        elif isinstance(arrivals, GivenArrivals):
            said.append(f"{name}: {len(arrivals.times)} given arrivals")
        said += [f"{name}: {source}" for source in stream.sources]
        said.append(f"{name}: pace {walkers.pace.text('Hz')}; weight {walkers.weight.text('N')}")
        if walkers.speed is not None:
            said.append(f"{name}: speed {walkers.speed.text('m/s')}, step length follows")
        elif walkers.step_length is not None:
            said.append(f"{name}: step length {walkers.step_length.text('m')}, speed = pace x step length")
        phase = "uniform at random" if walkers.phase is None else walkers.phase.text("rad")
        each = "as the load set has them" if stream.load.phases is not None else "each at random (the source has none)"
        said.append(f"{name}: phase of the first step {phase}; phases of the harmonics {each}")
        said.append(f"{name}: walking line e {walkers.offset.text('m')}")
        if stream.outside > 0.0005:
            low, high = stream.load.pace_range
            said.append(
                f"{name}: {100 * stream.outside:.3g} % of paces outside {low:g} to {high:g} Hz, held at the limit"
            )
    if case.people == "mass":
        changed = [
            f"{m.name} +{case.added_mass[m.name]:.4g} kg, {bare.frequency:.4g} to {m.frequency:.4g} Hz"
            for bare, m in zip(case.bare.modes, case.model.modes, strict=True)
        ]
        said.append(
            "people add their mass, spread evenly along the deck: "
            + "; ".join(changed)
            + "; damping ratios and shapes kept"
        )
    else:
        said.append("the people's effect on the modes is left out")
    said.append("vertical forces only; perfect gait: pace and force of a person do not vary while crossing")
    said.append("people walk independently; nobody slows anyone down or falls into step")
    said += scenario.notes
    scheme = f"Newmark, {run.integration}" + (", stiffness and damping matched to the step" if run.matched else "")
    said.append(
        f"{scheme}; step 1/{case.choice.per_second} s; a resonant peak is within about "
        f"{100 * case.choice.expected_error:.3g} %"
    )
    return said
