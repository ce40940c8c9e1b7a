"""What a sensitivity study changes, one thing at a time, and what it leaves alone.

A variation is a changed scenario, read through the same checks as one that somebody wrote.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from pydantic import ValidationError

from crowdsim.crowd.distributions import Distribution
from crowdsim.crowd.populations import POPULATIONS
from crowdsim.guides.damping import EUR_23984_SOURCE, TABLED_DAMPING
from crowdsim.loads import sets
from crowdsim.scenario.checks import cross_checks
from crowdsim.scenario.lines import key_text
from crowdsim.scenario.reader import Scenario
from crowdsim.scenario.schema import CaseTable, ModeTable, ScenarioFile, StreamTable
from crowdsim.study.prepare import Case
from crowdsim.study.situation import Stream

GAITS = ("walking", "jogging")
FREQUENCIES = (0.90, 0.95, 1.05, 1.10)
STRIDES = (0.9, 1.1)
SPREADS = (0.7, 1.3)
DAMPINGS = (0.5, 2.0)
ARRIVALS = (0.8, 1.2)
OWN_CHOICE = "this program's choice"
ALIKE = 1e-3  # relative, for load factors and phases [rad]

ALWAYS_LEFT = (
    "weights and modal masses (with the people's effect left out the response grows with the weights and falls with "
    "the masses in proportion)",
    "mode shapes, walking lines, shares of the directions",
    "an imperfect gait, the damping that people add, people who fall into step (not modelled)",
)


@dataclass(frozen=True)
class Variation:
    """One change.

    subject, label : what is changed, and how; source : where the other value comes from
    scenario : with the change and the one case; None where it cannot be built, for the reason `problem`
    note : what else follows from the change
    """

    subject: str
    label: str
    source: str
    scenario: Scenario | None
    note: str = ""
    problem: str = ""


class UnbuildableError(ValueError):
    """A changed scenario that breaks a rule of scenarios."""


def changed(scenario: Scenario, table: CaseTable, **tables: Any) -> Scenario:
    """The scenario with `table` as its only case and other tables in place of its own.

    Raises UnbuildableError where it breaks a rule.
    """
    file = scenario.file.model_copy(update={"case": [table], **tables})
    try:
        file = ScenarioFile.model_validate(file.model_dump(exclude_none=True, warnings=False))
    except ValidationError as error:
        texts = [f"{key_text(e['loc'])}: {e['msg'].replace('Input should', 'should')}" for e in error.errors()]
        raise UnbuildableError("; ".join(dict.fromkeys(texts))) from None
    found = [f"{key_text(path)}: {what} ({allowed})" for path, what, allowed in cross_checks(file)]
    if found:
        raise UnbuildableError("; ".join(found))
    return replace(scenario, file=file)


def variations(scenario: Scenario, table: CaseTable, base: Case) -> tuple[list[Variation], list[str]]:
    """Every variation of a case, and what is not varied with the reason.

    scenario, table : as written; base : the case prepared from them
    """
    maker = _Maker(scenario, table, base)
    made = [
        *maker.load_sets(),
        *maker.paces(),
        *maker.tied_paces(),
        *maker.strides(),
        *maker.dampings(),
        *maker.frequencies(),
        *maker.effect_of_people(),
        *maker.arrivals(),
    ]
    return made, [*maker.left, *ALWAYS_LEFT]


def same(a: Case, b: Case) -> bool:
    """Whether two cases have the same modes, persons and loads (factors and phases within 0.1 %)."""
    modes = [(m.frequency, m.damping, m.modal_mass) for m in a.model.modes]
    if modes != [(m.frequency, m.damping, m.modal_mass) for m in b.model.modes]:
        return False
    return all(p.walkers == q.walkers and _same_load(p, q) for p, q in zip(a.streams, b.streams, strict=True))


def _same_load(a: Stream, b: Stream) -> bool:
    p, q = a.load, b.load
    pace = a.walkers.pace.quantile(np.linspace(0.001, 0.999, 21))
    f, g = p.factors(pace), q.factors(pace)
    if f.shape != g.shape or (p.phases is None) != (q.phases is None) or p.scatter != q.scatter:
        return False
    if p.scatter and p.name != q.name:
        return False
    turned = np.angle(np.exp(1j * (np.array(p.phases or 0.0) - np.array(q.phases or 0.0))))
    return bool(np.allclose(f, g, rtol=ALIKE, atol=0.0) and np.all(np.abs(turned) < ALIKE))


def _written(of: Distribution) -> dict[str, Any]:
    """As a scenario writes it."""
    if of.kind == "fixed":
        return {"distribution": "fixed", "mean": of.mean}
    ends = {"min": of.minimum, "max": of.maximum}
    moments = {} if of.kind == "uniform" else {"mean": of.mean, "sd": of.sd}
    return {"distribution": of.kind, **moments, **{k: v for k, v in ends.items() if np.isfinite(v)}}


def _scaled(of: Distribution, factor: float) -> dict[str, Any]:
    """With the mean scaled and all else kept; both ends where there is no mean."""
    if of.kind == "uniform":
        return _written(replace(of, minimum=factor * of.minimum, maximum=factor * of.maximum))
    return {**_written(of), "mean": factor * of.mean}


def _signed(factor: float) -> str:
    return f"{100.0 * (factor - 1.0):+.0f} %"


def _names(streams: list[StreamTable]) -> str:
    return ", ".join(s.name for s in streams)


class _Maker:
    """Makes the variations of one case; `left` gathers what it leaves alone."""

    def __init__(self, scenario: Scenario, table: CaseTable, base: Case):
        self.scenario, self.table = scenario, table
        self.built = {s.walkers.name: s for s in base.streams}
        self.streams = [s for s in scenario.file.stream if s.name in self.built]
        self.gaits = [g for g in GAITS if any(s.gait == g for s in self.streams)]
        self.left: list[str] = []

    def _of(self, gait: str) -> list[StreamTable]:
        return [s for s in self.streams if s.gait == gait]

    def _named(self, gait: str, label: str) -> str:
        """The label, with the gait where there are two."""
        return label if len(self.gaits) == 1 else f"{gait}: {label}"

    def _make(
        self, subject: str, label: str, source: str, note: str = "", *, table: CaseTable | None = None, **tables: Any
    ) -> Variation:
        try:
            scenario = changed(self.scenario, table or self.table, **tables)
        except UnbuildableError as error:
            return Variation(subject, label, source, None, note, str(error))
        return Variation(subject, label, source, scenario, note)

    def _with(self, changes: dict[str, dict[str, Any]]) -> list[StreamTable]:
        """All streams, those named changed."""
        return [s.model_copy(update=changes.get(s.name, {})) for s in self.scenario.file.stream]

    def _modes(self, **factors: float) -> list[ModeTable]:
        """All modes, some of their numbers scaled."""
        return [
            m.model_copy(update={key: factor * getattr(m, key) for key, factor in factors.items()})
            for m in self.scenario.file.mode
        ]

    def load_sets(self) -> Iterator[Variation]:
        """Every other published set, all streams of a gait at once."""
        for gait in self.gaits:
            chosen = self._of(gait)
            now = [self.built[s.name].load for s in chosen]
            for name in sets.names(gait):
                if name == sets.HALF_SINE:
                    if not any(load.name.startswith(sets.HALF_SINE) for load in now):
                        self.left.append(f"load set {name} of {gait} (needs a contact ratio, and none is given)")
                    continue
                if all(load.name == name for load in now):
                    continue
                other = sets.load_set(gait, name)
                scattered = any(load.scatter for load in now) and not other.scatter
                yield self._make(
                    "load set", self._named(gait, name), other.source,
                    "mean factors, without the scatter from person to person that the base has" if scattered else "",
                    stream=self._with({s.name: {"load": {"set": name}} for s in chosen}),
                )  # fmt: skip

    def paces(self) -> Iterator[Variation]:
        """The pace of every other population, where the pace is not tied to a mode."""
        for gait in self.gaits:
            free = [s for s in self._of(gait) if s.pace is None or s.pace.mean_at is None]
            if not free:
                continue
            others = {
                name: p
                for name, p in POPULATIONS.items()
                if p.gait == gait and any(self.built[s.name].walkers.pace != p.pace for s in free)
            }
            if not others:
                self.left.append(f"pace of {_names(free)} (no other population for {gait})")
            follows = any(self.built[s.name].walkers.step_length is not None for s in free)
            for name, p in others.items():
                yield self._make(
                    "pace", self._named(gait, f"{name}, {p.pace.mean:g} Hz, sd {p.pace.sd:g}"), p.sources["pace"],
                    "step length kept, speed follows" if follows else "speed kept, step length follows",
                    stream=self._with({s.name: {"pace": _written(p.pace)} for s in free}),
                )  # fmt: skip

    def tied_paces(self) -> Iterator[Variation]:
        """Less and more spread, where the mean of the pace is tied to a mode."""
        tied = [s for s in self.streams if s.pace is not None and s.pace.mean_at is not None]
        fixed = [s for s in tied if s.pace is not None and s.pace.distribution == "fixed"]
        if fixed:
            self.left.append(f"pace of {_names(fixed)} (exactly on a mode, as the scenario wants it)")
        spread = [s for s in tied if s not in fixed]
        if not spread:
            return
        paces = {s.name: s.pace for s in spread if s.pace is not None and s.pace.sd is not None}
        for factor in SPREADS:
            yield self._make(
                "pace", f"spread x {factor:g}", OWN_CHOICE,
                f"{_names(spread)}: the mean stays on the mode, so the spread is varied and not the population",
                stream=self._with({
                    name: {"pace": p.model_copy(update={"sd": factor * p.sd})} for name, p in paces.items() if p.sd
                }),
            )  # fmt: skip

    def strides(self) -> Iterator[Variation]:
        """A mean step length, or speed where that is given, a little shorter and longer."""
        kinds = {
            s.name: "speed" if self.built[s.name].walkers.speed is not None else "step_length" for s in self.streams
        }
        subject = " and ".join(dict.fromkeys(k.replace("_", " ") for k in sorted(set(kinds.values()), reverse=True)))

        def stride(s: StreamTable, factor: float) -> dict[str, Any]:
            kind = kinds[s.name]
            return {kind: _scaled(getattr(self.built[s.name].walkers, kind), factor)}

        for factor in STRIDES:
            yield self._make(
                subject, f"mean {subject} {_signed(factor)}", OWN_CHOICE,
                "at the same pace: people are longer or shorter on the deck",
                stream=self._with({s.name: stride(s, factor) for s in self.streams}),
            )  # fmt: skip

    def dampings(self) -> Iterator[Variation]:
        """As tabled for the construction; without one, half and double."""
        kind = self.scenario.file.deck.construction
        if kind is None:
            for factor in DAMPINGS:
                yield self._make(
                    "damping", "half the damping" if factor < 1.0 else "double the damping", OWN_CHOICE,
                    "construction is not given in [deck]; with it the tabled minimum and mean are tried",
                    mode=self._modes(damping=factor),
                )  # fmt: skip
            return
        tabled = TABLED_DAMPING[kind]
        for word, value in (("minimum", tabled.minimum), ("mean", tabled.mean)):
            yield self._make(
                "damping", f"{100 * value:g} %, {word} for {kind}", EUR_23984_SOURCE, "the same in all modes",
                mode=[m.model_copy(update={"damping": value}) for m in self.scenario.file.mode],
            )  # fmt: skip

    def frequencies(self) -> Iterator[Variation]:
        """All modes together, masses and shapes kept."""
        tied = [s for s in self.streams if s.pace is not None and s.pace.mean_at is not None]
        note = f"the pace of {_names(tied)} follows the mode" if tied else ""
        for factor in FREQUENCIES:
            yield self._make(
                "frequency", f"all frequencies {_signed(factor)}",
                "a computed frequency and the measured one often differ by as much (common practice)", note,
                mode=self._modes(frequency=factor),
            )  # fmt: skip

    def effect_of_people(self) -> Iterator[Variation]:
        """Their mass added where it is left out, and the other way round."""
        if self.table.people == "none":
            other, label, note = "mass", "people's mass added", "frequencies fall, damping ratios stay"
        else:
            other, label, note = "none", "people's mass left out", ""
        yield self._make(
            "people's effect", label, OWN_CHOICE, note, table=self.table.model_copy(update={"people": other})
        )

    def arrivals(self) -> Iterator[Variation]:
        """Fewer and more people."""
        timed = [s for s in self.streams if s.arrival.times is not None]
        free = [s for s in self.streams if s.arrival.times is None]
        if timed:
            self.left.append(f"number of people of {_names(timed)} (their times are given)")
        if not free:
            return

        def arrival(s: StreamTable, factor: float) -> dict[str, Any]:
            a = s.arrival
            if a.constant is not None:
                return {"arrival": {"constant": max(1, int(factor * a.constant + 0.5))}}
            key = "per_hour" if a.per_hour is not None else "density"
            return {"arrival": {key: factor * getattr(a, key)}}

        notes = []
        if any(s.arrival.constant is None for s in free):
            notes.append("the same persons in the same order, the gaps between them scaled")
        if any(s.arrival.constant is not None for s in free):
            notes.append("a constant number rounded to whole persons")
        for factor in ARRIVALS:
            yield self._make(
                "number of people", f"number of people {_signed(factor)}", OWN_CHOICE, "; ".join(notes),
                stream=self._with({s.name: arrival(s, factor) for s in free}),
            )  # fmt: skip
