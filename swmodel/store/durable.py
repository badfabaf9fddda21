"""Files that are whole at any instant: written beside, flushed to the disk, and only then given their name.

Every system call that changes the disk goes through `os` in this file, so that tests can cut a run off after any of
them.
"""

from __future__ import annotations

import io
import json
import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any

import h5py

from ..errors import MachineError

BESIDE = ".partial"


class _RawFile(io.RawIOBase):
    """The file under HDF5, which keeps the first error until HDF5 has closed.

    When a write fails while HDF5 closes, HDF5 answers with errors of its own (some without a number) and a file that
    it can never close. So a failed write is remembered, what follows is thrown away, and the error is raised once
    HDF5 is done.

    Parameters
    ----------
    path : Path
        Where to write; what is there is lost.
    """

    def __init__(self, path: Path) -> None:
        super().__init__()
        self.failure: BaseException | None = None
        self._descriptor = os.open(path, os.O_RDWR | os.O_CREAT | os.O_TRUNC | getattr(os, "O_BINARY", 0), 0o666)

    def seekable(self) -> bool:
        return True

    def readable(self) -> bool:
        return True

    def writable(self) -> bool:
        return True

    def seek(self, offset: int, whence: int = os.SEEK_SET, /) -> int:
        return os.lseek(self._descriptor, offset, whence)

    def readinto(self, buffer: Any, /) -> int:
        """Fill the buffer; beyond the end of the file there are zeros, as HDF5 expects."""
        room = memoryview(buffer).cast("B")
        filled = 0
        while filled < len(room) and (data := os.read(self._descriptor, len(room) - filled)):
            room[filled : filled + len(data)] = data
            filled += len(data)
        room[filled:] = bytes(len(room) - filled)
        return len(room)

    def write(self, data: Any, /) -> int:
        rest = memoryview(data).cast("B")
        size = len(rest)
        try:
            while self.failure is None and len(rest):
                rest = rest[os.write(self._descriptor, rest) :]
        except BaseException as error:  # also a stop from the keyboard: it must not pass through HDF5 either
            self.failure = error
        return size

    def truncate(self, size: int | None = None, /) -> int:
        end = self.tell() if size is None else size
        try:
            if self.failure is None:
                os.ftruncate(self._descriptor, end)
        except BaseException as error:
            self.failure = error
        return end

    def sync(self) -> None:
        """Have the disk take what was written, or raise what went wrong."""
        if self.failure is not None:
            raise self.failure
        os.fsync(self._descriptor)

    def close(self) -> None:
        if not self.closed:
            super().close()
            os.close(self._descriptor)


@contextmanager
def machine_errors(path: Path) -> Iterator[None]:
    """Turn errors of the operating system into `MachineError`."""
    try:
        yield
    except OSError as error:
        reason = error.strerror or str(error)
        raise MachineError(f"cannot write {path}: {reason}; what was written before stays readable") from error


@contextmanager
def _beside(path: Path, *, sync_name: bool = True) -> Iterator[_RawFile]:
    """Open a file beside `path`; at the end it is on the disk and has the name `path`, or nothing is left of it."""
    partial = path.with_name(f"{path.name}.{os.getpid()}{BESIDE}")
    with machine_errors(path):
        raw = _RawFile(partial)
        try:
            try:
                yield raw
            except Exception as error:
                if raw.failure is not None:
                    raise raw.failure from error
                raise
            raw.sync()
            raw.close()
            os.replace(partial, path)  # noqa: PTH105  (tests cut the run at calls of os)
        except BaseException:
            raw.close()
            with suppress(FileNotFoundError):
                os.unlink(partial)  # noqa: PTH108
            raise
        if sync_name:
            sync_folder(path.parent)


@contextmanager
def hdf5_beside(path: Path, template: bytes = b"", *, sync_name: bool = True) -> Iterator[h5py.File]:
    """Write an HDF5 file that appears under its name whole, and on the disk, or not at all.

    Parameters
    ----------
    path : Path
        Its name.
    template : bytes
        What is in the file to begin with; nothing by default.
    sync_name : bool
        Whether the name, too, must be on the disk on return. A part's need not: the disk takes names in their order,
        and the index that names the part comes after it.

    Raises
    ------
    MachineError
        Where the disk is full, writing is not permitted, and so on; nothing is left of the file then.
    """
    with _beside(path, sync_name=sync_name) as raw:
        raw.write(template)
        with open_hdf5(raw, new=not template) as file:
            yield file


def open_hdf5(raw: Any, *, new: bool) -> h5py.File:
    """Open an HDF5 file to write, in the form that netCDF-4 needs to read it and to append to it.

    Links and attributes keep their order, and no newer format is used than Debian's ncdump reads.
    """
    form = ("earliest", "v110")
    return h5py.File(raw, "w", libver=form, track_order=True) if new else h5py.File(raw, "r+", libver=form)


def write_text(path: Path, text: str) -> None:
    """Write a text file that appears under its name whole, or not at all; line ends are kept as they are."""
    with _beside(path) as raw:
        raw.write(text.encode())


def write_json(path: Path, content: Any) -> None:
    """Write a JSON file that appears under its name whole, or not at all; NaN and infinity are refused."""
    write_text(path, json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False) + "\n")


def make_folder(path: Path) -> None:
    """Make a folder and those above it."""
    with machine_errors(path):
        path.mkdir(parents=True, exist_ok=True)
        sync_folder(path.parent)


def second_name(path: Path, name: Path) -> None:
    """Give a file a second name, by a copy where the file system knows no hard links; an old `name` is replaced."""
    with machine_errors(name):
        remove(name)
        try:
            os.link(path, name)
        except OSError:
            with path.open("rb") as source, _beside(name) as raw:
                while block := source.read(1 << 24):
                    raw.write(block)
        sync_folder(name.parent)


def remove(path: Path) -> None:
    """Remove a file, if it is there."""
    with machine_errors(path):
        try:
            os.unlink(path)  # noqa: PTH108
        except FileNotFoundError:
            return


def sync_folder(folder: Path) -> None:
    """Have the disk take the names in a folder; systems that cannot open a folder take them by themselves."""
    if not hasattr(os, "O_DIRECTORY"):
        return
    descriptor = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)
