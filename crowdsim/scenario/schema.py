"""The scenario file as typed tables. A new key is one field here."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, model_validator

from crowdsim.scenario.quantities import (
    Acceleration,
    Angle,
    BodyWeight,
    Density,
    Flow,
    Fraction,
    Frequency,
    Length,
    Mass,
    Number,
    Offset,
    Pace,
    Phase,
    StepLength,
    Table,
    Time,
    WalkingSpeed,
    custom,
)

Gait = Literal["walking", "jogging"]
Construction = Literal["reinforced concrete", "prestressed concrete", "composite", "steel", "timber", "stress ribbon"]
HARMONICS_LIMIT = 8
SMALLEST, LARGEST = 1e-6, 1e6  # ordinates


class Head(Table):
    """What the scenario is about."""

    title: str = Field("untitled", description="shown on every output")
    note: str = Field("", description="free text, kept with the results")


class DeckTable(Table):
    """The walking surface."""

    length: Annotated[Length, Field(gt=0, le=5000)] = Field(description="along the walking line [m]")
    width: Annotated[Length, Field(gt=0, le=100)] = Field(description="clear walking width [m]")
    construction: Construction | None = Field(None, description="says which tabled damping a sensitivity study tries")


class Shape(Table):
    """Ordinates along the deck: half waves, or a table of points from 0 to the deck's length."""

    half_waves: int | None = Field(None, ge=1, le=50, strict=True, description="sin(n pi s / L)")
    amplitude: Number = Field(1.0, description="factor of the half waves")
    s: list[Length] | None = Field(None, description="places [m], growing, from 0 to the length")
    value: list[Number] | None = Field(None, description="ordinates there")
    interpolation: Literal["spline", "linear", "monotone"] = "spline"

    @model_validator(mode="after")
    def _one_kind(self) -> Shape:
        if self.half_waves is not None:
            if self.s is not None or self.value is not None:
                raise custom("half_waves beside s and value", "one of the two forms")
            if not SMALLEST <= abs(self.amplitude) <= LARGEST:
                allowed = f"other than 0: {SMALLEST:g} to {LARGEST:g}, or its negative"
                raise custom(f"amplitude is {self.amplitude:g}", allowed)
            return self
        if self.s is None or self.value is None:
            raise custom("neither half_waves nor a table", "half_waves = 1, or s = [...] and value = [...]")
        if len(self.s) != len(self.value):
            raise custom(f"s has {len(self.s)} numbers, value {len(self.value)}", "as many of one as of the other")
        if len(self.s) < 2:
            raise custom(f"{len(self.s)} point", "at least 2 points")
        if any(b <= a for a, b in zip(self.s, self.s[1:], strict=False)):
            raise custom("s does not grow from point to point", "each s above the one before")
        if not any(self.value):
            raise custom("every value is 0", "at least one other than 0")
        top = max(abs(v) for v in self.value)
        if not SMALLEST <= top <= LARGEST:
            raise custom(f"the largest value is {top:g}", f"{SMALLEST:g} to {LARGEST:g}")
        if min(b - a for a, b in zip(self.s, self.s[1:], strict=False)) < 1e-6 * (self.s[-1] - self.s[0]):
            raise custom("two points all but coincide", "at least a millionth of the length between points")
        return self


class ModeTable(Table):
    """One mode of the bridge. `modal_mass` belongs to the ordinates exactly as given."""

    name: str = Field(min_length=1)
    frequency: Annotated[Frequency, Field(gt=0, le=100)] = Field(description="[Hz]")
    damping: Annotated[Fraction, Field(gt=0)] = Field(description="fraction of critical")
    modal_mass: Annotated[Mass, Field(ge=1e-3, le=1e12)] = Field(description="[kg]")
    vertical: Shape | None = None
    lateral: Shape | None = None
    longitudinal: Shape | None = None
    twist: Shape | None = Field(None, description="rad per unit of q; positive lifts the left edge")

    @model_validator(mode="after")
    def _moves(self) -> ModeTable:
        if all(getattr(self, d) is None for d in ("vertical", "lateral", "longitudinal", "twist")):
            raise custom("no ordinates", "vertical, lateral, longitudinal or twist = { half_waves = 1 }, say")
        return self


class Arrival(Table):
    """How people arrive: one of four."""

    per_hour: Annotated[Flow, Field(gt=0)] | None = Field(None, description="Poisson, persons per hour")
    density: Annotated[Density, Field(gt=0, le=6)] | None = Field(None, description="Poisson, persons/m2 on average")
    constant: int | None = Field(None, ge=1, le=100000, strict=True, description="exactly this many on the deck")
    times: list[Annotated[Time, Field(ge=0)]] | None = Field(None, min_length=1, description="given times [s]")

    @model_validator(mode="after")
    def _one(self) -> Arrival:
        keys = ("per_hour", "density", "constant", "times")
        given = [k for k in keys if getattr(self, k) is not None]
        if len(given) != 1:
            raise custom(f"{' and '.join(given) or 'nothing'} given", f"exactly one of {', '.join(keys)}")
        return self


