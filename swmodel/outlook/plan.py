"""The plan of a run: its basin, its start, its step, and when what is stored. Nothing is compiled for it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from ..dynamics import PV_FLUXES, PVFlux
from ..dynamics.frequency import largest_frequency
from ..dynamics.plain import PlainEquations
from ..errors import Fault, RequestError
from ..frame import build_frame
from ..grid import Basin, build_basin, build_grid
from ..state import StartFields, build_start
from ..steppers import StepChoice, choose_step, stability_limit
from ..store.output import ResolvedOutput, resolve_output

if TYPE_CHECKING:
    from ..settings import Experiment

FLOW_EXPECTED = 0.1  # of c, where the start is at rest and no speed is given: a wind-driven start has none yet
SNAPSHOTS_BY_DEFAULT = 50


@dataclass(frozen=True)
class Plan:
    """What will be run.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    basin : Basin
        Where the flow lives.
    pv_flux : PVFlux
        The scheme of the Coriolis term.
    start : StartFields
        The state at time 0.
    flow : tuple of float
        Largest flow along x and y that the step allows for, m/s.
    step : StepChoice
        The step, and why.
    output : ResolvedOutput
        What is stored, and how often.
    """

    experiment: Experiment
    basin: Basin
    pv_flux: PVFlux
    start: StartFields
    flow: tuple[float, float]
    step: StepChoice
    output: ResolvedOutput

    @property
    def steps(self) -> int:
        """Steps to the end."""
        return max(1, round(self.experiment.time.until / self.step.dt))


@dataclass(frozen=True)
class Begun:
    """What a run that goes on keeps from its beginning.

    Parameters
    ----------
    step : float
        The step it began with, s.
    snapshots_every, diagnostics_every : int
        In those steps.
    """

    step: float
    snapshots_every: int
    diagnostics_every: int


def as_parts(start: Any) -> Sequence[Any]:
    """Return the parts of a start of one's own: itself, where it is one."""
    return start if isinstance(start, list | tuple) else [start]


def make_basin(experiment: Experiment) -> Basin:
    """Build grid, frame and layer of an experiment."""
    grid = build_grid(experiment.grid, experiment.edges)
    frame = build_frame(experiment.frame, grid.south_y + grid.Ly / 2)
    return build_basin(grid, frame, experiment.layer)


@dataclass(frozen=True)
class Draft:
    """As much of a plan as can be made, and all that stands against it.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    parts : sequence
        The parts of the start.
    pv_flux : PVFlux
        The scheme of the Coriolis term.
    basin, start, flow, step, output
        As in `Plan`; None where it could not be made.
    faults : tuple of Fault
        What the run is refused for.
    """

    experiment: Experiment
    parts: Sequence[Any]
    pv_flux: PVFlux
    basin: Basin | None = None
    start: StartFields | None = None
    flow: tuple[float, float] | None = None
    step: StepChoice | None = None
    output: ResolvedOutput | None = None
    faults: tuple[Fault, ...] = ()

    @property
    def plan(self) -> Plan:
        """The plan.

        Raises
        ------
        RequestError
            Where anything stands against it.
        """
        if self.faults or not (self.basin and self.start and self.flow and self.step and self.output):
            raise RequestError(self.faults)
        return Plan(self.experiment, self.basin, self.pv_flux, self.start, self.flow, self.step, self.output)


def begin_draft(experiment: Experiment, *, start: Any = None, pv_flux: PVFlux | None = None) -> Draft:
    """Name what is to be planned; nothing is computed yet. Arguments as for `make_plan`."""
    parts: Sequence[Any] = experiment.start if start is None else as_parts(start)
    return Draft(experiment, parts, pv_flux or PV_FLUXES[experiment.numerics.pv_flux])


