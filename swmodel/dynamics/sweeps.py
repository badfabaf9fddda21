"""All stages of a step in one pass over bands of rows, and many steps a call.

Stage s runs one row behind stage s - 1; the states between stages live in rolling buffers of a few rows. Each band of
rows (one a thread) recomputes its overlap, so the bits depend neither on the number of bands nor on the pass. Measured
against three sweeps over whole fields: 0.64 to 0.77 of the time from 512 x 512 up, since each field is read and written
once a step. Row j of any set lies at ``(j + H) % rows``: a whole field never wraps, a rolling one does.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numba import njit, prange, types
from numba.extending import overload

from ..grid.domain import HALO_Y as H
from .compilation import INLINED, OPTIONS, U8, row_jit
from .edges import edge_columns, edge_rows, periodic_rows
from .kernels import row_centres, row_corners, row_gather, row_update

ROW_BUFFERS = 10  # a stage: q 3, V 3, U 2, B 2
GATHER_ROWS = 3  # base rows of the last stage of rk4
ROLLING_ROWS = 5  # four stages apart, and the ghost row that a wall adds


class Setup(NamedTuple):
    """Everything a kernel needs, flat: prange passes a NamedTuple of numbers, arrays and None, but none within it.

    A field is a number, a column, an array with halo, or None where the option is off; the types are the configuration.
    """

    stages: Any
    """[stage, (blend, weight)], of the fields' type."""
    dt: Any
    rx: Any
    """1/dx"""
    ry: Any
    """1/dy"""
    gravity: Any
    west: int
    """0 periodic, 1 wall with free slip, -1 wall without slip"""
    east: int
    south: int
    north: int
    nx: int
    ny: int
    gathers: int
    """1 where the last stage starts from the mean of the earlier ones (rk4): a run-time number, to compile less"""
    depth: Any
    """number, or field at centres with halo"""
    coriolis: Any
    """column, or field at corners with halo"""
    linear: Any = None
    """None, or 1"""


def row(x, r):
    """Row `r` of a field, value `r` of a column; a number is itself."""
    return x[r] if isinstance(x, np.ndarray) else x


@overload(row, **INLINED)
def _row(x, r):
    if isinstance(x, types.Array):
        return lambda x, r: x[r]
    return lambda x, r: x


def work_rows(stages: int) -> int:
    """Rows of workspace that one band needs."""
    return stages * (ROW_BUFFERS + 3 * ROLLING_ROWS) + GATHER_ROWS


@njit(**OPTIONS)
def corners(buffer, y, j, m):
    """q/24 into buffer[0:3] and V into buffer[3:6], row j."""
    r = j + H
    J = r % y.shape[1]
    S = (r - 1) % y.shape[1]
    k = (r + 1) % 3
    row_corners(
        buffer[k], buffer[3 + k], y[0, J], y[0, S], y[1, J], y[2, J], y[2, S], row(m.depth, r), row(m.depth, r - 1),
        row(m.coriolis, r), m.linear, m.rx, m.ry, m.nx,
    )  # fmt: skip


@njit(**OPTIONS)
def centres(buffer, y, j, m):
    """U into buffer[6:8] and B into buffer[8:10], row j."""
    r = j + H
    J = r % y.shape[1]
    N = (r + 1) % y.shape[1]
    k = r % 2
    row_centres(
        buffer[6 + k], buffer[8 + k], y[0, J], y[1, J], y[1, N], y[2, J], row(m.depth, r), m.linear, m.gravity, m.nx
    )


@njit(**OPTIONS)
def advance(scheme, first, buffer, y, yb, Jb, yo, j, blend, step, m):
    """Row j of yo = yb + (blend (y - yb) + step dy/dt), yb read at memory row Jb; `first` fills the row buffers."""
    for k in range(j - 1 if first else j + 1, j + 2):
        corners(buffer, y, k, m)
    for k in range(j - 1 if first else j, j + 1):
        centres(buffer, y, k, m)
    r = j + H
    k = (r + 1) % 3
    s = (k + 2) % 3
    n = (k + 1) % 3
    c = r % 2
    d = 1 - c
    J = r % y.shape[1]
    Jo = r % yo.shape[1]
    row_update(
        scheme, yo[0, Jo], yo[1, Jo], yo[2, Jo], yb[0, Jb], yb[1, Jb], yb[2, Jb], y[0, J], y[1, J], y[2, J],
        buffer[s], buffer[k], buffer[n], buffer[3 + s], buffer[3 + k], buffer[3 + n], buffer[6 + d], buffer[6 + c],
        buffer[8 + d], buffer[8 + c], blend, step, m.rx, m.ry, m.nx,
    )  # fmt: skip
    edge_columns(yo, Jo, m)
    edge_rows(yo, j, m)


