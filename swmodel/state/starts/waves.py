"""Starts that are waves: Poincare, Kelvin and Rossby wave, with the structure that theory gives them."""

from __future__ import annotations

import math
from typing import Annotated, ClassVar, Literal

import numpy as np
from pydantic import Field

from ...errors import Fault, RequestError
from ...grid.basin import Basin
from ...grid.staggered import Edge, Grid
from ...quantities import Angle, Length
from ...theory import structures
from ...theory.structures import WaveField
from ..balance import close_round
from .base import Array, Fields, FlowStart, Laid, Start, percent

Waves = Annotated[
    tuple[int, int], Field(description="[m, n]: whole wavelengths along x and y; between walls half waves across")
]
UNEVEN_CAUTION = 0.01
"""Share by which depth or f may vary under a wave whose structure is for even ones, before `check` says so."""


class PoincareWave(Start):
    """`kind = "poincare_wave"`: a plane wave, or one between two walls."""

    meaning: ClassVar[str] = "an inertia-gravity wave, an exact mode of the grid; travels toward [m, n]"
    source: ClassVar[str] = "Gill 1982, chapters 8 and 10; on the C-grid Arakawa & Lamb 1977"
    wave: ClassVar[str] = "inertia_gravity"

    kind: Literal["poincare_wave"] = "poincare_wave"
    amplitude: Annotated[Length, Field(description="largest elevation")]
    waves: Waves
    phase: Angle = 0.0
    at: Annotated[tuple[Length, Length], Field(description="[x, y] that the phase counts from")] = (0.0, 0.0)

    def fields(self, basin: Basin) -> Fields:
        """Return the wave at time 0."""
        return _sampled(self._structure(basin), basin.grid)

    def scale(self, basin: Basin) -> float:
        """Return the wavelength over 2 pi."""
        return 1 / math.hypot(*_wavenumbers(self.waves, basin.grid))

    def theory_arguments(self, basin: Basin) -> dict[str, float | str]:
        """Return k and l."""
        k, l = _wavenumbers(self.waves, basin.grid)  # noqa: E741
        return {"k": k, "l": l}

    def remarks(self, basin: Basin) -> list[str]:
        """Say where depth or f vary under the wave."""
        return _uneven(self.kind, basin, uniform_f=True)

    def _structure(self, basin: Basin) -> WaveField:
        grid = basin.grid
        k, l = _wavenumbers(self.waves, grid)  # noqa: E741
        layer = {"amplitude": self.amplitude, "gravity": basin.gravity, "depth": basin.reference_depth}
        layer |= {"f0": basin.frame.f0, "dx": grid.dx, "dy": grid.dy, "phase": _phase(self.phase, self.at, k, l, grid)}
        if grid.periodic_x and grid.periodic_y:
            return structures.poincare_wave(k=k, l=l, **layer)
        if grid.periodic_x:
            return structures.channel_poincare_wave(
                wavenumber=k, half_waves=self.waves[1], walls=_walls(grid.y_face), along="x", **layer
            )
        return structures.channel_poincare_wave(
            wavenumber=l, half_waves=self.waves[0], walls=_walls(grid.x_face), along="y", **layer
        )


