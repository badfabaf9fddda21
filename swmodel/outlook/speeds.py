"""How fast this machine is: a small benchmark, and how long past runs took against what was reckoned for them.

Both are kept in the cache folder, by machine. Reading them loads no compiler; measuring is for a run, once its kernels
are compiled.
"""

from __future__ import annotations

import json
import logging
import math
import os
import tempfile
import time as clock
from collections.abc import Mapping
from contextlib import suppress
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from ..dynamics import PV_FLUXES, PVFlux
from ..dynamics.cache import cache_folder
from ..grid import Basin
from ..grid.domain import usable_cores
from ..steppers import STEPPERS, TimeSettings, advance
from .machine import machine_name

if TYPE_CHECKING:
    from ..dynamics.tendency import Equations

FILE = "speed.json"
FORMAT = 1
SIDES = (16, 64, 256, 1024)  # cells: from what costs its calls alone to what no cache holds
SECONDS_A_SIDE = 0.05
KEPT = 200  # runs a machine
COMPARED = 10  # past runs, those nearest in length

# of an ssprk3 step, and of double precision: trials on two machines, for kernels not measured here
STEPPER_WORK = {"ssprk3": 1.0, "rk4": 1.43, "leapfrog": 0.77}
PRECISION_WORK = {"double": 1.0, "single": 0.57}

log = logging.getLogger(__name__)


@dataclass(frozen=True)
class Kernel:
    """What of a set-up decides the time a cell and step takes.

    Parameters
    ----------
    stepper, pv_flux, precision : str
        Names.
    linear, even, zonal : bool
        Linear equations; even depth; f that varies along y alone.
    threads : int
        How many may work.
    """

    stepper: str
    pv_flux: str
    precision: str
    linear: bool
    even: bool
    zonal: bool
    threads: int

    @classmethod
    def of(cls, basin: Basin, pv_flux: PVFlux, stepper: str, *, linear: bool, threads: int | None) -> Kernel:
        """Name the kernel of a set-up."""
        named = (name for name, row in PV_FLUXES.items() if row is pv_flux)
        flux = next(named, type(pv_flux.scheme).__name__)
        zonal = bool(np.all(basin.f == basin.f[:, :1]))
        cores = usable_cores()
        return cls(stepper, flux, basin.grid.precision, linear, basin.even, zonal, min(threads or cores, cores))

    @property
    def key(self) -> str:
        """Its name in the file."""
        words = (
            self.stepper,
            self.pv_flux,
            self.precision,
            "linear" if self.linear else "full",
            "even" if self.even else "uneven",
            "rows" if self.zonal else "field",
            str(self.threads),
        )
        return " ".join(words)

    @classmethod
    def from_key(cls, key: str) -> Kernel:
        """Read a name."""
        stepper, flux, precision, linear, even, zonal, threads = key.split(" ")
        return cls(stepper, flux, precision, linear == "linear", even == "even", zonal == "rows", int(threads))

    def unlike(self, other: Kernel) -> int:
        """How much another kernel differs."""
        weights = {"threads": 8, "precision": 4, "stepper": 4, "even": 2, "zonal": 2, "pv_flux": 1, "linear": 1}
        return sum(weight for name, weight in weights.items() if getattr(self, name) != getattr(other, name))


@dataclass(frozen=True)
class Past:
    """A run that ended: seconds it took, and what was reckoned for as many steps."""

    seconds: float
    reckoned: float


@dataclass(frozen=True)
class Speeds:
    """What is known of a machine.

    Parameters
    ----------
    measured : mapping of Kernel to mapping of int to float
        By kernel and number of cells: seconds a step.
    past : tuple of Past
        Runs, oldest first.
    """

    measured: Mapping[Kernel, Mapping[int, float]]
    past: tuple[Past, ...]

    def step(self, kernel: Kernel, cells: int) -> tuple[float, Kernel] | None:
        """Seconds that a step takes, and the kernel it was measured with; None where nothing was measured."""
        if not self.measured:
            return None
        nearest = min(self.measured, key=kernel.unlike)
        sizes, seconds = zip(*sorted(self.measured[nearest].items()), strict=True)
        if cells <= sizes[0]:
            step = seconds[0]
        elif cells >= sizes[-1]:
            step = seconds[-1] * cells / sizes[-1]
        else:
            step = math.exp(np.interp(math.log(cells), np.log(sizes), np.log(seconds)))
        step *= STEPPER_WORK[kernel.stepper] / STEPPER_WORK[nearest.stepper]
        return step * PRECISION_WORK[kernel.precision] / PRECISION_WORK[nearest.precision], nearest

    def ratios(self, reckoned: float) -> list[float]:
        """Real over reckoned seconds of the past runs nearest in length to one of so many reckoned seconds."""
        near = sorted(self.past, key=lambda run: abs(math.log(run.reckoned / reckoned)))[:COMPARED]
        return [run.seconds / run.reckoned for run in near]


