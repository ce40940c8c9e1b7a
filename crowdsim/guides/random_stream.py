"""Stationary random stream on one mode, every pace with its own response: no band, no flat density.

Where few paces lie on the mode's frequency the many beside it count, and the flat density of the narrow-band formula
(`narrow_band`) is far too low; where the density falls off within the mode's skirts, it is somewhat high.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
_FINE = 400  # paces on either side of the resonance, from a thousandth of its width on
_EVEN = 800  # paces from the slowest to the fastest


def amplification(frequency: Floats, mode_frequency: float, damping: float) -> Floats:
    """|acceleration| x modal mass / force of a mode under a harmonic force (textbook).

    r^2 / sqrt((1 - r^2)^2 + (2 zeta r)^2), r = frequency / mode_frequency; 1/(2 zeta) in resonance.

    >>> float(amplification(np.array([2.0]), 2.0, 0.01)[0])
    50.0
    """
    r = np.asarray(frequency, dtype=np.float64) / mode_frequency
    return np.asarray(r * r / np.hypot(1.0 - r * r, 2.0 * damping * r))


def paces(low: float, high: float, harmonic: int, mode_frequency: float, damping: float) -> Floats:
    """Paces [Hz] from low to high, close together where their harmonic is in resonance, for the trapezoidal rule."""
    away = np.geomspace(1e-3, max(2.0 / damping, 10.0), _FINE) * damping
    centre = mode_frequency / harmonic
    near = np.concatenate([centre * (1.0 - away), [centre], centre * (1.0 + away)])
    inside = near[(near > low) & (near < high)]
    return np.unique(np.concatenate([np.linspace(low, high, _EVEN), inside]))


def variance(
    persons: float,
    mean_square_ordinate: float,
    pace: Floats,
    density: Floats,
    force_square: Floats,
    harmonic: int,
    mode_frequency: float,
    damping: float,
    modal_mass: float,
) -> float:
    """Variance of the modal acceleration [m2/s4]: N <phi^2>/2 times the integral of p(x) E[F^2](x) |H(k x)|^2.

    persons : N on the deck on average; mean_square_ordinate : <phi^2> over the places where they walk
    pace, density, force_square : [pace] x [Hz] from `paces`, p [1/Hz] among those on the deck, E[F^2] [N2]

    Independent persons with phases at random; the growth and fading of each one's force along the mode is left out
    (Campbell's theorem, textbook).
    """
    square = density * force_square * amplification(harmonic * pace, mode_frequency, damping) ** 2
    return 0.5 * persons * mean_square_ordinate * float(np.trapezoid(square, pace)) / modal_mass**2
