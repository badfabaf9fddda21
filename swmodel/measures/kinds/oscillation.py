"""`kind = "frequency"` at a point and `kind = "phase_speed"` along a line."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Annotated, Any, ClassVar, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ...errors import Fault
from ...quantities import Length
from ..error import measure_error
from ..finding import Evidence, Finding, NoAnswerError
from ..fits import combine, fit_oscillation, fit_wave, oscillation_basis, turning_basis
from ..limits import (
    FEWEST_A_PERIOD,
    FEWEST_POINTS,
    FEWEST_SNAPSHOTS,
    explained_reason,
    field_faults,
    line_faults,
    place_faults,
    sampling_faults,
    sampling_reason,
    window_faults,
)
from ..lines import along_line, at_point
from ..record import Record, chosen
from .base import AlongLine, During, FieldOf, LineEnd, LineStart, Measure, OtherCoordinate, SignalName, unit_of

Array = NDArray[np.float64]
WholeRun = Annotated[During | None, Field(description="[t0, t1]; the whole run by default")]


class Frequency(Measure):
    """omega of the best sinusoid at a point, mean and trend removed; of a velocity with the sign of its turning."""

    meaning: ClassVar[str] = "omega at a point; of the velocity: positive anticlockwise, negative clockwise"
    source: ClassVar[str] = "least squares by variable projection, Golub & Pereyra 1973, SIAM J. Numer. Anal. 10"

    kind: Literal["frequency"] = "frequency"
    of: Annotated[SignalName, Field(description='a field, or "velocity": u + i v turning')]
    at: Annotated[tuple[Length, Length], Field(description="[x, y] of the point")]
    during: WholeRun = None

    def unit(self) -> str:
        """Return rad/s."""
        return "rad/s"

    def find(self, record: Record) -> Finding:
        """Fit the whole window, then parts of it."""
        numbers = chosen(record.times, self.during, last=False)
        if numbers.size < FEWEST_SNAPSHOTS:
            raise NoAnswerError(_few(numbers.size))
        times, values = record.times[numbers], self._signal(record, numbers)
        fit = fit_oscillation(times, values)
        omega = fit.parameters[0]
        resolution = 2 * math.pi / float(times[-1] - times[0])
        error = measure_error(
            numbers.size,
            lambda part: fit_oscillation(times[part], values[part], omega, resolution).parameters[0],
            omega,
        )
        reason = sampling_reason(times, 2 * math.pi / abs(omega)) or explained_reason(fit.explained)
        return Finding(omega, "rad/s", error, self._evidence(times, values), (), reason)

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Refuse what is not stored, a place or window outside, and too few snapshots or periods."""
        for name in ("u", "v") if self.of == "velocity" else (self.of,):
            yield from field_faults(record, name)
        yield from place_faults(record, [("at", "x", self.at[0]), ("at", "y", self.at[1])])
        yield from _wave_window_faults(record, self.during, period)

    def _signal(self, record: Record, numbers: NDArray[np.intp]) -> NDArray[Any]:
        names = ("u", "v") if self.of == "velocity" else (self.of,)
        read = {name: at_point(record, name, self.at) for name in names}
        parts = [np.array([read[name](record.field(name, int(k))) for k in numbers]) for name in names]
        return parts[0] + 1j * parts[1] if self.of == "velocity" else parts[0]

    def _evidence(self, times: Array, values: NDArray[Any]) -> Evidence:
        drawn = np.linspace(times[0], times[-1], 20 * times.size)
        middle = times.mean()
        basis = turning_basis if self.of == "velocity" else oscillation_basis

        def curve(omega: float) -> NDArray[Any]:
            return combine(basis(times - middle, omega), values, basis(drawn - middle, omega))

        unit = "m/s" if self.of == "velocity" else unit_of(self.of)
        return Evidence("time", "s", self.of, unit, times, values, drawn, curve)


