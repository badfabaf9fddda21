"""`kind = "energy_ratio"`: an energy of the mean state over an energy of the start, or over what was released."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Annotated, ClassVar, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, ValidationInfo, field_validator

from ...errors import Fault
from ...quantities import refusal
from ..error import Samples, every_second, halves, measure_error, without_blocks
from ..finding import Evidence, Finding, NoAnswerError
from ..limits import field_faults, line_faults, taken, window_faults
from ..record import HALF_A_TICK, Record
from .base import AlongLine, During, LineEnd, LineStart, Measure

Array = NDArray[np.float64]
Fields = tuple[Array, Array, Array]


class EnergyRatio(Measure):
    """An energy of the mean state over the window, divided by one of the start; both between `from` and `to`."""

    meaning: ClassVar[str] = "energy of the window's mean state over one of the start, or over the potential released"
    source: ClassVar[str] = "Gill 1982, chapter 7, for the step"

    kind: Literal["energy_ratio"] = "energy_ratio"
    of: Annotated[Literal["kinetic", "potential", "energy"], Field(description="of the window's mean state")]
    over: Annotated[
        Literal["start_kinetic", "start_potential", "start_energy", "released_potential"],
        Field(description='of the start; "released_potential": start less mean state'),
    ]
    along: AlongLine | None = None
    from_: LineStart = None
    to: LineEnd = None
    during: Annotated[During | None, Field(description="[t0, t1] or one time; the last snapshot by default")] = None

    @field_validator("from_", "to")
    @classmethod
    def _on_a_line(cls, end: float | None, info: ValidationInfo) -> float | None:
        if end is not None and info.data.get("along", "") is None:
            raise refusal(Fault((), "the end of a strip without its direction", 'along = "x" or along = "y"'))
        return end

    def unit(self) -> str:
        """Return that of a pure number."""
        return "1"

    def find(self, record: Record) -> Finding:
        """Average the fields, then take the energies."""
        numbers = taken(record.times, self.during, last=True)
        if abs(record.times[0]) > HALF_A_TICK:
            raise NoAnswerError("the start was not stored")
        strip = _Strip.of(record, self.along, self.from_, self.to)
        start = strip.energies(strip.fields(record, 0))

        def ratio(fields: Fields) -> float:
            kinetic, potential = strip.energies(fields)
            above = {"kinetic": kinetic, "potential": potential, "energy": kinetic + potential}[self.of]
            below = {
                "start_kinetic": start[0],
                "start_potential": start[1],
                "start_energy": start[0] + start[1],
                "released_potential": start[1] - potential,
            }[self.over]
            # what differs by less than round-off of the energies themselves is nothing
            if abs(below) <= 1e-12 * (abs(start[1]) + abs(potential)) or below == 0:
                raise NoAnswerError(f"{self.over} is 0 there: nothing to compare with")
            return above / below

        sums = _Sums(numbers.size)
        single = np.full(numbers.size, np.nan)
        for order, k in enumerate(numbers):
            fields = strip.fields(record, int(k))
            sums.add(order, fields)
            try:
                single[order] = ratio(fields)
            except NoAnswerError:
                continue  # at this instant nothing was released; the mean state may differ
        found = ratio(sums.mean(np.arange(numbers.size)))
        times = record.times[numbers]
        name = f"{self.of} over {self.over}, instant by instant"
        evidence = Evidence("time", "s", name, "1", times, single, times, lambda value: np.full(times.size, value))
        if numbers.size == 1:
            return Finding(found, "1", None, evidence, ("one instant: how it swings in time is not included",))
        error = measure_error(numbers.size, lambda part: ratio(sums.mean(part)), found)
        return Finding(found, "1", error, evidence)

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Refuse what is not stored, and windows and strips outside."""
        for name in ("eta", "u", "v"):
            if name not in record.names:
                yield from field_faults(record, name)
        yield from window_faults(record.times, self.during, last=True)
        if self.along is not None:
            yield from line_faults(record, "eta", self.along, None, (self.from_, self.to))


@dataclass(frozen=True)
class _Strip:
    """The part of the domain between two lines: its cells, each with the share of its area that lies between."""

    rows: slice
    columns: slice
    areas: Array
    depth: Array
    gravity: float
    linear: bool

    @classmethod
    def of(cls, record: Record, along: str | None, first: float | None, last: float | None) -> _Strip:
        shares = {}
        for direction, faces in (("x", record.x_face), ("y", record.y_face)):
            ends = (first, last) if direction == along else (None, None)
            low, high = sorted((faces[0] if ends[0] is None else ends[0], faces[-1] if ends[1] is None else ends[1]))
            inside = np.minimum(faces[1:], high) - np.maximum(faces[:-1], low)
            shares[direction] = np.clip(inside, 0.0, None)
        columns, rows = (_extent(shares[direction]) for direction in ("x", "y"))
        areas = shares["y"][rows, None] * shares["x"][None, columns]
        depth = np.broadcast_to(np.asarray(record.depth, np.float64), (record.y.size, record.x.size))[rows, columns]
        return cls(rows, columns, areas, depth, record.basin.gravity, record.linear)

    def fields(self, record: Record, k: int) -> Fields:
        """u, v and eta of a snapshot, 0 on land, with the faces on both sides of every cell."""
        faces_x = slice(self.columns.start, self.columns.stop + 1)
        faces_y = slice(self.rows.start, self.rows.stop + 1)
        cuts = {"u": (self.rows, faces_x), "v": (faces_y, self.columns), "eta": (self.rows, self.columns)}
        u, v, eta = (np.nan_to_num(record.field(name, k)[cut], nan=0.0) for name, cut in cuts.items())
        return u, v, eta

    def energies(self, fields: Fields) -> tuple[float, float]:
        """Kinetic and potential energy per unit density, m5 s-2, potential counted from the rest surface."""
        u, v, eta = fields
        h = self.depth if self.linear else self.depth + eta
        k = (u[:, 1:] ** 2 + u[:, :-1] ** 2 + v[1:] ** 2 + v[:-1] ** 2) / 4
        areas = np.where(np.isfinite(self.depth), self.areas, 0.0)
        kinetic = float(np.sum(areas * np.where(areas > 0, h, 0.0) * k))
        return kinetic, float(np.sum(areas * self.gravity * eta**2 / 2))


def _extent(shares: Array) -> slice:
    """The cells that have a share."""
    inside = np.flatnonzero(shares > 0)
    if not inside.size:
        raise NoAnswerError("no cell lies between the ends of the strip")
    return slice(int(inside[0]), int(inside[-1]) + 1)


class _Sums:
    """Sums of fields over groups of snapshots: the mean over every part of the window needs one reading only."""

    def __init__(self, count: int) -> None:
        parts = [*without_blocks(count), *halves(count), *every_second(count)] if count > 1 else []
        belongs = np.array([np.isin(np.arange(count), part) for part in parts]).reshape(len(parts), count)
        _, self._group = np.unique(belongs, axis=1, return_inverse=True)
        self._group = self._group.reshape(count)
        self._sums: dict[int, Fields] = {}

    def add(self, order: int, fields: Fields) -> None:
        """Add the fields of the snapshot with this place in the window."""
        group = int(self._group[order])
        if group not in self._sums:
            self._sums[group] = fields
            return
        for total, field in zip(self._sums[group], fields, strict=True):
            total += field

    def mean(self, part: Samples) -> Fields:
        """Mean over some of the snapshots; whole groups only."""
        groups = [self._sums[int(group)] for group in np.unique(self._group[part])]
        u, v, eta = (np.sum([group[i] for group in groups], axis=0) / part.size for i in range(3))
        return u, v, eta
