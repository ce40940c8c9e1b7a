"""The compiled loops: modal force of walkers, Newmark integration, measures, envelope.

The only file that uses numba; `dynamics.realisation` checks shapes and types and
calls it. Plain arrays in, results into arrays, a status returned; nothing is
allocated in the time loop.

How the force is made
---------------------
* *Samples.* The load has no content above its highest harmonic, so it is evaluated
  at every second or fourth step only (a "sample"), and the steps between follow
  from the sum over the persons by a twelve-point band-limited rule, at a cost
  that no longer grows with the crowd. `dynamics.step` chooses and states the error.
* *Chunks.* 32 samples, mirrored about their middle: with x the phase from the
  middle, the even part E(x) and the odd part O(x) of the load serve two samples,
  E + O and E - O. Both are Horner polynomials in cos(x) (Chebyshev polynomials
  of the first and second kind), whatever the phases of the harmonics. The lower
  half of a chunk is stored backwards, so no lane is ever reversed.
* *Ordinates.* Read from a fine table at the ends and the middle of a chunk; a
  parabola runs between. Half waves, tables and twist cost the same.
* *Runs.* 512 samples. The phase starts afresh at absolute multiples of a run,
  and all sums run in the order of the persons: bits do not depend on the block.

Indices are `uint64`: signed ones bring wrap-around branches that stop the
vectoriser. Rows have a stride known to the compiler, which lets it see that they
do not overlap.
"""

from __future__ import annotations

import math
import os
import tempfile
from collections.abc import Callable
from typing import Any

import numba
import numpy as np
from numba import njit

HALF = 16
CHUNK = 2 * HALF
CHUNKS = 16
RUN = CHUNK * CHUNKS  # samples
BLOCK_LIMIT = 4096  # samples
SCRATCH = BLOCK_LIMIT  # first column of the scratch chunk of a force row
STRIDE = BLOCK_LIMIT + CHUNK + 24  # of a force row; not a multiple of 4 KiB
TAPS = 12  # samples that one step between is made of
LAG = TAPS // 2  # samples that the rule looks ahead
ROWS = 4  # modes in one pass
HARMONICS = 8
SLOT = 2 * HALF + 2 * CHUNKS  # a person's table of cosines and sines
EVEN_ODD = (2 * HARMONICS + 1) * CHUNKS
ENDS = EVEN_ODD  # ordinates at the ends of the chunks
SHAPE = ENDS + (CHUNKS + 2) * ROWS  # middle, slope, curvature per chunk
WORK = SHAPE + 3 * CHUNKS * ROWS
CARRY = 2  # motion samples kept from the block before
WINDOW_PART = 64  # steps between two bounds of the running RMS
ENVELOPE_PART = 128  # steps between two bounds of the envelope
PARTS = 8  # parts of the envelope that are bounded together first
SUMS = 16
MODES_LIMIT = 64
SCRATCH_SIZE = 64 + ENVELOPE_PART + CARRY
DONE, STOPPED, NOT_FINITE = 0, 1, 2

_U = np.uint64
_HALF = _U(HALF)
_CHUNKS = _U(CHUNKS)
_ROTATION = _U(2 * HALF)
_STRIDE = _U(STRIDE)
_ODD = _U((HARMONICS + 1) * CHUNKS)
_ENDS = _U(ENDS)
_MIDDLE = _U(SHAPE)
_SLOPE = _U(SHAPE + CHUNKS * ROWS)
_CURVE = _U(SHAPE + 2 * CHUNKS * ROWS)
_FAST = {"contract", "nsz"}  # nothing that reorders a sum


def _compiled(**options: Any) -> Callable[[Any], Any]:
    """`njit` with the project's options and a cache that never makes an import fail."""
    settings: dict[str, Any] = {
        "fastmath": _FAST,
        "error_model": "numpy",
        "nogil": True,
        **options,
    }

    def wrap(function: Any) -> Any:
        if os.environ.get("NUMBA_DISABLE_CACHE"):
            return njit(**settings)(function)
        try:
            return njit(cache=True, **settings)(function)
        except RuntimeError:  # no folder that can be written
            numba.config.CACHE_DIR = os.path.join(tempfile.gettempdir(), "crowdsim-kernels")
        try:
            return njit(cache=True, **settings)(function)
        except (RuntimeError, OSError):
            return njit(**settings)(function)

    return wrap


@_compiled(inline="always")
def _unit(turns):
    """Cosine and sine of an angle in turns; by a series, so the same bits on every machine."""
    x = math.pi * (turns - np.rint(turns))  # half the angle, within a quarter turn
    z = x * x
    s = -1.0 / 1307674368000
    s = s * z + 1.0 / 6227020800
    s = s * z - 1.0 / 39916800
    s = s * z + 1.0 / 362880
    s = s * z - 1.0 / 5040
    s = s * z + 1.0 / 120
    s = s * z - 1.0 / 6
    s = x + x * (s * z)
    c = 1.0 / 20922789888000
    c = c * z - 1.0 / 87178291200
    c = c * z + 1.0 / 479001600
    c = c * z - 1.0 / 3628800
    c = c * z + 1.0 / 40320
    c = c * z - 1.0 / 720
    c = c * z + 1.0 / 24
    c = c * z - 0.5
    c = 1.0 + c * z
    return 1.0 - 2.0 * (s * s), 2.0 * (s * c)


