"""The results file: its groups, datasets, shapes and units as promised; nothing half-written, nothing overwritten.

Synthetic rows: what is written is known exactly and must come back to the last bit.
"""

from __future__ import annotations

import json
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import h5py
import numpy as np
import pytest

import crowdsim
from crowdsim.errors import EXIT_INPUT, ResultsError
from crowdsim.results.reader import open_file, open_results
from crowdsim.results.writer import CaseHead, CaseWriter, ResultsWriter

POINTS = [("V1 vertical", 24.0, 1.6, "vertical"), ("L1 lateral", 24.0, 0.0, "lateral"), ("lamp", 7.7, 0.0, "vertical")]
DIRECTIONS = ("vertical", "lateral")
DECK_S = np.linspace(0.0, 48.0, 5)
DECK_E = (-1.6, 0.0, 1.6)
WINDOWS = 3


def head(name: str = "day", **changes: Any) -> CaseHead:
    values: dict[str, Any] = {
        "name": name, "time_step": 0.005, "warm_up": 100.0, "duration": 750.0, "window": 240.0, "windows": WINDOWS,
        "people": "mass", "persons": 8.5, "points": POINTS, "directions": DIRECTIONS, "deck_s": DECK_S,
        "deck_e": DECK_E, "criterion": "eur-23984",
        "modes": [("V1", 1.9, 0.005, 39000.0, 500.0), ("L1", 0.9, 0.01, 4e4, 0.0)],
        "assumptions": ["perfect gait", "äöü m/s²"], "target": "CL2", "limit": None, "step": {"peak_error": 1e-4},
    }  # fmt: skip
    return CaseHead(**{**values, **changes})


def rows(count: int, seed: int = 1) -> list[SimpleNamespace]:
    random = np.random.default_rng(seed)
    return [
        SimpleNamespace(
            peak=random.random(3), rms=random.random(3), running_rms_max=random.random(3), peak_time=random.random(3),
            window_peak=random.random((WINDOWS, 3)), envelope=random.random(len(DIRECTIONS) * 3 * 5),
            deck_window_peak=random.random((WINDOWS, len(DIRECTIONS))),
        )
        for _ in range(count)
    ]  # fmt: skip


def write(
    path: Path, count: int = 4, names: tuple[str, ...] = ("day",), text: str = "[deck]\n", **options: Any
) -> None:
    with ResultsWriter(path, text, 7, ["a finding"], **options) as results:
        for i, name in enumerate(names):
            writer = results.case(head(name))
            for k, row in enumerate(rows(count, i)):
                writer.append(row, 10 + k)
            writer.flush()
            writer.history(0, 0, np.arange(30.0).reshape(10, 3))
            writer.history(2, 200, np.arange(15.0).reshape(5, 3))
        results.finish({"workers": 2})


def test_root_attributes_of_the_contract(tmp_path: Path) -> None:
    write(tmp_path / "run.h5")
    with h5py.File(tmp_path / "run.h5") as file:
        assert file.attrs["format"] == "crowdsim results"
        assert file.attrs["format_version"] == 1
        assert file.attrs["crowdsim_version"] == crowdsim.__version__
        assert file.attrs["scenario"] == "[deck]\n"
        assert file.attrs["seed"] == 7
        mark = json.loads(file.attrs["fingerprint"])
        assert {"machine", "fused_multiply_add", "numpy", "numba", "llvmlite"} <= set(mark)
        assert {"date", "host", "resumed", "workers"} <= set(file["run"].attrs)


def test_groups_datasets_and_shapes_of_the_contract(tmp_path: Path) -> None:
    write(tmp_path / "run.h5", count=4)
    with h5py.File(tmp_path / "run.h5") as file:
        case = file["cases/0"]
        assert case.attrs["name"] == "day"
        assert (case.attrs["time_step"], case.attrs["warm_up"], case.attrs["duration"]) == (0.005, 100.0, 750.0)
        shapes = {
            "points/name": (3,), "points/s": (3,), "points/e": (3,), "points/direction": (3,),
            "realisations/peak": (4, 3), "realisations/rms": (4, 3), "realisations/running_rms_max": (4, 3),
            "realisations/crossings": (4,), "deck/s": (5,), "deck/e": (3,),
            "deck/vertical/window_peak": (4, WINDOWS), "deck/lateral/window_peak": (4, WINDOWS),
            "deck/vertical/peak_envelope": (4, 3, 5), "deck/lateral/peak_envelope": (4, 3, 5),
            "histories/0/time": (10,), "histories/0/acceleration": (10, 3), "histories/2/time": (5,),
        }  # fmt: skip
        for name, shape in shapes.items():
            assert case[name].shape == shape, name
        assert [v.decode() for v in case["points/direction"][()]] == ["vertical", "lateral", "vertical"]


