"""`kind = "decay_length"`: the distance over which a profile falls off."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from typing import Annotated, ClassVar, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ...errors import Fault
from ...quantities import AnyQuantity, describe, same_dimension
from ..error import Samples, measure_error
from ..finding import Evidence, Finding, NoAnswerError
from ..fits import combine, exponential_basis, fit_exponential
from ..limits import FEWEST_POINTS, explained_reason, field_faults, line_faults, taken, window_faults
from ..lines import along_line
from ..record import Record
from .base import AlongLine, During, FieldOf, LineEnd, LineStart, Measure, OtherCoordinate, unit_of

Array = NDArray[np.float64]


class DecayLength(Measure):
    """L of the least-squares fit A + B exp(-s/L) to the field's mean over the window, s from `from` toward `to`."""

    meaning: ClassVar[str] = "L of the best A + B exp(-s/L) along a line, of the field's mean over the window"
    source: ClassVar[str] = "least squares by variable projection, Golub & Pereyra 1973, SIAM J. Numer. Anal. 10"

    kind: Literal["decay_length"] = "decay_length"
    of: FieldOf
    along: AlongLine
    at: OtherCoordinate = None
    from_: LineStart = None
    to: LineEnd = None
    offset: Annotated[AnyQuantity | None, Field(description="A, where it is known")] = None
    during: Annotated[During | None, Field(description="[t0, t1] or one time; the last snapshot by default")] = None

    def unit(self) -> str:
        """Return the metre."""
        return "m"

    def find(self, record: Record) -> Finding:
        """Average, then fit."""
        numbers = taken(record.times, self.during, last=True)
        line = along_line(record, self.of, self.along, self.at, self.from_, self.to)
        lines = np.array([line.sample(record.field(self.of, int(k))) for k in numbers])
        wet = np.isfinite(lines).all(axis=0)
        s, lines = line.s[wet], lines[:, wet]
        if s.size < FEWEST_POINTS:
            raise NoAnswerError(f"{s.size} points lie on the line; a fit takes at least {FEWEST_POINTS}")
        offset = None if self.offset is None else self.offset.value
        profile = lines.mean(axis=0)
        fit = fit_exponential(s, profile, offset)
        length = fit.parameters[0]
        again = partial(fit_exponential, offset=offset, near=length)
        remarks: tuple[str, ...] = ()
        if numbers.size > 1:

            def part_of_window(part: Samples) -> float:
                return again(s, lines[part].mean(axis=0)).parameters[0]

            error = measure_error(numbers.size, part_of_window, length)
        else:

            def part_of_line(part: Samples) -> float:
                return again(s[part], profile[part]).parameters[0]

            error = measure_error(s.size, part_of_line, length)
            remarks = ("one instant: its error is told from parts of the line; its swings in time are not included",)
        reason = explained_reason(fit.explained)
        if not reason and offset is None and length > s[-1] - s[0]:
            reason = "the line is shorter than the length found on it; take a longer line, or give offset"
        return Finding(length, "m", error, self._evidence(s, profile, offset), remarks, reason)

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Refuse what is not stored, places and windows outside, short lines, and an offset of another dimension."""
        yield from field_faults(record, self.of)
        yield from window_faults(record.times, self.during, last=True)
        yield from line_faults(record, self.of, self.along, self.at, (self.from_, self.to), FEWEST_POINTS)
        if self.offset is not None and self.offset.unit and not same_dimension(self.offset.unit, unit_of(self.of)):
            found = f"the offset is {describe(self.offset.unit)}"
            yield Fault(("offset",), found, f"{describe(unit_of(self.of))}, as {self.of} is")

    def _evidence(self, s: Array, profile: Array, offset: float | None) -> Evidence:
        drawn = np.linspace(s[0], s[-1], 200)
        fixed = offset is not None

        def curve(length: float) -> Array:
            basis, fine = (exponential_basis(at, length, fixed) for at in (s, drawn))
            return (offset or 0.0) + combine(basis, profile - (offset or 0.0), fine)

        name = f"distance along {self.along}"
        return Evidence(name, "m", f"mean {self.of}", unit_of(self.of), s, profile, drawn, curve)