@row_jit
def last_base(gathers, base, yb, y, rolling, j, n):
    """Where the last stage starts: the set and its memory row. With rk4 that row is made here."""
    J = j + H
    if gathers != 0:
        R = J % rolling.shape[2]
        for field in range(3):
            row_gather(base[field, 0], y[field, J], rolling[0, field, R], rolling[1, field, R], rolling[2, field, R], n)
        return base, 0
    return yb, J


@njit(**OPTIONS)
def one_pass(scheme, work, y, yb, yo, j0, j1, m):
    """Rows j0..j1-1 of yo, all stages chasing each other up the band; at a wall the overlap stops."""
    n = len(m.stages)
    rolling = work[n * ROW_BUFFERS : n * (ROW_BUFFERS + 3 * ROLLING_ROWS)].reshape((n, 3, ROLLING_ROWS, work.shape[1]))
    below = n * (ROW_BUFFERS + 3 * ROLLING_ROWS)
    base = work[below : below + GATHER_ROWS].reshape((GATHER_ROWS, 1, work.shape[1]))
    low = 0 if m.south != 0 else -H
    high = m.ny if m.north != 0 else m.ny + H
    for k in range(j0 - 2 * (n - 1), j1 + n - 1):
        for s in range(n):
            j = k - s
            start = max(j0 - 2 * (n - 1 - s), low)
            if j < start or j >= min(j1 + n - 1 - s, high):
                continue
            source = y if s == 0 else rolling[s - 1]
            target = yo if s == n - 1 else rolling[s]
            origin = yb
            Jb = j + H
            if s == n - 1:
                origin, Jb = last_base(m.gathers, base, yb, y, rolling, j, m.nx)
            buffer = work[s * ROW_BUFFERS : (s + 1) * ROW_BUFFERS]
            advance(scheme, j == start, buffer, source, origin, Jb, target, j, m.stages[s, 0], m.stages[s, 1] * m.dt, m)


@njit(parallel=True, cache=True, **OPTIONS)
def one_step(scheme, work, y, yb, yo, m, bands):
    """Yo = one step from y (base yb), a band of rows a thread; ghost rows of a periodic direction are not filled."""
    for t in prange(bands):
        one_pass(scheme, work[t], y, yb, yo, m.ny * t // bands, m.ny * (t + 1) // bands, m)


@njit(**OPTIONS)
def copy_level(source, target):
    """Copy a set of fields, by loops: assigning slices compiles slowly."""
    for field in range(3):
        for r in range(source.shape[1]):
            for i in range(U8(0), U8(source.shape[2])):
                target[field, r, i] = source[field, r, i]


@njit(cache=True, **OPTIONS)
def run_one_step_methods(scheme, F, steps, work, m, bands):
    """Many steps of ssprk3 or rk4; F holds two sets of (u, v, eta), and the present ends in the first."""
    for s in range(steps):
        a = 3 * (s % 2)
        b = 3 - a
        one_step(scheme, work, F[a : a + 3], F[a : a + 3], F[b : b + 3], m, bands)
        periodic_rows(F[b : b + 3], m)
    if steps % 2 == 1:
        copy_level(F[3:6], F[0:3])


@row_jit
def row_filter(before, present, after, nu, alpha, n):
    """Robert-Asselin filter with Williams' correction (Williams 2009), over a row.

    d = (nu/2) (before - 2 present + after); present += alpha d; after += (alpha - 1) d.
    """
    half = present.dtype.type(0.5)
    two = present.dtype.type(2)
    one = present.dtype.type(1)
    for i in range(U8(0), U8(n)):
        d = half * nu * ((before[i] - two * present[i]) + after[i])
        present[i] = present[i] + alpha * d
        after[i] = after[i] + (alpha - one) * d


@njit(parallel=True, cache=True, **OPTIONS)
def filter_levels(before, present, after, nu, alpha):
    """Filter two levels, ghosts included: they then stay what the edges would make of them."""
    for r in prange(present.shape[1]):
        for field in range(3):
            row_filter(before[field, r], present[field, r], after[field, r], nu, alpha, present.shape[2])


@njit(cache=True, **OPTIONS)
def run_leapfrog(scheme, F, steps, work, m, bands, nu, alpha):
    """Many leapfrog steps; F holds three sets: the present, the level before it, and room for the next."""
    now = 0
    old = 3
    new = 6
    for _ in range(steps):
        one_step(scheme, work, F[now : now + 3], F[old : old + 3], F[new : new + 3], m, bands)
        periodic_rows(F[new : new + 3], m)
        filter_levels(F[old : old + 3], F[now : now + 3], F[new : new + 3], nu, alpha)
        now, old, new = new, now, old
    if now == 6:
        copy_level(F[0:3], F[3:6])
        copy_level(F[6:9], F[0:3])
    elif now == 3:
        copy_level(F[3:6], F[0:3])
        copy_level(F[6:9], F[3:6])
