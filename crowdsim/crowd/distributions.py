"""Fixed numbers and truncated distributions: draws by redrawing, moments by quadrature."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from statistics import NormalDist
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Kind = Literal["fixed", "normal", "lognormal", "uniform"]
LEAST_PROBABILITY = 0.01
_STANDARD = NormalDist()  # of the standard library: scipy.special would cost a third of the start-up


def _normal_below(z: float) -> float:
    return 0.5 * math.erfc(-z / math.sqrt(2.0))


@dataclass(frozen=True)
class Distribution:
    """A positive or free quantity of a person.

    Attributes
    ----------
    kind : fixed, normal, lognormal or uniform
    mean, sd : of the variable itself before truncation, also for lognormal; `mean` alone is the
        value of a fixed quantity
    minimum, maximum : values outside are redrawn, never clipped; the ends of a uniform quantity

    Raises
    ------
    ValueError : sd not positive, an empty interval, or one that holds under 1 % of the probability
    """

    kind: Kind
    mean: float = 0.0
    sd: float = 0.0
    minimum: float = -math.inf
    maximum: float = math.inf

    def __post_init__(self) -> None:
        if self.kind == "fixed":
            return
        if not self.minimum < self.maximum:
            raise ValueError(f"min {self.minimum:g} is not below max {self.maximum:g}")
        if self.kind == "uniform":
            if not (math.isfinite(self.minimum) and math.isfinite(self.maximum)):
                raise ValueError("a uniform quantity needs min and max")
            return
        if not self.sd > 0.0:
            raise ValueError(f"sd must be above 0, not {self.sd:g}")
        if self.kind == "lognormal" and not self.mean > 0.0:
            raise ValueError(f"a lognormal quantity needs a mean above 0, not {self.mean:g}")
        if self.probability < LEAST_PROBABILITY:
            raise ValueError(
                f"[{self.minimum:g}, {self.maximum:g}] holds {100 * self.probability:.2g} % "
                f"of the probability; at least {100 * LEAST_PROBABILITY:g} % is needed"
            )

    @cached_property
    def log_parameters(self) -> tuple[float, float]:
        """Mean and standard deviation of the logarithm of a lognormal quantity."""
        variance = math.log1p((self.sd / self.mean) ** 2)
        return math.log(self.mean) - 0.5 * variance, math.sqrt(variance)

    def cumulative(self, x: float) -> float:
        """Untruncated probability below x of a normal or lognormal quantity."""
        if self.kind == "normal":
            return _normal_below((x - self.mean) / self.sd)
        if x <= 0.0:
            return 0.0
        m, s = self.log_parameters
        return _normal_below((math.log(x) - m) / s)

    @cached_property
    def probability(self) -> float:
        """Share of the untruncated probability within [minimum, maximum]."""
        if self.kind in ("fixed", "uniform"):
            return 1.0
        return self.cumulative(self.maximum) - self.cumulative(self.minimum)

    def quantile(self, p: Floats | float) -> Floats:
        """Value below which the share p of the truncated distribution lies."""
        p = np.asarray(p, dtype=np.float64)
        if self.kind == "fixed":
            return np.full(p.shape, self.mean)
        if self.kind == "uniform":
            return np.asarray(self.minimum + p * (self.maximum - self.minimum))
        low = self.cumulative(self.minimum)
        flat = np.clip(low + p * self.probability, 1e-300, 1.0 - 1e-16).ravel()
        z = np.array([_STANDARD.inv_cdf(x) for x in flat]).reshape(p.shape)
        if self.kind == "normal":
            x = self.mean + self.sd * z
        else:
            m, s = self.log_parameters
            x = np.array([math.exp(m + s * v) for v in z.ravel()]).reshape(z.shape)
        return np.asarray(np.clip(x, self.minimum, self.maximum), dtype=np.float64)

    def density(self, x: float) -> float:
        """Probability density at x of the truncated distribution. Raises ValueError for a fixed quantity."""
        if self.kind == "fixed":
            raise ValueError("a fixed quantity has no density")
        if not self.minimum <= x <= self.maximum:
            return 0.0
        if self.kind == "uniform":
            return 1.0 / (self.maximum - self.minimum)
        if self.kind == "normal":
            return _STANDARD.pdf((x - self.mean) / self.sd) / (self.sd * self.probability)
        if x <= 0.0:
            return 0.0
        m, s = self.log_parameters
        return _STANDARD.pdf((math.log(x) - m) / s) / (x * s * self.probability)

    @cached_property
    def nodes(self) -> tuple[Floats, Floats]:
        """Values and weights with which sums stand for expectations (Gauss-Legendre in the probability)."""
        if self.kind == "fixed":
            return np.array([self.mean]), np.array([1.0])
        edges = np.concatenate(
            [[0.0, 1e-6, 1e-4, 1e-3, 1e-2], np.linspace(0.1, 0.9, 9), [0.99, 0.999, 0.9999, 1 - 1e-6, 1.0]]
        )
        x, w = np.polynomial.legendre.leggauss(12)
        width = np.diff(edges)
        p = (edges[:-1, None] + 0.5 * width[:, None] * (x + 1.0)).ravel()
        return self.quantile(p), (0.5 * width[:, None] * w).ravel()

    def share_within(self, low: float, high: float) -> float:
        """Share of the truncated distribution within [low, high]."""
        if self.kind == "fixed":
            return float(low <= self.mean <= high)
        low, high = max(low, self.minimum), min(high, self.maximum)
        if low >= high:
            return 0.0
        if self.kind == "uniform":
            return (high - low) / (self.maximum - self.minimum)
        return (self.cumulative(high) - self.cumulative(low)) / self.probability

    def expectation(self, power: float = 1.0) -> float:
        """E[x^power] of the truncated distribution."""
        x, w = self.nodes
        # math.pow: numpy's own power may differ in the last bit from processor to processor
        return math.fsum(wi * math.pow(xi, power) for wi, xi in zip(w, x, strict=True))

    def draw(self, generator: np.random.Generator, count: int) -> Floats:
        """`count` values. The i-th is the i-th accepted draw, whatever the count."""
        return Draws(self, lambda: generator).take(count)

    def text(self, unit: str = "") -> str:
        """As a person writes it: `normal, mean 1.87, sd 0.186, 1.3 to 2.6 Hz`."""
        u = f" {unit}" if unit else ""
        if self.kind == "fixed":
            return f"{self.mean:.6g}{u}"
        if self.kind == "uniform":
            return f"uniform, {self.minimum:.4g} to {self.maximum:.4g}{u}"
        ends = ""
        if math.isfinite(self.minimum) and math.isfinite(self.maximum):
            ends = f", {self.minimum:.4g} to {self.maximum:.4g}"
        elif math.isfinite(self.minimum):
            ends = f", from {self.minimum:.4g}"
        elif math.isfinite(self.maximum):
            ends = f", to {self.maximum:.4g}"
        return f"{self.kind}, mean {self.mean:.4g}, sd {self.sd:.4g}{ends}{u}"


class Draws:
    """Values of a distribution one after the other: two `take`s give what one gives."""

    def __init__(self, distribution: Distribution, generator: Callable[[], np.random.Generator]):
        # a fixed quantity needs no generator, and to make one takes longer than to draw
        self._of = distribution
        self._random = None if distribution.kind == "fixed" else generator()
        self._left = np.zeros(0)

    def take(self, count: int) -> Floats:
        """The next `count` values."""
        of = self._of
        if self._random is None:
            return np.full(count, of.mean)
        if of.kind == "uniform":
            return self._random.uniform(of.minimum, of.maximum, count)
        kept, size = [self._left], self._left.size
        while size < count:
            trial = int((count - size) / of.probability * 1.1) + 8
            if of.kind == "normal":
                x = self._random.normal(of.mean, of.sd, trial)
            else:
                x = self._random.lognormal(*of.log_parameters, trial)
            kept.append(x[(x >= of.minimum) & (x <= of.maximum)])
            size += kept[-1].size
        values = np.concatenate(kept)
        self._left = values[count:]
        return values[:count]


def fixed(value: float) -> Distribution:
    """A quantity that is the same for everybody."""
    return Distribution("fixed", value)


def normal(mean: float, sd: float, minimum: float = -math.inf, maximum: float = math.inf) -> Distribution:
    """A truncated normal quantity; `mean` and `sd` before truncation."""
    return Distribution("normal", mean, sd, minimum, maximum)
