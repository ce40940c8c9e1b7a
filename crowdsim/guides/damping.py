"""Damping of footbridges by construction, as two guides table it for the vibrations of ordinary use.

Both sources give numbers for want of a measurement: the damping of a finished bridge is known when it was measured, and
differs from the table by a factor of two either way (common practice).
"""

from __future__ import annotations

from dataclasses import dataclass

EUR_23984_SOURCE = (
    "EUR 23984 EN, Design of lightweight footbridges for human induced vibrations, 2009, damping ratios for "
    "serviceability conditions; from memory"
)
SETRA_SOURCE = (
    "Setra, Footbridges: assessment of vibrational behaviour under pedestrian loading, 2006, critical damping "
    "ratios; from memory"
)


@dataclass(frozen=True)
class TabledDamping:
    """Fractions of critical for one construction.

    minimum, mean : of EUR 23984 (2009); setra : the one value of Setra (2006), None where it has none
    """

    minimum: float
    mean: float
    setra: float | None


TABLED_DAMPING: dict[str, TabledDamping] = {
    "reinforced concrete": TabledDamping(0.008, 0.013, 0.013),
    "prestressed concrete": TabledDamping(0.005, 0.010, 0.010),
    "composite": TabledDamping(0.003, 0.006, 0.006),
    "steel": TabledDamping(0.002, 0.004, 0.004),
    "timber": TabledDamping(0.010, 0.015, 0.010),
    "stress ribbon": TabledDamping(0.007, 0.010, None),
}
