"""The equations of one experiment, bound to compiled kernels."""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numba
import numpy as np

from ..grid import Basin
from ..grid.domain import Array, allocate, inside_centre, inside_u, inside_v, row_stride, spread, usable_cores
from .edges import FREE_SLIP, NO_SLIP, PERIODIC, fill_edges, periodic_rows
from .schemes import PVFlux
from .sweeps import Setup, one_step, work_rows

EULER = ((0.0, 1.0),)  # out = base + dt T: with base 0 and dt 1 it is the tendency itself
ROWS_A_BAND = 24  # fewer rows a thread and the overlap that each band recomputes eats the gain
CELLS_A_BAND = 8192  # fewer, and on a busy machine threads wait longer for each other than they work

numba_config: Any = numba.config
numba_config.THREADING_LAYER_PRIORITY = ["omp", "tbb", "workqueue"]


class Equations:
    """What the flow obeys: basin, PV flux, linear or not, and how many threads work on it.

    Parameters
    ----------
    basin : Basin
        Grid, frame, depth and gravity.
    pv_flux : PVFlux
        A row of `PV_FLUXES`, or one of your own.
    linear : bool
        Drop zeta and K, and take H for h in the fluxes.
    threads : int or None
        Largest number of threads; all usable cores by default. The result does not depend on it.
    """

    def __init__(self, basin: Basin, pv_flux: PVFlux, *, linear: bool = False, threads: int | None = None) -> None:
        self.basin = basin
        self.pv_flux = pv_flux
        self.linear = linear
        self.threads = min(threads or usable_cores(), int(numba_config.NUMBA_NUM_THREADS))

    @property
    def bands(self) -> int:
        """Number of bands of rows, one a thread; few on small grids."""
        grid = self.basin.grid
        return max(1, min(self.threads, grid.ny // ROWS_A_BAND, grid.nx * grid.ny // CELLS_A_BAND))

    @cached_property
    def _coefficients(self) -> dict[str, Any]:
        """Depth and f with their halos; f as a column where it does not vary along x."""
        grid, f = self.basin.grid, self.basin.f
        field = spread(f, grid, corner=True)
        zonal = bool(np.all(f == f[:, :1]))
        return {
            "depth": spread(self.basin.depth, grid),
            "coriolis": np.ascontiguousarray(field[:, 0]) if zonal else field,
        }

    def setup(self, stages: tuple[tuple[float, float], ...], dt: float, *, gathers: bool = False) -> Setup:
        """Return what the kernels need to run these stages with step `dt`."""
        grid = self.basin.grid
        number = grid.dtype.type
        wall = FREE_SLIP if grid.slip == "free" else NO_SLIP
        west, east, south, north = (
            PERIODIC if edge == "periodic" else wall for edge in (grid.west, grid.east, grid.south, grid.north)
        )
        return Setup(
            stages=np.array(stages, grid.dtype),
            dt=number(dt),
            rx=number(1 / grid.dx),
            ry=number(1 / grid.dy),
            gravity=number(self.basin.gravity),
            west=west,
            east=east,
            south=south,
            north=north,
            nx=grid.nx,
            ny=grid.ny,
            gathers=int(gathers),
            linear=1 if self.linear else None,
            **self._coefficients,
        )

    def workspace(self, stages: int) -> Array:
        """Row buffers of every band."""
        grid = self.basin.grid
        return np.zeros((self.bands, work_rows(stages), row_stride(grid.nx, grid.dtype.itemsize)), grid.dtype)

    def claim_threads(self) -> None:
        """Let the next kernel use one thread a band, as far as there are threads."""
        numba.set_num_threads(min(self.bands, int(numba_config.NUMBA_NUM_THREADS)))

    def fill(self, level: Array) -> None:
        """Fill the ghost cells of a set (u, v, eta) from its inside."""
        fill_edges(level, self.setup(EULER, 1.0))

    def stage_tendency(self, level: Array, out: Array, base: Array, work: Array) -> None:
        """Write the tendency of the set `level` (ghosts filled) into the set `out`; `base` is a set of zeros."""
        self.claim_threads()
        setup = self.setup(EULER, 1.0)
        one_step(self.pv_flux.scheme, work, level, base, out, setup, self.bands)
        periodic_rows(out, setup)

    def tendency(self, u: Array, v: Array, eta: Array) -> tuple[Array, Array, Array]:
        """Rates of change of u, v, eta by the fused kernels, all with both ends; `plain.PlainEquations` says the same.

        Parameters
        ----------
        u, v, eta : ndarray ``[ny, nx + 1]``, ``[ny + 1, nx]``, ``[ny, nx]``
            Velocities on faces, m/s; elevation at centres, m.

        Returns
        -------
        tuple of ndarray
            du/dt, dv/dt, m s-2; deta/dt, m/s.
        """
        grid = self.basin.grid
        sets = allocate(grid, 3)
        level, out, base = sets[0:3], sets[3:6], sets[6:9]
        for view, values, field in zip((inside_u, inside_v, inside_centre), (u, v, eta), level, strict=True):
            view(field, grid)[...] = values
        self.fill(level)
        self.stage_tendency(level, out, base, self.workspace(1))
        return inside_u(out[0], grid), inside_v(out[1], grid), inside_centre(out[2], grid)
