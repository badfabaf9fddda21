"""What `check` says of expectations: their expected values, and what no run of this plan could decide."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import Fault, RequestError
from ..grid import Basin
from ..measures import Expected, ExpectSettings, Record, expected_value
from ..measures import faults as faults_of_expectation
from ..quantities import Percentage, format_quantity
from ..store import build_window
from ..theory import THEORY
from .plan import SNAPSHOTS_BY_DEFAULT, Draft
from .tables import number

MOST_TIMES = 10_000_000  # a run that stores more often is refused for its disk; its times are not listed


@dataclass(frozen=True)
class Prospect:
    """An expectation before the run.

    Parameters
    ----------
    expect : ExpectSettings
        What is written.
    expected : Expected or None
        What is expected; None where it cannot be told.
    """

    expect: ExpectSettings
    expected: Expected | None

    def lines(self) -> Iterator[str]:
        """Yield what is printed of it."""
        yield self.expect.claim
        if self.expected is None:
            yield "no expected value: see the refusals"
            return
        value, unit, theory = self.expected
        within = self.expect.within
        if isinstance(within, Percentage):
            share = format_quantity(within.fraction * abs(value), unit, 2)
            tolerance = f"{within.percent:g} % ({share})"
        else:
            tolerance = format_quantity(within.value, within.unit or unit)
        yield f"expected {format_quantity(value, unit, 4)} within {tolerance}"
        if theory is not None:
            yield f"{theory}: {THEORY[theory].meaning} ({THEORY[theory].source})"

    def as_json(self) -> dict[str, Any]:
        """Return claim, measure and expected value."""
        measure = getattr(self.expect.measure, "model_dump", None)
        kind = type(self.expect.measure).__name__
        within = self.expect.within
        return {
            "claim": self.expect.claim,
            "measure": measure(mode="json", exclude_none=True) if callable(measure) else {"kind": kind},
            "expected": None
            if self.expected is None
            else {"value": number(self.expected.value), "unit": self.expected.unit, "theory": self.expected.theory},
            "within": str(within),
            "because": self.expect.because,
        }


def prospects(draft: Draft, basin: Basin) -> tuple[Prospect, ...]:
    """Resolve what every expectation expects."""
    return tuple(Prospect(expect, _expected(expect, basin, draft.parts)) for expect in draft.experiment.expect)


def expectation_faults(draft: Draft, basin: Basin) -> Iterator[Fault]:
    """Yield what no run of this plan could decide: a window or place outside, too few snapshots, and the like."""
    experiment = draft.experiment
    if not experiment.expect:
        return
    record = planned_record(draft, basin)
    for number_, expect in enumerate(experiment.expect):
        if record is not None:
            yield from faults_of_expectation(expect, number_, record, draft.parts)


def planned_record(draft: Draft, basin: Basin) -> Record | None:
    """Say what the run would leave; where no step could be found, at the times that were asked for.

    None where the region that is stored is wrong, or what is stored cannot be counted.
    """
    output, experiment = draft.experiment.output, draft.experiment
    try:
        window = draft.output.window if draft.output is not None else build_window(output, basin.grid)
    except RequestError:
        return None
    until = experiment.time.until
    if draft.output is not None and draft.step is not None:
        step = draft.step.dt
        every = draft.output.steps_between_snapshots * step
        between = draft.output.steps_between_diagnostics * step
    else:
        every = output.every or until / SNAPSHOTS_BY_DEFAULT
        between = output.diagnostics_every or every
    if until / min(every, between) > MOST_TIMES:
        return None
    x, y = window.axes(basin.grid, "centre")
    x_face, y_face = window.axes(basin.grid, "corner")
    return Record.planned(
        basin,
        _times(until, every),
        output.fields,
        series_times=_times(until, between),
        linear=experiment.numerics.linear,
        axes=(x, y, x_face, y_face),
    )


def _times(until: float, every: float) -> NDArray[np.float64]:
    """Every multiple of an interval up to the end, and the end."""
    whole = np.arange(int(until / every * (1 + 1e-12)) + 1, dtype=np.float64) * every
    return whole if until - whole[-1] < 1e-9 * until else np.concatenate((whole, [until]))


def _expected(expect: ExpectSettings, basin: Basin, parts: Any) -> Expected | None:
    try:
        return expected_value(expect, basin, parts)
    except RequestError:
        return None
