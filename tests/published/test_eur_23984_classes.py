"""Comfort classes and critical frequencies of EUR 23984 EN, Design of lightweight footbridges for human induced
vibrations (2009), from memory.

    class  comfort                    vertical        lateral [m/s2]
    CL1    maximum                    below 0.50      below 0.10
    CL2    medium                     0.50 to 1.00    0.10 to 0.30
    CL3    minimum                    1.00 to 2.50    0.30 to 0.80
    CL4    unacceptable discomfort    above 2.50      above 0.80

Critical range: vertical and longitudinal 1.25 to 2.3 Hz, extended to 4.6 Hz where the second harmonic could matter;
lateral 0.5 to 1.2 Hz. The classes are of the peak. The source does not say whose an edge is: here the worse class's.
Exact numbers.
"""

from __future__ import annotations

import math

import pytest

from crowdsim.guides.eur_23984 import EUR_23984

EDGES = [  # direction, edge [m/s2], class below it, class from it on
    ("vertical", 0.50, "CL1", "CL2"),
    ("vertical", 1.00, "CL2", "CL3"),
    ("vertical", 2.50, "CL3", "CL4"),
    ("lateral", 0.10, "CL1", "CL2"),
    ("lateral", 0.30, "CL2", "CL3"),
    ("lateral", 0.80, "CL3", "CL4"),
]
BANDS = [  # direction, gait, harmonic, low, high [Hz]
    ("vertical", "walking", 1, 1.25, 2.3),
    ("vertical", "walking", 2, 2.3, 4.6),
    ("vertical", "jogging", 1, 1.9, 3.5),
    ("longitudinal", "walking", 1, 1.25, 2.3),
    ("longitudinal", "walking", 2, 2.3, 4.6),
    ("lateral", "walking", 1, 0.5, 1.2),
]


@pytest.mark.parametrize(("direction", "edge", "better", "worse"), EDGES)
def test_an_edge_belongs_to_the_worse_class(direction, edge, better, worse):
    """A last bit below the edge is still the better class."""
    assert EUR_23984.classify(math.nextafter(edge, 0.0), direction) == better
    assert EUR_23984.classify(edge, direction) == worse
    assert EUR_23984.classify(math.nextafter(edge, 9.0), direction) == worse
    assert EUR_23984.limit(direction, better) == edge


@pytest.mark.parametrize("direction", ["vertical", "lateral"])
def test_the_ends(direction):
    assert EUR_23984.classify(0.0, direction) == "CL1"
    assert EUR_23984.classify(1e6, direction) == "CL4"


def test_no_class_is_left_out():
    assert EUR_23984.classes == ("CL1", "CL2", "CL3", "CL4")
    assert [w.split()[0] for w in EUR_23984.words] == ["maximum", "medium", "minimum", "unacceptable"]
    assert sum(len(bounds) for bounds in EUR_23984.bounds.values()) == len(EDGES)


def test_there_are_no_longitudinal_classes():
    assert EUR_23984.classify(0.4, "longitudinal") is None
    assert EUR_23984.limit("longitudinal", "CL1") is None
    assert "no classes" in EUR_23984.notes["longitudinal"]


def test_where_lock_in_may_begin_is_said():
    assert "lock-in" in EUR_23984.notes["lateral"]
    assert "0.10 to 0.15 m/s2" in EUR_23984.notes["lateral"]


@pytest.mark.parametrize(("direction", "gait", "harmonic", "low", "high"), BANDS)
def test_critical_frequencies(direction, gait, harmonic, low, high):
    """Both ends lie within."""
    (band,) = [b for b in EUR_23984.bands[direction] if (b.gait, b.harmonic) == (gait, harmonic)]
    assert (band.low, band.high) == (low, high)
    assert band.holds(low)
    assert band.holds(high)
    assert not band.holds(math.nextafter(low, 0.0))
    assert not band.holds(math.nextafter(high, 9.0))


@pytest.mark.parametrize("direction", ["vertical", "longitudinal"])
def test_the_extended_range_joins_the_critical_one(direction):
    """1.25 to 4.6 Hz without a gap."""
    first, second = (b for b in EUR_23984.bands[direction] if b.gait == "walking")
    assert (first.low, second.high) == (1.25, 4.6)
    assert first.high == second.low
    assert "extended" in second.words


def test_no_band_is_left_out():
    assert sum(len(bands) for bands in EUR_23984.bands.values()) == len(BANDS)


def test_the_second_harmonic_is_not_looked_at_sideways():
    assert [b.harmonic for b in EUR_23984.bands["lateral"]] == [1]


def test_the_source_says_what_year_and_how_sure():
    assert "EUR 23984 EN" in EUR_23984.source
    assert "2009" in EUR_23984.source
    assert EUR_23984.source.endswith("from memory")
    assert EUR_23984.key == "eur-23984"
