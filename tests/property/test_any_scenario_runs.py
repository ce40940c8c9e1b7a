"""Whatever valid scenario is written, it runs, and what comes out is finite and fits together."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import crowdsim
from crowdsim.errors import InputError
from crowdsim.results.summary import summarise
from crowdsim.study.simulate import plan

FIXED = settings(deadline=None, derandomize=True, database=None, suppress_health_check=[HealthCheck.too_slow])


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One folder for all examples; each overwrites the file of the one before."""
    return tmp_path_factory.mktemp("runs")


@settings(FIXED, max_examples=120)
@given(data=st.data())
def test_any_valid_scenario_runs(
    valid_tables: st.SearchStrategy[dict[str, Any]], toml: Callable[[Any], str], folder: Path, data: st.DataObject
) -> None:
    """Finite numbers, an RMS below the peak, an envelope that holds the points, histories that hold the peak.

    Or it is refused for a time step or a scheme of its own, by name, and nothing is written.
    """
    text = toml(data.draw(valid_tables))
    scenario = crowdsim.parse_scenario(text)
    out = folder / "run.h5"
    refused = plan(scenario).errors
    if refused:  # a time step or a scheme of the writer's own that leaves a useless peak
        run = scenario.file.run
        assert {finding.key for finding in refused} == {"run.time_step"}
        assert run.time_step is not None or not run.matched
        with pytest.raises(InputError, match=r"run\.time_step"):
            crowdsim.simulate(scenario, out=folder / "refused.h5")
        assert not (folder / "refused.h5").exists()
        return
    results = crowdsim.simulate(scenario, workers=2, out=out, force=True)
    assert len(results.cases) == max(len(scenario.file.case), 1)
    for case in results.cases:
        assert case.realisations == scenario.file.run.realisations
        assert len(case.points.name) > 0
        for name in ("peak", "rms", "running_rms_max", "peak_time", "window_peak"):
            values = getattr(case, name)
            assert np.all(np.isfinite(values)), name
            assert np.all(values >= 0.0), name
        slack = 1.0 + 1e-9  # rounding of sums of squares
        assert np.all(case.rms <= case.peak * slack)
        assert np.all(case.running_rms_max <= case.peak * slack)
        begin = case.attributes["warm_up"]
        assert np.all(case.peak_time >= begin - 1e-9)
        assert np.all(case.peak_time <= begin + case.attributes["duration"] + 1e-9)
        if case.window_peak.shape[1]:
            assert np.all(case.window_peak.max(axis=1) <= case.peak * slack)
        assert np.all(case.crossings >= 0)
        for number, direction in enumerate(case.points.direction):
            s, e = case.points.s[number], case.points.e[number]
            line = np.flatnonzero(np.isclose(case.deck_e, e, atol=1e-12))
            if direction not in case.envelope or line.size == 0:  # the envelope runs along the edges and the middle
                continue
            station = int(np.argmin(np.abs(case.deck_s - s)))
            away = abs(case.deck_s[station] - s) / scenario.file.deck.length
            assert away <= 1e-6  # stations closer than that are one
            there = case.envelope[direction][:, line[0], station]
            # an ordinate up to 1.5 falls to -1.5 within a tenth of the deck at the quickest
            largest = case.envelope[direction].max()
            np.testing.assert_allclose(there, case.peak[:, number], rtol=1e-9, atol=1e-12 + 30.0 * away * largest)
        for envelope in case.envelope.values():
            assert np.all(np.isfinite(envelope))
        for number, history in case.histories.items():
            assert np.all(np.isfinite(history.acceleration))
            observed = np.abs(history.acceleration[history.time >= begin - 1e-9])
            assert np.all(observed.max(axis=0) <= case.peak[number] * slack)
    for case in summarise(out, "any").cases:
        for point in case.points:
            assert 0.0 <= point.peak.median <= point.peak.p95.value <= point.peak.largest
