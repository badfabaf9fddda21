"""Checkpoints: all that the next step depends on, to the last bit; the two newest are kept."""

from __future__ import annotations

import logging
import re
import zlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from ..errors import RequestError
from .durable import hdf5_beside, make_folder, remove
from .layout import add_provenance, attach
from .provenance import Provenance

CHECKPOINTS = "checkpoints"
KEPT = 2

Array = NDArray[Any]
Level = tuple[Array, Array, Array]

log = logging.getLogger(__name__)


@dataclass(frozen=True)
class Checkpoint:
    """The state of a run between two steps.

    Parameters
    ----------
    time : float
        Model time, s.
    steps : int
        Steps taken since time 0.
    dt : float
        The step, s.
    levels : sequence of (u, v, eta)
        The present first, with both ends; leapfrog's level before it second.
    extra : mapping of str to number or ndarray
        Whatever else the next step depends on.
    """

    time: float
    steps: int
    dt: float
    levels: Sequence[Level]
    extra: Mapping[str, Any] = field(default_factory=dict)


def write_checkpoint(folder: Path, checkpoint: Checkpoint, provenance: Provenance) -> Path:
    """Write a checkpoint and remove all but the two newest.

    Parameters
    ----------
    folder : Path
        The run's folder.
    checkpoint : Checkpoint
        What to keep.
    provenance : Provenance
        What made the run.

    Raises
    ------
    MachineError
        Where it cannot be written; the older ones stay.
    """
    place = folder / CHECKPOINTS
    if not place.exists():
        make_folder(place)
    path = place / f"checkpoint-{checkpoint.steps:012d}.h5"
    with hdf5_beside(path) as file:
        add_provenance(file, provenance)
        attach(file, time=checkpoint.time, steps=np.int64(checkpoint.steps), dt=checkpoint.dt)
        for n, level in enumerate(checkpoint.levels):
            group = file.create_group(f"level_{n}", track_order=True)
            for name, values in zip(("u", "v", "eta"), level, strict=True):
                _store(group, name, values)
        extra = file.create_group("extra", track_order=True)
        for name, value in checkpoint.extra.items():
            _store(extra, name, value)
    for old in _newest_first(folder)[KEPT:]:
        remove(old)
    return path


def read_checkpoint(folder: Path, experiment: str = "") -> Checkpoint:
    """Read the newest checkpoint that is whole.

    Parameters
    ----------
    folder : Path
        The run's folder.
    experiment : str
        Digest that it must carry; any by default.

    Raises
    ------
    RequestError
        Where there is none.
    """
    for path in _newest_first(folder):
        try:
            return _read(path, experiment)
        except (OSError, KeyError, ValueError) as error:
            log.warning("checkpoint %s is passed over: %s", path.name, error)
    raise RequestError(f"{folder} holds no whole checkpoint to go on from; run it again from the start")


def drop_later(folder: Path, steps: int) -> None:
    """Remove the checkpoints of more steps than these: they were found damaged."""
    for path in _newest_first(folder):
        if _steps(path) > steps:
            remove(path)


def _store(group: h5py.Group, name: str, value: Any) -> None:
    values = np.ascontiguousarray(value) if np.ndim(value) else np.asarray(value)
    if values.dtype.kind not in "iuf" or values.dtype.itemsize < 4:
        raise ValueError(f"a checkpoint holds numbers of 4 or 8 bytes, and {name} is of type {values.dtype}")
    dataset = group.create_dataset(name, data=values, track_order=True)
    attach(dataset, crc32=np.uint32(zlib.crc32(values.tobytes())))


def _load(dataset: h5py.Dataset) -> Any:
    values = np.asarray(dataset[()])
    if zlib.crc32(values.tobytes()) != int(dataset.attrs["crc32"]):
        raise ValueError(f"{dataset.name} is damaged")
    return values if values.ndim else values.item()


def _read(path: Path, experiment: str) -> Checkpoint:
    with h5py.File(path) as file:
        if experiment and bytes(file.attrs["experiment"]).decode() != experiment:
            raise ValueError("it belongs to another experiment")
        levels: list[Level] = []
        while (name := f"level_{len(levels)}") in file:
            levels.append((_load(file[name]["u"]), _load(file[name]["v"]), _load(file[name]["eta"])))
        return Checkpoint(
            time=float(file.attrs["time"]),
            steps=int(file.attrs["steps"]),
            dt=float(file.attrs["dt"]),
            levels=levels,
            extra={name: _load(file["extra"][name]) for name in file["extra"]},
        )


def _newest_first(folder: Path) -> list[Path]:
    place = folder / CHECKPOINTS
    found = (
        [path for path in place.iterdir() if re.fullmatch(r"checkpoint-\d{12}\.h5", path.name)]
        if place.is_dir()
        else []
    )
    return sorted(found, reverse=True)


def _steps(path: Path) -> int:
    return int(path.stem.removeprefix("checkpoint-"))
