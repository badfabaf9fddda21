"""Reading a run's folder, during the run, after it, and after a crash."""

from __future__ import annotations

import datetime
import json
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from ..errors import MachineError, RequestError
from .names import FIELDS
from .parts import SNAPSHOTS
from .series import DIAGNOSTICS
from .writer import CONFIGURATION, SETTINGS

VERDICT = "verdict.json"

Array = NDArray[np.float64]


class Run:
    """A run's folder, as it is when first looked into; make another `Run` to see what came since.

    Parameters
    ----------
    folder : Path or str
        The folder.

    Raises
    ------
    RequestError
        Where it is not a run's folder.
    """

    def __init__(self, folder: Path | str) -> None:
        self.folder = Path(folder)
        if not (self.folder / SETTINGS).is_file():
            raise RequestError(f"{self.folder} is not a run's folder: it holds no {SETTINGS}")

    def __repr__(self) -> str:
        return f"Run({str(self.folder)!r})"

    @cached_property
    def config_text(self) -> str:
        """The configuration, verbatim."""
        return (self.folder / CONFIGURATION).read_bytes().decode()

    @cached_property
    def settings(self) -> dict[str, Any]:
        """Everything after overrides, with defaults filled."""
        return dict(json.loads((self.folder / SETTINGS).read_text("utf-8")))

    def verdict(self) -> dict[str, Any]:
        """Return what verdict.json says.

        Raises
        ------
        RequestError
            Where the run was not judged yet.
        """
        path = self.folder / VERDICT
        if not path.is_file():
            raise RequestError(f"{self.folder} holds no {VERDICT}: it was not judged yet")
        return dict(json.loads(path.read_text("utf-8")))

    def snapshots(self) -> Any:
        """Open the snapshots as an ``xarray.Dataset``; without xarray, as an ``h5py.File``.

        Raises
        ------
        RequestError
            Where there is none yet.
        MachineError
            Where a part of them is missing.
        """
        self.fields.check_parts()
        return _open(self.folder / SNAPSHOTS)

    def diagnostics(self, group: str | None = None) -> Any:
        """Open the time series as an ``xarray.Dataset``; without xarray, as an ``h5py.File``.

        Parameters
        ----------
        group : str, optional
            A budget, for example ``"energy_budget"``.

        Raises
        ------
        RequestError
            Where there is none yet.
        """
        path = self.folder / DIAGNOSTICS
        if not path.is_file():
            raise RequestError(f"{self.folder} holds no diagnostics yet")
        return _open(path, group)

    @cached_property
    def fields(self) -> Snapshots:
        """The snapshots as plain numbers."""
        return Snapshots(self.folder / SNAPSHOTS)

    @cached_property
    def series(self) -> Series:
        """The time series as plain numbers; empty where there is none yet."""
        return Series(self.folder / DIAGNOSTICS)


def _open(path: Path, group: str | None = None) -> Any:
    try:
        import xarray
    except ImportError:
        file = h5py.File(path)
        return file[group] if group else file
    dataset = xarray.open_dataset(path, engine="h5netcdf")
    if group is None:
        return dataset
    with dataset:
        return xarray.open_dataset(path, engine="h5netcdf", group=group).assign_coords(time=dataset["time"].load())


