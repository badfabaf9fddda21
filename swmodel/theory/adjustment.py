"""Adjustment of a step in elevation under rotation: the end state, its energies, and the way there.

At t = 0 the fluid is at rest with eta = eta0 sign(x) over an even depth, f is uniform, and the step is small against
the depth. Energies are per unit length of the step and per unit density. The deformation radius is a = c/|f|.

Sources: Rossby 1938, J. Mar. Res. 1; Cahn 1945, J. Meteor. 2 (the way there); Gill 1982, sections 7.2 and 7.3.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ..errors import Fault, RequestError
from .scales import deformation_radius, gravity_wave_speed

Array = NDArray[np.float64]


def adjusted_kinetic_share() -> float:
    """Share of the released potential energy that stays as kinetic energy of the balanced current: 1/3."""
    return 1 / 3


def _radius(gravity: float, depth: float, f0: float) -> float:
    if f0 == 0:
        raise RequestError(Fault((), "a step does not adjust to a balance without rotation", "f0 that is not 0"))
    return deformation_radius(gravity, depth, f0)


def adjusted_elevation(x: ArrayLike, *, eta0: float, gravity: float, depth: float, f0: float) -> Array:
    """Elevation of the end state, eta0 sign(x) (1 - exp(-|x|/a)), m.

    Parameters
    ----------
    x : array_like
        Distance from the step, m.
    eta0 : float
        Height of the step on either side, m.
    gravity, depth, f0 : float
        g in m s-2, H in m, Coriolis parameter in rad/s of either sign.
    """
    x = np.asarray(x, np.float64)
    return np.asarray(-eta0 * np.sign(x) * np.expm1(-np.abs(x) / _radius(gravity, depth, f0)))


def adjusted_velocity(x: ArrayLike, *, eta0: float, gravity: float, depth: float, f0: float) -> Array:
    """Velocity along the step in the end state, (g/f) d eta/dx = eta0 sqrt(g/H) sign(f) exp(-|x|/a), m/s.

    With x eastward it is northward where f > 0. Parameters as in `adjusted_elevation`.
    """
    decay = np.exp(-np.abs(np.asarray(x, np.float64)) / _radius(gravity, depth, f0))
    return np.asarray(eta0 * math.sqrt(gravity / depth) * math.copysign(1.0, f0) * decay)


@dataclass(frozen=True)
class AdjustedEnergies:
    """Energies of the end state within a distance of the step, m4 s-2 (per unit length and density).

    Parameters
    ----------
    released_potential : float
        Potential energy of the start less that of the end state.
    kinetic : float
        Kinetic energy of the end state.
    """

    released_potential: float
    kinetic: float

    @property
    def kinetic_share(self) -> float:
        """Kinetic over released potential energy; 1/3 over the whole line."""
        return self.kinetic / self.released_potential


def adjusted_energies(
    *, eta0: float, gravity: float, depth: float, f0: float, within: float = math.inf
) -> AdjustedEnergies:
    """Energies of the end state in |x| < `within` (m); over the whole line 3/2 and 1/2 of g eta0^2 a.

    Other parameters as in `adjusted_elevation`.
    """
    a = _radius(gravity, depth, f0)
    E = math.exp(-within / a)
    scale = gravity * eta0**2 * a
    return AdjustedEnergies(released_potential=scale * (2 * (1 - E) - (1 - E**2) / 2), kinetic=scale * (1 - E**2) / 2)


def adjusting_step(
    x: ArrayLike, t: float, *, eta0: float, gravity: float, depth: float, f0: float
) -> tuple[Array, Array, Array]:
    """Linear state on the way to the end state, on an unbounded line.

    Parameters
    ----------
    x : array_like
        Distances from the step, m.
    t : float
        Time since the step was let go, s.
    eta0, gravity, depth, f0 : float
        As in `adjusted_elevation`.

    Returns
    -------
    u, v, eta : ndarray
        In m/s, m/s and m, in the shape of `x`. With s = |x|/c and r = sqrt(t^2 - s^2), inside s < t::

            u   = -(g eta0/c) J0(f r)
            v   =  (g eta0/c) f   integral from s to t of J0(f sqrt(t'^2 - s^2)) dt'
            eta =  eta0 sign(x) f s  integral from s to t of J1(f sqrt(t'^2 - s^2))/sqrt(t'^2 - s^2) dt'

        and outside the start, eta0 sign(x) at rest. The integrals are taken by Gauss's rule to some 1e-12.

    Notes
    -----
    u obeys u_tt + f^2 u - c^2 u_xx = 0 with u_t = -2 g eta0 delta(x) at the start, whose solution is the Klein-Gordon
    equation's own (Cahn 1945); v follows from v_t = -f u, and eta from potential vorticity, which stays f sign(x) eta0.
    """
    from scipy.special import j0, j1

    c = gravity_wave_speed(gravity, depth)
    _radius(gravity, depth, f0)
    f = abs(f0)
    x = np.asarray(x, np.float64)
    s = np.abs(x) / c
    inside = s < t
    s = np.minimum(s, t)[..., None]
    # J0(z) and J1(z)/z have no singular point in z^2 = f^2 (t'^2 - s^2): Gauss's rule in t' converges at once,
    # with 16 nodes on each piece of at most 4 radians
    pieces = 1 + math.ceil(f * t / 4)
    node, weight = np.polynomial.legendre.leggauss(16)
    node = (np.arange(pieces)[:, None] + (node + 1) / 2).ravel() / pieces
    weight = np.tile(weight, pieces) / (2 * pieces)
    later = (t - s) * node
    z = f * np.sqrt(later * (later + 2 * s))
    z[z == 0] = np.finfo(float).tiny
    swung = np.sum(j0(z) * weight * (t - s), axis=-1)
    swept = np.sum(f**2 * s * j1(z) / z * weight * (t - s), axis=-1)
    speed = gravity * eta0 / c
    u = np.where(inside, -speed * j0(f * np.sqrt(t**2 - s[..., 0] ** 2)), 0.0)
    v = np.where(inside, speed * f0 * swung, 0.0)
    eta = eta0 * np.sign(x) * np.where(inside, swept, 1.0)
    return u, v, eta
