"""Numbers, shares and durations as a person reads them."""

from __future__ import annotations

from collections.abc import Iterable
from math import floor, log10


def number(value: float, digits: int = 3) -> str:
    """With `digits` significant digits and no power of ten within reach.

    >>> number(0.98765), number(1234.5), number(0.0)
    ('0.988', '1,234', '0')
    """
    if value == 0.0:
        return "0"
    if not 1e-4 <= abs(value) < 1e6:
        return f"{value:.{digits - 1}e}"
    rounded = float(f"{value:.{digits - 1}e}")  # 0.9996 has the places of 1.00
    places = max(0, digits - 1 - floor(log10(abs(rounded))))
    return f"{value:,.{places}f}"


def percent(share: float) -> str:
    """A probability: two significant digits, never 0 or 100 % for a share that is neither.

    >>> percent(0.05), percent(0.0), percent(0.99999), percent(0.333), percent(0.0042)
    ('5.0 %', '0 %', 'over 99.9 %', '33 %', '0.42 %')
    """
    if 0.0 < share < 1e-4:
        return "under 0.01 %"
    if 0.999 < share < 1.0:
        return "over 99.9 %"
    value = 100.0 * share
    if value < 10.0:
        value = float(f"{value:.1e}")  # 9.96 has the places of 10
    if value in (0.0, 100.0):
        return f"{value:.0f} %"
    places = 0 if 10.0 <= value < 98.95 else 1 if value >= 1.0 else 1 - floor(log10(value))
    return f"{value:.{places}f} %"


def span(seconds: float) -> str:
    """A duration as a person says it.

    >>> span(75.0), span(100.0), span(240.0), span(7200.0)
    ('75 s', '100 s', '4 min', '2 h')
    """
    if seconds < 90.0 or (seconds < 600.0 and seconds % 60.0):
        return f"{seconds:.3g} s"
    if seconds < 5400.0:
        return f"{seconds / 60:.3g} min"
    return f"{seconds / 3600:.3g} h"


def apart(value: float, others: Iterable[float]) -> str:
    """A number with as many digits, three to six, as keep it apart from others that it is not.

    >>> apart(0.49996, [0.5, 1.0]), apart(0.4912, [0.5, 1.0]), apart(0.5, [0.5, 1.0])
    ('0.49996', '0.491', '0.500')
    """
    others = [x for x in others if x != value]
    for digits in range(3, 6):
        if all(number(value, digits) != number(x, digits) for x in others):
            return number(value, digits)
    return number(value, 6)
