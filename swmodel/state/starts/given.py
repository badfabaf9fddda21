"""Starts that are given: as formulas, in a file, or by another run."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal, Self

import numpy as np
from pydantic import Field

from ...errors import Fault, RequestError
from ...fields import FileVariable, LengthField, SpeedField, evaluate
from ...fields.files import Stored, load
from ...grid.basin import Basin
from ...grid.staggered import Grid, Location
from ...quantities import Length, Time
from .base import Array, Fields, Start

SNAPSHOTS = "snapshots.h5"
_WHERE: tuple[tuple[str, Location], ...] = (("u", "u"), ("v", "v"), ("eta", "centre"))


class FormulaStart(Start):
    """`kind = "formula"`: eta, u and v as fields, each at its own points."""

    meaning: ClassVar[str] = "eta, u and v as formulas, numbers or file variables; what is not given is 0"
    source: ClassVar[str] = "common practice"

    kind: Literal["formula"] = "formula"
    eta: Annotated[LengthField, Field(description="elevation, at centres")] = 0.0
    u: Annotated[SpeedField, Field(description="velocity along x, at x-faces")] = 0.0
    v: Annotated[SpeedField, Field(description="velocity along y, at y-faces")] = 0.0
    at: Annotated[tuple[Length, Length], Field(description="[x, y] that the formulas count from")] = (0.0, 0.0)

    def fields(self, basin: Basin) -> Fields:
        """Evaluate each field at its own points."""
        faults = []
        values = {}
        for name, location in _WHERE:
            x, y = basin.grid.points(location)
            try:
                field = evaluate(getattr(self, name), x - self.at[0], y - self.at[1], basin.constants, key=(name,))
            except RequestError as error:
                faults += error.faults
                continue
            values[name] = np.array(np.broadcast_to(field, basin.grid.shape(location)))
        if faults:
            raise RequestError(faults)
        return values["u"], values["v"], values["eta"]

    def scale(self, basin: Basin) -> float:
        """Return the deformation radius."""
        return basin.deformation_radius

    def beside(self, folder: Path) -> Self:
        """Return the same start with the files it names taken relative to `folder`."""
        named: dict[str, Any] = {name: getattr(self, name) for name, _location in _WHERE}
        moved = {
            name: value.model_copy(update={"file": folder / value.file})
            for name, value in named.items()
            if isinstance(value, FileVariable)
        }
        return self.model_copy(update=moved)


class FileStart(Start):
    """`kind = "file"`: eta, u and v from a file."""

    meaning: ClassVar[str] = "eta, u and v from an HDF5, netCDF or .npy file, interpolated where its grid is another"
    source: ClassVar[str] = "common practice"

    kind: Literal["file"] = "file"
    file: Annotated[Path, Field(description="relative to the configuration")]
    eta: Annotated[str, Field(description="name of the variable in the file")] = "eta"
    u: Annotated[str, Field(description="name of the variable in the file")] = "u"
    v: Annotated[str, Field(description="name of the variable in the file")] = "v"
    time: Annotated[Time | None, Field(description="which time of the file; the last by default")] = None

    def fields(self, basin: Basin) -> Fields:
        """Read the file, and interpolate linearly where its points are others."""
        u, v, eta = (
            on_grid(stored, basin.grid, location, str(self.file))
            for stored, (_name, location) in zip(self._load(), _WHERE, strict=True)
        )
        return u, v, eta

    def scale(self, basin: Basin) -> float:
        """Return the deformation radius."""
        return basin.deformation_radius

    def beside(self, folder: Path) -> Self:
        """Return the same start with its file taken relative to `folder`."""
        return self.model_copy(update={"file": folder / self.file})

    def _load(self) -> list[Stored]:
        alone = 'for an elevation alone: kind = "formula" with eta = { file = "...", variable = "..." }'
        return load_state(self.file, (self.u, self.v, self.eta), self.time, alone)


class RunStart(Start):
    """`kind = "run"`: a snapshot of another run."""

    meaning: ClassVar[str] = "the last or any other snapshot of another run over the same cells, to the last bit"
    source: ClassVar[str] = "common practice"

    kind: Literal["run"] = "run"
    run: Annotated[Path, Field(description="folder of the run, relative to the configuration")]
    time: Annotated[Time | None, Field(description="model time of the snapshot; the last by default")] = None

    def fields(self, basin: Basin) -> Fields:
        """Read the snapshot."""
        grid = basin.grid
        file = self.run / SNAPSHOTS
        if not file.is_file():
            raise RequestError(
                Fault(("run",), f"{self.run} holds no {SNAPSHOTS}", "the folder of a run that has stored snapshots")
            )
        u, v, eta = load_state(file, ("u", "v", "eta"), self.time, "")
        size = tuple(_extent(points) for points in (u.x, v.y))
        own = (grid.Lx, grid.Ly)
        same_cells = all(
            stored.values.shape == grid.shape(location)
            for stored, (_name, location) in zip((u, v, eta), _WHERE, strict=True)
        )
        if not same_cells or not np.allclose(size, own, rtol=1e-9, atol=0.0):  # round-off of coordinates at most
            ny, nx = eta.values.shape
            raise RequestError(
                Fault(
                    ("run",),
                    f"its snapshots hold {nx} x {ny} cells over {size[0]:.6g} m x {size[1]:.6g} m",
                    f"the same cells and size as here: {grid.nx} x {grid.ny} over {own[0]:.6g} m x {own[1]:.6g} m",
                    'kind = "file" interpolates between grids',
                )
            )
        for stored, name in ((u, "u"), (v, "v"), (eta, "eta")):
            _refuse_gaps(stored.values, name, str(file), "run")
        return u.values, v.values, eta.values

    def scale(self, basin: Basin) -> float:
        """Return the deformation radius."""
        return basin.deformation_radius

    def beside(self, folder: Path) -> Self:
        """Return the same start with its folder taken relative to `folder`."""
        return self.model_copy(update={"run": folder / self.run})


def load_state(file: Path, names: tuple[str, str, str], time: float | None, remedy: str) -> list[Stored]:
    """Read u, v and eta at one time; every fault at once, `remedy` where none is known.

    Raises
    ------
    RequestError
        Where the file, a variable or the time is missing.
    """
    faults: list[Fault] = []
    found = []
    for name, (key, _location) in zip(names, _WHERE, strict=True):
        try:
            found.append(load(file, name, (key,), "last" if time is None else time))
        except RequestError as error:
            faults += [replace(fault, remedy=fault.remedy or remedy) for fault in error.faults]
    if faults:
        raise RequestError(faults)
    return found


def on_grid(stored: Stored, grid: Grid, location: Location, file: str) -> Array:
    """Return a stored field at the points of a location: as it is where it fits, else by linear interpolation.

    In a periodic direction the file goes round. At walls the outermost values hold for half a spacing more, and the
    velocity through them goes to 0.

    Parameters
    ----------
    stored : Stored
        The field, with its coordinates where it has some.
    grid : Grid
        The grid.
    location : str
        Where the values are wanted.
    file : str
        Its name, for messages.

    Raises
    ------
    RequestError
        Where the shape does not fit and there are no coordinates, the file does not cover the domain, or values are
        missing.
    """
    name = "eta" if location == "centre" else location
    wanted = grid.axes(location)
    fits = stored.values.shape == grid.shape(location)
    if stored.x is None or stored.y is None:
        if not fits:
            sizes = " x ".join(str(n) for n in reversed(stored.values.shape))
            here = " x ".join(str(n) for n in reversed(grid.shape(location)))
            raise RequestError(
                Fault(
                    (name,),
                    f"{file} holds {sizes} values (x, y) of it without coordinates",
                    f"{here}, as here, or coordinates to interpolate between",
                )
            )
        _refuse_gaps(stored.values, name, file, name)
        return stored.values
    _refuse_gaps(stored.values, name, file, name)
    spacings = (grid.dx, grid.dy)
    if fits and all(
        np.allclose(own, points, rtol=0.0, atol=1e-9 * spacing)  # round-off of coordinates at most
        for own, points, spacing in zip((stored.x, stored.y), wanted, spacings, strict=True)
    ):
        return stored.values
    values = stored.values
    if grid.periodic_x:
        xs, values = _round(stored.x, values, 1, grid.Lx)
    else:
        xs, values = _to_walls(stored.x, values, 1, grid.x_face if location == "u" else None)
    if grid.periodic_y:
        ys, values = _round(stored.y, values, 0, grid.Ly)
    else:
        ys, values = _to_walls(stored.y, values, 0, grid.y_face if location == "v" else None)
    faults = [
        Fault(
            (name,),
            f"{file} reaches from {axis} = {own[0]:.6g} m to {own[-1]:.6g} m, "
            f"and {axis} = {points[0]:.6g} m to {points[-1]:.6g} m is asked for",
            "a file must cover the domain; nothing is extrapolated",
        )
        for axis, own, points in (("x", xs, wanted[0]), ("y", ys, wanted[1]))
        if own[0] > points[0] + 1e-9 * np.ptp(points) or own[-1] < points[-1] - 1e-9 * np.ptp(points)
    ]
    if faults:
        raise RequestError(faults)
    return _linear(xs, ys, values, *wanted)


def _rising(own: Array, values: Array, axis: int) -> tuple[Array, Array]:
    """Return coordinates in rising order, and the values with them."""
    order = np.argsort(own)
    return own[order], np.take(values, order, axis)


def _round(own: Array, values: Array, axis: int, period: float) -> tuple[Array, Array]:
    """Return coordinates and values carried on round a period, where the file holds a whole one."""
    own, values = _rising(own, values, axis)
    once = own < own[0] + period * (1 - 1e-9)  # the last may repeat the first
    own, values = own[once], np.compress(once, values, axis)
    widest = float(np.max(np.diff(own), initial=0.0)) or period
    if own[0] + period - own[-1] > 1.5 * widest:  # what is left at the seam is no spacing
        return own, values
    return np.concatenate((own - period, own, own + period)), np.concatenate((values,) * 3, axis)


def _to_walls(own: Array, values: Array, axis: int, shut: Array | None) -> tuple[Array, Array]:
    """Return coordinates and values carried on by half a spacing: level, or where walls are `shut` to 0 on them."""
    own, values = _rising(own, values, axis)
    if own.size == 1:
        return own, values
    first, last = own[0] - (own[1] - own[0]) / 2, own[-1] + (own[-1] - own[-2]) / 2
    ends = np.take(values, [0, -1], axis)
    if shut is not None:
        slack = 1e-9 * (last - first)
        if own[0] > shut[0] >= first - slack:
            first = shut[0]
            ends[(slice(None), 0) if axis else 0] = 0.0
        if own[-1] < shut[-1] <= last + slack:
            last = shut[-1]
            ends[(slice(None), 1) if axis else 1] = 0.0
    low, high = np.split(ends, 2, axis)
    return np.concatenate(([first], own, [last])), np.concatenate((low, values, high), axis)


def _linear(xs: Array, ys: Array, values: Array, x: Array, y: Array) -> Array:
    from scipy.interpolate import RegularGridInterpolator

    inside = np.clip(y, ys[0], ys[-1])[:, None], np.clip(x, xs[0], xs[-1])[None, :]
    return np.asarray(RegularGridInterpolator((ys, xs), values)(inside), np.float64)


def _extent(points: Array | None) -> float:
    """Distance from the first to the last of coordinates, NaN without them."""
    return float(points[-1] - points[0]) if points is not None else float("nan")


def _refuse_gaps(values: Array, name: str, file: str, key: str) -> None:
    missing = int(np.size(values) - np.count_nonzero(np.isfinite(values)))
    if missing:
        found = f"{missing} of {values.size} values of {name} in {file} are missing or not finite"
        raise RequestError(Fault((key,), found, "every value must be finite"))
