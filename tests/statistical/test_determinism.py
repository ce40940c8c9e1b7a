"""The same scenario, case and seed give the same numbers to the last bit.

Whatever the number of workers, the block size, the span of time for which persons are drawn at once, the number of
realisations, and the width of the processor's vectors (AVX2 against AVX-512). What may change a number, the sampling
of the force, stays within the error that is stated.
"""

from __future__ import annotations

import json
import os
import platform
import subprocess
import sys
from dataclasses import fields, replace
from pathlib import Path

import h5py
import llvmlite.binding
import numpy as np
import pytest

import crowdsim
from crowdsim.dynamics.realisation import Response
from crowdsim.study import jobs
from crowdsim.study.jobs import run_realisation
from crowdsim.study.prepare import Case
from crowdsim.study.simulate import plan

SCENARIO = """
[scenario]
title = "everything at once"
[deck]
length = 33.0
width = 3.0
[[mode]]
name = "V1"
frequency = 2.05
damping = 0.006
modal_mass = 26000.0
vertical = { half_waves = 1 }
[[mode]]
name = "T1"
frequency = 2.9
damping = 0.008
modal_mass = 18000.0
vertical = { s = [0, 8, 16.5, 25, 33], value = [0, 0.2, 0.3, 0.2, 0] }
twist = { half_waves = 1, amplitude = 0.4 }
[[mode]]
name = "V2"
frequency = 6.3
damping = 0.007
modal_mass = 26000.0
vertical = { half_waves = 2 }
[[stream]]
name = "walkers"
arrival = { per_hour = 800 }
forward_share = 0.6
[[stream]]
name = "joggers"
gait = "jogging"
arrival = { per_hour = 60 }
load = { set = "half-sine", contact_ratio = 0.6 }
[[stream]]
name = "lookers-on"
arrival = { constant = 5 }
load = { harmonics = [0.3, 0.1, 0.05, 0.04, 0.03, 0.02], phases = [0.1, 0.2, 0.3, 0.4, 0.5, 0.6] }
[[case]]
name = "all"
people = "mass"
[[case]]
name = "walkers"
streams = ["walkers"]
[run]
duration = 60.0
realisations = 30
seed = 4
[comfort]
window = 20.0
"""

MEASURES = [f.name for f in fields(Response)]


@pytest.fixture(scope="module")
def case() -> Case:
    """The first case of the scenario."""
    return plan(crowdsim.parse_scenario(SCENARIO)).cases[0]


def response(case: Case, number: int, **options: int) -> Response:
    """One realisation."""
    row = run_realisation(case, number, history=(0, 4000), **options)
    assert row is not None
    return row.response


def assert_same_bits(first: Response, second: Response) -> None:
    """Every measure, and the history."""
    for name in MEASURES:
        a, b = getattr(first, name), getattr(second, name)
        assert a.shape == b.shape
        assert a.size > 0
        assert a.tobytes() == b.tobytes(), name


def datasets(path: Path) -> dict[str, bytes]:
    """Every dataset and attribute of a results file but those of the group /run, as bytes."""
    found: dict[str, bytes] = {}

    def visit(name: str, item: h5py.HLObject) -> None:
        if name.split("/")[0] == "run":
            return
        if isinstance(item, h5py.Dataset):
            found[name] = json.dumps(item.asstr()[()].tolist()).encode() if item.dtype == object else item[()].tobytes()
        for key, value in item.attrs.items():
            found[f"{name}@{key}"] = np.asarray(value).astype(str).tobytes()

    with h5py.File(path) as file:
        visit("", file)
        file.visititems(visit)
    return found


def test_results_file_for_one_and_two_workers_and_for_another_seed(tmp_path: Path) -> None:
    """All datasets and attributes byte for byte; another seed moves every measure (the comparison can fail)."""
    scenario = crowdsim.parse_scenario(SCENARIO)
    for name, workers, seed in (("one", 1, 4), ("two", 2, 4), ("five", 5, 4), ("other", 2, 5)):
        crowdsim.simulate(scenario, out=tmp_path / f"{name}.h5", workers=workers, seed=seed)
    one, two, five, other = (datasets(tmp_path / f"{name}.h5") for name in ("one", "two", "five", "other"))
    assert len(one) > 50
    assert one == two
    assert one == five
    for number in "01":
        for measure in ("peak", "rms", "running_rms_max", "window_peak", "crossings"):
            key = f"cases/{number}/realisations/{measure}"
            assert one[key] != other[key]


def test_the_first_17_of_30_realisations_are_a_run_of_17(tmp_path: Path) -> None:
    """Bit for bit in every measure of every realisation, and in its envelope."""
    scenario = crowdsim.parse_scenario(SCENARIO)
    many = crowdsim.simulate(scenario, workers=2)
    few = crowdsim.simulate(scenario, realisations=17, workers=2)
    for a, b in zip(many.cases, few.cases, strict=True):
        assert (a.realisations, b.realisations) == (30, 17)
        for name in ("peak", "rms", "running_rms_max", "peak_time", "window_peak", "crossings"):
            np.testing.assert_array_equal(getattr(a, name)[:17], getattr(b, name))
        np.testing.assert_array_equal(a.envelope["vertical"][:17], b.envelope["vertical"])


