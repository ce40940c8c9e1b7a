"""The simple resonance formula, and how much of it is reached while a person is on the deck.

One harmonic of one force on one lightly damped mode, its frequency equal to the mode's. Left out: the rest of the
mode's swing that is not in resonance, of the order of zeta and 1/(load cycles); other modes; a pace that wanders.
"""

from __future__ import annotations

import math
from itertools import accumulate

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# What the constant C of `weight_form` is for which meaning of the two weights.
# The structure's is the mode's, M g; the walkers' acts where the ordinate is 1.
MODAL_WEIGHT = 1.0
# The structure's is that of a uniform simple span as a whole, the mode has half of it; the walkers' acts at mid-span.
TOTAL_WEIGHT_OF_SIMPLE_SPAN = 2.0
# Both per unit area (or length), both spread over a uniform simple span, a group all in step: integral of the ordinate
# over integral of its square. Published rounded, 1.3, for rhythmic groups (Murray, Allen & Ungar, Floor Vibrations Due
# to Human Activity, AISC Design Guide 11, 1997, chapter 2; from memory); it is no formula for one walker.
SPREAD_OVER_SIMPLE_SPAN = 4.0 / math.pi


def _need_above_zero(**values: float) -> None:
    for name, value in values.items():
        if not 0.0 < value < math.inf:
            raise ValueError(f"{name} must be above 0, not {value:g}")


def _need_not_below_zero(**values: float) -> None:
    for name, value in values.items():
        if not 0.0 <= value < math.inf:
            raise ValueError(f"{name} must not be below 0, not {value:g}")


def steady_state(force: float, damping: float, modal_mass: float, ordinate: float = 1.0) -> float:
    """Acceleration [m/s2] that a force standing on the deck ends up with: F phi^2 / (2 zeta M).

    force : amplitude [N] of the harmonic in resonance; damping : fraction of critical; modal_mass : [kg]
    ordinate : of the mode where the force stands and the response is read; for two places the product of theirs has
    the place of its square

    Exact for a force whose frequency is the mode's (textbook).

    >>> round(steady_state(300.0, 0.006, 24_200.0), 3)
    1.033
    """
    _need_above_zero(damping=damping, modal_mass=modal_mass)
    return force * ordinate**2 / (2.0 * damping * modal_mass)


def fixed_position_factor(damping: float, cycles: float) -> float:
    """Share of the steady state that a force standing still reaches from rest: 1 - exp(-2 pi zeta N).

    damping : fraction of critical; cycles : N of the load [1]. Textbook, for small damping. With the cycles of a
    crossing it is far too high for a force that walks over a half sine: 1.6 times for short crossings.

    >>> round(fixed_position_factor(0.006, 59.7), 3)
    0.895
    """
    _need_above_zero(damping=damping)
    _need_not_below_zero(cycles=cycles)
    return -math.expm1(-2.0 * math.pi * damping * cycles)


def moving_force_factor(s: float) -> float:
    """Share R of the steady state at mid-span that a force reaches which crosses a half-sine mode at constant speed.

    s : 2 zeta f L / v, with L the length and v the speed, that is 2 zeta x (load cycles during the crossing) [1]

    The largest over theta = pi v t / L of s (s sin theta - cos theta + exp(-s theta)) / (1 + s^2), the slowly varying
    amplitude from rest; the peak acceleration is R F / (2 zeta M). R tends to 2 s for small s (a peak of 2 F f L/(M v),
    whatever the damping) and to 1 for large. Good to zeta^2 + (1 / (2 cycles))^2. Ricciardelli & Briatico, J. Eng.
    Mech. 137, 2011, 422-430, treat the same problem (from memory); derived anew.

    >>> [round(moving_force_factor(s), 4) for s in (0.1, 0.5, 1.0, 5.0)]
    [0.1728, 0.5553, 0.7562, 0.9806]
    """
    _need_not_below_zero(s=s)
    # The slope s cos + sin - s exp(-s theta) is above 0 at pi/2, below at pi, and vanishes once between: wherever it
    # does, the second derivative has the sign of the cosine.
    low, high = 0.5 * math.pi, math.pi
    for _ in range(60):
        theta = 0.5 * (low + high)
        if s * math.cos(theta) + math.sin(theta) > s * math.exp(-s * theta):
            low = theta
        else:
            high = theta
    return s * (s * math.sin(low) - math.cos(low) + math.exp(-s * low)) / (1.0 + s * s)


