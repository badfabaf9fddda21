"""What lies beyond an edge: ghost columns and rows, filled right after a row is made, so that kernels know no edges.

An edge is a number at run time: 0 periodic, 1 a wall with free slip, -1 a wall without slip. Beyond a wall eta is even,
the normal velocity odd, and the velocity along it even (free slip) or odd (no slip).
"""

from __future__ import annotations

from numba import njit

from ..grid.domain import HALO_X as W
from ..grid.domain import HALO_Y as H
from .compilation import OPTIONS, U8, row_jit

PERIODIC, FREE_SLIP, NO_SLIP = 0, 1, -1


@njit(**OPTIONS)
def edge_columns(y, J, m):
    """Fill the ghost columns of memory row `J` of the set `y`; m is the `Setup`."""
    u = y[0, J]
    v = y[1, J]
    eta = y[2, J]
    n = m.nx
    if m.west == 0:
        for a in (u, v, eta):
            for w in range(1, W + 1):
                a[W - w] = a[W + n - w]
                a[W + n - 1 + w] = a[W + w - 1]
    else:
        u[W] = 0
        u[W + n] = 0
        u[W - 1] = -u[W + 1]
        u[W + n + 1] = -u[W + n - 1]
        v[W - 1] = m.west * v[W]
        v[W + n] = m.east * v[W + n - 1]
        eta[W - 1] = eta[W]
        eta[W + n] = eta[W + n - 1]


@row_jit
def mirror_row(target, source, sign):
    """Target = sign source, ghosts and all."""
    for i in range(U8(0), U8(target.shape[0])):
        target[i] = sign * source[i]


@row_jit
def clear_row(target):
    """Target = 0: assigned, not multiplied, since what was there may not be finite."""
    for i in range(U8(0), U8(target.shape[0])):
        target[i] = 0


@njit(**OPTIONS)
def edge_rows(y, j, m):
    """Fill the ghost rows beyond a wall once row `j`, the one at the wall, is made; v on the wall is 0."""
    rows = y.shape[1]
    for edge, last, wall, ghost in ((m.south, 0, 0, -1), (m.north, m.ny - 1, m.ny, m.ny)):
        if edge != 0 and j == last:
            clear_row(y[1, (wall + H) % rows])
            mirror_row(y[0, (ghost + H) % rows], y[0, (j + H) % rows], edge)
            mirror_row(y[2, (ghost + H) % rows], y[2, (j + H) % rows], 1)


@njit(cache=True, **OPTIONS)
def periodic_rows(y, m):
    """Fill the ghost rows of a whole set where south and north are one line."""
    if m.south == 0:
        for field in range(3):
            for w in range(1, H + 1):
                mirror_row(y[field, H - w], y[field, H + m.ny - w], 1)
                mirror_row(y[field, H + m.ny - 1 + w], y[field, H + w - 1], 1)


@njit(cache=True, **OPTIONS)
def fill_edges(y, m):
    """Fill every ghost cell of a set from its inside; in a periodic direction the first of two equal ends counts."""
    for j in range(m.ny):
        edge_columns(y, j + H, m)
        edge_rows(y, j, m)
    periodic_rows(y, m)
