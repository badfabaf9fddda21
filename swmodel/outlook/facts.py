"""What is known of a set-up once its basin and start stand: the numbers that tables and cautions are made of."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..errors import RequestError
from ..frame import Frame
from ..grid import Basin, Grid
from ..state import StartFields
from ..theory import THEORY
from .plan import Draft
from .tables import named

if TYPE_CHECKING:
    from ..settings import Experiment

Direction = Literal["x", "y"]
DIRECTIONS: tuple[Direction, Direction] = ("x", "y")
NEGLIGIBLE = 1e-9  # of g eta/dx and f u: an imbalance that small is round-off and the balance's own tolerance
UNIFORM = 1e-6  # of the largest value: what varies by less varies by round-off, and by the balance's own tolerance


@dataclass(frozen=True)
class Wave:
    """A wave of the set-up.

    Parameters
    ----------
    name : str
        What it is.
    frequency : float
        omega, rad/s, positive.
    grid_ratio : float or None
        Frequency on the C-grid over that in the continuum, where theory knows it.
    part : int or None
        Number of the part of the start that it is.
    """

    name: str
    frequency: float
    grid_ratio: float | None = None
    part: int | None = None


@dataclass(frozen=True)
class Facts:
    """The set-up in numbers.

    Parameters
    ----------
    draft : Draft
        As much of the plan as could be made; its basin stands.
    basin : Basin
        That basin.
    """

    draft: Draft
    basin: Basin

    @property
    def experiment(self) -> Experiment:
        """The settings."""
        return self.draft.experiment

    @property
    def parts(self) -> Sequence[Any]:
        """The parts of the start."""
        return self.draft.parts

    @property
    def grid(self) -> Grid:
        """The grid."""
        return self.basin.grid

    @property
    def frame(self) -> Frame:
        """The rotating frame."""
        return self.basin.frame

    @property
    def start(self) -> StartFields | None:
        """The state at time 0; None where it could not be made."""
        return self.draft.start

    @property
    def linear(self) -> bool:
        """Whether the equations are the linear ones."""
        return self.experiment.numerics.linear

    @property
    def until(self) -> float:
        """Model time at the end, s."""
        return self.experiment.time.until

    @cached_property
    def length(self) -> float:
        """Smallest length in the start, L, m; infinite where nothing in it has a size."""
        return min(self._lengths(), default=math.inf)

    def _lengths(self) -> Iterator[float]:
        for part in self.parts:
            try:
                # a start of one's own that does not say is taken as a formula is: it adjusts to that width
                yield part.scale(self.basin) if hasattr(part, "scale") else self.basin.deformation_radius
            except RequestError:
                continue  # the start is refused anyway

    @cached_property
    def turning(self) -> float:
        """Size of the Coriolis parameter that counts, rad/s: |f0|, or |beta| a on the equatorial plane; 0 without."""
        if self.frame.plane == "equatorial":
            return abs(self.frame.beta) * self.basin.deformation_radius
        return abs(self.frame.f0)

    @property
    def inertial_period(self) -> float:
        """2 pi over `turning`, s; infinite without rotation."""
        return 2 * math.pi / self.turning if self.turning else math.inf

    @cached_property
    def speed(self) -> float:
        """Largest speed component at the start, m/s."""
        if self.start is None:
            return 0.0
        return max(float(np.abs(part).max(initial=0.0)) for part in (self.start.u, self.start.v))

    @cached_property
    def elevation(self) -> float:
        """Largest size of the elevation at the start, m."""
        return float(np.abs(self.start.eta).max()) if self.start is not None else 0.0

    @cached_property
    def relative_elevation(self) -> float:
        """Largest elevation over the depth below it."""
        return float(np.max(np.abs(self.start.eta) / self.basin.depth_field)) if self.start is not None else 0.0

    @property
    def expected_speed(self) -> float:
        """Speed of the flow, m/s: the start's, or where it is at rest the c eta/H that its elevation sets going."""
        return self.speed or self.basin.wave_speed * self.elevation / self.basin.reference_depth

    @cached_property
    def fastest_wave(self) -> float:
        """Speed of the fastest gravity waves, over the greatest depth, m/s."""
        return math.sqrt(self.basin.gravity * float(self.basin.depth_field.max()))

    @cached_property
    def varying(self) -> tuple[Direction, ...]:
        """Directions in which start, depth or f vary, or the flow soon will: Coriolis drives it against walls."""
        return tuple(direction for direction in DIRECTIONS if self._varies(direction))

    def _varies(self, direction: Direction) -> bool:
        axis = 1 if direction == "x" else 0
        fields: list[tuple[NDArray[np.float64], float]] = [
            (field, float(np.abs(field).max())) for field in (self.basin.depth_field, self.basin.f)
        ]
        if self.start is not None:
            # a velocity is small against the flow's speed and that of its waves, not against its own round-off
            slope = self.basin.wave_speed / self.basin.reference_depth
            speed = max(self.speed, slope * self.elevation)
            fields += [(self.start.u, speed), (self.start.v, speed), (self.start.eta, speed / slope)]
        if any(float(np.ptp(field, axis=axis).max()) > UNIFORM * size for field, size in fields):
            return True
        moves = any(float(np.ptp(field)) > UNIFORM * size for field, size in fields[2:])
        return moves and bool(self.basin.f.any()) and not self.periodic(direction)

    @cached_property
    def imbalance(self) -> dict[Direction, NDArray[np.float64]]:
        """How far the start is from geostrophic balance along each direction, m s-2 summed over the other.

        This is what sends out waves. It is taken at centres, over two cells: good to tell where they begin.
        """
        start, basin, grid = self.start, self.basin, self.grid
        if start is None:
            return {"x": np.zeros(grid.nx), "y": np.zeros(grid.ny)}
        u, v = (start.u[:, 1:] + start.u[:, :-1]) / 2, (start.v[1:] + start.v[:-1]) / 2
        f = (basin.f[1:, 1:] + basin.f[:-1, :-1]) / 2
        slope_x = basin.gravity * _slope(start.eta, 1, grid.dx, periodic=grid.periodic_x)
        slope_y = basin.gravity * _slope(start.eta, 0, grid.dy, periodic=grid.periodic_y)
        size = np.hypot(f * v - slope_x, f * u + slope_y)
        largest = max(float(np.abs(part).max()) for part in (slope_x, slope_y, f * u, f * v))
        size[size < NEGLIGIBLE * largest] = 0.0
        return {"x": size.sum(axis=0), "y": size.sum(axis=1)}

    def size(self, direction: Direction) -> float:
        """Extent of the domain along a direction, m."""
        return self.grid.Lx if direction == "x" else self.grid.Ly

    def spacing(self, direction: Direction) -> float:
        """Size of a cell along a direction, m."""
        return self.grid.dx if direction == "x" else self.grid.dy

    def periodic(self, direction: Direction) -> bool:
        """Whether a direction comes round."""
        return self.grid.periodic_x if direction == "x" else self.grid.periodic_y

    @cached_property
    def northward_reach(self) -> float:
        """Largest distance along y from the line y = y0, m."""
        return float(np.abs(self.grid.y_face[[0, -1]] - self.frame.y0).max())

    @cached_property
    def waves(self) -> tuple[Wave, ...]:
        """The waves of the start, by theory; none where it holds no wave."""
        return tuple(wave for number, part in enumerate(self.parts) for wave in self._wave(number, part))

    def _wave(self, number: int, part: Any) -> Iterator[Wave]:
        family = getattr(part, "wave", "")
        row = THEORY.get(f"{family}_frequency") if family else None
        if row is None:
            return
        known: dict[str, object] = {
            "gravity": self.basin.gravity,
            "depth": self.basin.reference_depth,
            "f0": self.frame.f0,
            "beta": self.frame.beta,
        }
        try:
            known |= part.theory_arguments(self.basin)
            omega = row.value(known)
        except RequestError:
            return
        name = f"{named(family)} wave, start.{number}"
        try:
            on_grid = row.value({**known, "dx": self.grid.dx, "dy": self.grid.dy, "on_grid": True})
        except RequestError:
            yield Wave(name, omega, None, number)
        else:
            yield Wave(name, omega, on_grid / omega, number)

    @property
    def only_waves(self) -> bool:
        """Whether the start is nothing but modes of this domain, which come round, or back from walls, by design."""
        return bool(self.parts) and all(getattr(part, "wave", "") for part in self.parts)

    @property
    def balanced(self) -> bool:
        """Whether all of the start that moves is balanced, so that it sends out waves of second order alone."""
        moving = [part for part in self.parts if getattr(part, "kind", "") != "rest"]
        return bool(moving) and all(
            getattr(part, "wave", "") or getattr(part, "balance", "none") != "none" for part in moving
        )


def _slope(eta: NDArray[np.float64], axis: int, spacing: float, *, periodic: bool) -> NDArray[np.float64]:
    if periodic:
        return (np.roll(eta, -1, axis) - np.roll(eta, 1, axis)) / (2 * spacing)
    return np.gradient(eta, spacing, axis=axis) if eta.shape[axis] > 1 else np.zeros_like(eta)