def test_every_dataset_says_its_units(tmp_path: Path) -> None:
    write(tmp_path / "run.h5")
    seen: dict[str, str] = {}

    def look(name: str, item: Any) -> None:
        if isinstance(item, h5py.Dataset):
            seen[name] = item.attrs["units"]

    with h5py.File(tmp_path / "run.h5") as file:
        file.visititems(look)
    assert len(seen) >= 20
    units = {
        "realisations/peak": "m/s2", "realisations/rms": "m/s2", "realisations/running_rms_max": "m/s2",
        "realisations/peak_time": "s", "realisations/crossings": "1", "points/s": "m", "points/e": "m",
        "deck/s": "m", "deck/vertical/peak_envelope": "m/s2", "histories/0/time": "s",
        "histories/0/acceleration": "m/s2", "modes/frequency": "Hz", "modes/modal_mass": "kg", "modes/added_mass": "kg",
    }  # fmt: skip
    for name, unit in units.items():
        assert seen[f"cases/0/{name}"] == unit


def test_what_was_written_comes_back_to_the_last_bit(tmp_path: Path) -> None:
    write(tmp_path / "run.h5", count=4, names=("day", "night"))
    read = open_results(tmp_path / "run.h5")
    assert (read.scenario, read.seed, read.version, read.findings) == (
        "[deck]\n",
        7,
        crowdsim.__version__,
        ("a finding",),
    )
    assert [c.name for c in read.cases] == ["day", "night"]
    for i, case in enumerate(read.cases):
        expected = rows(4, i)
        for name in ("peak", "rms", "running_rms_max", "peak_time", "window_peak"):
            np.testing.assert_array_equal(getattr(case, name), np.stack([getattr(r, name) for r in expected]))
        np.testing.assert_array_equal(case.crossings, [10, 11, 12, 13])
        for d, direction in enumerate(DIRECTIONS):
            whole = np.stack([r.envelope.reshape(2, 3, 5)[d] for r in expected])
            np.testing.assert_array_equal(case.envelope[direction], whole)
            anywhere = np.stack([r.deck_window_peak[:, d] for r in expected])
            np.testing.assert_array_equal(case.deck_window_peak[direction], anywhere)
        assert (case.points.name, case.points.direction) == (
            tuple(p[0] for p in POINTS), tuple(p[3] for p in POINTS),
        )  # fmt: skip
        np.testing.assert_array_equal(case.points.s, [24.0, 24.0, 7.7])
        np.testing.assert_array_equal(case.points.e, [1.6, 0.0, 0.0])
        np.testing.assert_array_equal(case.deck_s, DECK_S)
        np.testing.assert_array_equal(case.deck_e, DECK_E)
        assert case.assumptions == ("perfect gait", "äöü m/s²")
        np.testing.assert_array_equal(case.histories[0].acceleration, np.arange(30.0).reshape(10, 3))
        np.testing.assert_array_equal(case.histories[2].time, (200 + np.arange(5)) * 0.005)
    assert read.case("night").name == "night"
    with pytest.raises(KeyError):
        read.case("noon")


def test_more_rows_than_a_buffer_keep_their_order(tmp_path: Path) -> None:
    write(tmp_path / "run.h5", count=700)
    case = open_results(tmp_path / "run.h5").cases[0]
    np.testing.assert_array_equal(case.peak, np.stack([r.peak for r in rows(700, 0)]))
    np.testing.assert_array_equal(case.crossings, 10 + np.arange(700))


def test_more_than_ten_cases_keep_their_order(tmp_path: Path) -> None:
    names = tuple(f"case {i}" for i in range(12))
    write(tmp_path / "run.h5", names=names)
    assert tuple(c.name for c in open_results(tmp_path / "run.h5").cases) == names


def test_a_scenario_of_any_length_is_stored_whole(tmp_path: Path) -> None:
    text = "# " + "überlang " * 30_000 + "\n[deck]\n"
    assert len(text.encode()) > 4 * 65536  # an attribute of the old kind ends at 64 kB
    write(tmp_path / "run.h5", text=text)
    assert open_results(tmp_path / "run.h5").scenario == text


