"""Published populations: pace, step length or speed, weight. One entry a source.

Values by author and year; "from memory" where the original was not at hand. Truncation bounds
are this program's choice: they only keep out what no walker does.
"""

from __future__ import annotations

from dataclasses import dataclass

from crowdsim.crowd.distributions import Distribution, fixed, normal

GRAVITY = 9.81  # m/s2, by which a mass is a weight everywhere in the program


@dataclass(frozen=True)
class Population:
    """Who walks or jogs, as a source describes them.

    pace [Hz]; step_length [m] or speed [m/s], the other None; weight [N]; sources: where each of
    pace, stride (step length or speed) and weight comes from
    """

    gait: str
    pace: Distribution
    step_length: Distribution | None
    speed: Distribution | None
    weight: Distribution
    sources: dict[str, str]


_WALKING = (1.2, 2.6)
_STEP_LENGTH = normal(0.71, 0.071, 0.4, 1.1)
_STEP_SOURCE = "Zivanovic, Pavic & Reynolds 2007, from memory"
_WEIGHT = Distribution("lognormal", 73.9 * GRAVITY, 15.7 * GRAVITY, 300.0, 1500.0)
_WEIGHT_SOURCE = "Caprani, Keogh, Archbold & Fanning 2012 after Portier 2007, 73.9 kg, 21 %, from memory"

POPULATIONS: dict[str, Population] = {
    "zivanovic-2007": Population(
        "walking", normal(1.87, 0.186, *_WALKING), _STEP_LENGTH, None, _WEIGHT,
        {
            "pace": "Zivanovic, Pavic & Reynolds 2007, Engineering Structures 29, from memory",
            "stride": _STEP_SOURCE,
            "weight": _WEIGHT_SOURCE,
        },
    ),
    "matsumoto-1978": Population(
        "walking", normal(1.99, 0.173, *_WALKING), _STEP_LENGTH, None, _WEIGHT,
        {
            "pace": "Matsumoto et al. 1978, IABSE Proceedings P-17/78, from memory",
            "stride": _STEP_SOURCE,
            "weight": _WEIGHT_SOURCE,
        },
    ),
    "setra-2006": Population(
        "walking", normal(2.0, 0.175, *_WALKING), None, fixed(1.5), fixed(700.0),
        {
            "pace": "Setra 2006, the guide's simulations (it puts the mean on the mode), from memory",
            "stride": "Setra 2006, from memory",
            "weight": "Setra 2006, from memory",
        },
    ),
    "caprani-2012": Population(
        "walking", normal(1.96, 0.209, *_WALKING), normal(0.66, 0.066, 0.4, 1.1), None, _WEIGHT,
        {
            "pace": "Caprani, Keogh, Archbold & Fanning 2012, Computers & Structures, from memory",
            "stride": "Caprani et al. 2012, from memory",
            "weight": _WEIGHT_SOURCE,
        },
    ),
    "joggers": Population(
        "jogging", normal(2.62, 0.14, 2.0, 3.4), None, normal(2.7, 0.35, 1.6, 4.0), _WEIGHT,
        {
            "pace": "put together here, no published set: after treadmill data at 2.7 m/s (Karamanidis & "
            "Arampatzis 2005, from memory)",
            "stride": "put together here: the same data and the guides' 3 m/s, from memory",
            "weight": _WEIGHT_SOURCE,
        },
    ),
}  # fmt: skip

DEFAULT_POPULATION = {"walking": "zivanovic-2007", "jogging": "joggers"}