class KelvinWave(Start):
    """`kind = "kelvin_wave"`: along a wall, or along the equator."""

    meaning: ClassVar[str] = "a Kelvin wave along a wall, or on the equatorial plane along the equator"
    source: ClassVar[str] = "Thomson 1879; Gill 1982, chapter 10; along the equator Matsuno 1966"
    wave: ClassVar[str] = "kelvin"

    kind: Literal["kelvin_wave"] = "kelvin_wave"
    amplitude: Annotated[Length, Field(description="elevation at the wall, or on the equator")]
    waves: Annotated[int, Field(ge=1, description="whole wavelengths along the wall")]
    edge: Annotated[
        Literal["west", "east", "south", "north"] | None,
        Field(description="the wall it leans on; none on the equatorial plane"),
    ] = None
    phase: Angle = 0.0
    at: Annotated[Length, Field(description="place along the wall that the phase counts from")] = 0.0

    def fields(self, basin: Basin) -> Fields:
        """Return the wave at time 0."""
        self._refuse(basin)
        grid, k = basin.grid, self._wavenumber(basin.grid)
        layer = {"amplitude": self.amplitude, "gravity": basin.gravity, "depth": basin.reference_depth}
        layer |= {"phase": self.phase - k * self.at}
        if self.edge is None:
            wave = structures.equatorial_kelvin_wave(wavenumber=k, beta=basin.frame.beta, y0=basin.frame.y0, **layer)
            return _sampled(wave, grid)
        low, high = _walls(grid.x_face if self.edge in ("west", "east") else grid.y_face)
        wall = low if self.edge in ("west", "south") else high
        wave = structures.kelvin_wave(
            wavenumber=k, edge=self.edge, wall=wall, f0=basin.frame.f0, dx=grid.dx, dy=grid.dy, **layer
        )
        return _sampled(wave, grid)

    def scale(self, basin: Basin) -> float:
        """Return the wavelength over 2 pi."""
        return 1 / self._wavenumber(basin.grid)

    def theory_arguments(self, basin: Basin) -> dict[str, float | str]:
        """Return the wavenumber along the wall, k or l, and the edge."""
        k = self._wavenumber(basin.grid)
        if self.edge is None:
            return {"k": k}
        return {"l" if self.edge in ("west", "east") else "k": k, "edge": self.edge}

    def remarks(self, basin: Basin) -> list[str]:
        """Say where depth or f vary under the wave."""
        return _uneven(self.kind, basin, uniform_f=self.edge is not None)

    def _wavenumber(self, grid: Grid) -> float:
        length = grid.Ly if self.edge in ("west", "east") else grid.Lx
        return 2 * math.pi * self.waves / length

    def _refuse(self, basin: Basin) -> None:
        """Raise where the wave has no wall to lean on, or cannot go round."""
        grid = basin.grid
        equatorial = basin.frame.plane == "equatorial"
        faults = []
        if equatorial and self.edge is not None:
            faults.append(
                Fault(("edge",), f'"{self.edge}", on the equatorial plane', "there it leans on the equator: no edge")
            )
        elif not equatorial and self.edge is None:
            faults.append(Fault(("edge",), "it is missing", '"west", "east", "south" or "north": the wall it leans on'))
        elif self.edge is not None and getattr(grid, self.edge) != "wall":
            kind: Edge = getattr(grid, self.edge)
            faults.append(
                Fault(("edge",), f"{self.edge} is {kind}", "a Kelvin wave leans on a wall", f'{self.edge} = "wall"')
            )
        along_y = self.edge in ("west", "east")
        if not (grid.periodic_y if along_y else grid.periodic_x):
            ends = "south and north" if along_y else "west and east"
            faults.append(
                Fault(("kind",), f"walls at {ends} stop it", "whole wavelengths go round", f"periodic {ends}")
            )
        if faults:
            raise RequestError(faults)


class RossbyWave(FlowStart):
    """`kind = "rossby_wave"`: a planetary wave."""

    meaning: ClassVar[str] = "a planetary wave, its streamfunction g eta/f0; crests go west where beta > 0"
    source: ClassVar[str] = "Rossby 1939; Pedlosky 1987, chapter 3"
    wave: ClassVar[str] = "rossby"

    kind: Literal["rossby_wave"] = "rossby_wave"
    amplitude: Annotated[Length, Field(description="largest elevation")]
    waves: Waves
    phase: Angle = 0.0
    at: Annotated[tuple[Length, Length], Field(description="[x, y] that the phase counts from")] = (0.0, 0.0)

    def pattern(self, basin: Basin) -> Laid:
        """Return the streamfunction g eta/f0 at corners, m2/s."""
        x, y = basin.grid.points("corner")
        psi = basin.gravity / basin.frame.f0 * self._structure(basin).eta(x, y)
        close_round(psi, basin.grid)
        return Laid(psi)

    def fields(self, basin: Basin) -> Fields:
        """Return the wave at time 0 as theory has it, in geostrophic balance with f0."""
        return _sampled(self._structure(basin), basin.grid)

    def scale(self, basin: Basin) -> float:
        """Return the wavelength over 2 pi."""
        return 1 / math.hypot(*_wavenumbers(self.waves, basin.grid))

    def theory_arguments(self, basin: Basin) -> dict[str, float | str]:
        """Return k and l."""
        k, l = _wavenumbers(self.waves, basin.grid)  # noqa: E741
        return {"k": k, "l": l}

    def remarks(self, basin: Basin) -> list[str]:
        """Say where the depth varies under the wave."""
        return super().remarks(basin) + _uneven(self.kind, basin, uniform_f=False)

    def _structure(self, basin: Basin) -> WaveField:
        grid = basin.grid
        k, l = _wavenumbers(self.waves, grid)  # noqa: E741
        if not grid.periodic_x:
            found = "a Rossby wave between west and east walls has no closed form"
            raise RequestError(Fault(("kind",), found, "periodic west and east"))
        if basin.frame.f0 == 0:
            raise RequestError(Fault(("kind",), "its flow is g eta/f0, and f0 is 0", "a plane with f0, such as beta"))
        layer = {"amplitude": self.amplitude, "gravity": basin.gravity, "depth": basin.reference_depth}
        layer |= {"f0": basin.frame.f0, "beta": basin.frame.beta, "phase": _phase(self.phase, self.at, k, l, grid)}
        if grid.periodic_y:
            return structures.rossby_wave(k=k, l=l, **layer)
        return structures.channel_rossby_wave(
            wavenumber=k, half_waves=self.waves[1], walls=_walls(grid.y_face), **layer
        )


