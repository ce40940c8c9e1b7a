"""Scenarios by the thousand: a hypothesis strategy of valid scenario tables, and a writer of TOML.

The tests here are derandomised: every run of the suite sees the same examples. Deadlines are off, because the first
example compiles the kernels.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import pytest
from hypothesis import strategies as st

Tables = dict[str, Any]
WALKING_SETS = ["bachmann-ammann-1987", "kerr-1998", "young-2001-mean", "young-2001-design", "iso-10137-2007",
                "zivanovic-2007", "setra-2006"]  # fmt: skip
SCATTERED = ["kerr-1998", "young-2001-mean", "zivanovic-2007"]
JOGGING_SETS = ["iso-10137-2007", "bachmann-1995"]
POPULATIONS = ["zivanovic-2007", "matsumoto-1978", "setra-2006", "caprani-2012"]


def write_toml(value: Any, top: bool = True) -> str:
    """The value as TOML: tables and lists inline, so that any nesting can be written."""
    if isinstance(value, dict):
        if top:
            return "\n".join(f"{key} = {write_toml(item, False)}" for key, item in value.items()) + "\n"
        return "{ " + ", ".join(f"{key} = {write_toml(item, False)}" for key, item in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(write_toml(item, False) for item in value) + "]"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return '"' + value + '"'
    return repr(value)  # numbers; repr writes nan and inf as TOML does


def number(low: float, high: float) -> st.SearchStrategy[float]:
    """One of 1001 numbers from low to high: an engineer's, none of 1e-300."""
    return st.integers(0, 1000).map(lambda i: round(low + (high - low) * i / 1000.0, 9))


def quantity(mean: tuple[float, float], share: tuple[float, float] = (0.05, 0.2)) -> st.SearchStrategy[Any]:
    """A positive quantity: fixed, uniform, or normal or lognormal, cut at 2.5 standard deviations."""

    @st.composite
    def random(draw: st.DrawFn) -> Any:
        kind = draw(st.sampled_from(["fixed", "uniform", "normal", "lognormal", "default"]))
        centre = draw(number(*mean))
        if kind == "fixed":
            return centre
        spread = centre * draw(number(*share))
        low, high = centre - 2.5 * spread, centre + 2.5 * spread
        if kind == "uniform":
            return {"distribution": kind, "min": low, "max": high}
        table = {"mean": centre, "sd": spread, "min": low, "max": high}
        return table if kind == "default" else {"distribution": kind, **table}

    return random()


@st.composite
def shape(draw: st.DrawFn, length: float) -> Tables:
    """Half waves or a table."""
    if draw(st.booleans()):
        return {"half_waves": draw(st.integers(1, 3)), "amplitude": draw(st.sampled_from([1.0, 0.4, -1.3]))}
    count = draw(st.integers(2, 9))
    value = draw(st.lists(number(-1.5, 1.5), min_size=count, max_size=count))
    value = value if any(value) else [1.0] * count
    if draw(st.booleans()):
        value = [0.0, *value, 0.0]
    s = [length * i / (len(value) - 1) for i in range(len(value))]
    s[-1] = length
    return {"s": s, "value": value, "interpolation": draw(st.sampled_from(["spline", "linear", "monotone"]))}


@st.composite
def mode(draw: st.DrawFn, name: str, length: float, width: float, lateral_alone: bool) -> Tables:
    """A mode that a vertical force drives, or one that is only lateral."""
    table: Tables = {
        "name": name,
        "frequency": draw(number(0.8, 8.0)),
        "damping": draw(number(0.002, 0.05)),
        "modal_mass": draw(number(60.0, 500.0)) * length * width,
    }
    given = draw(st.sampled_from(["vertical", "vertical", "twist", "both", "all", "lateral"]))
    if given == "lateral" and not lateral_alone:
        given = "vertical"
    if given in ("vertical", "both", "all"):
        table["vertical"] = draw(shape(length))
    if given in ("twist", "both", "all"):
        table["twist"] = draw(shape(length))
    if given in ("lateral", "all"):
        table["lateral"] = draw(shape(length))
    return table


@st.composite
def arrival(draw: st.DrawFn, area: float) -> Tables:
    """One of the four; three streams stay far below the 6 persons/m2 that cannot stand there."""
    return draw(
        st.one_of(
            st.fixed_dictionaries({"per_hour": number(1.0, 3000.0)}),
            st.fixed_dictionaries({"density": number(0.005, 0.6)}),
            st.fixed_dictionaries({"constant": st.integers(1, min(int(area), 150))}),
            st.fixed_dictionaries({"times": st.lists(number(0.0, 30.0), min_size=1, max_size=8)}),
        )
    )


@st.composite
def load(draw: st.DrawFn, gait: str) -> Any:
    """Load factors written out or a published set."""
    if draw(st.booleans()):
        harmonics = draw(st.lists(number(0.0, 0.5), min_size=1, max_size=8))
        harmonics = harmonics if any(harmonics) else [0.4]
        table: Tables = {"harmonics": harmonics}
        if draw(st.booleans()):
            table["phases"] = draw(
                st.lists(number(-math.pi, math.pi), min_size=len(harmonics), max_size=len(harmonics))
            )
        return table
    if gait == "jogging":
        if draw(st.booleans()):
            return {"set": "half-sine", "contact_ratio": draw(number(0.3, 1.0))}
        return draw(st.sampled_from(JOGGING_SETS))
    if draw(st.booleans()):
        return {"set": draw(st.sampled_from(SCATTERED)), "scatter": draw(st.booleans())}
    return draw(st.sampled_from(WALKING_SETS))


