"""Scales of a rotating layer: speeds, lengths, times and the ratios that say what rotation does.

Where nothing turns (f0 = 0) a scale that needs rotation is infinite.
"""

from __future__ import annotations

import math

from ..errors import Fault, RequestError


def gravity_wave_speed(gravity: float, depth: float) -> float:
    """Speed of long gravity waves, c = sqrt(g H), m/s.

    Parameters
    ----------
    gravity : float
        g, or the reduced gravity of a layer over or under a deep resting one, m s-2.
    depth : float
        H, m.
    """
    if not (gravity > 0 and depth > 0):
        raise RequestError(Fault((), f"gravity {gravity:g} m/s^2 and depth {depth:g} m", "both above 0"))
    return math.sqrt(gravity * depth)


def deformation_radius(gravity: float, depth: float, f0: float, beta: float = 0.0) -> float:
    """Rossby's radius of deformation a = c/|f0|, m; where f0 = 0 but f varies, the equatorial one sqrt(c/|beta|).

    Parameters
    ----------
    gravity, depth : float
        g in m s-2 and H in m.
    f0 : float
        Coriolis parameter, rad/s, of either sign.
    beta : float
        df/dy, 1/(m s).

    Notes
    -----
    Source: Rossby 1938; Gill 1982, chapters 7 and 11.
    """
    c = gravity_wave_speed(gravity, depth)
    if f0 == 0:
        return math.sqrt(c / abs(beta)) if beta else math.inf
    return c / abs(f0)


def inertial_frequency(f0: float) -> float:
    """Frequency of inertial oscillations |f0|, rad/s."""
    return abs(f0)


def inertial_turning(f0: float) -> float:
    """Rate at which the velocity vector of an inertial oscillation turns, -f0, rad/s: negative is clockwise."""
    return -f0


def inertial_period(f0: float) -> float:
    """2 pi/|f0|, s."""
    return 2 * math.pi / abs(f0) if f0 else math.inf


def rossby_number(speed: float, length: float, f0: float) -> float:
    """Ro = U/(|f0| L): inertia over rotation."""
    return speed / (abs(f0) * length) if f0 else math.inf


def burger_number(radius: float, length: float) -> float:
    """Bu = (a/L)^2 with a the deformation radius: stratification or gravity over rotation."""
    return (radius / length) ** 2


def froude_number(speed: float, wave_speed: float) -> float:
    """Fr = U/c."""
    return speed / wave_speed


def beta_parameter(beta: float, length: float, f0: float) -> float:
    """|beta| L/|f0|: how much f changes over L against itself."""
    return abs(beta) * length / abs(f0) if f0 else math.inf


def rhines_scale(speed: float, beta: float) -> float:
    """sqrt(U/|beta|), m: where waves take over from turbulence (Rhines 1975, J. Fluid Mech. 69)."""
    return math.sqrt(speed / abs(beta)) if beta else math.inf