@_compiled()
def _powers(table, at, count, c0, s0, c, s):
    """table[at + l] + i table[at + count + l] = (c0 + i s0)(c + i s)^l; gives (c + i s)^count."""
    n = _U(count)
    table[at] = c0
    table[at + n] = s0
    done = 1
    while done < count:
        for l in range(done):
            k = at + _U(l)
            table[k + _U(done)] = table[k] * c - table[k + n] * s
            table[k + n + _U(done)] = table[k + n] * c + table[k] * s
        c, s = c * c - s * s, 2.0 * (c * s)
        done *= 2
    return c, s


@_compiled()
def person_table(table, at, rate):
    """Cosines, sines of the phase in the lanes of a chunk and at the chunks of a run.

    rate: turns per sample.
    """
    c0, s0 = _unit(0.5 * rate)
    c, s = _powers(table, at, HALF, c0, s0, c0 * c0 - s0 * s0, 2.0 * (c0 * s0))
    _powers(table, at + _ROTATION, CHUNKS, 1.0, 0.0, c * c - s * s, 2.0 * (c * s))


@_compiled(inline="always")
def _horner_4(work, table, at, loads, p, c0, s0):
    """Polynomials of the even and odd part of the load in the chunks of a run, to 4 harmonics."""
    a1, a2, a3, a4 = loads[p, 0], loads[p, 1], loads[p, 2], loads[p, 3]
    b1, b2, b3, b4 = loads[p, 8], loads[p, 9], loads[p, 10], loads[p, 11]
    for q in range(CHUNKS):
        k = _U(q)
        t = table[at + _ROTATION + k]
        u = table[at + _ROTATION + _CHUNKS + k]
        c = c0 * t - s0 * u
        s = s0 * t + c0 * u
        c2 = c * c - s * s
        s2 = 2.0 * (c * s)
        c3 = c2 * c - s2 * s
        s3 = s2 * c + c2 * s
        c4 = c2 * c2 - s2 * s2
        s4 = 2.0 * (c2 * s2)
        e1 = a1 * s + b1 * c
        o1 = a1 * c - b1 * s
        e2 = a2 * s2 + b2 * c2
        o2 = a2 * c2 - b2 * s2
        e3 = a3 * s3 + b3 * c3
        o3 = a3 * c3 - b3 * s3
        e4 = a4 * s4 + b4 * c4
        o4 = a4 * c4 - b4 * s4
        work[k] = e4 - e2
        work[_CHUNKS + k] = e1 - 3.0 * e3
        work[_U(2 * CHUNKS) + k] = 2.0 * e2 - 8.0 * e4
        work[_U(3 * CHUNKS) + k] = 4.0 * e3
        work[_U(4 * CHUNKS) + k] = 8.0 * e4
        work[_ODD + k] = o1 - o3
        work[_ODD + _CHUNKS + k] = 2.0 * o2 - 4.0 * o4
        work[_ODD + _U(2 * CHUNKS) + k] = 4.0 * o3
        work[_ODD + _U(3 * CHUNKS) + k] = 8.0 * o4