NOTHING = Speeds({}, ())


def read_speeds() -> Speeds:
    """Read what is known of this machine; nothing where there is no file, or none that can be read."""
    return _parsed(_read().get(machine_name()))


def _parsed(held: Any) -> Speeds:
    """Read one machine's part of the file; nothing where it is not as it should be."""
    try:
        measured = {
            Kernel.from_key(key): {int(cells): float(step) for cells, step in steps.items() if float(step) > 0}
            for key, steps in held.get("steps", {}).items()
            if steps
        }
        past = tuple(Past(float(one["seconds"]), float(one["reckoned"])) for one in held.get("runs", []))
        return Speeds(measured, tuple(run for run in past if min(run.seconds, run.reckoned) > 0))
    except (AttributeError, KeyError, TypeError, ValueError):  # written by hand, or by another version
        return NOTHING


def measure_speed(equations: Equations, settings: TimeSettings) -> None:
    """Time a few steps on grids of several sizes with a run's own kernels, unless this was done on this machine before.

    It takes about half a second, and compiles nothing that the run has not compiled.

    Parameters
    ----------
    equations : Equations
        The run's.
    settings : TimeSettings
        The run's stepper, filter and correction.
    """
    basin = equations.basin
    kernel = Kernel.of(basin, equations.pv_flux, settings.stepper, linear=equations.linear, threads=equations.threads)
    if kernel in read_speeds().measured:
        return
    steps = {str(side * side): _seconds_a_step(equations, settings, side) for side in SIDES}
    _change(lambda machine: machine.setdefault("steps", {}).update({kernel.key: steps}))


def remember(seconds: float, reckoned: float) -> None:
    """Keep how long a run took, and how long was reckoned for as many steps."""
    if seconds > 0 and reckoned > 0:
        _change(lambda machine: _append(machine, {"seconds": seconds, "reckoned": reckoned}))


def _append(machine: dict[str, Any], run: dict[str, float]) -> None:
    machine["runs"] = [*machine.get("runs", []), run][-KEPT:]


def _seconds_a_step(equations: Equations, settings: TimeSettings, side: int) -> float:
    """Seconds that a step takes on a square grid of so many cells a side, with the same kernels."""
    from ..dynamics.tendency import Equations as Bound
    from ..state import State

    given = equations.basin
    grid = replace(given.grid, nx=side, ny=side)
    depth = given.depth if given.even else np.full((side, side), given.reference_depth)
    basin = Basin(grid, given.frame, given.gravity, depth, given.reference_depth)
    small = Bound(basin, equations.pv_flux, linear=equations.linear, threads=equations.threads)
    state = State(grid, 1 + STEPPERS[settings.stepper].levels)
    small.fill(state.sets[0:3])

    def timed(steps: int) -> float:
        begun = clock.perf_counter()
        advance(state, steps, 0.0, small, settings)
        return clock.perf_counter() - begun

    first = max(min(timed(1), timed(1)), 1e-7)
    steps = max(1, int(SECONDS_A_SIDE / 3 / first))
    return min(timed(steps) for _ in range(3)) / steps


def _path() -> Path:
    return cache_folder() / FILE


def _read() -> dict[str, Any]:
    try:
        content = json.loads(_path().read_text("utf-8"))
        machines = content["machines"] if content["format"] == FORMAT else {}
    except (OSError, ValueError, KeyError, TypeError):
        return {}
    return machines if isinstance(machines, dict) else {}


def _change(change: Any) -> None:
    """Change what is known of this machine; a run does not fail for it."""
    machines, here = _read(), machine_name()
    if _parsed(machines.get(here)) == NOTHING:
        machines[here] = {}
    change(machines[here])
    name = ""
    try:
        with tempfile.NamedTemporaryFile("w", encoding="utf-8", dir=cache_folder(), delete=False) as file:
            name = file.name
            json.dump({"format": FORMAT, "machines": machines}, file)
        os.replace(name, _path())  # noqa: PTH105  (whole at any instant)
    except OSError as error:
        log.info("speeds of this machine could not be kept: %s", error)
        with suppress(OSError):
            os.unlink(name)  # noqa: PTH108
