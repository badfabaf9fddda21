"""When fast waves are back: round a periodic direction, or from a wall."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .facts import Direction, Facts

WITHIN = (0.05, 0.95)  # of what sends out waves lies between these shares of its sum along a direction

Array = NDArray[np.float64]
Span = tuple[float, float]


def source(facts: Facts, direction: Direction) -> Span:
    """Where waves begin along a direction, m: the middle nine tenths of the imbalance; else the domain's middle."""
    grid = facts.grid
    faces = grid.x_face if direction == "x" else grid.y_face
    middle = float(faces[0] + faces[-1]) / 2
    profile = facts.imbalance[direction]
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


def _image(distance: float, period: float) -> float:
    """Distance to the nearest image."""
    return distance - period * math.floor(distance / period + 0.5)
