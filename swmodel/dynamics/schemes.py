"""The PV fluxes there are to choose from. No compiled code here: listings and the schema read this table alone."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, NamedTuple

from . import reference


class Energy(NamedTuple):
    """Marks the flux `energy`: its type picks the point function when a kernel is compiled."""

    marker: int = 0


class Enstrophy(NamedTuple):
    """Marks the flux `enstrophy`."""

    marker: int = 0


class Both(NamedTuple):
    """Marks the flux `both`."""

    marker: int = 0


@dataclass(frozen=True)
class PVFlux:
    """One row of `PV_FLUXES`.

    Parameters
    ----------
    scheme : NamedTuple
        Marker whose type picks the point function at compile time.
    plain : callable
        The same flux in NumPy, ``(q, U, V, aspect) -> flux_u, flux_v``.
    conserves_energy : bool
        In space, on every domain.
    conserves_enstrophy : bool
        Potential enstrophy, in space, on doubly periodic domains.
    meaning, source : str
        One line, and where it was published.
    """

    scheme: Any
    plain: Callable[..., Any]
    conserves_energy: bool
    conserves_enstrophy: bool
    meaning: str
    source: str


PV_FLUXES = {
    "both": PVFlux(
        Both(),
        reference.flux_both,
        True,
        True,
        "conserves energy and potential enstrophy",
        "Arakawa & Lamb 1981, Mon. Wea. Rev. 109",
    ),
    "energy": PVFlux(
        Energy(), reference.flux_energy, True, False, "conserves energy", "Sadourny 1975, J. Atmos. Sci. 32, model I"
    ),
    "enstrophy": PVFlux(
        Enstrophy(),
        reference.flux_enstrophy,
        False,
        True,
        "conserves potential enstrophy",
        "Sadourny 1975, J. Atmos. Sci. 32, model II",
    ),
}
