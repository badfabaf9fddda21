"""Rates of change of energy and potential enstrophy that a tendency makes, term by term."""

from __future__ import annotations

import numpy as np
from flows import EDGES, random_basin, random_flow

from swmodel.diagnostics.derived import Flow, corner_mean, vorticity

# round-off: sums of some 1e3 products, each with some ten roundings, leave 1e-16; promised is 1e-12
ROUND_OFF = 1e-13


def face_means(h, grid):
    """Two-cell means of h on x-faces and y-faces; on walls the cell's own, where the velocity is 0 anyway."""
    x_mode, y_mode = ("wrap" if periodic else "edge" for periodic in (grid.periodic_x, grid.periodic_y))
    wide, tall = np.pad(h, ((0, 0), (1, 1)), mode=x_mode), np.pad(h, ((1, 1), (0, 0)), mode=y_mode)
    return (wide[:, 1:] + wide[:, :-1]) / 2, (tall[1:] + tall[:-1]) / 2


def energy_rates(basin, fields, rates, linear):
    """Terms of dE/dt, E = sum of h_u u^2/2 + h_v v^2/2 + g eta^2/2 over faces and cells (Sadourny 1975).

    Each face counts once: of two equal ends the first.
    """
    u, v, eta = fields
    du, dv, deta = rates
    h_u, h_v = face_means(basin.depth_field + (0 if linear else eta), basin.grid)
    kinetic = 0 if linear else (u[:, 1:] ** 2 + u[:, :-1] ** 2 + v[1:] ** 2 + v[:-1] ** 2) / 4
    return [(h_u * u * du)[:, :-1], (h_v * v * dv)[:-1], kinetic * deta, basin.gravity * eta * deta]


def enstrophy_rates(basin, fields, rates):
    """Terms of dZ/dt, Z = sum of h q^2/2 over corners, doubly periodic: q dzeta/dt - q^2/2 dh/dt."""
    grid = basin.grid
    edges = (grid.west, grid.east, grid.south, grid.north)
    known = {"depth": basin.depth, "f": basin.f, "dx": grid.dx, "dy": grid.dy, "edges": edges, "slip": "free"}
    zeta = vorticity(Flow(*fields, linear=False, **known))
    dzeta = vorticity(Flow(*rates, linear=False, **known))
    q = (basin.f + zeta) / corner_mean(basin.depth_field + fields[2], edges)
    dh = corner_mean(rates[2], edges)
    return [(q * dzeta)[:-1, :-1], (-(q**2) / 2 * dh)[:-1, :-1]]


def relative(terms):
    """Sum of terms over the sum of their absolute values."""
    everything = np.concatenate([np.ravel(term) for term in terms])
    return abs(everything.sum()) / np.abs(everything).sum()


def states(of, count, edges=tuple(EDGES), least=3):
    """Random basins and flows of a combination, dx != dy, over the given kinds of edges in turn.

    At least 3 cells wide: on 2 x 2 all corners are alike, no rate is left, and round-off stands against round-off.
    """
    for seed in range(count):
        rng = np.random.default_rng(seed)
        nx, ny = (int(n) for n in rng.integers(least, 16, 2))
        basin = random_basin(rng, of, nx, ny, edges[seed % len(edges)], ("free", "none")[seed % 2])
        yield basin, random_flow(rng, basin.grid)
