"""Published load factors of walking, vertical. f is the pace [Hz].

All values are from memory unless marked; the sources were not at hand.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from crowdsim.loads.load_set import LoadSet

Floats = NDArray[np.float64]
_QUARTER = 0.5 * math.pi


def _columns(*columns: Floats | float) -> Floats:
    return np.stack(np.broadcast_arrays(*columns), axis=-1).astype(np.float64)


def bachmann_ammann_1987(pace: Floats) -> Floats:
    """a1 = 0.4 up to 2.0 Hz, rising to 0.5 at 2.4 Hz, a2 = a3 = 0.1; valid for 1.6 to 2.4 Hz.

    Bachmann & Ammann, Vibrations in Structures, IABSE Structural Engineering Documents 3e, 1987;
    from memory, the range read in a text that quotes it. The source has a1 at 2.0 and 2.4 Hz; below
    2.0 Hz it is held at 0.4 (this program's choice). Second and third harmonic lag by pi/2.

    >>> bachmann_ammann_1987(np.array([2.0, 2.4])).round(3).tolist()
    [[0.4, 0.1, 0.1], [0.5, 0.1, 0.1]]
    """
    return _columns(0.4 + 0.25 * np.maximum(pace - 2.0, 0.0), 0.1, 0.1)


def kerr_1998(pace: Floats) -> Floats:
    """a1 = -0.2649 f^3 + 1.3206 f^2 - 1.7597 f + 0.7613, a2 = 0.07, a3 = 0.05; 1 to 3 Hz.

    Kerr, Human induced loading on staircases, PhD thesis, University College London, 1998; from
    memory. The first factor scatters by about 32 % at 95 %, a standard deviation of 16 %.

    >>> kerr_1998(np.array([1.8, 2.0]))[:, 0].round(3).tolist()
    [0.328, 0.405]
    """
    f = pace
    return _columns(((-0.2649 * f + 1.3206) * f - 1.7597) * f + 0.7613, 0.07, 0.05)


def young_2001_mean(pace: Floats) -> Floats:
    """Mean factors of four harmonics, each by its own frequency h = k f.

    min(0.37 (f - 0.95), 0.50), 0.054 + 0.0044 h, 0.026 + 0.0050 h, 0.010 + 0.0051 h; f 1 to 2.8 Hz.
    Young, Improved floor vibration prediction methodologies, ARUP, 2001; from memory.

    >>> young_2001_mean(np.array([2.0])).round(4).tolist()
    [[0.3885, 0.0716, 0.056, 0.0508]]
    """
    f = pace
    return _columns(
        np.minimum(0.37 * (f - 0.95), 0.50),
        0.054 + 0.0044 * 2 * f,
        0.026 + 0.0050 * 3 * f,
        0.010 + 0.0051 * 4 * f,
    )


def _young_spread(pace: Floats) -> Floats:
    """Coefficients of variation 0.17, 0.40, 0.40, 0.40 (Young 2001, from memory) times the means."""
    return np.asarray(young_2001_mean(pace) * np.array([0.17, 0.40, 0.40, 0.40]), dtype=np.float64)


def young_2001_design(pace: Floats) -> Floats:
    """Design factors (25 % chance of exceedance) of four harmonics, each by its own frequency h = k f.

    min(0.41 (f - 0.95), 0.56), 0.069 + 0.0056 h, 0.033 + 0.0064 h, 0.013 + 0.0065 h; f 1 to 2.8 Hz.
    Young 2001, also in CCIP-016 (2006); from memory.

    >>> young_2001_design(np.array([2.0])).round(4).tolist()
    [[0.4305, 0.0914, 0.0714, 0.065]]
    """
    f = pace
    return _columns(
        np.minimum(0.41 * (f - 0.95), 0.56),
        0.069 + 0.0056 * 2 * f,
        0.033 + 0.0064 * 3 * f,
        0.013 + 0.0065 * 4 * f,
    )


def iso_10137_2007(pace: Floats) -> Floats:
    """a1 = 0.37 (f - 1.0), a2 = 0.1, a3 = a4 = a5 = 0.06; f 1.2 to 2.4 Hz.

    ISO 10137:2007, Annex A; from memory.

    >>> iso_10137_2007(np.array([2.0])).round(3).tolist()
    [[0.37, 0.1, 0.06, 0.06, 0.06]]
    """
    return _columns(0.37 * (pace - 1.0), 0.1, 0.06, 0.06, 0.06)


def zivanovic_2007(pace: Floats) -> Floats:
    """First factor after Kerr 1998, then means 0.07, 0.05, 0.05, 0.03.

    Zivanovic, Pavic & Reynolds, Probability-based prediction of multi-mode vibration response to
    walking excitation, Engineering Structures 29, 2007; from memory. Sub-harmonics and the spread
    of each harmonic over a band are left out: this is the perfect gait with its random factors.

    >>> zivanovic_2007(np.array([2.0])).round(3).tolist()
    [[0.405, 0.07, 0.05, 0.05, 0.03]]
    """
    return _columns(kerr_1998(pace)[:, 0], 0.07, 0.05, 0.05, 0.03)


def _zivanovic_spread(pace: Floats) -> Floats:
    return _columns(0.16 * kerr_1998(pace)[:, 0], 0.030, 0.020, 0.020, 0.015)


def setra_2006(pace: Floats) -> Floats:
    """0.4, 0.1, 0.1 of 700 N; second and third harmonic about a quarter turn behind.

    Setra, Footbridges: assessment of vibrational behaviour under pedestrian loading, 2006; from memory.

    >>> setra_2006(np.array([2.0])).tolist()
    [[0.4, 0.1, 0.1]]
    """
    return _columns(np.full(pace.shape, 0.4), 0.1, 0.1)


_LAG = (0.0, -_QUARTER, -_QUARTER)

WALKING = {
    s.name: s
    for s in (
        LoadSet("bachmann-ammann-1987", "Bachmann & Ammann 1987, from memory", "walking", (1.6, 2.4),
                bachmann_ammann_1987, phases=_LAG),
        LoadSet("kerr-1998", "Kerr 1998, from memory", "walking", (1.0, 3.0), kerr_1998,
                spread=lambda f: _columns(0.16 * kerr_1998(f)[:, 0], 0.0, 0.0)),
        LoadSet("young-2001-mean", "Young 2001, mean values, from memory", "walking", (1.0, 2.8), young_2001_mean,
                spread=_young_spread),
        LoadSet("young-2001-design", "Young 2001, design values, from memory", "walking", (1.0, 2.8),
                young_2001_design),
        LoadSet("iso-10137-2007", "ISO 10137:2007, Annex A, walking, from memory", "walking", (1.2, 2.4),
                iso_10137_2007),
        LoadSet("zivanovic-2007", "Zivanovic, Pavic & Reynolds 2007, from memory", "walking", (1.2, 2.6),
                zivanovic_2007, spread=_zivanovic_spread, scatter=True),
        LoadSet("setra-2006", "Setra 2006, from memory", "walking", (1.6, 2.4), setra_2006, phases=_LAG),
    )
}  # fmt: skip
