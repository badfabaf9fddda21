"""One writer to a run's folder: the lock, who holds it and since when."""

from __future__ import annotations

import datetime
import errno
import json
import os
from pathlib import Path

from ..errors import MachineError
from .durable import machine_errors

try:
    import fcntl
except ImportError:  # a system without locks of this kind: the process number in the file has to do
    fcntl = None  # type: ignore[assignment]

LOCK = ".lock"


class FolderLock:
    """Held from its making to `release`, or to the end of the process, however that comes.

    The operating system's own lock is taken on the file, so that nothing stays locked by a process that was killed.
    Where the file system has none, the process number in the file decides.

    Parameters
    ----------
    folder : Path
        The run's folder.

    Attributes
    ----------
    left_by : str
        Who held it and ended without letting go; empty where nobody.

    Raises
    ------
    MachineError
        Where another process holds it.
    """

    def __init__(self, folder: Path) -> None:
        self.path = folder / LOCK
        with machine_errors(self.path):
            self._descriptor = self._acquire()
            self.left_by = _holder(self.path)
            os.ftruncate(self._descriptor, 0)
            since = datetime.datetime.now(datetime.UTC).strftime("%Y-%m-%d %H:%M:%S UTC")
            os.write(self._descriptor, json.dumps({"process": os.getpid(), "since": since}).encode())

    def _acquire(self) -> int:
        while True:
            descriptor = os.open(self.path, os.O_RDWR | os.O_CREAT, 0o666)
            if not _lock(descriptor, self.path):
                os.close(descriptor)
                raise MachineError(f"{self.path.parent} is in use by {_holder(self.path) or 'another process'}")
            try:
                if os.path.samestat(os.fstat(descriptor), os.stat(self.path)):  # noqa: PTH116
                    return descriptor
            except FileNotFoundError:
                pass
            os.close(descriptor)  # its holder let go and removed it just now: try again

    def release(self) -> None:
        """Let go."""
        if self._descriptor >= 0:
            with machine_errors(self.path):
                self.path.unlink(missing_ok=True)
                os.close(self._descriptor)
            self._descriptor = -1


def _lock(descriptor: int, path: Path) -> bool:
    """Take the lock; False where another process has it."""
    if fcntl is not None:
        try:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError as error:
            if error.errno in (errno.EWOULDBLOCK, errno.EACCES):
                return False
            if error.errno not in (errno.ENOLCK, errno.ENOSYS, errno.EOPNOTSUPP):
                raise
        else:
            return True
    process = _read(path).get("process")
    return not (isinstance(process, int) and process != os.getpid() and _lives(process))


def _lives(process: int) -> bool:
    """Whether there is such a process; where that cannot be asked, yes."""
    if os.name != "posix":
        return True
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except PermissionError:
        return True
    return True


def _read(path: Path) -> dict[str, object]:
    try:
        content = json.loads(path.read_text("utf-8"))
    except (OSError, ValueError):
        return {}
    return content if isinstance(content, dict) else {}


def _holder(path: Path) -> str:
    """Who holds the lock and since when; empty where the file does not say."""
    content = _read(path)
    return f"process {content['process']} since {content.get('since')}" if "process" in content else ""
