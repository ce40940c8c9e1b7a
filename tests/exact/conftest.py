"""What the exact tests share: one walker as a formula, a scenario brought to a case, its closed form.

The formulas are written from the equations of motion alone and import nothing of crowdsim's mechanics;
crowdsim is used only to read a scenario and to run it.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
import pytest
from numpy.typing import NDArray

from crowdsim import parse_scenario
from crowdsim.study.jobs import Row, run_realisation
from crowdsim.study.prepare import Case, prepare
from crowdsim.study.situation import cases

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Walker:
    """One person who crosses once: weight x sum of harmonics[k-1] sin(k (2 pi pace t + phase) + phases[k-1]).

    t is the time since `arrival` [s]; pace [Hz], speed [m/s], weight [N], phases [rad], offset e [m].
    """

    pace: float
    speed: float
    harmonics: tuple[float, ...] = (0.4, 0.1, 0.1)
    phases: tuple[float, ...] = ()
    phase: float = 0.0
    weight: float = 700.0
    arrival: float = 0.0
    forward: bool = True
    offset: float = 0.0
    gait: str = "walking"
    load: str = ""  # instead of harmonics and phases, as the scenario writes it

    def stream(self) -> str:
        """The stream's table of a scenario."""
        phases = f", phases = {list(self.phases)}" if self.phases else ""
        load = self.load or f"{{ harmonics = {list(self.harmonics)}{phases} }}"
        return f"""
            [[stream]]
            name = "one person"
            gait = "{self.gait}"
            arrival = {{ times = [{self.arrival!r}] }}
            forward_share = {1 if self.forward else 0}
            pace = {self.pace!r}
            speed = {self.speed!r}
            weight = {self.weight!r}
            phase = {self.phase!r}
            offset = {self.offset!r}
            load = {load}
            """

    @property
    def lags(self) -> tuple[float, ...]:
        """Phase of every harmonic at the arrival [rad]."""
        own = self.phases or (0.0,) * len(self.harmonics)
        return tuple(k * self.phase + own[k - 1] for k in range(1, len(self.harmonics) + 1))

    def force(self, since_arrival: Floats) -> Floats:
        """Force beyond the static weight [N], as if the deck had no ends."""
        t = np.asarray(since_arrival, dtype=np.float64)
        turn = 2.0 * np.pi * self.pace * t
        return self.weight * sum(
            (a * np.sin(k * turn + lag) for k, (a, lag) in enumerate(zip(self.harmonics, self.lags, strict=True), 1)),
            start=np.zeros(t.shape),
        )

    def place(self, since_arrival: Floats, length: float) -> Floats:
        """s [m]."""
        way = self.speed * np.asarray(since_arrival, dtype=np.float64)
        return way if self.forward else length - way


def _half_wave_acceleration(
    walker: Walker, length: float, frequency: float, damping: float, mass: float, half_waves: int, time: Floats
) -> Floats:
    """q'' [m/s2] of a mode sin(n pi s / length) at rest before the arrival; closed form (models of moving loads).

    On the deck every harmonic times the half wave is two harmonics of frequency k Omega -+ n pi v / length:
    two particular solutions and a free vibration from rest (Fryba 1972, from memory; re-derived here).
    Off the deck the oscillator swings freely.
    """
    omega = 2.0 * np.pi * frequency
    root = complex(-damping * omega, omega * np.sqrt(1.0 - damping**2))
    crossing = length / walker.speed
    sweep = half_waves * np.pi * walker.speed / length
    sign = 1.0 if walker.forward else (-1.0) ** (half_waves + 1)
    since = np.asarray(time, dtype=np.float64) - walker.arrival

    def free(displacement: float, velocity: float) -> complex:
        return complex(displacement, (root.real * displacement - velocity) / root.imag)

    def on_deck(t: Floats) -> tuple[Floats, Floats, Floats]:
        q, v, force = np.zeros(t.shape), np.zeros(t.shape), np.zeros(t.shape)
        for k, (factor, lag) in enumerate(zip(walker.harmonics, walker.lags, strict=True), start=1):
            for side in (-1.0, 1.0):
                # sin(x) sin(y) = (cos(x - y) - cos(x + y)) / 2
                load = -side * 0.5 * sign * walker.weight * factor / mass * np.exp(1j * lag)
                w = 2.0 * np.pi * k * walker.pace + side * sweep
                steady = load / (omega**2 - w**2 + 2j * damping * omega * w)
                swing = free(-steady.real, -(1j * w * steady).real)
                turn, decay = np.exp(1j * w * t), swing * np.exp(root * t)
                q += (steady * turn).real + decay.real
                v += (1j * w * steady * turn).real + (root * decay).real
                force += (load * turn).real
        return q, v, force

    q, v, force = on_deck(np.clip(since, 0.0, crossing))
    acceleration = force - 2.0 * damping * omega * v - omega**2 * q
    (q_end,), (v_end,), _ = on_deck(np.array([crossing]))
    off = since > crossing
    swing = free(float(q_end), float(v_end))
    acceleration[off] = (root**2 * swing * np.exp(root * (since[off] - crossing))).real
    acceleration[since < 0.0] = 0.0
    return acceleration


def _prepared(text: str) -> Case:
    scenario = parse_scenario(text)
    return prepare(scenario, cases(scenario)[0])


def _full_run(case: Case, number: int = 0, *, factor: int | None = None) -> Row:
    """Realisation `number` with its whole history; `factor`: steps in a sample of the force, else as chosen."""
    if factor is not None:
        case = replace(case, choice=replace(case.choice, factor=factor))
    row = run_realisation(case, number, history=(0, case.recorder.total))
    assert row is not None
    return row


def _vertex_peak(samples: Floats) -> float:
    """Largest absolute value: samples, and vertices of parabolas through three of them at local extrema."""
    middle = samples[1:-1]
    sign = np.where(middle > 0.0, 1.0, -1.0)
    rise, fall = sign * (middle - samples[:-2]), sign * (middle - samples[2:])
    top = (rise >= 0.0) & (fall >= 0.0) & (rise + fall > 0.0)
    height = sign[top] * middle[top] + (rise[top] - fall[top]) ** 2 / (8.0 * (rise[top] + fall[top]))
    return float(max(np.abs(samples).max(), height.max(initial=0.0)))


@pytest.fixture
def walker_of() -> type[Walker]:
    """One walker."""
    return Walker


@pytest.fixture
def half_wave_acceleration() -> Callable[..., Floats]:
    """Closed form of one walker on a half-wave mode."""
    return _half_wave_acceleration


@pytest.fixture
def prepared() -> Callable[[str], Case]:
    """The first case of a scenario's text, as every command prepares it."""
    return _prepared


@pytest.fixture
def full_run() -> Callable[..., Row]:
    """A realisation with its whole history."""
    return _full_run


@pytest.fixture
def vertex_peak() -> Callable[[Sequence[float]], float]:
    """Peak of a sampled signal."""
    return _vertex_peak
