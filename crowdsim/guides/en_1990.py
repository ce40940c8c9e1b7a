"""Limits of EN 1990, Annex A2 (bridges), A2.4.3.2: limits, no classes."""

from __future__ import annotations

from crowdsim.guides.criterion import Band, Criterion

_HORIZONTAL = (Band(0.0, 2.5, 1, "verification needed below 2.5 Hz"),)

EN_1990 = Criterion(
    key="en-1990",
    title="EN 1990 Annex A2",
    source="EN 1990:2002 + A1:2005, Annex A2, A2.4.3.2, recommended values, read in texts that quote them; "
    "frequencies from memory; a National Annex may differ",
    classes=(),
    words=(),
    bounds={"vertical": (0.7,), "lateral": (0.2,), "longitudinal": (0.2,)},
    bands={
        "vertical": (Band(0.0, 5.0, 1, "verification needed below 5 Hz"),),
        "lateral": _HORIZONTAL,
        "longitudinal": _HORIZONTAL,
    },
    notes={
        "lateral": "0.2 m/s2 in normal use; 0.4 m/s2 in exceptional crowd conditions",
        "longitudinal": "0.2 m/s2 in normal use; 0.4 m/s2 in exceptional crowd conditions",
    },
)
