"""The table *Cost*: steps, memory, disk and time, set beside what the machine has."""

from __future__ import annotations

import statistics
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..dynamics.frequency import needs_iteration
from ..errors import Fault
from ..grid import GridSettings
from ..grid.domain import HALO_Y, row_stride
from ..steppers import STEPPERS
from ..store.names import BUDGETS, FIELDS, SERIES
from .machine import available_memory, free_disk
from .plan import Plan
from .speeds import Kernel, Speeds, read_speeds, remember
from .tables import BYTES, Row, Table, written

# the most that is held at once, traced and weighed on 512 x 512 and 1024 x 1024 cells: doubles a cell
PLANNING_DOUBLES = 20
BALANCE_DOUBLES = 30  # beside it, where a start is balanced
ITERATION_DOUBLES = 105  # beside it, where the largest frequency is found by iteration: 20 vectors of three fields
RUNNING_DOUBLES = 12  # the plan, and what is derived for a snapshot
LIBRARY_BYTES = 60e6
COMPILED_BYTES = 150e6  # the compiler and its kernels
SNAPSHOT_BYTES = 6_000  # a snapshot's share of names, chunk tables and its place in the index
CHECKPOINTS_AT_ONCE = 3  # two are kept while the next is written
LEAST_COMPRESSED = 0.5  # of the plain size: shuffle and gzip save no more on a flow that fills the domain

START_SECONDS = 1.0  # imports, kernels from the cache, files
SECONDS_A_VALUE = 40e-9  # storing: derive, pack, write
SECONDS_A_SNAPSHOT = 0.01  # files that must reach the disk
STEPS_A_DIAGNOSTIC = 7  # sums, and the energy budget that takes a step apart


@dataclass(frozen=True)
class Work:
    """What a run does.

    Parameters
    ----------
    kernel : Kernel
        What it steps with.
    cells, steps : int
        How many.
    snapshots, values : int
        Snapshots, and the values in one.
    diagnostics : int
        Rows of the time series.
    """

    kernel: Kernel
    cells: int
    steps: int
    snapshots: int
    values: int
    diagnostics: int

    def seconds(self, speeds: Speeds, share: float = 1.0) -> float | None:
        """Reckon how long so much of it takes, s; None where this machine's speed is not known."""
        known = speeds.step(self.kernel, self.cells)
        if known is None:
            return None
        stepping = known[0] * (self.steps + STEPS_A_DIAGNOSTIC * self.diagnostics)
        storing = self.snapshots * (self.values * SECONDS_A_VALUE + SECONDS_A_SNAPSHOT)
        return START_SECONDS + share * (stepping + storing)


@dataclass(frozen=True)
class Cost:
    """What a run costs.

    Parameters
    ----------
    work : Work
        What it does.
    memory, memory_available : float
        Bytes needed, and there; None where the system does not say.
    disk, disk_least, disk_free : float
        Bytes at most and at least, and free; None where the system does not say.
    seconds : float or None
        Estimated wall time; None on a machine that has measured nothing yet.
    seconds_note : str
        Where the estimate comes from, and how good such estimates were.
    compiled : bool
        Whether the kernels were known on this machine: else the run compiles them first, which the estimate leaves out.
    """

    work: Work
    memory: float
    memory_available: float | None
    disk: float
    disk_least: float
    disk_free: float | None
    seconds: float | None
    seconds_note: str
    compiled: bool

    def table(self) -> Table:
        """Return the table."""
        return Table("Cost", tuple(self._rows()))

    def _rows(self) -> Iterator[Row]:
        work = self.work
        yield Row("steps", work.steps, "", f"of {work.cells:,} cells".replace(",", " "))
        yield Row("snapshots", work.snapshots, "", f"of {work.values:,} values".replace(",", " "))
        yield Row("diagnostics", work.diagnostics, "", "rows of the time series")
        yield Row("memory", self.memory, BYTES, f"of {written(self.memory_available, BYTES)} available")
        yield Row("disk", self.disk, BYTES, f"at most; of {written(self.disk_free, BYTES)} free")
        shown = "" if self.seconds is not None else "not known"
        yield Row("wall_time", self.seconds, "s", self.seconds_note, shown=shown)

    def faults(self) -> list[Fault]:
        """Return what the machine cannot give."""
        found = memory_faults(self.memory, self.memory_available)
        if self.disk_free is not None and self.disk_least > self.disk_free:
            found.append(
                Fault(
                    ("output",),
                    f"the output takes {written(self.disk, BYTES)}, at least {written(self.disk_least, BYTES)}",
                    f"{written(self.disk_free, BYTES)} are free",
                    "store less often, fewer fields, a region or every n-th point (stride)",
                )
            )
        return found


def memory_faults(needed: float, available: float | None) -> list[Fault]:
    """Refuse what does not fit into memory."""
    if available is None or needed <= available:
        return []
    return [
        Fault(
            ("grid", "cells"),
            f"the run takes {written(needed, BYTES)} of memory",
            f"{written(available, BYTES)} are available",
            "fewer cells",
        )
    ]


