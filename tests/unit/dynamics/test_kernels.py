"""The compiled kernels: every index checked once, packed multiply-adds in the force loop, a cache that may fail.

Two processes of their own: one with numba's index checks (they must not mix with the cache of the
plain kernels), one without a cache, whose assembly can be read.
"""

from __future__ import annotations

import json
import os
import re
from collections.abc import Callable
from pathlib import Path

import llvmlite.binding
import numpy as np
import pytest

from crowdsim.dynamics import kernels
from crowdsim.scenario.reader import parse_scenario
from crowdsim.study.jobs import run_realisation
from crowdsim.study.prepare import prepare
from crowdsim.study.situation import cases

MODES = "".join(
    f"""
[[mode]]
name = "M{n}"
frequency = {1.1 + 0.9 * n}
damping = 0.01
modal_mass = 3e4
vertical = {{ half_waves = {1 + n % 3} }}
twist = {{ half_waves = {1 + n % 2}, amplitude = 0.3 }}
"""
    for n in range(6)
)
PERSON = """
forward_share = 0.5
pace = { mean = 1.9, sd = 0.2, min = 1.3, max = 2.6 }
"""
SEVERAL = f"""
[deck]
length = 30.0
width = 3.0
{MODES}
[[stream]]
name = "flow"
arrival = {{ per_hour = 900 }}
load = {{ harmonics = [0.4, 0.1, 0.1, 0.06, 0.05, 0.04, 0.03, 0.02], phases = [0, 1, 2, 3, 4, 5, 6, 7] }}
{PERSON}
[[stream]]
name = "crowd"
arrival = {{ density = 0.05 }}
load = "iso-10137-2007"
{PERSON}
[[stream]]
name = "always"
arrival = {{ constant = 5 }}
load = {{ harmonics = [0.4, 0.1, 0.1] }}
{PERSON}
[[stream]]
name = "times"
arrival = {{ times = [0.0, 0.001, 7.0, 7.0, 29.995, 30.0] }}
load = {{ harmonics = [0.4] }}
{PERSON}
[[case]]
name = "eight harmonics"
[[case]]
name = "three harmonics"
streams = ["always", "times"]
[[point]]
name = "corner"
s = 30.0
e = -1.5
[run]
duration = 30.0
seed = 3
[comfort]
window = 10.0
"""
# an ordinate that does not vanish at an end: the force is sampled at every step, nothing lies between
FREE_END = SEVERAL.replace(
    "vertical = { half_waves = 1 }", "vertical = { s = [0, 10, 20, 30], value = [0, 0.3, 0.7, 1] }"
)

PROGRAM = """
import json, sys
import numpy as np
from crowdsim.dynamics import kernels
from crowdsim.scenario.reader import parse_scenario
from crowdsim.study.jobs import run_realisation
from crowdsim.study.prepare import prepare
from crowdsim.study.situation import cases

try:
    kernels.person_table(np.zeros(kernels.SLOT - 1), np.uint64(0), 0.1)
except IndexError:
    checked = True
else:
    checked = False
rows = []
for text in {texts!r}:
    read = parse_scenario(text)
    for table in cases(read):
        case = prepare(read, table)
        r = run_realisation(case, 0, history=(0, case.recorder.total)).response
        rows.append([x.tolist() for x in (r.peak, r.rms, r.running_rms_max, r.envelope, np.abs(r.history).max(axis=0))])
print(json.dumps([checked, rows]))
"""


def test_no_kernel_reads_or_writes_beside_its_arrays(python: Callable[..., str], tmp_path: Path) -> None:
    texts = (SEVERAL, FREE_END)
    output = python(PROGRAM.format(texts=texts), NUMBA_BOUNDSCHECK="1", NUMBA_CACHE_DIR=str(tmp_path))
    checked, found = json.loads(output)
    assert checked, "the index checks are not in force"
    rows = iter(found)
    for text in texts:
        read = parse_scenario(text)
        for table in cases(read):
            case = prepare(read, table)
            assert case.deck.modes == 6
            assert case.deck.twist.size > 0
            assert (case.choice.factor > 1) == (text is SEVERAL)
            row = run_realisation(case, 0, history=(0, case.recorder.total))
            assert row is not None
            r = row.response
            plain = (r.peak, r.rms, r.running_rms_max, r.envelope, np.abs(r.history).max(axis=0))
            for a, b in zip(plain, next(rows), strict=True):
                # checks may change which products are fused: some thousand roundings of 1e-16 over the record
                np.testing.assert_allclose(a, b, rtol=1e-10)
            assert np.all(r.peak > 0.0)


ASSEMBLY = """
from numba import float64, int64, uint64
from crowdsim.dynamics import kernels
line = float64[::1]
kernels._lanes_4_4.compile((line, line, uint64, line, int64, int64, uint64))
print(*kernels._lanes_4_4.inspect_asm().values())
"""


def test_the_force_loop_runs_on_packed_multiply_adds(python: Callable[..., str]) -> None:
    features = llvmlite.binding.get_host_cpu_features()
    if not (features.get("avx2") and features.get("fma")):
        pytest.skip("this processor has no AVX2 with fused multiply-add")
    text = python(ASSEMBLY, NUMBA_DISABLE_CACHE="1")
    packed = re.findall(r"vfn?m(?:add|sub)\d+pd\s[^\n]*%[yz]mm", text)
    # even and odd part (4 + 3), ordinates of four modes (4), sums of two halves and four modes (8)
    assert len(packed) >= 19


CACHED = """
import os
import numpy as np
from crowdsim.dynamics import kernels
kernels.person_table(np.zeros(kernels.SLOT), np.uint64(0), 0.1)
print(sum(len(files) for _, _, files in os.walk(os.environ["NUMBA_CACHE_DIR"])))
"""


def test_the_cache_is_used_and_can_be_switched_off(python: Callable[..., str], tmp_path: Path) -> None:
    off, on = tmp_path / "off", tmp_path / "on"
    assert int(python(CACHED, NUMBA_CACHE_DIR=str(off), NUMBA_DISABLE_CACHE="1")) == 0
    assert int(python(CACHED, NUMBA_CACHE_DIR=str(on))) > 0


def test_a_cache_that_cannot_be_written_stops_nobody(python: Callable[..., str], tmp_path: Path) -> None:
    blocked = tmp_path / "a file"
    blocked.write_text("no folder can be made below this")
    assert python(CACHED, NUMBA_CACHE_DIR=str(blocked / "cache"), TMPDIR=str(tmp_path)) == "0\n"


def test_the_sizes_fit_together() -> None:
    assert kernels.CHUNK == 2 * kernels.HALF
    assert kernels.RUN == 512 == kernels.CHUNK * kernels.CHUNKS  # bits hang on it: the phase starts afresh there
    assert kernels.BLOCK_LIMIT % kernels.RUN == 0
    assert kernels.STRIDE >= kernels.BLOCK_LIMIT + kernels.CHUNK
    assert (8 * kernels.STRIDE) % 4096 != 0  # rows 4 KiB apart would share their cache lines
    assert 2 * kernels.LAG == kernels.TAPS
    assert os.environ.get("NUMBA_DISABLE_JIT") in (None, "", "0")
