"""What a figure is drawn from: a run's folder, read back."""

from __future__ import annotations

import logging
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..errors import CAUTION
from .rulers import Unit, unit_for

if TYPE_CHECKING:
    from ..grid import Basin
    from ..measures import Record, Verdict
    from ..settings import Experiment
    from ..store.reading import Run
    from .page import Page

Array = NDArray[np.float64]
Along = Literal["x", "y"]

FEW_CELLS = 8  # across a domain: fewer make a line and no map

log = logging.getLogger(__name__)


class NoPictureError(Exception):
    """Raised where a figure cannot be drawn from what was stored; its text is the reason. It never leaves `draw`."""


@dataclass(frozen=True)
class Drawing:
    """A figure to be drawn.

    Parameters
    ----------
    name : str
        Name of its file, without the ending.
    paint : callable
        Returns the page.
    """

    name: str
    paint: Callable[[], Page]


@dataclass(frozen=True)
class Scene:
    """A run as figures see it.

    Parameters
    ----------
    run : Run
        The run, read back.
    experiment : Experiment
        Its settings.
    basin : Basin
        Where its flow lived.
    record : Record
        Its fields and time series.
    """

    run: Run
    experiment: Experiment
    basin: Basin
    record: Record

    @classmethod
    def of(cls, folder: Path | str) -> Scene:
        """Read a run's folder.

        Raises
        ------
        RequestError
            Where it is not a run's, or holds no snapshots yet.
        MachineError
            Where it cannot be read.
        """
        from ..measures import Record
        from ..outlook.plan import make_basin
        from ..settings import Experiment
        from ..store.reading import Run

        run = Run(folder)
        experiment = Experiment.from_json(run.settings)
        basin = make_basin(experiment)
        return cls(run, experiment, basin, Record.from_run(run, basin, experiment.numerics.linear))

    @cached_property
    def verdict(self) -> Verdict:
        """The expectations, judged on what is there."""
        from ..measures import judge

        return judge(self.experiment.expect, self.record, self.experiment.start)

    @property
    def name(self) -> str:
        """Name of the run."""
        return self.run.folder.resolve().name

    @property
    def title(self) -> str:
        """Title of the experiment; without one, the run's name."""
        return self.experiment.title or self.name

    @property
    def times(self) -> Array:
        """Times of the snapshots, s."""
        return self.record.times

    @cached_property
    def time_unit(self) -> Unit:
        """Unit in which the times of the run are written."""
        return unit_for(self.times, "s")

    def after(self, k: int) -> str:
        """Say when a snapshot was taken."""
        time = float(self.times[k])
        return f"after {self.time_unit.text(time)}" if time else "at the start"

    @property
    def thin(self) -> Along | None:
        """The direction that holds too few cells for a map while the other holds more."""
        few_x, few_y = self.record.x.size <= FEW_CELLS, self.record.y.size <= FEW_CELLS
        return None if few_x == few_y else "x" if few_x else "y"

    @property
    def software(self) -> str:
        """What made the run, with its version."""
        return self.run.fields.attributes.get("source", "swmodel")

    @property
    def origin(self) -> str:
        """Where the figure comes from, and what it is not for: the last lines of every figure."""
        grid, settings = self.basin.grid, self.experiment
        revision = self.run.fields.attributes.get("git_revision", "")
        parts = [
            f"run {self.name}",
            f"{grid.nx} x {grid.ny} cells",
            f"{'linear, ' if self.record.linear else ''}{settings.time.stepper}, {grid.precision} precision",
            self.software + (f", revision {revision[:10]}" if revision else ""),
        ]
        return f"{'; '.join(parts)}. {short_caution()}"

    def need(self, *names: str) -> None:
        """See that fields are there or can be computed.

        Raises
        ------
        NoPictureError
            Where one is not, or there is no snapshot.
        """
        stored = self.record.names
        if missing := [name for name in names if name not in stored]:
            raise NoPictureError(f"{' and '.join(missing)} {'was' if len(missing) == 1 else 'were'} not stored")
        if not self.times.size:
            raise NoPictureError("no snapshot was stored yet")

    @property
    def has_velocity(self) -> bool:
        """Whether u and v were stored."""
        return {"u", "v"} <= set(self.record.names)


def short_caution() -> str:
    """Return the caution up to whom to ask instead."""
    return CAUTION.split(";")[0] + "."


def largest(values: NDArray[Any]) -> float:
    """Largest magnitude of what is finite; 0 where nothing is."""
    sizes = np.abs(values)
    return float(np.max(sizes, where=np.isfinite(sizes), initial=0.0))