class PhaseSpeed(Measure):
    """omega/k of the best A cos(k s - omega t + phase) along a line, positive toward `to`."""

    meaning: ClassVar[str] = "omega/k of the best travelling wave along a line, positive toward `to`"
    source: ClassVar[str] = "least squares by variable projection, Golub & Pereyra 1973, SIAM J. Numer. Anal. 10"

    kind: Literal["phase_speed"] = "phase_speed"
    of: FieldOf
    along: AlongLine
    at: OtherCoordinate = None
    from_: LineStart = None
    to: LineEnd = None
    during: WholeRun = None

    def unit(self) -> str:
        """Return m/s."""
        return "m/s"

    @property
    def backward(self) -> bool:
        """Whether the line runs toward -x or -y."""
        return self.from_ is not None and self.to is not None and self.from_ > self.to

    def find(self, record: Record) -> Finding:
        """Fit the whole window, then parts of it."""
        numbers = chosen(record.times, self.during, last=False)
        if numbers.size < FEWEST_SNAPSHOTS:
            raise NoAnswerError(_few(numbers.size))
        line = along_line(record, self.of, self.along, self.at, self.from_, self.to)
        s, times = line.s, record.times[numbers]
        lines = np.array([line.sample(record.field(self.of, int(k))) for k in numbers])
        if s.size < FEWEST_POINTS:
            raise NoAnswerError(f"{s.size} points lie on the line; a fit takes at least {FEWEST_POINTS}")
        if not np.isfinite(lines).all():
            raise NoAnswerError("the line crosses land")
        fit = fit_wave(times, s, lines)
        k, omega = fit.parameters

        def speed(part: NDArray[np.intp]) -> float:
            its_k, its_omega = fit_wave(times[part], s, lines[part], (k, omega)).parameters
            return its_omega / its_k

        error = measure_error(numbers.size, speed, omega / k)
        reason = explained_reason(fit.explained)
        if not reason and omega:
            reason = sampling_reason(times, 2 * math.pi / abs(omega))
        points = 2 * math.pi / k / float(s[1] - s[0])
        if not reason and points < FEWEST_A_PERIOD:
            reason = f"only {points:.2g} points a wavelength; it takes at least {FEWEST_A_PERIOD}"
        return Finding(omega / k, "m/s", error, self._evidence(times, s, lines, k), (), reason)

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Refuse what is not stored, a line or window outside or too short, and too few snapshots or periods."""
        yield from field_faults(record, self.of)
        yield from line_faults(record, self.of, self.along, self.at, (self.from_, self.to), FEWEST_POINTS)
        yield from _wave_window_faults(record, self.during, period)

    def _evidence(self, times: Array, s: Array, lines: Array, k: float) -> Evidence:
        # where the crest of wavenumber k stands at each snapshot
        turning = (lines - lines.mean()) @ np.exp(-1j * k * s)
        crests = -np.unwrap(np.angle(turning)) / k

        def curve(speed: float) -> Array:
            return np.asarray(crests.mean() + speed * (times - times.mean()))

        return Evidence("time", "s", f"crest of {self.of} along {self.along}", "m", times, crests, times, curve)


def _few(count: int) -> str:
    return f"snapshots in the window: {count}; it takes at least {FEWEST_SNAPSHOTS}"


def _wave_window_faults(
    record: Record, during: tuple[float, float] | float | None, period: float | None
) -> Iterator[Fault]:
    """Yield what is wrong with the window of a wave."""
    wrong = list(window_faults(record.times, during))
    yield from wrong
    if wrong:
        return
    times = record.times[chosen(record.times, during, last=False)]
    if times.size < FEWEST_SNAPSHOTS:
        yield Fault(
            ("during",),
            f"snapshots in the window: {times.size}",
            f"at least {FEWEST_SNAPSHOTS}",
            "a longer window, or store more often",
        )
    yield from sampling_faults(times, period)
