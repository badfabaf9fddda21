"""The staggered grid: where eta, u, v and the corner quantities lie (Arakawa C; Arakawa & Lamb 1977)."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ..choices import Choice
from ..quantities import Length

Edge = Literal["periodic", "wall"]
Slip = Literal["free", "none"]
Location = Literal["centre", "u", "v", "corner"]
Array = NDArray[np.floating[Any]]


class GridSettings(Choice):
    """`[grid]`: how many cells, how large, where the origin lies, and in which precision."""

    cells: Annotated[tuple[Annotated[int, Field(ge=1)], Annotated[int, Field(ge=1)]], Field(description="[nx, ny]")]
    size: Annotated[
        tuple[Annotated[Length, Field(gt=0)], Annotated[Length, Field(gt=0)]], Field(description="[Lx, Ly]")
    ]
    origin: Annotated[
        Literal["centre", "corner"], Field(description='where x = y = 0 lies; "corner" is the south-west one')
    ] = "centre"
    precision: Literal["double", "single"] = "double"


class EdgesSettings(Choice):
    """`[edges]`: what lies at each side of the domain, and whether walls hold the fluid."""

    west: Edge
    east: Edge
    south: Edge
    north: Edge
    slip: Annotated[Slip, Field(description='"free": no stress at walls; "none": no flow along them')] = "free"


@dataclass(frozen=True)
class Grid:
    """A uniform C-grid of nx by ny cells; eta at centres, u on x-faces, v on y-faces, vorticity at corners.

    Arrays are C-ordered ``[j, i]`` (y, x). Both ends of a direction are held: u is ``[ny, nx + 1]``,
    v ``[ny + 1, nx]``, corners ``[ny + 1, nx + 1]``; in a periodic direction the last repeats the first.

    Parameters
    ----------
    nx, ny : int
        Cells along x and y.
    dx, dy : float
        Cell size, m.
    west_x, south_y : float
        Position of the south-west corner, m.
    west, east, south, north : str
        ``"periodic"`` or ``"wall"``.
    slip : str
        ``"free"`` or ``"none"``, for every wall.
    precision : str
        ``"double"`` or ``"single"``: the type of the prognostic fields.
    """

    nx: int
    ny: int
    dx: float
    dy: float
    west_x: float
    south_y: float
    west: Edge = "periodic"
    east: Edge = "periodic"
    south: Edge = "periodic"
    north: Edge = "periodic"
    slip: Slip = "free"
    precision: Literal["double", "single"] = "double"

    @property
    def dtype(self) -> np.dtype[Any]:
        """Type of the prognostic fields."""
        return np.dtype(np.float64 if self.precision == "double" else np.float32)

    @property
    def Lx(self) -> float:
        """Extent along x, m."""
        return self.nx * self.dx

    @property
    def Ly(self) -> float:
        """Extent along y, m."""
        return self.ny * self.dy

    @property
    def periodic_x(self) -> bool:
        """Whether west and east are one line."""
        return self.west == "periodic"

    @property
    def periodic_y(self) -> bool:
        """Whether south and north are one line."""
        return self.south == "periodic"

    @cached_property
    def x(self) -> NDArray[np.float64]:
        """Abscissae of the centres, m, ``[nx]``."""
        return np.asarray(self.west_x + (np.arange(self.nx) + 0.5) * self.dx, np.float64)

    @cached_property
    def y(self) -> NDArray[np.float64]:
        """Ordinates of the centres, m, ``[ny]``."""
        return np.asarray(self.south_y + (np.arange(self.ny) + 0.5) * self.dy, np.float64)

    @cached_property
    def x_face(self) -> NDArray[np.float64]:
        """Abscissae of x-faces and corners, m, ``[nx + 1]``."""
        return np.asarray(self.west_x + np.arange(self.nx + 1) * self.dx, np.float64)

    @cached_property
    def y_face(self) -> NDArray[np.float64]:
        """Ordinates of y-faces and corners, m, ``[ny + 1]``."""
        return np.asarray(self.south_y + np.arange(self.ny + 1) * self.dy, np.float64)

    def axes(self, location: Location) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return the 1-D x and y of a location."""
        x = self.x_face if location in ("u", "corner") else self.x
        y = self.y_face if location in ("v", "corner") else self.y
        return x, y

    def points(self, location: Location) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return x as a row ``[1, nx or nx + 1]`` and y as a column ``[ny or ny + 1, 1]``: they broadcast."""
        x, y = self.axes(location)
        return x[None, :], y[:, None]

    def shape(self, location: Location) -> tuple[int, int]:
        """Return the shape of an array at a location, both ends included."""
        x, y = self.axes(location)
        return y.size, x.size


def build_grid(grid: GridSettings, edges: EdgesSettings) -> Grid:
    """Make the grid that `[grid]` and `[edges]` describe."""
    (nx, ny), (Lx, Ly) = grid.cells, grid.size
    centred = grid.origin == "centre"
    return Grid(
        nx=nx,
        ny=ny,
        dx=Lx / nx,
        dy=Ly / ny,
        west_x=-Lx / 2 if centred else 0.0,
        south_y=-Ly / 2 if centred else 0.0,
        west=edges.west,
        east=edges.east,
        south=edges.south,
        north=edges.north,
        slip=edges.slip,
        precision=grid.precision,
    )
