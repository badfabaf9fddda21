"""Starts that give the elevation: rest, step, front, bump."""

from __future__ import annotations

import math
from typing import Annotated, ClassVar, Literal

import numpy as np
from pydantic import Field

from ...grid.basin import Basin
from ...quantities import Length
from .base import Array, Direction, Fields, Laid, Start, SurfaceStart, lay, still


class Rest(Start):
    """`kind = "rest"`."""

    meaning: ClassVar[str] = "nothing moves, the surface is level"
    source: ClassVar[str] = "common practice"

    kind: Literal["rest"] = "rest"

    def fields(self, basin: Basin) -> Fields:
        """Return zeros."""
        return still(basin)

    def scale(self, basin: Basin) -> float:
        """Return infinity: nothing in it has a size."""
        return math.inf


class Step(Start):
    """`kind = "step"`: a jump of the elevation."""

    meaning: ClassVar[str] = "a jump in elevation, fluid at rest: eta = amplitude sign(s)"
    source: ClassVar[str] = "Rossby 1938, J. Mar. Res. 1"

    kind: Literal["step"] = "step"
    amplitude: Annotated[Length, Field(description="half the height of the jump")]
    along: Annotated[Direction, Field(description="direction in which it jumps")] = "x"
    at: Annotated[Length, Field(description="where it jumps")] = 0.0

    def fields(self, basin: Basin) -> Fields:
        """Return eta = amplitude sign(s), and no flow."""
        u, v, _rest = still(basin)
        middle = (self.at, 0.0) if self.along == "x" else (0.0, self.at)
        laid = lay(self._shape, middle, self.along, basin.grid, "centre", level=False)
        return u, v, laid.values

    def scale(self, basin: Basin) -> float:
        """Return the deformation radius: the width that a jump adjusts to."""
        return basin.deformation_radius

    def _shape(self, sx: Array, sy: Array) -> Array:
        return self.amplitude * np.sign(sx if self.along == "x" else sy)


class Front(SurfaceStart):
    """`kind = "front"`: a smooth step."""

    meaning: ClassVar[str] = "a smooth step in elevation: eta = amplitude tanh(s/width)"
    source: ClassVar[str] = "common practice"

    kind: Literal["front"] = "front"
    amplitude: Annotated[Length, Field(description="half the height between its two sides")]
    width: Annotated[Length, Field(gt=0)]
    along: Annotated[Direction, Field(description="direction in which it rises")] = "x"
    at: Annotated[Length, Field(description="where its middle lies")] = 0.0

    def pattern(self, basin: Basin, *, level: bool) -> Laid:
        """Return the elevation as laid over the centres, m."""
        middle = (self.at, 0.0) if self.along == "x" else (0.0, self.at)
        return lay(self._shape, middle, self.along, basin.grid, "centre", level=level)

    def scale(self, basin: Basin) -> float:
        """Return `width`."""
        return self.width

    def _shape(self, sx: Array, sy: Array) -> Array:
        return self.amplitude * np.tanh((sx if self.along == "x" else sy) / self.width)


class Bump(SurfaceStart):
    """`kind = "bump"`: a round hill or hollow."""

    meaning: ClassVar[str] = "a round hill or hollow: eta = amplitude exp(-r^2/(2 radius^2))"
    source: ClassVar[str] = "common practice"

    kind: Literal["bump"] = "bump"
    amplitude: Annotated[Length, Field(description="height of the middle; negative is a hollow")]
    radius: Annotated[Length, Field(gt=0)]
    at: Annotated[tuple[Length, Length], Field(description="[x, y] of its middle")] = (0.0, 0.0)

    def pattern(self, basin: Basin, *, level: bool) -> Laid:
        """Return the elevation as laid over the centres, m."""
        return lay(self._shape, self.at, "xy", basin.grid, "centre", level=level)

    def scale(self, basin: Basin) -> float:
        """Return `radius`."""
        return self.radius

    def _shape(self, sx: Array, sy: Array) -> Array:
        return self.amplitude * np.exp(-(sx**2 + sy**2) / (2 * self.radius**2))
