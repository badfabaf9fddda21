"""`kind = "change"`: how much a time series changed."""

from __future__ import annotations

import math
import sys
from collections.abc import Iterator
from typing import Annotated, ClassVar, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ...errors import Fault
from ...store.names import SERIES
from ..finding import Evidence, Finding, NoAnswerError
from ..limits import window_faults
from ..record import Record, chosen, si
from .base import During, Measure, SeriesName

Array = NDArray[np.float64]

ROUND_OFF = 4 * sys.float_info.epsilon
"""Relative error of the difference of two sums of one row each; it grows as the root of the cells in a row, which are
added one after the other (Higham 2002, Accuracy and Stability of Numerical Algorithms, section 4.2)."""

ENERGY = ("energy_kinetic", "energy_potential")


class Change(Measure):
    """(last - first)/abs(first) of a time series, or last - first."""

    meaning: ClassVar[str] = "change of a time series from first to last, relative unless absolute"
    source: ClassVar[str] = "definition"

    kind: Literal["change"] = "change"
    of: Annotated[SeriesName, Field(description='a time series; "energy" is kinetic and potential together')]
    absolute: Annotated[bool, Field(description="last - first, not divided by the first")] = False
    during: Annotated[During | None, Field(description="[t0, t1]; the whole run by default")] = None

    def unit(self) -> str:
        """Return that of the series, or of a pure number."""
        return si(SERIES[self._names()[0]].units) if self.absolute else "1"

    def find(self, record: Record) -> Finding:
        """Compare the last with the first."""
        if missing := [name for name in self._names() if name not in record.series]:
            raise NoAnswerError(f"there is no time series {', '.join(missing)}")
        numbers = chosen(record.series_times, self.during, last=False)
        if numbers.size < 2:
            raise NoAnswerError(f"{numbers.size} times of the series lie in the window; a change takes two")
        values = np.sum([record.series[name][numbers] for name in self._names()], axis=0)
        first, last = float(values[0]), float(values[-1])
        if not (np.isfinite(first) and np.isfinite(last)):
            raise NoAnswerError(f"{self.of} is not a number at an end of the window")
        if not self.absolute and first == 0:
            raise NoAnswerError(f"{self.of} is 0 at first, and nothing can be relative to it; set absolute = true")
        scale = 1.0 if self.absolute else abs(first)
        error = ROUND_OFF * math.sqrt(record.basin.grid.nx) * max(abs(first), abs(last)) / scale
        times = record.series_times[numbers]
        evidence = Evidence(
            "time",
            "s",
            f"change of {self.of}",
            self.unit(),
            times,
            (values - first) / scale,
            times[[0, -1]],
            lambda value: np.array([value, value]),
        )
        return Finding((last - first) / scale, self.unit(), error, evidence)

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Refuse a series that there is not, and a window outside or with fewer than two times."""
        for name in self._names():
            if name not in record.series:
                yield Fault(("of",), f"there is no time series {name}", f"one of {', '.join(record.series)}")
        if isinstance(self.during, float):
            yield Fault(("during",), "one time has no change", "a window [t0, t1]")
        else:
            yield from window_faults(record.series_times, self.during, fewest=2)

    def _names(self) -> tuple[str, ...]:
        return ENERGY if self.of == "energy" else (self.of,)
