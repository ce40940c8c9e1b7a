"""Laws fitted to the window peaks of a file: those of the same peaks in memory, and words where there is none."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import asdict
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from crowdsim.errors import ResultsError
from crowdsim.response.extremes import fit, goodness
from crowdsim.results.fits import SHARES, FittedCase, fit_file
from crowdsim.results.writer import CaseHead, ResultsWriter

Floats = NDArray[np.float64]
LATERAL = 1e-3  # what is in the other direction, which nobody fits


def write(path: Path, cases: Sequence[tuple[str, Floats, Floats]]) -> Path:
    """A file with these cases: name, peaks [realisation, window], largest of each record [realisation]."""
    with ResultsWriter(path, "", 7, []) as results:
        for name, peaks, records in cases:
            windows = peaks.shape[1]
            head = CaseHead(
                name=name, time_step=0.005, warm_up=100.0, duration=750.0 if windows else 60.0, window=240.0,
                windows=windows, criterion="eur-23984", people="none", persons=8.5,
                points=[("V1 vertical", 24.0, 0.0, "vertical"), ("V1 lateral", 24.0, 0.0, "lateral")],
                directions=("vertical", "lateral"), deck_s=np.linspace(0.0, 48.0, 3), deck_e=(0.0,),
                modes=[("V1", 1.9, 0.005, 39000.0, 0.0)], assumptions=[], target=None, limit=None, step={},
            )  # fmt: skip
            writer = results.case(head)
            for row, record in zip(peaks, records, strict=True):
                envelope = np.concatenate([record * np.array([0.3, 1.0, 0.2]), np.full(3, LATERAL)])
                deck = np.stack([row, np.full(windows, LATERAL)], axis=1)
                writer.append(SimpleNamespace(
                    peak=np.zeros(2), rms=np.zeros(2), running_rms_max=np.zeros(2), peak_time=np.zeros(2),
                    window_peak=np.zeros((windows, 2)), envelope=envelope, deck_window_peak=deck,
                ), 5)  # fmt: skip
            writer.flush()
        results.finish({})
    return path


def gumbel(realisations: int = 100, windows: int = 3, seed: int = 2) -> Floats:
    return np.random.default_rng(seed).gumbel(0.6, 0.08, (realisations, windows))


def one(path: Path, peaks: Floats, family: Any = "gumbel", records: Floats | None = None) -> FittedCase:
    (found,) = fit_file(write(path, [("day", peaks, peaks.max(axis=1) if records is None else records)]), family)
    return found


@pytest.mark.parametrize("family", ["gumbel", "gev"])
def test_the_law_of_the_peaks_in_the_file(tmp_path: Path, family: Any) -> None:
    """Windows of one realisation need not be independent: they are fitted as [realisation, window]."""
    peaks = gumbel()
    law, test = fit(peaks, family), goodness(fit(peaks, family), peaks)
    found = one(tmp_path / "run.h5", peaks, family)
    assert (found.case, found.direction, found.window, found.family) == ("day", "vertical", 240.0, family)
    assert (found.text, found.trouble) == (law.text(), "")
    assert (found.statistic, found.p_value, found.correlation) == (test.statistic, test.p_value, test.correlation)
    assert found.upper_end == (law.upper_end if law.shape < 0.0 else None)
    assert tuple(q.share for q in found.quantiles) == SHARES == (0.5, 0.95, 0.99, 0.999)
    for q in found.quantiles:
        assert (q.value, (q.low, q.high)) == (law.quantile(q.share), law.quantile_interval(q.share))
        assert q.low is not None
        assert q.high is not None
        assert q.low < q.value < q.high


@pytest.mark.parametrize(
    ("realisations", "windows", "beyond"),
    [(10, 1, (0.95, 0.99, 0.999)), (20, 1, (0.99, 0.999)), (99, 1, (0.99, 0.999)), (100, 1, (0.999,)),
     (34, 3, (0.999,)), (100, 3, (0.999,)), (334, 3, ())],
)  # fmt: skip
def test_what_lies_beyond_the_sample_is_extrapolated(
    tmp_path: Path, realisations: int, windows: int, beyond: tuple[float, ...]
) -> None:
    """A share above 1 - 1/windows simulated: of 20 windows the 95 % value is the last that they hold."""
    found = one(tmp_path / "run.h5", gumbel(realisations, windows))
    assert tuple(q.share for q in found.quantiles if q.extrapolated) == beyond


def test_records_shorter_than_a_window_are_fitted_whole(tmp_path: Path) -> None:
    records = gumbel(80, 1)[:, 0]
    found = one(tmp_path / "run.h5", np.zeros((80, 0)), records=records)
    assert found.window == 60.0
    assert found.text == fit(records).text()


def test_a_law_with_an_upper_end(tmp_path: Path) -> None:
    """A GEV law of shape -1/3: 1 - 0.2 times Weibull numbers, none above 1."""
    peaks = 1.0 - 0.2 * np.random.default_rng(4).weibull(3.0, (200, 1))
    found = one(tmp_path / "run.h5", peaks, "gev")
    assert found.upper_end is not None
    assert found.upper_end > peaks.max()


def test_a_law_without_standard_errors_has_quantiles_without_intervals(tmp_path: Path) -> None:
    """A GEV law of shape -0.7 crowds against its end: values, no intervals, and no nan in JSON."""
    peaks = 1.0 - 0.2 * np.random.default_rng(5).exponential(size=(300, 1)) ** 0.7
    law = fit(peaks, "gev")
    assert -1.0 < law.shape <= -0.5
    found = one(tmp_path / "run.h5", peaks, "gev")
    assert found.trouble == ""
    assert [(q.low, q.high) for q in found.quantiles] == [(None, None)] * 4
    assert json.loads(json.dumps(asdict(found), allow_nan=False))["quantiles"][0]["low"] is None


TROUBLE = {
    "constant": (np.full((80, 3), 0.5), "all 240 values are equal"),
    "nobody": (np.zeros((80, 3)), "240 of 240 values are exactly 0"),
    "seldom anybody": (np.where(gumbel(80) > 0.55, gumbel(80), 0.0), "values are exactly 0, as where nobody walked"),
    "few": (gumbel(9, 1), "9 values are too few"),
    "few realisations of many windows": (gumbel(9, 10), "9 independent groups of values (realisations) are too few"),
    "no realisation": (np.zeros((0, 3)), "0 values are too few"),
    "no realisation of a short record": (np.zeros((0, 0)), "0 values are too few"),
}


@pytest.mark.parametrize("family", ["gumbel", "gev"])
@pytest.mark.parametrize("name", TROUBLE)
def test_trouble_in_place_of_an_error(tmp_path: Path, name: str, family: Any) -> None:
    peaks, words = TROUBLE[name]
    records = peaks.max(axis=1) if peaks.shape[1] else np.zeros(peaks.shape[0])
    found = one(tmp_path / "run.h5", peaks, family, records)
    assert words in found.trouble
    assert (found.case, found.direction, found.family) == ("day", "vertical", family)
    assert (found.text, found.quantiles) == ("", ())
    assert (found.upper_end, found.statistic, found.p_value, found.correlation) == (None, None, None, None)


def test_trouble_of_one_case_leaves_the_others(tmp_path: Path) -> None:
    """Twelve cases in the order of the file, though HDF5 lists 10 before 2."""
    peaks = [gumbel(20, 1, seed) for seed in range(12)]
    peaks[3] = np.full((20, 1), 0.5)
    cases = [(f"case {i}", p, p.max(axis=1)) for i, p in enumerate(peaks)]
    found = fit_file(write(tmp_path / "run.h5", cases), "gumbel")
    assert [f.case for f in found] == [name for name, _, _ in cases]
    assert [bool(f.trouble) for f in found] == [i == 3 for i in range(12)]
    assert found[10].text == fit(peaks[10]).text()


def test_a_file_that_is_none_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ResultsError, match="no such file"):
        fit_file(tmp_path / "none.h5", "gumbel")
