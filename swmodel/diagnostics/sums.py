"""Conserved quantities and extremes, one row of sums at a time, so that they depend on no number of threads.

Compiled: at the default interval the plain NumPy sums would cost as much as the run. `plain_sums` is the twin. On one
thread: sums cost less than a step, and a parallel loop would take twice as long to compile.
All sums are in double precision, whatever the run's.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray

from ..dynamics.compilation import ONE, OPTIONS, U8, row_jit
from ..dynamics.kernels import at, thickness
from ..dynamics.sweeps import Setup, row
from ..grid import Basin
from ..grid.domain import HALO_X as W
from ..grid.domain import HALO_Y as H
from ..grid.domain import Array, inside_centre, inside_u, inside_v, ordered_sum
from .derived import Side, corner_mean, derive

# columns of the row sums
MASS, KINETIC, POTENTIAL, ENSTROPHY, CIRCULATION, MOMENTUM_X, MOMENTUM_Y, DIVERGENCE2, VORTICITY2 = range(9)
SPEED2_MAX, PV_MIN, PV_MAX, FROUDE2_MAX = range(9, 13)
COLUMNS = 13
HALF_WEIGHT = 0.5  # share of the wet area of a corner, or a face, that lies on a wall


@row_jit
def row_of_cells(out, u, v, vn, eta, etas, depth, depths, linear, gravity, rx, ry, n):
    """Sums over the cells and faces of one row; see `plain_sums`."""
    mass = kinetic = potential = momentum_x = momentum_y = divergence2 = 0.0
    speed2_max = froude2_max = 0.0
    for i in range(U8(W), U8(n + W)):
        e = i + ONE
        w = i - ONE
        h = float(at(depth, i)) + float(eta[i])
        flux_h = float(thickness(linear, depth, eta, i))
        h_u = 0.5 * (float(thickness(linear, depth, eta, w)) + flux_h)
        h_v = 0.5 * (float(thickness(linear, depths, etas, i)) + flux_h)
        ui = float(u[i])
        vi = float(v[i])
        divergence = (float(u[e]) - ui) * rx + (float(vn[i]) - vi) * ry
        speed2 = 0.5 * ((ui * ui + float(u[e]) ** 2) + (vi * vi + float(vn[i]) ** 2))
        mass += h
        kinetic += h_u * ui * ui + h_v * vi * vi
        potential += float(eta[i]) ** 2
        momentum_x += h_u * ui
        momentum_y += h_v * vi
        divergence2 += divergence * divergence
        speed2_max = max(speed2_max, speed2)
        froude2_max = max(froude2_max, speed2 / h)
    out[MASS] = mass
    out[KINETIC] = 0.5 * kinetic
    out[POTENTIAL] = 0.5 * gravity * potential
    out[MOMENTUM_X] = momentum_x
    out[MOMENTUM_Y] = momentum_y
    out[DIVERGENCE2] = divergence2
    out[SPEED2_MAX] = speed2_max
    out[FROUDE2_MAX] = froude2_max / gravity


@row_jit
def corner_pv(linear, f, zeta, depth4, eta4):
    """(q, thickness that weighs it, value that is squared in the potential enstrophy) at a corner."""
    if linear is None:
        h = depth4 + eta4
        q = (f + zeta) / h
        return q, h, q
    anomaly = (zeta - f * eta4 / depth4) / depth4
    return f / depth4 + anomaly, depth4, anomaly


@row_jit
def row_of_corners(out, u, us, v, eta, etas, depth, depths, f, linear, rx, ry, west_wall, east_wall, weight, n):
    """Sums over the corners of one row, each with its share of wet area; see `plain_sums`."""
    enstrophy = circulation = vorticity2 = 0.0
    pv_min = math.inf
    pv_max = -math.inf
    for i in range(U8(W), U8(n + W + 1)):
        w = i - ONE
        share = weight
        if i == U8(W) and west_wall:
            share *= HALF_WEIGHT
        if i == U8(n + W):
            share *= HALF_WEIGHT if east_wall else 0.0
        zeta = (float(v[i]) - float(v[w])) * rx - (float(u[i]) - float(us[i])) * ry
        depth4 = 0.25 * (float(at(depth, i)) + float(at(depth, w)) + float(at(depths, i)) + float(at(depths, w)))
        eta4 = 0.25 * (float(eta[i]) + float(eta[w]) + float(etas[i]) + float(etas[w]))
        q, h, squared = corner_pv(linear, float(at(f, i)), zeta, depth4, eta4)
        enstrophy += share * (h * squared * squared)
        circulation += share * zeta
        vorticity2 += share * (zeta * zeta)
        pv_min = min(pv_min, q)
        pv_max = max(pv_max, q)
    out[ENSTROPHY] = 0.5 * enstrophy
    out[CIRCULATION] = circulation
    out[VORTICITY2] = vorticity2
    out[PV_MIN] = pv_min
    out[PV_MAX] = pv_max


@njit(cache=True, **OPTIONS)
def row_sums(y, m):
    """Sums and extremes of every row of the set `y`, ``[ny + 1, COLUMNS]``; the last row has corners alone."""
    out = np.zeros((m.ny + 1, COLUMNS))
    rx = float(m.rx)
    ry = float(m.ry)
    for j in range(m.ny + 1):
        r = j + H
        if j < m.ny:
            row_of_cells(
                out[j], y[0, r], y[1, r], y[1, r + 1], y[2, r], y[2, r - 1], row(m.depth, r), row(m.depth, r - 1),
                m.linear, float(m.gravity), rx, ry, m.nx,
            )  # fmt: skip
        weight = 1.0
        if j == 0 and m.south != 0:
            weight = HALF_WEIGHT
        if j == m.ny:
            weight = HALF_WEIGHT if m.north != 0 else 0.0
        row_of_corners(
            out[j], y[0, r], y[0, r - 1], y[1, r], y[2, r], y[2, r - 1], row(m.depth, r), row(m.depth, r - 1),
            row(m.coriolis, r), m.linear, rx, ry, m.west != 0, m.east != 0, weight, m.nx,
        )  # fmt: skip
    return out


@njit(cache=True, **OPTIONS)
def row_health(y, m):
    """Least thickness of every row, ``[ny]``; minus infinity where a value is not finite."""
    out = np.zeros(m.ny)
    for j in range(m.ny):
        r = j + H
        least = math.inf
        for i in range(W, m.nx + W):
            h = float(at(row(m.depth, r), i)) + float(y[2, r, i])
            finite = math.isfinite(h) and math.isfinite(y[0, r, i]) and math.isfinite(y[1, r, i])
            least = min(least, h) if finite else -math.inf
        out[j] = least
    return out


def gather_sums(rows: NDArray[np.float64], basin: Basin) -> dict[str, float]:
    """Turn row sums into the time series' values.

    Returns
    -------
    dict
        ``mass`` (m3), ``energy_kinetic``, ``energy_potential`` (m5 s-2), ``potential_enstrophy`` (m s-2),
        ``circulation`` (m2 s-1), ``momentum_x``, ``momentum_y`` (m4 s-1), ``speed_max`` (m/s), ``pv_min``, ``pv_max``
        (1/(m s)), ``rossby_number`` = r.m.s. of zeta over r.m.s. of f, ``froude_number`` = largest speed/sqrt(g h),
        ``divergence_rms``, ``vorticity_rms`` (1/s).
    """
    grid = basin.grid
    area = grid.dx * grid.dy
    whole = grid.Lx * grid.Ly

    def total(column: int) -> float:
        return ordered_sum(rows[:, column]) * area

    inside = rows[: grid.ny]
    vorticity = math.sqrt(total(VORTICITY2) / whole)
    f_rms = math.sqrt(float(np.mean(basin.f**2)))
    return {
        "mass": total(MASS),
        "energy_kinetic": total(KINETIC),
        "energy_potential": total(POTENTIAL),
        "potential_enstrophy": total(ENSTROPHY),
        "circulation": total(CIRCULATION),
        "momentum_x": total(MOMENTUM_X),
        "momentum_y": total(MOMENTUM_Y),
        "speed_max": math.sqrt(float(inside[:, SPEED2_MAX].max())),
        "pv_min": float(rows[:, PV_MIN].min()),
        "pv_max": float(rows[:, PV_MAX].max()),
        "rossby_number": vorticity / f_rms if f_rms else math.nan,
        "froude_number": math.sqrt(float(inside[:, FROUDE2_MAX].max())),
        "divergence_rms": math.sqrt(total(DIVERGENCE2) / whole),
        "vorticity_rms": vorticity,
    }


def sums(level: Array, setup: Setup, basin: Basin) -> dict[str, float]:
    """Conserved quantities and extremes of a set (u, v, eta) with its ghosts filled; see `gather_sums`."""
    return gather_sums(row_sums(level, setup), basin)


def plain_sums(level: Array, basin: Basin, *, linear: bool) -> dict[str, float]:
    """The same in NumPy: the twin that `sums` is held against."""
    grid = basin.grid
    u, v = inside_u(level[0], grid).astype(float), inside_v(level[1], grid).astype(float)
    eta = inside_centre(level[2], grid).astype(float)
    H_rest, f = basin.depth_field, basin.f
    edges: tuple[Side, Side, Side, Side] = (grid.west, grid.east, grid.south, grid.north)
    known: dict[str, Any] = {
        "depth": H_rest, "f": f, "dx": grid.dx, "dy": grid.dy, "edges": edges, "slip": grid.slip, "linear": linear
    }  # fmt: skip
    zeta, q = derive("vorticity", u, v, eta, **known), derive("pv", u, v, eta, **known)
    divergence, speed = derive("divergence", u, v, eta, **known), derive("speed", u, v, eta, **known)
    h = H_rest if linear else H_rest + eta
    # two-cell means; on a wall the velocity is 0, so that what stands beyond it does not matter
    h_u, h_v = (h + np.roll(h, 1, 1)) / 2, (h + np.roll(h, 1, 0)) / 2
    u, v = u[:, :-1], v[:-1]
    depth4, eta4 = corner_mean(H_rest, edges), corner_mean(eta, edges)
    squared = (zeta - f * eta4 / depth4) / depth4 if linear else q
    share = np.outer(_shares(grid.ny, grid.periodic_y), _shares(grid.nx, grid.periodic_x))
    area, whole = grid.dx * grid.dy, grid.Lx * grid.Ly
    vorticity = math.sqrt((share * zeta**2).sum() * area / whole)
    f_rms = math.sqrt(float(np.mean(f**2)))
    return {
        "mass": float((H_rest + eta).sum() * area),
        "energy_kinetic": float((h_u * u**2 + h_v * v**2).sum() * area / 2),
        "energy_potential": float(basin.gravity * (eta**2).sum() * area / 2),
        "potential_enstrophy": float((share * (depth4 if linear else depth4 + eta4) * squared**2).sum() * area / 2),
        "circulation": float((share * zeta).sum() * area),
        "momentum_x": float((h_u * u).sum() * area),
        "momentum_y": float((h_v * v).sum() * area),
        "speed_max": float(speed.max()),
        "pv_min": float(q.min()),
        "pv_max": float(q.max()),
        "rossby_number": vorticity / f_rms if f_rms else math.nan,
        "froude_number": float((speed / np.sqrt(basin.gravity * (H_rest + eta))).max()),
        "divergence_rms": math.sqrt((divergence**2).sum() * area / whole),
        "vorticity_rms": vorticity,
    }


def _shares(n: int, periodic: bool) -> NDArray[np.float64]:
    """Share of wet area of the n + 1 corners of a line: half on walls; of two equal ends the first counts."""
    share = np.ones(n + 1)
    share[0] = 1.0 if periodic else HALF_WEIGHT
    share[-1] = 0.0 if periodic else HALF_WEIGHT
    return share