def _sampled(wave: WaveField, grid: Grid) -> Fields:
    """Take a wave at each field's own points."""
    u, v, eta = wave.u(*grid.points("u")), wave.v(*grid.points("v")), wave.eta(*grid.points("centre"))
    close_round(u, grid, along_y=False)
    close_round(v, grid, along_x=False)
    return u, v, eta


def _walls(faces: Array) -> tuple[float, float]:
    """Where the two walls of a direction lie, m."""
    return float(faces[0]), float(faces[-1])


def _wavenumbers(waves: tuple[int, int], grid: Grid) -> tuple[float, float]:
    """Return k and l, 1/m: 2 pi over the wavelength, or pi times half waves over the distance of the walls.

    Raises
    ------
    RequestError
        Where there is no such wave: no wavelength at all, no half wave between walls, or walls all round.
    """
    m, n = waves
    if not (grid.periodic_x or grid.periodic_y):
        raise RequestError(
            Fault(("kind",), "plane waves have no closed form between walls all round", "one periodic direction or two")
        )
    if m == n == 0:
        raise RequestError(Fault(("waves",), "[0, 0] is no wave", "at least one of them other than 0"))
    for number, axis, periodic in ((m, "x", grid.periodic_x), (n, "y", grid.periodic_y)):
        if not periodic and number < 1:
            raise RequestError(
                Fault(("waves",), f"{number} half waves between the walls along {axis}", "a whole number from 1 on")
            )
    return (
        (2 if grid.periodic_x else 1) * math.pi * m / grid.Lx,
        (2 if grid.periodic_y else 1) * math.pi * n / grid.Ly,
    )


def _phase(phase: float, at: tuple[float, float], k: float, l: float, grid: Grid) -> float:  # noqa: E741
    """Phase at x = y = 0 of a wave whose phase counts from `at`.

    Raises
    ------
    RequestError
        Where `at` would shift the wave across walls, between which its pattern is fixed.
    """
    for place, axis, periodic in ((at[0], "x", grid.periodic_x), (at[1], "y", grid.periodic_y)):
        if not periodic and place != 0:
            raise RequestError(
                Fault(("at",), f"{axis} = {place:.6g} m", f"0 along {axis}: between walls the pattern is fixed by them")
            )
    return phase - (k * at[0] if grid.periodic_x else 0.0) - (l * at[1] if grid.periodic_y else 0.0)


def _uneven(kind: str, basin: Basin, *, uniform_f: bool) -> list[str]:
    """Say where depth or f vary too much for a wave whose structure is for even ones."""
    name = kind.replace("_", " ")
    depths = float(np.ptp(basin.depth_field)) / basin.reference_depth
    turning = float(np.ptp(basin.f)) / abs(basin.frame.f0) if uniform_f and basin.frame.f0 else 0.0
    return [
        f"the {name} is laid out for an even {what}; here it varies by {percent(share)} of {standard}; expect other "
        f"waves besides, or make it even"
        for what, share, standard in (("depth", depths, "the reference depth"), ("f", turning, "f0"))
        if share > UNEVEN_CAUTION
    ]
