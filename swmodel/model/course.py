"""One run from where its model stands to its end: what is stored when, and how it ends."""

from __future__ import annotations

import signal
import time as clock
import zlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from types import FrameType

import numpy as np

from ..errors import SolutionError, StopRequested
from ..outlook.plan import Plan
from ..quantities import format_quantity
from ..store.writer import RunWriter
from .model import Model

STOPPING = (signal.SIGINT, signal.SIGTERM)


@dataclass(frozen=True)
class Progress:
    """How far a run has come.

    Parameters
    ----------
    time, until : float
        Model time now and at the end, s.
    steps : int
        Steps taken by this process.
    energy_drift : float
        (energy - energy at the start)/energy at the start.
    """

    time: float
    until: float
    steps: int
    energy_drift: float


Report = Callable[[Progress], None]


def set_up_digest(plan: Plan) -> int:
    """Digest of what the settings name but do not hold: depth, f, and the PV flux."""
    flux = type(plan.pv_flux.scheme).__qualname__.encode()
    basin = plan.basin
    return zlib.crc32(
        np.ascontiguousarray(basin.depth_field).tobytes(), zlib.crc32(basin.f.tobytes(), zlib.crc32(flux))
    )


class Course:
    """One run from where its model stands to the end: what is stored when, and how it ends."""

    def __init__(self, model: Model, plan: Plan, writer: RunWriter, report: Report | None) -> None:
        self.model = model
        self.plan = plan
        self.writer = writer
        self.report = report
        self.signal = 0
        self.first_energy: float | None = None
        if writer.checkpoint is not None:
            self.first_energy = float(writer.checkpoint.extra["first_energy"])
        self._energy = self.first_energy or 0.0
        self._pace = 0.0  # seconds a step, once measured
        self.first_step = model.steps
        self.checked = clock.monotonic()

    def follow(self) -> None:
        """Advance to the end, storing on the way."""
        plan = self.plan
        with self._signals():
            if self.writer.checkpoint is None:
                self._store(snapshot=True, diagnostics=True)
            while (ticks := self._ticks()) < plan.steps:
                self._advance_to(self._next(ticks))
                ticks = self._ticks()
                end = ticks == plan.steps
                self._store(
                    snapshot=end or ticks % plan.output.steps_between_snapshots == 0,
                    diagnostics=end or ticks % plan.output.steps_between_diagnostics == 0,
                )
                if self.signal and not end:
                    self._stop()
            self._checkpoint()
            self.writer.finish()

    def _ticks(self) -> int:
        """Model time in steps of the plan; the model's own may have been halved."""
        return round(self.model.time / self.plan.step.dt)

    def _next(self, ticks: int) -> int:
        """Next time, in steps of the plan, at which something is stored."""
        output = self.plan.output
        coming = (
            (ticks // every + 1) * every for every in (output.steps_between_snapshots, output.steps_between_diagnostics)
        )
        return min(*coming, self.plan.steps)

    def _advance_to(self, ticks: int) -> None:
        """Advance to a time given in steps of the plan, in pieces short enough to heed a signal."""
        model = self.model
        steps = round((ticks * self.plan.step.dt - model.time) / model.dt)
        while steps > 0:
            piece = min(steps, self._piece())
            begun = clock.monotonic()
            try:
                model.take(piece)
            except SolutionError as error:
                self._checkpoint()
                kept = self.writer.folder / "checkpoints"
                hint = f"the last good state, at {format_quantity(model.time, 's')}, is in {kept}"
                raise SolutionError(f"{error}; {hint}", error.time, error.place) from error
            self._pace = (clock.monotonic() - begun) / piece
            steps -= piece
            if not steps:
                return  # what is due at this time is stored before a signal is heeded
            if self.signal:
                self._stop()
            if self._checkpoint_due():
                self._checkpoint()
            if self.report:
                self._tell()

    def _piece(self) -> int:
        """Steps that take some half second."""
        return max(1, int(0.5 / self._pace)) if self._pace else 10

    def _store(self, *, snapshot: bool, diagnostics: bool) -> None:
        model = self.model
        if diagnostics:
            values = model.diagnostics()
            energy = values["energy_kinetic"] + values["energy_potential"]
            if self.first_energy is None:
                self.first_energy = energy
            self._energy = energy
            self.writer.write_diagnostics(model.time, values, {"energy_budget": model.energy_budget()})
        if snapshot:
            self.writer.write_snapshot(model.time, {name: model.field(name) for name in self.plan.output.fields})
        if diagnostics:
            halved = self._ticks() < self.plan.steps and model.halve_step_if_outgrown()
            if halved or self._checkpoint_due():
                self._checkpoint()
            if self.report:
                self._tell()

    def _checkpoint_due(self) -> bool:
        return clock.monotonic() - self.checked > self.plan.output.checkpoint_every

    def _checkpoint(self) -> None:
        self.checked = clock.monotonic()
        output = self.plan.output
        held = self.model.checkpoint()
        begun = {
            "step": self.plan.step.dt,
            "snapshots_every": output.steps_between_snapshots,
            "diagnostics_every": output.steps_between_diagnostics,
            "first_energy": self.first_energy,
            "set_up": set_up_digest(self.plan),
        }
        self.writer.write_checkpoint(replace(held, extra={**held.extra, **begun}))

    def _tell(self) -> None:
        assert self.report is not None
        drift = (self._energy - self.first_energy) / self.first_energy if self.first_energy else 0.0
        self.report(
            Progress(self.model.time, self.plan.experiment.time.until, self.model.steps - self.first_step, drift)
        )

    def _stop(self) -> None:
        self._checkpoint()
        name = signal.Signals(self.signal).name
        raise StopRequested(
            f"stopped by {name} at {format_quantity(self.model.time, 's')}; a checkpoint was written; "
            f"go on with: swmodel resume {self.writer.folder}",
            self.signal,
        )

    @contextmanager
    def _signals(self) -> Iterator[None]:
        """Note signals that ask to stop; they are heeded between pieces. Only the main thread can listen."""

        def note(number: int, frame: FrameType | None) -> None:
            self.signal = number

        try:
            before = {number: signal.signal(number, note) for number in STOPPING}
        except ValueError:
            before = {}
        try:
            yield
        finally:
            for number, handler in before.items():
                signal.signal(number, handler)
