"""What can go wrong, as exceptions that carry their exit code.

::

    SwmodelError
    ├── RequestError     exit 2         the request is wrong, or the check refuses it: a list of faults
    ├── SolutionError    exit 3         the solution became unphysical; the last good state is kept
    ├── MachineError     exit 4         the machine failed it: disk full, no permission, folder in use
    └── StopRequested    exit 128 + n   stopped by signal n; a checkpoint was written
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

VERSION = "0.1.0"
CAUTION = (
    "Research prototype: not for navigation, coastal-hazard or tsunami warning, or engineering design; "
    "for those the responsible authority and licensed practice decide."
)


@dataclass(frozen=True)
class Fault:
    """One thing wrong with a request.

    Parameters
    ----------
    key : tuple of str and int
        Path to the faulty entry, for example ``("start", 0, "width")``; empty when it concerns no single key.
    found : str
        What was found there, in words.
    allowed : str
        What would be allowed; may be empty.
    remedy : str
        What to do; may be empty.
    file : str
        The file, where one is known.
    line : int or None
        Line in that file, counted from 1.
    """

    key: tuple[str | int, ...]
    found: str
    allowed: str = ""
    remedy: str = ""
    file: str = ""
    line: int | None = None

    def placed(self, file: str, line: int | None) -> Fault:
        """Return the same fault with its place in a file."""
        return replace(self, file=file, line=line)

    def __str__(self) -> str:
        where = self.file + (f":{self.line}" if self.file and self.line else "")
        key = ".".join(str(part) for part in self.key)
        head = ": ".join(part for part in (where, key) if part)
        body = "; ".join(part for part in (self.found, self.allowed, self.remedy) if part)
        return f"{head}: {body}" if head else body


class SwmodelError(Exception):
    """Whatever this package raises on purpose."""

    exit_code = 1


class RequestError(SwmodelError):
    """The request cannot be met as written.

    Parameters
    ----------
    faults : str, Fault or an iterable of Fault
        Everything found wrong, all at once.
    """

    exit_code = 2

    def __init__(self, faults: str | Fault | Iterable[Fault]) -> None:
        if isinstance(faults, str):
            faults = Fault((), faults)
        self.faults = [faults] if isinstance(faults, Fault) else list(faults)
        super().__init__("\n".join(str(fault) for fault in self.faults))


class SolutionError(SwmodelError):
    """The solution became unphysical: a value is not finite, or the layer dried.

    Parameters
    ----------
    message : str
        What happened, when, where, and the likely cause.
    time : float
        Model time at which it was noticed, s.
    place : tuple of float
        x and y there, m.
    """

    exit_code = 3

    def __init__(self, message: str, time: float, place: tuple[float, float]) -> None:
        super().__init__(message)
        self.time = time
        self.place = place


class MachineError(SwmodelError):
    """The machine failed the run: disk full, no permission, a folder in use. What was written stays readable."""

    exit_code = 4


class StopRequested(SwmodelError):  # noqa: N818  (it is no error of anyone's)
    """A signal asked the run to stop; its state is in a checkpoint.

    Parameters
    ----------
    message : str
        What was kept, and how to go on.
    signal : int
        Number of the signal.
    """

    def __init__(self, message: str, signal: int) -> None:
        super().__init__(message)
        self.signal = signal
        self.exit_code = 128 + signal