class Snapshots:
    """The fields of a run at its output times, as plain numbers.

    A missing part would read as NaN through the index; so each snapshot is read from its own part.

    Parameters
    ----------
    path : Path
        ``snapshots.h5``, plain or an index.

    Attributes
    ----------
    times : ndarray ``[n]``
        Model times, s.
    x, y, x_face, y_face : ndarray
        Coordinates of what is stored, m.
    names : tuple of str
        Fields that are stored.
    depth, f : ndarray
        Thickness at rest at centres, m, and Coriolis parameter at corners, rad/s.
    attributes : dict of str to str
        Global attributes of the file.
    epoch : datetime
        Date of model time 0, UTC.

    Raises
    ------
    RequestError
        Where there is none yet.
    MachineError
        Where it cannot be read.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self._last: tuple[Path, h5py.File] | None = None
        if not path.is_file():
            raise RequestError(f"{path.parent} holds no snapshots yet")
        with _opened(path) as file:
            self.times: Array = np.asarray(file["time"], np.float64)
            self.epoch = _epoch(file["time"])
            self.x: Array = file["x"][()]
            self.y: Array = file["y"][()]
            self.x_face: Array = file["x_face"][()]
            self.y_face: Array = file["y_face"][()]
            self.names = tuple(name for name in file if name in FIELDS)
            self.attributes = {name: _text(value) for name, value in file.attrs.items()}
            self._pieces = _pieces(path, file[self.names[0]])
            still = _pieces(path, file["depth"])[0].path
        with _opened(still) as file:
            self.depth: Array = file["depth"][()]
            self.f: Array = file["f"][()]

    def __len__(self) -> int:
        return self.times.size

    def field(self, name: str, index: int) -> Array:
        """Return a stored field of one snapshot, ``[y, x]`` with both ends; NaN on land.

        Parameters
        ----------
        name : str
            One of `names`.
        index : int
            Number of the snapshot; negative counts from the last.

        Raises
        ------
        MachineError
            Where the part that holds it is missing or unreadable.
        """
        if name not in self.names:
            raise KeyError(f"{name} was not stored; there are {', '.join(self.names)}")
        if not -len(self) <= index < len(self):
            raise IndexError(f"there are {len(self)} snapshots, and none of number {index}")
        k = index % len(self)
        piece = self._piece(k)
        if not piece.path.exists():  # the run made one part of several since, or one file of all
            with _opened(self.path) as file:
                self._pieces = _pieces(self.path, file[name])
            piece = self._piece(k)
        return np.asarray(self._file(piece.path)[name][k - piece.first], np.float64)

    def check_parts(self) -> None:
        """See that every snapshot the index names is there.

        Raises
        ------
        MachineError
            Where a part is missing or unreadable.
        """
        for piece in self._pieces:
            if len(self._file(piece.path)["time"]) < piece.count:
                raise MachineError(f"{piece.path} holds fewer than {piece.count} snapshots")

    def _piece(self, k: int) -> _Piece:
        return next(piece for piece in self._pieces if piece.first <= k < piece.first + piece.count)

    def _file(self, path: Path) -> h5py.File:
        """Keep the file that was read last open: the next snapshot mostly lies in it."""
        if self._last is None or self._last[0] != path:
            if self._last is not None:
                self._last[1].close()
                self._last = None
            self._last = (path, _opened(path))
        return self._last[1]


@dataclass(frozen=True)
class _Piece:
    """Where some snapshots that follow each other lie."""

    first: int
    count: int
    path: Path


def _pieces(path: Path, dataset: h5py.Dataset) -> list[_Piece]:
    """Find in which files the values of a dataset of `path` lie."""
    if not dataset.is_virtual:
        return [_Piece(0, len(dataset), path)]
    pieces = []
    for source in dataset.virtual_sources():
        low, high = source.vspace.get_select_bounds()
        pieces.append(_Piece(low[0], high[0] - low[0] + 1, path.parent / source.file_name))
    return pieces


class Series:
    """The time series of a run, as plain numbers.

    Parameters
    ----------
    path : Path
        ``diagnostics.h5``; where it is missing there are no rows and no names.

    Attributes
    ----------
    time : ndarray ``[n]``
        Model times, s.
    names : tuple of str
        Sums and extremes; ``series[name]`` is an ndarray ``[n]``.
    groups : tuple of str
        Budgets.

    Raises
    ------
    MachineError
        Where the file cannot be read.
    """

    def __init__(self, path: Path) -> None:
        self.time: Array = np.zeros(0)
        self._values: dict[str, Array] = {}
        self._groups: dict[str, dict[str, Array]] = {}
        if path.is_file():
            with _opened(path) as file:
                self.time = file["time"][()]
                self._values = _columns(file)
                self._groups = {name: _columns(item) for name, item in file.items() if isinstance(item, h5py.Group)}
        self.names = tuple(self._values)
        self.groups = tuple(self._groups)

    def __getitem__(self, name: str) -> Array:
        return self._values[name]

    def group(self, name: str) -> dict[str, Array]:
        """Return the terms of a budget, ndarray ``[n]`` each."""
        return self._groups[name]


def _columns(home: h5py.Group) -> dict[str, Array]:
    return {
        name: item[()]
        for name, item in home.items()
        if isinstance(item, h5py.Dataset) and item.ndim == 1 and name != "time"
    }


def _opened(path: Path) -> h5py.File:
    try:
        return h5py.File(path)
    except OSError as error:
        reason = "it is missing" if isinstance(error, FileNotFoundError) else str(error)
        raise MachineError(f"cannot read {path}: {reason}") from error


def _text(value: Any) -> str:
    return value.decode() if isinstance(value, bytes) else str(value)


def _epoch(axis: h5py.Dataset) -> datetime.datetime:
    return datetime.datetime.fromisoformat(_text(axis.attrs["units"]).removeprefix("seconds since "))
