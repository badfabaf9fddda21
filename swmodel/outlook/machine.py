"""What this machine has to give: memory, disk, and a name for its measured speeds that tells nothing of it."""

from __future__ import annotations

import hashlib
import os
import platform
import shutil
from collections.abc import Iterator
from contextlib import suppress
from pathlib import Path

from ..grid.domain import usable_cores

MEMINFO = Path("/proc/meminfo")
CONTROL_GROUP = Path("/sys/fs/cgroup")


def machine_name() -> str:
    """Return a digest that differs between machines: a cache folder may be shared by several."""
    said = f"{platform.node()} {platform.machine()} {platform.processor()} {usable_cores()}"
    return hashlib.sha256(said.encode()).hexdigest()[:12]


def available_memory() -> float | None:
    """Bytes that a new process can have; None where the system does not say."""
    return min(_limits(), default=None)


def free_disk(folder: Path) -> float | None:
    """Bytes free where a folder is or would be; None where the system does not say."""
    for place in (folder.absolute(), *folder.absolute().parents):
        if place.exists():
            try:
                return float(shutil.disk_usage(place).free)
            except OSError:
                return None
    return None


def _limits() -> Iterator[float]:
    try:
        fields = dict(line.split(":", 1) for line in MEMINFO.read_text("ascii").splitlines())
        yield float(fields["MemAvailable"].split()[0]) * 1024
    except (OSError, KeyError, ValueError):
        with suppress(AttributeError, OSError, ValueError):  # no Linux: at least not more than there is
            yield float(os.sysconf("SC_PHYS_PAGES")) * os.sysconf("SC_PAGE_SIZE")
    with suppress(OSError, ValueError):  # a container may get less; there is no such file, or it says "max", elsewhere
        limit = float((CONTROL_GROUP / "memory.max").read_text("ascii"))
        yield max(limit - float((CONTROL_GROUP / "memory.current").read_text("ascii")), 0.0)