def draft_plan(draft: Draft, begun: Begun | None = None) -> Draft:
    """Plan as far as that goes: what cannot be made is left out, and why is among the faults."""
    experiment = draft.experiment
    faults: list[Fault] = []
    try:
        basin = make_basin(experiment)
        draft = replace(draft, basin=basin)
        plain = PlainEquations(basin, draft.pv_flux, experiment.numerics.linear)
        fields = build_start(draft.parts, basin, plain.tendency, Path.cwd())
        faults += _thickness_faults(basin, fields)
        flow = expected_flow(experiment, basin, fields)
        draft = replace(draft, start=fields, flow=flow)
        step = plan_step(experiment, basin, draft.pv_flux, fields, flow, begun)
        draft = replace(draft, step=step)
        output = resolve_output(experiment.output, basin.grid, experiment.time.until, step.dt)
    except RequestError as error:
        return replace(draft, faults=(*faults, *error.faults))
    if begun is not None:
        output = replace(
            output, steps_between_snapshots=begun.snapshots_every, steps_between_diagnostics=begun.diagnostics_every
        )
    return replace(draft, output=output, faults=tuple(faults))


def make_plan(
    experiment: Experiment, *, start: Any = None, pv_flux: PVFlux | None = None, begun: Begun | None = None
) -> Plan:
    """Work out what a run will do.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    start : object or sequence, optional
        Start states of your own, in place of the experiment's: objects with ``fields(basin)``.
    pv_flux : PVFlux, optional
        A PV flux of your own.
    begun : Begun, optional
        Step and intervals of a run that goes on; they stay, whatever its new end.

    Raises
    ------
    RequestError
        Where the set-up cannot be run as written, with all that stands against it.
    """
    return draft_plan(begin_draft(experiment, start=start, pv_flux=pv_flux), begun).plan


def expected_flow(experiment: Experiment, basin: Basin, start: StartFields) -> tuple[float, float]:
    """Largest flow along x and y, m/s: given, the start's, or a tenth of c; none where the equations are linear."""
    if experiment.numerics.linear:
        return 0.0, 0.0
    if experiment.time.speed is not None:
        return experiment.time.speed, experiment.time.speed
    u, v = float(np.abs(start.u).max(initial=0)), float(np.abs(start.v).max(initial=0))
    expected = FLOW_EXPECTED * basin.wave_speed
    return (u, v) if u > 0 or v > 0 else (expected, expected)


def plan_step(
    experiment: Experiment,
    basin: Basin,
    pv_flux: PVFlux,
    start: StartFields,
    flow: tuple[float, float],
    begun: Begun | None = None,
) -> StepChoice:
    """Choose the step of an experiment, or take that of a run that goes on."""
    grid, time, output = basin.grid, experiment.time, experiment.output
    thickest = float(np.max(basin.depth_field if experiment.numerics.linear else basin.depth_field + start.eta))
    advection = flow[0] / grid.dx + flow[1] / grid.dy
    times = {"time.until": time.until}
    times |= {f"output.{key}": every for key in ("every", "diagnostics_every") if (every := getattr(output, key))}
    nice = None if "output.every" in times else time.until / SNAPSHOTS_BY_DEFAULT
    omega_max = largest_frequency(basin, thickest, pv_flux)
    if begun is not None:
        limit = time.margin * stability_limit(time.stepper, time.filter, time.williams) / (omega_max + advection)
        return StepChoice(begun.step, limit, omega_max, advection, time.until, given=time.step != "auto")
    return choose_step(time, omega_max, advection, times, nice)


def _thickness_faults(basin: Basin, start: StartFields) -> list[Fault]:
    """Refuse a start that leaves no fluid somewhere."""
    thickness = basin.depth_field + start.eta
    if (low := float(thickness.min())) > 0:
        return []
    j, i = np.unravel_index(int(np.argmin(thickness)), thickness.shape)
    grid = basin.grid
    return [
        Fault(
            ("start",),
            f"the thickness at the start is {low:.4g} m at x = {grid.x[i]:.6g} m, y = {grid.y[j]:.6g} m",
            "a thickness above 0 everywhere (there is no wetting and drying)",
            "lower the amplitude or deepen the layer",
        )
    ]


def planned_times(plan: Plan, every: int) -> np.ndarray[Any, np.dtype[np.float64]]:
    """Model times at which something happens every so many steps, start and end included, s."""
    steps = np.unique(np.append(np.arange(0, plan.steps, every), plan.steps))
    return steps * plan.step.dt


def run_folder_name(experiment: Experiment) -> str:
    """Name of a run's folder: the configuration's own name."""
    return Path(experiment.path).stem if experiment.path else "experiment"