class Load(Table):
    """The varying vertical force: load factors written out, or a published set."""

    harmonics: list[Annotated[Number, Field(ge=0, le=10)]] | None = Field(
        None, min_length=1, max_length=HARMONICS_LIMIT, description="amplitude / weight of harmonic 1, 2, ..."
    )
    phases: list[Angle] | None = Field(None, description="phase of each harmonic [rad], default 0")
    set: str | None = Field(None, description="name of a published set")
    scatter: bool | None = Field(None, strict=True, description="draw each person's factors from the source's scatter")
    contact_ratio: Number | None = Field(None, description="half-sine: contact time x pace")

    @model_validator(mode="after")
    def _one(self) -> Load:
        if (self.harmonics is None) == (self.set is None):
            raise custom("harmonics and set", "one of the two")
        if self.harmonics is None and self.phases is not None:
            raise custom("phases without harmonics", "phases stand beside harmonics")
        if self.harmonics is not None:
            if self.scatter is not None or self.contact_ratio is not None:
                raise custom("scatter or contact_ratio beside harmonics", "they belong to a published set")
            if self.phases is not None and len(self.phases) != len(self.harmonics):
                raise custom(f"{len(self.phases)} phases for {len(self.harmonics)} harmonics", "one phase a harmonic")
            if not any(self.harmonics):
                raise custom("every harmonic is 0", "at least one above 0")
        return self


def _named_load(value: Any) -> Any:
    return {"set": value} if isinstance(value, str) else value


LoadChoice = Annotated[Load, BeforeValidator(_named_load, json_schema_input_type=str | Load)]


class StreamTable(Table):
    """People who are alike: how they arrive, walk and load the deck."""

    name: str = Field(min_length=1)
    gait: Gait = "walking"
    arrival: Arrival
    forward_share: Annotated[Fraction, Field(ge=0, le=1)] = Field(1.0, description="share towards growing s")
    population: str | None = Field(None, description="published population for what is not given here")
    pace: Pace | None = None
    step_length: StepLength | None = None
    speed: WalkingSpeed | None = None
    weight: BodyWeight | None = None
    load: LoadChoice | None = None
    phase: Phase | None = Field(None, description="default: uniform at random")
    offset: Offset | None = Field(None, description="e of the walking line")


class CaseTable(Table):
    """A design situation: who is on the deck, what is asked."""

    name: str = Field(min_length=1)
    streams: list[str] | None = Field(None, min_length=1, description="names; default all")
    people: Literal["none", "mass"] = Field("none", description="the persons' effect on the modes")
    target: str | None = Field(None, description="the class to reach")
    limit: Annotated[Acceleration, Field(gt=0)] | None = Field(None, description="owner's limit [m/s2]")


class PointTable(Table):
    """A place, beside the antinodes, where response is recorded."""

    name: str = Field(min_length=1)
    s: Annotated[Length, Field(ge=0)]
    e: Length = 0.0
    direction: Literal["vertical", "lateral", "longitudinal"] = "vertical"


class RunTable(Table):
    """How much is simulated, and how."""

    duration: Annotated[Time, Field(ge=1, le=1e7)] = Field(960.0, description="observed time [s]")
    realisations: int = Field(200, ge=1, le=10_000_000, strict=True)
    seed: int = Field(1, ge=0, lt=2**63, strict=True)
    time_step: Annotated[Time, Field(ge=1e-4, le=0.1)] | None = Field(None, description="1/n s; default chosen")
    warm_up: Annotated[Time, Field(ge=0, le=1e6)] | None = Field(None, description="[s]; default chosen")
    integration: Literal["fox-goodwin", "linear-acceleration", "average-acceleration"] = "fox-goodwin"
    matched: bool = Field(True, strict=True, description="stiffness and damping matched to the step")


class ComfortTable(Table):
    """Whose classes speak, and of what time."""

    criterion: Literal["eur-23984", "setra-2006", "en-1990"] = "eur-23984"
    window: Annotated[Time, Field(ge=1)] | None = Field(
        None, description="the time that a class speaks of [s]; default 240 s, or the whole record if shorter"
    )


class ScenarioFile(Table):
    """Everything in a scenario file."""

    scenario: Head = Head(title="untitled", note="")
    deck: DeckTable
    mode: list[ModeTable] = Field(min_length=1, max_length=64)
    stream: list[StreamTable] = Field(min_length=1, max_length=200)
    case: list[CaseTable] = Field(default_factory=list)
    point: list[PointTable] = Field(default_factory=list)
    run: RunTable = RunTable()  # type: ignore[call-arg]
    comfort: ComfortTable = ComfortTable()  # type: ignore[call-arg]


_BOUNDS = {"gt": "exclusiveMinimum", "ge": "minimum", "lt": "exclusiveMaximum", "le": "maximum"}


def json_schema() -> dict[str, Any]:
    """JSON Schema of a scenario file, for editors that complete and check while one types."""
    schema = _tidied(ScenarioFile.model_json_schema(mode="validation"))
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "crowdsim scenario",
        "description": "A footbridge, its people and what is to be simulated",
        **{k: v for k, v in schema.items() if k not in ("title", "description")},
    }


def _tidied(node: Any) -> Any:
    """Without what TOML cannot say (null), with bounds on the number where a unit string may stand beside it."""
    if isinstance(node, list):
        return [_tidied(item) for item in node]
    if not isinstance(node, dict):
        return node
    out = {k: _tidied(v) for k, v in node.items() if not (k == "default" and v is None)}
    if isinstance(out.get("default"), dict):
        out["default"] = {k: v for k, v in out["default"].items() if v is not None}
    if isinstance(out.get("title"), str):
        del out["title"]
    bounds = {_BOUNDS[k]: out.pop(k) for k in tuple(out) if k in _BOUNDS}
    if "anyOf" in out:
        choices = [c for c in out["anyOf"] if c != {"type": "null"}]
        for choice in choices:
            if choice.get("type") == "number":
                choice.update(bounds)
        out["anyOf"] = choices
        if len(choices) == 1:
            out = {**choices[0], **{k: v for k, v in out.items() if k != "anyOf"}}
    else:
        out.update(bounds)
    return out
