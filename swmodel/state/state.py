"""The state of the flow: u, v, eta with their halo, and the time."""

from __future__ import annotations

from dataclasses import dataclass, field

from ..grid.domain import Array, allocate, inside_centre, inside_u, inside_v
from ..grid.staggered import Grid


@dataclass
class State:
    """Prognostic fields and time.

    `sets` holds several sets of (u, v, eta) with halo, ``[3 n, ny + 2 HALO_Y, stride]``. Set 0 is the present;
    leapfrog keeps the level before it in set 1; the others are room for the next step to be written into.

    Parameters
    ----------
    grid : Grid
        The grid.
    number : int
        How many sets.
    time : float
        Model time, s.
    steps : int
        Steps taken since time 0.
    """

    grid: Grid
    number: int
    time: float = 0.0
    steps: int = 0
    sets: Array = field(init=False, repr=False)

    def __post_init__(self) -> None:
        self.sets = allocate(self.grid, self.number)

    @property
    def u(self) -> Array:
        """Velocity along x on x-faces, m/s, ``[ny, nx + 1]``; a live view."""
        return inside_u(self.sets[0], self.grid)

    @property
    def v(self) -> Array:
        """Velocity along y on y-faces, m/s, ``[ny + 1, nx]``; a live view."""
        return inside_v(self.sets[1], self.grid)

    @property
    def eta(self) -> Array:
        """Surface (or interface) elevation at centres, m, ``[ny, nx]``; a live view."""
        return inside_centre(self.sets[2], self.grid)

    def level(self, k: int) -> tuple[Array, Array, Array]:
        """Views of u, v, eta of set `k`."""
        u, v, eta = self.sets[3 * k : 3 * k + 3]
        return inside_u(u, self.grid), inside_v(v, self.grid), inside_centre(eta, self.grid)
