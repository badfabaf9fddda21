"""Starts that give the flow: vortex and jet."""

from __future__ import annotations

import math
from typing import Annotated, ClassVar, Literal

import numpy as np
from pydantic import Field

from ...choices import Choice
from ...errors import Fault, RequestError
from ...grid.basin import Basin
from ...quantities import Length, Number, Speed
from .base import Array, Direction, FlowStart, Laid, lay

# V of the Gaussian vortex is largest where exp(s) = 1 + 2 s, s = 1.2564 r^2/radius^2; by Newton's iteration
GAUSSIAN_PEAK = 1.2564312086261697


class Vortex(FlowStart):
    """`kind = "vortex"`: a circular flow."""

    meaning: ClassVar[str] = (
        "a circular flow, fastest at `radius`: shielded (no net circulation) or with a Gaussian core"
    )
    source: ClassVar[str] = (
        "shielded: Carton & McWilliams 1989, in Mesoscale/Synoptic Coherent Structures in Geophysical Turbulence, "
        "with exponent 2; gaussian: Lamb 1932, Hydrodynamics, sec. 334a; references from memory"
    )

    kind: Literal["vortex"] = "vortex"
    profile: Literal["gaussian", "shielded"]
    speed: Annotated[Speed, Field(description="largest speed; positive turns anticlockwise")]
    radius: Annotated[Length, Field(gt=0, description="where that speed is reached")]
    at: Annotated[tuple[Length, Length], Field(description="[x, y] of its middle")] = (0.0, 0.0)

    def pattern(self, basin: Basin) -> Laid:
        """Return the streamfunction as laid over the corners, m2/s."""
        grid = basin.grid
        if self.profile == "gaussian" and grid.periodic_x and grid.periodic_y:
            raise RequestError(
                Fault(
                    ("profile",),
                    'a "gaussian" vortex has a net circulation, which a doubly periodic domain cannot hold',
                    'profile = "shielded" there',
                    "or walls on two sides",
                )
            )
        shape = self._gaussian if self.profile == "gaussian" else self._shielded
        return lay(shape, self.at, "xy", grid, "corner", level=True)

    def scale(self, basin: Basin) -> float:
        """Return `radius`."""
        return self.radius

    def _shielded(self, sx: Array, sy: Array) -> Array:
        # V = dpsi/dr = speed (r/radius) exp((1 - r^2/radius^2)/2)
        return -self.speed * self.radius * np.exp((1 - (sx**2 + sy**2) / self.radius**2) / 2)

    def _gaussian(self, sx: Array, sy: Array) -> Array:
        # V = dpsi/dr = C (1 - exp(-s))/r, so that dpsi/ds = C/2 (1 - exp(-s))/s: the entire exponential integral
        from scipy.special import exp1

        s = GAUSSIAN_PEAK * (sx**2 + sy**2) / self.radius**2
        middle = s == 0
        away = np.where(middle, 1.0, s)
        entire = np.where(middle, 0.0, exp1(away) + np.log(away) + np.euler_gamma)
        return self.speed * self.radius / (1 - math.exp(-GAUSSIAN_PEAK)) / 2 * entire


class Perturbation(Choice):
    """Wave laid over a jet, as a streamfunction of size speed width."""

    size: Annotated[Number, Field(description="streamfunction over speed width")]
    waves: Annotated[int, Field(ge=1, description="whole wavelengths along the jet")]


class Jet(FlowStart):
    """`kind = "jet"`: a parallel flow."""

    meaning: ClassVar[str] = "a parallel flow, speed sech^2(s/width), with a wave along it if wanted"
    source: ClassVar[str] = "Bickley 1937, Phil. Mag. 23; as a start Lipps 1962, J. Fluid Mech. 12"

    kind: Literal["jet"] = "jet"
    speed: Annotated[Speed, Field(description="speed of its axis; positive toward east or north")]
    width: Annotated[Length, Field(gt=0)]
    along: Annotated[Direction, Field(description="direction of the flow")] = "x"
    at: Annotated[Length, Field(description="where its axis lies, across the flow")] = 0.0
    perturbation: Perturbation | None = None

    def pattern(self, basin: Basin) -> Laid:
        """Return the streamfunction as laid over the corners, m2/s."""
        across, middle = ("y", (0.0, self.at)) if self.along == "x" else ("x", (self.at, 0.0))
        length = basin.grid.Lx if self.along == "x" else basin.grid.Ly

        def shape(sx: Array, sy: Array) -> Array:
            # u = -dpsi/dy along x, v = dpsi/dx along y
            s, distance, turn = (sy, sx, -1.0) if self.along == "x" else (sx, sy, 1.0)
            psi = turn * self.speed * self.width * np.tanh(s / self.width)
            if self.perturbation is None:
                return psi
            wave = np.cos(2 * np.pi * self.perturbation.waves * distance / length)
            return psi + self.perturbation.size * self.speed * self.width * wave * sech(s / self.width) ** 2

        return lay(shape, middle, across, basin.grid, "corner", level=True)

    def scale(self, basin: Basin) -> float:
        """Return `width`, or the perturbation's wavelength over 2 pi where that is less."""
        if self.perturbation is None:
            return self.width
        length = basin.grid.Lx if self.along == "x" else basin.grid.Ly
        return min(self.width, length / (2 * math.pi * self.perturbation.waves))


def sech(s: Array) -> Array:
    """Hyperbolic secant that does not overflow."""
    decay: Array = np.exp(-np.abs(s))
    return 2 * decay / (1 + decay**2)
