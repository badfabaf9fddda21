"""What is refused before a run, because no refinement of the grid could see it afterwards."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from ..errors import Fault
from ..quantities import format_quantity
from .error import BLOCKS
from .finding import NoAnswerError
from .lines import along_line
from .record import HALF_A_TICK, Along, Record, chosen

Array = NDArray[np.float64]

FEWEST_A_PERIOD = 4  # snapshots: with fewer, all levels of refinement agree on a wrong frequency
FEW_A_PERIOD = 8  # snapshots: with fewer, nothing is decided
FEWEST_PERIODS = 1.5  # in the window
FEWEST_POINTS = 8  # in a fit along a line
LEAST_EXPLAINED = 0.9  # of the variance
FEWEST_SNAPSHOTS = 12  # 1.5 periods of 8 snapshots


def taken(times: Array, during: tuple[float, float] | float | None, *, last: bool = False) -> NDArray[np.intp]:
    """Return the numbers of the snapshots in a window: one alone, or at least as many as there are blocks.

    Raises
    ------
    NoAnswerError
        Where there are fewer.
    """
    numbers = chosen(times, during, last=last)
    if numbers.size != 1 and numbers.size < BLOCKS:
        raise NoAnswerError(f"{numbers.size} stored times lie in the window; its error takes at least {BLOCKS}")
    return numbers


def field_faults(record: Record, name: str, key: str = "of") -> Iterator[Fault]:
    """Yield a fault where a field is neither stored nor can be computed."""
    if name in record.names:
        return
    missing = [one for one in ("eta", "u", "v") if one not in record.names]
    if missing:
        found = f'"{name}" is not stored'
        if name not in missing:
            found += f", nor {', '.join(missing)} to compute it from"
        yield Fault((key,), found, remedy=f'add "{name}" to fields in [output]')


def window_faults(
    times: Array, during: tuple[float, float] | float | None, *, last: bool = False, fewest: int = BLOCKS
) -> Iterator[Fault]:
    """Yield a fault where a window leaves the run, or holds too few stored times.

    Parameters
    ----------
    times : ndarray
        Times of the snapshots or of the series, s.
    during : tuple of float, float or None
        The window, s.
    last : bool
        Whether no window means the last snapshot alone.
    fewest : int
        How many stored times a window needs; by default one for each block.
    """
    if not times.size:
        yield Fault(("during",), "nothing was stored")
        return
    first, final = during if isinstance(during, tuple) else (during, during)
    begin, end = (format_quantity(float(one), "s") for one in (times[0], times[-1]))
    if first is not None and final is not None:
        if first < times[0] - HALF_A_TICK or final > times[-1] + HALF_A_TICK:
            outside = final if final > times[-1] else first
            found = f"{format_quantity(outside, 's')} lies outside the run"
            yield Fault(("during",), found, f"times from {begin} to {end}", "run longer, or measure earlier")
            return
        if first == final:
            if not chosen(times, during, last=last).size:
                nearest = format_quantity(float(times[np.argmin(np.abs(times - first))]), "s", 6)
                found = f"nothing is stored at {format_quantity(first, 's', 6)}"
                yield Fault(("during",), found, f"the nearest is at {nearest}")
            return
    elif last:
        return
    count = chosen(times, during, last=last).size
    if count < fewest:
        found = f"{count} stored time{'s lie' if count != 1 else ' lies'} in the window"
        yield Fault(("during",), found, f"at least {fewest}", "a longer window, or store more often")


def place_faults(record: Record, place: Sequence[tuple[str, str, float | None]]) -> Iterator[Fault]:
    """Yield a fault for every coordinate outside what is stored.

    Parameters
    ----------
    record : Record
        The run.
    place : sequence of tuple
        Key, direction (``"x"`` or ``"y"``) and coordinate, m.
    """
    for key, direction, value in place:
        faces = record.x_face if direction == "x" else record.y_face
        low, high = float(faces[0]), float(faces[-1])
        slack = 1e-9 * (high - low)
        if value is not None and not low - slack <= value <= high + slack:
            found = f"{direction} = {format_quantity(value, 'm')} lies outside what is stored"
            ends = [format_quantity(one, "m", 5) for one in (low, high)]
            yield Fault((key,), found, f"{direction} from {ends[0]} to {ends[1]}")


def line_faults(
    record: Record,
    name: str,
    along: Along,
    at: float | None,
    ends: tuple[float | None, float | None],
    fewest: int = 1,
) -> Iterator[Fault]:
    """Yield a fault where a line leaves what is stored or holds too few of the field's points."""
    across = "y" if along == "x" else "x"
    outside = list(place_faults(record, [("at", across, at), ("from", along, ends[0]), ("to", along, ends[1])]))
    yield from outside
    if outside:
        return
    try:
        count = along_line(record, name, along, at, *ends).s.size
    except NoAnswerError:
        count = 0
    if count < fewest:
        found = f"{count} point{'s' if count != 1 else ''} of {name} between the ends of the line"
        key = "to" if ends[1] is not None else "from"
        yield Fault((key,), found, f"at least {fewest}", "a longer line, or a finer grid")


def sampling_faults(times: Array, period: float | None) -> Iterator[Fault]:
    """Yield a fault where a window holds too few snapshots a period, or too few periods.

    Parameters
    ----------
    times : ndarray
        Times of the snapshots in the window, s.
    period : float or None
        Expected period, s.
    """
    if period is None or not math.isfinite(period) or times.size < 2:
        return
    longest, window = float(np.max(np.diff(times))), float(times[-1] - times[0])
    written = format_quantity(period, "s")
    # an interval that is a quarter of the period but for rounding is one
    if longest * FEWEST_A_PERIOD > period * (1 + 1e-9):
        yield Fault(
            ("during",),
            f"{period / longest:.2g} snapshots fall into one expected period of {written}",
            f"at least {FEWEST_A_PERIOD}, better {FEW_A_PERIOD} and more",
            f"store every {format_quantity(period / FEW_A_PERIOD, 's', 2)} or more often",
        )
    if window < FEWEST_PERIODS * period * (1 - 1e-9):
        yield Fault(
            ("during",),
            f"the window holds {window / period:.2g} expected periods of {written}",
            f"at least {FEWEST_PERIODS}",
            "a longer window",
        )


def sampling_reason(times: Array, period: float) -> str:
    """Say why a period that was found decides nothing, or return an empty text."""
    longest, window = float(np.max(np.diff(times))), float(times[-1] - times[0])
    # a found period wavers: a part in a thousand past the limit does not turn a verdict
    if longest * FEW_A_PERIOD > period * 1.001:
        return f"only {period / longest:.2g} snapshots a period; store at least {FEW_A_PERIOD}"
    if window < FEWEST_PERIODS * period * 0.999:
        return f"the window holds {window / period:.2g} periods; it takes at least {FEWEST_PERIODS}"
    return ""


def explained_reason(explained: float) -> str:
    """Say that a fit explains too little, or return an empty text."""
    if explained < LEAST_EXPLAINED:
        return f"the best curve explains only {100 * max(explained, 0.0):.0f} % of the variance"
    return ""
