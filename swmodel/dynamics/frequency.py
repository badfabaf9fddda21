"""The largest frequency of the discrete linear operator: what limits the step."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..grid import Basin
from ..grid.staggered import Grid
from . import reference
from .schemes import PVFlux

SAFETY = 1.05  # the iteration comes from below
TOLERANCE = 1e-2  # of omega^2: half a per cent of omega, a tenth of what SAFETY allows
FEWEST = 16  # unknowns below which the whole matrix is cheaper than an iteration

Vector = NDArray[np.float64]


def largest_frequency(basin: Basin, thickest: float, pv_flux: PVFlux) -> float:
    """Largest frequency omega_max of the linear operator, rad/s.

    omega_max^2 = max(f^2, 4 g H_max (1/dx^2 + 1/dy^2)): exact for an even depth on an f-plane, an upper bound while
    max|f| times the cell size does not exceed c. Beyond that (coarse grids) it is found by iteration on the operator
    itself, times 1.05.

    Parameters
    ----------
    basin : Basin
        Where the flow lives.
    thickest : float
        Largest thickness H + eta, m.
    pv_flux : PVFlux
        Scheme of the Coriolis term: where f varies between neighbouring corners, schemes differ.
    """
    grid = basin.grid
    f_max = float(np.abs(basin.f).max())
    bound = math.sqrt(max(f_max**2, 4 * basin.gravity * thickest * (1 / grid.dx**2 + 1 / grid.dy**2)))
    if not needs_iteration(basin, thickest):
        return bound
    # a domain of one closed cell has no wave at all
    return max(f_max, SAFETY * iterated_frequency(basin, thickest, pv_flux))


def needs_iteration(basin: Basin, thickest: float) -> bool:
    """Whether the largest frequency has no closed form: uneven depth or f on cells that are coarse against c/|f|."""
    grid = basin.grid
    fine = float(np.abs(basin.f).max()) * max(grid.dx, grid.dy) <= math.sqrt(basin.gravity * thickest)
    uniform = basin.even and bool(np.all(basin.f == basin.f.flat[0]))
    return not (fine or uniform)


def iterated_frequency(basin: Basin, thickest: float, pv_flux: PVFlux) -> float:
    """Largest frequency by iteration on the square of the linear operator A (Lanczos, or Arnoldi; scipy).

    In variables scaled by the square root of the energy, A is antisymmetric where the flux conserves energy: -A^2 is
    then symmetric with eigenvalues omega^2. The thickness is scaled to `thickest` at its largest.
    """
    from scipy.sparse.linalg import LinearOperator, eigs, eigsh

    depth = basin.depth_field * (thickest / float(np.max(basin.depth_field)))
    apply, size = _scaled_operator(basin, depth, pv_flux)
    if size < FEWEST:
        whole = np.column_stack([apply(column) for column in np.eye(size)])
        return float(np.abs(np.linalg.eigvals(whole).imag).max())
    square = LinearOperator((size, size), matvec=lambda x: -apply(apply(np.ravel(x))), dtype=np.float64)
    start = apply(np.random.default_rng(0).standard_normal(size))
    if pv_flux.conserves_energy:
        largest = float(eigsh(square, k=1, which="LA", tol=TOLERANCE, v0=start, return_eigenvectors=False)[0])
    else:
        largest = float(eigs(square, k=1, which="LR", tol=TOLERANCE, v0=start, return_eigenvectors=False)[0].real)
    return math.sqrt(max(largest, 0.0))


def _scaled_operator(basin: Basin, depth: Vector, pv_flux: PVFlux) -> tuple[Callable[[Vector], Vector], int]:
    """The linear operator on one long vector of sqrt(H) u, sqrt(H) v, sqrt(g) eta, without closed or repeated faces."""
    grid = basin.grid
    ny, nx = grid.ny, grid.nx
    first_u, first_v = int(not grid.periodic_x), int(not grid.periodic_y)
    shapes = (ny, nx - first_u), (ny - first_v, nx), (ny, nx)
    sizes = np.cumsum([math.prod(shape) for shape in shapes])
    root_u = np.sqrt((depth + np.roll(depth, 1, 1)) / 2)[:, first_u:]
    root_v = np.sqrt((depth + np.roll(depth, 1, 0)) / 2)[first_v:]
    root_eta = math.sqrt(basin.gravity)

    def apply(x: Vector) -> Vector:
        u, v, eta = (part.reshape(shape) for part, shape in zip(np.split(x, sizes[:-1]), shapes, strict=True))
        du, dv, deta = reference.tendency(
            _closed(u / root_u, 1, grid),
            _closed(v / root_v, 0, grid),
            eta / root_eta,
            depth=depth,
            f=basin.f,
            gravity=basin.gravity,
            dx=grid.dx,
            dy=grid.dy,
            edges=(grid.west, grid.east, grid.south, grid.north),
            pv_flux=pv_flux.plain,
            linear=True,
        )
        du, dv = du[:, first_u:-1] * root_u, dv[first_v:-1] * root_v
        return np.concatenate([du.ravel(), dv.ravel(), (deta * root_eta).ravel()])

    return apply, int(sizes[-1])


def _closed(a: Any, axis: int, grid: Grid) -> Any:
    """Give a velocity its second end, or its two walls."""
    periodic = grid.periodic_x if axis == 1 else grid.periodic_y
    if periodic:
        return np.concatenate([a, np.take(a, [0], axis)], axis)
    wall = (
        np.zeros_like(np.take(a, [0], axis))
        if a.shape[axis]
        else np.zeros((a.shape[0], 1) if axis else (1, a.shape[1]))
    )
    return np.concatenate([wall, a, wall], axis)
