"""The dynamics room: the equations, plain (reference.py) and fused (kernels.py), and the PV fluxes.

Importing the room loads no compiled code; `tendency` does, when a run needs it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

from pydantic import Field

from ..choices import Choice, name_in
from .schemes import PV_FLUXES, PVFlux

if TYPE_CHECKING:
    PVFluxName = str
else:
    PVFluxName = name_in(PV_FLUXES)

__all__ = ["PV_FLUXES", "NumericsSettings", "PVFlux"]


class NumericsSettings(Choice):
    """`[numerics]`: how the equations are put on the grid."""

    pv_flux: Annotated[PVFluxName, Field(description="scheme of the Coriolis term")] = "both"
    linear: Annotated[bool, Field(description="drop advection, take the depth at rest in the fluxes")] = False
    threads: Annotated[int, Field(ge=1)] | None = None
