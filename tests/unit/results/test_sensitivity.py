"""A sensitivity study in a results file: comes back as it was, leaves the rest of the file alone, is refused elsewhere.

Synthetic numbers throughout; sentences and ranking are checked on them too.
"""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest

from crowdsim.errors import ResultsError
from crowdsim.results.reader import open_results
from crowdsim.results.sensitivity import (
    Base,
    Sensitivity,
    Varied,
    cases_for,
    ranked,
    read_sensitivity,
    write_sensitivity,
)
from crowdsim.results.writer import CaseHead, ResultsWriter

TEXT = "[deck]\nlength = 48\n"


def varied(subject: str, label: str, change: float | None, half: float = 0.02, note: str = "") -> Varied:
    if change is None:
        return Varied(subject, label, "a source", None, None, None, None, note)
    return Varied(subject, label, "a source", 1.2 * (1.0 + change), change, change - half, change + half, note)


VARIED = [
    varied("load set", "kerr-1998", -0.05),
    varied("load set", "äöü-1999", 0.03),
    varied("frequency", "-10 %", -0.45),
    varied("frequency", "+10 %", 0.12, note="the pace follows"),
    varied("step length", "+10 %", 0.002),
    varied("damping", "0.4 %", None, note="the same as the base"),
]


def result(case: str = "day", **changes: Any) -> Sensitivity:
    variations, order = ranked(VARIED)
    made = Sensitivity(
        title="Weir Lane", case=case, direction="vertical", window=240.0, realisations=200, seed=7, version="0.1.0",
        base=Base(1.2, 1.14, 1.29), variations=variations, order=order, not_varied=("weights", "times of school"),
    )  # fmt: skip
    return replace(made, **changes)


def write_run(path: Path, names: tuple[str, ...] = ("day", "night")) -> None:
    head = CaseHead(
        name="", time_step=0.005, warm_up=100.0, duration=750.0, window=240.0, windows=3, criterion="eur-23984",
        people="none", persons=8.5, points=[("V1", 24.0, 0.0, "vertical")], directions=("vertical",),
        deck_s=np.linspace(0.0, 48.0, 5), deck_e=(0.0,), modes=[("V1", 1.9, 0.005, 39000.0, 0.0)],
        assumptions=["perfect gait"], target=None, limit=None, step={"peak_error": 1e-4},
    )  # fmt: skip
    with ResultsWriter(path, TEXT, 7, []) as results:
        for name in names:
            results.case(replace(head, name=name))
        results.finish({"workers": 2})


@pytest.fixture
def run(tmp_path: Path) -> Path:
    path = tmp_path / "run.h5"
    write_run(path)
    return path


def test_it_comes_back_as_it_was(run: Path) -> None:
    assert read_sensitivity(run) == ()
    write_sensitivity(run, TEXT, result())
    assert read_sensitivity(run) == (result(),)
    few = result("night", base=Base(1.2, None, None), not_varied=())
    write_sensitivity(run, TEXT, few)
    assert read_sensitivity(run) == (result(), few)


def test_an_earlier_one_of_the_case_is_replaced(run: Path) -> None:
    write_sensitivity(run, TEXT, result())
    later = result(seed=8, variations=result().variations[:2])
    write_sensitivity(run, TEXT, later)
    assert read_sensitivity(run) == (later,)


def test_one_without_a_variation(run: Path) -> None:
    empty = result(variations=(), order=())
    write_sensitivity(run, TEXT, empty)
    assert read_sensitivity(run) == (empty,)


def test_the_rest_of_the_file_stays(run: Path) -> None:
    def contents() -> dict[str, Any]:
        found: dict[str, Any] = {}

        def look(name: str, item: Any) -> None:
            if not name.startswith("sensitivity"):
                values = item[()].tolist() if isinstance(item, h5py.Dataset) else None
                found[name] = (values, {k: str(v) for k, v in item.attrs.items()})

        with h5py.File(run) as file:
            file.visititems(look)
            found["/"] = {k: str(v) for k, v in file.attrs.items()}
        return found

    before = contents()
    write_sensitivity(run, TEXT, result())
    assert contents() == before
    assert len(before) > 20
    assert [c.name for c in open_results(run).cases] == ["day", "night"]


