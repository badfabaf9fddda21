"""Time series: diagnostics.h5, rewritten beside and renamed, seldom enough never to hold the run up."""

from __future__ import annotations

import datetime
import time as clock
from array import array
from collections.abc import Mapping
from pathlib import Path

import h5py

from ..errors import MachineError, RequestError
from .durable import hdf5_beside
from .layout import TIME_CHUNK, add_provenance, add_time, attach, set_times
from .names import BUDGETS, SERIES, SeriesName
from .provenance import Provenance

DIAGNOSTICS = "diagnostics.h5"

FLUSH_SECONDS = 0.5  # rows of the last half second are not yet on the disk
FLUSH_SHARE = 0.02  # of the wall clock is spent on writing rows, however many there are

Group = Mapping[str, float]


class SeriesWriter:
    """Keeps the rows of all time series, and writes them all now and then.

    The whole file is rewritten each time; the longer that takes, the longer it waits before the next. A checkpoint
    writes the rows first, so that what a resumed run needs is always on the disk.

    Parameters
    ----------
    folder : Path
        The run's folder.
    epoch : datetime
        Date of model time 0.
    provenance : Provenance
        What made the run.
    """

    def __init__(self, folder: Path, epoch: datetime.datetime, provenance: Provenance) -> None:
        self.path = folder / DIAGNOSTICS
        self.epoch = epoch
        self.provenance = provenance
        self.times = array("d")
        self._columns: dict[tuple[str, str], array[float]] = {}
        self._unwritten = False
        self._due = clock.monotonic() + FLUSH_SECONDS

    def append(self, time: float, values: Group, groups: Mapping[str, Group]) -> None:
        """Take one row, and write all if it is time.

        Parameters
        ----------
        time : float
            Model time, s.
        values : mapping of str to float
            Sums and extremes.
        groups : mapping of str to mapping
            Terms of each budget.
        """
        row = {("", name): value for name, value in values.items()}
        row |= {(group, name): value for group, terms in groups.items() for name, value in terms.items()}
        if not self.times:
            self._columns = {key: array("d") for key in row if _described(key)}
        if row.keys() != self._columns.keys():
            changed = sorted("/".join(key).strip("/") for key in row.keys() ^ self._columns.keys())
            raise ValueError(f"a row of diagnostics has the names of the first one; these differ: {', '.join(changed)}")
        self.times.append(time)
        for key, value in row.items():
            self._columns[key].append(value)
        self._unwritten = True
        if clock.monotonic() >= self._due:
            self.flush()

    def flush(self) -> None:
        """Write every row; on return they will survive anything."""
        if not self._unwritten:
            return
        began = clock.monotonic()
        with hdf5_beside(self.path) as file:
            add_provenance(file, self.provenance)
            axis = add_time(file, self.epoch)
            set_times(file, self.times)
            for (group, name), values in self._columns.items():
                home = _group(file, group) if group else file
                chunks = (TIME_CHUNK,)
                dataset = home.create_dataset(name, data=values, maxshape=(None,), chunks=chunks, track_order=True)
                dataset.dims[0].attach_scale(axis)
                row = _described((group, name))
                attach(dataset, units=row.units, long_name=row.long_name, cell_methods="time: point")
        self._unwritten = False
        took = clock.monotonic() - began
        self._due = clock.monotonic() + max(FLUSH_SECONDS, took / FLUSH_SHARE)

    def restore(self, until: float) -> int:
        """Take up the rows on the disk, and drop those later than a time.

        Parameters
        ----------
        until : float
            Time of the checkpoint from which the run goes on, s.

        Returns
        -------
        int
            How many rows were dropped.
        """
        if not self.path.exists():
            return 0
        try:
            with h5py.File(self.path) as file:
                experiment = bytes(file.attrs["experiment"]).decode()
                times = file["time"][()]
                columns = {("", name): file[name][()] for name in file if name in SERIES}
                groups = [name for name in file if name in BUDGETS]
                columns |= {(group, name): file[group][name][()] for group in groups for name in file[group]}
        except (OSError, KeyError) as error:
            raise MachineError(f"{self.path} cannot be read: {error}") from error
        if experiment != self.provenance.experiment:
            raise RequestError(f"{self.path} belongs to another experiment")
        kept = times <= until
        self.times = array("d", times[kept])
        self._columns = {key: array("d", values[kept]) for key, values in columns.items()}
        self._unwritten = not kept.all()
        return int((~kept).sum())


def _described(key: tuple[str, str]) -> SeriesName:
    """What the file says of a series; a term of a budget is named after both."""
    group, name = key
    if group:
        budget = BUDGETS.get(group)
        if budget is None:
            raise ValueError(f"{group} has no row in store/names.py: BUDGETS")
        return SeriesName(budget.units, f"{budget.long_name}: {name.replace('_', ' ')}")
    if name not in SERIES:
        raise ValueError(f"{name} has no row in store/names.py: SERIES")
    return SERIES[name]


def _group(file: h5py.File, name: str) -> h5py.Group:
    return file[name] if name in file else file.create_group(name, track_order=True)
