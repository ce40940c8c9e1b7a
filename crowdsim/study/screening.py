"""Which modes lie where walking and jogging reach, by published ranges and by the scenario's own people."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from crowdsim.bridge.modal import ModalModel, Mode
from crowdsim.guides.criterion import Band, Criterion
from crowdsim.guides.en_1990 import EN_1990
from crowdsim.guides.eur_23984 import EUR_23984
from crowdsim.guides.setra_2006 import SETRA_2006
from crowdsim.results.texts import number
from crowdsim.study.resonances import reaching
from crowdsim.study.situation import Situation, people_mass

FULL = 70.0  # kg/m2: one person of 70 kg a square metre, the loaded deck of Setra 2006, from memory
HARMONICS = (("walking", 1), ("walking", 2), ("jogging", 1))  # that sources have ranges for


@dataclass(frozen=True)
class Screened:
    """One mode in one direction against one harmonic of one gait.

    empty, people, full : frequency [Hz] of the bare deck, with the mass of the most persons that any
    case has on average, with 70 kg/m2 everywhere
    eur, setra, en : what the ranges of EUR 23984, Setra and EN 1990 say, empty text for nothing
    streams : streams of the scenario that reach it; simulate : whether it needs a closer look; why
    """

    mode: str
    direction: str
    gait: str
    harmonic: int
    empty: float
    people: float
    full: float
    eur: str
    setra: str
    en: str
    streams: tuple[str, ...]
    simulate: bool
    why: str


def screen(situations: Sequence[Situation]) -> Iterator[Screened]:
    """Rows for every mode and direction: each harmonic that a range or a stream names, else one that none does."""
    busiest = max(situations, key=lambda s: s.persons)
    bare = busiest.bare
    for mode in bare.modes:
        for direction in mode.directions:
            states = (mode.frequency, _with_people(bare, mode, busiest), _full(bare, mode))
            rows = [
                row
                for gait, harmonic in _harmonics(situations)
                if (row := _row(situations, mode, direction, gait, harmonic, states)) is not None
            ]
            yield from rows or [_quiet(mode, direction, states)]


def _harmonics(situations: Sequence[Situation]) -> list[tuple[str, int]]:
    """What sources have ranges for, and every harmonic of every stream's load."""
    own = {(s.load.gait, k) for now in situations for s in now.streams for k in range(1, s.load.harmonics + 1)}
    return [*HARMONICS, *sorted(own - set(HARMONICS), key=lambda x: (x[0] != "walking", x[1]))]


def _with_people(bare: ModalModel, mode: Mode, now: Situation) -> float:
    added = people_mass(bare, mode, now.streams)
    return bare.with_mass({mode.name: added}).mode(mode.name).frequency


def _full(bare: ModalModel, mode: Mode) -> float:
    mass = FULL * bare.length * bare.width * bare.mean_square(mode, 0.0, bare.width**2 / 12.0)
    return bare.with_mass({mode.name: mass}).mode(mode.name).frequency


def _named(criterion: Criterion, direction: str, gait: str, harmonic: int, low: float, high: float) -> str:
    """The first range (a source lists the worst first) that any frequency from low to high lies in."""
    for band in criterion.bands.get(direction, ()):
        if (band.gait, band.harmonic) == (gait, harmonic) and _meets(band, low, high):
            return f"{band.words}, {band.low:g} to {band.high:g} Hz"
    return ""


def _meets(band: Band, low: float, high: float) -> bool:
    return band.low <= high and low <= band.high


def _row(
    situations: Sequence[Situation], mode: Mode, direction: str, gait: str, harmonic: int,
    states: tuple[float, float, float],
) -> Screened | None:  # fmt: skip
    low, high = min(states), max(states)
    eur = _named(EUR_23984, direction, gait, harmonic, low, high)
    setra = _named(SETRA_2006, direction, gait, harmonic, low, high)
    en = _named(EN_1990, direction, "walking", 1, low, high)  # whatever the harmonic
    reached = _reached(situations, direction, gait, harmonic, (states[0], states[1])) if direction == "vertical" else ()
    if not (eur or setra or reached):
        return None
    why = [f"{name}: {text}" for name, text in (("EUR 23984", eur), ("Setra", setra)) if text]
    if reached:
        why.append("within the pace of " + " and ".join(f"'{name}'" for name in reached))
    if direction != "vertical":
        why.append(f"{direction} forces are not simulated in this version")
    return Screened(
        mode.name, direction, gait, harmonic, *states, eur=eur, setra=setra, en=en, streams=reached, simulate=True,
        why="; ".join(why),
    )  # fmt: skip


def _reached(
    situations: Sequence[Situation], direction: str, gait: str, harmonic: int, frequencies: tuple[float, float]
) -> tuple[str, ...]:
    found = [
        stream.walkers.name
        for now in situations
        for stream in now.streams
        if stream.load.gait == gait and any(harmonic in reaching(stream, f, 0.02) for f in frequencies)
    ]
    return tuple(dict.fromkeys(found))


def _quiet(mode: Mode, direction: str, states: tuple[float, float, float]) -> Screened:
    en = _named(EN_1990, direction, "walking", 1, min(states), max(states))
    why = f"{number(mode.frequency, 4)} Hz lies outside the ranges of EUR 23984 and Setra, and no stream reaches it"
    if en:
        why = f"EN 1990: {en}; {why}"
    if direction != "vertical":
        why += f"; {direction} forces are not simulated in this version"
    return Screened(
        mode.name, direction, "", 0, *states, eur="", setra="", en=en, streams=(), simulate=bool(en), why=why
    )
