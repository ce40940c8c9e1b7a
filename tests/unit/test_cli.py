"""The commands as a user runs them: exit status, messages, files, every scenario and example of the repository."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import h5py
import pytest

ROOT = Path(__file__).resolve().parents[2]
SCENARIOS = sorted((ROOT / "scenarios").glob("*.toml"))
EXAMPLES = sorted((ROOT / "examples").glob("*.py"))
ENVIRONMENT = {**os.environ, "PYTHONPATH": str(ROOT), "NO_COLOR": "1"}


def crowdsim(*arguments: object, **options: object) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "crowdsim", *map(str, arguments)],
        capture_output=True, text=True, env=ENVIRONMENT, timeout=300, **options,  # type: ignore[call-overload]
    )  # fmt: skip


@pytest.mark.parametrize("scenario", SCENARIOS, ids=lambda p: p.stem)
def test_every_scenario_is_checked_and_simulated(scenario: Path, tmp_path: Path) -> None:
    checked = crowdsim("check", scenario)
    assert checked.returncode == 0, checked.stderr
    assert "Modes" in checked.stdout
    assert "persons on the deck on average" in checked.stdout
    out = tmp_path / "run.h5"
    run = crowdsim("simulate", scenario, "--out", out, "--realisations", 3)
    assert run.returncode == 0, run.stderr
    assert "95 % value" in run.stdout
    assert "Comfort only" in run.stdout
    with h5py.File(out) as file:
        assert file.attrs["scenario"] == scenario.read_text(encoding="utf-8")
        assert all(case["realisations/peak"].shape[0] == 3 for case in file["cases"].values())
    assert [p.name for p in tmp_path.iterdir()] == ["run.h5"]


@pytest.mark.parametrize("example", EXAMPLES, ids=lambda p: p.stem)
def test_every_example_runs(example: Path, tmp_path: Path) -> None:
    arguments = {"envelope_figure": [str(tmp_path / "figure.png"), "3"]}.get(example.stem, ["3"])
    run = subprocess.run(
        [sys.executable, str(example), *arguments], capture_output=True, text=True, env=ENVIRONMENT, timeout=300
    )
    assert run.returncode == 0, run.stderr
    assert run.stdout.strip()
    if example.stem == "envelope_figure":
        assert (tmp_path / "figure.png").stat().st_size > 10_000


def test_json_is_json_and_holds_the_numbers_of_the_file(tmp_path: Path) -> None:
    out = tmp_path / "run.h5"
    run = crowdsim("simulate", SCENARIOS[0], "--out", out, "--realisations", 4, "--json", "--case", "walkers alone")
    summary = json.loads(run.stdout)
    assert [c["name"] for c in summary["cases"]] == ["walkers alone"]
    point = summary["cases"][0]["points"][0]
    with h5py.File(out) as file:
        assert point["peak"]["largest"] == file["cases/0/realisations/peak"][:, 0].max()
    assert point["peak"]["p95"]["low"] is None  # four realisations have no interval
    check = json.loads(crowdsim("check", SCENARIOS[0], "--json").stdout)
    assert [c["name"] for c in check["cases"]] == ["walkers alone", "walkers and joggers"]


def test_schema_is_printed() -> None:
    schema = json.loads(crowdsim("schema").stdout)
    assert {"deck", "mode", "stream"} <= set(schema["required"])


def bad(text: str, old: str, new: str) -> str:
    assert old in text
    return text.replace(old, new, 1)


WRONG = {
    "unknown key": ("width = 3.2", "widht = 3.2", "widht"),
    "wrong unit": ("length = 48.0", 'length = "48 kg"', "deck.length"),
    "ton": ('"38.5 t"', '"38.5 ton"', "mode[0].modal_mass"),
    "negative": ("frequency = 1.92", "frequency = -1.92", "mode[0].frequency"),
    "syntax": ("[deck]", "[deck", "line"),
    "unstable step": ("seed = 7", "seed = 7\ntime_step = 0.1", "run.time_step"),
    "no such stream": ('streams = ["to the station"]', 'streams = ["to the statoin"]', "did you mean to the station"),
    "damping": ('damping = "0.5 %"', "damping = 0.5", "mode[0].damping"),
    "no such load": ('load = "young-2001-mean"', 'load = "young-2001"', "did you mean young-2001-mean"),
    "too many realisations": ("realisations = 200", "realisations = 2.5", "run.realisations"),
}


@pytest.mark.parametrize("name", WRONG)
def test_wrong_input_ends_with_2_and_one_message_and_writes_nothing(name: str, tmp_path: Path) -> None:
    old, new, word = WRONG[name]
    text = (ROOT / "scenarios" / "weekday-commuters.toml").read_text(encoding="utf-8")
    scenario = tmp_path / "scenario.toml"
    scenario.write_text(bad(text, old, new), encoding="utf-8")
    for command in (("check",), ("simulate", "--out", tmp_path / "run.h5")):
        run = crowdsim(command[0], scenario, *command[1:])
        assert run.returncode == 2, run.stdout
        assert "Traceback" not in run.stderr
        assert word in run.stderr
        assert str(scenario) in run.stderr
    assert [p.name for p in tmp_path.iterdir()] == ["scenario.toml"]


def test_files_are_not_overwritten_without_force(tmp_path: Path) -> None:
    out = tmp_path / "run.h5"
    out.write_bytes(b"mine")
    arguments = ("simulate", SCENARIOS[0], "--out", out, "--realisations", 1)
    run = crowdsim(*arguments)
    assert run.returncode == 2
    assert "--force" in run.stderr
    assert out.read_bytes() == b"mine"
    assert crowdsim(*arguments, "--force").returncode == 0
    assert h5py.is_hdf5(out)
    missing = crowdsim("simulate", SCENARIOS[0], "--out", tmp_path / "nowhere" / "run.h5")
    assert missing.returncode == 2
    assert "there is no folder" in missing.stderr


def test_missing_file_and_case() -> None:
    run = crowdsim("check", "nowhere.toml")
    assert (run.returncode, "no such file" in run.stderr) == (2, True)
    run = crowdsim("check", SCENARIOS[0], "--case", "noon")
    assert run.returncode == 2
    assert "walkers alone" in run.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="signals of this kind are not sent on Windows")
def test_ctrl_c_keeps_what_was_finished(tmp_path: Path) -> None:
    out = tmp_path / "run.h5"
    scenario = ROOT / "scenarios" / "one-walker.toml"
    process = subprocess.Popen(
        [sys.executable, "-m", "crowdsim", "simulate", str(scenario), "--out", str(out), "--realisations", "100000"],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=ENVIRONMENT,
        # a shell starts what runs in the background with the signal ignored, and children inherit that
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),
    )  # fmt: skip
    try:
        begun = time.monotonic()
        while not any(p.stat().st_size > 1_000_000 for p in tmp_path.iterdir()):  # rows are in the file
            assert time.monotonic() - begun < 120.0
            time.sleep(0.1)
        process.send_signal(signal.SIGINT)
        _, errors = process.communicate(timeout=60)
    finally:
        process.kill()
    assert process.returncode == 1
    assert "Traceback" not in errors
    assert "of 100000 written" in errors
    assert str(out) in errors
    with h5py.File(out) as file:
        rows = file["cases/0/realisations/peak"].shape[0]
        assert f"{rows} of 100000" in errors
        assert not file["run"].attrs["complete"]
        assert set(file["cases/0/histories"]) >= {"0"}
    assert [p.name for p in tmp_path.iterdir()] == ["run.h5"]


def test_help_answers_without_heavy_modules() -> None:
    code = (
        "import sys, crowdsim.cli\n"
        "try:\n    crowdsim.cli.app(['--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = {'numpy', 'scipy', 'numba', 'h5py', 'matplotlib', 'pydantic', 'pint'} & set(sys.modules)\n"
        "print('HEAVY', sorted(heavy))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, env=ENVIRONMENT)
    assert "simulate" in run.stdout
    assert "HEAVY []" in run.stdout
