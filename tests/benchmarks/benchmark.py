"""Speed of crowdsim against plain NumPy, as ratios that are measured in one run on one core.

    python tests/benchmarks/benchmark.py [--quick]

Unit of cost: nanoseconds per person-step, one person on the deck for one time step of 0.005 s.
The other side is a script as a competent engineer writes it: one Python loop over the persons,
everything else vectorised, `scipy.signal.lsim` for the modes. Both sides get the same job and must
agree; the differences are printed (lsim joins the force linearly and the script's peak is the
largest sample, so some 0.1 % are the script's own error). Each time is the best of several
repeats, the two sides taking turns. `--quick` shortens everything, to see that it runs: its ratios
are no record.

Not collected by pytest: a ratio of times is no pass or fail on a shared machine.
"""

from __future__ import annotations

import os

os.environ["OMP_NUM_THREADS"] = "1"  # before NumPy is loaded: one core for both sides
os.environ["OPENBLAS_NUM_THREADS"] = "1"
os.environ["MKL_NUM_THREADS"] = "1"
os.environ["BLIS_NUM_THREADS"] = "1"

import argparse
import re
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

import numpy as np
from numba import njit
from numpy.typing import NDArray
from scipy import signal

from crowdsim.dynamics import kernels, realisation
from crowdsim.dynamics.interpolation import between_weights
from crowdsim.dynamics.realisation import Passages
from crowdsim.scenario.reader import parse_scenario
from crowdsim.study import jobs
from crowdsim.study.executor import Halt, rows
from crowdsim.study.prepare import Case
from crowdsim.study.simulate import plan

Floats = NDArray[np.float64]
ROOT = Path(__file__).resolve().parents[2]
TARGET_FORCE = {"AVX-512": 300.0, "AVX2": 220.0}
TARGET_WHOLE = 200.0
TARGET_WORKERS = 0.9
TARGET_COMMAND = 150.0
_UNSIGNED = np.uint64


@dataclass(frozen=True)
class Job:
    """A deck with half-wave modes at `frequencies` and a crowd of about `persons`."""

    persons: float
    length: float
    frequencies: tuple[float, ...]
    harmonics: tuple[float, ...]
    duration: float
    time_step: float = 0.005
    width: float = 3.0
    damping: float = 0.006
    modal_mass: float = 40_000.0

    def scenario(self) -> str:
        """The scenario file."""
        modes = "\n".join(
            f'[[mode]]\nname = "V{n}"\nfrequency = {f}\ndamping = {self.damping}\nmodal_mass = {self.modal_mass}\n'
            f"vertical = {{ half_waves = {n} }}"
            for n, f in enumerate(self.frequencies, start=1)
        )
        return f"""
[deck]
length = {self.length}
width = {self.width}
{modes}
[[stream]]
name = "walkers"
arrival = {{ density = {self.persons / (self.length * self.width)!r} }}
forward_share = 0.5
pace = {{ mean = 1.9, sd = 0.18, min = 1.4, max = 2.6 }}
step_length = {{ mean = 0.71, sd = 0.07, min = 0.4, max = 1.0 }}
weight = {{ mean = 750.0, sd = 120.0, min = 300.0, max = 1500.0 }}
load = {{ harmonics = {list(self.harmonics)} }}
[run]
duration = {self.duration}
time_step = {self.time_step}
realisations = 400
seed = 1
"""

    def case(self) -> Case:
        """The only case, ready to run."""
        return plan(parse_scenario(self.scenario(), "benchmark")).cases[0]


def best(rounds: int, *sides: tuple[int, Callable[[], Any]]) -> list[float]:
    """Shortest time [s] of each side, the sides taking turns of so many calls each."""
    shortest = [float("inf")] * len(sides)
    for _ in range(rounds):
        for i, (calls, side) in enumerate(sides):
            for _ in range(calls):
                begin = time.perf_counter()
                side()
                shortest[i] = min(shortest[i], time.perf_counter() - begin)
    return shortest


# ---------------------------------------------------------------- the script: plain NumPy and SciPy


