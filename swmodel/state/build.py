"""The state at the start: the sum of its parts, those to be balanced first added and balanced once, as one flow."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import Fault, RequestError
from ..grid.basin import Basin
from ..grid.staggered import Grid
from .balance import (
    BalanceTendency,
    balanced_elevation,
    close_round,
    geostrophic_streamfunction,
    gradient_streamfunction,
    hold_on_walls,
    velocities,
)
from .starts.base import IMAGE_CAUTION, Fields, FlowStart, OwnStart, Start, SurfaceStart, percent, still

Array = NDArray[np.float64]


@dataclass(frozen=True)
class StartFields:
    """The state at the start.

    Parameters
    ----------
    u : ndarray ``[ny, nx + 1]``
        Velocity along x on x-faces, m/s; 0 on walls.
    v : ndarray ``[ny + 1, nx]``
        Velocity along y on y-faces, m/s; 0 on walls.
    eta : ndarray ``[ny, nx]``
        Elevation at centres, m.
    cautions : list of str
        What `check` should say of it, each with the part it concerns.
    """

    u: Array
    v: Array
    eta: Array
    cautions: list[str] = field(default_factory=list)


def build_start(
    parts: Sequence[Start | OwnStart], basin: Basin, tendency: BalanceTendency, base_folder: Path
) -> StartFields:
    """Add up the parts of a start.

    Parameters
    ----------
    parts : sequence
        Start states: rows of `STARTS`, or objects of your own with ``fields(basin)``.
    basin : Basin
        Where the flow lives.
    tendency : callable
        ``(u, v, eta, linear) -> (du, dv, deta)``: the run's own equations, against which the balance is solved.
    base_folder : Path
        Folder that paths in the parts are relative to.

    Returns
    -------
    StartFields
        In double precision, whatever the run's.

    Raises
    ------
    RequestError
        With every fault of every part, keyed ``("start", number, key)``.
    """
    faults: list[Fault] = []
    whole = _Sum(basin)
    own = [part.beside(base_folder) if isinstance(part, Start) else part for part in parts]
    faults += _mixed_balance(own)
    for number, part in enumerate(own):
        try:
            whole.add(number, part)
        except RequestError as error:
            faults += [_placed(fault, number) for fault in error.faults]
    if faults:
        raise RequestError(faults)
    if whole.balance is not None:
        try:
            whole.balance_once(tendency)
        except RequestError as error:
            raise RequestError([_placed(fault, whole.balanced[0]) for fault in error.faults]) from error
    cautions = [
        *(f"start.{number}: {remark}" for number, part in enumerate(own) for remark in _remarks(part, basin)),
        *whole.shut_walls(),
    ]
    for values, along_x, along_y in ((whole.u, True, False), (whole.v, False, True)):
        close_round(values, basin.grid, along_x=along_x, along_y=along_y)
    return StartFields(whole.u, whole.v, whole.eta, cautions)


class _Sum:
    """The parts added so far: as they are, and waiting for balance."""

    def __init__(self, basin: Basin) -> None:
        self.basin = basin
        self.u, self.v, self.eta = still(basin)
        self.psi = np.zeros(basin.grid.shape("corner"))
        self.surface = np.zeros(basin.grid.shape("centre"))
        self.balance: str | None = None
        self.balanced: list[int] = []

    def add(self, number: int, part: Start | OwnStart) -> None:
        """Add one part."""
        if isinstance(part, FlowStart | SurfaceStart) and part.balance != "none":
            if part.balance == "geostrophic" and not self.basin.f.any():
                raise RequestError(_NO_ROTATION)
            if isinstance(part, FlowStart):
                self.psi += part.streamfunction(self.basin)
            else:
                self.surface += part.surface(self.basin)
            self.balance = part.balance
            self.balanced.append(number)
            return
        u, v, eta = _checked(part.fields(self.basin), self.basin.grid)
        self.u += u
        self.v += v
        self.eta += eta

    def balance_once(self, tendency: BalanceTendency) -> None:
        """Balance what waits for it, and add it."""
        psi = self.psi
        linear = self.balance == "geostrophic"
        if self.surface.any():
            if linear:
                psi = psi + hold_on_walls(geostrophic_streamfunction(self.surface, self.basin), self.basin.grid)
            else:
                psi = psi + gradient_streamfunction(self.surface, self.basin, tendency)
        u, v = velocities(psi, self.basin.grid)
        mean = float(np.mean(self.surface))
        self.eta += balanced_elevation(u, v, self.basin, tendency, linear=linear, mean=mean)
        self.u += u
        self.v += v

    def shut_walls(self) -> list[str]:
        """Let nothing flow through walls, and say where that changes something."""
        grid = self.basin.grid
        largest = max(float(np.max(np.abs(self.u))), float(np.max(np.abs(self.v))))
        through = []
        if not grid.periodic_x:
            through += [("west", self.u[:, 0]), ("east", self.u[:, -1])]
        if not grid.periodic_y:
            through += [("south", self.v[0, :]), ("north", self.v[-1, :])]
        cautions = []
        for name, normal in through:
            lost = float(np.max(np.abs(normal)))
            if lost > IMAGE_CAUTION * largest:
                cautions.append(
                    f"start: the flow given at the {name} wall runs into it, and is set to 0 there; that changes a "
                    f"speed by {percent(lost / largest)} of the largest; give a flow along the wall"
                )
            normal[:] = 0.0
        return cautions


_NO_ROTATION = Fault(
    ("balance",),
    '"geostrophic" balance needs rotation, and f is 0 everywhere',
    remedy='balance = "gradient" (the pressure then holds the flow on its curved way) or "none"',
)


def _placed(fault: Fault, number: int) -> Fault:
    """Return a fault of a part with the part's own place in the configuration."""
    return fault if fault.key[:1] == ("start",) else replace(fault, key=("start", number, *fault.key))


def _mixed_balance(parts: Sequence[Any]) -> list[Fault]:
    """Refuse parts that are to be balanced by different equations."""
    words = {
        number: part.balance
        for number, part in enumerate(parts)
        if isinstance(part, FlowStart | SurfaceStart) and part.balance != "none"
    }
    if len(set(words.values())) < 2:
        return []
    first, word = next(iter(words.items()))
    return [
        Fault(
            ("start", number, "balance"),
            f'"{other}", and start.{first} has "{word}"',
            'balanced parts are one flow and share one word; "none" goes with either',
            f'"{word}" here too, or "{other}" there',
        )
        for number, other in words.items()
        if other != word
    ]


def _checked(fields: Fields, grid: Grid) -> Fields:
    """Return a part's fields as doubles, their shapes and values checked."""
    faults = []
    own = []
    shapes = grid.shape("u"), grid.shape("v"), grid.shape("centre")
    for name, values, shape in zip(("u", "v", "eta"), fields, shapes, strict=True):
        values = np.asarray(values, np.float64)
        own.append(values)
        if values.shape != shape:
            faults.append(Fault((), f"its {name} has the shape {list(values.shape)}", f"{list(shape)}, y first"))
        elif not np.isfinite(values).all():
            faults.append(Fault((), f"its {name} is not finite everywhere", "every value must be finite"))
    if faults:
        raise RequestError(faults)
    return own[0], own[1], own[2]


def _remarks(part: Start | OwnStart, basin: Basin) -> list[str]:
    return part.remarks(basin) if isinstance(part, Start) else []
