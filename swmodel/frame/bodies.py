"""Planets and moons: constants with unit and source, gravity at a latitude, the level surface.

Rotation rates are magnitudes: north is the pole about which a body turns anticlockwise, so f is positive in every
body's northern hemisphere. (For all bodies below this is also the north of the IAU.) Titan turns synchronously.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .geopotential import equator_gravity, level_radius, normal_gravity, pole_gravity

_WGS84 = "WGS 84: NIMA TR8350.2, third edition, 2000"
_IAU2015 = "IAU WGCCRE 2015: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22"
_DAY = 86400.0  # s


@dataclass(frozen=True)
class Constant:
    """A published number.

    Parameters
    ----------
    value : float
        Its value in `unit`.
    unit : str
        SI unit.
    source : str
        Where it was published, and how it was derived where it was.
    """

    value: float
    unit: str
    source: str


@dataclass(frozen=True)
class Body:
    """A body that turns, and its level spheroid.

    Parameters
    ----------
    name, meaning, source : str
        Name, one line on what it is, and the sources in short.
    rotation_rate : Constant
        Omega, rad/s, a magnitude.
    GM : Constant
        Gravitational parameter, m3 s-2.
    J2, J4 : Constant
        Zonal harmonics of the attraction.
    reference_radius : Constant
        Radius to which the harmonics refer, m.
    equatorial_radius, polar_radius, mean_radius : Constant
        Of the surface (giant planets: of the 1 bar level), m.
    published_gravity : tuple of Constant or None
        Gravity at equator and pole where it is published with the spheroid; else it is derived.
    """

    name: str
    meaning: str
    source: str
    rotation_rate: Constant
    GM: Constant
    J2: Constant
    J4: Constant
    reference_radius: Constant
    equatorial_radius: Constant
    polar_radius: Constant
    mean_radius: Constant
    published_gravity: tuple[Constant, Constant] | None = None

    @cached_property
    def equator_and_pole_gravity(self) -> tuple[float, float]:
        """Gravity at the equator and at the poles, m s-2: published, or -grad Phi at the two radii."""
        if self.published_gravity:
            return self.published_gravity[0].value, self.published_gravity[1].value
        GM, R = self.GM.value, self.reference_radius.value
        J2, J4 = self.J2.value, self.J4.value
        at_equator = equator_gravity(
            self.equatorial_radius.value,
            GM=GM,
            rotation_rate=self.rotation_rate.value,
            reference_radius=R,
            J2=J2,
            J4=J4,
        )
        return at_equator, pole_gravity(self.polar_radius.value, GM=GM, reference_radius=R, J2=J2, J4=J4)

    def gravity(self, latitude: float) -> float:
        """Gravity on the level spheroid at a geographic latitude, m s-2; the same north and south."""
        at_equator, at_pole = self.equator_and_pole_gravity
        return normal_gravity(
            latitude,
            equatorial_radius=self.equatorial_radius.value,
            polar_radius=self.polar_radius.value,
            at_equator=at_equator,
            at_pole=at_pole,
        )

    @cached_property
    def mean_gravity(self) -> float:
        """Mean gravity over the area of the level spheroid, m s-2: for a frame that stands at no latitude."""
        a, b = self.equatorial_radius.value, self.polar_radius.value
        # 32 Gauss points over a hemisphere: the integrand is smooth, Saturn's flattening leaves no error above 1e-14
        node, weight = np.polynomial.legendre.leggauss(32)
        latitude = math.pi / 4 * (node + 1)
        # area of a zone of the spheroid: meridional times prime-vertical radius of curvature times cos(latitude)
        zone = weight * np.cos(latitude) / (a**2 * np.cos(latitude) ** 2 + b**2 * np.sin(latitude) ** 2) ** 2
        return float(np.dot(zone, [self.gravity(at) for at in latitude]) / zone.sum())

    def level_radius(self, latitude: float, *, harmonics: int = 4) -> float:
        """Distance from the centre of the level surface through the equator, at a geocentric latitude, m.

        Parameters
        ----------
        latitude : float
            Geocentric latitude, rad.
        harmonics : int
            0: a point mass; 2: with J2; 4: with J2 and J4.
        """
        return level_radius(
            latitude,
            equatorial_radius=self.equatorial_radius.value,
            GM=self.GM.value,
            rotation_rate=self.rotation_rate.value,
            reference_radius=self.reference_radius.value,
            J2=self.J2.value if harmonics >= 2 else 0.0,
            J4=self.J4.value if harmonics >= 4 else 0.0,
        )


@dataclass(frozen=True)
class CustomBody:
    """A body of one's own: nothing is known of it but what the frame gives outright."""

    name: str = "custom"
    meaning: str = "a body of your own: gravity, rotation_rate and radius are given outright"
    source: str = "the configuration"


def _degrees_a_day(rate: float, source: str) -> Constant:
    """Rotation rate from the published degrees a day (of 86 400 s)."""
    return Constant(math.radians(rate) / _DAY, "rad/s", f"{rate} deg a day of 86 400 s; {source}")


_A, _INVERSE_FLATTENING, _C20 = 6378137.0, 298.257223563, -0.484166774985e-3
_B = _A * (1 - 1 / _INVERSE_FLATTENING)

