"""Quantities with units: every kind, the SI value by hand, and what is refused with which words.

A wrong factor here is a wrong verdict further on, without any other sign of it.
"""

from __future__ import annotations

import math

import pytest

from crowdsim.scenario import units
from crowdsim.scenario.units import GRAVITY, KINDS, UnitError, allowed_text, parse

# conversions by hand from the definitions (min = 60 s, in = 25.4 mm, lb = 0.45359237 kg, lbf = lb x 9.80665 m/s2)
GOOD = [
    ("length", "48 m", 48.0),
    ("length", "48000 mm", 48.0),
    ("length", "0.048 km", 48.0),
    ("length", "100 in", 2.54),
    ("length", "-1.2 m", -1.2),
    ("length", ".5 m", 0.5),
    ("length", "1e3 mm", 1.0),
    ("mass", "38.5 t", 38500.0),
    ("mass", "38500 kg", 38500.0),
    ("mass", "100 lb", 45.359237),
    ("force", "0.42 kN", 420.0),
    ("force", "750 N", 750.0),
    ("weight", "0.75 kN", 750.0),
    ("weight", "100 lbf", 45.359237 * 9.80665),
    ("weight", "75 kg", 735.75),
    ("frequency", "1.92 Hz", 1.92),
    ("frequency", "120 per minute", 2.0),
    ("frequency", "120/min", 2.0),
    ("frequency", "120 steps per minute", 2.0),
    ("frequency", "2 1/s", 2.0),
    ("fraction", "0.5 %", 0.005),
    ("fraction", "0.5%", 0.005),
    ("fraction", "0.5 percent", 0.005),
    ("time", "15 min", 900.0),
    ("time", "0.5 h", 1800.0),
    ("time", "900 s", 900.0),
    ("speed", "1.4 m/s", 1.4),
    ("speed", "5 km/h", 5 / 3.6),
    ("speed", "5 km per hour", 5 / 3.6),
    ("angle", "90 deg", 0.5 * math.pi),
    ("angle", "1.5 rad", 1.5),
    ("rotation", "0.4 rad", 0.4),
    ("acceleration", "0.7 m/s2", 0.7),
    ("acceleration", "0.7 m/s^2", 0.7),
    ("acceleration", "70 cm/s2", 0.7),
    ("density", "0.5 persons/m2", 0.5),
    ("density", "0.5 persons per m2", 0.5),
    ("density", "0.5 per m2", 0.5),
    ("flow", "900 per hour", 900.0),
    ("flow", "900 persons per hour", 900.0),
    ("flow", "15 per minute", 900.0),
    ("flow", "0.25 Hz", 900.0),
]

BAD = [
    ("mass", "38.5 ton", "ton is ambiguous"),
    ("mass", "38.5 tons", "ton is ambiguous"),
    ("mass", "38.5 Ton", "ton is ambiguous"),
    ("weight", "0.08 ton", "ton is ambiguous"),
    ("mass", "420 kN", "is a force"),
    ("mass", "1 MN", "is a force"),
    ("mass", "75 m", "wrong kind"),
    ("mass", "75", "has no unit"),
    ("frequency", "12 rad/s", "has an angle in it"),
    ("frequency", "12 radians per second", "has an angle in it"),
    ("frequency", "115 rpm", "has an angle in it"),
    ("frequency", "2 rps", "angle"),
    ("frequency", "2 turns/s", "angle"),
    ("frequency", "2 mrad/s", "angle"),
    ("frequency", "2 °/s", "angle"),
    ("fraction", "0.5 rad", "angle"),
    ("fraction", "1 deg", "angle"),
    ("frequency", "2 s", "wrong kind"),
    ("frequency", "2 hz", "unknown unit"),
    ("length", "48 s", "wrong kind"),
    ("length", "48,0 m", "a comma"),
    ("length", "12 parsnips", "unknown unit"),
    ("length", "abc", "no number with a unit"),
    ("length", "", "no number with a unit"),
    ("length", "1e400 m", "1e400 m"),
    ("fraction", "0.5", "has no unit"),
    ("fraction", "2 kg", "wrong kind"),
    ("force", "75 kg", "wrong kind"),
    ("weight", "7 m", "wrong kind"),
    ("time", "900 m", "wrong kind"),
    ("speed", "2 m", "wrong kind"),
    ("angle", "3 m", "wrong kind"),
    ("rotation", "3 m", "wrong kind"),
    ("acceleration", "0.7 m/s", "wrong kind"),
    ("density", "0.5 kg/m2", "wrong kind"),
    ("density", "0.5 per m", "wrong kind"),
    ("flow", "900 m", "wrong kind"),
]


@pytest.mark.parametrize(("kind", "text", "value"), GOOD)
def test_a_string_is_brought_to_si(kind: str, text: str, value: float) -> None:
    # a few roundings of the conversion factors, each below 2.3e-16
    assert parse(kind, text) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(("kind", "text", "what"), BAD)
def test_a_wrong_unit_is_refused_with_its_reason(kind: str, text: str, what: str) -> None:
    with pytest.raises(UnitError) as caught:
        parse(kind, text)
    assert what in caught.value.what
    assert repr(text) in caught.value.what or text in caught.value.what
    assert caught.value.allowed


def test_every_kind_has_a_good_and_a_bad_example_here() -> None:
    assert {kind for kind, *_ in GOOD} == set(KINDS)
    assert {kind for kind, *_ in BAD} == set(KINDS)


@pytest.mark.parametrize("kind", KINDS)
def test_a_plain_number_is_si_and_stays_as_it_is(kind: str) -> None:
    assert parse(kind, 0.1) == 0.1
    assert parse(kind, 3) == 3.0
    assert isinstance(parse(kind, 3), float)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("value", [True, None, [1.0], math.inf, -math.inf, math.nan])
def test_what_is_no_number_is_refused(kind: str, value: object) -> None:
    with pytest.raises(UnitError, match="given"):
        parse(kind, value)


@pytest.mark.parametrize("kind", KINDS)
def test_the_example_of_each_kind_is_accepted(kind: str) -> None:
    unit, example = KINDS[kind]
    assert example in allowed_text(kind)
    assert unit in allowed_text(kind)
    for written in example.split(" or "):
        assert math.isfinite(parse(kind, written))


def test_a_mass_as_weight_leaves_a_note_with_both_numbers() -> None:
    notes: list[str] = []
    assert parse("weight", "75 kg", notes) == 75 * GRAVITY
    assert len(notes) == 1
    assert "75 kg" in notes[0]
    assert "735.8 N" in notes[0]  # 735.75 in four digits
    assert "9.81" in notes[0]
    assert parse("weight", "750 N", notes) == 750.0
    assert len(notes) == 1


@pytest.mark.parametrize(("kind", "unit"), [(kind, unit) for kind, usual in units.USUAL.items() for unit in usual])
def test_a_usual_unit_is_what_pint_makes_of_it(kind: str, unit: str, monkeypatch: pytest.MonkeyPatch) -> None:
    values = (0.5, 1.0, 1.92, 38.5, 115.0, 900.0)
    notes: list[str] = []
    quick = [parse(kind, f"{x} {unit}", notes) for x in values]
    monkeypatch.setattr(units, "USUAL", {})
    others: list[str] = []
    assert quick == [parse(kind, f"{x} {unit}", others) for x in values]  # to the last bit
    assert notes == others
