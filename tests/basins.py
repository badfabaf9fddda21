"""Invented basins for tests of the starts and their balance, with the linear and the full equations over them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from pydantic import TypeAdapter

from swmodel.dynamics.reference import tendency
from swmodel.errors import Fault, RequestError
from swmodel.frame import Frame
from swmodel.grid import Basin, Grid
from swmodel.state import StartFields, StartSettings, build_start

Array = NDArray[np.float64]
P, W = "periodic", "wall"
EDGES: dict[str, Any] = {
    "periodic": (P, P, P, P),
    "channel along x": (P, P, W, W),
    "channel along y": (W, W, P, P),
    "box": (W, W, W, W),
}
F = 1e-4
HEMISPHERES = {"north": F, "south": -F}
EPSILON = float(np.finfo(float).eps)


def make_basin(
    edges: str = "periodic",
    *,
    cells: tuple[int, int] = (24, 18),
    size: tuple[float, float] = (600e3, 400e3),
    f0: float = F,
    beta: float = 0.0,
    plane: Any = "f",
    depth: Array | float = 200.0,
    gravity: float = 9.81,
    slip: Any = "free",
) -> Basin:
    """Lay out a basin round x = y = 0; cells are not square unless asked for."""
    (nx, ny), (Lx, Ly) = cells, size
    grid = Grid(nx, ny, Lx / nx, Ly / ny, -Lx / 2, -Ly / 2, *EDGES[edges], slip=slip)
    frame = Frame(plane, None, None, f0, beta, gravity, abs(f0) / 2, 6.371e6)
    return Basin(grid, frame, gravity, depth, float(np.mean(depth)))


def uneven_depth(cells: tuple[int, int]) -> Array:
    """Return a smooth bank, periodic in both directions, 120 to 280 m."""
    nx, ny = cells
    x, y = 2 * np.pi * (np.arange(nx) + 0.5) / nx, 2 * np.pi * (np.arange(ny) + 0.5) / ny
    return 200 + 40 * (np.cos(x)[None, :] + np.sin(y)[:, None])


def equations(basin: Basin, pv_flux: str = "both") -> Callable[[Array, Array, Array, bool], tuple[Array, Array, Array]]:
    """Return the plain equations over the basin."""
    grid = basin.grid

    def rates(u: Array, v: Array, eta: Array, linear: bool) -> tuple[Array, Array, Array]:
        return tendency(
            u,
            v,
            eta,
            depth=basin.depth,
            f=basin.f,
            gravity=basin.gravity,
            dx=grid.dx,
            dy=grid.dy,
            edges=(grid.west, grid.east, grid.south, grid.north),
            slip=grid.slip,
            pv_flux=pv_flux,
            linear=linear,
        )

    return rates


def start(basin: Basin, *parts: Any, pv_flux: str = "both", folder: Path | None = None) -> StartFields:
    """Build a start over the basin."""
    return build_start(parts, basin, equations(basin, pv_flux), folder or Path("/nowhere"))


def divergence(du: Array, dv: Array, grid: Grid) -> Array:
    """Divergence at centres from faces."""
    return np.diff(du, axis=1) / grid.dx + np.diff(dv, axis=0) / grid.dy


def vorticity_inside(u: Array, v: Array, grid: Grid) -> Array:
    """Vorticity at the corners that lie on no side of the domain."""
    return np.diff(v, axis=1)[1:-1, :] / grid.dx - np.diff(u, axis=0)[:, 1:-1] / grid.dy


def largest(*fields: Array) -> float:
    """Largest magnitude."""
    return max(float(np.abs(field).max()) for field in fields)


def read(kind: str, **keys: Any) -> Any:
    """Read a start as a configuration has it."""
    return TypeAdapter(StartSettings).validate_python({"kind": kind, **keys})


def refusal(basin: Basin, *parts: Any) -> list[Fault]:
    """Return the faults for which a start is refused."""
    with pytest.raises(RequestError) as refused:
        start(basin, *parts)
    return refused.value.faults
