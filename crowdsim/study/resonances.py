"""Which harmonic of whose steps is in resonance with which mode, and with what force."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import groupby

import numpy as np
from numpy.typing import NDArray

from crowdsim.bridge.modal import ModalModel, Mode
from crowdsim.crowd.arrivals import ConstantNumber, GivenArrivals
from crowdsim.crowd.people import Walkers
from crowdsim.guides.resonance import moving_force_factor_along
from crowdsim.study.situation import FASTEST_SHARE, SLOWEST_SHARE, Situation, Stream

Floats = NDArray[np.float64]
PLACES = 961  # along a walking line


@dataclass(frozen=True)
class Resonance:
    """One person whose harmonic `harmonic` has exactly the frequency of `mode`.

    streams : names of the alike streams that such a person may belong to; gait
    pace [Hz], speed [m/s]; weight [N], load_factor: means at that pace; line: e of the walk [m]
    path : largest |ordinate| on the line; top : largest anywhere, where the response is read
    simple : whether the shape is that of a simple span, sin(pi s/L), within 2 %
    crossing : reached of the steady state while crossing once
    persons : of these streams on the deck on average; in_band : share of them within the half-power band
    """

    mode: Mode
    gait: str
    streams: tuple[str, ...]
    harmonic: int
    pace: float
    speed: float
    weight: float
    load_factor: float
    line: float
    path: float
    top: float
    simple: bool
    crossing: float
    cycles: float
    persons: float
    in_band: float

    @property
    def force(self) -> float:
        """Amplitude of the harmonic [N]."""
        return self.weight * self.load_factor

    @property
    def who(self) -> str:
        """The streams, in words."""
        return " and ".join(f"'{name}'" for name in self.streams) if len(self.streams) > 1 else self.streams[0]


def reach(stream: Stream, harmonic: int) -> tuple[float, float]:
    """Frequencies [Hz] that a harmonic of all but 0.2 % of a stream's persons spans."""
    pace = stream.walkers.pace
    return harmonic * float(pace.quantile(SLOWEST_SHARE)), harmonic * float(pace.quantile(FASTEST_SHARE))


def reaching(stream: Stream, frequency: float, damping: float = 0.0) -> list[int]:
    """Harmonics of a stream that reach a frequency, or its half-power band."""
    found = []
    for k in range(1, stream.load.harmonics + 1):
        low, high = reach(stream, k)
        inside = low * (1.0 - damping) - 1e-9 <= frequency <= high * (1.0 + damping) + 1e-9
        if inside and stream.load.factors(np.array([frequency / k]))[0, k - 1] > 0.0:
            found.append(k)
    return found


def speed_at(walkers: Walkers, pace: float) -> float:
    """Mean speed [m/s] of those who walk at `pace` [Hz]."""
    if walkers.speed is not None:
        return walkers.speed.expectation()
    assert walkers.step_length is not None
    return pace * walkers.step_length.expectation()


def share_on_deck(stream: Stream, low: float, high: float) -> float:
    """Share of the persons on the deck whose pace is within [low, high] Hz: slow ones stay longer."""
    pace = stream.walkers.pace
    if pace.kind == "fixed":
        return float(low <= pace.mean <= high)
    x = np.linspace(max(low, pace.minimum), min(high, pace.maximum), 201)
    if x[0] >= x[-1]:
        return 0.0
    return float(np.trapezoid(densities_on_deck(stream, x), x))


def densities_on_deck(stream: Stream, pace: Floats) -> Floats:
    """Probability density [1/Hz] of each of `pace` among the persons on the deck."""
    x, w = stream.walkers.pace.nodes
    stay = _stay(stream, pace) / np.sum(w * _stay(stream, x))
    return np.array([stream.walkers.pace.density(float(p)) for p in pace]) * stay


def density_on_deck(stream: Stream, pace: float) -> float:
    """Probability density [1/Hz] of `pace` among the persons on the deck."""
    return float(densities_on_deck(stream, np.array([pace]))[0])


