"""One Poisson stream is the sum of two independent ones whose rates add up to its own (textbook).

Two-sample Kolmogorov-Smirnov tests on the peaks and the RMS of 1500 realisations each, seeds fixed. False alarm of each
assertion: 1e-4. What would be seen: two halves that drew the same persons would raise the RMS by 41 %; a change of
the rate by a fifth is found (`test_the_comparison_can_fail`).
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import stats

import crowdsim
from crowdsim.study.executor import Halt, default_workers, rows
from crowdsim.study.simulate import plan

P_LOW = 1e-4
REALISATIONS = 1500
DECK = """
[deck]
length = 45.0
width = 3.0
[[mode]]
name = "V1"
frequency = 1.95
damping = 0.01
modal_mass = 36000.0
vertical = { half_waves = 1 }
[[mode]]
name = "V2"
frequency = 4.1
damping = 0.01
modal_mass = 36000.0
vertical = { half_waves = 2 }
[run]
duration = 40.0
"""


def stream(name: str, per_hour: float, forward: float = 0.5) -> str:
    """A Poisson stream of default walkers."""
    return (
        f'\n[[stream]]\nname = "{name}"\narrival = {{ per_hour = {per_hour} }}\nforward_share = {forward}\n'
        'load = { set = "young-2001-mean", scatter = true }\n'
    )


def measures(streams: str, seed: int) -> NDArray[np.float64]:
    """Peak and RMS at both antinodes and the crossings of each realisation [realisation, measure]."""
    case = plan(crowdsim.parse_scenario(DECK + streams), seed=seed).cases[0]
    return np.array(
        [[*r.response.peak, *r.response.rms, r.crossings] for r in rows(case, REALISATIONS, default_workers(), Halt())]
    )


@pytest.fixture(scope="module")
def together() -> NDArray[np.float64]:
    """One stream of 900 an hour, half of it each way."""
    return measures(stream("all", 900.0), 1)


@pytest.mark.parametrize(
    "parts",
    [
        stream("some", 450.0) + stream("others", 450.0),
        stream("few", 150.0) + stream("most", 750.0),
        stream("there", 450.0, 1.0) + stream("back", 450.0, 0.0),
    ],
    ids=["halves", "a sixth and the rest", "by direction"],
)
def test_splitting_a_stream_changes_nothing_in_distribution(together: NDArray[np.float64], parts: str) -> None:
    """Four measures and the crossings (discrete: the test is then on the safe side)."""
    apart = measures(parts, 2)
    for column in range(together.shape[1]):
        assert stats.ks_2samp(together[:, column], apart[:, column]).pvalue > P_LOW


def test_the_comparison_can_fail(together: NDArray[np.float64]) -> None:
    """720 instead of 900 an hour is found in every measure, and so is the stream counted twice."""
    for other in (stream("all", 720.0), stream("all", 900.0) + stream("again", 900.0)):
        different = measures(other, 3)
        for column in range(together.shape[1]):
            assert stats.ks_2samp(together[:, column], different[:, column]).pvalue < P_LOW


def test_two_streams_are_independent() -> None:
    """RMS under each of two streams alone, in the same realisations: no rank correlation (false alarm 1e-4)."""
    text = DECK + stream("some", 450.0) + stream("others", 450.0)
    text += '\n[[case]]\nname = "a"\nstreams = ["some"]\n[[case]]\nname = "b"\nstreams = ["others"]\n'
    found = [
        [r.response.rms[0] for r in rows(case, REALISATIONS, default_workers(), Halt())]
        for case in plan(crowdsim.parse_scenario(text)).cases
    ]
    assert stats.spearmanr(*found).pvalue > P_LOW
