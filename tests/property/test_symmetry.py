"""What must not matter does not: the sign and scale of weights, the end from which the deck is looked at, its sides.

Mirroring about mid-span turns s into L - s: shapes are reversed, who walked towards growing s now walks back; the twist
keeps its sign, since left stays left. Mirroring about the centre line turns e into -e: the twist changes sign (what
lifted the left edge now lifts the right one), walking lines change sides. Both together are a turn of the observer.

Equal means equal but for rounding: sums of some 1e4 terms of relative error 1e-16 leave about 1e-14, of which a
lightly damped mode makes 1/(2 zeta) = 250 times as much at worst. `ROUNDING` is four times that.
"""

from __future__ import annotations

import copy
from collections.abc import Callable
from dataclasses import fields, replace
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

import crowdsim
from crowdsim.dynamics.newmark import Newmark, step_coefficients
from crowdsim.dynamics.realisation import CELLS, Deck, Passages, Recorder, Response, deck_table, run, table_cells
from crowdsim.study.jobs import run_realisation
from crowdsim.study.simulate import plan

Floats = NDArray[np.float64]
Tables = dict[str, Any]
Writer = Callable[[Any], str]
FIXED = settings(deadline=None, derandomize=True, database=None, suppress_health_check=[HealthCheck.too_slow])
ROUNDING = 1e-11
MEASURES = ("peak", "rms", "running_rms_max", "window_peak", "envelope", "history")


def run_first(text: str) -> list[Response]:
    """Realisation 0 of every case, with the whole observed history."""
    found = []
    for case in plan(crowdsim.parse_scenario(text)).cases:
        row = run_realisation(case, 0, history=(case.recorder.warm, case.recorder.total))
        assert row is not None
        found.append(row.response)
    return found


def assert_equal_but_for_rounding(
    first: Response, second: Response, factor: float = 1.0, columns: slice = slice(None)
) -> None:
    """second = factor x first, relative to the largest acceleration anywhere; columns: which points."""
    largest = factor * max(float(first.envelope.max()), 1e-12)
    for name in ("peak", "rms", "running_rms_max", "window_peak"):
        a, b = getattr(first, name)[..., columns], getattr(second, name)[..., columns]
        np.testing.assert_allclose(b, factor * a, rtol=0.0, atol=ROUNDING * largest, err_msg=name)


@settings(FIXED, max_examples=40)
@given(data=st.data())
def test_accelerations_go_with_the_weights(
    valid_tables: st.SearchStrategy[Tables], toml: Writer, data: st.DataObject
) -> None:
    """Weights times c, fixed or random: accelerations times c; for a power of two to the last bit."""
    tables = data.draw(valid_tables)
    factor = data.draw(st.sampled_from([2.0, 0.25, 1.37, 0.1]))
    for case in tables.get("case", []):
        case["people"] = "none"  # or the heavier people would change the modes
    tables["stream"][0]["arrival"] = {"times": [0.0, 1.234, 5.0]}  # or there may be nobody to compare
    heavier = copy.deepcopy(tables)
    for stream, other in zip(tables["stream"], heavier["stream"], strict=True):
        weight = data.draw(
            st.sampled_from([700.0, {"mean": 760.0, "sd": 90.0, "min": 500.0, "max": 1000.0},
                             {"distribution": "uniform", "min": 600.0, "max": 800.0}])
        )  # fmt: skip
        stream["weight"] = weight
        other["weight"] = (
            {k: v if isinstance(v, str) else factor * v for k, v in weight.items()}
            if isinstance(weight, dict)
            else factor * weight
        )
    for light, heavy in zip(run_first(toml(tables)), run_first(toml(heavier)), strict=True):
        assert_equal_but_for_rounding(light, heavy, factor)
        if factor in (2.0, 0.25):
            for name in MEASURES:
                np.testing.assert_array_equal(getattr(heavy, name), factor * getattr(light, name), err_msg=name)


def mirrored_shape(shape: Tables, length: float) -> Tables:
    """The shape seen from the other end."""
    if "half_waves" in shape:
        sign = 1.0 if shape["half_waves"] % 2 else -1.0  # sin(n pi (L - s)/L) = -(-1)^n sin(n pi s/L)
        return {**shape, "amplitude": sign * shape.get("amplitude", 1.0)}
    return {**shape, "s": [length - s for s in reversed(shape["s"])], "value": list(reversed(shape["value"]))}