@dataclass(frozen=True)
class Crowd:
    """Who walks: one person a row. cosine, sine: force amplitude [N] of each harmonic."""

    enter: Floats
    leave: Floats
    place: Floats
    velocity: Floats
    pace: Floats
    phase: Floats
    amplitude: Floats
    angle: Floats

    @classmethod
    def of(cls, walks: Passages) -> Crowd:
        """The same people as a realisation of crowdsim."""
        return cls(
            walks.enter, walks.leave, walks.place, walks.velocity, walks.pace, 2 * np.pi * walks.turns,
            np.hypot(walks.cosine, walks.sine), np.arctan2(walks.sine, walks.cosine),
        )  # fmt: skip

    def person_steps(self, steps: int, time_step: float) -> int:
        """Persons on the deck, summed over the steps."""
        first = np.ceil(self.enter / time_step)
        last = np.minimum(np.floor(self.leave / time_step), steps - 1)
        return int(np.maximum(last - first + 1, 0).sum())


def script_people(random: np.random.Generator, job: Job, rate: float, end: float) -> Crowd:
    """Draws the people of a realisation. The few who would be redrawn are clipped: same cost, less code."""
    count = random.poisson(rate * end)
    enter = np.sort(random.uniform(0.0, end, count))
    pace = random.normal(1.9, 0.18, count).clip(1.4, 2.6)
    speed = pace * random.normal(0.71, 0.07, count).clip(0.4, 1.0)
    forward = random.uniform(size=count) < 0.5
    weight = random.normal(750.0, 120.0, count).clip(300.0, 1500.0)
    amplitude = weight[:, None] * np.array(job.harmonics)
    return Crowd(
        enter, enter + job.length / speed, np.where(forward, 0.0, job.length), np.where(forward, speed, -speed),
        pace, random.uniform(0.0, 2 * np.pi, count), amplitude, np.zeros_like(amplitude),
    )  # fmt: skip


def script_force(crowd: Crowd, job: Job, steps: int) -> Floats:
    """Modal forces [mode, step]: a loop over the persons, vectorised over the steps of each."""
    modes = len(job.frequencies)
    wave = np.pi / job.length * np.arange(1, modes + 1)[:, None]
    force = np.zeros((modes, steps))
    for p in range(crowd.enter.size):
        first = int(np.ceil(crowd.enter[p] / job.time_step))
        end = min(int(np.floor(crowd.leave[p] / job.time_step)) + 1, steps)
        walked = np.arange(first, end) * job.time_step - crowd.enter[p]
        phase = 2 * np.pi * crowd.pace[p] * walked + crowd.phase[p]
        load = np.zeros(walked.size)
        for k, (amplitude, angle) in enumerate(zip(crowd.amplitude[p], crowd.angle[p], strict=True), start=1):
            load += amplitude * np.sin(k * phase + angle)
        force[:, first:end] += load * np.sin(wave * (crowd.place[p] + crowd.velocity[p] * walked))
    return force


def script_motion(force: Floats, job: Job) -> Floats:
    """Modal accelerations [mode, step]."""
    time_axis = np.arange(force.shape[1]) * job.time_step
    motion = np.empty_like(force)
    for m, frequency in enumerate(job.frequencies):
        omega = 2 * np.pi * frequency
        row = [-(omega**2), -2 * job.damping * omega]
        system = ([[0.0, 1.0], row], [[0.0], [1 / job.modal_mass]], [row], [[1 / job.modal_mass]])
        motion[m] = signal.lsim(system, force[m], time_axis)[1]
    return motion


def script_measures(motion: Floats, points: Floats, stations: Floats, warm: int, window: int) -> dict[str, Floats]:
    """Peak, rms, largest running rms at the points; largest peak at the stations."""
    observed = motion[:, warm:]
    acceleration = points @ observed
    squares = acceleration**2
    sums = np.cumsum(squares, axis=1)
    return {
        "peak": np.abs(acceleration).max(axis=1),
        "rms": np.sqrt(squares.mean(axis=1)),
        "running_rms_max": np.sqrt((sums[:, window:] - sums[:, :-window]).max(axis=1) / window),
        "envelope": np.array([np.abs(station @ observed).max() for station in stations]),
    }


def script_realisation(crowd: Crowd, job: Job, case: Case) -> dict[str, Floats]:
    """Everything after the draw."""
    record = case.recorder
    motion = script_motion(script_force(crowd, job, record.total), job)
    return script_measures(motion, record.points, record.stations, record.warm, record.window)


# ---------------------------------------------------------------- crowdsim's force loop alone


