"""The chain: check, advance, store, judge; and going on from a checkpoint."""

from __future__ import annotations

import logging
import signal
import sys
import time as clock
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from types import FrameType
from typing import TYPE_CHECKING, Any

from ..errors import RequestError, SolutionError, StopRequested
from ..measures import ExpectSettings, Record, Verdict, faults
from ..measures import judge as judge_record
from ..outlook import Outlook, check
from ..outlook.cost import remember_run
from ..outlook.plan import Begun, Plan, make_basin, make_plan, run_folder_name
from ..outlook.speeds import measure_speed
from ..quantities import TIME, format_quantity, read_quantity
from ..settings import Experiment
from ..store.checkpoints import read_checkpoint
from ..store.durable import write_json
from ..store.lock import FolderLock
from ..store.provenance import digest, gather_provenance, package_versions
from ..store.reading import VERDICT, Run
from ..store.writer import RunWriter, free_folder
from .model import Model

if TYPE_CHECKING:
    from ..dynamics import PVFlux

RUNS = Path("runs")
STOPPING = (signal.SIGINT, signal.SIGTERM)

log = logging.getLogger(__name__)


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


def run(
    experiment: Experiment,
    into: str | Path | None = None,
    *,
    start: Any = None,
    pv_flux: PVFlux | None = None,
    outlook: Outlook | None = None,
    progress: Report | None = None,
) -> Run:
    """Check an experiment, run it, store it and judge it.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    into : str or Path, optional
        Folder of the run, new or empty; by default ``runs/NAME`` after the configuration, numbered where it exists.
    start : object or sequence, optional
        Start states of your own: objects with ``fields(basin)``.
    pv_flux : PVFlux, optional
        A PV flux of your own.
    outlook : Outlook, optional
        What `check` said of this very experiment; by default it is asked here.
    progress : callable, optional
        Told a `Progress` now and then.

    Returns
    -------
    Run
        What was left on disk, judged.

    Raises
    ------
    RequestError
        Where the request is wrong or the check refuses it; nothing is written.
    SolutionError
        Where the solution became unphysical; the last good state is in a checkpoint.
    MachineError
        Where the machine failed it; what was written stays readable.
    StopRequested
        Where a signal asked it to stop; a checkpoint was written.
    """
    outlook = outlook or check(experiment, start=start, pv_flux=pv_flux)
    if outlook.refusals or outlook.plan is None:
        raise experiment.placed(RequestError(outlook.refusals))
    plan = outlook.plan
    folder = Path(into) if into is not None else free_folder(RUNS, run_folder_name(experiment))
    provenance = gather_provenance(experiment.text, experiment.as_json(), sys.argv)
    with RunWriter(
        folder, plan.basin, provenance=provenance, output=plan.output, epoch=experiment.time.start
    ) as writer:
        begun = clock.monotonic()
        model = Model(experiment, plan=plan)
        for caution in outlook.cautions:
            log.info("caution: %s", caution)
        _log_beginning(model)
        _Course(model, plan, writer, progress).follow()
        seconds = clock.monotonic() - begun
        log.info("ended after %.3g s of wall clock", seconds)
    if outlook.cost is not None:
        measure_speed(model.equations, experiment.time)
        remember_run(outlook.cost, seconds, float(plan.basin.grid.nx * plan.basin.grid.ny * plan.steps))
    judge(folder)
    return Run(folder)


