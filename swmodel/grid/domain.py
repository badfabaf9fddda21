"""How fields lie in memory: halos, row stride, views of the inside, and sums in a fixed order.

A kernel runs over the interior and reads a halo; edges fill it at physical sides. One process owns the whole domain.
"""

from __future__ import annotations

import math
import os
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .staggered import Grid

HALO_X = 4  # columns on either side: half a cache line of doubles keeps rows aligned alike
HALO_Y = 8  # rows on either side: four stages in one pass read 2 (4 - 1) + 2 rows beyond their band
CACHE_LINE = 64  # bytes
_LINES_A_PAGE_HALF = 32  # 2048 bytes: rows that far apart fall on the same cache sets

Array = NDArray[np.floating[Any]]


def row_stride(nx: int, itemsize: int) -> int:
    """Return the row length in elements: whole cache lines, at least two lines away from a multiple of 2048 bytes.

    Rows at such multiples evict each other (measured: twice as slow).
    """
    lines = -(-(nx + 2 * HALO_X + 8) * itemsize // CACHE_LINE)
    while lines % _LINES_A_PAGE_HALF in (0, 1, _LINES_A_PAGE_HALF - 1):
        lines += 1
    return lines * CACHE_LINE // itemsize


def allocate(grid: Grid, sets: int) -> Array:
    """Return zeroed room for `sets` sets of (u, v, eta) with halo: ``[3 sets, ny + 2 HALO_Y, stride]``, aligned."""
    stride = row_stride(grid.nx, grid.dtype.itemsize)
    shape = (3 * sets, grid.ny + 2 * HALO_Y, stride)
    size = math.prod(shape) * grid.dtype.itemsize
    raw = np.zeros(size + CACHE_LINE, np.uint8)
    # rows start so that the first interior element, not the halo, falls on a cache line
    shift = (-(raw.ctypes.data + HALO_X * grid.dtype.itemsize)) % CACHE_LINE
    return raw[shift : shift + size].view(grid.dtype).reshape(shape)


def inside_u(field: Array, grid: Grid) -> Array:
    """View of u with both ends, ``[ny, nx + 1]``."""
    return field[HALO_Y : HALO_Y + grid.ny, HALO_X : HALO_X + grid.nx + 1]


def inside_v(field: Array, grid: Grid) -> Array:
    """View of v with both ends, ``[ny + 1, nx]``."""
    return field[HALO_Y : HALO_Y + grid.ny + 1, HALO_X : HALO_X + grid.nx]


def inside_centre(field: Array, grid: Grid) -> Array:
    """View of a centre field, ``[ny, nx]``."""
    return field[HALO_Y : HALO_Y + grid.ny, HALO_X : HALO_X + grid.nx]


def spread(values: Array | float, grid: Grid, *, corner: bool = False) -> Any:
    """Lay a coefficient out with its halo: round the domain, or beyond a wall mirrored (centres) or held (corners).

    Parameters
    ----------
    values : float, ndarray ``[ny, nx]``, or with `corner` ``[ny + 1, nx + 1]``
        The coefficient; a number stays one.
    grid : Grid
        The grid.
    corner : bool
        Whether the values lie at corners.

    Returns
    -------
    ndarray ``[ny + 2 HALO_Y, stride]`` of the grid's precision, or a number of it.
    """
    if np.ndim(values) == 0:
        return grid.dtype.type(values)
    columns = _sources(grid.nx, row_stride(grid.nx, grid.dtype.itemsize), HALO_X, grid.periodic_x, corner)
    rows = _sources(grid.ny, grid.ny + 2 * HALO_Y, HALO_Y, grid.periodic_y, corner)
    return np.ascontiguousarray(np.asarray(values)[np.ix_(rows, columns)], grid.dtype)


def _sources(n: int, length: int, rim: int, periodic: bool, corner: bool) -> NDArray[np.intp]:
    """Index of the inside value that each place of a line with halo holds."""
    k = np.arange(length) - rim
    if periodic:
        return k % n
    if corner:
        return k.clip(0, n)
    mirrored = np.where(k < 0, -1 - k, k)
    folded: NDArray[np.intp] = np.minimum(mirrored, 2 * n - 1 - mirrored)
    return folded.clip(0, n - 1)


def ordered_sum(rows: NDArray[np.float64]) -> float:
    """Sum of row sums, exact before its one rounding, so that it depends on no order and no number of threads."""
    return math.fsum(rows.tolist())


def usable_cores() -> int:
    """Return how many cores this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # systems without affinity
        return os.cpu_count() or 1
