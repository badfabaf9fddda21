"""What a measure measures: the fields and time series of one run, from disk or from memory."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..diagnostics.derived import Side, derive
from ..grid import Basin, Grid
from ..store.names import FIELDS, SERIES

Array = NDArray[np.float64]
Along = Literal["x", "y"]

HALF_A_TICK = 5e-7  # s: times are whole microseconds


@dataclass(frozen=True)
class Record:
    """The fields and time series of a run.

    Parameters
    ----------
    basin : Basin
        Where the flow lives.
    times : ndarray ``[n]``
        Times of the snapshots, s.
    names : sequence of str
        Fields that were stored.
    read : callable
        Name and number of a snapshot to the stored field, ``[y, x]``, with both ends.
    series_times : ndarray ``[m]``
        Times of the time series, s.
    series : mapping of str to ndarray ``[m]``
        Sums and extremes against time.
    linear : bool
        Whether the equations are the linear ones.
    x, y, x_face, y_face : ndarray
        Where the stored values lie, m.
    depth : ndarray ``[ny, nx]`` or float
        Thickness at rest at the stored centres, m.
    f : ndarray ``[ny + 1, nx + 1]``
        Coriolis parameter at the stored corners, rad/s.
    """

    basin: Basin
    times: Array
    names: Sequence[str]
    read: Callable[[str, int], NDArray[Any]]
    series_times: Array
    series: Mapping[str, Array]
    linear: bool
    x: Array
    y: Array
    x_face: Array
    y_face: Array
    depth: Array | float
    f: Array

    @classmethod
    def from_memory(
        cls,
        basin: Basin,
        times: Array,
        fields: Mapping[str, NDArray[Any]],
        *,
        series_times: Array | None = None,
        series: Mapping[str, Array] | None = None,
        linear: bool = False,
    ) -> Record:
        """Take arrays that cover the whole domain.

        Parameters
        ----------
        basin : Basin
            Where the flow lives.
        times : ndarray ``[n]``
            Times of the snapshots, s.
        fields : mapping of str to ndarray ``[n, y, x]``
            Fields with both ends at every time.
        series_times : ndarray ``[m]``
            Times of the time series, s; those of the snapshots by default.
        series : mapping of str to ndarray ``[m]``
            Time series.
        linear : bool
            Whether the equations are the linear ones.
        """
        grid = basin.grid
        return cls(
            basin=basin,
            times=times,
            names=tuple(fields),
            read=lambda name, k: fields[name][k],
            series_times=times if series_times is None else series_times,
            series=series or {},
            linear=linear,
            x=grid.x,
            y=grid.y,
            x_face=grid.x_face,
            y_face=grid.y_face,
            depth=basin.depth,
            f=basin.f,
        )

    @classmethod
    def from_run(cls, run: Any, basin: Basin, linear: bool) -> Record:
        """Take what a run left on disk.

        Parameters
        ----------
        run : Run
            The run, read back; its `fields` and `series` are used.
        basin : Basin
            Where its flow lived.
        linear : bool
            Whether its equations were the linear ones.
        """
        fields, series = run.fields, run.series
        return cls(
            basin=basin,
            times=np.asarray(fields.times, np.float64),
            names=tuple(fields.names),
            read=fields.field,
            series_times=np.asarray(series.time, np.float64),
            series={name: np.asarray(series[name], np.float64) for name in series.names},
            linear=linear,
            x=np.asarray(fields.x, np.float64),
            y=np.asarray(fields.y, np.float64),
            x_face=np.asarray(fields.x_face, np.float64),
            y_face=np.asarray(fields.y_face, np.float64),
            depth=np.asarray(fields.depth, np.float64),
            f=np.asarray(fields.f, np.float64),
        )

    @classmethod
    def planned(
        cls,
        basin: Basin,
        times: Array,
        names: Sequence[str],
        *,
        series_times: Array,
        series: Sequence[str] = tuple(SERIES),
        linear: bool = False,
        axes: tuple[Array, Array, Array, Array] | None = None,
    ) -> Record:
        """Say what a run that has not begun will leave; its values cannot be read.

        Parameters
        ----------
        basin, times, names, series_times, linear
            As in `Record`.
        series : sequence of str
            Names of the time series.
        axes : tuple of ndarray or None
            x, y, x_face and y_face of what will be stored, m; those of the whole domain by default.
        """
        grid = basin.grid
        x, y, x_face, y_face = axes or (grid.x, grid.y, grid.x_face, grid.y_face)
        none = {name: np.zeros(0) for name in series}
        nowhere = np.zeros((0, 0))
        return cls(basin, times, names, _unread, series_times, none, linear, x, y, x_face, y_face, nowhere, nowhere)

    @property
    def dx(self) -> float:
        """Distance between stored centres along x, m."""
        return float(self.x_face[-1] - self.x_face[0]) / self.x.size

    @property
    def dy(self) -> float:
        """Distance between stored centres along y, m."""
        return float(self.y_face[-1] - self.y_face[0]) / self.y.size

    @property
    def edges(self) -> tuple[Side, Side, Side, Side]:
        """What lies west, east, south and north of the stored values; ``"cut"`` where only a part was stored."""
        return stored_edges(self.basin.grid, self.x_face, self.y_face)

    def field(self, name: str, k: int) -> Array:
        """Return a field of snapshot `k`, stored or computed from eta, u and v, with both ends; NaN on land."""
        if name in self.names:
            return np.asarray(self.read(name, k), np.float64)
        derived = derive(
            name,
            self.field("u", k),
            self.field("v", k),
            self.field("eta", k),
            depth=self.depth,
            f=self.f,
            dx=self.dx,
            dy=self.dy,
            edges=self.edges,
            slip=self.basin.grid.slip,
            linear=self.linear,
        )
        return np.asarray(derived, np.float64)

    def axes(self, name: str) -> tuple[Array, Array]:
        """Return x and y of the points of a field, m."""
        return points_of(name, self.x, self.y, self.x_face, self.y_face)


def _unread(name: str, k: int) -> NDArray[Any]:
    raise LookupError(f"the run has not begun: there is no {name} of snapshot {k}")


def si(unit: str) -> str:
    """Write a unit of the files, ``m s-1``, as `quantities` does, ``m/s``."""
    above: list[str] = []
    below: list[str] = []
    for factor in unit.split():
        name, power = re.fullmatch(r"([A-Za-z]+|1)(-?\d*)", factor).groups()  # type: ignore[union-attr]
        size = power.lstrip("-")
        (below if power.startswith("-") else above).append(name if size in ("", "1") else f"{name}^{size}")
    return "/".join([" ".join(above) or "1", *below])


def points_of(name: str, x: Array, y: Array, x_face: Array, y_face: Array) -> tuple[Array, Array]:
    """Pick the x and the y at which a field lies, m."""
    location = FIELDS[name].location
    return (x_face if location in ("u", "corner") else x), (y_face if location in ("v", "corner") else y)


def stored_edges(grid: Grid, x_face: Array, y_face: Array) -> tuple[Side, Side, Side, Side]:
    """Name what lies beyond the four sides of stored values."""
    whole_x = x_face[-1] - x_face[0] > (grid.nx - 0.5) * grid.dx
    whole_y = y_face[-1] - y_face[0] > (grid.ny - 0.5) * grid.dy
    at_wall = (
        abs(x_face[0] - grid.x_face[0]) < grid.dx / 2,
        abs(x_face[-1] - grid.x_face[-1]) < grid.dx / 2,
        abs(y_face[0] - grid.y_face[0]) < grid.dy / 2,
        abs(y_face[-1] - grid.y_face[-1]) < grid.dy / 2,
    )

    def side(edge: Literal["periodic", "wall"], whole: bool, wall: bool) -> Side:
        return edge if (whole if edge == "periodic" else wall) else "cut"

    return (
        side(grid.west, bool(whole_x), bool(at_wall[0])),
        side(grid.east, bool(whole_x), bool(at_wall[1])),
        side(grid.south, bool(whole_y), bool(at_wall[2])),
        side(grid.north, bool(whole_y), bool(at_wall[3])),
    )


def chosen(times: Array, during: tuple[float, float] | float | None, *, last: bool) -> NDArray[np.intp]:
    """Pick the numbers of the snapshots that a measure uses.

    Parameters
    ----------
    times : ndarray
        Times of all snapshots, s.
    during : tuple of float, float or None
        First and last time, both included, or one time, s.
    last : bool
        What None means: the last snapshot alone, or all.
    """
    if during is None:
        return np.arange(times.size)[-1:] if last else np.arange(times.size)
    first, final = during if isinstance(during, tuple) else (during, during)
    return np.flatnonzero((times >= first - HALF_A_TICK) & (times <= final + HALF_A_TICK))
