"""How snapshots.h5 and diagnostics.h5 look inside: netCDF-4, CF-1.11, SGRID 0.3."""

from __future__ import annotations

import datetime
import io
import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from ..errors import CAUTION
from ..grid import Basin
from ..grid.staggered import Location
from .durable import open_hdf5
from .names import DIMENSIONS, FIELDS, SGRID_LOCATIONS, STILL_FIELDS, FieldName
from .output import ResolvedOutput, Window
from .provenance import Provenance, without_host

try:
    from isal import isal_zlib as deflate
except ImportError:  # a machine without it: the same format, some eight times slower
    import zlib as deflate  # type: ignore[no-redef]

DEFLATE_LEVEL = 1  # 2 to 4 gain 3 % on eddying flow and cost half the speed
CHUNK_BYTES = 4 << 20  # rows of a plane are stored in bands of at most this: a section reads little
TIME_CHUNK = 128

Array = NDArray[Any]


@dataclass(frozen=True)
class Layout:
    """What every file of snapshots of one run has in common.

    Parameters
    ----------
    x, y, x_face, y_face : ndarray
        Coordinates of what is stored, m.
    fields : tuple of str
        Names of the fields in a snapshot.
    dtype : numpy.dtype
        Type of the fields.
    compression : bool
        Whether planes are compressed.
    epoch : datetime
        Date of model time 0.
    provenance : Provenance
        What made the run.
    """

    x: NDArray[np.float64]
    y: NDArray[np.float64]
    x_face: NDArray[np.float64]
    y_face: NDArray[np.float64]
    fields: tuple[str, ...]
    dtype: np.dtype[Any]
    compression: bool
    epoch: datetime.datetime
    provenance: Provenance

    @classmethod
    def of_run(cls, basin: Basin, output: ResolvedOutput, epoch: datetime.datetime, provenance: Provenance) -> Layout:
        """Take the layout from what a run stores."""
        x, y = output.window.axes(basin.grid, "centre")
        x_face, y_face = output.window.axes(basin.grid, "corner")
        dtype = basin.grid.dtype.newbyteorder("<")
        return cls(x, y, x_face, y_face, output.fields, dtype, output.compression, epoch, provenance)

    def shape(self, location: Location) -> tuple[int, int]:
        """Shape of a plane at a location."""
        y, x = DIMENSIONS[location]
        return getattr(self, y).size, getattr(self, x).size

    def bands(self, location: Location, itemsize: int) -> int:
        """Rows of a plane that are stored together."""
        ny, nx = self.shape(location)
        return min(ny, max(1, CHUNK_BYTES // (nx * itemsize)))

    @cached_property
    def plain_template(self) -> bytes:
        """A file with room for snapshots, but none yet: making it anew for each would cost more than the fields."""
        image = io.BytesIO()
        with open_hdf5(image, new=True) as file:
            self._add_head(file)
            for name in self.fields:
                row = FIELDS[name]
                self._create(file, name, (0, *self.shape(row.location)), self.dtype, row)
        return image.getvalue()

    def index_template(self, still: str) -> bytes:
        """Return an index that names no part yet.

        Parameters
        ----------
        still : str
            File with depth and f, as a path from the folder of the index.
        """
        image = io.BytesIO()
        with open_hdf5(image, new=True) as file:
            self._add_head(file)
            for name, row in STILL_FIELDS.items():
                shape = self.shape(row.location)
                self.link_field(file, name, shape, [(slice(0, shape[0]), still)])
        return image.getvalue()

    def _add_head(self, file: h5py.File) -> None:
        """Write global attributes, configuration, coordinates and topology; there are no times yet."""
        add_provenance(file, self.provenance)
        for name in ("x", "y", "x_face", "y_face"):
            self._add_axis(file, name)
        add_time(file, self.epoch)
        topology = file.create_dataset("grid", data=np.int32(0), track_order=True)
        attach(
            topology,
            cf_role="grid_topology",
            topology_dimension=np.int32(2),
            node_dimensions="x_face y_face",
            node_coordinates="x_face y_face",
            face_dimensions="x: x_face (padding: none) y: y_face (padding: none)",
            long_name="staggered C-grid: cells are the faces of the topology, corners its nodes",
        )

    def _add_axis(self, file: h5py.File, name: str) -> None:
        axis = name[0]
        dataset = file.create_dataset(name, data=getattr(self, name), track_order=True)
        place = "faces and corners" if name.endswith("_face") else "cell centres"
        attach(
            dataset,
            standard_name=f"projection_{axis}_coordinate",
            long_name=f"{axis} of {place} on the tangent plane",
            units="m",
            axis=axis.upper(),
        )
        if name.endswith("_face"):
            attach(dataset, c_grid_axis_shift=np.float64(-0.5))
        dataset.make_scale(name)

    def add_still_fields(self, file: h5py.File, values: Mapping[str, Array]) -> None:
        """Write depth and f as double, whatever the precision of the run."""
        for name, row in STILL_FIELDS.items():
            dataset = self._create(file, name, self.shape(row.location), np.dtype("<f8"), row)
            self._write_plane(dataset, (), np.asarray(values[name]), row.location)

    def make_room(self, file: h5py.File, times: Sequence[float]) -> None:
        """Write the times, and make room for the fields of as many snapshots, in a file begun from the template."""
        set_times(file, times)
        for name in self.fields:
            file[name].resize(len(times), axis=0)

    def write_snapshot(self, file: h5py.File, k: int, values: Mapping[str, Array]) -> None:
        """Write the fields of snapshot `k` of a file, ``[y, x]`` each, as they are stored."""
        for name in self.fields:
            self._write_plane(file[name], (k,), values[name], FIELDS[name].location)

    def link_field(
        self, file: h5py.File, name: str, shape: tuple[int, ...], sources: Sequence[tuple[slice, str]]
    ) -> None:
        """Make a field whose values lie in other files.

        Parameters
        ----------
        file : h5py.File
            Where it is made.
        name : str
            Name of the field, here and there.
        shape : tuple of int
            Its shape.
        sources : sequence of (slice, str)
            What part of the first direction lies in which file, as a path from the folder of `file`.
        """
        row = FIELDS.get(name) or STILL_FIELDS[name]
        dtype = self.dtype if name in FIELDS else np.dtype("<f8")
        first_room = h5py.h5s.UNLIMITED if name in FIELDS else shape[0]
        space = h5py.h5s.create_simple(shape, (first_room, *shape[1:]))
        form = h5py.h5p.create(h5py.h5p.DATASET_CREATE)
        form.set_fill_value(np.array(np.nan, dtype))
        # h5py's own virtual layouts take 0.1 ms a source, and the index is written with every snapshot
        for part, source in sources:
            block = (part.stop - part.start, *shape[1:])
            space.select_hyperslab((part.start,) + (0,) * (len(shape) - 1), (1,) * len(shape), block=block)
            form.set_virtual(space, source.encode(), name.encode(), h5py.h5s.create_simple(block))
        space.select_all()
        made = h5py.h5d.create(file.id, name.encode(), h5py.h5t.py_create(dtype), space, form)
        self._describe(file, h5py.Dataset(made), row)

    def _create(
        self, file: h5py.File, name: str, shape: tuple[int, ...], dtype: np.dtype[Any], row: FieldName
    ) -> h5py.Dataset:
        """Make room for a field of two or, with time, three dimensions."""
        ny, nx = shape[-2:]
        growing = len(shape) == 3
        dataset = file.create_dataset(
            name,
            shape,
            dtype,
            maxshape=(None, ny, nx) if growing else None,
            chunks=(*(1,) * growing, self.bands(row.location, dtype.itemsize), nx),
            fillvalue=np.nan,
            track_order=True,
            **({"compression": "gzip", "compression_opts": DEFLATE_LEVEL, "shuffle": True} if self.compression else {}),
        )
        self._describe(file, dataset, row)
        return dataset

    def _describe(self, file: h5py.File, dataset: h5py.Dataset, row: FieldName) -> None:
        names = DIMENSIONS[row.location]
        still = dataset.ndim == 2
        for n, name in enumerate(names if still else ("time", *names)):
            h5py.h5ds.attach_scale(dataset.id, h5py.h5d.open(file.id, name.encode()), n)
        attach(
            dataset,
            _FillValue=dataset.dtype.type(np.nan),
            units=row.units,
            long_name=row.long_name,
            standard_name=row.standard_name,
            cell_methods="" if still else "time: point",
            grid="grid",
            location=SGRID_LOCATIONS[row.location],
        )

    def _write_plane(self, dataset: h5py.Dataset, lead: tuple[int, ...], plane: Array, location: Location) -> None:
        """Write one plane past HDF5's own filters, which are slower than the disk."""
        rows = self.bands(location, dataset.dtype.itemsize)
        for first in range(0, plane.shape[0], rows):
            band = np.ascontiguousarray(plane[first : first + rows], dataset.dtype)
            if len(band) < rows:  # the last chunk reaches beyond the plane
                band = np.pad(band, ((0, rows - len(band)), (0, 0)), constant_values=np.nan)
            dataset.id.write_direct_chunk((*lead, first, 0), packed(band) if self.compression else band.tobytes())


def packed(values: Array) -> bytes:
    """Shuffle and deflate a C-contiguous array as HDF5's filters do."""
    shuffled = np.ascontiguousarray(values.view(np.uint8).reshape(-1, values.itemsize).T)
    return bytes(deflate.compress(shuffled, DEFLATE_LEVEL))


def chunks_of(dataset: h5py.Dataset, k: int) -> Iterator[tuple[int, ...]]:
    """Yield where the chunks of plane `k` of a field lie."""
    for first in range(0, dataset.shape[1], dataset.chunks[1]):
        yield k, first, 0


def still_values(basin: Basin, window: Window) -> dict[str, Array]:
    """Depth and f as they are stored."""
    return {"depth": window.cut(basin.depth_field, "centre"), "f": window.cut(basin.f, "corner")}


def add_provenance(file: h5py.File, provenance: Provenance) -> None:
    """Write the global attributes, and configuration and settings as text."""
    now = datetime.datetime.now(datetime.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    attach(
        file,
        Conventions="CF-1.11",
        title=provenance.title,
        source=f"swmodel {provenance.versions.get('swmodel', '')}".strip(),
        history=f"{now} {provenance.command or 'swmodel'}",
        comment=CAUTION,
        command=provenance.command,
        package_versions=", ".join(f"{name} {version}" for name, version in provenance.versions.items()),
        git_revision=provenance.revision,
        experiment=provenance.experiment,
    )
    settings = json.dumps(_without_host(provenance.settings), ensure_ascii=False)
    texts = (
        ("configuration", provenance.configuration, "configuration file of the experiment (TOML)"),
        ("settings", settings, "settings of the experiment with overrides and defaults (JSON)"),
    )
    for name, text, meaning in texts:
        dataset = file.create_dataset(name, data=text, dtype=h5py.string_dtype(), track_order=True)
        attach(dataset, long_name=meaning)


def _without_host(settings: Any) -> Any:
    """Settings with every absolute path cut to its name."""
    if isinstance(settings, Mapping):
        return {name: _without_host(value) for name, value in settings.items()}
    if isinstance(settings, list | tuple):
        return [_without_host(value) for value in settings]
    return without_host([settings]) if isinstance(settings, str) else settings


def add_time(file: h5py.File, epoch: datetime.datetime) -> h5py.Dataset:
    """Make the time axis, which may grow and is empty.

    Parameters
    ----------
    file : h5py.File
        Where.
    epoch : datetime
        Date of model time 0; UTC unless it says otherwise.
    """
    dataset = file.create_dataset("time", (0,), "<f8", maxshape=(None,), chunks=(TIME_CHUNK,), track_order=True)
    attach(
        dataset,
        standard_name="time",
        long_name="model time",
        units=f"seconds since {_utc(epoch)}",
        calendar="standard",
        units_metadata="leap_seconds: none",
        axis="T",
    )
    dataset.make_scale("time")
    return dataset


def set_times(file: h5py.File, times: Sequence[float]) -> None:
    """Write model times, s, into the time axis."""
    file["time"].resize(len(times), axis=0)
    file["time"][...] = times


def _utc(epoch: datetime.datetime) -> str:
    if epoch.tzinfo is not None:
        epoch = epoch.astimezone(datetime.UTC).replace(tzinfo=None)
    return epoch.isoformat(sep=" ")


def attach(target: Any, **attributes: Any) -> None:
    """Write attributes: text as fixed-length strings, which every reader takes; what is empty is left out."""
    for name, value in attributes.items():
        if isinstance(value, str):
            if not value:
                continue
            data = np.array(value.encode())
            form = h5py.h5t.py_create(data.dtype)
            form.set_cset(h5py.h5t.CSET_ASCII if value.isascii() else h5py.h5t.CSET_UTF8)
        else:
            data = np.asarray(value)
            form = h5py.h5t.py_create(data.dtype)
        # h5py's own way of making an attribute takes twice as long, and the index has many
        h5py.h5a.create(target.id, name.encode(), form, h5py.h5s.create(h5py.h5s.SCALAR)).write(data, form)
