"""Snapshots of a running run: part files, each whole at any instant, under an index that joins them.

A file that grows can be cut in the middle of a write and then lost as a whole. So a snapshot becomes a file of its own
that appears under its name only when the disk has it; ``snapshots.h5`` is rewritten in the same manner and shows all
parts as one dataset (an HDF5 virtual dataset). Sixteen parts of one size become one, so that the index stays short. At
the orderly end everything becomes one plain file.

The parts that became one are kept until the next time: whoever opened the index before can still read it.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import h5py
from numpy.typing import NDArray

from ..errors import MachineError, RequestError
from .durable import hdf5_beside, make_folder, remove, second_name
from .layout import Layout, chunks_of, set_times
from .names import FIELDS, STILL_FIELDS

SNAPSHOTS = "snapshots.h5"
PARTS = "parts"
STILL = "still.h5"

TOGETHER = 16  # so many parts of one size become one: the index of 2000 snapshots names at most 45
TOGETHER_BYTES = 512 << 20  # larger groups stay apart: joining them would hold the run up, and gain nothing


@dataclass(frozen=True)
class Part:
    """Snapshots that lie together in one file.

    Parameters
    ----------
    first, count : int
        Number of the first, and how many.
    """

    first: int
    count: int

    @property
    def name(self) -> str:
        """Name of the file."""
        return f"snapshots-{self.first:08d}-{self.count:08d}.h5"

    @property
    def beyond(self) -> int:
        """Number of the first snapshot after it."""
        return self.first + self.count

    @classmethod
    def from_name(cls, name: str) -> Part | None:
        """Read the name of a file; None where it is no part's."""
        found = re.fullmatch(r"snapshots-(\d{8})-(\d{8})\.h5", name)
        return cls(int(found[1]), int(found[2])) if found else None


