"""The chain: check, advance, store, judge; and going on from a checkpoint."""

from __future__ import annotations

import logging
import sys
import time as clock
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import Fault, RequestError
from ..measures import ExpectSettings, Record, Verdict, faults
from ..measures import judge as judge_record
from ..outlook import Outlook, check
from ..outlook.cost import remember_run
from ..outlook.plan import Begun, as_parts, make_basin, make_plan, run_folder_name
from ..outlook.speeds import measure_speed
from ..quantities import TIME, format_quantity, read_quantity
from ..settings import Experiment
from ..store.checkpoints import read_checkpoint
from ..store.durable import write_json
from ..store.lock import FolderLock
from ..store.provenance import digest, gather_provenance, package_versions
from ..store.reading import VERDICT, Run
from ..store.writer import RunWriter, free_folder
from .course import Course, Report, set_up_digest
from .model import Model

if TYPE_CHECKING:
    from ..dynamics import PVFlux

RUNS = Path("runs")
KEPT_IN_CHECKPOINTS = ("step", "snapshots_every", "diagnostics_every", "first_energy", "set_up")
TIME_ROUND_OFF = 1e-6  # s: times are kept to a microsecond

log = logging.getLogger(__name__)


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
    outlook = outlook or check(experiment, start=start, pv_flux=pv_flux, into=into)
    if outlook.refusals or outlook.plan is None:
        raise experiment.placed(RequestError(outlook.refusals))
    plan = outlook.plan
    folder = Path(into) if into is not None else free_folder(RUNS, run_folder_name(experiment))
    provenance = gather_provenance(experiment.text, experiment.as_json(), sys.argv)
    with RunWriter(
        folder, plan.basin, provenance=provenance, output=plan.output, epoch=experiment.time.start
    ) as writer:
        begun = clock.monotonic()
        log.info("command: %s", provenance.command)
        model = Model(experiment, plan=plan)
        for caution in outlook.cautions:
            log.info("caution: %s", caution)
        _log_beginning(model)
        Course(model, plan, writer, progress).follow()
        seconds = clock.monotonic() - begun
        log.info("ended after %.3g s of wall clock", seconds)
    if outlook.cost is not None:
        measure_speed(model.equations, experiment.time)
        remember_run(outlook.cost, seconds, float(plan.basin.grid.nx * plan.basin.grid.ny * plan.steps))
    judge(folder, start=start)
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
    if lacking := [name for name in KEPT_IN_CHECKPOINTS if name not in kept.extra]:
        found = f"its checkpoint holds no {', '.join(lacking)}: another version of swmodel wrote it"
        raise RequestError(Fault((), found, "", "resume it with that version, or run it again"))
    begun = Begun(float(kept.extra["step"]), int(kept.extra["snapshots_every"]), int(kept.extra["diagnostics_every"]))
    if until is not None:
        experiment = _extended(experiment, begun.step, until)
        if experiment.time.until < float(kept.time) - TIME_ROUND_OFF:
            raise RequestError(f"--until: the run has reached {format_quantity(float(kept.time), 's')} already")
    plan = make_plan(experiment, start=start, pv_flux=pv_flux, begun=begun)
    if int(kept.extra["set_up"]) != set_up_digest(plan):
        raise RequestError(
            Fault(
                (),
                "the depth, f or the PV flux is not what the run began with",
                "the same files, and the same objects of your own",
                "give them again, or start a new run",
            )
        )
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
        Course(model, plan, writer, progress).follow()
    judge(Path(folder), start=start)
    return Run(folder)


def judge(run: Run | str | Path, expectations: Sequence[ExpectSettings] | None = None, *, start: Any = None) -> Verdict:
    """Judge what a run left, and write verdict.json.

    Parameters
    ----------
    run : Run, str or Path
        The run or its folder.
    expectations : sequence, optional
        Other expectations than the run's own; verdict.json is then left alone.
    start : object or sequence, optional
        Start states of your own that the run began with.

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
    starts = experiment.start if start is None else as_parts(start)
    if expectations is not None:
        wrong = [fault for n, one in enumerate(expectations) for fault in faults(one, n, record, starts)]
        if wrong:
            raise RequestError(wrong)
    reached, until = float(record.times[-1]), experiment.time.until
    ended = f"the run ended at {format_quantity(reached, 's')} of {format_quantity(until, 's')}"
    verdict = judge_record(
        experiment.expect if expectations is None else expectations,
        record,
        starts,
        run=held.folder.name,
        versions=package_versions(),
        unfinished=ended if until - reached > TIME_ROUND_OFF else "",
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
