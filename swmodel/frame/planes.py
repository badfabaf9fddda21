"""Planes: how the Coriolis parameter varies over the flat domain that stands for a piece of a sphere."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Plane:
    """A row of `PLANES`.

    Parameters
    ----------
    name, meaning, source : str
        Name, what it is in one line, and where it was published.
    coriolis : callable
        ``(x, y, f0, beta, y0, radius) -> f`` in rad/s, positions in m.
    refuses : mapping
        Keys of `[frame]` that have no meaning on this plane, and why.
    """

    name: str
    meaning: str
    source: str
    coriolis: Callable[[Array, Array, float, float, float, float], Array]
    refuses: Mapping[str, str] = field(default_factory=dict)


def _uniform(x: Array, y: Array, f0: float, beta: float, y0: float, radius: float) -> Array:
    return np.full(np.broadcast_shapes(x.shape, y.shape), f0)


def _linear(x: Array, y: Array, f0: float, beta: float, y0: float, radius: float) -> Array:
    return f0 + beta * (y - y0) + 0 * x


def _sine(x: Array, y: Array, f0: float, beta: float, y0: float, radius: float) -> Array:
    # 2 Omega sin(phi0 + s), s = (y - y0)/R, with 2 Omega sin(phi0) = f0 and 2 Omega cos(phi0) = beta R
    s = (y - y0) / radius
    return f0 * np.cos(s) + beta * radius * np.sin(s) + 0 * x


def _polar(x: Array, y: Array, f0: float, beta: float, y0: float, radius: float) -> Array:
    return f0 * (1 - (x**2 + y**2) / (2 * radius**2))


_STILL = "nothing turns on this plane: f = 0"
_TABLE = "a turntable is no planet: its f is 2 rotation_rate everywhere"

PLANES: dict[str, Plane] = {
    "f": Plane(
        "f",
        "f = f0 everywhere: the tangent plane at one latitude",
        "Gill 1982, section 7.4",
        _uniform,
        {"beta": "f is the same everywhere on this plane"},
    ),
    "beta": Plane("beta", "f = f0 + beta (y - y0): first order in northward distance", "Rossby 1939", _linear),
    "equatorial": Plane(
        "equatorial",
        "f = beta (y - y0): the beta-plane round the equator",
        "Matsuno 1966",
        _linear,
        {"latitude": "it is the equator's, at y0", "f0": "f is 0 on the equator, at y0"},
    ),
    "sine": Plane(
        "sine", "f = 2 Omega sin(latitude + (y - y0)/R): the whole sine on the plane", "common practice", _sine
    ),
    "polar": Plane(
        "polar",
        "f = f0 (1 - r^2/(2 R^2)), r from either pole at x = y = 0",
        "LeBlond 1964, Tellus 16; reference from memory",
        _polar,
        {
            "y0": "the pole is x = y = 0",
            "f0": "it follows from the latitude of the pole",
            "beta": "f has no slope at the pole",
        },
    ),
    "none": Plane(
        "none",
        "f = 0: no rotation",
        "common practice",
        _uniform,
        dict.fromkeys(("latitude", "f0", "beta", "y0", "rotation_rate", "radius"), _STILL),
    ),
    "tank": Plane(
        "tank",
        "f = 2 rotation_rate: a laboratory turntable about x = y = 0, its rest surface a paraboloid",
        "Greenspan 1968, The Theory of Rotating Fluids",
        _uniform,
        dict.fromkeys(("body", "latitude", "f0", "beta", "radius"), _TABLE) | {"y0": "the axis is x = y = 0"},
    ),
}


def at_pole(latitude: float) -> bool:
    """Whether a latitude (rad) is 90 deg or -90 deg, as nearly as text with a unit can say."""
    return abs(abs(latitude) - math.pi / 2) < 1e-9