EARTH = Body(
    name="earth",
    meaning="Earth, the WGS 84 spheroid",
    source=_WGS84,
    rotation_rate=Constant(7.292115e-5, "rad/s", _WGS84),
    GM=Constant(3.986004418e14, "m3 s-2", f"{_WGS84} (with the atmosphere)"),
    J2=Constant(-math.sqrt(5) * _C20, "1", f"-sqrt(5) C20, C20 = {_C20} fully normalised; {_WGS84}"),
    J4=Constant(-2.37e-6, "1", "of the WGS 84 normal field, to three digits; value from memory"),
    reference_radius=Constant(_A, "m", _WGS84),
    equatorial_radius=Constant(_A, "m", _WGS84),
    polar_radius=Constant(_B, "m", f"a (1 - 1/{_INVERSE_FLATTENING}), a = {_A} m; {_WGS84}"),
    mean_radius=Constant((2 * _A + _B) / 3, "m", f"(2 a + b)/3; {_WGS84}"),
    published_gravity=(Constant(9.7803253359, "m s-2", _WGS84), Constant(9.8321849378, "m s-2", _WGS84)),
)

MARS = Body(
    name="mars",
    meaning="Mars, its mean spheroid",
    source=f"{_IAU2015}; Konopliv et al. 2016, Icarus 274",
    rotation_rate=_degrees_a_day(350.891982443297, _IAU2015),
    GM=Constant(4.282837e13, "m3 s-2", "Konopliv et al. 2016, Icarus 274; value from memory"),
    J2=Constant(1.9566e-3, "1", "Konopliv et al. 2016, Icarus 274; value from memory"),
    J4=Constant(-1.54e-5, "1", "Konopliv et al. 2016, Icarus 274; value from memory"),
    reference_radius=Constant(3.396e6, "m", "Konopliv et al. 2016, Icarus 274; value from memory"),
    equatorial_radius=Constant(3396.19e3, "m", _IAU2015),
    polar_radius=Constant(
        (3373.19e3 + 3379.21e3) / 2, "m", f"mean of north 3373.19 km and south 3379.21 km; {_IAU2015}"
    ),
    mean_radius=Constant(3389.50e3, "m", _IAU2015),
)

JUPITER = Body(
    name="jupiter",
    meaning="Jupiter at the 1 bar level, turning with its magnetic field (System III)",
    source=f"{_IAU2015}; Iess et al. 2018, Nature 555",
    rotation_rate=_degrees_a_day(870.5360000, _IAU2015),
    GM=Constant(1.26686532e17, "m3 s-2", "the planet without its moons, JPL; value from memory"),
    J2=Constant(1.469657e-2, "1", "Iess et al. 2018, Nature 555; value from memory"),
    J4=Constant(-5.8661e-4, "1", "Iess et al. 2018, Nature 555; value from memory"),
    reference_radius=Constant(71492e3, "m", "Iess et al. 2018, Nature 555; value from memory"),
    equatorial_radius=Constant(71492e3, "m", _IAU2015),
    polar_radius=Constant(66854e3, "m", _IAU2015),
    mean_radius=Constant(69911e3, "m", _IAU2015),
)

SATURN = Body(
    name="saturn",
    meaning="Saturn at the 1 bar level, turning with its radio period (System III)",
    source=f"{_IAU2015}; Iess et al. 2019, Science 364",
    rotation_rate=_degrees_a_day(810.7939024, _IAU2015),
    GM=Constant(3.7931206e16, "m3 s-2", "the planet without its moons, JPL; value from memory"),
    J2=Constant(1.629057e-2, "1", "Iess et al. 2019, Science 364; value from memory"),
    J4=Constant(-9.3531e-4, "1", "Iess et al. 2019, Science 364; value from memory"),
    reference_radius=Constant(60330e3, "m", "Iess et al. 2019, Science 364; value from memory"),
    equatorial_radius=Constant(60268e3, "m", _IAU2015),
    polar_radius=Constant(54364e3, "m", _IAU2015),
    mean_radius=Constant(58232e3, "m", _IAU2015),
)

TITAN = Body(
    name="titan",
    meaning="Titan, which turns once an orbit round Saturn (15.9 days)",
    source=f"{_IAU2015}; Durante et al. 2019, Icarus 326",
    rotation_rate=_degrees_a_day(22.5769768, _IAU2015),
    GM=Constant(8.97814e12, "m3 s-2", "Durante et al. 2019, Icarus 326; value from memory"),
    J2=Constant(3.31e-5, "1", "Durante et al. 2019, Icarus 326; value from memory"),
    J4=Constant(0.0, "1", "below 2e-6 in size and left out; Durante et al. 2019, Icarus 326, value from memory"),
    reference_radius=Constant(2575e3, "m", "Durante et al. 2019, Icarus 326; value from memory"),
    equatorial_radius=Constant(
        (2575.15e3 + 2574.78e3) / 2, "m", f"mean of the two equatorial semi-axes 2575.15 km and 2574.78 km; {_IAU2015}"
    ),
    polar_radius=Constant(2574.47e3, "m", _IAU2015),
    mean_radius=Constant(2574.73e3, "m", _IAU2015),
)

BODIES: dict[str, Body | CustomBody] = {
    "earth": EARTH,
    "mars": MARS,
    "jupiter": JUPITER,
    "saturn": SATURN,
    "titan": TITAN,
    "custom": CustomBody(),
}
