"""Comfort ranges and frequency ranges of Setra/AFGC, Footbridges: assessment of vibrational behaviour of footbridges
under pedestrian loading, October 2006, chapter 2, from memory.

    range  comfort         vertical        horizontal [m/s2]
    1      maximum         0 to 0.5        0 to 0.15
    2      mean            0.5 to 1.0      0.15 to 0.30
    3      minimum         1.0 to 2.5      0.30 to 0.80
    4      unacceptable    above 2.5       above 0.80

    risk                           vertical, longitudinal       transverse [Hz]
    1  maximum                     1.7 to 2.1                   0.5 to 1.1
    2  medium                      1.0 to 1.7, 2.1 to 2.6       0.3 to 0.5, 1.1 to 1.3
    3  low, second harmonic        2.6 to 5.0                   1.3 to 2.5
    4  negligible                  outside                      outside

Transverse acceleration is held at 0.10 m/s2 in every case, for lock-in. An edge belongs to the worse range. Exact.
"""

from __future__ import annotations

import math

import pytest

from crowdsim.guides.setra_2006 import SETRA_2006

EDGES = [  # direction, edge [m/s2], range below it, range from it on
    ("vertical", 0.50, "range 1", "range 2"),
    ("vertical", 1.00, "range 2", "range 3"),
    ("vertical", 2.50, "range 3", "range 4"),
    *(
        (direction, edge, better, worse)
        for direction in ("lateral", "longitudinal")
        for edge, better, worse in (
            (0.15, "range 1", "range 2"),
            (0.30, "range 2", "range 3"),
            (0.80, "range 3", "range 4"),
        )
    ),
]
RISKS = [  # direction, frequency [Hz], worst range of risk that it lies in; edges and either side
    *((d, f, risk) for d in ("vertical", "longitudinal") for f, risk in (
        (0.99, None), (1.0, 2), (1.4, 2), (1.699, 2), (1.7, 1), (1.9, 1), (2.1, 1), (2.101, 2), (2.6, 2), (2.601, 3),
        (4.0, 3), (5.0, 3), (5.01, None),
    )),
    *(("lateral", f, risk) for f, risk in (
        (0.29, None), (0.3, 2), (0.499, 2), (0.5, 1), (0.8, 1), (1.1, 1), (1.101, 2), (1.3, 2), (1.301, 3), (2.5, 3),
        (2.51, None),
    )),
]  # fmt: skip


def risk(direction: str, frequency: float) -> int | None:
    """The first range of walking that holds a frequency, as the source lists them: worst first."""
    for band in SETRA_2006.bands[direction]:
        if band.gait == "walking" and band.holds(frequency):
            return int(band.words.removeprefix("range ").split(",")[0])
    return None


@pytest.mark.parametrize(("direction", "edge", "better", "worse"), EDGES)
def test_an_edge_belongs_to_the_worse_range(direction, edge, better, worse):
    assert SETRA_2006.classify(math.nextafter(edge, 0.0), direction) == better
    assert SETRA_2006.classify(edge, direction) == worse
    assert SETRA_2006.classify(math.nextafter(edge, 9.0), direction) == worse
    assert SETRA_2006.limit(direction, better) == edge


@pytest.mark.parametrize("direction", ["vertical", "lateral", "longitudinal"])
def test_the_ends(direction):
    assert SETRA_2006.classify(0.0, direction) == "range 1"
    assert SETRA_2006.classify(1e6, direction) == "range 4"


def test_no_range_is_left_out():
    assert SETRA_2006.classes == ("range 1", "range 2", "range 3", "range 4")
    assert [w.split()[0] for w in SETRA_2006.words] == ["maximum", "mean", "minimum", "unacceptable"]
    assert sum(len(bounds) for bounds in SETRA_2006.bounds.values()) == len(EDGES)


@pytest.mark.parametrize(("direction", "frequency", "expected"), RISKS)
def test_risk_of_a_frequency(direction, frequency, expected):
    assert risk(direction, frequency) == expected


@pytest.mark.parametrize("direction", ["vertical", "longitudinal", "lateral"])
def test_low_risk_is_that_of_the_second_harmonic(direction):
    for band in SETRA_2006.bands[direction]:
        if band.gait == "walking":
            assert band.harmonic == (2 if "range 3" in band.words else 1)


def test_runners():
    """2.0 to 3.5 Hz, vertical alone."""
    running = {d: [b for b in bands if b.gait == "jogging"] for d, bands in SETRA_2006.bands.items()}
    ((only,),) = [bands for bands in running.values() if bands]
    assert running["vertical"] == [only]
    assert (only.low, only.high, only.harmonic) == (2.0, 3.5, 1)


def test_the_cap_for_lock_in_is_said():
    assert "0.10 m/s2" in SETRA_2006.notes["lateral"]
    assert "lock-in" in SETRA_2006.notes["lateral"]


def test_the_source_says_what_year_and_how_sure():
    assert "2006" in SETRA_2006.source
    assert SETRA_2006.source.endswith("from memory")
    assert SETRA_2006.key == "setra-2006"
