"""The model: it owns the state, advances it in compiled blocks, and stops where the solution becomes unphysical."""

from __future__ import annotations

import logging
import math
from typing import TYPE_CHECKING, Any

import numpy as np

from ..diagnostics.derived import derive
from ..dynamics import PVFlux
from ..errors import RequestError, SolutionError
from ..grid.domain import Array
from ..outlook.plan import Plan, make_plan
from ..quantities import TIME, format_quantity, read_quantity
from ..state import State
from ..steppers import STEPPERS, advance, stability_limit
from ..store.checkpoints import Checkpoint

if TYPE_CHECKING:
    from ..dynamics.sweeps import Setup
    from ..settings import Experiment

STEPS_A_BLOCK = 50  # between looks at the state: a look costs some 1 % of that
OUTGROWN = 0.5  # of the way from the margin to the limit: beyond it the flow has outgrown what the step allows for

log = logging.getLogger(__name__)


class Model:
    """A rotating shallow-water model of one experiment.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    start : object or sequence, optional
        Start states of your own, in place of the experiment's: objects with ``fields(basin)``.
    pv_flux : PVFlux, optional
        A PV flux of your own.
    plan : Plan, optional
        A plan made before; by default it is made here.

    Raises
    ------
    RequestError
        Where the set-up cannot be run as written.

    Examples
    --------
    >>> model = Model(experiment)
    >>> model.advance("3 h")
    >>> model.eta.max()
    """

    def __init__(
        self,
        experiment: Experiment,
        *,
        start: Any = None,
        pv_flux: PVFlux | None = None,
        plan: Plan | None = None,
    ) -> None:
        # numba loads here, not where the class is named
        from ..diagnostics.budgets import EnergyBudget
        from ..dynamics.tendency import EULER, Equations

        self.experiment = experiment
        self.plan = plan or make_plan(experiment, start=start, pv_flux=pv_flux)
        self.basin = self.plan.basin
        self.settings = experiment.time
        self.equations = Equations(
            self.basin, self.plan.pv_flux, linear=experiment.numerics.linear, threads=experiment.numerics.threads
        )
        self.dt = self.plan.step.dt
        self.halvings = 0
        self._levels = STEPPERS[self.settings.stepper].levels
        self._first = self._levels == 2
        self._origin = (0, 0.0)  # step and time from which times are counted, so that they depend on no blocks
        self._setup: Setup = self.equations.setup(EULER, 1.0)
        self._budget: EnergyBudget | None = None
        self.state = State(self.basin.grid, 1 + self._levels)
        for view, values in zip(
            (self.u, self.v, self.eta), (self.plan.start.u, self.plan.start.v, self.plan.start.eta), strict=True
        ):
            view[...] = values
        self._fill()

    @property
    def time(self) -> float:
        """Model time, s."""
        return self.state.time

    @property
    def steps(self) -> int:
        """Steps taken."""
        return self.state.steps

    @property
    def u(self) -> Array:
        """Velocity along x on x-faces, m/s, ``[ny, nx + 1]``; a live view until the next `advance`."""
        return self.state.u

    @property
    def v(self) -> Array:
        """Velocity along y on y-faces, m/s, ``[ny + 1, nx]``; a live view until the next `advance`."""
        return self.state.v

    @property
    def eta(self) -> Array:
        """Elevation at centres, m, ``[ny, nx]``; a live view until the next `advance`."""
        return self.state.eta

    def advance(self, span: float | str) -> None:
        """Advance by a whole number of steps.

        Parameters
        ----------
        span : float or str
            Model time, s or text with a unit.

        Raises
        ------
        RequestError
            Where it is no whole number of steps; the nearest is named.
        SolutionError
            Where a value is not finite or the layer dries; the state is then the last good one.
        """
        seconds = read_quantity(span, TIME) if isinstance(span, str) else float(span)
        steps = round(seconds / self.dt)
        if steps < 0 or abs(steps * self.dt - seconds) > 1e-6:
            nearest = max(1, steps) * self.dt
            raise RequestError(
                f"{format_quantity(seconds, 's')} is no whole number of steps of {self.dt:.10g} s; "
                f"the nearest is {nearest:.10g} s"
            )
        self._fill()  # the views may have been written into
        self.take(steps)

    def take(self, steps: int) -> None:
        """Take so many steps, in blocks, each looked at."""
        while steps > 0:
            block = min(steps, STEPS_A_BLOCK)
            kept = self._kept()
            before = self.state.steps, self._first
            self._advance(block)
            if self._least_thickness() <= 0:
                self.state.sets[: len(kept)] = kept
                self.state.steps, self._first = before
                self._to_the_last_good_step(block)
            steps -= block

    def field(self, name: str) -> Array:
        """Return a field of the present state at its own points, both ends included.

        Parameters
        ----------
        name : str
            ``eta``, ``u``, ``v``, ``h``, ``pv``, ``vorticity``, ``divergence`` or ``speed``.
        """
        if name in ("u", "v", "eta"):
            return getattr(self, name)  # type: ignore[no-any-return]
        grid = self.basin.grid
        return derive(
            name,
            self.u,
            self.v,
            self.eta,
            depth=self.basin.depth,
            f=self.basin.f,
            dx=grid.dx,
            dy=grid.dy,
            edges=(grid.west, grid.east, grid.south, grid.north),
            slip=grid.slip,
            linear=self.equations.linear,
        )

    def diagnostics(self) -> dict[str, float]:
        """Conserved quantities and extremes of the present state; see `diagnostics.sums.gather_sums`."""
        from ..diagnostics.sums import sums

        self._fill()  # the views may have been written into
        return sums(self.state.sets[0:3], self._setup, self.basin)

    def energy_budget(self) -> dict[str, float]:
        """Terms of the energy budget of the next step, m5 s-3; see `diagnostics.budgets`."""
        from ..diagnostics.budgets import EnergyBudget

        if self._budget is None:
            self._budget = EnergyBudget(self.equations, self.settings)
        self._fill()
        return self._budget.rates(self.state, self.dt, first=self._first)

    def halve_step_if_outgrown(self) -> bool:
        """Halve the step where the flow has outgrown what it allows for; a given step stays."""
        if self.plan.step.given or self.equations.linear:
            return False
        used = self._share_of_limit(self._advection())
        margin = self.settings.margin
        if used <= margin + OUTGROWN * (1 - margin):
            return False
        self._set_step(self.dt / 2, self.halvings + 1)
        self._first = self._levels == 2
        log.warning(
            "at %s the flow has outgrown the step: it used %.0f %% of the stability limit; the step is now %.6g s",
            format_quantity(self.time, "s"),
            100 * used,
            self.dt,
        )
        return True

    def checkpoint(self) -> Checkpoint:
        """Return a copy of all that the next step depends on."""
        number = 1 if self._first else self._levels
        levels = [(u.copy(), v.copy(), eta.copy()) for u, v, eta in map(self.state.level, range(number))]
        origin_steps, origin_time = self._origin
        extra = {"halvings": self.halvings, "origin_steps": origin_steps, "origin_time": origin_time}
        return Checkpoint(self.time, self.steps, self.dt, levels, extra)

    def restore(self, checkpoint: Checkpoint) -> None:
        """Go back to what a checkpoint holds, to the last bit."""
        for k, level in enumerate(checkpoint.levels):
            for view, values in zip(self.state.level(k), level, strict=True):
                view[...] = values
            self.equations.fill(self.state.sets[3 * k : 3 * k + 3])
        self._first = self._levels == 2 and len(checkpoint.levels) == 1
        self.dt = float(checkpoint.dt)
        self.halvings = int(checkpoint.extra["halvings"])
        self._origin = int(checkpoint.extra["origin_steps"]), float(checkpoint.extra["origin_time"])
        self.state.steps, self.state.time = int(checkpoint.steps), float(checkpoint.time)

    def _fill(self) -> None:
        self.equations.fill(self.state.sets[0:3])

    def _advance(self, steps: int) -> None:
        advance(self.state, steps, self.dt, self.equations, self.settings, first=self._first)
        self._first = False
        self._set_time()

    def _kept(self) -> Array:
        """Copy of every level that the next step depends on."""
        return self.state.sets[: 3 * self._levels].copy()

    def _set_time(self) -> None:
        origin_steps, origin_time = self._origin
        self.state.time = origin_time + (self.state.steps - origin_steps) * self.dt

    def _set_step(self, dt: float, halvings: int) -> None:
        self._origin = self.state.steps, self.state.time
        self.dt, self.halvings = dt, halvings

    def _least_thickness(self) -> float:
        """Least thickness, m; minus infinity where a value is not finite."""
        from ..diagnostics.sums import row_health

        return float(row_health(self.state.sets[0:3], self._setup).min())

    def _to_the_last_good_step(self, steps: int) -> None:
        """Take single steps from a good state up to the last good one, then say what comes after it."""
        for _ in range(steps):
            kept = self._kept()
            before = self.state.steps, self._first
            advection = self._advection()
            self._advance(1)
            if self._least_thickness() <= 0:
                error = self._unphysical(max(advection, self._advection()))
                self.state.sets[: len(kept)] = kept
                self.state.steps, self._first = before
                self._set_time()
                raise error
        raise AssertionError("a block went bad, but none of its steps did")

    def _advection(self) -> float:
        """U/dx + V/dy of the largest flow that is a number, 1/s."""
        u, v = (float(np.nanmax(np.abs(speed), initial=0.0)) for speed in (self.u, self.v))
        return u / self.basin.grid.dx + v / self.basin.grid.dy

    def _share_of_limit(self, advection: float) -> float:
        """Share of the stability limit that the step uses with a flow of U/dx + V/dy = `advection`."""
        limit = stability_limit(self.settings.stepper, self.settings.filter, self.settings.williams)
        return self.dt * (self.plan.step.omega_max + advection) / limit

    def _unphysical(self, advection: float) -> SolutionError:
        """Say what is wrong with the present state, where, and the likely cause, with a flow of `advection`."""
        grid = self.basin.grid
        h = self.basin.depth_field + self.eta
        finite = np.isfinite(h) & np.isfinite(self.u[:, 1:]) & np.isfinite(self.v[1:])
        j, i = np.unravel_index(int(np.argmin(np.where(finite, h, -np.inf))), h.shape)
        place = float(grid.x[i]), float(grid.y[j])
        dried = bool(finite.all())
        what = "the layer dries" if dried else "a value is not finite"
        used = self._share_of_limit(advection)
        if used > 1 or not math.isfinite(used):
            cause = (
                f"the step of {self.dt:.6g} s is too long for the flow ({used:.3g} of the stability limit): shorten it"
            )
            cause += ", or give [time] speed; or the grid is too coarse for the flow's gradients: refine it"
        elif dried:
            cause = "the layer outcrops, and there is no wetting and drying: lower the amplitude or deepen the layer"
        else:
            cause = "the grid is too coarse for the flow's gradients: refine it, or shorten the step"
        message = (
            f"{what} at {format_quantity(self.time, 's')} (step {self.steps}) at x = {format_quantity(place[0], 'm')}, "
            f"y = {format_quantity(place[1], 'm')}; likely cause: {cause}"
        )
        return SolutionError(message, self.time, place)
