"""`[output]`: what is stored, where and how often. Imports neither h5py nor numba."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated, Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ..choices import Choice, name_in
from ..errors import Fault, RequestError
from ..grid.staggered import Grid, Location
from ..quantities import Length, Time, format_quantity
from .names import FIELDS

DEFAULT_SNAPSHOTS = 50  # where `every` is not given: the run in that many equal parts
ROUND_OFF = 1e-9  # of a cell or step: what arithmetic may add to a number meant to be whole

if TYPE_CHECKING:
    FieldWord = str
else:
    FieldWord = name_in(FIELDS)


class OutputSettings(Choice):
    """`[output]`: what is stored, where and how often."""

    every: Annotated[Time, Field(gt=0, description="between snapshots; until/50 by default")] | None = None
    fields: Annotated[tuple[FieldWord, ...], Field(min_length=1)] = ("eta", "u", "v")
    region: (
        Annotated[tuple[Length, Length, Length, Length], Field(description="[x0, x1, y0, y1], widened to whole cells")]
        | None
    ) = None
    stride: Annotated[int, Field(ge=1, description="every n-th point; an odd n that divides the region's cells")] = 1
    diagnostics_every: Annotated[Time, Field(gt=0, description="between sums; `every` by default")] | None = None
    checkpoint_every: Annotated[Time, Field(gt=0, description="of wall clock")] = "10 min"  # type: ignore[assignment]
    budgets: Annotated[Literal["rates"], Field(description='"rates": their terms at diagnostics times')] = "rates"
    compression: Annotated[bool, Field(description="lossless: shuffle and gzip 1")] = True


@dataclass(frozen=True)
class Window:
    """The part of the grid that is stored: whole cells, and every `stride`-th face and centre of them.

    Parameters
    ----------
    west, east, south, north : int
        Cells ``west <= i < east`` and ``south <= j < north``.
    stride : int
        Odd, and dividing both numbers of cells, so that what is kept is again a C-grid.
    """

    west: int
    east: int
    south: int
    north: int
    stride: int = 1

    def columns(self, location: Location) -> slice:
        """Indices along x that are kept at a location."""
        return _kept(self.west, self.east, self.stride, faces=location in ("u", "corner"))

    def rows(self, location: Location) -> slice:
        """Indices along y that are kept at a location."""
        return _kept(self.south, self.north, self.stride, faces=location in ("v", "corner"))

    def cut(self, field: NDArray[Any], location: Location) -> NDArray[Any]:
        """View of the stored part of a field with both ends, ``[y, x]``."""
        return field[self.rows(location), self.columns(location)]

    def axes(self, grid: Grid, location: Location) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Coordinates x and y of the stored part of a location, m."""
        x, y = grid.axes(location)
        return x[self.columns(location)], y[self.rows(location)]


@dataclass(frozen=True)
class ResolvedOutput:
    """`[output]` with nothing left open.

    Parameters
    ----------
    steps_between_snapshots, steps_between_diagnostics : int
        In steps; the start and the end are stored besides.
    checkpoint_every : float
        Wall clock between checkpoints, s.
    fields : tuple of str
        Names of the fields in a snapshot.
    window : Window
        The part of the grid that is stored.
    compression : bool
        Whether snapshots are compressed.
    budgets : str
        How budgets are taken.
    """

    steps_between_snapshots: int
    steps_between_diagnostics: int
    checkpoint_every: float
    fields: tuple[str, ...]
    window: Window
    compression: bool = True
    budgets: str = "rates"


def resolve_output(settings: OutputSettings, grid: Grid, until: float, step: float) -> ResolvedOutput:
    """Fill in what `[output]` leaves open.

    Parameters
    ----------
    settings : OutputSettings
        As written.
    grid : Grid
        The grid of the run.
    until : float
        Model time at the end, s.
    step : float
        The step, s; given intervals are whole multiples of it.

    Raises
    ------
    RequestError
        With every fault of region, stride, fields and intervals at once.
    """
    faults = list(_interval_faults(settings, step)) + list(_field_faults(settings))
    try:
        window = build_window(settings, grid)
    except RequestError as error:
        faults += error.faults
    if faults:
        raise RequestError(faults)
    snapshots, diagnostics = _intervals(settings, until, step)
    return ResolvedOutput(
        steps_between_snapshots=snapshots,
        steps_between_diagnostics=diagnostics,
        checkpoint_every=settings.checkpoint_every,
        fields=settings.fields,
        window=window,
        compression=settings.compression,
        budgets=settings.budgets,
    )