@_compiled(inline="always")
def _horner_8(work, table, at, loads, p, c0, s0):
    """The same to 8 harmonics."""
    a1, a2, a3, a4 = loads[p, 0], loads[p, 1], loads[p, 2], loads[p, 3]
    a5, a6, a7, a8 = loads[p, 4], loads[p, 5], loads[p, 6], loads[p, 7]
    b1, b2, b3, b4 = loads[p, 8], loads[p, 9], loads[p, 10], loads[p, 11]
    b5, b6, b7, b8 = loads[p, 12], loads[p, 13], loads[p, 14], loads[p, 15]
    for q in range(CHUNKS):
        k = _U(q)
        t = table[at + _ROTATION + k]
        u = table[at + _ROTATION + _CHUNKS + k]
        c = c0 * t - s0 * u
        s = s0 * t + c0 * u
        c2 = c * c - s * s
        s2 = 2.0 * (c * s)
        c3 = c2 * c - s2 * s
        s3 = s2 * c + c2 * s
        c4 = c2 * c2 - s2 * s2
        s4 = 2.0 * (c2 * s2)
        c5 = c4 * c - s4 * s
        s5 = s4 * c + c4 * s
        c6 = c3 * c3 - s3 * s3
        s6 = 2.0 * (c3 * s3)
        c7 = c6 * c - s6 * s
        s7 = s6 * c + c6 * s
        c8 = c4 * c4 - s4 * s4
        s8 = 2.0 * (c4 * s4)
        e1 = a1 * s + b1 * c
        o1 = a1 * c - b1 * s
        e2 = a2 * s2 + b2 * c2
        o2 = a2 * c2 - b2 * s2
        e3 = a3 * s3 + b3 * c3
        o3 = a3 * c3 - b3 * s3
        e4 = a4 * s4 + b4 * c4
        o4 = a4 * c4 - b4 * s4
        e5 = a5 * s5 + b5 * c5
        o5 = a5 * c5 - b5 * s5
        e6 = a6 * s6 + b6 * c6
        o6 = a6 * c6 - b6 * s6
        e7 = a7 * s7 + b7 * c7
        o7 = a7 * c7 - b7 * s7
        e8 = a8 * s8 + b8 * c8
        o8 = a8 * c8 - b8 * s8
        work[k] = e4 - e2 - e6 + e8
        work[_CHUNKS + k] = e1 - 3.0 * e3 + 5.0 * e5 - 7.0 * e7
        work[_U(2 * CHUNKS) + k] = 2.0 * e2 - 8.0 * e4 + 18.0 * e6 - 32.0 * e8
        work[_U(3 * CHUNKS) + k] = 4.0 * e3 - 20.0 * e5 + 56.0 * e7
        work[_U(4 * CHUNKS) + k] = 8.0 * e4 - 48.0 * e6 + 160.0 * e8
        work[_U(5 * CHUNKS) + k] = 16.0 * e5 - 112.0 * e7
        work[_U(6 * CHUNKS) + k] = 32.0 * e6 - 256.0 * e8
        work[_U(7 * CHUNKS) + k] = 64.0 * e7
        work[_U(8 * CHUNKS) + k] = 128.0 * e8
        work[_ODD + k] = o1 - o3 + o5 - o7
        work[_ODD + _CHUNKS + k] = 2.0 * o2 - 4.0 * o4 + 6.0 * o6 - 8.0 * o8
        work[_ODD + _U(2 * CHUNKS) + k] = 4.0 * o3 - 12.0 * o5 + 24.0 * o7
        work[_ODD + _U(3 * CHUNKS) + k] = 8.0 * o4 - 32.0 * o6 + 80.0 * o8
        work[_ODD + _U(4 * CHUNKS) + k] = 16.0 * o5 - 80.0 * o7
        work[_ODD + _U(5 * CHUNKS) + k] = 32.0 * o6 - 192.0 * o8
        work[_ODD + _U(6 * CHUNKS) + k] = 64.0 * o7
        work[_ODD + _U(7 * CHUNKS) + k] = 128.0 * o8


@_compiled(inline="always")
def _blend(work, at, ordinates, k, row, g):
    """work[at + j] = ordinates of four modes a share g of a cell beyond cell k."""
    y0, y1, y2, y3 = ordinates[k], ordinates[k + _U(1)], ordinates[k + _U(2)], ordinates[k + _U(3)]
    k += row
    z0, z1, z2, z3 = ordinates[k], ordinates[k + _U(1)], ordinates[k + _U(2)], ordinates[k + _U(3)]
    work[at] = y0 + g * (z0 - y0)
    work[at + _U(1)] = y1 + g * (z1 - y1)
    work[at + _U(2)] = y2 + g * (z2 - y2)
    work[at + _U(3)] = y3 + g * (z3 - y3)


@_compiled(inline="always")
def _blend_twist(work, at, ordinates, twist, e, k, row, g):
    """The same with offset e times the twist added."""
    y0, y1, y2, y3 = ordinates[k], ordinates[k + _U(1)], ordinates[k + _U(2)], ordinates[k + _U(3)]
    t0, t1, t2, t3 = twist[k], twist[k + _U(1)], twist[k + _U(2)], twist[k + _U(3)]
    k += row
    z0, z1, z2, z3 = ordinates[k], ordinates[k + _U(1)], ordinates[k + _U(2)], ordinates[k + _U(3)]
    w0, w1, w2, w3 = twist[k], twist[k + _U(1)], twist[k + _U(2)], twist[k + _U(3)]
    y0 += e * t0
    y1 += e * t1
    y2 += e * t2
    y3 += e * t3
    z0 += e * w0
    z1 += e * w1
    z2 += e * w2
    z3 += e * w3
    work[at] = y0 + g * (z0 - y0)
    work[at + _U(1)] = y1 + g * (z1 - y1)
    work[at + _U(2)] = y2 + g * (z2 - y2)
    work[at + _U(3)] = y3 + g * (z3 - y3)


@_compiled(inline="always")
def _ordinates(work, ordinates, twist, groups, group, first, last, cell, step, offset):
    """Ordinates of four modes along chunks first..last: middle, slope, curvature of a parabola.

    cell: where the person is at the start of the run, in cells of the table; step: cells per
    chunk; twist may be empty. The four loads and stores stand in one block: then they are one.
    """
    row = _U(groups * ROWS)
    a = _ENDS + _U(first * ROWS)
    if twist.size == 0:
        for q in range(first, last + 1):
            x = cell + step * q
            i = np.int64(x)
            g = x - i
            k = _U((i * groups + group) * ROWS)
            _blend(work, a, ordinates, k, row, g)
            a += _U(ROWS)
        a = _MIDDLE + _U(first * ROWS)
        for q in range(first, last):
            x = cell + step * (q + 0.5)
            i = np.int64(x)
            g = x - i
            k = _U((i * groups + group) * ROWS)
            _blend(work, a, ordinates, k, row, g)
            a += _U(ROWS)
    else:
        for q in range(first, last + 1):
            x = cell + step * q
            i = np.int64(x)
            g = x - i
            k = _U((i * groups + group) * ROWS)
            _blend_twist(work, a, ordinates, twist, offset, k, row, g)
            a += _U(ROWS)
        a = _MIDDLE + _U(first * ROWS)
        for q in range(first, last):
            x = cell + step * (q + 0.5)
            i = np.int64(x)
            g = x - i
            k = _U((i * groups + group) * ROWS)
            _blend_twist(work, a, ordinates, twist, offset, k, row, g)
            a += _U(ROWS)
    for z in range(first * ROWS, last * ROWS):
        k = _U(z)
        begin = work[_ENDS + k]
        end = work[_ENDS + _U(ROWS) + k]
        work[_SLOPE + k] = (end - begin) * (1.0 / CHUNK)
        work[_CURVE + k] = (begin - 2.0 * work[_MIDDLE + k] + end) * (2.0 / (CHUNK * CHUNK))


