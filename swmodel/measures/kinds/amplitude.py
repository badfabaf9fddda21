"""`kind = "amplitude"`: the largest magnitude of a field on a point, a line or the whole domain."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial
from typing import Annotated, Any, ClassVar, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, ValidationInfo, field_validator

from ...errors import Fault
from ...quantities import refusal
from ..error import measure_error
from ..finding import Evidence, Finding, NoAnswerError
from ..limits import field_faults, line_faults, place_faults, taken, window_faults
from ..lines import along_line, at_point
from ..record import Record
from .base import AlongLine, During, FieldOf, LineEnd, LineStart, Measure, Place, unit_of

Array = NDArray[np.float64]


class Amplitude(Measure):
    """Largest magnitude at each snapshot, then the mean over the snapshots."""

    meaning: ClassVar[str] = "largest magnitude on a point, a line or the whole domain, mean over the snapshots"
    source: ClassVar[str] = "definition"

    kind: Literal["amplitude"] = "amplitude"
    of: FieldOf
    along: AlongLine | None = None
    at: Annotated[Place | None, Field(description="[x, y]; with `along`, the line's other coordinate")] = None
    from_: LineStart = None
    to: LineEnd = None
    during: Annotated[During | None, Field(description="[t0, t1] or one time; the last snapshot by default")] = None

    @field_validator("at")
    @classmethod
    def _fits_along(cls, at: tuple[float, float] | float | None, info: ValidationInfo) -> Any:
        along = info.data.get("along", "")
        if along is None and isinstance(at, float):
            remedy = 'write a point as ["10 km", "0 km"], or give along'
            raise refusal(Fault((), "one coordinate without a direction", remedy=remedy))
        if along and isinstance(at, tuple):
            raise refusal(Fault((), f'a point beside along = "{along}"', "one quantity: the line's other coordinate"))
        return at

    @field_validator("from_", "to")
    @classmethod
    def _on_a_line(cls, end: float | None, info: ValidationInfo) -> float | None:
        if end is not None and info.data.get("along", "") is None:
            raise refusal(Fault((), "the end of a line without its direction", 'along = "x" or along = "y"'))
        return end

    def unit(self) -> str:
        """Return that of the field."""
        return unit_of(self.of)

    def find(self, record: Record) -> Finding:
        """Take the mean of the largest magnitudes."""
        numbers = taken(record.times, self.during, last=True)
        values = self._values(record)
        fields = [values(record.field(self.of, int(k))) for k in numbers]
        sizes = np.array([_largest(field, self.of) for field in fields])
        found = float(sizes.mean())
        times = record.times[numbers]
        level = partial(np.full, times.size)
        evidence = Evidence("time", "s", f"largest |{self.of}|", self.unit(), times, sizes, times, level)
        if sizes.size == 1:
            return Finding(found, self.unit(), None, evidence, ("one instant: how it swings in time is not included",))
        error = measure_error(sizes.size, lambda part: float(sizes[part].mean()), found)
        return Finding(found, self.unit(), error, evidence)

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Refuse what is not stored, and places and windows outside."""
        yield from field_faults(record, self.of)
        yield from window_faults(record.times, self.during, last=True)
        if self.along is not None:
            at = self.at if isinstance(self.at, float) else None
            yield from line_faults(record, self.of, self.along, at, (self.from_, self.to))
        elif isinstance(self.at, tuple):
            yield from place_faults(record, [("at", "x", self.at[0]), ("at", "y", self.at[1])])

    def _values(self, record: Record) -> Callable[[NDArray[Any]], Array]:
        if self.along is not None:
            at = self.at if isinstance(self.at, float) else None
            return along_line(record, self.of, self.along, at, self.from_, self.to).sample
        if isinstance(self.at, tuple):
            read = at_point(record, self.of, self.at)
            return lambda field: np.array([read(field)])
        return lambda field: np.asarray(field, np.float64)


def _largest(field: Array, name: str) -> float:
    """Largest magnitude of what is water."""
    sizes = np.abs(field[np.isfinite(field)])
    if not sizes.size:
        raise NoAnswerError(f"{name} has no value there")
    return float(sizes.max())
