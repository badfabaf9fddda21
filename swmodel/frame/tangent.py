"""The frame itself: f, beta and gravity of the plane on which the fluid lies."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ..errors import RequestError
from .bodies import BODIES, Body, Constant
from .coriolis import neglected_share
from .planes import PLANES
from .settings import FrameSettings, PlaneName, frame_faults

STANDARD_GRAVITY = Constant(9.80665, "m s-2", "CGPM 1901, third General Conference on Weights and Measures")


@dataclass(frozen=True)
class Frame:
    """A rotating plane.

    Parameters
    ----------
    plane : str
        Name in `PLANES`.
    body : Body or None
        The body; None on a turntable and for a body of one's own.
    latitude : float or None
        Geographic latitude of the line y = y0, rad, negative in the south; None where f was given outright, on a
        turntable and without rotation.
    f0 : float
        Coriolis parameter at y0, rad/s, with its sign.
    beta : float
        df/dy of this plane at y0, 1/(m s): 0 on `f`, `polar`, `none`, `tank`.
    gravity : float
        Gravity of the level surfaces, m s-2.
    rotation_rate : float
        Omega, rad/s: a magnitude for bodies, signed for a turntable (negative is clockwise), 0 without rotation. Where
        f was given outright for a body of one's own without its rotation rate, half the size of f0, as at a pole.
    radius : float
        Mean radius of the body, m; infinite where there is none.
    y0 : float
        y at which f = f0, m.
    """

    plane: PlaneName
    body: Body | None
    latitude: float | None
    f0: float
    beta: float
    gravity: float
    rotation_rate: float
    radius: float
    y0: float = 0.0

    def coriolis(self, x: ArrayLike, y: ArrayLike) -> NDArray[np.float64]:
        """Coriolis parameter at points, rad/s, in the shape to which x and y (m) broadcast."""
        here = PLANES[self.plane].coriolis
        points = np.asarray(x, np.float64), np.asarray(y, np.float64)
        return np.asarray(here(*points, self.f0, self.beta, self.y0, self.radius))

    @property
    def horizontal_coriolis(self) -> float:
        """F = 2 Omega cos(latitude) at y0, rad/s: the component that the traditional approximation leaves out."""
        if self.plane == "tank":
            return 0.0
        if self.latitude is not None:
            return 2 * self.rotation_rate * abs(math.cos(self.latitude))
        return math.sqrt(max((2 * self.rotation_rate) ** 2 - self.f0**2, 0.0))

    @property
    def sphere_beta(self) -> float:
        """df/dy on the body at y0, 1/(m s), whether the plane keeps it or not: F/R."""
        return self.horizontal_coriolis / self.radius

    def neglected_share(self, depth: float, length: float, deformation_radius: float) -> float:
        """Coriolis part left out by the traditional approximation over the part kept: (H/L) cot(latitude), positive.

        Parameters
        ----------
        depth, length : float
            H and L of the flow, m.
        deformation_radius : float
            a, m: on the equatorial plane f is taken at that distance from the equator, and cot(latitude) is R/a.
        """
        f = self.beta * deformation_radius if self.plane == "equatorial" else self.f0
        return neglected_share(depth, length, f, self.horizontal_coriolis)


def build_frame(settings: FrameSettings, middle_y: float = 0.0) -> Frame:
    """Make the frame that `[frame]` describes.

    Parameters
    ----------
    settings : FrameSettings
        As read.
    middle_y : float
        y of the middle of the domain, m: y0 where it is not given.

    Raises
    ------
    RequestError
        With every fault of the table at once, keyed ``("frame", key)``.
    """
    if faults := frame_faults(settings):
        raise RequestError(faults)
    y0 = settings.y0 if settings.y0 is not None else middle_y
    if settings.plane == "tank":
        assert settings.rotation_rate is not None  # frame_faults saw to it
        gravity = settings.gravity if settings.gravity is not None else STANDARD_GRAVITY.value
        Omega = settings.rotation_rate
        return Frame("tank", None, None, 2 * Omega, 0.0, gravity, Omega, math.inf)
    row = BODIES[settings.body or "earth"]
    body = row if isinstance(row, Body) else None
    latitude = 0.0 if settings.plane == "equatorial" else settings.latitude
    gravity = _gravity(settings, body, latitude)
    if settings.plane == "none":
        return Frame("none", body, None, 0.0, 0.0, gravity, 0.0, math.inf)
    radius = _first(settings.radius, body.mean_radius.value if body else None, math.inf)
    pole_rate = abs(settings.f0) / 2 if settings.f0 is not None else 0.0
    Omega = _first(settings.rotation_rate, body.rotation_rate.value if body else None, pole_rate)
    f0, beta = _f0_and_beta(settings, latitude, Omega, radius)
    return Frame(
        settings.plane, body, latitude, f0, beta, gravity, Omega, radius, 0.0 if settings.plane == "polar" else y0
    )


def _first(*values: float | None) -> float:
    """Return the first that is known."""
    return next(value for value in values if value is not None)


def _gravity(settings: FrameSettings, body: Body | None, latitude: float | None) -> float:
    """Gravity given outright, else the body's at the latitude, else its mean over the body."""
    if settings.gravity is not None or body is None:
        return _first(settings.gravity)
    return body.mean_gravity if latitude is None else body.gravity(latitude)


def _f0_and_beta(
    settings: FrameSettings, latitude: float | None, rotation_rate: float, radius: float
) -> tuple[float, float]:
    """Return f and its slope at y0: given outright, or of the latitude; the slope is 0 on planes that have none."""
    if latitude is None:
        return _first(settings.f0), _first(settings.beta, 0.0)
    f0 = 2 * rotation_rate * math.sin(latitude)
    sloping = settings.plane in ("beta", "equatorial", "sine")
    beta = 2 * rotation_rate * math.cos(latitude) / radius if sloping else 0.0
    return f0, beta if settings.beta is None else settings.beta
