"""Steps between the samples of a band-limited force."""

from __future__ import annotations

import math
from functools import cache

import numpy as np
from numpy.typing import NDArray

from crowdsim.dynamics.kernels import TAPS

Floats = NDArray[np.float64]
REACH = 1.3  # rad per sample: highest frequency for which the rule is meant
_SHAPE = 11.0  # of the window; side lobes below 1e-5 from 2 pi - REACH on


def _bessel_i0(x: float) -> float:
    """Modified Bessel function I0 by its power series: the same bits on every machine."""
    term = total = 1.0
    k = 1
    while term > 1e-18 * total:
        term *= (0.5 * x / k) ** 2
        total += term
        k += 1
    return total


@cache
def between_weights(factor: int) -> Floats:
    """Weights [step between, TAPS] of the samples around a step j/factor of a sample on.

    A sinc under a Kaiser window (Kaiser 1974, from memory), its weights brought to the sum one.
    factor: steps in a sample, 1, 2 or 4. Raises ValueError for another.
    """
    if factor not in (1, 2, 4):
        raise ValueError(f"factor: 1, 2 or 4, not {factor}")
    half = TAPS // 2
    rows = []
    for j in range(1, factor):
        row = []
        for tap in range(TAPS):
            x = j / factor - (tap - (half - 1))
            window = _bessel_i0(_SHAPE * math.sqrt(1.0 - (x / half) ** 2)) / _bessel_i0(_SHAPE)
            row.append(math.sin(math.pi * x) / (math.pi * x) * window)
        total = math.fsum(row)
        rows.append([w / total for w in row])
    return np.array(rows, dtype=np.float64).reshape(factor - 1, TAPS)


def between_error(factor: int, angle: Floats) -> Floats:
    """Largest relative error of the rule on a harmonic of `angle` [rad per sample]."""
    angle = np.asarray(angle, dtype=np.float64)
    worst = np.zeros(angle.shape)
    for j, row in enumerate(between_weights(factor), start=1):
        x = np.arange(TAPS) - (TAPS // 2 - 1) - j / factor
        sum_ = (row * np.exp(1j * np.multiply.outer(angle, x))).sum(axis=-1)
        worst = np.maximum(worst, np.abs(sum_ - 1.0))
    return worst