def negative_shape(shape: Tables) -> Tables:
    """The shape upside down."""
    if "half_waves" in shape:
        return {**shape, "amplitude": -shape.get("amplitude", 1.0)}
    return {**shape, "value": [-v for v in shape["value"]]}


def mirrored(tables: Tables, *, ends: bool, sides: bool) -> Tables:
    """The same bridge and people after s -> L - s and, or, e -> -e."""
    other = copy.deepcopy(tables)
    length = other["deck"]["length"]
    for mode in other["mode"]:
        for direction in ("vertical", "lateral", "longitudinal", "twist"):
            if direction in mode and ends:
                mode[direction] = mirrored_shape(mode[direction], length)
        if "twist" in mode and sides:
            mode["twist"] = negative_shape(mode["twist"])
    for stream in other["stream"]:
        if ends:
            stream["forward_share"] = 1.0 - stream["forward_share"]
        if sides:
            stream["offset"] = -stream["offset"]
    for point in other["point"]:
        if ends:
            point["s"] = length - point["s"]
        if sides:
            point["e"] = -point["e"]
    return other


@settings(FIXED, max_examples=60)
@given(data=st.data())
def test_a_mirrored_scenario_gives_the_mirrored_response(
    valid_tables: st.SearchStrategy[Tables], toml: Writer, data: st.DataObject
) -> None:
    """Peaks, RMS and running RMS at three places of the writer's own, for all three ways of looking.

    Streams are all forward or all back, with a fixed walking line, so that the mirrored file draws the mirrored
    persons; a constant crowd is tested below, on walks.
    """
    tables = data.draw(valid_tables)
    length, width = tables["deck"]["length"], tables["deck"]["width"]
    tables["stream"][0]["arrival"] = {"constant": 3}
    for stream in tables["stream"]:
        stream["forward_share"] = data.draw(st.sampled_from([0.0, 1.0]))
        stream["offset"] = data.draw(st.sampled_from([-0.45, -0.2, 0.0, 0.3])) * width
        if "constant" in stream["arrival"]:
            stream["arrival"] = {"times": [0.0, 1.234, 5.0]}
    tables["point"] = [
        {"name": f"place {i}", "s": share * length, "e": side * width, "direction": direction}
        for i, (share, side, direction) in enumerate(
            [(0.13, 0.5, "vertical"), (0.5, -0.2, "vertical"), (0.71, 0.0, "lateral")]
        )
    ]
    here = run_first(toml(tables))
    for ends, sides in ((True, False), (False, True), (True, True)):
        there = run_first(toml(mirrored(tables, ends=ends, sides=sides)))
        for one, other in zip(here, there, strict=True):
            # the antinodes come first; of two equal ones the mirrored deck may name the other
            assert_equal_but_for_rounding(one, other, columns=slice(-3, None))


LENGTH, WIDTH, TIME_STEP, FACTOR, TOTAL, WARM = 30.0, 3.0, 0.01, 4, 2001, 400
PLACES = np.array([0.0, 0.11, 0.35, 0.5, 0.62, 0.9, 1.0]) * LENGTH
FREQUENCY, DAMPING = np.array([1.9, 2.7, 4.4]), np.array([0.004, 0.01, 0.02])
MODAL_MASS = np.array([20e3, 12e3, 25e3])


def vertical(s: Floats) -> Floats:
    """Three shapes without symmetry, nought at both ends, smooth beyond them [place, mode]."""
    x = s / LENGTH
    return np.stack(
        [np.sin(np.pi * x), 0.4 * np.sin(np.pi * x) * (x - 0.3), np.sin(2 * np.pi * x) * (1.2 - x)], axis=-1
    )


def twist(s: Floats) -> Floats:
    """The same for the twist [rad]."""
    x = s / LENGTH
    return np.stack([np.zeros_like(x), 0.5 * np.sin(np.pi * x) * (1.0 + 0.4 * x), 0.1 * np.sin(3 * np.pi * x)], axis=-1)


def deck_and_recorder(*, ends: bool, sides: bool) -> tuple[Deck, Recorder]:
    """The deck, and the points on its left edge, after s -> L - s and, or, e -> -e."""
    before = table_cells(LENGTH, FACTOR * TIME_STEP)
    s = (np.arange(CELLS + 2 * before + 2) - before) * (LENGTH / CELLS)
    along = LENGTH - s if ends else s
    sign = -1.0 if sides else 1.0
    deck = deck_table(vertical(along), sign * twist(along), LENGTH, before)
    # the points are the same places of the bridge, whatever they are called now
    points = vertical(PLACES) + 0.5 * WIDTH * twist(PLACES)
    return deck, Recorder(points, points, TOTAL, WARM, 100, 500)


