"""What a comfort criterion is: classes of the peak acceleration by direction, or a limit alone."""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True)
class Band:
    """Frequencies [Hz] that a source names: from low to high, both in.

    harmonic : of the pace (of half the pace, sideways), 1 or 2; words : what the source says of it
    gait : whose
    """

    low: float
    high: float
    harmonic: int
    words: str
    gait: str = "walking"

    def holds(self, frequency: float) -> bool:
        """Whether `frequency` lies within."""
        return self.low <= frequency <= self.high


@dataclass(frozen=True)
class Criterion:
    """Classes of comfort, best first, by the peak acceleration [m/s2].

    Attributes
    ----------
    key : as in a scenario; title : for people; source : author, title, year, clause, how sure
    classes : names, best first; the last has no upper bound. Empty: a limit, no classes
    bounds : by direction, upper bounds of all classes but the last; or the one limit
    bands : by direction, frequencies for which the source wants a check
    notes : by direction, what the source adds
    """

    key: str
    title: str
    source: str
    classes: tuple[str, ...]
    words: tuple[str, ...]
    bounds: dict[str, tuple[float, ...]]
    bands: dict[str, tuple[Band, ...]] = field(default_factory=dict)
    notes: dict[str, str] = field(default_factory=dict)

    def classify(self, value: float, direction: str) -> str | None:
        """The class of a peak; a value at an edge belongs to the worse one. None: the source has none."""
        if not self.classes or direction not in self.bounds:
            return None
        return self.classes[sum(value >= bound for bound in self.bounds[direction])]

    def limit(self, direction: str, target: str | None = None) -> float | None:
        """What a peak must not exceed for the class `target`, or the one limit. None: the source has none.

        Raises ValueError for a class that is none, or that has no upper bound.
        """
        if direction not in self.bounds:
            return None
        if not self.classes:
            return self.bounds[direction][0]
        if target not in self.reachable:
            raise ValueError(f"{target!r} is no class of {self.title} to aim at: {', '.join(self.reachable)}")
        return self.bounds[direction][self.classes.index(target)]

    @property
    def reachable(self) -> tuple[str, ...]:
        """Classes that one may aim at: all but the last."""
        return self.classes[:-1]

    def range_text(self, name: str, direction: str) -> str:
        """The class as a span of acceleration."""
        i = self.classes.index(name)
        bounds = self.bounds[direction]
        if i == 0:
            return f"below {bounds[0]:.2f} m/s2"
        if i == len(bounds):
            return f"{bounds[-1]:.2f} m/s2 and above"
        return f"{bounds[i - 1]:.2f} to below {bounds[i]:.2f} m/s2"
