"""How a percentile changes from one set of realisations to another that was drawn with the same random numbers.

Realisation k of both has the same persons, so both are high together, and their ratio scatters less than two runs of
their own would. Whole realisations are drawn anew with replacement (B. Efron & R. J. Tibshirani, An Introduction to the
Bootstrap, Chapman & Hall, 1993, chapters 8 and 13, from memory), the same ones for both, and the percentile interval of
the ratio is taken; windows of a realisation stay together, so nothing is assumed of how they depend on each other.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from crowdsim.response.statistics import LEAST_FOR_INTERVAL, percentile_rank

Floats = NDArray[np.float64]
RESAMPLES = 2000
_SEED = 20
_AT_A_TIME = 2_000_000  # values drawn at a time: memory does not grow with the realisations


@dataclass(frozen=True)
class Change:
    """Of a percentile, relative: 0.1 is 10 % more. `low` and `high` are None where there is no interval."""

    value: float
    low: float | None
    high: float | None


class PairedChanges:
    """Changes of the 95 % value from `base`, for one variant after the other.

    Parameters
    ----------
    base : [realisation, window] or [realisation]
    share, confidence : of the percentile and of the interval
    resamples : number of resamples, always the same ones

    Raises ValueError for an empty base, or one whose percentile is not above 0.
    """

    def __init__(self, base: Floats, share: float = 0.95, confidence: float = 0.95, resamples: int = RESAMPLES):
        base = _by_realisation(base)
        self._count, self._share, self._confidence, self._resamples = base.shape[0], share, confidence, resamples
        self._value = _percentiles(base[None], share)[0]
        if not self._value > 0.0:
            raise ValueError(f"the percentile of the base must be above 0, not {self._value:g}")
        self._drawn = self._resampled(base)

    def change(self, variant: Floats) -> Change:
        """From the base to `variant` [realisation, window], realisation by realisation.

        No interval below 72 realisations: the 95 % value of so few is next to the largest, of which no resampling
        knows what lies beyond. Raises ValueError for another number of realisations.

        >>> base = np.random.default_rng(1).gumbel(1.0, 0.2, (200, 3))
        >>> PairedChanges(base).change(1.1 * base)  # doctest: +ELLIPSIS
        Change(value=0.1..., low=0.1..., high=0.1...)
        """
        variant = _by_realisation(variant)
        if variant.shape[0] != self._count:
            raise ValueError(f"{variant.shape[0]} realisations beside {self._count} of the base")
        value = float(_percentiles(variant[None], self._share)[0] / self._value) - 1.0
        if self._count < LEAST_FOR_INTERVAL or not np.all(self._drawn > 0.0):
            return Change(value, None, None)
        tail = 0.5 * (1.0 - self._confidence)
        low, high = np.quantile(self._resampled(variant) / self._drawn, [tail, 1.0 - tail]) - 1.0
        return Change(value, min(float(low), value), max(float(high), value))

    def _resampled(self, values: Floats) -> Floats:
        """The percentile of every resample."""
        return np.concatenate([_percentiles(values[picks], self._share) for picks in self._picks()])

    def _picks(self) -> Iterator[NDArray[np.int64]]:
        """Numbers of the realisations [resample, realisation], some resamples at a time."""
        random = np.random.default_rng(_SEED)
        rows = max(1, _AT_A_TIME // self._count)
        for begin in range(0, self._resamples, rows):
            yield random.integers(0, self._count, (min(rows, self._resamples - begin), self._count))


def _by_realisation(values: Floats) -> Floats:
    values = np.asarray(values, dtype=np.float64)
    values = values[:, None] if values.ndim == 1 else values
    if values.ndim != 2 or values.size == 0:
        raise ValueError(f"values: [realisation, window], at least one, not {values.shape}")
    return values


def _percentiles(values: Floats, share: float) -> Floats:
    """Pooled x_(ceil(share n)) of every resample of `values` [resample, realisation, window]."""
    flat = values.reshape(values.shape[0], -1)
    rank = percentile_rank(flat.shape[1], share) - 1
    return np.asarray(np.partition(flat, rank, axis=1)[:, rank])