class SnapshotParts:
    """Writes snapshots so that none that was acknowledged is lost, whatever happens.

    Parameters
    ----------
    folder : Path
        The run's folder.
    layout : Layout
        What is in a file.
    still : mapping of str to ndarray
        Depth and f as they are stored.
    """

    def __init__(self, folder: Path, layout: Layout, still: Mapping[str, NDArray[Any]]) -> None:
        self.index = folder / SNAPSHOTS
        self.folder = folder / PARTS
        self.layout = layout
        self.parts: list[Part] = []
        self.times: list[float] = []
        self._joined_before: list[Part] = []
        self._index_template = layout.index_template(f"{PARTS}/{STILL}")
        make_folder(self.folder)
        if not (self.folder / STILL).exists():
            with hdf5_beside(self.folder / STILL, layout.plain_template) as file:
                layout.add_still_fields(file, still)

    def append(self, time: float, values: Mapping[str, NDArray[Any]]) -> None:
        """Store one snapshot; on return it will survive anything.

        Parameters
        ----------
        time : float
            Model time, s.
        values : mapping of str to ndarray ``[y, x]``
            The fields as they are stored.
        """
        part = Part(len(self.times), 1)
        with hdf5_beside(self.folder / part.name, self.layout.plain_template, sync_name=False) as file:
            self.layout.make_room(file, [time])
            self.layout.write_snapshot(file, 0, values)
        parts, joined = self._join([*self.parts, part], [*self.times, time])
        self._write_index(parts, [*self.times, time])
        self.parts = parts
        self.times.append(time)
        if joined:
            self._remove(self._joined_before)
            self._joined_before = joined

    def finish(self) -> None:
        """Make one plain file of all parts and remove them."""
        if self.parts:
            self._copy(self.parts, self.times, self.index)
        self._remove(self._on_disk())
        remove(self.folder / STILL)
        with suppress(OSError):  # a file that is not ours keeps the folder
            self.folder.rmdir()

    def restore(self, until: float) -> int:
        """Take up what is in the folder, and drop what is later than a time.

        Parameters
        ----------
        until : float
            Time of the checkpoint from which the run goes on, s.

        Returns
        -------
        int
            How many snapshots were dropped.

        Raises
        ------
        MachineError
            Where a part before that time is missing or unreadable.
        """
        if self.index.exists() and not _is_index(self.index, self.layout.fields[0]):
            whole = Part(0, len(self._read_times(self.index)))
            second_name(self.index, self.folder / whole.name)
        parts, times = self._chain()
        kept = sum(time <= until for time in times)
        if kept:
            self.parts, self.times = self._shortened(parts, times, kept), times[:kept]
            self._write_index(self.parts, self.times)
        else:
            remove(self.index)
        self._remove(part for part in self._on_disk() if part not in self.parts)
        return len(times) - kept

    def _join(self, parts: list[Part], times: list[float]) -> tuple[list[Part], list[Part]]:
        """Make one part of the last ones while there are enough of one size; return the parts, and those joined."""
        joined: list[Part] = []
        while self._worth_joining(last := parts[-TOGETHER:]):
            whole = Part(last[0].first, sum(part.count for part in last))
            self._copy(last, times[whole.first : whole.beyond], self.folder / whole.name)
            joined += last
            parts = [*parts[:-TOGETHER], whole]
        return parts, joined

    def _worth_joining(self, parts: Sequence[Part]) -> bool:
        if len(parts) < TOGETHER or len({part.count for part in parts}) > 1:
            return False
        return sum((self.folder / part.name).stat().st_size for part in parts) <= TOGETHER_BYTES

    def _chain(self) -> tuple[list[Part], list[float]]:
        """Find the parts that follow each other from the first snapshot on, the largest where several begin alike."""
        found = self._on_disk()
        parts: list[Part] = []
        times: list[float] = []
        while following := [part for part in found if part.first == len(times)]:
            part = max(following, key=lambda part: part.count)
            own = self._read_times(self.folder / part.name)
            if len(own) != part.count:
                raise MachineError(f"{self.folder / part.name} holds {len(own)} snapshots, not {part.count}")
            parts.append(part)
            times += own
        acknowledged = len(self._read_times(self.index)) if self.index.exists() else 0
        if len(times) < acknowledged:
            raise MachineError(f"{self.folder} lacks the part that begins with snapshot {len(times)}")
        return parts, times

    def _shortened(self, parts: list[Part], times: list[float], count: int) -> list[Part]:
        """Cut the parts off after so many snapshots."""
        whole = [part for part in parts if part.beyond <= count]
        cut = next((part for part in parts if part.first < count < part.beyond), None)
        if cut is None:
            return whole
        rest = Part(cut.first, count - cut.first)
        self._copy([cut], times[cut.first : count], self.folder / rest.name)
        return [*whole, rest]

    def _copy(self, parts: Sequence[Part], times: Sequence[float], path: Path) -> None:
        """Write the first snapshots of some parts, as many as there are times, into one plain file.

        The whole file, ``snapshots.h5``, takes the still fields in.
        """
        with hdf5_beside(path, self.layout.plain_template, sync_name=path == self.index) as file:
            if path == self.index:
                with h5py.File(self.folder / STILL) as source:
                    self.layout.add_still_fields(file, {name: source[name][()] for name in STILL_FIELDS})
            self.layout.make_room(file, times)
            k = 0
            for part in parts:
                with h5py.File(self.folder / part.name) as source:
                    for n in range(min(part.count, len(times) - k)):
                        for name in self.layout.fields:
                            _copy_plane(source[name], n, file[name], k)
                        k += 1

    def _write_index(self, parts: Sequence[Part], times: Sequence[float]) -> None:
        """Write ``snapshots.h5`` anew, joining the parts."""
        with hdf5_beside(self.index, self._index_template) as file:
            set_times(file, times)
            sources = [(slice(part.first, part.beyond), f"{PARTS}/{part.name}") for part in parts]
            for name in self.layout.fields:
                shape = (len(times), *self.layout.shape(FIELDS[name].location))
                self.layout.link_field(file, name, shape, sources)

    def _read_times(self, path: Path) -> list[float]:
        try:
            with h5py.File(path) as file:
                times = [float(time) for time in file["time"][()]]
                experiment = bytes(file.attrs["experiment"]).decode()
        except (OSError, KeyError) as error:
            raise MachineError(f"{path} cannot be read: {error}") from error
        if experiment != self.layout.provenance.experiment:
            raise RequestError(f"{path} belongs to another experiment")
        return times

    def _on_disk(self) -> list[Part]:
        return [part for file in self.folder.iterdir() if (part := Part.from_name(file.name))]

    def _remove(self, parts: Iterable[Part]) -> None:
        for part in parts:
            remove(self.folder / part.name)


def _copy_plane(source: h5py.Dataset, n: int, target: h5py.Dataset, k: int) -> None:
    """Copy one plane as it is stored, without unpacking it."""
    for (_, *place), (_, *to) in zip(chunks_of(source, n), chunks_of(target, k), strict=True):
        mask, data = source.id.read_direct_chunk((n, *place))
        target.id.write_direct_chunk((k, *to), data, mask)


def _is_index(path: Path, field: str) -> bool:
    with h5py.File(path) as file:
        return bool(file[field].is_virtual)
