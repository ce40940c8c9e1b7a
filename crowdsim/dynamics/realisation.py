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
FASTEST = 18.1  # m/s: the largest pace x step length that a scenario can draw
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

    points : [point, mode]; stations : [station, mode] ordinates, a direction after the other
    total : steps, step 0 at time 0; warm : first observed step
    window : steps of the running RMS; segment : steps of the comfort window
    directions : stations in each direction; empty: all in one
    """

    points: Floats
    stations: Floats
    total: int
    warm: int
    window: int
    segment: int
    directions: tuple[int, ...] = ()

    @property
    def segments(self) -> int:
        """Whole comfort windows in the observed time."""
        return (self.total - 1 - self.warm) // self.segment


@dataclass(frozen=True)
class Response:
    """What one realisation gives.

    peak, rms, running_rms_max, peak_time : [point] (m/s2; s from time 0)
    window_peak : [window, point]; envelope : [station]; deck_window_peak : [window, direction], the
    largest anywhere; history : [step, point] or empty
    """

    peak: Floats
    rms: Floats
    running_rms_max: Floats
    peak_time: Floats
    window_peak: Floats
    envelope: Floats
    deck_window_peak: Floats
    history: Floats


@dataclass
class Control:
    """Shared with the kernel while it runs: stop at the next block; samples done so far."""

    stop: NDArray[np.uint8] = field(default_factory=lambda: np.zeros(1, np.uint8))
    progress: NDArray[np.int64] = field(default_factory=lambda: np.zeros(1, np.int64))


class NotFiniteError(ArithmeticError):
    """The motion of a realisation grew beyond the numbers."""


class Workspace:
    """Work arrays that one thread uses for one realisation after the other.

    Fresh arrays of this size would be mapped and unmapped by the system every time, which stalls
    the other threads of the process.
    """

    def __init__(self) -> None:
        self._arrays: dict[str, Floats] = {}

    def zeros(self, name: str, *shape: int) -> Floats:
        """The array called `name`, all nought, from the start of a cache line."""
        count = int(np.prod(shape))
        if name not in self._arrays or self._arrays[name].size < count:
            self._arrays[name] = aligned(count)
        view = self._arrays[name][:count].reshape(shape)
        view[...] = 0.0
        return view


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


def _rows(
    passages: Passages, deck: Deck, sample: float, begin: int, end: int
) -> tuple[NDArray[np.int64], Floats, Floats]:
    """Kernel tables of the passages that touch samples begin..end, in the order of their first sample."""
    enter = np.ceil(passages.enter / sample - 1e-9).astype(np.int64)
    leave = np.floor(passages.leave / sample + 1e-9).astype(np.int64) + 1
    order = np.flatnonzero((enter < leave) & (enter < end) & (leave > begin))
    order = order[np.argsort(enter[order], kind="stable")]
    enter, leave = enter[order], leave[order]
    late = enter * sample - passages.enter[order]
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
    return np.ascontiguousarray(np.stack([enter, leave], axis=1)), numbers, loads


def _slots(rows: NDArray[np.int64], begin: int, end: int, block: int) -> int:
    """A power of two that holds everybody between the first not yet gone and the last to come in a block."""
    if rows.shape[0] == 0:
        return 1
    starts = np.arange(begin, end, block)
    high = np.searchsorted(rows[:, 0], starts + block, side="left")
    low = np.searchsorted(np.maximum.accumulate(rows[:, 1]), starts, side="right")
    most = int(np.max(high - low, initial=1))
    return 1 << (max(most, 1) - 1).bit_length()


class Realisation:
    """A realisation on its way: `advance` as far as persons are known, then `response`.

    Parameters
    ----------
    step : [mode, 11] from `newmark.step_coefficients`, driven modes only
    history : steps [from, to) whose acceleration is kept
    factor : steps in a sample of the force (1, 2 or 4), see `step.choose`
    block : samples worked on at a time, a multiple of 512; changes no bit
    workspace : used by this realisation alone until its response is there

    Raises ValueError for arrays that do not fit each other.
    """

    def __init__(
        self,
        deck: Deck,
        step: Floats,
        recorder: Recorder,
        time_step: float,
        *,
        history: tuple[int, int] | None = None,
        control: Control | None = None,
        factor: int = 4,
        block: int = BLOCK,
        workspace: Workspace | None = None,
    ):
        modes = deck.modes
        if step.shape != (modes, 11):
            raise ValueError(f"step: {step.shape}, not {(modes, 11)}")
        for name in ("points", "stations"):
            if getattr(recorder, name).shape[1:] != (modes,):
                raise ValueError(f"{name}: one ordinate for each of the {modes} driven modes")
        directions = recorder.directions or (recorder.stations.shape[0],)
        if sum(directions) != recorder.stations.shape[0]:
            raise ValueError(f"directions: {directions} for {recorder.stations.shape[0]} stations")
        if block % RUN or not 0 < block <= BLOCK_LIMIT:
            raise ValueError(f"block: a multiple of {RUN} up to {BLOCK_LIMIT}, not {block}")
        if not 1 <= modes <= kernels.MODES_LIMIT:
            raise ValueError(f"1 to {kernels.MODES_LIMIT} driven modes, not {modes}")
        self.deck, self.recorder, self.time_step = deck, recorder, time_step
        self.factor, self.block = factor, block
        self.control = control or Control()
        self.samples = -(-recorder.total // factor) + kernels.LAG
        self.sample = 0
        pair = modes + modes % 2

        def padded(values: Floats, axis: int) -> Floats:
            shape = list(values.shape)
            shape[axis] = pair
            out = np.zeros(shape)
            out[: values.shape[0], : values.shape[1]] = values
            return out

        points = recorder.points.shape[0]
        begin, stop = history or (0, 0)
        steps = factor * block
        self._step, self._points = padded(step, 0), padded(recorder.points, 1)
        self._stations, self._weights = padded(recorder.stations, 1), between_weights(factor)
        self._history, self._history_start = np.zeros((max(stop - begin, 0), points)), begin
        zeros = (workspace or Workspace()).zeros
        self._zeros = zeros
        self._force, self._work = zeros("force", -(-modes // ROWS) * ROWS * STRIDE), zeros("work", WORK)
        self._rows, self._between = zeros("rows", pair, TAPS + block), zeros("between", pair, factor - 1, block)
        self._motion, self._state = zeros("motion", pair, CARRY + steps), np.zeros((pair, 3))
        self._y = zeros("y", points, recorder.window + 2 + steps)
        self._scratch, self._tops = zeros("scratch", SCRATCH_SIZE), np.zeros((kernels.PARTS + 1, pair))
        self._peaks, self._squares = np.zeros((points, recorder.segments + 1)), np.zeros((points, SUMS))
        self._running, self._best = np.zeros((points, 2)), np.zeros((points, 3))
        self._envelope = np.zeros(recorder.stations.shape[0])
        self._ends = np.cumsum(np.array(directions, dtype=np.int64))
        parts = np.split(np.abs(self._stations), self._ends[:-1])
        self._most = np.array([part.max(axis=0) for part in parts])
        self._deck = np.zeros((len(directions), recorder.segments + 1))

    def advance(self, passages: Passages, until: int) -> bool:
        """Goes on to sample `until`, a multiple of `BLOCK_LIMIT` or the last.

        passages : all that touch the samples from here to `until`. False where `control` stopped it.
        Raises ValueError for passages that do not fit, NotFiniteError for a motion that is not finite.
        """
        until = min(until, self.samples)
        if passages.cosine.shape[1] > HARMONICS:
            raise ValueError(f"at most {HARMONICS} harmonics, not {passages.cosine.shape[1]}")
        rows, numbers, loads = _rows(passages, self.deck, self.factor * self.time_step, self.sample, until)
        if numbers.size and np.max(np.abs(numbers[:, 3])) * CHUNK + 1 > self.deck.before:
            raise ValueError(f"a person faster than {FASTEST} m/s")
        r = self.recorder
        status = kernels.realisation(
            rows, numbers, loads, bool(passages.cosine.shape[1] > 4), self.deck.vertical, self.deck.twist,
            self.deck.modes, self._step, self._points, self._stations,
            self.sample, until, r.total, r.warm, r.window, r.segment, self.block, self._weights,
            self._history, self._history_start,
            self._force, self._zeros("table", _slots(rows, self.sample, until, self.block) * SLOT), self._work,
            self._rows, self._between, self._motion, self._state, self._y, self._scratch, self._tops,
            self._peaks, self._squares, self._running, self._best, self._envelope,
            self._ends, self._most, self._deck, self.control.stop, self.control.progress,
        )  # fmt: skip
        if status == kernels.NOT_FINITE:
            raise NotFiniteError("the motion is not finite")
        self.sample = until
        return bool(status != kernels.STOPPED)

    def response(self) -> Response:
        """The measures, once the last sample is reached."""
        if self.sample < self.samples:
            raise ValueError(f"at sample {self.sample} of {self.samples}")
        r = self.recorder
        if not np.all(np.isfinite(self._envelope)) or not np.all(np.isfinite(self._best)):
            raise NotFiniteError("the motion is not finite")

        def windows(peaks: Floats) -> Floats:
            whole, rest = peaks[:, :-1].T.copy(), peaks[:, -1]
            if r.segments and (r.total - 1 - r.warm) % r.segment == 0:
                whole[-1] = np.maximum(whole[-1], rest)  # the last step of all ends the last window
            return whole

        return Response(
            peak=self._best[:, 0].copy(),
            rms=np.sqrt((self._squares.sum(axis=1) - self._best[:, 2]) / (r.total - 1 - r.warm)),
            running_rms_max=np.sqrt(self._running[:, 1] / r.window),
            peak_time=(self._best[:, 1] + r.warm) * self.time_step,
            window_peak=windows(self._peaks),
            envelope=self._envelope,
            deck_window_peak=windows(self._deck),
            history=self._history,
        )


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
    """A whole realisation whose passages are all known; None where `control` stopped it.

    Parameters and errors as `Realisation`.
    """
    whole = Realisation(deck, step, recorder, time_step, history=history, control=control, factor=factor, block=block)
    return whole.response() if whole.advance(passages, whole.samples) else None
