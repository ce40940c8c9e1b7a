"""Schema types of quantities: fixed numbers with units, and random ones."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationInfo, model_validator
from pydantic_core import PydanticCustomError

from crowdsim.crowd.distributions import Distribution
from crowdsim.scenario.units import UnitError, parse

# least and largest value of a quantity that has no min or max of its own
FLOORS = {"pace": (0.3, 6.0), "step_length": (0.1, 3.0), "speed": (0.1, 12.0), "weight": (10.0, 10_000.0)}


class Table(BaseModel):
    """A table of a scenario: unknown keys are errors, nothing is changed after reading."""

    model_config = ConfigDict(extra="forbid", frozen=True)


def custom(what: str, allowed: str = "") -> PydanticCustomError:
    """An error with what is wrong and what is allowed, for the reader to place."""
    return PydanticCustomError("crowdsim", "{what}", {"what": what, "allowed": allowed})


def _parser(kind: str) -> BeforeValidator:
    def read(value: Any, info: ValidationInfo) -> float:
        notes = (info.context or {}).get("notes") if info.context else None
        try:
            return parse(kind, value, notes)
        except UnitError as error:
            raise custom(error.what, error.allowed) from None

    return BeforeValidator(read, json_schema_input_type=float | str)


Length = Annotated[float, _parser("length")]
Mass = Annotated[float, _parser("mass")]
Weight = Annotated[float, _parser("weight")]
Frequency = Annotated[float, _parser("frequency")]
Fraction = Annotated[float, _parser("fraction")]
Time = Annotated[float, _parser("time")]
Speed = Annotated[float, _parser("speed")]
Angle = Annotated[float, _parser("angle")]
Acceleration = Annotated[float, _parser("acceleration")]
Density = Annotated[float, _parser("density")]
Flow = Annotated[float, _parser("flow")]
Number = Annotated[float, _parser("fraction")]


class Random(Table):
    """A random quantity. `mean` and `sd` belong to the variable before truncation to [min, max]."""

    distribution: Literal["fixed", "normal", "lognormal", "uniform"] = "normal"

    @model_validator(mode="after")
    def _complete(self) -> Random:
        given = {k: getattr(self, k) for k in ("mean", "sd", "min", "max") if getattr(self, k, None) is not None}
        at = getattr(self, "mean_at", None)
        if self.distribution == "uniform":
            missing, surplus = {"min", "max"} - set(given), set(given) & {"mean", "sd"}
            if missing or surplus or at:
                raise custom("a uniform quantity takes min and max, and no mean or sd", "min, max")
        elif self.distribution == "fixed":
            if "mean" not in given and not at:
                raise custom("no value given", "a number, or mean and sd")
        else:
            if at is not None and "mean" in given:
                raise custom("mean and mean_at given", "one of them")
            missing = {"sd"} - set(given) | (set() if at else {"mean"} - set(given))
            if missing:
                raise custom(
                    f"{' and '.join(sorted(missing))} missing", f"a {self.distribution} quantity takes mean and sd"
                )
        if at is None:
            try:
                self.build(-math.inf, math.inf)
            except ValueError as error:
                raise custom(str(error), "values outside min to max are redrawn") from None
        return self

    def build(self, floor: float, ceiling: float, mean: float | None = None) -> Distribution:
        """The distribution; min and max default to `floor` and `ceiling`; `mean` stands for mean_at."""
        value: Any = self
        low = floor if value.min is None else value.min
        high = ceiling if value.max is None else value.max
        return Distribution(
            self.distribution, (value.mean if mean is None else mean) or 0.0, value.sd or 0.0, low, high
        )


def _spread(value: Any) -> Any:
    return value if isinstance(value, dict | Random) else {"distribution": "fixed", "mean": value}


class RandomPace(Random):
    """Step frequency of a person [Hz]."""

    mean: Annotated[Frequency, Field(gt=0, le=6)] | None = None
    mean_at: str | None = Field(
        None, min_length=1, description="name of a mode whose frequency, as simulated, is the mean"
    )
    harmonic: int = Field(1, ge=1, le=8, strict=True, description="mean_at: the harmonic that meets the mode")
    sd: Annotated[Frequency, Field(gt=0)] | None = None
    min: Annotated[Frequency, Field(gt=0)] | None = None
    max: Annotated[Frequency, Field(gt=0, le=6)] | None = None

    @model_validator(mode="before")
    @classmethod
    def _fixed_at(cls, value: Any) -> Any:
        if isinstance(value, dict) and "mean_at" in value and "sd" not in value and "distribution" not in value:
            return {**value, "distribution": "fixed"}
        return value


class RandomStepLength(Random):
    """Step length [m]."""

    mean: Annotated[Length, Field(gt=0, le=3)] | None = None
    sd: Annotated[Length, Field(gt=0)] | None = None
    min: Annotated[Length, Field(gt=0)] | None = None
    max: Annotated[Length, Field(gt=0, le=3)] | None = None


class RandomSpeed(Random):
    """Speed along the deck [m/s]."""

    mean: Annotated[Speed, Field(gt=0, le=12)] | None = None
    sd: Annotated[Speed, Field(gt=0)] | None = None
    min: Annotated[Speed, Field(gt=0)] | None = None
    max: Annotated[Speed, Field(gt=0, le=12)] | None = None


class RandomWeight(Random):
    """Static weight [N], or a mass string."""

    mean: Annotated[Weight, Field(gt=0)] | None = None
    sd: Annotated[Weight, Field(gt=0)] | None = None
    min: Annotated[Weight, Field(gt=0)] | None = None
    max: Annotated[Weight, Field(gt=0)] | None = None


class RandomOffset(Random):
    """Offset of the walking line from the centre line [m], positive to the left."""

    mean: Length | None = None
    sd: Annotated[Length, Field(gt=0)] | None = None
    min: Length | None = None
    max: Length | None = None


class RandomPhase(Random):
    """Phase of the first harmonic as the person steps on [rad]."""

    mean: Angle | None = None
    sd: Annotated[Angle, Field(gt=0)] | None = None
    min: Angle | None = None
    max: Angle | None = None


Pace = Annotated[RandomPace, BeforeValidator(_spread, json_schema_input_type=float | str | RandomPace)]
StepLength = Annotated[
    RandomStepLength, BeforeValidator(_spread, json_schema_input_type=float | str | RandomStepLength)
]
WalkingSpeed = Annotated[RandomSpeed, BeforeValidator(_spread, json_schema_input_type=float | str | RandomSpeed)]
BodyWeight = Annotated[RandomWeight, BeforeValidator(_spread, json_schema_input_type=float | str | RandomWeight)]
Offset = Annotated[RandomOffset, BeforeValidator(_spread, json_schema_input_type=float | str | RandomOffset)]
Phase = Annotated[RandomPhase, BeforeValidator(_spread, json_schema_input_type=float | str | RandomPhase)]
