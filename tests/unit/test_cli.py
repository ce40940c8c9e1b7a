"""The commands as a user runs them: exit status, messages, files, every scenario and example of the repository.

A process of its own for each kind of call; `here` calls the same entry point in this process, where many are tried.
"""

from __future__ import annotations

import csv
import json
import os
import re
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any, NoReturn

import h5py
import pytest

from crowdsim.cli import main
from crowdsim.console.base import CAUTION
from crowdsim.plots.draw import FIGURES
from crowdsim.results.sensitivity import read_sensitivity
from crowdsim.scenario.reader import parse_scenario, read_scenario
from crowdsim.study.compare import compare_file
from crowdsim.study.estimate import estimate
from crowdsim.study.simulate import simulate

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
    commuters, table = ROOT / "scenarios" / "weekday-commuters.toml", tmp_path / "cases.csv"
    arguments = {
        "envelope_figure": [str(tmp_path / "figure.png"), "3"],
        "client_table": [str(commuters), str(table), "3"],
    }.get(example.stem, ["3"])
    run = subprocess.run(
        [sys.executable, str(example), *arguments], capture_output=True, text=True, env=ENVIRONMENT, timeout=300
    )
    assert run.returncode == 0, run.stderr
    assert run.stdout.strip()
    if example.stem == "envelope_figure":
        assert (tmp_path / "figure.png").stat().st_size > 10_000
    if example.stem == "client_table":
        heads, *rows = list(csv.reader(table.open(encoding="utf-8")))
        assert [row[0] for row in rows] == ["weekday morning", "quiet noon"]
        assert all(len(row) == len(heads) for row in rows)
        for row in (heads, *rows):
            assert f"| {' | '.join(row)} |" in run.stdout


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


# ---------------------------------------------------------------- estimate, compare, plot, sensitivity


def scenario_of(name: str) -> Path:
    return ROOT / "scenarios" / f"{name}.toml"


def joined(text: str) -> str:
    """Without the ends of lines."""
    return " ".join(text.split())


def no_nan(text: str) -> Any:
    """JSON, and nothing else, as every reader of JSON takes it."""
    return json.loads(text, parse_constant=lambda word: pytest.fail(f"{word} in JSON"))


@dataclass(frozen=True)
class Ended:
    """What a command ended with."""

    status: int
    out: str
    err: str


Here = Callable[..., Ended]


