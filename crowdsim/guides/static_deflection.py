"""First frequency of a span from its deflection under its own weight: f = 18 / sqrt(deflection in mm).

Common practice. For uniform beams and their largest deflection f sqrt(deflection in mm) is (computed, g = 9.81 m/s2)

    simply supported           17.75    pi^2 and 5/384
    fixed at one end, propped  17.89    15.418 and 1/184.6
    fixed at both ends         18.00    22.373 and 1/384
    cantilever                 19.60    3.516 and 1/8
    lumped mass on a spring    15.76    sqrt(g) / (2 pi)

from f = (lambda^2 / 2 pi) sqrt(E I / (m L^4)) and the deflection c m g L^4 / (E I); lambda^2 and c stand at the right.

The deflection is that under gravity of exactly the vibrating mass, in the direction of the vibration, by the dynamic
stiffness (modulus, composite action, parapets). Uniform, straight member, one mode, supports that hardly move.
Continuous beams under uniform gravity do not obey it: their first mode goes up and down in turn, so the load must be
reversed on every other span.
"""

from __future__ import annotations

import math

_CONSTANT = 18.0  # Hz sqrt(mm)


def frequency(deflection: float) -> float:
    """Frequency [Hz] from a deflection [m], which must be above 0.

    >>> round(frequency(0.100), 2)
    1.8
    """
    if not 0.0 < deflection < math.inf:
        raise ValueError(f"deflection must be above 0, not {deflection:g}")
    return _CONSTANT / math.sqrt(1e3 * deflection)


def deflection(frequency: float) -> float:
    """Deflection [m] from a frequency [Hz], which must be above 0; the inverse of `frequency`.

    >>> round(deflection(1.8), 6)
    0.1
    """
    if not 0.0 < frequency < math.inf:
        raise ValueError(f"frequency must be above 0, not {frequency:g}")
    return 1e-3 * (_CONSTANT / frequency) ** 2
