"""Values at a point or along a line: the field's own points along it, linear between them across it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..store.names import FIELDS
from .finding import NoAnswerError
from .record import Along, Record

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Line:
    """A line through a field.

    Parameters
    ----------
    s : ndarray ``[n]``
        Distance of its points from the first end toward the other, m, increasing.
    sample : callable
        The field ``[y, x]`` to its values at those points, ``[n]``.
    """

    s: Array
    sample: Callable[[NDArray[Any]], Array]


def between(values: Array, where: float, *, wraps: float = 0.0) -> tuple[int, int, float]:
    """Find the two neighbours of a place and the share of the second; held beyond the last value.

    Parameters
    ----------
    values : ndarray ``[n]``
        Increasing coordinates.
    where : float
        The place.
    wraps : float
        Length of the period where the last value is followed by the first again, else 0.
    """
    if wraps:
        where = values[0] + (where - values[0]) % wraps
        if where > values[-1]:
            share = (where - values[-1]) / (values[0] + wraps - values[-1])
            return values.size - 1, 0, float(share)
    upper = int(np.clip(np.searchsorted(values, where), 1, max(values.size - 1, 1)))
    if values.size == 1:
        return 0, 0, 0.0
    share = (where - values[upper - 1]) / (values[upper] - values[upper - 1])
    return upper - 1, upper, float(np.clip(share, 0.0, 1.0))


def at_point(record: Record, name: str, place: tuple[float, float]) -> Callable[[NDArray[Any]], float]:
    """Return what reads a field's value at a point, bilinear between the field's own points."""
    x, y = record.axes(name)
    i0, i1, p = between(x, place[0], wraps=_period(record, name, "x"))
    j0, j1, q = between(y, place[1], wraps=_period(record, name, "y"))
    columns, shares_x = _neighbours(i0, i1, p)
    rows, shares_y = _neighbours(j0, j1, q)

    def read(field: NDArray[Any]) -> float:
        value = float(shares_y @ np.asarray(field, np.float64)[np.ix_(rows, columns)] @ shares_x)
        if not np.isfinite(value):
            raise NoAnswerError(f"{name} has no value at x = {place[0]:g} m, y = {place[1]:g} m")
        return value

    return read


def along_line(
    record: Record, name: str, along: Along, at: float | None, first: float | None, last: float | None
) -> Line:
    """Lay a line through a field.

    Parameters
    ----------
    record : Record
        What is measured.
    name : str
        The field.
    along : str
        ``"x"`` or ``"y"``.
    at : float or None
        The other coordinate, m; None takes the mean over the other direction.
    first, last : float or None
        Ends on the line, m; by default those of what was stored. With `first` beyond `last` it runs the other way.

    Raises
    ------
    NoAnswerError
        Where none of the field's points lies between the ends.
    """
    x, y = record.axes(name)
    own, other = (x, y) if along == "x" else (y, x)
    ends = record.x_face if along == "x" else record.y_face
    first = float(ends[0]) if first is None else first
    last = float(ends[-1]) if last is None else last
    sign = 1.0 if last >= first else -1.0
    step = float(ends[-1] - ends[0]) / own.size
    s = sign * (own - first)
    # a point that lies on an end but for the rounding of its position belongs to the line
    inside = np.flatnonzero((s >= -1e-9 * step) & (s <= abs(last - first) + 1e-9 * step))
    if not inside.size:
        raise NoAnswerError(f"no point of {name} lies between {along} = {first:g} m and {last:g} m")
    if sign < 0:
        inside = inside[::-1]
    if at is None:
        shares = _mean_shares(record, name, along, other.size)

        def sample(field: NDArray[Any]) -> Array:
            return _mean(field if along == "x" else field.T, shares)[inside]

    else:
        across = "y" if along == "x" else "x"
        rows, pair = _neighbours(*between(other, at, wraps=_period(record, name, across)))

        def sample(field: NDArray[Any]) -> Array:
            lines = (field if along == "x" else field.T)[rows]
            return np.asarray(pair @ np.asarray(lines, np.float64), np.float64)[inside]

    return Line(s[inside], sample)


def _period(record: Record, name: str, direction: str) -> float:
    """Length after which a field's own points come again; 0 where the last repeats the first, or nothing repeats."""
    on_faces = FIELDS[name].location in (("u", "corner") if direction == "x" else ("v", "corner"))
    edge, faces = (record.edges[0], record.x_face) if direction == "x" else (record.edges[2], record.y_face)
    return float(faces[-1] - faces[0]) if edge == "periodic" and not on_faces else 0.0


def _neighbours(first: int, second: int, share: float) -> tuple[list[int], Array]:
    """Rows and their shares; one alone where the place lies on it, so that land beside it does not count."""
    if share == 0.0:
        return [first], np.ones(1)
    if share == 1.0:
        return [second], np.ones(1)
    return [first, second], np.array([1.0 - share, share])


def _mean_shares(record: Record, name: str, along: Along, count: int) -> Array:
    """Widths across the line that each point stands for: half at the ends of a direction that holds both."""
    shares = np.ones(count)
    if FIELDS[name].location in (("v", "corner") if along == "x" else ("u", "corner")):
        shares[[0, -1]] = 0.5
    return shares


def _mean(lines: NDArray[Any], shares: Array) -> Array:
    """Mean over the first axis of what is water; NaN where nothing is."""
    values = np.asarray(lines, np.float64)
    wet = np.isfinite(values)
    weight = shares @ wet
    total = shares @ np.where(wet, values, 0.0)
    return np.where(weight > 0, total / np.where(weight > 0, weight, 1.0), np.nan)