@pytest.fixture
def here(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Here:
    """A command in this process."""

    def run(*arguments: object) -> Ended:
        monkeypatch.setattr(sys, "argv", ["crowdsim", *map(str, arguments)])
        with pytest.raises(SystemExit) as ended:
            main()
        out, err = capsys.readouterr()
        return Ended(int(ended.value.code or 0), out, err)

    return run


@dataclass(frozen=True)
class Run:
    """A results file and what the command that made it printed."""

    path: Path
    out: str


@pytest.fixture(scope="module")
def simulated(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Run]:
    """A run of a scenario with enough realisations for intervals."""
    folder, made = tmp_path_factory.mktemp("cli"), {}

    def run(name: str) -> Run:
        if name not in made:
            path = folder / f"{name}.h5"
            ended = crowdsim("simulate", scenario_of(name), "--out", path, "--realisations", 80)
            assert ended.returncode == 0, ended.stderr
            made[name] = Run(path, ended.stdout)
        return made[name]

    return run


@pytest.fixture
def walker(simulated: Callable[[str], Run], tmp_path: Path) -> Path:
    """A copy of the results of one walker."""
    path = tmp_path / "walker.h5"
    path.write_bytes(simulated("one-walker").path.read_bytes())
    return path


def test_the_summary_of_a_run_says_what_a_report_needs(simulated: Callable[[str], Run]) -> None:
    run = simulated("weekday-commuters")
    said = joined(run.out)
    cases = compare_file(run.path).summary.cases
    assert [c.name for c in cases] == ["weekday morning", "quiet noon"]
    for case in cases:
        (judged,) = [d.judgement for d in case.deck if d.judgement is not None]
        assert judged.sentence in said
        assert f"class {judged.class_name} of EUR 23984 (2009)" in judged.sentence
        assert re.search(rf"^{case.name} .* {judged.class_name} .* {judged.verdict} *$", run.out, re.MULTILINE)
    assert "is not met." in said
    assert said.count("Hand formulas beside it") == 2
    assert re.search(r"^steady state in resonance +V1 .* \d+\.\d+ ", run.out, re.MULTILINE)
    assert "Not varied: load set, pace, step length, damping" in said
    assert CAUTION in said
    assert run.out.rstrip().splitlines()[-1].startswith(f"Results: {run.path} (seed 7, ")


def test_estimate(here: Here) -> None:
    path = scenario_of("weekday-commuters")
    run = crowdsim("estimate", path)
    assert (run.returncode, run.stderr) == (0, "")
    for words in ("Which modes lie in reach", "Case weekday morning", "Case quiet noon", "Hand formulas",
                  "What they stand for", CAUTION):  # fmt: skip
        assert words in joined(run.stdout)
    data = no_nan(here("estimate", path, "--json").out)
    keys = {"name", "source", "case", "direction", "measure", "value", "unit", "mode", "stands_for", "assumes"}
    assert all(keys <= set(m) for m in data["methods"])
    assert {m["case"] for m in data["methods"]} == {"weekday morning", "quiet noon"}
    assert data == json.loads(json.dumps(estimate(read_scenario(path)).as_dict()))
    assert all(m["note"] for m in data["methods"] if m["value"] is None)


@pytest.mark.parametrize("scenario", SCENARIOS, ids=lambda p: p.stem)
def test_estimate_of_every_scenario_and_case(here: Here, scenario: Path) -> None:
    names = dict.fromkeys(m["case"] for m in no_nan(here("estimate", scenario, "--json").out)["methods"])
    for name in names:
        ended = here("estimate", scenario, "--case", name)
        assert ended.status == 0
        assert [n for n in names if f"Case {n}\n" in ended.out] == [name]


def test_compare(here: Here, simulated: Callable[[str], Run]) -> None:
    path = simulated("weekday-commuters").path
    run = crowdsim("compare", path)
    assert (run.returncode, run.stderr) == (0, "")
    for words in ("Cases: largest peak anywhere on the deck in one window of 4 min", "its 95 % interval",
                  "Peaks where each mode moves most", "Chance of a peak above 1.00 m/s2 there", "ratio",
                  "What they stand for, and why they differ", "Which modes lie in reach", CAUTION):  # fmt: skip
        assert words in joined(run.stdout)
    assert "Law fitted" not in run.stdout
    data = no_nan(here("compare", path, "--json").out)
    assert data == json.loads(json.dumps(compare_file(path).as_dict()))
    assert (data["fits"], data["sensitivities"]) == ([], [])


def test_compare_with_another_percentile_and_limit(here: Here, simulated: Callable[[str], Run]) -> None:
    """80 realisations of four windows: the 90 % value is the 288th of 320."""
    path = simulated("weekday-commuters").path
    with h5py.File(path) as file:
        peaks = sorted(file["cases/0/deck/vertical/window_peak"][()].ravel())
    assert len(peaks) == 320
    asked = ("compare", path, "--percentile", 0.9, "--limit", 0.8)
    ended = here(*asked)
    assert ended.status == 0
    assert "the 90 % value of the peak vertical acceleration anywhere on the deck in 4 min" in joined(ended.out)
    assert "the limit of 0.800 m/s2 (as specified)" in joined(ended.out)
    assert "90 % peak, m/s2" in ended.out
    assert "Chance of a peak above 0.800 m/s2 there" in ended.out
    (judged,) = [d["judgement"] for d in no_nan(here(*asked, "--json").out)["cases"][0]["deck"]]
    assert (judged["value"]["share"], judged["value"]["value"]) == (0.9, peaks[287])
    assert (judged["limit"], judged["target"], judged["class_name"]) == (0.8, None, None)
    assert judged["exceedance"]["value"] == pytest.approx(sum(p > 0.8 for p in peaks) / 320, abs=1e-15)


@pytest.mark.parametrize(("family", "law"), [("gumbel", "Gumbel law"), ("gev", "Generalised extreme value law")])
def test_compare_with_a_fit(here: Here, walker: Path, family: str, law: str) -> None:
    ended = here("compare", walker, "--fit", family)
    assert ended.status == 0
    assert f"all streams, vertical, 75 s: {law} of maxima: location " in joined(ended.out)
    assert "EXTRAPOLATED beyond the windows simulated" in joined(ended.out)
    assert "the verdict does not use it" in ended.out
    (fitted,) = no_nan(here("compare", walker, "--fit", family, "--json").out)["fits"]
    assert (fitted["case"], fitted["family"], fitted["window"]) == ("all streams", family, 75.0)
    assert [q["share"] for q in fitted["quantiles"] if q["extrapolated"]] == [0.99, 0.999]  # of 80 windows


def test_plot(walker: Path, tmp_path: Path) -> None:
    out = tmp_path / "figure.svg"
    run = crowdsim("plot", walker, "exceedance", "--out", out, "--fit", "gumbel", "--width", 120)
    assert (run.returncode, run.stdout.strip(), run.stderr) == (0, str(out), "")
    assert "one crossing" in out.read_text(encoding="utf-8")  # the hand formulas are marked


BEGINNINGS = {"png": b"\x89PNG\r\n", "svg": b"<?xml", "pdf": b"%PDF-"}


@pytest.mark.parametrize("ending", BEGINNINGS)
@pytest.mark.parametrize("figure", FIGURES)
def test_plot_of_every_figure_as_png_svg_and_pdf(here: Here, walker: Path, figure: str, ending: str) -> None:
    out = walker.with_name(f"{figure}.{ending}")
    ended = here("plot", walker, figure, "--out", out, "--case", "all streams")
    assert (ended.status, ended.out.strip(), ended.err) == (0, str(out), "")
    data = out.read_bytes()
    assert data.startswith(BEGINNINGS[ending])
    assert len(data) > 5000
    assert sorted(p.name for p in walker.parent.iterdir()) == sorted([out.name, walker.name])


def test_plot_of_a_point(here: Here, walker: Path) -> None:
    first, second = (walker.with_name(f"{name}.png") for name in ("V1", "V2"))
    for out in (first, second):
        assert here("plot", walker, "history", "--out", out, "--point", out.stem).status == 0
    assert first.read_bytes() != second.read_bytes()


@pytest.fixture(scope="module")
def rare(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One or two of 80 realisations move at all: the 95 % value is 0 everywhere, the largest is not."""
    text = bad(scenario_of("weekday-commuters").read_text(encoding="utf-8"), "per_hour = 200", "per_hour = 0.1")
    path = tmp_path_factory.mktemp("rare") / "rare.h5"
    simulate(parse_scenario(text, "rare.toml"), out=path, realisations=80, case="quiet noon")
    peak = compare_file(path).summary.cases[0].deck[0].peak
    assert peak.p95.value == 0.0 < peak.largest
    return path


@pytest.mark.parametrize("figure", FIGURES)
def test_figures_of_a_run_in_which_hardly_anybody_walks(here: Here, rare: Path, tmp_path: Path, figure: str) -> None:
    """Drawn, or refused in words."""
    out = tmp_path / "figure.svg"
    ended = here("plot", rare, figure, "--out", out)
    if ended.status == 0:
        assert out.stat().st_size > 5000
    else:
        assert ended.status == 2
        assert "nothing to draw" in ended.err
        assert not out.exists()


def test_sensitivity_is_drawn_and_kept_and_compare_says_what_matters_most(here: Here, walker: Path) -> None:
    figure = walker.with_name("bars.png")
    run = crowdsim(
        "sensitivity", scenario_of("one-walker"), "--realisations", 80, "--out", figure, "--into", walker, "--json"
    )
    assert run.returncode == 0, run.stderr
    assert f"kept in {walker}" in run.stderr
    assert f"drawn: {figure}" in run.stderr
    assert figure.read_bytes().startswith(BEGINNINGS["png"])
    (kept,) = read_sensitivity(walker)
    assert no_nan(run.stdout) == json.loads(json.dumps(kept.as_dict()))
    assert (kept.case, kept.realisations, kept.window) == ("all streams", 80, 75.0)
    # the base is the run itself: the same seed, the same number
    judged = compare_file(walker).summary.cases[0].deck[0].judgement
    assert judged is not None
    assert (kept.base.value, kept.base.low, kept.base.high) == (judged.value.value, judged.value.low, judged.value.high)
    ended = here("compare", walker)
    assert "A sensitivity study is in the file." in ended.out
    assert f"{kept.text()} {kept.not_varied_text()}" in joined(ended.out)
    assert "The 95 % peak of all streams in 75 s, " in kept.text()
    assert f"most depends on: {kept.order[0]} (" in kept.text()
    assert no_nan(here("compare", walker, "--json").out)["sensitivities"] == [json.loads(json.dumps(kept.as_dict()))]
    assert sorted(p.name for p in walker.parent.iterdir()) == ["bars.png", "walker.h5"]


def wrong_files(folder: Path) -> None:
    """Files that are no results of this program, or of one to come."""
    (folder / "note.h5").write_text("a, b\n1, 2\n", encoding="utf-8")
    with h5py.File(folder / "other.h5", "w") as file:
        file["x"] = 1.0
    (folder / "newer.h5").write_bytes((folder / "walker.h5").read_bytes())
    with h5py.File(folder / "newer.h5", "r+") as file:
        file.attrs["format_version"] = 99


ONE, MARKET, COMMUTERS = (str(scenario_of(n)) for n in ("one-walker", "market-day", "weekday-commuters"))
WRONG_CALLS = {
    "missing file": ("compare none.h5", "none.h5: no such file"),
    "a folder": ("compare .", "no such file"),
    "not HDF5": ("compare note.h5", "note.h5: no HDF5 file"),
    "a scenario for a run": (f"compare {ONE}", "a scenario, no results file; run simulate first"),
    "a run for a scenario": ("estimate walker.h5", "is a results file, no scenario"),
    "foreign HDF5": ("compare other.h5", "other.h5: not a results file of crowdsim"),
    "another format": ("compare newer.h5", "newer.h5: written in format 99; this program reads up to 1"),
    "plot of another format": ("plot newer.h5 envelope -o x.png", "written in format 99"),
    "unknown figure": ("plot walker.h5 pie -o x.png", "known: history, envelope, exceedance, modes, people"),
    "unknown case": ("plot walker.h5 envelope -o x.png --case noon", "cases in the file: 'all streams'"),
    "unknown case, marked figure": ("plot walker.h5 exceedance -o x.png --case noon", "no case is called 'noon'"),
    "unknown point": ("plot walker.h5 history -o x.png --point lamp", "points of case 'all streams': V1, V2"),
    "point of another figure": ("plot walker.h5 modes -o x.png --point V1", "a point is for the figure 'history'"),
    "fit of another figure": ("plot walker.h5 modes -o x.png --fit gev", "for the figure 'exceedance'"),
    "ending": ("plot walker.h5 history -o x.jpg", "x.jpg: a figure ends in .png, .svg or .pdf"),
    "no ending": ("plot walker.h5 history -o x", "a figure ends in .png, .svg or .pdf"),
    "folder missing": ("plot walker.h5 history -o nowhere/x.png", "there is no folder nowhere; make it first"),
    "too narrow": ("plot walker.h5 history -o x.png --width 10", "width 10 mm: 60 to 400 mm are possible"),
    "no width": ("plot walker.h5 history -o x.png --width nan", "60 to 400 mm are possible"),
    "no figure to write": ("plot walker.h5 history", "--out"),
    "percentile": ("compare walker.h5 --percentile 2", "--percentile"),
    "percentile in per cent": ("compare walker.h5 --percentile 95", "--percentile"),
    "limit": ("compare walker.h5 --limit -1", "above 0, in m/s2"),
    "no limit": ("compare walker.h5 --limit nan", "above 0, in m/s2"),
    "law": ("compare walker.h5 --fit other", "'gumbel'"),
    "estimate of an unknown case": (f"estimate {COMMUTERS} --case evening", "weekday morning, quiet noon"),
    "which case": (f"sensitivity {COMMUTERS}", "name one with --case: weekday morning, quiet noon"),
    "no such case": (f"sensitivity {COMMUTERS} --case evening", "no case is called 'evening'"),
    "into another scenario's file": (f"sensitivity {MARKET} --into walker.h5", "holds results of another scenario"),
    "into nothing": (f"sensitivity {ONE} --into none.h5", "none.h5: no such file"),
    "into a note": (f"sensitivity {ONE} --into note.h5", "no HDF5 file"),
    "bars with an ending": (f"sensitivity {ONE} -o x.jpg", "a figure ends in .png, .svg or .pdf"),
    "bars too narrow": (f"sensitivity {ONE} -o x.png --width 10", "110 to 400 mm are possible"),
}


@pytest.mark.parametrize("name", WRONG_CALLS)
def test_wrong_calls_end_with_2_and_one_message_and_write_nothing(
    here: Here, walker: Path, name: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Said before anything is simulated: a study that begins would be an error of another kind."""
    monkeypatch.setattr("crowdsim.study.sensitivity._peaks", begun)
    monkeypatch.chdir(walker.parent)
    wrong_files(walker.parent)
    before = {p.name: p.read_bytes() for p in walker.parent.iterdir()}
    call, words = WRONG_CALLS[name]
    ended = here(*call.split())
    assert ended.status == 2
    assert ended.out == ""
    assert words in ended.err
    assert "Traceback" not in ended.err
    assert len(ended.err.strip().splitlines()) <= 4  # the command line adds its usage
    assert {p.name: p.read_bytes() for p in walker.parent.iterdir()} == before


def begun(*_: object) -> NoReturn:
    raise AssertionError("the study has begun")


@pytest.mark.parametrize(
    "call", ["plot walker.h5 pie -o x.png", "compare newer.h5", f"sensitivity {MARKET} --into walker.h5"]
)
def test_wrong_calls_in_a_process_of_their_own(walker: Path, call: str) -> None:
    wrong_files(walker.parent)
    before = sorted(p.name for p in walker.parent.iterdir())
    run = crowdsim(*call.split(), cwd=walker.parent)
    assert (run.returncode, run.stdout) == (2, "")
    assert len(run.stderr.strip().splitlines()) == 1
    assert sorted(p.name for p in walker.parent.iterdir()) == before


def test_a_study_of_a_case_that_the_file_has_not_is_refused_before_it_runs(
    here: Here, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The file was made with --case: its scenario is the same, the case is missing."""
    path = tmp_path / "morning.h5"
    assert here("simulate", COMMUTERS, "-o", path, "--realisations", 3, "--case", "weekday morning", "-q").status == 0
    monkeypatch.setattr("crowdsim.study.sensitivity._peaks", begun)
    ended = here("sensitivity", COMMUTERS, "--case", "quiet noon", "--into", path, "--realisations", 3)
    assert ended.status == 2
    assert "has no case 'quiet noon'; cases there: weekday morning" in ended.err
    assert read_sensitivity(path) == ()


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