@_compiled(inline="always")
def _lanes(force, table, at, work, first, last, column, rows, harmonics):
    """Adds chunks first..last of a run to the force rows, whose column is the start of the run.

    rows (2 or 4) and harmonics (4 or 8) are constants of the compiled variants below.
    """
    for q in range(first, last):
        k = _U(q)
        m = _MIDDLE + _U(q * ROWS)
        r = _SLOPE + _U(q * ROWS)
        v = _CURVE + _U(q * ROWS)
        e0 = work[k]
        e1 = work[_CHUNKS + k]
        e2 = work[_U(2 * CHUNKS) + k]
        e3 = work[_U(3 * CHUNKS) + k]
        e4 = work[_U(4 * CHUNKS) + k]
        e5 = work[_U(5 * CHUNKS) + k]
        e6 = work[_U(6 * CHUNKS) + k]
        e7 = work[_U(7 * CHUNKS) + k]
        e8 = work[_U(8 * CHUNKS) + k]
        o0 = work[_ODD + k]
        o1 = work[_ODD + _CHUNKS + k]
        o2 = work[_ODD + _U(2 * CHUNKS) + k]
        o3 = work[_ODD + _U(3 * CHUNKS) + k]
        o4 = work[_ODD + _U(4 * CHUNKS) + k]
        o5 = work[_ODD + _U(5 * CHUNKS) + k]
        o6 = work[_ODD + _U(6 * CHUNKS) + k]
        o7 = work[_ODD + _U(7 * CHUNKS) + k]
        m0, m1, m2, m3 = work[m], work[m + _U(1)], work[m + _U(2)], work[m + _U(3)]
        r0, r1, r2, r3 = work[r], work[r + _U(1)], work[r + _U(2)], work[r + _U(3)]
        v0, v1, v2, v3 = work[v], work[v + _U(1)], work[v + _U(2)], work[v + _U(3)]
        for l in range(HALF):
            i = at + _U(l)
            c = table[i]
            s = table[i + _HALF]
            if harmonics == 4:
                even = e0 + c * (e1 + c * (e2 + c * (e3 + c * e4)))
                odd = s * (o0 + c * (o1 + c * (o2 + c * o3)))
            else:
                high = e4 + c * (e5 + c * (e6 + c * (e7 + c * e8)))
                even = e0 + c * (e1 + c * (e2 + c * (e3 + c * high)))
                high = o4 + c * (o5 + c * (o6 + c * o7))
                odd = s * (o0 + c * (o1 + c * (o2 + c * (o3 + c * high))))
            after = even + odd
            before = even - odd
            t = l + 0.5
            w = t * t
            p = column + _U(q * CHUNK + l)
            n = p + _HALF
            y = m0 + v0 * w
            z = r0 * t
            force[p] += before * (y - z)
            force[n] += after * (y + z)
            y = m1 + v1 * w
            z = r1 * t
            force[p + _STRIDE] += before * (y - z)
            force[n + _STRIDE] += after * (y + z)
            if rows == 4:
                y = m2 + v2 * w
                z = r2 * t
                force[p + _U(2 * STRIDE)] += before * (y - z)
                force[n + _U(2 * STRIDE)] += after * (y + z)
                y = m3 + v3 * w
                z = r3 * t
                force[p + _U(3 * STRIDE)] += before * (y - z)
                force[n + _U(3 * STRIDE)] += after * (y + z)


@_compiled()
def _lanes_2_4(force, table, at, work, first, last, column):
    _lanes(force, table, at, work, first, last, column, 2, 4)


@_compiled()
def _lanes_4_4(force, table, at, work, first, last, column):
    _lanes(force, table, at, work, first, last, column, 4, 4)


@_compiled()
def _lanes_4_8(force, table, at, work, first, last, column):
    _lanes(force, table, at, work, first, last, column, 4, 8)


@_compiled(inline="always")
def _chunks(force, table, at, work, first, last, column, two, many):
    if many:
        _lanes_4_8(force, table, at, work, first, last, column)
    elif two:
        _lanes_2_4(force, table, at, work, first, last, column)
    else:
        _lanes_4_4(force, table, at, work, first, last, column)


