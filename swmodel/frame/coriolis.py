"""The Coriolis acceleration in full, and the part of it that the traditional approximation leaves out."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray


def coriolis_acceleration(
    velocity: tuple[ArrayLike, ArrayLike, ArrayLike], latitude: float, rotation_rate: float
) -> NDArray[np.float64]:
    """-2 Omega x v in local axes, m s-2.

    Parameters
    ----------
    velocity : tuple of array_like
        u eastward, v northward, w upward, m/s.
    latitude : float
        Geographic latitude, rad, negative in the south.
    rotation_rate : float
        Omega, rad/s.

    Returns
    -------
    ndarray ``[3, ...]``
        Eastward ``f v - F w``, northward ``-f u`` and upward ``F u``, with f = 2 Omega sin(latitude) and the horizontal
        component F = 2 Omega cos(latitude).

    Notes
    -----
    Source: Gill 1982, section 4.12.
    """
    u, v, w = np.broadcast_arrays(*(np.asarray(part, np.float64) for part in velocity))
    f = 2 * rotation_rate * math.sin(latitude)
    F = 2 * rotation_rate * math.cos(latitude)
    return np.stack([f * v - F * w, -f * u, F * u])


def traditional_acceleration(velocity: tuple[ArrayLike, ArrayLike], f: ArrayLike) -> NDArray[np.float64]:
    """What the shallow-water equations keep of it: ``(f v, -f u)``, m s-2, ``[2, ...]``."""
    u, v, f = np.broadcast_arrays(*(np.asarray(part, np.float64) for part in (*velocity, f)))
    return np.stack([f * v, -f * u])


def neglected_share(depth: float, length: float, f: float, horizontal: float) -> float:
    """Size of the Coriolis part that the traditional approximation leaves out, over the part it keeps.

    A flow of depth H and length L has w of the order u H/L, so that F w over f u is (H/L) |cot(latitude)|.

    Parameters
    ----------
    depth, length : float
        H and L, m.
    f : float
        Coriolis parameter, rad/s, of either sign.
    horizontal : float
        F = 2 Omega cos(latitude), rad/s.

    Returns
    -------
    float
        A ratio; infinite at the equator itself, 0 where nothing turns.

    Notes
    -----
    Source: Gerkema et al. 2008, Rev. Geophys. 46, RG2004.
    """
    if horizontal == 0:
        return 0.0
    return math.inf if f == 0 else depth / length * abs(horizontal / f)
