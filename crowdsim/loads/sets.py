"""The load sets by gait and name."""

from __future__ import annotations

from crowdsim.loads.jogging import JOGGING, half_sine
from crowdsim.loads.load_set import LoadSet
from crowdsim.loads.walking import WALKING

LOAD_SETS: dict[str, dict[str, LoadSet]] = {"walking": WALKING, "jogging": JOGGING}
HALF_SINE = "half-sine"
DEFAULT_LOAD = {"walking": "young-2001-mean", "jogging": "iso-10137-2007"}


def names(gait: str) -> list[str]:
    """What a scenario may write as `load` for this gait."""
    return [*LOAD_SETS[gait], *([HALF_SINE] if gait == "jogging" else [])]


def load_set(gait: str, name: str, *, scatter: bool | None = None, contact_ratio: float | None = None) -> LoadSet:
    """The load set `name` of `gait`.

    scatter: None keeps what the source does; contact_ratio: of the half-sine pulse only.
    Raises KeyError for an unknown name, ValueError for an option that the set does not have.
    """
    if name == HALF_SINE and gait == "jogging":
        if contact_ratio is None:
            raise ValueError("half-sine needs contact_ratio (contact time x pace)")
        chosen = half_sine(contact_ratio)
    else:
        if contact_ratio is not None:
            raise ValueError(f"contact_ratio belongs to {HALF_SINE}, not to {name}")
        chosen = LOAD_SETS[gait][name]
    return chosen if scatter is None else chosen.scattered(scatter)
