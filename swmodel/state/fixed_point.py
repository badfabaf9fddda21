"""A root of a field equation by rounds that learn from each other (Anderson 1965, J. ACM 12)."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

REMEMBERED = 10  # with 5, fronts of Rossby number 1.2 no longer close in
WEIGHT = 0.5  # with 1, hollows beyond Rossby number 1 diverge on fine grids


def anderson(correction: Callable[[Array], Array], start: Array, *, tolerance: float, rounds: int) -> Array | None:
    """Return x with every abs(correction(x)) <= tolerance, or None where the rounds do not close in.

    Each round goes from the mixture of the last few whose correction is least, by a part of that correction.

    Parameters
    ----------
    correction : callable
        What is to vanish, shaped as x; adding some of it leads nearer.
    start : ndarray
        First x.
    tolerance : float
        Largest correction allowed in the end.
    rounds : int
        Most evaluations of `correction`.
    """
    x = start
    steps: list[tuple[Array, Array]] = []  # changes of x and of the correction from round to round
    before: tuple[Array, Array] | None = None
    farthest = np.inf
    for _ in range(rounds):
        found = correction(x)
        size = float(np.max(np.abs(found)))
        if size <= tolerance:
            return x
        if not size < farthest:
            return None
        if before is None:
            farthest = 1e3 * size  # beyond that no round ever came back
        else:
            steps = [*steps, (x - before[0], found - before[1])][-REMEMBERED:]
        before = x, found
        x = x + WEIGHT * found
        # sums by NumPy and not by BLAS, whose last digits depend on the number of threads
        gram = np.array([[np.sum(one * other) for _, one in steps] for _, other in steps])
        share = np.array([np.sum(change * found) for _, change in steps])
        if steps:
            mixture = np.linalg.lstsq(gram, share, rcond=1e-14)[0]  # 1e-14: round-off of sums of squares
            for part, (moved, change) in zip(mixture, steps, strict=True):
                x = x - part * (moved + WEIGHT * change)
    return None
