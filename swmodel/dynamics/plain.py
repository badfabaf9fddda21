"""The equations of one experiment, bound to the plain NumPy twin: nothing is compiled for balancing a start."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from ..grid import Basin
from . import reference
from .schemes import PVFlux


@dataclass(frozen=True)
class PlainEquations:
    """What the flow obeys, in plain NumPy.

    Parameters
    ----------
    basin : Basin
        Grid, frame, depth and gravity.
    pv_flux : PVFlux
        A row of `PV_FLUXES`, or one of your own.
    linear : bool
        Drop zeta and K, and take H for h in the fluxes.
    """

    basin: Basin
    pv_flux: PVFlux
    linear: bool = False

    def tendency(self, u: Any, v: Any, eta: Any, linear: bool = False) -> tuple[Any, Any, Any]:
        """Rates of change of u, v, eta, all with both ends: by the run's own equations, or by their linear part.

        Returns
        -------
        tuple of ndarray
            du/dt, dv/dt, m s-2; deta/dt, m/s.
        """
        basin, grid = self.basin, self.basin.grid
        return reference.tendency(
            u,
            v,
            eta,
            depth=basin.depth,
            f=basin.f,
            gravity=basin.gravity,
            dx=grid.dx,
            dy=grid.dy,
            edges=(grid.west, grid.east, grid.south, grid.north),
            slip=grid.slip,
            pv_flux=self.pv_flux.plain,
            linear=self.linear or linear,
        )