@_compiled()
def _part_chunk(force, table, at, work, q, start, stop, column, row, two, many):
    """Adds samples start..stop (counted from the run) of chunk q, by way of the scratch chunk."""
    rows = 2 if two and not many else 4
    scratch = row + _U(SCRATCH)
    for j in range(rows):
        for l in range(CHUNK):
            force[scratch + _U(j * STRIDE + l)] = 0.0
    _chunks(force, table, at, work, q, q + 1, scratch - _U(q * CHUNK), two, many)
    for l in range(CHUNK):
        i = q * CHUNK + (l if l >= HALF else HALF - 1 - l)
        if start <= i < stop:
            for j in range(rows):
                k = _U(j * STRIDE + l)
                force[column + _U(q * CHUNK) + k] += force[scratch + k]


@_compiled(inline="always")
def _person_run(
    force, table, at, work, ordinates, twist, modes, column, n, start, stop, persons, numbers, loads, p, many
):
    """Adds person p's force over samples start..stop of the run that begins at sample n."""
    person = persons[p, 0]
    rate = numbers[p, 1]
    step = numbers[p, 3]
    c0, s0 = _unit(numbers[p, 0] + rate * (n + (HALF - 0.5) - person))
    if many:
        _horner_8(work, table, at, loads, p, c0, s0)
    else:
        _horner_4(work, table, at, loads, p, c0, s0)
    begin = start - n
    end = stop - n
    first = begin // CHUNK
    last = (end + CHUNK - 1) // CHUNK
    full = first if begin == first * CHUNK else first + 1
    rest = last if end == last * CHUNK else last - 1
    groups = (modes + ROWS - 1) // ROWS
    cell = numbers[p, 2] + step * (n - 0.5 - person)
    for group in range(groups):
        _ordinates(work, ordinates, twist, groups, group, first, last, cell, step * CHUNK, numbers[p, 4])
        row = _U(group * ROWS * STRIDE)
        two = modes - group * ROWS <= 2
        if full < rest:
            _chunks(force, table, at, work, full, rest, row + column, two, many)
        if full > first:
            _part_chunk(force, table, at, work, first, begin, end, row + column, row, two, many)
        if rest < last and (full == first or last - 1 > first):
            _part_chunk(force, table, at, work, last - 1, begin, end, row + column, row, two, many)