def memory_needed(grid: GridSettings, stepper: str, *, balanced: bool, iterated: bool = False) -> float:
    """Bytes that planning and running hold at most, from the settings alone: before a large array is made.

    Parameters
    ----------
    grid : GridSettings
        Cells and precision.
    stepper : str
        Name in `STEPPERS`.
    balanced : bool
        Whether a part of the start is balanced.
    iterated : bool
        Whether the largest frequency is found by iteration.
    """
    nx, ny = grid.cells
    size = 8 if grid.precision == "double" else 4
    padded = (ny + 2 * HALO_Y) * row_stride(nx, size) * size
    # state and its copy, the energy budget's own sets, coefficients
    fields = 3 * (2 * (1 + STEPPERS[stepper].levels) + 4) + 2
    running = COMPILED_BYTES + fields * padded + RUNNING_DOUBLES * 8 * nx * ny
    planning = (PLANNING_DOUBLES + max(BALANCE_DOUBLES * balanced, ITERATION_DOUBLES * iterated)) * 8 * nx * ny
    return LIBRARY_BYTES + max(planning, running)


def is_balanced(parts: Sequence[Any]) -> bool:
    """Whether a part of the start is balanced."""
    return any(getattr(part, "balance", "none") != "none" for part in parts)


def reckon(plan: Plan, folder: Path, *, balanced: bool = False) -> Cost:
    """Reckon what a planned run costs.

    Parameters
    ----------
    plan : Plan
        The plan.
    folder : Path
        Where the run will be written.
    balanced : bool
        Whether a part of its start is balanced.
    """
    experiment, output, grid = plan.experiment, plan.output, plan.basin.grid
    deepest = float(plan.basin.depth_field.max())
    kernel = Kernel.of(
        plan.basin,
        plan.pv_flux,
        experiment.time.stepper,
        linear=experiment.numerics.linear,
        threads=experiment.numerics.threads,
    )
    work = Work(
        kernel=kernel,
        cells=grid.nx * grid.ny,
        steps=plan.steps,
        snapshots=_times(plan.steps, output.steps_between_snapshots),
        values=sum(_values(plan, name) for name in output.fields),
        diagnostics=_times(plan.steps, output.steps_between_diagnostics),
    )
    plain = work.snapshots * (work.values * grid.dtype.itemsize + SNAPSHOT_BYTES)
    rows = work.diagnostics * 8 * (1 + len(SERIES) + 8 * len(BUDGETS))
    levels = STEPPERS[experiment.time.stepper].levels
    checkpoints = CHECKPOINTS_AT_ONCE * levels * 3 * work.cells * grid.dtype.itemsize
    least = plain * (LEAST_COMPRESSED if output.compression else 1.0) + rows + checkpoints
    speeds = read_speeds()
    seconds, note = estimate(work, speeds)
    return Cost(
        work=work,
        memory=memory_needed(
            experiment.grid,
            experiment.time.stepper,
            balanced=balanced,
            iterated=needs_iteration(plan.basin, deepest),
        ),
        memory_available=available_memory(),
        disk=2 * plain + rows + checkpoints,  # at the end all snapshots are joined, and then the parts removed
        disk_least=least,
        disk_free=free_disk(folder),
        seconds=seconds,
        seconds_note=note,
        compiled=kernel in speeds.measured,
    )


def estimate(work: Work, speeds: Speeds) -> tuple[float | None, str]:
    """Estimate the wall time of a run, s, and say where that comes from and how good such estimates were."""
    reckoned = work.seconds(speeds)
    known = speeds.step(work.kernel, work.cells)
    if reckoned is None or known is None:
        return None, "not yet measured on this machine: the first run measures it"
    note = "from steps timed on this machine"
    if known[1] != work.kernel:
        note += f" with other kernels ({known[1].key}); compiling its own takes some 10 s besides"
    ratios = speeds.ratios(reckoned)
    if not ratios:
        return reckoned, f"{note}; no run here to compare with yet"
    middle = statistics.median(ratios)
    low, high = min(ratios) / middle, max(ratios) / middle
    runs = f"{len(ratios)} past run{'s' if len(ratios) > 1 else ''}"
    good = "took as long as that" if len(ratios) == 1 else f"took {low:.2g} to {high:.2g} times such an estimate"
    return reckoned * middle, f"{note}; {runs} here {good}"


def remember_run(cost: Cost, seconds: float, cell_steps: float) -> None:
    """Keep how long a run really took, so that later estimates are as good as the past ones were.

    Parameters
    ----------
    cost : Cost
        What the outlook reckoned.
    seconds : float
        Wall time of the whole run.
    cell_steps : float
        Cells times steps that were taken: less than all where it was stopped.

    Notes
    -----
    A run that had to compile its kernels is not kept: it says nothing of the next one.
    """
    if not cost.compiled:
        return
    share = cell_steps / (cost.work.cells * cost.work.steps)
    reckoned = cost.work.seconds(read_speeds(), share)
    if reckoned is not None:
        remember(seconds, reckoned)


def _times(steps: int, every: int) -> int:
    """How often something happens every so many steps, start and end included."""
    return 1 + -(-steps // every)


def _values(plan: Plan, name: str) -> int:
    x, y = plan.output.window.axes(plan.basin.grid, FIELDS[name].location)
    return int(x.size * y.size)