def some_passages(seed: int, count: int, harmonics: int) -> Passages:
    """Both ways, some of them on the deck at time 0, some standing, anywhere across the width."""
    g = np.random.default_rng(seed)
    forward = g.random(count) < 0.5
    middle = g.random(count) < 0.4
    place = np.where(middle, g.random(count) * LENGTH, np.where(forward, 0.0, LENGTH))
    speed = np.where(middle & (g.random(count) < 0.3), 0.0, g.uniform(0.7, 3.0, count))
    enter = np.where(middle, 0.0, g.uniform(0.0, 18.0, count))
    way = np.where(forward, LENGTH - place, place)
    with np.errstate(divide="ignore"):
        leave = np.where(speed > 0.0, enter + way / speed, 1000.0)
    force = g.uniform(100.0, 300.0, (count, harmonics)) / np.arange(1, harmonics + 1)
    phase = g.uniform(0.0, 2.0 * np.pi, (count, harmonics))
    return Passages(
        enter=enter, leave=leave, place=place, velocity=np.where(forward, speed, -speed),
        offset=g.uniform(-0.5, 0.5, count) * WIDTH, pace=g.uniform(1.5, 2.5, count), turns=g.random(count),
        cosine=force * np.cos(phase), sine=force * np.sin(phase),
    )  # fmt: skip


def run_passages(passages: Passages, *, ends: bool = False, sides: bool = False) -> Response:
    """Their response with the whole history."""
    deck, recorder = deck_and_recorder(ends=ends, sides=sides)
    step = step_coefficients(Newmark(), FREQUENCY, DAMPING, MODAL_MASS, TIME_STEP)
    response = run(passages, deck, step, recorder, TIME_STEP, factor=FACTOR, history=(0, TOTAL))
    assert response is not None
    return response


@pytest.mark.parametrize(("ends", "sides"), [(True, False), (False, True), (True, True)])
@settings(FIXED, max_examples=150)
@given(seed=st.integers(0, 10_000), count=st.integers(1, 40), harmonics=st.integers(1, 8))
def test_mirrored_walks_on_a_mirrored_deck(ends: bool, sides: bool, seed: int, count: int, harmonics: int) -> None:
    """The whole history at seven places of the left edge, three modes without symmetry, walkers of all kinds."""
    passages = some_passages(seed, count, harmonics)
    other = replace(
        passages,
        place=LENGTH - passages.place if ends else passages.place,
        velocity=-passages.velocity if ends else passages.velocity,
        offset=-passages.offset if sides else passages.offset,
    )
    one, two = run_passages(passages), run_passages(other, ends=ends, sides=sides)
    largest = np.abs(one.history).max()
    assert largest > 0.0
    np.testing.assert_allclose(two.history, one.history, rtol=0.0, atol=ROUNDING * largest)
    for name in ("peak", "rms", "running_rms_max", "window_peak", "envelope"):
        np.testing.assert_allclose(getattr(two, name), getattr(one, name), rtol=0.0, atol=ROUNDING * largest)


def test_mirrored_walks_on_the_deck_as_it_was_differ() -> None:
    """The comparisons above can fail: the shapes have no symmetry, and neither have the walks."""
    passages = some_passages(1, 20, 2)
    one = run_passages(passages)
    largest = np.abs(one.history).max()
    for other in (
        replace(passages, place=LENGTH - passages.place, velocity=-passages.velocity),
        replace(passages, offset=-passages.offset),
    ):
        assert np.abs(run_passages(other).history - one.history).max() > 0.05 * largest


@settings(FIXED, max_examples=150)
@given(seed=st.integers(0, 10_000), count=st.integers(2, 40), harmonics=st.integers(1, 8))
def test_responses_to_two_crowds_add(seed: int, count: int, harmonics: int) -> None:
    """The history of all is the sum of the histories of the two parts: the modes are linear."""
    passages = some_passages(seed, count, harmonics)
    part = np.arange(count) % 3 == 0

    def chosen(keep: NDArray[np.bool_]) -> Passages:
        return Passages(**{f.name: getattr(passages, f.name)[keep] for f in fields(Passages)})

    whole = run_passages(passages).history
    parts = run_passages(chosen(part)).history + run_passages(chosen(~part)).history
    np.testing.assert_allclose(parts, whole, rtol=0.0, atol=ROUNDING * np.abs(whole).max())
