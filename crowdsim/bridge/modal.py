"""The modal model of a deck."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from crowdsim.bridge.ordinates import Ordinate

Floats = NDArray[np.float64]
DIRECTIONS = ("vertical", "lateral", "longitudinal")
_FINE = 4800  # divisions: mid-span, quarters, sixths, eighths, tenths fall on the grid


@dataclass(frozen=True)
class Mode:
    """q'' + 2 zeta omega q' + omega^2 q = (1/M) sum of force x ordinate at the foot.

    frequency [Hz]; damping: fraction of critical; modal_mass [kg], belongs to the ordinates as
    given; vertical, lateral, longitudinal: ordinates of the walking surface; twist [rad per q],
    positive lifts the left edge
    """

    name: str
    frequency: float
    damping: float
    modal_mass: float
    vertical: Ordinate | None = None
    lateral: Ordinate | None = None
    longitudinal: Ordinate | None = None
    twist: Ordinate | None = None

    @property
    def time_constant(self) -> float:
        """1/(zeta omega) [s]."""
        return 1.0 / (self.damping * 2.0 * math.pi * self.frequency)

    @property
    def driven(self) -> bool:
        """Whether a vertical force can reach it."""
        return self.vertical is not None or self.twist is not None

    @property
    def directions(self) -> tuple[str, ...]:
        """Directions in which the mode moves the deck."""
        moves = {"vertical": self.driven, "lateral": self.lateral is not None,
                 "longitudinal": self.longitudinal is not None}  # fmt: skip
        return tuple(d for d in DIRECTIONS if moves[d])

    def ordinate(self, direction: str, s: Floats | float, e: Floats | float = 0.0) -> Floats:
        """Ordinate of `direction` at (s, e): vertical(s) + e twist(s), lateral(s) or longitudinal(s)."""
        s = np.asarray(s, dtype=np.float64)
        total = np.zeros(np.broadcast_shapes(s.shape, np.shape(e)))
        if direction == "vertical":
            if self.vertical is not None:
                total = total + self.vertical(s)
            if self.twist is not None:
                total = total + np.asarray(e) * self.twist(s)
            return total
        shape = self.lateral if direction == "lateral" else self.longitudinal
        return total if shape is None else total + shape(s)


@dataclass(frozen=True)
class Point:
    """Where response is recorded: (s, e) [m] in a direction."""

    name: str
    s: float
    e: float
    direction: str


@dataclass(frozen=True)
class ModalModel:
    """A deck of `length` and clear walking `width` [m] and its modes, names unique."""

    length: float
    width: float
    modes: tuple[Mode, ...]
    fine: Floats = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "fine", np.arange(_FINE + 1) * (self.length / _FINE))

    @property
    def twists(self) -> bool:
        """Whether any mode twists."""
        return any(m.twist is not None for m in self.modes)

    @property
    def directions(self) -> tuple[str, ...]:
        """Directions in which any mode moves."""
        return tuple(d for d in DIRECTIONS if any(d in m.directions for m in self.modes))

    @property
    def edges(self) -> tuple[float, ...]:
        """Offsets at which the deck is looked at: both edges and the centre line where it twists."""
        return (-0.5 * self.width, 0.0, 0.5 * self.width) if self.twists else (0.0,)

    def mode(self, name: str) -> Mode:
        """The mode called `name`. Raises KeyError."""
        for m in self.modes:
            if m.name == name:
                return m
        raise KeyError(name)

    def largest(self, mode: Mode, direction: str) -> tuple[float, float, float]:
        """(s, e, ordinate) where |ordinate| is largest; of equals the one nearest mid-span."""
        offsets = self.edges if direction == "vertical" and mode.twist is not None else (0.0,)
        best = (0.5 * self.length, 0.0, 0.0)
        for e in sorted(offsets, key=lambda e: (abs(e), -e)):
            values = np.abs(mode.ordinate(direction, self.fine, e))
            top = float(values.max())
            near = np.flatnonzero(values >= top * (1.0 - 1e-9))
            i = int(near[np.argmin(np.abs(near - _FINE // 2))])
            s = float(self.fine[i])
            around = np.linspace(self.fine[max(i - 1, 0)], self.fine[min(i + 1, _FINE)], 201)
            finer = np.abs(mode.ordinate(direction, around, e))
            if float(finer.max()) > top * (1.0 + 1e-9):
                s, top = float(around[int(np.argmax(finer))]), float(finer.max())
            if top > abs(best[2]) * (1.0 + 1e-9):
                best = (s, e, float(mode.ordinate(direction, s, e)))
        return best

    @cached_property
    def antinodes(self) -> tuple[Point, ...]:
        """The point of largest ordinate of every mode in each direction it moves; equal places joined."""
        found: dict[tuple[float, float, str], list[str]] = {}
        for mode in self.modes:
            for direction in mode.directions:
                s, e, _ = self.largest(mode, direction)
                key = (round(s, 6), e, direction)
                found.setdefault(key, []).append(mode.name)
        single = len(self.directions) == 1
        return tuple(
            Point("+".join(names) + ("" if single else f" {direction}"), s, e, direction)
            for (s, e, direction), names in found.items()
        )

    def mean_square(
        self,
        mode: Mode,
        offset_mean: float = 0.0,
        offset_square: float = 0.0,
        directions: tuple[str, ...] = DIRECTIONS,
    ) -> float:
        """Mean over the deck of the squared ordinates of `directions`, persons spread uniformly in s.

        offset_mean, offset_square: E[e] [m], E[e^2] [m2] of the persons' offsets.
        """
        square = np.zeros(_FINE + 1)
        if "vertical" in directions:
            v = mode.vertical(self.fine) if mode.vertical is not None else square
            t = mode.twist(self.fine) if mode.twist is not None else square
            square = v * v + 2.0 * offset_mean * v * t + offset_square * t * t
        for direction in ("lateral", "longitudinal"):
            if direction in directions:
                square = square + mode.ordinate(direction, self.fine) ** 2
        weights = np.full(_FINE + 1, 2.0)
        weights[1::2] = 4.0
        weights[[0, -1]] = 1.0
        return math.fsum(square * weights) / (3.0 * _FINE)

    def with_mass(self, added: dict[str, float]) -> ModalModel:
        """The model with modal mass `added` [kg] by mode: frequency falls, damping ratio is kept."""
        changed = []
        for m in self.modes:
            mass = m.modal_mass + added.get(m.name, 0.0)
            changed.append(replace(m, modal_mass=mass, frequency=m.frequency * math.sqrt(m.modal_mass / mass)))
        return ModalModel(self.length, self.width, tuple(changed))
