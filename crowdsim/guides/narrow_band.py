"""A stationary random stream on one lightly damped mode: standard deviation, and peaks of a Gaussian process."""

from __future__ import annotations

import math

_EULER = 0.5772
_HIGHEST = 37.0  # standard deviations: exp(r^2/2) is still a number, exp(-r^2/2) is nothing beside any share


def _need_above_zero(**values: float) -> None:
    for name, value in values.items():
        if not 0.0 < value < math.inf:
            raise ValueError(f"{name} must be above 0, not {value:g}")


def standard_deviation(
    density: float, frequency: float, damping: float, modal_mass: float, ordinate: float = 1.0
) -> float:
    """Standard deviation of the acceleration [m/s2]: (phi / M) sqrt(S pi f / (4 zeta)).

    density : S [N2/Hz], one-sided, of the modal force at the mode's frequency; frequency : f [Hz]
    damping : fraction of critical; modal_mass : [kg]; ordinate : where the response is read

    omega^2 x the displacement under a density that is the same at all frequencies (textbook). It holds where the
    density changes little over the width zeta f of the resonance, so also where a crossing lasts much longer than
    1 / (zeta omega).

    >>> round(standard_deviation(997_356.0, 1.9, 0.006, 24_200.0), 3)
    0.651
    """
    _need_above_zero(frequency=frequency, damping=damping, modal_mass=modal_mass)
    return abs(ordinate) / modal_mass * math.sqrt(density * math.pi * frequency / (4.0 * damping))


def stream_density(
    persons: float, mean_square_ordinate: float, force_square: float, pace_density: float, harmonic: int = 1
) -> float:
    """One-sided density [N2/Hz] of the modal force of a random stream at a frequency f.

    N <phi^2> (E[F^2]/2) p(f/h)/h: persons come at random, each with a pace and a phase of his own.

    persons : N, mean number on the deck; mean_square_ordinate : <phi^2> along the deck (1/2 for half waves)
    force_square : E[F^2] [N2], F the amplitude of the harmonic h; harmonic : h
    pace_density : p(f/h) [1/Hz], density of the pace among those on the deck: where speed = pace x step length it is
    that of the arrivals weighted by 1/pace, for who walks slowly stays longer

    The spread in frequency from walking over the deck, about v/L, is left out. Brownjohn et al. 2004 and Piccardo &
    Tubino 2012 have the same idea (from memory); in this form textbook.

    >>> round(stream_density(20.0, 0.5, 300.0**2, 2.2163))
    997335
    """
    if harmonic < 1:
        raise ValueError(f"harmonic: 1 or more, not {harmonic}")
    return persons * mean_square_ordinate * 0.5 * force_square * pace_density / harmonic


def davenport(rate: float, time: float) -> float:
    """Mean of the largest value within a time, in standard deviations: g = sqrt(2 ln nu T) + 0.5772 / sqrt(2 ln nu T).

    rate : nu [Hz], upward crossings of the mean, about the mode's frequency; time : T [s]. For the largest |value| take
    twice the rate.

    Maxima that come independently of each other (Davenport, Note on the distribution of the largest value of a random
    function with application to gust loading, Proc. Inst. Civ. Engrs 28, 1964). A lightly damped mode has them in
    clumps, and g is too high for it. ValueError for nu T of 1 and below, where the form has no value; it is meant
    for large ones.

    >>> [round(davenport(1.0, time), 3) for time in (100.0, 1000.0)]
    [3.225, 3.872]
    """
    cycles = rate * time
    if not 1.0 < cycles < math.inf:
        raise ValueError(f"rate x time must be above 1, not {cycles:g}")
    root = math.sqrt(2.0 * math.log(cycles))
    return root + _EULER / root


def vanmarcke(share: float, frequency: float, damping: float, time: float) -> float:
    """Peak factor of |acceleration| that is not exceeded within a time with the probability `share`.

    share : between 0 and 1, 0.5 for the median; frequency : f [Hz] and damping (fraction of critical) of the mode
    time : T [s] of a stationary response

    First passage of a symmetric barrier r, in standard deviations, by a Gaussian process:

        L = (1 - e) exp(-2 f T e (1 - exp(-sqrt(pi/2) q^1.2 r)) / (1 - e)),    e = exp(-r^2 / 2).

    1 - e: the process starts within; 2 f e: crossings outward of |a|; the bracket: the share of them that is first in
    a clump; over 1 - e: only time spent within counts. q = sqrt(4 zeta / pi) is the bandwidth of a lightly damped mode
    under white noise, 1.2 an exponent that the source fitted to simulations. Vanmarcke, On the distribution of
    the first-passage time for normal stationary random processes, J. Appl. Mech. 42, 1975, 215-220; from memory.

    Against simulated white noise at 2 Hz and 600 s the median is 4 % high at zeta 0.5 %, 2 % at 1 % and 0.6 % at 2 %,
    the 95 % value within 2 %; at 240 s the 95 % value is 1 % high at 1 %, 3 % at 0.5 %, 5 % at 0.2 % (computed). For
    damping of 0.5 % and more, and f T of 600 and more; below, a few per cent high. Persons who cross a
    deck are no white noise, and their peaks can differ.

    >>> [round(vanmarcke(share, 2.0, 0.005, 600.0), 2) for share in (0.5, 0.95)]
    [3.61, 4.31]
    """
    _need_above_zero(frequency=frequency, damping=damping, time=time)
    if not 0.0 < share < 1.0:
        raise ValueError(f"share: between 0 and 1, not {share:g}")
    clumping = math.sqrt(0.5 * math.pi) * math.sqrt(4.0 * damping / math.pi) ** 1.2

    def log_probability(r: float) -> float:
        within = -math.expm1(-0.5 * r * r)
        rate = 2.0 * frequency * -math.expm1(-clumping * r) / math.expm1(0.5 * r * r)
        return math.log(within) - rate * time

    # L grows with r, and is at most 1 - e
    low, high = math.sqrt(-2.0 * math.log1p(-share)), _HIGHEST
    for _ in range(60):
        r = 0.5 * (low + high)
        if log_probability(r) < math.log(share):
            low = r
        else:
            high = r
    return 0.5 * (low + high)
