"""Cautions: what the grid and its numbers cannot hold."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from ...quantities import format_quantity
from ..facts import DIRECTIONS, Direction, Facts
from ..resolution import cells_within, single_precision_error
from ..tables import listed
from .base import Caution

LEAST_CELLS_A_RADIUS = 2.0  # to hold it at all: Hallberg 2013, Ocean Modelling 72
LEAST_CELLS_A_SCALE = 4.0  # 25 cells a wave of 2 pi L: second-order differences then err by (dx/L)^2/24 = 0.3 %
AREA_SEEN = 0.01  # of the domain: a radius unresolved over less than that goes unsaid
SINGLE_COARSE = 1e-3  # relative: the fourth digit is then gone


def radius_unresolved(facts: Facts) -> Iterator[Caution]:
    """Few cells within the deformation radius, somewhere."""
    a = facts.basin.deformation_radius
    if not math.isfinite(a):
        return
    remedy = "finer cells, or take what depends on it as unresolved"
    coarse = [d for d in facts.varying if cells_within(facts, a, d) < LEAST_CELLS_A_RADIUS]
    if coarse:
        cells = [f"{cells_within(facts, a, d):.2g} cells along {d}" for d in coarse]
        why = f"a = {format_quantity(a, 'm')} holds {listed(cells)}, at least {LEAST_CELLS_A_RADIUS:g} are needed"
        yield Caution("the deformation radius is unresolved", why, remedy)
    elif facts.frame.plane != "equatorial" and facts.varying:
        cell = max(facts.spacing(d) for d in facts.varying)
        f = np.abs(facts.basin.f[1:, 1:] + facts.basin.f[:-1, :-1]) / 2
        c = np.sqrt(facts.basin.gravity * facts.basin.depth_field)
        share = float(np.mean(c < LEAST_CELLS_A_RADIUS * cell * f))
        if share > AREA_SEEN:
            why = f"over {100 * share:.2g} % of the area it holds less than {LEAST_CELLS_A_RADIUS:g} cells"
            yield Caution("the deformation radius is unresolved in places", why, remedy)


def start_unresolved(facts: Facts) -> Iterator[Caution]:
    """Few cells within the smallest length of the start."""
    length = facts.length
    if not math.isfinite(length) or length == facts.basin.deformation_radius:
        return
    coarse = [d for d in facts.varying if cells_within(facts, length, d) < LEAST_CELLS_A_SCALE]
    if coarse:
        cells = [f"{cells_within(facts, length, d):.2g} cells along {d}" for d in coarse]
        why = f"L = {format_quantity(length, 'm')} holds {listed(cells)}, at least {LEAST_CELLS_A_SCALE:g} are needed"
        yield Caution("the smallest scale of the start is unresolved", why, "finer cells, or a larger scale")


def jump_off_faces(facts: Facts) -> Iterator[Caution]:
    """A jump that lies on no face of this grid and of those twice and four times as coarse."""
    for number, part in enumerate(facts.parts):
        direction: Direction = getattr(part, "along", "x")
        if getattr(part, "kind", "") != "step" or direction not in DIRECTIONS:
            continue
        grid = facts.grid
        edge, cells = (grid.west_x, grid.nx) if direction == "x" else (grid.south_y, grid.ny)
        share = (part.at - edge) / facts.size(direction)
        if any(abs(share * cells / n - round(share * cells / n)) > 1e-6 for n in (1, 2, 4)):
            nearest = edge + round(share * cells / 4) * 4 * facts.spacing(direction)
            yield Caution(
                f"the jump of start.{number} lies on no face that coarser grids share",
                f"twice or four times as coarse, {direction} = {format_quantity(part.at, 'm', 5)} lies within a cell, "
                "and the jump's shift would pass for an error of the scheme",
                f"at = {format_quantity(nearest, 'm', 6)}, or a number of cells that divides by 8",
            )


def single_precision(facts: Facts) -> Iterator[Caution]:
    """Rounding that grows with the number of steps."""
    if facts.grid.precision != "single" or facts.draft.step is None:
        return
    steps = round(facts.until / facts.draft.step.dt)
    error = single_precision_error(steps)
    if error > SINGLE_COARSE:
        yield Caution(
            "single precision is too coarse for so many steps",
            f"{steps} steps may add up to a relative error of {error:.1g}, and more in an unstable flow",
            'precision = "double"',
        )
