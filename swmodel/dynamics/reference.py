"""The equations in plain NumPy: the twin that every fast kernel is held against. It imports nothing of ours.

Vector-invariant rotating shallow water on an Arakawa C-grid (equations 1 to 3 of docs/equations.md)::

    du/dt  =  q h v - d/dx (K + g eta)                       on x-faces   (1)
    dv/dt  = -q h u - d/dy (K + g eta)                       on y-faces   (2)
    deta/dt = -d/dx (h u) - d/dy (h v)                       at centres   (3)

All arrays below carry a rim of ghost cells and have one shape; ``a[j, i]`` of u is the west face of cell (j, i), of v
its south face, of a corner quantity its south-west corner. `east(a)[j, i]` is ``a[j, i + 1]``, and so on; what wraps
round lies in the rim and is never used.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.floating[Any]]
RIM = 2


def east(a: Array) -> Array:
    """The neighbour to the east."""
    return np.roll(a, -1, 1)


def west(a: Array) -> Array:
    """The neighbour to the west."""
    return np.roll(a, 1, 1)


def north(a: Array) -> Array:
    """The neighbour to the north."""
    return np.roll(a, -1, 0)


def south(a: Array) -> Array:
    """The neighbour to the south."""
    return np.roll(a, 1, 0)


def flux_energy(q: Array, U: Array, V: Array, aspect: float) -> tuple[Array, Array]:
    """PV flux that conserves energy (Sadourny 1975, his model I); equation 4."""
    flux_u = (q * (V + west(V)) + north(q) * north(V + west(V))) / 4
    flux_v = -(q * (U + south(U)) + east(q) * east(U + south(U))) / 4
    return flux_u, flux_v


def flux_enstrophy(q: Array, U: Array, V: Array, aspect: float) -> tuple[Array, Array]:
    """PV flux that conserves potential enstrophy (Sadourny 1975, his model II); equation 5."""
    flux_u = (q + north(q)) / 2 * (V + west(V) + north(V + west(V))) / 4
    flux_v = -(q + east(q)) / 2 * (U + south(U) + east(U + south(U))) / 4
    return flux_u, flux_v


def flux_both(q: Array, U: Array, V: Array, aspect: float) -> tuple[Array, Array]:
    """PV flux that conserves energy and potential enstrophy (Arakawa & Lamb 1981); equation 6.

    With dx != dy the epsilon terms carry ``aspect`` = dy/dx and the phi terms its inverse.
    """
    qe, qn, qne = east(q), north(q), north(east(q))
    alpha = (2 * qne + qn + 2 * q + qe) / 24
    delta = (qne + 2 * qn + q + 2 * qe) / 24
    beta, gamma = west(delta), west(alpha)
    epsilon = aspect * (qne + qn - q - qe) / 24
    phi = (-qne + qn + q - qe) / 24 / aspect
    flux_u = alpha * north(V) + beta * west(north(V)) + gamma * west(V) + delta * V - epsilon * east(U)
    flux_u = flux_u + west(epsilon) * west(U)
    flux_v = east(gamma) * east(U) + delta * U + south(alpha) * south(U) + east(south(beta)) * south(east(U))
    flux_v = -(flux_v + phi * north(V) - south(phi) * south(V))
    return flux_u, flux_v


FLUXES = {"energy": flux_energy, "enstrophy": flux_enstrophy, "both": flux_both}


def with_rim(
    a: Array, periodic: tuple[bool, bool], face: tuple[bool, bool], sign: tuple[float, float, float, float]
) -> Array:
    """Return `a` with its rim: round the domain, or mirrored at walls with a sign.

    Parameters
    ----------
    a : ndarray
        Values with both ends along each direction in which they lie on faces.
    periodic : tuple of bool
        Along x, along y.
    face : tuple of bool
        Whether `a` lies on faces along x, along y.
    sign : tuple of float
        Sign of the mirror image beyond west, east, south, north.
    """
    for axis, lower, upper in ((1, sign[0], sign[1]), (0, sign[2], sign[3])):
        on_face = face[1 - axis]
        n = a.shape[axis] - on_face
        k = np.arange(-RIM, n + RIM + 1)
        if periodic[1 - axis]:
            a = np.take(a, k % n, axis)
            continue
        image = np.where(k < 0, -k if on_face else -1 - k, k)
        image = np.where(k > n - (not on_face), 2 * n - k - (not on_face), image).clip(0, n - (not on_face))
        factor = np.where(k < 0, lower, np.where(k > n - (not on_face), upper, 1.0))
        a = np.take(a, image, axis) * np.expand_dims(factor, 1 - axis)
    return a


def tendency(
    u: Array,
    v: Array,
    eta: Array,
    *,
    depth: Array | float,
    f: Array,
    gravity: float,
    dx: float,
    dy: float,
    edges: tuple[str, str, str, str],
    slip: str = "free",
    pv_flux: str | Callable[..., tuple[Array, Array]] = "both",
    linear: bool = False,
) -> tuple[Array, Array, Array]:
    """Rates of change of u, v and eta (equations 1 to 3).

    Parameters
    ----------
    u : ndarray ``[ny, nx + 1]``
        Velocity on x-faces, m/s; 0 on walls.
    v : ndarray ``[ny + 1, nx]``
        Velocity on y-faces, m/s; 0 on walls.
    eta : ndarray ``[ny, nx]``
        Elevation at centres, m.
    depth : ndarray ``[ny, nx]`` or float
        Thickness at rest, m.
    f : ndarray ``[ny + 1, nx + 1]``
        Coriolis parameter at corners, rad/s.
    gravity, dx, dy : float
        m s-2, m, m.
    edges : tuple of str
        West, east, south, north: ``"periodic"`` or ``"wall"``.
    slip : str
        ``"free"`` or ``"none"``.
    pv_flux : str or callable
        ``"energy"``, ``"enstrophy"``, ``"both"``, or a function ``(q, U, V, aspect)``.
    linear : bool
        Drop zeta and K, and take H for h in the fluxes.

    Returns
    -------
    tuple of ndarray
        du/dt, dv/dt (m s-2) and deta/dt (m/s), shaped as u, v, eta; 0 for the normal velocity on walls.
    """
    ny, nx = eta.shape
    periodic = edges[0] == "periodic", edges[2] == "periodic"
    mirror = 1.0 if slip == "free" else -1.0
    H = with_rim(np.broadcast_to(np.asarray(depth, eta.dtype), eta.shape), periodic, (False, False), (1, 1, 1, 1))
    eta_ = with_rim(eta, periodic, (False, False), (1, 1, 1, 1))
    u_ = with_rim(u, periodic, (True, False), (-1, -1, mirror, mirror))
    v_ = with_rim(v, periodic, (False, True), (mirror, mirror, -1, -1))
    f_ = with_rim(f, periodic, (True, True), (1, 1, 1, 1))

    h = H if linear else H + eta_
    U = (h + west(h)) / 2 * u_
    V = (h + south(h)) / 2 * v_
    zeta = (v_ - west(v_)) / dx - (u_ - south(u_)) / dy
    h_corner = (h + west(h) + south(h) + south(west(h))) / 4
    q = (f_ if linear else f_ + zeta) / h_corner
    K = 0 * eta_ if linear else (u_**2 + east(u_) ** 2 + v_**2 + north(v_) ** 2) / 4
    B = K + gravity * eta_

    flux_u, flux_v = (FLUXES[pv_flux] if isinstance(pv_flux, str) else pv_flux)(q, U, V, dy / dx)
    du = flux_u - (B - west(B)) / dx
    dv = flux_v - (B - south(B)) / dy
    deta = -(east(U) - U) / dx - (north(V) - V) / dy

    inside = slice(RIM, RIM + ny), slice(RIM, RIM + nx)
    du = du[RIM : RIM + ny, RIM : RIM + nx + 1]
    dv = dv[RIM : RIM + ny + 1, RIM : RIM + nx]
    if not periodic[0]:
        du[:, [0, -1]] = 0
    if not periodic[1]:
        dv[[0, -1], :] = 0
    return du, dv, deta[inside]