def _stay(stream: Stream, pace: Floats) -> Floats:
    """How long persons of a pace stay, up to a factor."""
    constant = isinstance(stream.walkers.arrivals, ConstantNumber)
    return np.ones(pace.shape) if constant or stream.walkers.speed is not None else 1.0 / pace


def _lines(stream: Stream) -> tuple[float, ...]:
    """Walking lines e [m] worth trying: the outermost and the middle."""
    offset = stream.walkers.offset
    return tuple(dict.fromkeys(float(offset.quantile(p)) for p in (0.5, 0.001, 0.999)))


def _ways(stream: Stream) -> tuple[int, ...]:
    share = stream.walkers.forward_share
    return (*((1,) if share > 0.0 else ()), *((-1,) if share < 1.0 else ()))


def _one(model: ModalModel, mode: Mode, alike: list[Stream], harmonic: int) -> Resonance | None:
    stream = alike[0]
    pace = mode.frequency / harmonic
    speed = speed_at(stream.walkers, pace)
    decay = mode.damping * 2.0 * math.pi * mode.frequency * model.length / speed
    s = np.linspace(0.0, model.length, PLACES)
    best = (0.0, 0.0, 0.0, 0.0)  # reached x ordinate, reached, ordinate, line
    for line in _lines(stream):
        along = mode.ordinate("vertical", s, line)
        top = float(np.abs(along).max())
        if top <= 0.0:
            continue
        for way in {w for one in alike for w in _ways(one)}:
            factor = moving_force_factor_along(along[::way], decay)
            if factor * top > best[0] * (1.0 + 1e-9):
                best = (factor * top, factor, top, line)
    if best[0] <= 0.0:
        return None
    band = mode.damping * pace
    persons = sum(one.persons for one in alike)
    near = sum(one.persons * share_on_deck(one, pace - band, pace + band) for one in alike)
    return Resonance(
        mode=mode, gait=stream.load.gait, streams=tuple(one.walkers.name for one in alike), harmonic=harmonic,
        pace=pace, speed=speed, weight=stream.walkers.weight.expectation(),
        load_factor=float(stream.load.factors(np.array([pace]))[0, harmonic - 1]),
        line=best[3], path=best[2], top=abs(model.largest(mode, "vertical")[2]), simple=simple_span(mode, model.length),
        crossing=best[1], cycles=mode.frequency * model.length / speed, persons=persons,
        in_band=near / persons if persons else 0.0,
    )  # fmt: skip


def simple_span(mode: Mode, length: float) -> bool:
    """Whether the vertical shape is sin(pi s/L), within 2 %, and does not twist."""
    s = np.linspace(0.0, length, PLACES)
    along = np.abs(mode.ordinate("vertical", s))
    half_sine = np.sin(np.pi * s / length)
    return mode.twist is None and bool(np.all(np.abs(along / along.max() - half_sine) < 0.02))


def alike(streams: tuple[Stream, ...]) -> list[list[Stream]]:
    """Streams whose persons differ in arrival and direction alone, together."""

    def key(stream: Stream) -> str:
        w = stream.walkers
        load = (stream.load.gait, stream.load.name, *stream.load.factors(np.array([1.8, 2.5])).ravel().tolist())
        kind = type(w.arrivals).__name__
        return repr((w.pace, w.step_length, w.speed, w.weight, w.offset, load, kind))

    return [list(group) for _, group in groupby(sorted(streams, key=key), key)]


def resonances(situation: Situation, mode: Mode) -> Iterator[Resonance]:
    """Every harmonic of every kind of person in the case that reaches a mode of the case."""
    if not mode.driven:
        return
    groups = alike(situation.streams)
    order = [s.walkers.name for s in situation.streams]
    for group in sorted(groups, key=lambda g: order.index(g[0].walkers.name)):
        for harmonic in reaching(group[0], mode.frequency, mode.damping):
            found = _one(situation.model, mode, group, harmonic)
            if found is not None:
                yield found


def stationary(situation: Situation) -> bool:
    """Whether the number on the deck does not hang on given arrivals."""
    return not any(isinstance(s.walkers.arrivals, GivenArrivals) for s in situation.streams)
