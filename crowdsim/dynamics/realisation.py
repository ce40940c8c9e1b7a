"""One realisation: shapes and types checked, work arrays laid out, kernel called.

Knows the persons only as arrays of a load that is a sum of harmonics; where they come from is
the business of `crowd` and `loads`.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from crowdsim.dynamics import kernels
from crowdsim.dynamics.interpolation import between_weights
from crowdsim.dynamics.kernels import (
    BLOCK_LIMIT,
    CARRY,
    CHUNK,
    HARMONICS,
    ROWS,
    RUN,
    SCRATCH_SIZE,
    SLOT,
    STRIDE,
    SUMS,
    TAPS,
    WORK,
)

Floats = NDArray[np.float64]
CELLS = 4096
FASTEST = 12.0  # m/s; nobody runs faster
BLOCK = 1024  # samples


@dataclass(frozen=True)
class Passages:
    """Walks over the deck, one a row, as the kernel needs them.

    Attributes
    ----------
    enter, leave : [passage] time on and off the deck [s], from time 0
    place : [passage] s at `enter` [m]
    velocity : [passage] towards growing s [m/s]
    offset : [passage] e [m]
    pace : [passage] [Hz]
    turns : [passage] phase of the first harmonic at `enter` [turns]
    cosine, sine : [passage, harmonic] force amplitude x cos, sin of the harmonic's own phase [N]
    """

    enter: Floats
    leave: Floats
    place: Floats
    velocity: Floats
    offset: Floats
    pace: Floats
    turns: Floats
    cosine: Floats
    sine: Floats


@dataclass(frozen=True)
class Deck:
    """Ordinates of the driven modes on a fine table that reaches beyond both ends.

    vertical, twist : flat [cell, mode padded to 4]; twist may be empty
    cell : length of a cell [m]; before : cells in front of s = 0
    """

    vertical: Floats
    twist: Floats
    modes: int
    cell: float
    before: int


@dataclass(frozen=True)
class Recorder:
    """Where and how the response is measured.

    points : [point, mode]; stations : [station, mode] ordinates
    total : steps, step 0 at time 0; warm : first observed step
    window : steps of the running RMS; segment : steps of the comfort window
    """

    points: Floats
    stations: Floats
    total: int
    warm: int
    window: int
    segment: int

    @property
    def segments(self) -> int:
        """Whole comfort windows in the observed time."""
        return (self.total - 1 - self.warm) // self.segment


@dataclass(frozen=True)
class Response:
    """What one realisation gives.

    peak, rms, running_rms_max, peak_time : [point] (m/s2; s from time 0)
    window_peak : [window, point]; envelope : [station]; history : [step, point] or empty
    """

    peak: Floats
    rms: Floats
    running_rms_max: Floats
    peak_time: Floats
    window_peak: Floats
    envelope: Floats
    history: Floats


@dataclass
class Control:
    """Shared with the kernel while it runs: stop at the next block; samples done so far."""

    stop: NDArray[np.uint8] = field(default_factory=lambda: np.zeros(1, np.uint8))
    progress: NDArray[np.int64] = field(default_factory=lambda: np.zeros(1, np.int64))


class NotFiniteError(ArithmeticError):
    """The motion of a realisation grew beyond the numbers."""


def aligned(count: int) -> Floats:
    """Zeros that begin on a cache line."""
    room = np.zeros(count + 8)
    skip = (-room.ctypes.data // 8) % 8
    return room[skip : skip + count]


def table_cells(length: float, sample: float) -> int:
    """Cells that the table needs beyond each end of a deck of `length` [m]; sample [s]."""
    reach = FASTEST * sample * CHUNK
    return int(np.ceil(reach / (length / CELLS))) + 2


def deck_table(vertical: Floats, twist: Floats | None, length: float, before: int) -> Deck:
    """Packs ordinates [cell, mode], read at s = (i - before) length/CELLS, for the kernel."""
    cells, modes = vertical.shape
    groups = -(-modes // ROWS)

    def pack(values: Floats) -> Floats:
        padded = np.zeros((cells, groups * ROWS))
        padded[:, :modes] = values
        return padded.ravel()

    return Deck(pack(vertical), np.zeros(0) if twist is None else pack(twist), modes, length / CELLS, before)


def _rows(passages: Passages, deck: Deck, sample: float, samples: int) -> tuple[NDArray[np.int64], Floats, Floats]:
    first = np.ceil(passages.enter / sample - 1e-9).astype(np.int64)
    end = np.floor(passages.leave / sample + 1e-9).astype(np.int64) + 1
    keep = (first < end) & (first < samples)
    order = np.flatnonzero(keep)
    order = order[np.argsort(first[order], kind="stable")]
    first, end = first[order], np.minimum(end[order], samples)
    late = first * sample - passages.enter[order]
    pace = passages.pace[order]
    numbers = np.empty((order.size, 5))
    numbers[:, 0] = np.fmod(passages.turns[order] + pace * late, 1.0)
    numbers[:, 1] = pace * sample
    numbers[:, 2] = (passages.place[order] + passages.velocity[order] * late) / deck.cell + deck.before
    numbers[:, 3] = passages.velocity[order] * sample / deck.cell
    numbers[:, 4] = passages.offset[order]
    loads = np.zeros((order.size, 2 * HARMONICS))
    loads[:, : passages.cosine.shape[1]] = passages.cosine[order]
    loads[:, HARMONICS : HARMONICS + passages.sine.shape[1]] = passages.sine[order]
    return np.ascontiguousarray(np.stack([first, end], axis=1)), numbers, loads


def _slots(rows: NDArray[np.int64], samples: int, block: int) -> int:
    if rows.shape[0] == 0:
        return 1
    starts = np.arange(0, samples, block)
    high = np.searchsorted(rows[:, 0], starts + block, side="left")
    low = np.searchsorted(np.maximum.accumulate(rows[:, 1]), starts, side="right")
    most = int(np.max(high - low, initial=1))
    return 1 << (max(most, 1) - 1).bit_length()


def run(
    passages: Passages,
    deck: Deck,
    step: Floats,
    recorder: Recorder,
    time_step: float,
    *,
    history: tuple[int, int] | None = None,
    control: Control | None = None,
    factor: int = 4,
    block: int = BLOCK,
) -> Response | None:
    """Acceleration measures of one realisation; None where `control` stopped it.

    Parameters
    ----------
    step : [mode, 11] from `newmark.step_coefficients`, driven modes only
    history : steps [from, to) whose acceleration is kept
    factor : steps in a sample of the force (1, 2 or 4), see `step.choose`
    block : samples worked on at a time, a multiple of 512; changes no bit

    Raises
    ------
    ValueError : arrays that do not fit each other
    NotFiniteError : the motion is not finite
    """
    modes = deck.modes
    if step.shape != (modes, 11):
        raise ValueError(f"step: {step.shape}, not {(modes, 11)}")
    for name in ("points", "stations"):
        if getattr(recorder, name).shape[1:] != (modes,):
            raise ValueError(f"{name}: one ordinate for each of the {modes} driven modes")
    if block % RUN or not 0 < block <= BLOCK_LIMIT:
        raise ValueError(f"block: a multiple of {RUN} up to {BLOCK_LIMIT}, not {block}")
    if passages.cosine.shape[1] > HARMONICS:
        raise ValueError(f"at most {HARMONICS} harmonics, not {passages.cosine.shape[1]}")
    if not 1 <= modes <= kernels.MODES_LIMIT:
        raise ValueError(f"1 to {kernels.MODES_LIMIT} driven modes, not {modes}")
    control = control or Control()
    weights = between_weights(factor)
    points = recorder.points.shape[0]
    samples = -(-recorder.total // factor) + kernels.LAG
    rows, numbers, loads = _rows(passages, deck, factor * time_step, samples)
    if numbers.size and np.max(np.abs(numbers[:, 3])) * CHUNK + 1 > deck.before:
        raise ValueError(f"a person faster than {FASTEST} m/s")
    pair = modes + modes % 2

    def padded(values: Floats, axis: int) -> Floats:
        width = [(0, 0)] * values.ndim
        width[axis] = (0, pair - modes)
        return np.ascontiguousarray(np.pad(values, width), dtype=np.float64)

    begin, stop = history or (0, 0)
    kept = np.zeros((max(stop - begin, 0), points))
    steps = factor * block
    y = np.zeros((points, recorder.window + 2 + steps))
    peaks = np.zeros((points, recorder.segments + 1))
    squares = np.zeros((points, SUMS))
    running = np.zeros((points, 2))
    best = np.zeros((points, 2))
    envelope = np.zeros(recorder.stations.shape[0])
    motion = np.zeros((pair, CARRY + steps))
    status = kernels.realisation(
        rows, numbers, loads, bool(passages.cosine.shape[1] > 4), deck.vertical, deck.twist, modes,
        padded(step, 0), padded(recorder.points, 1), padded(recorder.stations, 1),
        recorder.total, recorder.warm, recorder.window, recorder.segment, block, weights, kept, begin,
        aligned(-(-modes // ROWS) * ROWS * STRIDE), aligned(_slots(rows, samples, block) * SLOT), aligned(WORK),
        np.zeros((pair, TAPS + block)), np.zeros((pair, factor - 1, block)), motion, np.zeros((pair, 3)),
        y, aligned(SCRATCH_SIZE), np.zeros((kernels.PARTS + 1, pair)), peaks, squares, running, best, envelope,
        control.stop, control.progress,
    )  # fmt: skip
    if status == kernels.STOPPED:
        return None
    if status == kernels.NOT_FINITE:
        raise NotFiniteError("the motion is not finite")
    return Response(
        peak=best[:, 0].copy(),
        rms=np.sqrt(squares.sum(axis=1) / (recorder.total - 1 - recorder.warm)),
        running_rms_max=np.sqrt(running[:, 1] / recorder.window),
        peak_time=(best[:, 1] + recorder.warm) * time_step,
        window_peak=np.ascontiguousarray(peaks[:, :-1].T),
        envelope=envelope,
        history=kept,
    )
