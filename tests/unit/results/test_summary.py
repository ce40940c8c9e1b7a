"""The summary of a results file equals numpy on the arrays of the same file."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from crowdsim.errors import ResultsError
from crowdsim.response.statistics import Distribution1D
from crowdsim.results import summary as module
from crowdsim.results.reader import CaseResults, open_results
from crowdsim.results.summary import Summary, summarise
from crowdsim.scenario.reader import Scenario
from crowdsim.study.simulate import plan, simulate_to

COUNT = 90
SHAPE = "vertical = { half_waves = 1 }"
CHANGES = (
    ("duration = 900.0", "duration = 240.0"),
    (SHAPE, SHAPE + "\ntwist = { half_waves = 2, amplitude = 0.3 }"),
    ("", '[[mode]]\nname = "V2"\nfrequency = 4\ndamping = 0.01\nmodal_mass = 4e4\nvertical = { half_waves = 2 }\n'),
    ("", '[[case]]\nname = "day"\n[[case]]\nname = "people"\npeople = "mass"\n'),
    ("", '[[point]]\nname = "lamp"\ns = 7\n'),
)


@pytest.fixture(scope="module")
def path(scenario: Callable[..., Scenario], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A results file of two cases and ninety realisations."""
    out = tmp_path_factory.mktemp("summary") / "run.h5"
    simulate_to(plan(scenario(*CHANGES), realisations=COUNT), out)
    return out


@pytest.fixture(scope="module")
def both(path: Path) -> tuple[Summary, tuple[CaseResults, ...]]:
    """The summary, and the arrays that it must be equal to."""
    return summarise(path, "Weir Lane"), open_results(path).cases


def agrees(said: Distribution1D, values: np.ndarray) -> None:
    ordered = np.sort(values)
    assert said.count == values.size == COUNT
    assert said.mean == np.mean(values)
    assert said.sd == np.std(values, ddof=1)
    assert said.median == np.median(values)
    assert said.largest == values.max()
    assert said.p95.share == 0.95
    assert said.p95.value == ordered[math.ceil(0.95 * COUNT) - 1]
    # ranks of the distribution-free 95 % interval of the 95 % value for n = 90: 81 and 90, from the binomial
    # distribution (computed): P(B <= 80) = 0.019 and P(B <= 81) = 0.047; P(B <= 88) = 0.943, P(B <= 89) = 0.990
    assert (said.p95.low, said.p95.high) == (ordered[81 - 1], ordered[90 - 1])


def test_every_point_equals_numpy(both: tuple[Summary, tuple[CaseResults, ...]]) -> None:
    said, cases = both
    assert [c.name for c in said.cases] == [c.name for c in cases] == ["day", "people"]
    for summary, case in zip(said.cases, cases, strict=True):
        assert [p.name for p in summary.points] == list(case.points.name)
        for i, point in enumerate(summary.points):
            assert (point.s, point.e, point.direction) == (
                case.points.s[i], case.points.e[i], case.points.direction[i],
            )  # fmt: skip
            agrees(point.peak, case.peak[:, i])
            agrees(point.rms, case.rms[:, i])
            agrees(point.running_rms_max, case.running_rms_max[:, i])
        assert summary.crossings_mean == case.crossings.mean()
        assert summary.realisations == COUNT
        assert (summary.duration, summary.time_step) == (240.0, case.attributes["time_step"])


def test_the_deck_equals_numpy(both: tuple[Summary, tuple[CaseResults, ...]]) -> None:
    said, cases = both
    for summary, case in zip(said.cases, cases, strict=True):
        (deck,) = summary.deck
        envelope = case.envelope["vertical"]
        agrees(deck.peak, envelope.max(axis=(1, 2)))
        values = np.sort(envelope, axis=0)[math.ceil(0.95 * COUNT) - 1]
        e, s = np.unravel_index(np.argmax(values), values.shape)
        assert (deck.s, deck.e) == (case.deck_s[s], case.deck_e[e])


def test_the_deck_read_in_slabs_is_the_same(
    path: Path, both: tuple[Summary, tuple[CaseResults, ...]], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(module, "_SLAB", 7 * COUNT)  # seven columns at a time
    assert summarise(path, "Weir Lane") == both[0]


def test_the_envelope_is_at_least_the_peak_of_a_point_on_it(both: tuple[Summary, tuple[CaseResults, ...]]) -> None:
    for case in both[1]:
        for i in range(len(case.points.name)):
            e = int(np.flatnonzero(case.deck_e == case.points.e[i])[0])
            s = int(np.argmin(np.abs(case.deck_s - case.points.s[i])))
            # the points stand among the stations; two summation orders of at most four terms
            np.testing.assert_allclose(case.envelope["vertical"][:, e, s], case.peak[:, i], rtol=1e-12)


def test_modes_are_those_that_were_simulated(both: tuple[Summary, tuple[CaseResults, ...]]) -> None:
    day, people = both[0].cases
    assert [m["name"] for m in day.modes] == ["V1", "V2"]
    assert (day.modes[0]["frequency"], day.modes[0]["modal_mass"], day.modes[0]["added_mass"]) == (1.92, 38500.0, 0.0)
    heavier = people.modes[0]
    assert heavier["added_mass"] > 0
    assert heavier["modal_mass"] == 38500.0 + heavier["added_mass"]
    assert heavier["frequency"] == pytest.approx(1.92 * math.sqrt(38500.0 / heavier["modal_mass"]), rel=1e-14)


def test_it_goes_to_json(both: tuple[Summary, tuple[CaseResults, ...]]) -> None:
    data = json.loads(json.dumps(both[0].as_dict(), allow_nan=False))
    assert data["title"] == "Weir Lane"
    assert data["seed"] == 7
    assert data["cases"][1]["points"][0]["peak"]["p95"]["value"] == both[0].cases[1].points[0].peak.p95.value


def test_a_file_that_is_none_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ResultsError):
        summarise(tmp_path / "none.h5", "")