@st.composite
def stream(draw: st.DrawFn, name: str, length: float, width: float, modes: list[Tables]) -> Tables:
    """People who are alike; what is left out has a default."""
    gait = draw(st.sampled_from(["walking", "walking", "jogging"]))
    table: Tables = {"name": name, "gait": gait, "arrival": draw(arrival(length * width))}
    if draw(st.booleans()):
        table["forward_share"] = draw(st.sampled_from([0.0, 0.5, 0.3, 1.0]))
    if gait == "walking" and draw(st.booleans()):
        table["population"] = draw(st.sampled_from(POPULATIONS))
    if draw(st.booleans()):
        pace = draw(quantity((1.5, 2.2) if gait == "walking" else (2.4, 3.0), (0.04, 0.1)))
        fitting = [(m["name"], h) for m in modes for h in (1, 2, 3) if 1.4 <= m["frequency"] / h <= 3.0]
        if fitting and draw(st.booleans()):
            at, harmonic = draw(st.sampled_from(fitting))
            pace = {"mean_at": at, "harmonic": harmonic, "sd": 0.15} if draw(st.booleans()) else {"mean_at": at}
            if "sd" not in pace and harmonic != 1:
                pace["harmonic"] = harmonic
        table["pace"] = pace
    if draw(st.booleans()):
        if draw(st.booleans()):
            table["speed"] = draw(quantity((1.0, 1.7) if gait == "walking" else (2.0, 3.5)))
        else:
            table["step_length"] = draw(quantity((0.55, 0.9)))
    if draw(st.booleans()):
        table["weight"] = draw(st.one_of(quantity((500.0, 1000.0)), st.just("75 kg")))
    if draw(st.booleans()):
        table["load"] = draw(load(gait))
    if draw(st.booleans()):
        table["phase"] = draw(
            st.sampled_from([0.0, 1.0, "90 deg", {"distribution": "uniform", "min": 0.0, "max": 1.0}])
        )
    if draw(st.booleans()):
        half = 0.5 * width
        table["offset"] = draw(
            st.sampled_from([0.0, 0.4 * half, -half, {"mean": 0.1, "sd": 0.3, "min": -0.6 * half, "max": half}])
        )
    return table


@st.composite
def tables(draw: st.DrawFn) -> Tables:
    """A valid scenario: a small bridge, up to five modes, up to three streams, a run of seconds."""
    length, width = draw(number(8.0, 150.0)), draw(number(1.2, 6.0))
    modes = [draw(mode(f"M{i}", length, width, lateral_alone=i > 0)) for i in range(draw(st.integers(1, 5)))]
    streams = [draw(stream(f"S{i}", length, width, modes)) for i in range(draw(st.integers(1, 3)))]
    file: Tables = {"deck": {"length": length, "width": width}, "mode": modes, "stream": streams}
    if draw(st.booleans()):
        file["scenario"] = {"title": "Crossing", "note": "a note"}
    names = [s["name"] for s in streams]
    cases = []
    for i in range(draw(st.integers(0, 2))):
        case: Tables = {"name": f"case {i}", "people": draw(st.sampled_from(["none", "mass"]))}
        if draw(st.booleans()):
            case["streams"] = draw(st.lists(st.sampled_from(names), min_size=1, unique=True))
        ask = draw(st.sampled_from(["nothing", "target", "limit"]))
        if ask == "target":
            case["target"] = draw(st.sampled_from(["CL1", "CL2", "CL3"]))
        elif ask == "limit":
            case["limit"] = draw(number(0.1, 2.0))
        cases.append(case)
    if cases:
        file["case"] = cases
    if draw(st.booleans()):
        file["point"] = [
            {"name": "bench", "s": draw(number(0.0, 1.0)) * length, "e": draw(number(-0.5, 0.5)) * width,
             "direction": draw(st.sampled_from(["vertical", "lateral", "longitudinal"]))}
        ]  # fmt: skip
    run: Tables = {"duration": draw(number(5.0, 20.0)), "realisations": draw(st.integers(1, 2))}
    if draw(st.booleans()):
        run["seed"] = draw(st.integers(0, 2**40))
    if draw(st.booleans()):
        run["integration"] = draw(st.sampled_from(["fox-goodwin", "linear-acceleration", "average-acceleration"]))
        run["matched"] = draw(st.booleans())
    if draw(st.booleans()):
        run["time_step"] = draw(st.sampled_from([0.01, 0.005, 0.0025, "4 ms"]))
    if draw(st.booleans()):
        run["warm_up"] = draw(st.sampled_from([0.0, 20.0, "1 min"]))
    file["run"] = run
    if draw(st.booleans()):
        file["comfort"] = {"criterion": "eur-23984", "window": draw(number(1.0, 30.0))}
    return file


@pytest.fixture(scope="session")
def valid_tables() -> st.SearchStrategy[Tables]:
    """Strategy of valid scenarios as nested tables."""
    return tables()


@pytest.fixture(scope="session")
def toml() -> Callable[[Any], str]:
    """Writes tables as TOML."""
    return write_toml
