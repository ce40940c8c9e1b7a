"""Comfort ranges and frequency ranges of the guide of Setra (2006)."""

from __future__ import annotations

from crowdsim.guides.criterion import Band, Criterion

_VERTICAL = (
    Band(1.7, 2.1, 1, "range 1, maximum risk"),
    Band(1.0, 1.7, 1, "range 2, medium risk"),
    Band(2.1, 2.6, 1, "range 2, medium risk"),
    Band(2.6, 5.0, 2, "range 3, low risk, second harmonic"),
)
_TRANSVERSE = (
    Band(0.5, 1.1, 1, "range 1, maximum risk"),
    Band(0.3, 0.5, 1, "range 2, medium risk"),
    Band(1.1, 1.3, 1, "range 2, medium risk"),
    Band(1.3, 2.5, 2, "range 3, low risk, second harmonic"),
)
_HORIZONTAL = (0.15, 0.30, 0.80)

SETRA_2006 = Criterion(
    key="setra-2006",
    title="Setra (2006)",
    source="Setra, Footbridges: assessment of vibrational behaviour under pedestrian loading, 2006, "
    "chapter 2; from memory",
    classes=("range 1", "range 2", "range 3", "range 4"),
    words=("maximum comfort", "mean comfort", "minimum comfort", "unacceptable"),
    bounds={"vertical": (0.50, 1.00, 2.50), "lateral": _HORIZONTAL, "longitudinal": _HORIZONTAL},
    bands={
        "vertical": (*_VERTICAL, Band(2.0, 3.5, 1, "runners", "jogging")),
        "longitudinal": _VERTICAL,
        "lateral": _TRANSVERSE,
    },
    notes={"lateral": "the source keeps transverse acceleration at or below 0.10 m/s2 in every case, for lock-in"},
)
