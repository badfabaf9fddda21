"""Fields that follow from u, v and eta at one time, in plain NumPy.

Every array holds both ends of its direction, ``[j, i]``: centres ``[ny, nx]``, x-faces ``[ny, nx + 1]``, y-faces
``[ny + 1, nx]``, corners ``[ny + 1, nx + 1]``; in a periodic direction the last repeats the first.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.floating[Any]]
Side = Literal["periodic", "wall", "cut"]


@dataclass(frozen=True)
class Flow:
    """What a derived field is made of.

    Parameters
    ----------
    u, v, eta : ndarray ``[ny, nx + 1]``, ``[ny + 1, nx]``, ``[ny, nx]``
        Velocity on its faces, m/s, and elevation at centres, m.
    depth : ndarray ``[ny, nx]`` or float
        Thickness at rest, m.
    f : ndarray ``[ny + 1, nx + 1]``
        Coriolis parameter at corners, rad/s.
    dx, dy : float
        Cell size, m.
    edges : tuple of str
        West, east, south, north: ``"periodic"``, ``"wall"``, or ``"cut"`` where the fields are part of a larger domain.
    slip : str
        ``"free"`` or ``"none"`` along walls.
    linear : bool
        Whether the equations are the linear ones.
    """

    u: Array
    v: Array
    eta: Array
    depth: Array | float
    f: Array
    dx: float
    dy: float
    edges: tuple[Side, Side, Side, Side]
    slip: str
    linear: bool


def derive(
    name: str,
    u: Array,
    v: Array,
    eta: Array,
    *,
    depth: Array | float,
    f: Array,
    dx: float,
    dy: float,
    edges: tuple[Side, Side, Side, Side],
    slip: str = "free",
    linear: bool = False,
) -> Array:
    """Compute a field that follows from u, v and eta.

    Parameters
    ----------
    name : str
        A name in `DERIVED`.
    u, v, eta, depth, f, dx, dy, edges, slip, linear
        As in `Flow`.

    Returns
    -------
    ndarray
        At the location that `store.names` gives. On a ``"cut"`` side what would need values from beyond it is NaN.

    Raises
    ------
    KeyError
        Where `DERIVED` has no such name.
    """
    return DERIVED[name](Flow(u, v, eta, depth, f, dx, dy, edges, slip, linear))


def thickness(flow: Flow) -> Array:
    """Thickness h = H + eta at centres, m."""
    return flow.depth + flow.eta


def divergence(flow: Flow) -> Array:
    """du/dx + dv/dy at centres, 1/s."""
    return np.diff(flow.u, axis=1) / flow.dx + np.diff(flow.v, axis=0) / flow.dy


def speed(flow: Flow) -> Array:
    """sqrt(2 K) at centres, m/s, with K = (mean_x u^2 + mean_y v^2)/2 as in the equations."""
    u2, v2 = flow.u**2, flow.v**2
    return np.sqrt((u2[:, 1:] + u2[:, :-1] + v2[1:] + v2[:-1]) / 2)


def vorticity(flow: Flow) -> Array:
    """Relative vorticity zeta = dv/dx - du/dy at corners, 1/s.

    On a wall it is 0 (free slip), or the one that a mirrored tangential velocity of opposite sign gives (no slip).
    """
    west, east, south, north = flow.edges
    mirror = 1.0 if flow.slip == "free" else -1.0
    below, above = _beyond(flow.u, 0, south, mirror), _beyond(flow.u, 0, north, mirror, upper=True)
    left, right = _beyond(flow.v, 1, west, mirror), _beyond(flow.v, 1, east, mirror, upper=True)
    u = np.concatenate([below, flow.u, above], axis=0)
    v = np.concatenate([left, flow.v, right], axis=1)
    return np.diff(v, axis=1) / flow.dx - np.diff(u, axis=0) / flow.dy


def potential_vorticity(flow: Flow) -> Array:
    """Potential vorticity q = (f + zeta)/h at corners, 1/(m s); h is the mean of the cells round the corner.

    With the linear equations it is the same to first order in the amplitude, (f + zeta - f eta/H)/H.
    """
    zeta = vorticity(flow)
    eta = corner_mean(flow.eta, flow.edges)
    depth = corner_mean(np.broadcast_to(np.asarray(flow.depth, flow.eta.dtype), flow.eta.shape), flow.edges)
    if flow.linear:
        return (flow.f + zeta - flow.f * eta / depth) / depth
    return (flow.f + zeta) / (depth + eta)


def corner_mean(a: Array, edges: tuple[Side, Side, Side, Side]) -> Array:
    """Mean, at each corner, of the cells of the domain round it: four inside, two on a wall, one where walls meet.

    Parameters
    ----------
    a : ndarray ``[ny, nx]``
        Values at centres.
    edges : tuple of str
        West, east, south, north.

    Returns
    -------
    ndarray ``[ny + 1, nx + 1]``
    """
    # a wall's image has the value of the cell before it, so the mean of two is that of the one
    for axis, lower, upper in ((1, edges[0], edges[1]), (0, edges[2], edges[3])):
        a = np.concatenate([_beyond(a, axis, lower, 1.0), a, _beyond(a, axis, upper, 1.0, upper=True)], axis=axis)
        first, second = (a[:, :-1], a[:, 1:]) if axis == 1 else (a[:-1], a[1:])
        a = (first + second) / 2
    return a


def _beyond(a: Array, axis: int, side: Side, mirror: float, *, upper: bool = False) -> Array:
    """One line of values just beyond a side, for values that lie half a cell inside it."""
    inner, opposite = (-1, 0) if upper else (0, -1)
    if side == "periodic":
        return np.take(a, [opposite], axis)
    factor = mirror if side == "wall" else np.nan
    return factor * np.take(a, [inner], axis)


DERIVED: dict[str, Callable[[Flow], Array]] = {
    "h": thickness,
    "divergence": divergence,
    "speed": speed,
    "vorticity": vorticity,
    "pv": potential_vorticity,
}
