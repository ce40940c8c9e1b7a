"""Limits of EN 1990:2002 + A1:2005, Annex A2, A2.4.3.2, recommended values of the peak on any part of the deck.

Vertical 0.7 m/s2; horizontal 0.2 m/s2 in normal use, 0.4 m/s2 in exceptional crowd conditions: read in texts that quote
the standard. Verification below 5 Hz (vertical) and 2.5 Hz (horizontal): from memory. Limits, no classes. Exact.
"""

from __future__ import annotations

import math

import pytest

from crowdsim.guides.en_1990 import EN_1990


@pytest.mark.parametrize(("direction", "limit"), [("vertical", 0.7), ("lateral", 0.2), ("longitudinal", 0.2)])
def test_limits(direction, limit):
    assert EN_1990.limit(direction) == limit
    assert EN_1990.classify(limit, direction) is None  # a limit is no class


def test_there_are_no_classes():
    assert EN_1990.classes == EN_1990.words == EN_1990.reachable == ()


@pytest.mark.parametrize(("direction", "high"), [("vertical", 5.0), ("lateral", 2.5), ("longitudinal", 2.5)])
def test_frequencies_to_verify(direction, high):
    """The edge is taken to need it, on the safe side."""
    (band,) = EN_1990.bands[direction]
    assert (band.low, band.high) == (0.0, high)
    assert f"{high:g} Hz" in band.words
    assert band.holds(0.1)
    assert band.holds(high)
    assert not band.holds(math.nextafter(high, 9.0))


@pytest.mark.parametrize("direction", ["lateral", "longitudinal"])
def test_the_exceptional_crowd_is_said(direction):
    assert "0.2 m/s2 in normal use" in EN_1990.notes[direction]
    assert "0.4 m/s2 in exceptional" in EN_1990.notes[direction]


def test_the_source_says_which_clause_and_how_sure():
    for part in ("EN 1990:2002", "A2.4.3.2", "recommended values", "texts that quote", "from memory", "National Annex"):
        assert part in EN_1990.source
    assert EN_1990.key == "en-1990"
