"""Whether a limit is met, as far as the simulation can tell, and what more realisations would buy."""

from __future__ import annotations

import math
from typing import Literal

from crowdsim.response.statistics import Percentile, least_for_interval
from crowdsim.response.windows import Proportion, normal_quantile

Verdict = Literal["met", "not met", "undecided"]
OUT_OF_REACH = 10_000_000


def verdict(value: Percentile, limit: float) -> Verdict:
    """met: the upper end of the interval is at or below the limit; not met: the lower end is above it."""
    if value.low is None or value.high is None:
        return "undecided"
    if value.high <= limit:
        return "met"
    return "not met" if value.low > limit else "undecided"


def realisations_to_decide(
    exceedance: Proportion, realisations: int, share: float = 0.95, confidence: float = 0.95
) -> int | None:
    """About how many realisations would decide, if the share of windows beyond the limit stays as it is.

    The interval of the percentile leaves the limit when (1 - share) leaves the interval of the
    exceedance probability p, by the normal approximation of the binomial: n effective windows with
    |p - (1 - share)| above z sqrt(share (1 - share)/n). None where that is out of reach (ten million).
    """
    z = normal_quantile(0.5 + 0.5 * confidence)
    apart = abs(exceedance.value - (1.0 - share))
    each = exceedance.effective / realisations
    if apart <= 0.0:
        return None
    ranks = 2.0 if exceedance.value > 1.0 - share else 1.0  # by which whole ranks miss the normal approximation
    need = (z * z * share * (1.0 - share) / apart**2 + ranks / apart) / each
    count = max(least_for_interval(share, confidence), math.ceil(need), math.ceil(1.05 * realisations))
    count = _round_up(count)
    return count if count <= OUT_OF_REACH else None


def relative_half_width(value: Percentile) -> float | None:
    """Half the interval over the value: 0.08 reads +-8 %. None without an interval."""
    if value.low is None or value.high is None or value.value <= 0.0:
        return None
    return 0.5 * (value.high - value.low) / value.value


def realisations_for_width(value: Percentile, realisations: int, wanted: float) -> int | None:
    """About how many realisations give an interval of +- `wanted` (0.03 is 3 %): widths fall as 1/sqrt(n)."""
    half = relative_half_width(value)
    if half is None:
        return None
    return max(least_for_interval(value.share), _round_up(math.ceil(realisations * (half / wanted) ** 2 - 1e-6)))


def _round_up(count: int) -> int:
    """To two significant digits."""
    unit: int = 10 ** max(0, len(str(count)) - 2)
    return -(-count // unit) * unit