@pytest.mark.parametrize("block", [512, 1024, 2048, 4096])
def test_block_size_changes_no_bit(case: Case, block: int) -> None:
    """Blocks in samples; the default is one of them."""
    for number in (0, 7):
        assert_same_bits(response(case, number), response(case, number, block=block))


@pytest.mark.parametrize("span", [4096, 2 * 4096])
def test_span_of_the_draws_changes_no_bit(case: Case, span: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Persons drawn for a span of samples at a time, here several spans a realisation, against all at once."""
    whole = run_realisation(case, 3, history=(0, 4000))
    monkeypatch.setattr(jobs, "SPAN", span)
    assert case.recorder.total / case.choice.factor > span
    parts = run_realisation(case, 3, history=(0, 4000))
    assert whole is not None
    assert parts is not None
    assert_same_bits(whole.response, parts.response)
    assert whole.crossings == parts.crossings


def test_a_realisation_alone_is_the_one_among_many(case: Case) -> None:
    """Number 12 first, then again after others have run."""
    alone = response(case, 12)
    for number in range(3):
        response(case, number)
    assert_same_bits(alone, response(case, 12))


def short_deck() -> Case:
    """Where stepping on and off weighs most: 16 m, one mode of 3 % damping, second harmonic in resonance."""
    text = """
[deck]
length = 16.0
width = 2.0
[[mode]]
name = "V1"
frequency = 3.7
damping = 0.03
modal_mass = 7000.0
vertical = { half_waves = 1 }
[[stream]]
name = "walkers"
arrival = { per_hour = 1500 }
forward_share = 0.5
[run]
duration = 120.0
seed = 6
"""
    return plan(crowdsim.parse_scenario(text)).cases[0]


@pytest.mark.parametrize("deck", ["everything", "short"])
@pytest.mark.parametrize("factor", [2, 4])
def test_sampling_of_the_force_stays_within_the_stated_error(case: Case, deck: str, factor: int) -> None:
    """Every second or fourth step against every step: peak, RMS, running RMS, envelope of five realisations.

    Relative to the largest of the measure, within the error that the choice states for a peak.
    """
    case = case if deck == "everything" else short_deck()
    assert case.choice.factor == 4  # what the program itself would take
    worst = 0.0
    for number in range(5):
        each, some = (
            response(replace(case, choice=replace(case.choice, factor=steps)), number) for steps in (1, factor)
        )
        for name in ("peak", "rms", "running_rms_max", "envelope"):
            a, b = getattr(each, name), getattr(some, name)
            worst = max(worst, float(np.abs(a - b).max() / a.max()))
    assert 0.0 < worst <= case.choice.expected_error


CHILD = """
import sys, crowdsim
from crowdsim.dynamics import kernels
from crowdsim.study.jobs import run_realisation
from crowdsim.study.simulate import plan
case = plan(crowdsim.parse_scenario(sys.stdin.read())).cases[0]
response = run_realisation(case, 0, history=(0, 4000)).response
assembly = "".join(kernels.realisation.inspect_asm().values())
for name in sys.argv[1:]:
    print(name, getattr(response, name).tobytes().hex())
print("wide", "zmm" in assembly)
print("vectors", "ymm" in assembly)
"""


def test_vectors_of_256_bits_give_the_bits_of_512(case: Case, tmp_path: Path) -> None:
    """The kernels compiled anew for AVX2 with fused multiply-add (a 2013 processor) in a process of their own."""
    if platform.machine().lower() not in ("x86_64", "amd64"):
        pytest.skip(f"vectors of 256 and 512 bits are x86-64's; this is {platform.machine()}")
    features = llvmlite.binding.get_host_cpu_features()
    if not features.get("avx512f", False):
        pytest.skip("this processor has no AVX-512: nothing to compare with")
    modern = ("avx512", "avx10", "evex512", "amx", "apx")
    kept = ",".join(
        f"{'+' if given and not name.startswith(modern) else '-'}{name}" for name, given in features.items()
    )
    package = str(Path(crowdsim.__file__).parents[1])
    environment = {
        **os.environ,
        "NUMBA_CPU_NAME": "haswell",
        "NUMBA_CPU_FEATURES": kept,
        "NUMBA_CACHE_DIR": str(tmp_path),
        "PYTHONPATH": os.pathsep.join([package, os.environ.get("PYTHONPATH", "")]),
    }
    child = subprocess.run(
        [sys.executable, "-c", CHILD, *MEASURES], input=SCENARIO, env=environment, capture_output=True, text=True,
        check=True, timeout=300,
    )  # fmt: skip
    found = dict(line.split(" ") for line in child.stdout.splitlines())
    assert (found.pop("wide"), found.pop("vectors")) == ("False", "True")
    here = response(case, 0)
    assert found == {name: getattr(here, name).tobytes().hex() for name in MEASURES}