def test_target_and_limit_are_there_when_given(tmp_path: Path) -> None:
    with ResultsWriter(tmp_path / "run.h5", "", 1, []) as results:
        CaseWriter.flush(results.case(head("class")))
        results.case(head("limit", target=None, limit=0.7))
        results.finish({})
    with h5py.File(tmp_path / "run.h5") as file:
        assert file["cases/0"].attrs["target"] == "CL2"
        assert file["cases/0"].attrs["criterion"] == "eur-23984"
        assert "limit" not in file["cases/0"].attrs
        assert file["cases/1"].attrs["limit"] == 0.7
        assert "target" not in file["cases/1"].attrs


# ---------------------------------------------------------------- nothing half-written, nothing overwritten


def test_an_error_on_the_way_leaves_nothing_behind(tmp_path: Path) -> None:
    seen: list[str] = []

    def broken() -> None:
        with ResultsWriter(tmp_path / "run.h5", "", 1, []) as results:
            results.case(head()).append(rows(1)[0], 0)
            seen.extend(p.suffix for p in tmp_path.iterdir())
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        broken()
    assert seen == [".part"]  # under another name until it is whole
    assert list(tmp_path.iterdir()) == []


def test_without_finish_no_file_is_made(tmp_path: Path) -> None:
    with ResultsWriter(tmp_path / "run.h5", "", 1, []):
        pass
    assert list(tmp_path.iterdir()) == []


def test_a_case_without_a_row_can_be_taken_out_again(tmp_path: Path) -> None:
    with ResultsWriter(tmp_path / "run.h5", "", 1, []) as results:
        writer = results.case(head("day"))
        writer.append(rows(1)[0], 3)
        writer.flush()
        results.case(head("night"))
        results.drop_last_case()
        results.finish({})
    assert [c.name for c in open_results(tmp_path / "run.h5").cases] == ["day"]


def test_an_existing_file_is_refused_without_force(tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    write(path, count=2)
    before = path.read_bytes()
    with pytest.raises(ResultsError, match="exists already; --force") as caught:
        ResultsWriter(path, "", 1, [])
    assert caught.value.exit_status == EXIT_INPUT
    assert path.read_bytes() == before
    write(path, count=3, force=True)
    assert open_results(path).cases[0].realisations == 3


def test_an_error_under_force_keeps_the_old_file(tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    write(path, count=2)
    with pytest.raises(ZeroDivisionError), ResultsWriter(path, "", 1, [], force=True):
        raise ZeroDivisionError
    assert open_results(path).cases[0].realisations == 2
    assert list(tmp_path.iterdir()) == [path]


def test_a_folder_and_a_missing_folder_are_refused(tmp_path: Path) -> None:
    with pytest.raises(ResultsError, match="is a folder"):
        ResultsWriter(tmp_path, "", 1, [], force=True)
    with pytest.raises(ResultsError, match="there is no folder"):
        ResultsWriter(tmp_path / "none" / "run.h5", "", 1, [])


# ---------------------------------------------------------------- files that are none of ours


def test_a_missing_file_is_named(tmp_path: Path) -> None:
    with pytest.raises(ResultsError, match=r"none\.h5: no such file"):
        open_results(tmp_path / "none.h5")
    with pytest.raises(ResultsError, match="no such file"):
        open_results(tmp_path)


def test_a_foreign_file_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "note.h5"
    path.write_text("a, b\n1, 2\n")
    with pytest.raises(ResultsError, match="no HDF5 file"):
        open_results(path)
    with h5py.File(path, "w") as file:
        file["x"] = 1.0
    with pytest.raises(ResultsError, match="not a results file of crowdsim"):
        open_results(path)


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.999])
def test_a_truncated_file_is_refused(tmp_path: Path, share: float) -> None:
    path = tmp_path / "run.h5"
    write(path, count=50)
    data = path.read_bytes()
    path.write_bytes(data[: int(share * len(data))])
    with pytest.raises(ResultsError, match="damaged"):
        open_results(path)


def test_a_newer_format_is_refused_with_both_numbers(tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    write(path)
    with h5py.File(path, "a") as file:
        file.attrs["format_version"] = 2
    with pytest.raises(ResultsError, match=r"format 2; this program reads up to 1\. Update"):
        open_results(path)


def test_reading_closes_the_file(tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    write(path)
    open_results(path)
    with h5py.File(path, "a") as file:  # fails while another handle is open for reading
        file.attrs["mine"] = 1
    with pytest.raises(ResultsError):
        open_file(tmp_path / "none.h5")
