"""Damping ratios by construction after two guides, for the vibrations of ordinary use.

Sources: EUR 23984 EN, Design of lightweight footbridges for human induced vibrations, 2009 (minimum and average damping
ratio, serviceability); Setra/AFGC, Footbridges: assessment of vibrational behaviour of footbridges under pedestrian
loading, October 2006 (one critical damping ratio a material, no stress ribbon). Both from memory.

Symbol map: xi [%] -> fraction of critical. Exact numbers; tolerance: rounding of the division by 100.
"""

from __future__ import annotations

from typing import get_args

import pytest

from crowdsim.guides.damping import EUR_23984_SOURCE, SETRA_SOURCE, TABLED_DAMPING
from crowdsim.scenario.schema import Construction

ROWS = [
    ("reinforced concrete", 0.8, 1.3, 1.3),
    ("prestressed concrete", 0.5, 1.0, 1.0),
    ("composite", 0.3, 0.6, 0.6),
    ("steel", 0.2, 0.4, 0.4),
    ("timber", 1.0, 1.5, 1.0),
    ("stress ribbon", 0.7, 1.0, None),
]


@pytest.mark.parametrize(("construction", "minimum", "mean", "setra"), ROWS)
def test_values(construction: str, minimum: float, mean: float, setra: float | None) -> None:
    """In per cent of critical. The guides differ for timber: 1.0 % is the one's minimum and the other's value."""
    found = TABLED_DAMPING[construction]
    assert 100.0 * found.minimum == pytest.approx(minimum, rel=1e-12)
    assert 100.0 * found.mean == pytest.approx(mean, rel=1e-12)
    assert found.setra == (None if setra is None else pytest.approx(setra / 100.0, rel=1e-12))


def test_every_construction_of_a_scenario_is_tabled() -> None:
    assert list(TABLED_DAMPING) == list(get_args(Construction)) == [row[0] for row in ROWS]


@pytest.mark.parametrize(("source", "year"), [(EUR_23984_SOURCE, "2009"), (SETRA_SOURCE, "2006")])
def test_sources_say_the_year_and_how_sure(source: str, year: str) -> None:
    assert year in source
    assert source.endswith("from memory")
