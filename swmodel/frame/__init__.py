"""The rotating frame: bodies, gravity and geopotential, the Coriolis acceleration, and the planes that stand for them.

The frame turns with angular velocity Omega. On the plane tangent at geographic latitude phi0 the Coriolis parameter is
f0 = 2 Omega sin(phi0), negative in the southern hemisphere, and its northward slope beta = 2 Omega cos(phi0)/R, with R
the body's mean radius. Gravity holds the attraction and the centrifugal part.
"""

from .bodies import BODIES, Body, Constant, CustomBody
from .coriolis import coriolis_acceleration, neglected_share, traditional_acceleration
from .geopotential import geopotential, level_radius, normal_gravity
from .planes import PLANES, Plane
from .settings import FrameSettings, frame_faults
from .tangent import STANDARD_GRAVITY, Frame, build_frame

__all__ = [
    "BODIES",
    "PLANES",
    "STANDARD_GRAVITY",
    "Body",
    "Constant",
    "CustomBody",
    "Frame",
    "FrameSettings",
    "Plane",
    "build_frame",
    "coriolis_acceleration",
    "frame_faults",
    "geopotential",
    "level_radius",
    "neglected_share",
    "normal_gravity",
    "traditional_acceleration",
]
