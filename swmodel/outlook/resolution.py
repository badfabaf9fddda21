"""The table *Resolution*: cells, and how many of them lie within the lengths that count."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from ..quantities import format_quantity
from .facts import DIRECTIONS, Direction, Facts
from .tables import Row, Table

SINGLE_ROUNDING = float(np.finfo(np.float32).eps) / 4
"""Relative error a step brings in single precision where roundings add up.

A trial (48 x 40 cells, 300 to 30 000 steps; a Poincare wave with all three steppers, measured against double precision)
gives 0.03 to 0.25 of 1.2e-7 a step, growing with the number of steps, since the coefficients are rounded too.
"""


def resolution_table(facts: Facts) -> Table:
    """Count cells."""
    return Table("Resolution", tuple(_rows(facts)))


def cells_within(facts: Facts, length: float, direction: Direction) -> float:
    """How many cells a length holds along a direction."""
    return length / facts.spacing(direction)


def single_precision_error(steps: int) -> float:
    """Relative error to expect of single precision after so many steps of a smooth flow."""
    return SINGLE_ROUNDING * steps


def _rows(facts: Facts) -> Iterator[Row]:
    grid = facts.grid
    yield Row("cells", grid.nx * grid.ny, "", shown=f"{grid.nx} x {grid.ny}", note=f"{grid.precision} precision")
    for direction in DIRECTIONS:
        note = "periodic" if facts.periodic(direction) else f"walls, {'free' if grid.slip == 'free' else 'no'} slip"
        if direction not in facts.varying:
            note += "; nothing varies along it"
        size = format_quantity(facts.size(direction), "m")
        yield Row(f"cell_size_{direction}", facts.spacing(direction), "m", f"of {size}, {note}")
    yield from _within(facts, "deformation_radius", facts.basin.deformation_radius)
    yield from _within(facts, "start_scale", facts.length)
    for wave in facts.waves:
        if wave.grid_ratio is not None:
            share = f"{100 * (wave.grid_ratio - 1):+.2g} %"
            note = f"of the frequency of the {wave.name}"
            yield Row(f"grid_error_of_start_{wave.part}", wave.grid_ratio - 1, "", note, shown=share)
    if grid.precision == "single" and facts.draft.step is not None:
        steps = round(facts.until / facts.draft.step.dt)
        note = f"relative, after {steps} steps, if roundings add up"
        yield Row("rounding_error", single_precision_error(steps), "", note)


def _within(facts: Facts, key: str, length: float) -> Iterator[Row]:
    if not math.isfinite(length):
        return
    symbol = "a" if key == "deformation_radius" else "L"
    for direction in facts.varying:
        yield Row(f"cells_per_{key}_{direction}", cells_within(facts, length, direction), "", f"{symbol}/d{direction}")