def resume(
    folder: str | Path,
    until: str | float | None = None,
    *,
    start: Any = None,
    pv_flux: PVFlux | None = None,
    progress: Report | None = None,
) -> Run:
    """Go on with a run from its newest checkpoint, bit for bit.

    Parameters
    ----------
    folder : str or Path
        The run's folder.
    until : str or float, optional
        A new end, counted from time 0.
    start, pv_flux, progress
        As for `run`; objects of your own must be given again.

    Raises
    ------
    RequestError
        Where the folder is no run's, or the new end does not fit the step.
    MachineError
        Where another process still holds the folder.
    """
    held = Run(folder)
    FolderLock(held.folder).release()  # a run that still goes on is told first, with its holder
    experiment = Experiment.from_json(held.settings)
    kept = read_checkpoint(Path(folder), digest(experiment.as_json()))
    begun = Begun(float(kept.extra["step"]), int(kept.extra["snapshots_every"]), int(kept.extra["diagnostics_every"]))
    if until is not None:
        experiment = _extended(experiment, begun.step, until)
    plan = make_plan(experiment, start=start, pv_flux=pv_flux, begun=begun)
    provenance = gather_provenance(held.config_text, experiment.as_json(), sys.argv)
    with RunWriter(
        Path(folder),
        plan.basin,
        provenance=provenance,
        output=plan.output,
        epoch=experiment.time.start,
        resume=True,
    ) as writer:
        model = Model(experiment, plan=plan)
        assert writer.checkpoint is not None
        model.restore(writer.checkpoint)
        log.info("goes on from %s", format_quantity(model.time, "s"))
        _log_beginning(model)
        _Course(model, plan, writer, progress).follow()
    judge(Path(folder))
    return Run(folder)


def judge(run: Run | str | Path, expectations: Sequence[ExpectSettings] | None = None) -> Verdict:
    """Judge what a run left, and write verdict.json.

    Parameters
    ----------
    run : Run, str or Path
        The run or its folder.
    expectations : sequence, optional
        Other expectations than the run's own; verdict.json is then left alone.

    Returns
    -------
    Verdict
        holds, fails or undecided, each with its reasons.

    Raises
    ------
    RequestError
        Where the run does not hold what other expectations ask for. What the run's own cannot be given is undecided.
    """
    held = run if isinstance(run, Run) else Run(run)
    experiment = Experiment.from_json(held.settings)
    record = Record.from_run(held, make_basin(experiment), experiment.numerics.linear)
    if expectations is not None:
        wrong = [fault for n, one in enumerate(expectations) for fault in faults(one, n, record, experiment.start)]
        if wrong:
            raise RequestError(wrong)
    verdict = judge_record(
        experiment.expect if expectations is None else expectations,
        record,
        experiment.start,
        run=held.folder.name,
        versions=package_versions(),
    )
    if expectations is None:
        write_json(held.folder / VERDICT, verdict.as_json())
    return verdict


def _log_beginning(model: Model) -> None:
    """Say what is about to be run."""
    grid, plan = model.basin.grid, model.plan
    log.info(
        "%d x %d cells, %d steps of %.10g s to %s, %d threads",
        grid.nx,
        grid.ny,
        plan.steps,
        plan.step.dt,
        format_quantity(plan.experiment.time.until, "s"),
        model.equations.bands,
    )


def _extended(experiment: Experiment, dt: float, until: str | float) -> Experiment:
    """Return the experiment with a new end that the step divides."""
    end = read_quantity(until, TIME) if isinstance(until, str) else float(until)
    if end < dt or abs(round(end / dt) * dt - end) > 1e-6:
        raise RequestError(
            f"--until: {format_quantity(end, 's')} is no whole number of steps of {dt:.10g} s; "
            f"the nearest is {max(1, round(end / dt)) * dt:.10g} s"
        )
    return experiment.with_values({"time.until": end})


class _Course:
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
        model, plan = self.model, self.plan
        with self._signals():
            if model.steps == 0:
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
            if halved or clock.monotonic() - self.checked > self.plan.output.checkpoint_every:
                self._checkpoint()
                self.checked = clock.monotonic()
            if self.report:
                self._tell()

    def _checkpoint(self) -> None:
        output = self.plan.output
        held = self.model.checkpoint()
        begun = {
            "step": self.plan.step.dt,
            "snapshots_every": output.steps_between_snapshots,
            "diagnostics_every": output.steps_between_diagnostics,
            "first_energy": self.first_energy,
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
