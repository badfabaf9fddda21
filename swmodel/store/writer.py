"""What a running run writes: its folder, snapshots, time series and checkpoints."""

from __future__ import annotations

import datetime
import json
import logging
from collections.abc import Iterator, Mapping
from pathlib import Path
from types import TracebackType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import Fault, MachineError, RequestError
from ..grid import Basin
from .checkpoints import CHECKPOINTS, Checkpoint, drop_later, read_checkpoint, write_checkpoint
from .durable import BESIDE, machine_errors, make_folder, remove, write_json, write_text
from .layout import Layout, still_values
from .lock import LOCK, FolderLock
from .names import FIELDS
from .output import ResolvedOutput
from .parts import PARTS, SnapshotParts
from .provenance import MAY_CHANGE, Provenance, flatten
from .runlog import close_log, open_log
from .series import SeriesWriter

CONFIGURATION = "config.toml"
SETTINGS = "settings.json"

log = logging.getLogger(__name__)


class RunWriter:
    """Writes a run's folder so that it can be read, and gone on from, whatever happens to the run.

    Parameters
    ----------
    folder : Path
        The run's folder; made where it is missing.
    basin : Basin
        Where the flow lives.
    provenance : Provenance
        What makes the run.
    output : ResolvedOutput
        What is stored.
    epoch : datetime
        Date of model time 0; UTC unless it says otherwise.
    resume : bool
        Whether to go on from the newest whole checkpoint. What is later than it is dropped: the run will write it
        again, the same to the last bit.

    Attributes
    ----------
    checkpoint : Checkpoint or None
        From which a resumed run goes on.

    Raises
    ------
    RequestError
        Where a new run's folder holds anything, or a resumed one is not a run's, is another experiment's, or holds no
        whole checkpoint.
    MachineError
        Where another process holds the folder, or it cannot be written.
    """

    def __init__(
        self,
        folder: Path | str,
        basin: Basin,
        *,
        provenance: Provenance,
        output: ResolvedOutput,
        epoch: datetime.datetime,
        resume: bool = False,
    ) -> None:
        self.folder = Path(folder)
        self.checkpoint: Checkpoint | None = None
        self._basin = basin
        self._output = output
        self._provenance = provenance
        with machine_errors(self.folder):
            self._open_folder(resume)
            self._lock = FolderLock(self.folder)
            try:
                self._check_content(resume)
                self._log = open_log(self.folder)
            except BaseException:
                self._lock.release()
                raise
        if self._lock.left_by:
            log.warning("the folder was left locked by %s, which has ended; taken over", self._lock.left_by)
        try:
            layout = Layout.of_run(basin, output, epoch, provenance)
            if resume:
                self.checkpoint = read_checkpoint(self.folder, provenance.experiment)
            else:
                write_text(self.folder / CONFIGURATION, provenance.configuration)
            write_json(self.folder / SETTINGS, dict(provenance.settings))
            self._snapshots = SnapshotParts(self.folder, layout, still_values(basin, output.window))
            self._series = SeriesWriter(self.folder, epoch, provenance)
            if self.checkpoint is not None:
                self._restore(self.checkpoint)
        except BaseException:
            self._close()
            raise

    @property
    def last_snapshot(self) -> float | None:
        """Time of the last snapshot that is stored, s; None where there is none."""
        return self._snapshots.times[-1] if self._snapshots.times else None

    @property
    def last_row(self) -> float | None:
        """Time of the last row of the time series, s; None where there is none."""
        return self._series.times[-1] if self._series.times else None

    def write_snapshot(self, time: float, fields: Mapping[str, NDArray[Any]]) -> None:
        """Store the fields of one time; on return they will survive anything.

        Parameters
        ----------
        time : float
            Model time, s; later than the one before.
        fields : mapping of str to ndarray ``[y, x]``
            Every field of the output, over the whole domain with both ends; others are passed over.

        Raises
        ------
        MachineError
            Where it cannot be written.
        """
        _check_later("snapshot", time, self.last_snapshot)
        self._snapshots.append(time, {name: self._cut(name, fields[name]) for name in self._output.fields})

    def write_diagnostics(
        self, time: float, values: Mapping[str, float], groups: Mapping[str, Mapping[str, float]] | None = None
    ) -> None:
        """Take a row of the time series; it is on the disk within a second, and before any checkpoint.

        Parameters
        ----------
        time : float
            Model time, s.
        values : mapping of str to float
            Sums and extremes: names of `names.SERIES`, the same each time.
        groups : mapping of str to mapping
            Terms of budgets: names of `names.BUDGETS`, each with terms of any name.

        Raises
        ------
        MachineError
            Where it cannot be written.
        """
        _check_later("row", time, self.last_row)
        self._series.append(time, values, groups or {})

    def write_checkpoint(self, checkpoint: Checkpoint) -> None:
        """Store what the run can go on from; on return it will survive anything.

        Raises
        ------
        MachineError
            Where it cannot be written; the ones before stay.
        """
        self._series.flush()
        write_checkpoint(self.folder, checkpoint, self._provenance)

    def finish(self) -> None:
        """End in good order: every row written, the snapshots in one plain file.

        Where the disk has no room to join the snapshots, they stay in their parts under the index, and the log says so.
        """
        self._series.flush()
        try:
            self._snapshots.finish()
        except MachineError as error:
            log.warning("the snapshots stay in %s under their index: %s", PARTS, error)

    def __enter__(self) -> RunWriter:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        try:
            self._series.flush()
        except MachineError:
            if error is None:
                raise
        finally:
            self._close()

    def _cut(self, name: str, field: NDArray[Any]) -> NDArray[Any]:
        location = FIELDS[name].location
        if np.shape(field) != self._basin.grid.shape(location):
            raise ValueError(f"{name} has shape {np.shape(field)}, not {self._basin.grid.shape(location)}")
        return self._output.window.cut(np.asarray(field), location)

    def _open_folder(self, resume: bool) -> None:
        if self.folder.exists() and not self.folder.is_dir():
            raise RequestError(f"{self.folder} is not a folder")
        if resume and not (self.folder / SETTINGS).exists():
            raise RequestError(f"{self.folder} is not a run's folder: it holds no {SETTINGS}")
        if not resume and not self.folder.exists():
            make_folder(self.folder)

    def _check_content(self, resume: bool) -> None:
        if resume:
            faults = list(_differences(self._provenance.settings, _read_settings(self.folder)))
            if faults:
                raise RequestError(faults)
        elif held := sorted(path.name for path in self.folder.iterdir() if path.name != LOCK):
            raise RequestError(
                Fault((), f"{self.folder} holds {held[0]}", "a folder that is new or empty", "name another with --into")
            )

    def _restore(self, checkpoint: Checkpoint) -> None:
        """Drop what is later than the checkpoint."""
        self._remove_half_written()
        drop_later(self.folder, checkpoint.steps)
        snapshots = self._snapshots.restore(checkpoint.time)
        rows = self._series.restore(checkpoint.time)
        if snapshots or rows:
            log.warning(
                "dropped %d snapshots and %d rows of diagnostics later than the checkpoint at %.10g s; "
                "the run writes them again",
                snapshots,
                rows,
                checkpoint.time,
            )

    def _remove_half_written(self) -> None:
        for place in (self.folder, self.folder / PARTS, self.folder / CHECKPOINTS):
            for path in place.glob(f"*{BESIDE}"):
                log.warning("dropped %s, which was half written", path.name)
                remove(path)

    def _close(self) -> None:
        close_log(self._log)
        self._lock.release()


