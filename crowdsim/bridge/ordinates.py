"""Ordinates of a mode along the deck: half waves and tables."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Literal, Protocol

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Interpolation = Literal["spline", "linear", "monotone"]


class Ordinate(Protocol):
    """A function of s [m] that also continues smoothly beyond both ends."""

    def __call__(self, s: Floats) -> Floats:
        """Values at s."""
        ...

    def text(self) -> str:
        """As a person writes it."""
        ...


@dataclass(frozen=True)
class HalfWaves:
    """amplitude x sin(count pi s / length), by `math.sin`: the same bits on every machine."""

    count: int
    length: float
    amplitude: float = 1.0

    def __call__(self, s: Floats) -> Floats:
        s = np.asarray(s, dtype=np.float64)
        factor = self.count * math.pi / self.length
        values = [self.amplitude * math.sin(factor * x) for x in s.ravel()]
        return np.array(values, dtype=np.float64).reshape(s.shape)

    def text(self) -> str:
        scale = "" if self.amplitude == 1.0 else f"{self.amplitude:g} x "
        return f"{scale}sin({'' if self.count == 1 else f'{self.count} '}pi s / L)"


@dataclass(frozen=True)
class Table:
    """A curve through points (s, value).

    interpolation: a cubic spline with natural ends (linear for fewer than four points), straight
    lines, or the monotone cubic of Fritsch & Butland 1984. Beyond the ends it runs straight on.
    """

    s: tuple[float, ...]
    value: tuple[float, ...]
    interpolation: Interpolation = "spline"

    @property
    def used(self) -> Interpolation:
        """The interpolation in force."""
        return "linear" if len(self.s) < 4 else self.interpolation

    @cached_property
    def _curve(self) -> Any:
        from scipy.interpolate import CubicSpline, PchipInterpolator

        if self.used == "spline":
            return CubicSpline(self.s, self.value, bc_type="natural")
        return PchipInterpolator(self.s, self.value)

    def __call__(self, s: Floats) -> Floats:
        s = np.asarray(s, dtype=np.float64)
        first, last = self.s[0], self.s[-1]
        inside = np.clip(s, first, last)
        if self.used == "linear":
            x, y = np.array(self.s), np.array(self.value)
            values = np.interp(inside, x, y)
            slopes = ((y[1] - y[0]) / (x[1] - x[0]), (y[-1] - y[-2]) / (x[-1] - x[-2]))
        else:
            values = self._curve(inside)
            slopes = (float(self._curve(first, 1)), float(self._curve(last, 1)))
        beyond = np.where(s < first, slopes[0] * (s - first), np.where(s > last, slopes[1] * (s - last), 0.0))
        return np.asarray(values + beyond, dtype=np.float64)

    def excursion(self) -> float:
        """How far the curve leaves the range of its points, as a share of the largest ordinate."""
        fine = self(np.linspace(self.s[0], self.s[-1], 4801))
        value = np.array(self.value)
        over = max(float(fine.max() - value.max()), float(value.min() - fine.min()), 0.0)
        return over / max(float(np.abs(value).max()), 1e-300)

    def text(self) -> str:
        return f"table of {len(self.s)} points, {self.used}"
