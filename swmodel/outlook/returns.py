"""When fast waves are back: round a periodic direction, or from a wall."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .facts import Direction, Facts

WITHIN = (0.05, 0.95)  # of what sends out waves lies between these shares of its sum along a direction
NEGLIGIBLE = 1e-9  # of g eta/dx and f u: an imbalance that small is round-off and the balance's own tolerance

Array = NDArray[np.float64]
Span = tuple[float, float]


def imbalance(facts: Facts) -> Array:
    """Size of the start's departure from geostrophic balance at centres, m s-2, ``[ny, nx]``: what sends out waves.

    Not a number of the model's own: one-sided and two-cell differences, good to tell where the waves begin.
    """
    start, basin, grid = facts.start, facts.basin, facts.grid
    assert start is not None
    u, v = (start.u[:, 1:] + start.u[:, :-1]) / 2, (start.v[1:] + start.v[:-1]) / 2
    f = (basin.f[1:, 1:] + basin.f[:-1, :-1]) / 2
    slope_x = basin.gravity * _slope(start.eta, 1, grid.dx, periodic=grid.periodic_x)
    slope_y = basin.gravity * _slope(start.eta, 0, grid.dy, periodic=grid.periodic_y)
    size = np.hypot(f * v - slope_x, f * u + slope_y)
    largest = max(float(np.abs(part).max()) for part in (slope_x, slope_y, f * u, f * v))
    return np.where(size > NEGLIGIBLE * largest, size, 0.0)


def source(facts: Facts, direction: Direction) -> Span:
    """Where waves begin along a direction, m: the middle nine tenths of the imbalance; else the domain's middle."""
    grid = facts.grid
    faces = grid.x_face if direction == "x" else grid.y_face
    middle = float(faces[0] + faces[-1]) / 2
    if facts.start is None:
        return middle, middle
    profile = imbalance(facts).sum(axis=0 if direction == "x" else 1)
    if not profile.any():
        return middle, middle
    share = np.concatenate(([0.0], np.cumsum(profile) / profile.sum()))
    low, high = np.interp(WITHIN, share, faces)
    return float(low), float(high)


def return_time(facts: Facts, direction: Direction, region: Span | None = None) -> float:
    """When the fastest waves are back, s.

    Round a periodic direction: at the place they left, or, going the long way round, at the nearest place of `region`.
    Between walls: from the nearer wall at the place they left, or at the place of `region` that they meet first.

    Parameters
    ----------
    facts : Facts
        The set-up.
    direction : {"x", "y"}
        Along which they go.
    region : tuple of float, optional
        The part of the domain along it that counts, m.
    """
    low, high = source(facts, direction)
    middle = (low + high) / 2
    first, last = region or (middle, middle)
    faces = facts.grid.x_face if direction == "x" else facts.grid.y_face
    west, east = float(faces[0]), float(faces[-1])
    if facts.periodic(direction):
        reach = max(abs(_image(end - middle, facts.size(direction))) for end in (first, last))
        return (facts.size(direction) - reach) / facts.fastest_wave
    # a place outside is refused elsewhere
    first, last = max(first, west), min(last, east)
    return min(low - west + first - west, east - high + east - last) / facts.fastest_wave


def region_of(measure: Any, direction: Direction, faces: Array) -> Span | None:
    """Return the part of the domain along a direction that a measure looks at, m; None where it names none."""
    along, at = getattr(measure, "along", None), getattr(measure, "at", None)
    if isinstance(at, tuple):
        place = at[0] if direction == "x" else at[1]
        return place, place
    if along == direction:
        ends = getattr(measure, "from_", None), getattr(measure, "to", None)
        if ends == (None, None):
            return None
        whole = float(faces[0]), float(faces[-1])
        first, last = sorted(given if given is not None else end for given, end in zip(ends, whole, strict=True))
        return first, last
    if along is not None and isinstance(at, float):
        return at, at
    return None


def window_end(measure: Any, until: float) -> float:
    """When a measure has seen all it looks at, s."""
    during = getattr(measure, "during", None)
    if during is None:
        return until
    return float(during[1]) if isinstance(during, tuple) else float(during)


def _slope(eta: Array, axis: int, spacing: float, *, periodic: bool) -> Array:
    if periodic:
        return (np.roll(eta, -1, axis) - np.roll(eta, 1, axis)) / (2 * spacing)
    return np.gradient(eta, spacing, axis=axis) if eta.shape[axis] > 1 else np.zeros_like(eta)


def _image(distance: float, period: float) -> float:
    """Distance to the nearest image."""
    return distance - period * math.floor(distance / period + 0.5)
