"""A set of dynamic load factors and how a person's harmonics are drawn from it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
_TRIES = 4
PHASES = 8  # drawn for every person, however many the set needs


@dataclass(frozen=True)
class LoadSet:
    """Vertical force beyond the static weight: weight x sum_k a_k sin(k theta + phase_k).

    Attributes
    ----------
    name : as in a scenario; source : author, title, year, and how sure
    gait : walking or jogging
    pace_range : [Hz] within which the set holds; outside, it is held at the limit
    mean : pace [person] -> mean load factors [person, harmonic]
    spread : pace [person] -> standard deviations [person, harmonic]; None: the source has none
    phases : of the harmonics [rad]; None: uniform at random, each for itself
    scatter : draw the factors of each person from mean and spread (normal, above 0)
    """

    name: str
    source: str
    gait: str
    pace_range: tuple[float, float]
    mean: Callable[[Floats], Floats]
    spread: Callable[[Floats], Floats] | None = None
    phases: tuple[float, ...] | None = None
    scatter: bool = False

    def scattered(self, scatter: bool) -> LoadSet:
        """The set with or without scatter. Raises ValueError where the source gives none."""
        if scatter and self.spread is None:
            raise ValueError(f"{self.name} gives no scatter of its factors")
        return replace(self, scatter=scatter)

    def held(self, pace: Floats) -> Floats:
        """Pace brought into the range."""
        return np.clip(pace, *self.pace_range)

    def factors(self, pace: Floats) -> Floats:
        """Mean load factors [person, harmonic] at `pace` [Hz]."""
        return self.mean(self.held(np.atleast_1d(np.asarray(pace, dtype=np.float64))))

    @property
    def harmonics(self) -> int:
        """Number of harmonics."""
        return int(self.factors(np.array([self.pace_range[0]])).shape[1])

    def draw(
        self, pace: Floats, random: np.random.Generator, phase_random: np.random.Generator
    ) -> tuple[Floats, Floats]:
        """Load factors and phases [person, harmonic] of persons at `pace` [Hz].

        random : of the factors; phase_random : of the phases, a generator of their own

        A person's draws do not depend on how many others there are, nor the phases on the set: all
        sets without phases of their own give a person the same ones. A factor that comes out
        negative is redrawn.
        """
        held = self.held(np.asarray(pace, dtype=np.float64))
        factors = self.mean(held)
        count, harmonics = factors.shape
        if self.phases is None:
            phases = 2.0 * np.pi * phase_random.random((count, PHASES))[:, :harmonics]
        else:
            phases = np.broadcast_to(np.array(self.phases, dtype=np.float64), factors.shape)
        if self.scatter:
            assert self.spread is not None
            tries = random.standard_normal((count, _TRIES, harmonics))
            values = factors[:, None, :] + self.spread(held)[:, None, :] * tries
            pick = np.argmax(values > 0.0, axis=1)
            factors = np.abs(np.take_along_axis(values, pick[:, None, :], axis=1)[:, 0, :])
        return factors, phases


def given(harmonics: tuple[float, ...], phases: tuple[float, ...] | None, gait: str) -> LoadSet:
    """The load factors that a scenario writes out; phases default to 0."""
    row = np.array(harmonics, dtype=np.float64)
    return LoadSet(
        name="given in the scenario",
        source="given in the scenario",
        gait=gait,
        pace_range=(0.0, np.inf),
        mean=lambda pace: np.tile(row, (pace.size, 1)),
        phases=phases if phases is not None else (0.0,) * len(harmonics),
    )
