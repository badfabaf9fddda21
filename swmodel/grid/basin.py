"""The basin: grid, rotating frame, depth at rest and gravity, bound into what every later room asks for."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Annotated

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ..choices import Choice
from ..errors import Fault, RequestError
from ..fields import FieldValue, evaluate, uses
from ..frame import Frame
from ..quantities import Acceleration, Length
from .staggered import Grid


class LayerSettings(Choice):
    """`[layer]`: the fluid layer at rest."""

    depth: Annotated[FieldValue, Field(description="thickness at rest, a field in m")]
    reference_depth: Annotated[Length, Field(gt=0)] | None = None
    reduced_gravity: Annotated[Acceleration, Field(gt=0)] | None = None


@dataclass(frozen=True)
class Basin:
    """Where the flow lives.

    Parameters
    ----------
    grid : Grid
        The C-grid.
    frame : Frame
        The rotating frame.
    gravity : float
        g of the equations, m s-2: the reduced one where given.
    depth : ndarray ``[ny, nx]`` or float
        Thickness at rest H(x, y) at centres, m; a float where it is even.
    reference_depth : float
        H of formulas and scales, m: the mean depth unless given.
    """

    grid: Grid
    frame: Frame
    gravity: float
    depth: NDArray[np.float64] | float
    reference_depth: float

    @cached_property
    def f(self) -> NDArray[np.float64]:
        """Coriolis parameter at corners, rad/s, ``[ny + 1, nx + 1]``."""
        x, y = self.grid.points("corner")
        values = np.broadcast_to(self.frame.coriolis(x, y), self.grid.shape("corner"))
        return np.ascontiguousarray(values, np.float64)

    @cached_property
    def depth_field(self) -> NDArray[np.float64]:
        """Depth as an array at centres, m, ``[ny, nx]``."""
        return np.broadcast_to(np.asarray(self.depth, np.float64), (self.grid.ny, self.grid.nx))

    @property
    def even(self) -> bool:
        """Whether the depth is the same everywhere."""
        return not isinstance(self.depth, np.ndarray)

    @property
    def wave_speed(self) -> float:
        """Gravity-wave speed c = sqrt(g H), m/s."""
        return math.sqrt(self.gravity * self.reference_depth)

    @property
    def deformation_radius(self) -> float:
        """A = c/|f0|, on the equatorial plane sqrt(c/beta), m; infinite without rotation."""
        if self.frame.plane == "equatorial":
            return math.sqrt(self.wave_speed / abs(self.frame.beta))
        return self.wave_speed / abs(self.frame.f0) if self.frame.f0 else math.inf

    @property
    def constants(self) -> dict[str, float]:
        """The experiment's own constants, as formulas know them; a is left out where there is none."""
        known = {
            "f0": self.frame.f0,
            "beta": self.frame.beta,
            "g": self.gravity,
            "H": self.reference_depth,
            "Lx": self.grid.Lx,
            "Ly": self.grid.Ly,
            "c": self.wave_speed,
            "pi": math.pi,
        }
        if math.isfinite(self.deformation_radius):
            known["a"] = self.deformation_radius
        return known


def build_basin(grid: Grid, frame: Frame, layer: LayerSettings) -> Basin:
    """Put the layer into its frame and grid.

    Raises
    ------
    RequestError
        Where the depth cannot be evaluated, or is not positive somewhere.
    """
    gravity = layer.reduced_gravity if layer.reduced_gravity is not None else frame.gravity
    depth = _rest_thickness(grid, frame, layer, gravity)
    low = float(np.min(depth))
    if not low > 0:
        j, i = np.unravel_index(int(np.argmin(depth)), depth.shape)
        raise RequestError(
            Fault(
                ("layer", "depth"),
                f"the thickness at rest is {low:.6g} m at x = {grid.x[i]:.6g} m, y = {grid.y[j]:.6g} m",
                "a thickness above 0 everywhere",
                "deepen the layer there, or turn the table more slowly"
                if frame.plane == "tank"
                else "deepen the layer",
            )
        )
    even = bool(np.all(depth == depth.flat[0]))
    mean = float(depth.flat[0]) if even else float(np.mean(depth))
    reference = layer.reference_depth if layer.reference_depth is not None else mean
    return Basin(grid, frame, gravity, float(depth.flat[0]) if even else depth, reference)


def _rest_thickness(grid: Grid, frame: Frame, layer: LayerSettings, gravity: float) -> NDArray[np.float64]:
    """Thickness at rest at centres; on a turntable the paraboloid is laid over the given depth, same volume."""
    x, y = grid.points("centre")
    constants = {"f0": frame.f0, "beta": frame.beta, "g": gravity, "Lx": grid.Lx, "Ly": grid.Ly, "pi": math.pi}
    if layer.reference_depth is not None:
        c = math.sqrt(gravity * layer.reference_depth)
        constants |= {"H": layer.reference_depth, "c": c}
        if frame.plane == "equatorial":
            constants["a"] = math.sqrt(c / abs(frame.beta))
        elif frame.f0:
            constants["a"] = c / abs(frame.f0)
    elif used := uses(layer.depth) & {"H", "c", "a"}:
        names = ", ".join(sorted(used))
        raise RequestError(
            Fault(("layer", "depth"), f"the depth uses {names}, which follow from it", remedy="give reference_depth")
        )
    depth = np.array(
        np.broadcast_to(evaluate(layer.depth, x, y, constants, key=("layer", "depth")), (grid.ny, grid.nx))
    )
    if frame.plane == "tank" and layer.reduced_gravity is None:
        r2 = np.broadcast_to(x**2 + y**2, depth.shape)
        depth = depth + frame.rotation_rate**2 * (r2 - r2.mean()) / (2 * gravity)
    return depth.astype(np.float64)
