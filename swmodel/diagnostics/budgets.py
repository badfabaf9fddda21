"""The energy budget of one step, each term from the very tendencies that the step applies, none by subtraction.

Exact for any stepper: over a step,

    E(new) - E(old) = sum mean(h_u) mean(u) du + mean(h_v) mean(v) dv
                          + [cell mean of mean(u^2 + v^2)/2 + g mean(eta)] deta                                      (8)

with mean = (old + new)/2. A process p that changes the fields by du_p, dv_p, deta_p has that sum as its share. The
conservative terms, weighted as the stepper weights its stages, leave the time-stepping remainder; leapfrog's filter is
a process of its own.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange
from numpy.typing import NDArray

from ..dynamics.compilation import ONE, OPTIONS, U8, row_jit
from ..dynamics.edges import periodic_rows
from ..dynamics.kernels import thickness
from ..dynamics.sweeps import one_step, row
from ..dynamics.tendency import Equations
from ..grid.domain import HALO_X as W
from ..grid.domain import HALO_Y as H
from ..grid.domain import allocate, ordered_sum
from ..state import State
from ..steppers import STEPPERS, Stepper, TimeSettings

KINETIC, POTENTIAL, CHANGE = range(3)

Rows = NDArray[np.float64]


@njit(parallel=True, cache=True, **OPTIONS)
def accumulate(total, T, share, Y, y, blend, step):
    """Total += share T; then Y = y + (blend (Y - y) + step T), the state of the next stage."""
    for r in prange(T.shape[1]):
        for field in range(3):
            for i in range(U8(0), U8(T.shape[2])):
                total[field, r, i] += share * T[field, r, i]
                Y[field, r, i] = y[field, r, i] + (blend * (Y[field, r, i] - y[field, r, i]) + step * T[field, r, i])


@row_jit
def energy_row(out, old, new, change, r, S, N, depth, depths, linear, gravity, n):
    """Shares of one row of cells: into kinetic energy, into potential energy, and the change itself."""
    kinetic = potential = difference = 0.0
    for i in range(U8(W), U8(n + W)):
        e = i + ONE
        w = i - ONE
        h0 = float(thickness(linear, depth, old[2, r], i))
        h1 = float(thickness(linear, depth, new[2, r], i))
        hu0 = 0.5 * (h0 + float(thickness(linear, depth, old[2, r], w)))
        hu1 = 0.5 * (h1 + float(thickness(linear, depth, new[2, r], w)))
        hv0 = 0.5 * (h0 + float(thickness(linear, depths, old[2, S], i)))
        hv1 = 0.5 * (h1 + float(thickness(linear, depths, new[2, S], i)))
        u0 = float(old[0, r, i])
        u1 = float(new[0, r, i])
        v0 = float(old[1, r, i])
        v1 = float(new[1, r, i])
        eta0 = float(old[2, r, i])
        eta1 = float(new[2, r, i])
        deta = float(change[2, r, i])
        kinetic += 0.25 * (
            (hu0 + hu1) * (u0 + u1) * float(change[0, r, i]) + (hv0 + hv1) * (v0 + v1) * float(change[1, r, i])
        )
        if linear is None:
            squares = u0 * u0 + u1 * u1 + float(old[0, r, e]) ** 2 + float(new[0, r, e]) ** 2
            squares += v0 * v0 + v1 * v1 + float(old[1, N, i]) ** 2 + float(new[1, N, i]) ** 2
            kinetic += 0.125 * squares * deta
        potential += 0.5 * gravity * (eta0 + eta1) * deta
        difference += 0.5 * ((hu1 * u1 * u1 - hu0 * u0 * u0) + (hv1 * v1 * v1 - hv0 * v0 * v0))
        difference += 0.5 * gravity * (eta1 - eta0) * (eta1 + eta0)
    out[KINETIC] = kinetic
    out[POTENTIAL] = potential
    out[CHANGE] = difference


@njit(parallel=True, cache=True, **OPTIONS)
def energy_rows(old, new, change, m):
    """`energy_row` of every row, ``[ny, 3]``."""
    out = np.zeros((m.ny, 3))
    for j in prange(m.ny):
        r = j + H
        energy_row(
            out[j],
            old,
            new,
            change,
            r,
            r - 1,
            r + 1,
            row(m.depth, r),
            row(m.depth, r - 1),
            m.linear,
            float(m.gravity),
            m.nx,
        )
    return out


class EnergyBudget:
    """Energy budget of the step that follows a state.

    Parameters
    ----------
    equations : Equations
        What the flow obeys.
    settings : TimeSettings
        Stepper, filter and correction.
    """

    def __init__(self, equations: Equations, settings: TimeSettings) -> None:
        self.equations = equations
        self.settings = settings
        self._scratch = allocate(equations.basin.grid, 4)

    def rates(self, state: State, dt: float, *, first: bool = False) -> dict[str, float]:
        """Terms of the next step's energy budget, each divided by the time it spans, m5 s-3 per unit density.

        Parameters
        ----------
        state : State
            Ghosts filled. Its room for the next step is written into; its levels are not.
        dt : float
            The step, s.
        first : bool
            Whether leapfrog has no earlier level yet: its first step is one of ssprk3.

        Returns
        -------
        dict
            ``kinetic`` and ``potential``, what the conservative terms bring into either; ``time_stepping``, their sum;
            ``filter``; ``change``; and ``residual`` = change - time_stepping - filter, at round-off.
        """
        stepper = STEPPERS[self.settings.stepper]
        if stepper.levels == 2 and not first:
            return self._leapfrog(state, dt, stepper)
        return self._one_step(state, dt, STEPPERS["ssprk3"] if stepper.levels == 2 else stepper)

    def _one_step(self, state: State, dt: float, stepper: Stepper) -> dict[str, float]:
        equations, scheme = self.equations, self.equations.pv_flux.scheme
        old, new = state.sets[0:3], state.sets[3:6]
        Y, T, total, zero = (self._scratch[3 * k : 3 * k + 3] for k in range(4))
        number = state.grid.dtype.type
        work = equations.workspace(len(stepper.stages))
        setup = equations.setup(stepper.stages, dt, gathers=stepper.gathers)
        equations.claim_threads()
        one_step(scheme, work, old, old, new, setup, equations.bands)
        periodic_rows(new, setup)
        Y[...] = old
        total[...] = 0
        for (blend, weight), share in zip(stepper.stages, stepper.quadrature, strict=True):
            equations.stage_tendency(Y, T, zero, work)
            accumulate(total, T, number(share * dt), Y, old, number(blend), number(weight * dt))
            equations.fill(Y)
        rows = energy_rows(old, new, total, setup)
        return self._terms(rows, None, dt)

    def _leapfrog(self, state: State, dt: float, stepper: Stepper) -> dict[str, float]:
        """From the level before the present to the one after it, of which the filter takes its share."""
        equations = self.equations
        now, old, new = (state.sets[3 * k : 3 * k + 3] for k in range(3))
        _, T, total, zero = (self._scratch[3 * k : 3 * k + 3] for k in range(4))
        nu, alpha = self.settings.filter, self.settings.williams
        work = equations.workspace(1)
        setup = equations.setup(stepper.stages, dt)
        equations.claim_threads()
        one_step(equations.pv_flux.scheme, work, now, old, new, setup, equations.bands)
        periodic_rows(new, setup)
        equations.stage_tendency(now, T, zero, work)
        np.multiply(T, 2 * dt, out=total)
        filtered = (alpha - 1) * (nu / 2) * ((old - 2 * now) + new)
        new += filtered
        equations.fill(new)
        rows = energy_rows(old, new, total, setup)
        return self._terms(rows, energy_rows(old, new, np.ascontiguousarray(filtered), setup), 2 * dt)

    def _terms(self, rows: Rows, filter_rows: Rows | None, span: float) -> dict[str, float]:
        grid = self.equations.basin.grid
        scale = grid.dx * grid.dy / span
        kinetic, potential, change = (ordered_sum(rows[:, k]) * scale for k in (KINETIC, POTENTIAL, CHANGE))
        remainder = ordered_sum(np.concatenate([rows[:, KINETIC], rows[:, POTENTIAL]])) * scale
        filtered = 0.0
        if filter_rows is not None:
            filtered = ordered_sum(np.concatenate([filter_rows[:, KINETIC], filter_rows[:, POTENTIAL]])) * scale
        return {
            "kinetic": kinetic,
            "potential": potential,
            "time_stepping": remainder,
            "filter": filtered,
            "change": change,
            "residual": change - remainder - filtered,
        }