@njit(nogil=True)
def kernel_force(
    persons, numbers, loads, many, ordinates, twist, modes, samples, block, weights,
    force, table, work, rows, between, out,
):  # fmt: skip
    """Modal force at every step, by the block loop of `kernels.realisation` without motion and measures."""
    factor = 1 + weights.shape[0]
    mask = table.size // kernels.SLOT - 1
    low = np.int64(0)
    high = np.int64(0)
    for n in range(0, samples, block):
        while high < persons.shape[0] and persons[high, 0] < n + block:
            kernels.person_table(table, _UNSIGNED((high & mask) * kernels.SLOT), numbers[high, 1])
            high += 1
        while low < high and persons[low, 1] <= n:
            low += 1
        kernels.force_block(
            force, table, work, ordinates, twist, modes, n, block, low, high, persons, numbers, loads, many
        )
        kernels.between_block(force, rows, between, weights, modes, block)
        if out.size:
            for m in range(modes):
                for i in range(block):
                    first = factor * (n - kernels.LAG + i)
                    for j in range(factor):
                        if 0 <= first + j < out.shape[1]:
                            out[m, first + j] = rows[m, i + kernels.LAG] if j == 0 else between[m, j - 1, i]


def force_runner(case: Case, walks: Passages) -> Callable[[Floats], None]:
    """A call of `kernel_force`; its argument takes the force [mode, step], empty: nothing is kept."""
    factor, block, modes = case.choice.factor, realisation.BLOCK, case.deck.modes
    samples = -(-case.recorder.total // factor) + kernels.LAG
    persons, numbers, loads = realisation._rows(walks, case.deck, factor * case.choice.time_step, 0, samples)
    table = realisation.aligned(realisation._slots(persons, 0, samples, block) * kernels.SLOT)
    groups = -(-modes // kernels.ROWS)
    force = realisation.aligned(groups * kernels.ROWS * kernels.STRIDE)
    work = realisation.aligned(kernels.WORK)
    between = np.zeros((modes, factor - 1, block))
    weights = between_weights(factor)

    def run(out: Floats) -> None:
        kernel_force(
            persons, numbers, loads, walks.cosine.shape[1] > 4, case.deck.vertical, case.deck.twist, modes, samples,
            block, weights, force, table, work, np.zeros((modes, kernels.TAPS + block)), between, out,
        )  # fmt: skip

    return run


# ---------------------------------------------------------------- measurements


def register_width() -> tuple[str, str]:
    """What the processor has, and what the force kernel uses: packed fused multiply-adds by register."""
    import llvmlite.binding

    features = llvmlite.binding.get_host_cpu_features()
    host = "AVX-512" if features.get("avx512f") else "AVX2" if features.get("avx2") else "neither AVX2 nor AVX-512"
    program = (
        "from numba import float64, int64, uint64\n"
        "from crowdsim.dynamics import kernels\n"
        "line = float64[::1]\n"
        "kernels._lanes_4_4.compile((line, line, uint64, line, int64, int64, uint64))\n"
        "print(*kernels._lanes_4_4.inspect_asm().values())\n"
    )
    environment = {**os.environ, "NUMBA_DISABLE_CACHE": "1", "PYTHONPATH": str(ROOT)}
    done = subprocess.run([sys.executable, "-c", program], env=environment, capture_output=True, text=True, check=True)
    counts = {r: len(re.findall(rf"vfn?m(?:add|sub)\d+pd\s.*%{r}", done.stdout)) for r in ("zmm", "ymm")}
    used = "AVX-512" if counts["zmm"] > counts["ymm"] else "AVX2"
    return host, f"{used} ({counts['zmm']} packed multiply-adds on zmm, {counts['ymm']} on ymm registers)"


@dataclass(frozen=True)
class Measured:
    """One line of the table."""

    what: str
    ours: str
    theirs: str
    ratio: float
    target: float

    def line(self) -> str:
        """For a person."""
        met = "met" if self.ratio >= self.target else "NOT met"
        return f"{self.what:<34}{self.ours:>20}{self.theirs:>20}{self.ratio:>9.3g}{self.target:>9.3g}  {met}"


def measure_force(quick: bool, target: float) -> Measured:
    """The force loop at 4 harmonics and 4 modes, 90 persons."""
    job = Job(90.0, 60.0, (2.05, 4.3, 7.0, 11.0), (0.4, 0.1, 0.1, 0.05), 120.0 if quick else 600.0)
    case = job.case()
    walks = jobs.joined([p for _, p in jobs.draw(case, 0)])
    steps = case.recorder.total
    crowd = Crowd.of(walks)
    run = force_runner(case, walks)
    nothing = np.zeros((0, 0))
    kept = np.zeros((len(job.frequencies), steps))
    run(kept)
    exact = script_force(crowd, job, steps)
    difference = np.abs(kept - exact).max() / np.abs(exact).max()
    print(f"force loop: {case.choice.factor} steps a sample; modal forces differ by {difference:.1e} of the largest")
    rounds = 2 if quick else 4
    ours, theirs = best(rounds, (5, lambda: run(nothing)), (1, lambda: script_force(crowd, job, steps)))
    nano = 1e9 / crowd.person_steps(steps, job.time_step)
    ours, theirs = nano * ours, nano * theirs
    return Measured("force loop, 4 harmonics, 4 modes", f"{ours:.3f} ns", f"{theirs:.1f} ns", theirs / ours, target)


def whole_job(quick: bool) -> Job:
    """45 persons, 2 modes, 3 harmonics."""
    return Job(45.0, 54.0, (2.05, 4.3), (0.4, 0.1, 0.1), 240.0 if quick else 720.0)


def measure_whole(quick: bool) -> tuple[Measured, float]:
    """The whole realisation; also the script's time for one [s]."""
    job = whole_job(quick)
    case = job.case()
    record = case.recorder
    row = jobs.run_realisation(case, 0)
    assert row is not None
    walks = jobs.joined([p for _, p in jobs.draw(case, 0)])
    same = script_realisation(Crowd.of(walks), job, case)
    for name in ("peak", "rms", "running_rms_max", "envelope"):
        ours, theirs = getattr(row.response, name), same[name]
        print(f"whole: {name} differs by {np.abs(ours - theirs).max() / np.abs(theirs).max():.1e} for the same people")

    rate = case.persons / (job.length * case.streams[0].inverse_speed)
    random = np.random.default_rng(1)
    parts = np.zeros(3)
    per_step, script_times = float("inf"), []
    for _ in range(2 if quick else 3):
        stamps = [time.perf_counter()]
        crowd = script_people(random, job, rate, record.total * job.time_step)
        force = script_force(crowd, job, record.total)
        stamps.append(time.perf_counter())
        motion = script_motion(force, job)
        stamps.append(time.perf_counter())
        script_measures(motion, record.points, record.stations, record.warm, record.window)
        stamps.append(time.perf_counter())
        taken = stamps[-1] - stamps[0]
        parts += np.diff(stamps)
        script_times.append(taken)
        per_step = min(per_step, 1e9 * taken / crowd.person_steps(record.total, job.time_step))
    parts /= len(script_times)
    named = ", ".join(f"{name} {part:.2f}" for name, part in zip(("force", "lsim", "measures"), parts, strict=True))
    print(f"whole: the script's {parts.sum():.2f} s are {named} s")
    ours = float("inf")
    for k in range(5 if quick else 20):
        begin = time.perf_counter()
        done = jobs.run_realisation(case, k)
        taken = time.perf_counter() - begin
        assert done is not None
        ours = min(ours, 1e9 * taken / done.person_steps)
    share = 1.0 - parts[1] / parts.sum()
    print(f"whole: if the modes cost the script nothing, the ratio would be {share * per_step / ours:.0f}")
    measured = Measured(
        "realisation, 3 harmonics, 2 modes", f"{ours:.3f} ns", f"{per_step:.1f} ns", per_step / ours, TARGET_WHOLE
    )
    return measured, min(script_times)


def single_worker(count: int, core: int, quick: bool) -> None:
    """A process of its own: `count` realisations on one core from the time it is told; prints when it ended."""
    pin({core})
    case = whole_job(quick).case()
    for _ in rows(case, 2, 1, Halt()):
        pass
    print("ready", flush=True)
    time.sleep(max(float(sys.stdin.readline()) - time.time(), 0.0))
    for _ in rows(case, count, 1, Halt()):
        pass
    print(time.time(), flush=True)


def processes_rate(count: int, pair: list[int], quick: bool) -> float:
    """Realisations a second of two processes of one worker each, both at work at the same time."""
    processes = [
        subprocess.Popen(
            [sys.executable, __file__, "--single", str(count), str(core), *(["--quick"] * quick)],
            stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True,
        )
        for core in pair
    ]  # fmt: skip
    for process in processes:
        assert process.stdout is not None
        if process.stdout.readline().strip() != "ready":
            raise SystemExit("a worker process failed")
    begin = time.time() + 0.2
    for process in processes:
        assert process.stdin is not None
        process.stdin.write(f"{begin!r}\n")
        process.stdin.flush()
    ends = [float(process.communicate()[0]) for process in processes]
    return 2 * count / (max(ends) - begin)


def measure_workers(quick: bool, cores: list[int]) -> Measured | None:
    """Two threads on two cores against two processes on the same two cores, realisations a second."""
    if len(cores) < 2:
        print("workers: left out, there is one core only")
        return None
    pair = cores[:2]
    case = whole_job(quick).case()
    count = 40 if quick else 200
    together = apart = 0.0
    before = os.sched_getaffinity(0)
    pin(set(pair))
    for _ in range(1 if quick else 6):
        apart = max(apart, processes_rate(count, pair, quick))
        begin = time.perf_counter()
        for _ in rows(case, 2 * count, 2, Halt()):
            pass
        together = max(together, 2 * count / (time.perf_counter() - begin))
    pin(before)
    return Measured(
        "two workers / two processes", f"{together:.0f} per s", f"{apart:.0f} per s", together / apart, TARGET_WORKERS
    )


def measure_command(quick: bool, script_time: float) -> Measured:
    """`crowdsim simulate` from start-up to results file, one core, against the script's time."""
    count = 40 if quick else 400
    with tempfile.TemporaryDirectory() as folder:
        scenario = Path(folder) / "scenario.toml"
        scenario.write_text(whole_job(quick).scenario(), encoding="utf-8")
        command = [
            sys.executable, "-m", "crowdsim", "simulate", str(scenario), "--out", str(Path(folder) / "run.h5"),
            "--realisations", str(count), "--workers", "1", "--force",
        ]  # fmt: skip
        environment = {**os.environ, "PYTHONPATH": str(ROOT)}

        def run() -> None:
            done = subprocess.run(command, env=environment, capture_output=True, text=True, check=False)
            if done.returncode != 0:
                raise SystemExit(f"the command failed: {done.stderr}")

        taken = best(1, (2 if quick else 4, run))[0]
    theirs = count * script_time
    return Measured(
        f"command, {count} realisations", f"{taken:.2f} s", f"{theirs:.0f} s", theirs / taken, TARGET_COMMAND
    )


def pin(cores: set[int]) -> None:
    """This process to `cores`, where the system can."""
    if hasattr(os, "sched_setaffinity"):
        os.sched_setaffinity(0, cores)


def main() -> None:
    """Measures everything and prints the table."""
    parser = argparse.ArgumentParser(description="Speed of crowdsim against plain NumPy.")
    parser.add_argument("--quick", action="store_true", help="short, to see that it runs; no record")
    parser.add_argument("--single", nargs=2, metavar=("COUNT", "CORE"), help=argparse.SUPPRESS)
    options = parser.parse_args()
    if options.single:
        single_worker(int(options.single[0]), int(options.single[1]), options.quick)
        return
    cores = sorted(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else list(range(os.cpu_count() or 1))
    load = os.getloadavg()[0] if hasattr(os, "getloadavg") else float("nan")
    host, used = register_width()
    print(f"processor has {host}; the force kernel uses {used}")
    print(f"{len(cores)} cores, load average {load:.2f} before the run; NumPy {np.__version__}; one core from here on")
    pin({cores[-1]})
    target = TARGET_FORCE["AVX-512" if used.startswith("AVX-512") else "AVX2"]
    measured: list[Measured | None] = [measure_force(options.quick, target)]
    whole, script_time = measure_whole(options.quick)
    measured += [whole, measure_command(options.quick, script_time)]
    measured.insert(2, measure_workers(options.quick, cores))
    print(f"\n{'':<34}{'crowdsim':>20}{'other side':>20}{'ratio':>9}{'target':>9}")
    for m in measured:
        if m is not None:
            print(m.line())
    print("times per person-step where in ns" + ("; quick: no record" if options.quick else ""))


if __name__ == "__main__":
    main()
