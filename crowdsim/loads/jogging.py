"""Published load factors of jogging, vertical."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from crowdsim.loads.load_set import LoadSet

Floats = NDArray[np.float64]
PULSE_HARMONICS = 4


def pulse_factor(harmonic: int, contact_ratio: float) -> float:
    """Signed Fourier factor of a half-sine pulse: F = G [1 + sum c_k cos(2 pi k f (t - contact/2))].

    contact_ratio: contact time x pace, 0.3 to 1; the mean force is the weight, so the pulse's
    height is pi/(2 contact_ratio) weights. Bachmann & Ammann 1987, from memory; the series is
    derived here.

    >>> round(pulse_factor(1, 0.6), 3), round(abs(pulse_factor(2, 0.6)), 3)
    (1.405, 0.34)
    """
    x = 2.0 * harmonic * contact_ratio
    if abs(x - 1.0) < 1e-9:
        return 0.5 * math.pi
    return 2.0 * math.cos(0.5 * math.pi * x) / (1.0 - x * x)


def half_sine(contact_ratio: float) -> LoadSet:
    """Half-sine pulses of the given contact ratio, first four harmonics.

    Raises ValueError outside 0.3 to 1.
    """
    if not 0.3 <= contact_ratio <= 1.0:
        raise ValueError(f"contact_ratio: 0.3 to 1, not {contact_ratio:g}")
    signed = [pulse_factor(k, contact_ratio) for k in range(1, PULSE_HARMONICS + 1)]
    row = np.abs(np.array(signed))
    # cos(k (theta - pi r)) = sin(k theta + pi/2 - k pi r); a negative factor turns by pi
    phases = tuple(
        math.fmod(0.5 * math.pi - k * math.pi * contact_ratio + (math.pi if c < 0 else 0.0), 2.0 * math.pi)
        for k, c in enumerate(signed, start=1)
    )
    return LoadSet(
        f"half-sine, contact ratio {contact_ratio:g}",
        "half-sine pulse (Bachmann & Ammann 1987, from memory), series derived, four harmonics",
        "jogging",
        (1.5, 4.0),
        lambda pace: np.tile(row, (pace.size, 1)),
        phases=phases,
    )


def _constant(name: str, source: str, pace_range: tuple[float, float], factors: tuple[float, ...]) -> LoadSet:
    row = np.array(factors)
    return LoadSet(name, source, "jogging", pace_range, lambda pace: np.tile(row, (pace.size, 1)))


JOGGING = {
    "bachmann-1995": _constant(
        "bachmann-1995", "Bachmann et al. 1995, running, from memory", (2.0, 3.0), (1.6, 0.7, 0.2)
    ),
    "iso-10137-2007": _constant(
        "iso-10137-2007", "ISO 10137:2007, Annex A, running, from memory", (2.0, 4.0), (1.4, 0.4, 0.1)
    ),
}
