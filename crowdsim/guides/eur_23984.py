"""Comfort classes and critical frequencies of EUR 23984 EN (2009)."""

from __future__ import annotations

from crowdsim.guides.criterion import Band, Criterion

_VERTICAL = (
    Band(1.25, 2.3, 1, "critical range"),
    Band(2.3, 4.6, 2, "extended range, where the second harmonic could matter"),
)

EUR_23984 = Criterion(
    key="eur-23984",
    title="EUR 23984 (2009)",
    source="EUR 23984 EN, Design of lightweight footbridges for human induced vibrations, 2009; from memory",
    classes=("CL1", "CL2", "CL3", "CL4"),
    words=("maximum comfort", "medium comfort", "minimum comfort", "unacceptable discomfort"),
    bounds={"vertical": (0.50, 1.00, 2.50), "lateral": (0.10, 0.30, 0.80)},
    bands={
        "vertical": (*_VERTICAL, Band(1.9, 3.5, 1, "joggers", "jogging")),
        "longitudinal": _VERTICAL,
        "lateral": (Band(0.5, 1.2, 1, "critical range"),),
    },
    notes={
        "lateral": "lock-in may begin at 0.10 to 0.15 m/s2",
        "longitudinal": "the source has no classes for this direction",
    },
)
