"""What every start state is, and how patterns are laid over a grid that may be periodic.

To write another start state:

1. Make a class of `Start` in one file of this folder: `kind` (its name), `meaning`, `source`, and its typed keys.
2. Give it `scale` (the smallest length in it) and `fields` (u, v, eta with nothing balanced).
3. If it can be balanced, derive it from `FlowStart` (its streamfunction is given) or `SurfaceStart` (its elevation is),
   and give it `pattern`; `fields` is there then. A wave names its family in `wave`, and says its
   wavenumbers in `theory_arguments`.
4. Add the class to the table `STARTS`. The tests that hold for every row run on it unasked.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal, Protocol, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import ConfigDict, Field

from ...choices import Choice
from ...grid.basin import Basin
from ...grid.staggered import Grid, Location
from ...quantities import Length
from ..balance import close_round, geostrophic_streamfunction, hold_on_walls, velocities

Array = NDArray[np.float64]
Fields = tuple[Array, Array, Array]
Balance = Annotated[
    Literal["none", "geostrophic", "gradient"],
    Field(description='"geostrophic": by the linear equations; "gradient": by the equations in full'),
]
Direction = Literal["x", "y"]
Position = tuple[Length, Length]

IMAGE_CAUTION = 0.01
"""Share of the largest speed by which images or walls may change the flow unsaid."""


def _require_kind(schema: dict[str, Any]) -> None:
    """Say in the schema what the choice among kinds needs anyway."""
    schema["required"] = ["kind", *schema.get("required", [])]


class Start(Choice):
    """Base of the start states."""

    model_config = ConfigDict(json_schema_extra=_require_kind)

    wave: ClassVar[str] = ""

    kind: Any

    def fields(self, basin: Basin) -> Fields:
        """Return u ``[ny, nx + 1]``, v ``[ny + 1, nx]`` (m/s) and eta ``[ny, nx]`` (m), nothing balanced."""
        raise NotImplementedError

    def scale(self, basin: Basin) -> float:
        """Return the smallest length in it, m."""
        raise NotImplementedError

    def beside(self, folder: Path) -> Self:
        """Return the same start with the files it names taken relative to `folder`."""
        return self

    def remarks(self, basin: Basin) -> list[str]:
        """Return what to be cautious of, each "what; why here, with the number; remedy"."""
        return []


class OwnStart(Protocol):
    """Any object of your own that lays out a state."""

    def fields(self, basin: Basin) -> Fields:
        """Return u ``[ny, nx + 1]``, v ``[ny + 1, nx]`` (m/s) and eta ``[ny, nx]`` (m)."""


def still(basin: Basin) -> Fields:
    """Return u, v and eta of rest."""
    grid = basin.grid
    return np.zeros(grid.shape("u")), np.zeros(grid.shape("v")), np.zeros(grid.shape("centre"))


Shape = Callable[[Array, Array], Array]
"""A pattern in an unbounded plane: values at displacements (x row, y column), m."""


@dataclass(frozen=True)
class Laid:
    """A pattern laid over a grid.

    Parameters
    ----------
    values : ndarray
        Its values.
    trend : tuple of float
        Slope along x and y that was taken out, a rise over a period being impossible, per m.
    neighbours : dict
        For each periodic direction, the largest slope of the pattern (across the line half way to its next image, where
        the nearest image changes).
    """

    values: Array
    trend: tuple[float, float] = (0.0, 0.0)
    neighbours: dict[str, float] = field(default_factory=dict)


def nearest(distance: Array, period: float) -> Array:
    """Return the distance to the nearest of images a period apart."""
    return distance - period * np.round(distance / period)


def lay(shape: Shape, at: Position, local: str, grid: Grid, location: Location, *, level: bool) -> Laid:
    """Lay a pattern over the grid: in a periodic direction it is seen from its nearest image.

    Parameters
    ----------
    shape : callable
        The pattern in an unbounded plane.
    at : tuple of float
        Its middle, m.
    local : str
        The directions in which it has a middle, of ``"xy"``; along the others it is uniform or has the domain's period.
    grid : Grid
        The grid.
    location : str
        Where the values lie.
    level : bool
        Whether to take out what a pattern rises from one end of a period to the other.
    """
    x, y = grid.points(location)
    sx, sy = x - at[0], y - at[1]
    round_x, round_y = grid.periodic_x and "x" in local, grid.periodic_y and "y" in local
    sx = nearest(sx, grid.Lx) if round_x else sx
    sy = nearest(sy, grid.Ly) if round_y else sy
    values = np.array(np.broadcast_to(shape(sx, sy), grid.shape(location)))
    trend = [0.0, 0.0]
    neighbours = {}
    origin = np.zeros((1, 1))
    if round_x:
        half, step = np.full((1, 1), grid.Lx / 2), grid.dx / 2
        trend[0] = float((shape(half, origin) - shape(-half, origin)).item()) / grid.Lx if level else 0.0
        neighbours["x"] = float(np.max(np.abs(shape(half + step, sy) - shape(half - step, sy)))) / grid.dx
    if round_y:
        half, step = np.full((1, 1), grid.Ly / 2), grid.dy / 2
        trend[1] = float((shape(origin, half) - shape(origin, -half)).item()) / grid.Ly if level else 0.0
        neighbours["y"] = float(np.max(np.abs(shape(sx, half + step) - shape(sx, half - step)))) / grid.dy
    if any(trend):
        values -= trend[0] * sx + trend[1] * sy
    close_round(values, grid, along_x=location in ("u", "corner"), along_y=location in ("v", "corner"))
    return Laid(values, (trend[0], trend[1]), neighbours)


class FlowStart(Start):
    """Base of starts that give a flow by its streamfunction; eta follows from `balance`."""

    balance: Balance = "geostrophic"

    def pattern(self, basin: Basin) -> Laid:
        """Return the streamfunction as laid over the corners, m2/s; what it rises round a period is taken out."""
        raise NotImplementedError

    def streamfunction(self, basin: Basin) -> Array:
        """Return the streamfunction at corners, m2/s, ``[ny + 1, nx + 1]``, constant along walls."""
        return hold_on_walls(self.pattern(basin).values, basin.grid)

    def fields(self, basin: Basin) -> Fields:
        """Return the flow with its mean, and eta = 0."""
        pattern = self.pattern(basin)
        u, v = velocities(hold_on_walls(pattern.values, basin.grid), basin.grid)
        return u - pattern.trend[1], v + pattern.trend[0], still(basin)[2]

    def remarks(self, basin: Basin) -> list[str]:
        """Say where images or walls change the flow."""
        pattern = self.pattern(basin)
        u, v = velocities(pattern.values, basin.grid)
        steepest = _largest(u - pattern.trend[1], v + pattern.trend[0])
        images = image_remarks(self.kind, pattern, steepest, mean_kept=self.balance == "none")
        return images + wall_remarks(self.kind, pattern.values, basin.grid)


class SurfaceStart(Start):
    """Base of starts that give the elevation; the flow follows from `balance`."""

    balance: Balance = "none"

    def pattern(self, basin: Basin, *, level: bool) -> Laid:
        """Return the elevation as laid over the centres, m; `level` takes out what it rises round a period."""
        raise NotImplementedError

    def surface(self, basin: Basin) -> Array:
        """Return the elevation to be balanced, m, ``[ny, nx]``."""
        return self.pattern(basin, level=True).values

    def fields(self, basin: Basin) -> Fields:
        """Return eta as it is, and no flow."""
        u, v, _rest = still(basin)
        return u, v, self.pattern(basin, level=False).values

    def remarks(self, basin: Basin) -> list[str]:
        """Say where images or walls change the flow in balance with it."""
        if self.balance == "none":
            return []
        grid = basin.grid
        pattern = self.pattern(basin, level=True)
        along_x, along_y = np.diff(pattern.values, axis=1) / grid.dx, np.diff(pattern.values, axis=0) / grid.dy
        steepest = _largest(along_x + pattern.trend[0], along_y + pattern.trend[1])
        images = image_remarks(self.kind, pattern, steepest, mean_kept=False)
        return images + wall_remarks(self.kind, geostrophic_streamfunction(pattern.values, basin), grid)


def image_remarks(kind: str, pattern: Laid, steepest: float, *, mean_kept: bool) -> list[str]:
    """Say where the images that a periodic direction brings would change a speed by over 1 % of the largest."""
    remarks: list[str] = []
    if steepest == 0:  # one cell along: nothing flows
        return remarks
    for direction, slope in pattern.neighbours.items():
        if slope > IMAGE_CAUTION * steepest:
            remarks.append(
                f"the {kind} meets its own image: half a period away along {direction} its speed is still "
                f"{percent(slope / steepest)} of the largest, and only the nearest image is counted; "
                f"a smaller {kind}, or a longer domain along {direction}"
            )
        mean = abs(pattern.trend[direction == "y"])
        if mean > IMAGE_CAUTION * steepest and not mean_kept:
            remarks.append(
                f"the mean flow of the {kind} is taken out, {percent(mean / steepest)} of the largest speed: along "
                f"{direction} the domain is periodic, where no elevation balances a mean flow; walls on either side, "
                f"or a longer domain along {direction}"
            )
    return remarks


def wall_remarks(kind: str, psi: Array, grid: Grid) -> list[str]:
    """Say where holding the streamfunction constant along walls changes a speed by over 1 % of the largest."""
    u, v = velocities(psi, grid)
    held_u, held_v = velocities(hold_on_walls(psi, grid), grid)
    largest = _largest(u, v)
    change = _largest(held_u - u, held_v - v)
    if change <= IMAGE_CAUTION * largest:
        return []
    return [
        f"a wall bends the flow of the {kind}: its streamfunction is held constant along the wall, which changes a "
        f"speed by {percent(change / largest)} of the largest; move it away from the wall"
    ]


def _largest(*fields: Array) -> float:
    """Return the largest magnitude in fields, any of which may be empty."""
    return max(float(np.max(np.abs(field), initial=0.0)) for field in fields)


def percent(share: float) -> str:
    """Write a share in per cent, with two digits below 10 %."""
    return f"{100 * share:.2g} %" if share < 0.1 else f"{100 * share:.0f} %"