def free_folder(runs: Path, name: str) -> Path:
    """Return the first of ``NAME``, ``NAME-2``, ``NAME-3``... that is not there yet."""
    number = 1
    folder = runs / name
    while folder.exists():
        number += 1
        folder = runs / f"{name}-{number}"
    return folder


def _check_later(what: str, time: float, before: float | None) -> None:
    if before is not None and not time > before:
        raise ValueError(f"a {what} at {time} s is not later than the one before, {before} s")


def _read_settings(folder: Path) -> dict[str, Any]:
    path = folder / SETTINGS
    try:
        with machine_errors(path):
            content = json.loads(path.read_text("utf-8"))
    except ValueError as error:
        raise RequestError(f"{path} is not JSON: {error}") from error
    if not isinstance(content, dict):
        raise RequestError(f"{path} holds no settings")
    return content


def _differences(asked: Mapping[str, Any], there: Mapping[str, Any]) -> Iterator[Fault]:
    """Yield what keeps a run from being gone on with under other settings."""
    new, old = dict(flatten(json.loads(json.dumps(asked)))), dict(flatten(there))
    for key in sorted(new.keys() | old.keys(), key=repr):
        if key not in MAY_CHANGE and (key in new, new.get(key)) != (key in old, old.get(key)):
            yield Fault(
                key,
                f"{json.dumps(new[key]) if key in new else 'nothing'} is asked for",
                f"the run's folder has {json.dumps(old[key]) if key in old else 'nothing'}",
                "start a new run",
            )
