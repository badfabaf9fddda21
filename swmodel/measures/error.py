"""The measure's own error M: how far the number moves when parts of the data are left out.

M = max(3 j, 2 w, 3 d): j the block jackknife's standard error over 5 blocks (Quenouille 1956; Tukey 1958; in blocks,
Kuensch 1989), w the largest difference of either half to the whole, d the largest difference when every second sample
is used, both phases. The factors are from a trial with exact answers; the standard error of a least-squares fit alone
is several times too small, since what disturbs the fit is the flow itself and not independent noise.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from .finding import NoAnswerError

BLOCKS = 5
Samples = NDArray[np.intp]


def without_blocks(count: int) -> list[Samples]:
    """Numbers of the samples that stay when each of 5 blocks in turn is left out."""
    every = np.arange(count)
    return [np.setdiff1d(every, block) for block in np.array_split(every, BLOCKS)]


def halves(count: int) -> list[Samples]:
    """Numbers of the samples of the first and of the second half; with an odd count both hold the middle one."""
    every = np.arange(count)
    return [every[: (count + 1) // 2], every[count // 2 :]]


def every_second(count: int) -> list[Samples]:
    """Numbers of every second sample, from the first and from the second on."""
    every = np.arange(count)
    return [every[::2], every[1::2]]


def measure_error(count: int, measure: Callable[[Samples], float], whole: float) -> float:
    """Return M = max(3 j, 2 w, 3 d).

    Parameters
    ----------
    count : int
        How many samples there are; at least 5.
    measure : callable
        Numbers of samples to the value measured on them alone.
    whole : float
        The value measured on all.

    Returns
    -------
    float
        Infinite where the measure does not work on one of the parts.
    """
    try:
        left_out = np.array([measure(part) for part in without_blocks(count)])
        half = max(abs(measure(part) - whole) for part in halves(count))
        second = max(abs(measure(part) - whole) for part in every_second(count))
    except NoAnswerError:
        return math.inf
    jackknife = math.sqrt((BLOCKS - 1) / BLOCKS * float(np.sum((left_out - left_out.mean()) ** 2)))
    error = max(3 * jackknife, 2 * half, 3 * second)
    return float(error) if math.isfinite(error) else math.inf
