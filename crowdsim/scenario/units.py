"""Quantities with units: a number in SI, or a string such as "38.5 t", "0.5 %", "120 per minute"."""

from __future__ import annotations

import math
import re
from functools import cache
from typing import Any

from crowdsim.crowd.populations import GRAVITY

# kind: (unit in force, example)
KINDS = {
    "length": ("m", "48 m"),
    "mass": ("kg", "38.5 t"),
    "force": ("N", "750 N"),
    "weight": ("N", "750 N or 75 kg"),
    "frequency": ("Hz", "1.92 Hz or 115 per minute"),
    "fraction": ("", "0.5 %"),
    "time": ("s", "15 min"),
    "speed": ("m/s", "1.4 m/s or 5 km/h"),
    "angle": ("rad", "90 deg"),
    "acceleration": ("m/s2", "0.7 m/s2"),
    "density": ("1/m2", "0.5 persons/m2"),
    "rotation": ("rad", "0.4 rad"),
    "flow": ("1/h", "900 per hour"),
}
# the usual units, to spare the half second that pint takes to load; a test holds them to pint's own
USUAL = {
    "length": {"m": 1.0, "cm": 0.01, "mm": 0.001, "km": 1000.0},
    "mass": {"kg": 1.0, "t": 1000.0, "g": 0.001},
    "force": {"N": 1.0, "kN": 1000.0},
    "weight": {"N": 1.0, "kN": 1000.0, "kg": GRAVITY},
    "frequency": {"Hz": 1.0, "per minute": 1.0 / 60.0, "1/s": 1.0},
    "fraction": {"%": 0.01},
    "time": {"s": 1.0, "min": 60.0, "h": 3600.0},
    "speed": {"m/s": 1.0, "km/h": 1.0 / 3.6},
    "acceleration": {"m/s2": 1.0},
    "density": {"1/m2": 1.0, "persons/m2": 1.0},
    "flow": {"per hour": 1.0, "1/h": 1.0, "persons/h": 1.0, "per minute": 60.0},
}
_PINT_UNIT = {"m/s2": "m/s**2", "1/m2": "1/m**2", "1/h": "1/hour", "": "dimensionless"}
_NUMBER = re.compile(r"^\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*$")
_UNIT = re.compile(r"(?=.*[A-Za-z%])[\w\s%/*^.()°-]+")
_POWER_OF_NUMBER = re.compile(r"\d\s*(\*\*|\^)|(\*\*|\^)\s*[(-]*\d\d")
_COUNTED = re.compile(r"\b(persons?|people|pedestrians?|walkers?|joggers?|steps?|cycles?)\b", re.IGNORECASE)


class UnitError(ValueError):
    """What is wrong with a quantity, and what is allowed."""

    def __init__(self, what: str, allowed: str):
        self.what, self.allowed = what, allowed
        super().__init__(f"{what} ({allowed})")


@cache
def _registry() -> Any:
    import pint

    return pint.UnitRegistry()


def allowed_text(kind: str) -> str:
    """What may be written for a quantity of this kind."""
    unit, example = KINDS[kind]
    return f"a number{f' in {unit}' if unit else ''}, or a string with its unit such as {example!r}"


def parse(kind: str, value: object, notes: list[str] | None = None) -> float:
    """The quantity in SI. Raises UnitError for a wrong unit, a missing one or what is no number."""
    allowed = allowed_text(kind)
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise UnitError(f"{value!r} given", allowed)
    if isinstance(value, int | float):
        if not math.isfinite(value):
            raise UnitError(f"{value} given", allowed)
        return float(value)
    match = _NUMBER.match(value)
    if not match:
        raise UnitError(f"{value!r} is no number with a unit", allowed)
    number, unit = float(match.group(1)), match.group(2)
    if unit.startswith(","):
        raise UnitError(f"{value!r}: a comma", "a decimal point: " + value.replace(",", ".", 1))
    if not unit:
        raise UnitError(f"{value!r} has no unit", allowed)
    factor = USUAL.get(kind, {}).get(unit)
    if factor is not None and math.isfinite(number * factor):
        if kind == "weight" and unit == "kg":
            _mass_taken(value, number * factor, notes)
        return number * factor
    if not _UNIT.fullmatch(unit) or _POWER_OF_NUMBER.search(unit):
        raise UnitError(f"{value!r}: {unit!r} is no unit", allowed)
    if re.search(r"\btons?\b", unit, re.IGNORECASE):
        raise UnitError(f"{value!r}: ton is ambiguous", "write t for 1000 kg, or kg, lb")
    if kind == "mass" and re.fullmatch(r"k?N|MN", unit):
        raise UnitError(f"{value!r} is a force", "a mass: in kg or t")
    text = _COUNTED.sub("", unit).strip()
    text = re.sub(r"^per\b|^(?=/)", "1/" if text.startswith("per") else "1", text)
    text = re.sub(r"\bper\b", "/", text).replace("%", "percent")
    text = re.sub(r"(?<=[a-z])([23])\b", r"**\1", text)
    target = _PINT_UNIT.get(KINDS[kind][0], KINDS[kind][0])
    return _convert(kind, value, number, text or "dimensionless", target, notes, allowed)


def _article(word: str) -> str:
    return "an" if word[0] in "aeiou" else "a"


def _mass_taken(given: str, newton: float, notes: list[str] | None) -> None:
    if notes is not None:
        notes.append(f"weight {given!r} taken as {newton:.4g} N (times {GRAVITY} m/s2)")


def _convert(
    kind: str, given: str, number: float, text: str, target: str, notes: list[str] | None, allowed: str
) -> float:
    import pint

    registry = _registry()
    try:
        quantity = registry.Quantity(number, registry.parse_units(text) if "1/" not in text else None)
        if "1/" in text:
            quantity = number * registry.parse_expression(text)
        if kind in ("angle", "rotation"):
            if quantity.dimensionless and not _has_angle(quantity):
                raise UnitError(f"{given!r} is no angle", allowed)
        elif _has_angle(quantity):
            hint = "write it in Hz or per minute" if kind in ("frequency", "flow") else allowed
            raise UnitError(f"{given!r} has an angle in it", hint)
        if kind == "weight" and quantity.check("[mass]"):
            newton = float(quantity.to("kg").magnitude) * GRAVITY
            _mass_taken(given, newton, notes)
            return newton
        result = float(quantity.to(target).magnitude)
    except UnitError:
        raise
    except pint.DimensionalityError:
        raise UnitError(f"{given!r} is of the wrong kind for {_article(kind)} {kind}", allowed) from None
    except Exception:
        raise UnitError(f"{given!r}: unknown unit", allowed) from None
    if not math.isfinite(result):
        raise UnitError(f"{given!r} given", allowed)
    return result


def _has_angle(quantity: Any) -> bool:
    """Whether a unit of the quantity is an angle: radians, turns, degrees, revolutions, whatever their prefix."""
    return "radian" in quantity.to_root_units()._units
