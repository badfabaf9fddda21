"""The geopotential of a turning body: attraction and centrifugal part, its level surfaces, and gravity on them.

Phi = -(G M / r) [1 - J2 (R/r)^2 P2(sin theta) - J4 (R/r)^4 P4(sin theta)] - Omega^2 r^2 cos(theta)^2 / 2

with r the distance from the centre, theta the geocentric latitude, Pn the Legendre polynomials and R the radius to
which J2 and J4 refer. Gravity is -grad Phi; fluid at rest in the turning frame has a level surface of Phi as its
surface, so the centrifugal force appears in no equation of motion along it (Gill 1982, section 4.5.1).
"""

from __future__ import annotations

import math


def geopotential(
    r: float,
    latitude: float,
    *,
    GM: float,
    rotation_rate: float,
    reference_radius: float = 1.0,
    J2: float = 0.0,
    J4: float = 0.0,
) -> float:
    """Geopotential of a turning body, m2 s-2; it grows upward.

    Parameters
    ----------
    r : float
        Distance from the centre, m.
    latitude : float
        Geocentric latitude, rad.
    GM : float
        Gravitational parameter, m3 s-2.
    rotation_rate : float
        Omega, rad/s.
    reference_radius : float
        Radius to which J2 and J4 refer, m; of no account where both are 0.
    J2, J4 : float
        Zonal harmonics of the attraction; 0 and 0 is a point mass.

    Notes
    -----
    Source: Heiskanen & Moritz 1967, Physical Geodesy, sections 2-5 and 2-9.
    """
    sin2 = math.sin(latitude) ** 2
    P2 = (3 * sin2 - 1) / 2
    P4 = (35 * sin2**2 - 30 * sin2 + 3) / 8
    ratio2 = (reference_radius / r) ** 2
    attraction = -GM / r * (1 - J2 * ratio2 * P2 - J4 * ratio2**2 * P4)
    centrifugal = -((rotation_rate * r * math.cos(latitude)) ** 2) / 2
    return attraction + centrifugal


def level_radius(
    latitude: float,
    *,
    equatorial_radius: float,
    GM: float,
    rotation_rate: float,
    reference_radius: float = 1.0,
    J2: float = 0.0,
    J4: float = 0.0,
) -> float:
    """Distance from the centre of the level surface that passes through the equator at `equatorial_radius`, m.

    Parameters
    ----------
    latitude : float
        Geocentric latitude, rad, of either sign.
    equatorial_radius : float
        Distance of the surface from the centre at the equator, m.
    GM, rotation_rate, reference_radius, J2, J4 : float
        As in `geopotential`.

    Raises
    ------
    ValueError
        Where no such surface lies between half and one and a half of the equatorial radius: the body turns too fast.
    """
    from scipy.optimize import brentq

    def above(r: float, at: float) -> float:
        return geopotential(r, at, GM=GM, rotation_rate=rotation_rate, reference_radius=reference_radius, J2=J2, J4=J4)

    level = above(equatorial_radius, 0.0)
    # rounding of Phi limits the radius to some 1e-16 of itself: ask for no more
    return float(
        brentq(
            lambda r: above(r, latitude) - level,
            0.5 * equatorial_radius,
            1.5 * equatorial_radius,
            xtol=1e-14 * equatorial_radius,
        )
    )


def equator_gravity(
    equatorial_radius: float, *, GM: float, rotation_rate: float, reference_radius: float, J2: float, J4: float
) -> float:
    """Gravity at the equator, m s-2: dPhi/dr at latitude 0, where P2 = -1/2 and P4 = 3/8."""
    ratio2 = (reference_radius / equatorial_radius) ** 2
    attraction = GM / equatorial_radius**2 * (1 + 3 / 2 * J2 * ratio2 - 15 / 8 * J4 * ratio2**2)
    return attraction - rotation_rate**2 * equatorial_radius


def pole_gravity(polar_radius: float, *, GM: float, reference_radius: float, J2: float, J4: float) -> float:
    """Gravity at a pole, m s-2: dPhi/dr at latitude 90 deg, where P2 = P4 = 1."""
    ratio2 = (reference_radius / polar_radius) ** 2
    return GM / polar_radius**2 * (1 - 3 * J2 * ratio2 - 5 * J4 * ratio2**2)


def normal_gravity(
    latitude: float, *, equatorial_radius: float, polar_radius: float, at_equator: float, at_pole: float
) -> float:
    """Gravity on a level spheroid at a geographic latitude, m s-2.

    Parameters
    ----------
    latitude : float
        Geographic latitude (angle of the vertical with the equator's plane), rad.
    equatorial_radius, polar_radius : float
        Semi-axes of the spheroid, m.
    at_equator, at_pole : float
        Gravity there, m s-2.

    Notes
    -----
    Closed formula of Somigliana (1929); NIMA TR8350.2 (2000), eq. 4-1.
    """
    cos2, sin2 = math.cos(latitude) ** 2, math.sin(latitude) ** 2
    a, b = equatorial_radius, polar_radius
    return (a * at_equator * cos2 + b * at_pole * sin2) / math.sqrt(a**2 * cos2 + b**2 * sin2)