@_compiled()
def force_block(force, table, work, ordinates, twist, modes, n, samples, low, high, persons, numbers, loads, many):
    """Force rows over samples n..n + samples from persons low..high.

    persons[p]: first sample, end; numbers[p]: phase at the first sample [turns], turns per sample,
    place there [cells], cells per sample, offset [m]; loads[p]: amplitudes x cos, x sin.
    """
    mask = table.size // SLOT - 1
    for row in range((modes + ROWS - 1) // ROWS * ROWS):
        for i in range(samples):
            force[_U(row * STRIDE + i)] = 0.0
    for m in range(n, n + samples, RUN):
        column = _U(m - n)
        for p in range(low, high):
            start = max(persons[p, 0], m)
            stop = min(persons[p, 1], m + RUN)
            if start < stop:
                at = _U((p & mask) * SLOT)
                _person_run(
                    force, table, at, work, ordinates, twist, modes, column, m, start, stop, persons, numbers,
                    loads, p, many
                )  # fmt: skip


@_compiled()
def between_block(force, rows, between, weights, modes, samples):
    """Force at the samples in natural order and at the steps between, `LAG` samples late.

    rows: [mode, TAPS + BLOCK_LIMIT], the last TAPS samples first; between: [mode, step between,
    BLOCK_LIMIT]; weights: [step between, TAPS].
    """
    for m in range(modes):
        e = rows[m]
        for l in range(TAPS):
            e[l] = e[samples + l]
        for q in range(samples // CHUNK):
            a = _U(m * STRIDE + q * CHUNK)
            b = TAPS + q * CHUNK
            for l in range(HALF):
                e[b + HALF - 1 - l] = force[a + _U(l)]
            for l in range(HALF):
                e[b + HALF + l] = force[a + _HALF + _U(l)]
        for j in range(weights.shape[0]):
            o = between[m, j]
            w = weights[j]
            w0, w1, w2, w3, w4, w5 = w[0], w[1], w[2], w[3], w[4], w[5]
            w6, w7, w8, w9, wa, wb = w[6], w[7], w[8], w[9], w[10], w[11]
            for i in range(samples):
                k = _U(i)
                o[k] = (
                    w0 * e[k + _U(1)]
                    + w1 * e[k + _U(2)]
                    + w2 * e[k + _U(3)]
                    + w3 * e[k + _U(4)]
                    + w4 * e[k + _U(5)]
                    + w5 * e[k + _U(6)]
                    + w6 * e[k + _U(7)]
                    + w7 * e[k + _U(8)]
                    + w8 * e[k + _U(9)]
                    + w9 * e[k + _U(10)]
                    + wa * e[k + _U(11)]
                    + wb * e[k + _U(12)]
                )


@_compiled()
def newmark_block(rows, between, motion, state, step, samples):
    """Accelerations of the modes over the steps of a block, two modes side by side.

    state[mode]: displacement, velocity, force of the step before; step[mode]: see
    `newmark.step_coefficients`. motion: [mode, CARRY + steps], the last CARRY steps first.
    """
    extra = between.shape[1]
    steps = samples * (1 + extra)
    for m in range(0, motion.shape[0], 2):
        x, y = motion[m], motion[m + 1]
        for l in range(CARRY):
            x[l] = x[steps + l]
            y[l] = y[steps + l]
        u, v, f = state[m, 0], state[m, 1], state[m, 2]
        p, q, g = state[m + 1, 0], state[m + 1, 1], state[m + 1, 2]
        a = step[m]
        b = step[m + 1]
        a0, a1, a2, a3, a4, a5, a6, a7, a8, a9, aa = a[0], a[1], a[2], a[3], a[4], a[5], a[6], a[7], a[8], a[9], a[10]
        b0, b1, b2, b3, b4, b5, b6, b7, b8, b9, bb = b[0], b[1], b[2], b[3], b[4], b[5], b[6], b[7], b[8], b[9], b[10]
        n = _U(CARRY)
        for i in range(samples):
            k = _U(i)
            h = rows[m, k + _U(LAG)]
            j = rows[m + 1, k + _U(LAG)]
            u, v = a0 * u + (a1 * v + (a2 * f + a3 * h)), a5 * v + (a4 * u + (a6 * f + a7 * h))
            p, q = b0 * p + (b1 * q + (b2 * g + b3 * j)), b5 * q + (b4 * p + (b6 * g + b7 * j))
            x[n] = h * a8 - a9 * v - aa * u
            y[n] = j * b8 - b9 * q - bb * p
            f, g = h, j
            n += _U(1)
            for t in range(extra):
                h = between[m, _U(t), k]
                j = between[m + 1, _U(t), k]
                u, v = a0 * u + (a1 * v + (a2 * f + a3 * h)), a5 * v + (a4 * u + (a6 * f + a7 * h))
                p, q = b0 * p + (b1 * q + (b2 * g + b3 * j)), b5 * q + (b4 * p + (b6 * g + b7 * j))
                x[n] = h * a8 - a9 * v - aa * u
                y[n] = j * b8 - b9 * q - bb * p
                f, g = h, j
                n += _U(1)
        state[m, 0], state[m, 1], state[m, 2] = u, v, f
        state[m + 1, 0], state[m + 1, 1], state[m + 1, 2] = p, q, g


@_compiled(inline="always")
def _vertex(a, b, c):
    """Largest absolute value of the parabola through three samples, if b is a local extremum; else |b|."""
    s = 1.0 if b > 0 else -1.0
    p = s * (b - a)
    q = s * (b - c)
    if p >= 0.0 and q >= 0.0 and p + q > 0.0:
        return s * b + (p - q) * (p - q) / (8.0 * (p + q))
    return s * b


@_compiled(inline="always")
def _combine(y, at, count, shape, motion, first):
    """y[at + i] = sum over modes of shape x motion[:, first + i]."""
    f = shape[0]
    x = motion[0]
    for i in range(count):
        y[_U(at + i)] = f * x[_U(first + i)]
    for m in range(1, shape.size):
        f = shape[m]
        x = motion[m]
        if f != 0.0:
            for i in range(count):
                y[_U(at + i)] += f * x[_U(first + i)]


@_compiled(inline="always")
def _sum(sums):
    total = 0.0
    for l in range(SUMS):
        total += sums[l]
    return total


@_compiled()
def _largest(x, first, count):
    """Largest |x| over x[first : first + count], and largest |x[i] - x[i - 1]| there."""
    k = _U(first)
    last = x[k - _U(1)]
    a = b = c = d = 0.0
    p = q = r = s = 0.0
    for _ in range(count // 4):
        v, w, y, z = x[k], x[k + _U(1)], x[k + _U(2)], x[k + _U(3)]
        h, i, j, l = abs(v - last), abs(w - v), abs(y - w), abs(z - y)
        last = z
        v, w, y, z = abs(v), abs(w), abs(y), abs(z)
        a = v if v > a else a
        b = w if w > b else b
        c = y if y > c else c
        d = z if z > d else d
        p = h if h > p else p
        q = i if i > q else q
        r = j if j > r else r
        s = l if l > s else s
        k += _U(4)
    top = max(max(a, b), max(c, d))
    jump = max(max(p, q), max(r, s))
    for _ in range(count % 4):
        top = max(top, abs(x[k]))
        jump = max(jump, abs(x[k] - x[k - _U(1)]))
        k += _U(1)
    return top, jump


@_compiled()
def point_block(y, keep, begin, end, first, final, window, segment, sums, lanes, running, peaks, best):
    """Peak, sum of squares and largest running sum of one point over steps begin..end of a block.

    y: acceleration, with `keep` > window steps of the block before in front; first: the first
    observed step, counted like begin. window: steps of the running RMS; segment: steps of the
    comfort window. sums: [SUMS] squares by step modulo SUMS; lanes: [2 SUMS] scratch; running:
    sum over the last window, largest (ends counted half); peaks: a value a segment, the rest of
    the record last; best: peak, its step from the first observed one, half the squares of the
    first step and of `final`, the last one.
    """
    last = peaks.size - 1
    for i in (first, final):
        if begin <= i < end:
            best[2] += 0.5 * y[keep + i] * y[keep + i]
    part = begin
    while part < end:
        stop = min((part // WINDOW_PART + 1) * WINDOW_PART, end)
        whole = stop - part == WINDOW_PART
        total = 0.0
        gone = 0.0
        base = keep + part
        if whole:
            for l in range(2 * SUMS):
                lanes[_U(l)] = 0.0
            for i in range(0, WINDOW_PART, SUMS):
                k = _U(base + i)
                o = _U(base + i - window)
                for l in range(SUMS):
                    a = y[k + _U(l)]
                    b = y[o + _U(l)]
                    lanes[_U(l)] += a * a
                    lanes[_U(l + SUMS)] += b * b
            for l in range(SUMS):
                total += lanes[_U(l)]
                gone += lanes[_U(l + SUMS)]
                sums[_U(l)] += lanes[_U(l)]
        else:
            for i in range(part, stop):
                sums[i % SUMS] += y[keep + i] * y[keep + i]
        if whole and part >= first + window and running[0] + total <= running[1]:
            running[0] += total - gone
        else:
            r = running[0]
            for i in range(part, stop):
                z = y[keep + i] * y[keep + i]
                if i >= first + window:
                    b = y[keep + i - window]
                    n = r + (z - b * b)
                    running[1] = max(running[1], 0.5 * (r + n))
                    r = n
                else:
                    r += z
            running[0] = r
        early = 1 if part > first else 0
        count = stop - part + early
        top, jump = _largest(y, base - early, count)
        top += 0.125 * jump
        a = min((part - first) // segment, last)
        b = min((stop - 1 - first) // segment, last)
        if top > min(peaks[a], peaks[b]) or top > best[0]:
            for i in range(part, stop):
                k = min((i - first) // segment, last)
                v = abs(y[keep + i])
                if v > peaks[k]:
                    peaks[k] = v
                if v > best[0]:
                    best[0] = v
                    best[1] = i - first
                if i - 1 > first:
                    k = min((i - 1 - first) // segment, last)
                    if 1.25 * abs(y[keep + i - 1]) > peaks[k]:
                        v = _vertex(y[keep + i - 2], y[keep + i - 1], y[keep + i])
                        if v > peaks[k]:
                            peaks[k] = v
                        if v > best[0]:
                            best[0] = v
                            best[1] = i - 1 - first
        part = stop


@_compiled()
def deck_block(motion, shapes, envelope, ends, most, peaks, begin, end, first, segment, y, tops):
    """Largest |acceleration| at every station, and anywhere in each comfort window, over steps begin..end.

    shapes: [station, mode], a direction after the other; envelope: [station]; ends: [direction] one
    past its last station; most: [direction, mode] largest |ordinate|; peaks: [direction, window], the
    rest of the record last. Parts of 128 steps, and before them eight parts together, are left out
    where the sum over the modes of |ordinate| x (largest |motion| + 1/8 of its largest jump), which no
    sample and no vertex of a parabola can exceed, is not above what stands: exact. A vertex belongs
    to the window of its middle step, as at a point. tops: [PARTS + 1, mode] scratch.
    """
    last = peaks.shape[1] - 1
    outer = begin
    while outer < end:
        limit = min((outer // (PARTS * ENVELOPE_PART) + 1) * PARTS * ENVELOPE_PART, end)
        k = min((outer - first) // segment, last)
        if k < last:
            limit = min(limit, first + (k + 1) * segment)
        if outer > first and outer == first + k * segment:
            _close_window(motion, shapes, ends, peaks, outer, first, k - 1)
        _tops(motion, tops, outer, limit, first)
        for s in range(envelope.size):
            if _bound(shapes[s], tops[PARTS]) > envelope[s]:
                part = outer
                number = 0
                while part < limit:
                    stop = min((part // ENVELOPE_PART + 1) * ENVELOPE_PART, limit)
                    if _bound(shapes[s], tops[number]) > envelope[s]:
                        early = 1 if part > first else 0
                        envelope[s] = _station(y, shapes[s], motion, part, stop, early, first, envelope[s])
                    part = stop
                    number += 1
        begins = np.int64(0)
        for d in range(ends.size):
            if k == 0:  # all so far is the first window's
                for s in range(begins, ends[d]):
                    peaks[d, k] = max(peaks[d, k], envelope[s])
            elif _bound(most[d], tops[PARTS]) > peaks[d, k]:
                _window(motion, shapes, most[d], begins, ends[d], peaks[d], k, outer, limit, first, segment, y, tops)
            begins = ends[d]
        outer = limit


@_compiled(inline="always")
def _bound(shape, top):
    """What no sample and no vertex can exceed."""
    bound = 0.0
    for m in range(shape.size):
        bound += abs(shape[m]) * top[m]
    return bound


@_compiled()
def _tops(motion, tops, outer, limit, first):
    """Largest |motion| + 1/8 of its largest jump, by part, and over all parts last."""
    for m in range(motion.shape[0]):
        x = motion[m]
        whole = 0.0
        part = outer
        number = 0
        while part < limit:
            stop = min((part // ENVELOPE_PART + 1) * ENVELOPE_PART, limit)
            early = 1 if part > first else 0
            a, jump = _largest(x, CARRY + part - early, stop - part + early)
            a += 0.125 * jump
            tops[number, m] = a
            whole = max(whole, a)
            part = stop
            number += 1
        tops[PARTS, m] = whole


@_compiled()
def _window(motion, shapes, most, begins, ends, peaks, k, outer, limit, first, segment, y, tops):
    """Brings peaks[k] up to the largest |acceleration| at stations begins..ends over steps outer..limit."""
    part = outer
    number = 0
    while part < limit:
        stop = min((part // ENVELOPE_PART + 1) * ENVELOPE_PART, limit)
        if _bound(most, tops[number]) > peaks[k]:
            border = part > first and part == first + k * segment  # the step before is another window's
            early = 1 if part > first and not border else 0
            least = part - 1 if border else first
            # the station that can have most comes first: after it few can beat what stands
            high = -1.0
            likely = begins
            for s in range(begins, ends):
                bound = _bound(shapes[s], tops[number])
                if bound > high:
                    high = bound
                    likely = s
            if high > peaks[k]:
                peaks[k] = _station(y, shapes[likely], motion, part, stop, early, least, peaks[k])
                for s in range(begins, ends):
                    if _bound(shapes[s], tops[number]) > peaks[k]:
                        peaks[k] = _station(y, shapes[s], motion, part, stop, early, least, peaks[k])
        part = stop
        number += 1


@_compiled()
def _close_window(motion, shapes, ends, peaks, part, first, k):
    """Vertices whose middle is the step before `part`, the last of window k: it needed the next sample."""
    if part - 1 <= first:
        return
    station = 0
    for d in range(ends.size):
        while station < ends[d]:
            a = b = c = 0.0
            for m in range(shapes.shape[1]):
                f = shapes[station, m]
                a += f * motion[m, part]
                b += f * motion[m, part + 1]
                c += f * motion[m, part + 2]
            peaks[d, k] = max(peaks[d, k], _vertex(a, b, c))
            station += 1


@_compiled()
def _station(y, shape, motion, part, stop, early, least, best):
    """The larger of `best` and the largest |acceleration| over steps part - early..stop at one station.

    Vertices count whose middle step is after `least`, from the step before `part` on.
    """
    count = stop - part + CARRY
    _combine(y, 0, count, shape, motion, part)
    at = CARRY - early
    top, jump = _largest(y, at, count - at)
    if top + 0.125 * jump <= best:
        return best
    best = max(best, top)
    below = best - 0.125 * jump
    for i in range(CARRY, count):
        if abs(y[i - 1]) >= below and part + i - 3 > least:
            best = max(best, _vertex(y[i - 2], y[i - 1], y[i]))
    return best


@_compiled()
def realisation(
    persons, numbers, loads, many, ordinates, twist, modes, step, points, stations,
    first_sample, last_sample, total, warm, window, segment, block, weights, history, history_start,
    force, table, work, rows, between, motion, state, y, scratch, tops,
    peaks, squares, running, best, envelope, ends, most, deck_peaks, stop, progress,
):  # fmt: skip
    """Samples first..last of one realisation in blocks: force, motion, measures.

    All that must outlast the call is in the arrays. Gives DONE, STOPPED or NOT_FINITE.
    """
    factor = 1 + weights.shape[0]
    steps = factor * block
    keep = y.shape[1] - steps
    mask = table.size // SLOT - 1
    count = persons.shape[0]
    lanes = scratch[:64]
    low = np.int64(0)  # typed: a bare nought would compile the callees twice
    high = np.int64(0)
    n = np.int64(first_sample)
    while n < last_sample and factor * (n - LAG) < total:
        if stop[0] != 0:
            return STOPPED
        while high < count and persons[high, 0] < n + block:
            person_table(table, _U((high & mask) * SLOT), numbers[high, 1])
            high += 1
        while low < high and persons[low, 1] <= n:
            low += 1
        force_block(force, table, work, ordinates, twist, modes, n, block, low, high, persons, numbers, loads, many)
        between_block(force, rows, between, weights, modes, block)
        newmark_block(rows, between, motion, state, step, block)
        zero = factor * (n - LAG)  # the step at which this block begins
        begin = max(0, warm - zero)
        end = min(steps, total - zero)
        for q in range(points.shape[0]):
            row = y[q]
            for i in range(keep):
                row[i] = row[i + steps]
            _combine(row, keep, steps, points[q], motion, CARRY)
            for i in range(max(0, history_start - zero), min(end, history_start + history.shape[0] - zero)):
                history[zero + i - history_start, q] = row[keep + i]
            if begin < end:
                point_block(
                    row, keep, begin, end, warm - zero, total - 1 - zero, window, segment, squares[q], lanes,
                    running[q], peaks[q], best[q]
                )  # fmt: skip
        if begin < end:
            deck_block(
                motion, stations, envelope, ends, most, deck_peaks, begin, end, warm - zero, segment, scratch[64:], tops
            )  # fmt: skip
        for m in range(modes):
            if not math.isfinite(state[m, 0]):
                return NOT_FINITE
        n += block
        progress[0] += steps
    return DONE