def moving_force_factor_along(ordinates: Floats, decay: float) -> float:
    """Share of the steady state that a crossing force reaches, for a mode of any shape.

    ordinates : [place], at equal distances from one end of the deck to the other, two at least, not all 0
    decay : zeta omega T with T the crossing time, 2 pi zeta x (load cycles during the crossing); pi s for a half sine

    The largest of |amplitude| during the crossing, relative to the steady state of a force standing at the largest
    |ordinate|: read there too, the peak acceleration is the factor x F phi_max^2 / (2 zeta M). The slowly varying
    amplitude A' + zeta omega A = F phi(t) / (2 M omega) starts from rest, runs along straight chords between the places
    and is integrated exactly, its turning points within a cell included; after the crossing it only decays. Good
    to zeta^2 + (1 / (2 cycles in a half wave))^2, and to about zeta / factor where the ordinate is not 0 at an end of
    the deck. Own derivation, as for `moving_force_factor`.

    ValueError for ordinates that do not fit or a negative decay.

    >>> half_sine = np.sin(np.pi * np.linspace(0.0, 1.0, 481))
    >>> round(moving_force_factor_along(half_sine, 0.5 * np.pi), 4)
    0.5553
    """
    phi = np.asarray(ordinates, dtype=np.float64)
    if phi.ndim != 1 or phi.size < 2 or not np.isfinite(phi).all() or not phi.any():
        raise ValueError(f"ordinates: two at least along the deck, finite, not all 0, not {phi.shape}")
    _need_not_below_zero(decay=decay)
    x = decay / (phi.size - 1)
    if x == 0.0:
        return 0.0
    # A cell of b' + b = p, x long, p straight: b(x) = kept b(0) + near p(0) + far p(x).
    kept, gained = math.exp(-x), -math.expm1(-x)
    far = 1.0 - gained / x
    near = gained - far
    gains = (near * phi[:-1] + far * phi[1:]).tolist()
    at_places = np.array(list(accumulate(gains, lambda b, gain: kept * b + gain, initial=0.0)))
    # Within a cell the amplitude turns where it meets the ordinate: at the share log1p(x (b - p)/rise)/x of the cell.
    rise, start = np.diff(phi), phi[:-1]
    swell = np.divide(x * (at_places[:-1] - start), rise, out=np.zeros_like(rise), where=rise != 0.0)
    share = np.log1p(np.maximum(swell, 0.0)) / x
    turning = np.where((share > 0.0) & (share < 1.0), start + rise * share, 0.0)
    return float(max(np.abs(at_places).max(), np.abs(turning).max()) / np.abs(phi).max())


def weight_form(
    constant: float, load_factor: float, walkers_weight: float, damping: float, structure_weight: float
) -> float:
    """The steady state in weights, as a fraction of gravity: C alpha Wp / (2 zeta W).

    constant : C, which says what the weights are: MODAL_WEIGHT, TOTAL_WEIGHT_OF_SIMPLE_SPAN, SPREAD_OVER_SIMPLE_SPAN
    load_factor : alpha of the harmonic in resonance; damping : fraction of critical
    walkers_weight, structure_weight : Wp and W, both [N] or both [N/m2]

    >>> round(weight_form(TOTAL_WEIGHT_OF_SIMPLE_SPAN, 0.4, 750.0, 0.006, 474_804.0), 4)
    0.1053
    """
    _need_above_zero(damping=damping, structure_weight=structure_weight)
    return constant * load_factor * walkers_weight / (2.0 * damping * structure_weight)