def test_every_dataset_says_its_units(run: Path) -> None:
    write_sensitivity(run, TEXT, result("night"))
    with h5py.File(run) as file:
        group = file["sensitivity/1"]  # the number of the case
        units = {name: data.attrs["units"] for name, data in group.items()}
    text = dict.fromkeys(("subject", "label", "source", "note"), "")
    assert units == {**text, "base": "m/s2", "value": "m/s2", "change": "1", "low": "1", "high": "1"}


def test_refused_without_touching_the_file(run: Path) -> None:
    before = run.read_bytes()
    with pytest.raises(ResultsError, match="results of another scenario"):
        write_sensitivity(run, TEXT + "# changed\n", result())
    with pytest.raises(ResultsError, match=r"no case 'noon'; cases there: day, night"):
        write_sensitivity(run, TEXT, result("noon"))
    with pytest.raises(ResultsError, match="no such file"):
        write_sensitivity(run.with_name("other.h5"), TEXT, result())
    strange = run.with_name("strange.h5")
    h5py.File(strange, "w").close()
    with pytest.raises(ResultsError, match="not a results file of crowdsim"):
        write_sensitivity(strange, TEXT, result())
    assert run.read_bytes() == before
    assert sorted(p.name for p in run.parent.iterdir()) == ["run.h5", "strange.h5"]


def test_a_failure_on_the_way_leaves_the_file_whole(run: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    before = run.read_bytes()

    def fail(*_: Any) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", fail)
    with pytest.raises(ResultsError, match="No space left on device"):
        write_sensitivity(run, TEXT, result())
    assert run.read_bytes() == before
    assert [p.name for p in run.parent.iterdir()] == ["run.h5"]


def test_ranking() -> None:
    variations, order = ranked(VARIED)
    assert order == ("frequency", "load set", "step length", "damping")
    assert [v.label for v in variations] == ["-10 %", "+10 %", "kerr-1998", "äöü-1999", "+10 %", "0.4 %"]


def test_sentences() -> None:
    text = result().text()
    # half the interval of the base is 6.3 %
    assert text == (
        "The 95 % peak of day in 4 min, 1.20 m/s2 from 200 realisations, most depends on: frequency (-45 to +12 %). "
        "Smaller than what chance leaves in it: load set (-5 to +3 %), step length (+0.2 %). Chance leaves -5 to +8 %, "
        "all that more realisations could remove."
    )
    assert result().not_varied_text() == "Not varied: weights; times of school."
    assert result(not_varied=()).not_varied_text() == ""
    assert result(variations=(), order=()).text() == "day: no variation could be run."
    many = result(window=75.0, realisations=12000).text()
    assert many.startswith("The 95 % peak of day in 75 s, 1.20 m/s2 from 12,000 realisations, most depends on: ")
    few = result(base=Base(1.2, None, None)).text()
    assert few.endswith("frequency (-45 to +12 %), load set (-5 to +3 %), step length (+0.2 %).")


def test_a_base_that_hides_everything_still_names_the_largest() -> None:
    text = result(base=Base(1.2, 0.5, 2.5)).text()
    assert "most depends on: frequency (-45 to +12 %). Smaller than what chance leaves in it: load set" in text


def test_everything_above_chance_names_nothing_below() -> None:
    text = result(base=Base(1.2, 1.1999, 1.2001)).text()  # half the interval: 0.008 %
    assert "frequency (-45 to +12 %), load set (-5 to +3 %), step length (+0.2 %)." in text
    assert "Smaller than" not in text


def test_cases_for_a_scenario(run: Path) -> None:
    """Names with their keys, of a file of the very same text."""
    assert cases_for(run, TEXT) == {"day": "0", "night": "1"}
    with pytest.raises(ResultsError, match=r"run\.h5: holds results of another scenario"):
        cases_for(run, TEXT + "\n")
    with pytest.raises(ResultsError, match="no such file"):
        cases_for(run.with_name("none.h5"), TEXT)


def test_cases_for_more_than_ten_cases(tmp_path: Path) -> None:
    """HDF5 orders keys as text, 10 before 2: a name still leads to its own key."""
    names = tuple(f"case {i}" for i in range(12))
    write_run(tmp_path / "many.h5", names)
    assert cases_for(tmp_path / "many.h5", TEXT) == {name: str(i) for i, name in enumerate(names)}
    write_sensitivity(tmp_path / "many.h5", TEXT, result("case 10"))
    write_sensitivity(tmp_path / "many.h5", TEXT, result("case 2"))
    assert [s.case for s in read_sensitivity(tmp_path / "many.h5")] == ["case 2", "case 10"]
