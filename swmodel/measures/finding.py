"""What a measure finds: a number with its own error, the evidence behind it, or the reason why it cannot be told."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray


class NoAnswerError(Exception):
    """Raised inside a measure that cannot tell; its text is the reason. It never leaves `take`."""


@dataclass(frozen=True)
class Evidence:
    """What a picture needs to draw the points, the fit, and the same curve with the expected value.

    Parameters
    ----------
    axis, axis_unit : str
        What runs along the abscissa, and its SI unit.
    name, unit : str
        What the points are, and their SI unit.
    at, values : ndarray ``[n]``
        The points. For a turning velocity the values are complex, u + i v.
    curve_at : ndarray ``[m]``
        Where the curve is drawn.
    curve : callable
        A value of the measure to the best curve with that value, at `curve_at`.
    """

    axis: str
    axis_unit: str
    name: str
    unit: str
    at: NDArray[np.float64]
    values: NDArray[Any]
    curve_at: NDArray[np.float64]
    curve: Callable[[float], NDArray[Any]]


@dataclass(frozen=True)
class Finding:
    """The outcome of a measure.

    Parameters
    ----------
    value : float or None
        What was found, in `unit`; None where nothing could be measured.
    unit : str
        SI unit, written as in `quantities`.
    fit_error : float or None
        M, the measure's own error; None where one instant gives none.
    evidence : Evidence or None
        What a picture draws.
    remarks : tuple of str
        What a reader should know.
    reason : str
        Why this decides nothing; empty where it does.
    """

    value: float | None
    unit: str
    fit_error: float | None = None
    evidence: Evidence | None = None
    remarks: tuple[str, ...] = ()
    reason: str = ""