def build_window(settings: OutputSettings, grid: Grid) -> Window:
    """Widen the region to whole cells and check the stride.

    Raises
    ------
    RequestError
        Where the region is empty or leaves the domain, or the stride is even or does not divide the cells.
    """
    x0, x1, y0, y1 = settings.region or (grid.x_face[0], grid.x_face[-1], grid.y_face[0], grid.y_face[-1])
    faults = list(_region_faults(x0, x1, "x", grid.x_face)) + list(_region_faults(y0, y1, "y", grid.y_face))
    if faults:
        raise RequestError(faults)
    west, east = _whole_cells(x0, x1, grid.west_x, grid.dx)
    south, north = _whole_cells(y0, y1, grid.south_y, grid.dy)
    window = Window(west, east, south, north, settings.stride)
    nx, ny = east - west, north - south
    if settings.stride % 2 == 0 or nx % settings.stride or ny % settings.stride:
        fitting = [str(n) for n in range(1, math.gcd(nx, ny) + 1, 2) if math.gcd(nx, ny) % n == 0]
        raise RequestError(
            Fault(
                ("output", "stride"),
                f"stride {settings.stride} does not leave a C-grid of {nx} x {ny} cells",
                f"an odd number that divides both: {', '.join(fitting)}",
            )
        )
    return window


def _kept(first: int, beyond: int, stride: int, *, faces: bool) -> slice:
    """Every n-th face from the first, every n-th centre from the (n - 1)/2-th."""
    return slice(first, beyond + 1, stride) if faces else slice(first + (stride - 1) // 2, beyond, stride)


def _whole_cells(low: float, high: float, origin: float, size: float) -> tuple[int, int]:
    return math.floor((low - origin) / size + ROUND_OFF), math.ceil((high - origin) / size - ROUND_OFF)


def _region_faults(low: float, high: float, axis: str, faces: NDArray[np.float64]) -> Iterator[Fault]:
    first, last = float(faces[0]), float(faces[-1])
    slack = ROUND_OFF * (last - first)
    if not low < high:
        yield Fault(
            ("output", "region"),
            f"the region reaches from {axis} = {format_quantity(low, 'm')} to {format_quantity(high, 'm')}",
            "[x0, x1, y0, y1] with x0 < x1 and y0 < y1",
        )
    elif low < first - slack or high > last + slack:
        yield Fault(
            ("output", "region"),
            f"the region reaches from {axis} = {format_quantity(low, 'm')} to {format_quantity(high, 'm')}",
            f"within the domain, {format_quantity(first, 'm')} to {format_quantity(last, 'm')}",
        )


def _field_faults(settings: OutputSettings) -> Iterator[Fault]:
    for name in sorted({name for name in settings.fields if settings.fields.count(name) > 1}):
        yield Fault(("output", "fields"), f'"{name}" is named more than once', "each field once")


def _interval_faults(settings: OutputSettings, step: float) -> Iterator[Fault]:
    for key in ("every", "diagnostics_every"):
        interval = getattr(settings, key)
        if interval is not None and abs(_nearest_steps(interval, step) * step - interval) > ROUND_OFF * interval:
            yield Fault(
                ("output", key),
                f"{format_quantity(interval, 's')} is {interval / step:.6g} steps of {format_quantity(step, 's')}",
                "a whole number of steps",
            )


def _intervals(settings: OutputSettings, until: float, step: float) -> tuple[int, int]:
    """Steps between snapshots and between diagnostics."""
    diagnostics = settings.diagnostics_every and _nearest_steps(settings.diagnostics_every, step)
    if settings.every is not None:
        snapshots = _nearest_steps(settings.every, step)
    else:
        unit = diagnostics or 1
        snapshots = unit * _nearest_steps(until / DEFAULT_SNAPSHOTS, unit * step)
    return snapshots, diagnostics or snapshots


def _nearest_steps(interval: float, step: float) -> int:
    return max(1, round(interval / step))
