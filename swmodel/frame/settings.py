"""`[frame]` as it is written, and everything that can be wrong with it."""

from __future__ import annotations

import math
from typing import Annotated, Literal

from pydantic import Field

from ..choices import Choice
from ..errors import Fault
from ..quantities import Acceleration, Angle, BetaRate, Length, Rate
from .planes import PLANES, at_pole

BodyName = Literal["earth", "mars", "jupiter", "saturn", "titan", "custom"]
PlaneName = Literal["f", "beta", "equatorial", "sine", "polar", "none", "tank"]


class FrameSettings(Choice):
    """`[frame]`: where on what body. What is given outright goes before the body's own."""

    body: Annotated[BodyName | None, Field(description='"earth" by default; none on a turntable')] = None
    latitude: Annotated[Angle | None, Field(description="geographic, north positive")] = None
    plane: Annotated[PlaneName, Field(description="how f varies over the domain")] = "f"
    y0: Annotated[Length | None, Field(description="y at which f = f0; by default the middle of the domain")] = None
    f0: Annotated[Rate | None, Field(description="Coriolis parameter outright, negative in the south")] = None
    beta: Annotated[BetaRate | None, Field(description="df/dy outright")] = None
    gravity: Annotated[Annotated[Acceleration, Field(gt=0)] | None, Field(description="gravity outright")] = None
    rotation_rate: Annotated[Rate | None, Field(description="turning of body or turntable, anticlockwise positive")] = (
        None
    )
    radius: Annotated[Annotated[Length, Field(gt=0)] | None, Field(description="radius of the body outright")] = None


def frame_faults(settings: FrameSettings) -> list[Fault]:
    """List whatever is wrong with `[frame]` as a whole, each fault keyed ``("frame", key)``."""
    faults = [
        Fault(("frame", key), f'plane = "{settings.plane}" takes no {key}', why, "leave it out")
        for key, why in PLANES[settings.plane].refuses.items()
        if getattr(settings, key) is not None
    ]
    refused = {fault.key[1] for fault in faults}
    faults += _latitude_faults(settings) if "latitude" not in refused else []
    faults += _outright_faults(settings)
    faults += _rotation_faults(settings) if "rotation_rate" not in refused else []
    faults += _custom_faults(settings) if "body" not in refused else []
    return faults


def _latitude_faults(settings: FrameSettings) -> list[Fault]:
    """Latitude out of range, or not at a pole where it must be."""
    key = ("frame", "latitude")
    latitude = settings.latitude
    if settings.plane == "polar":
        allowed = "90 deg or -90 deg"
        if latitude is None:
            return [Fault(key, 'plane = "polar" needs a latitude', allowed, "say which pole")]
        if not at_pole(latitude):
            found = f"{math.degrees(latitude):.6g} deg is not a pole"
            return [Fault(key, found, allowed, 'off the pole, choose plane = "beta" or "sine"')]
    elif latitude is not None and abs(latitude) > math.pi / 2 and not at_pole(latitude):
        return [
            Fault(key, f"{math.degrees(latitude):.6g} deg is no latitude", "-90 deg to 90 deg", "north is positive")
        ]
    return []


def _outright_faults(settings: FrameSettings) -> list[Fault]:
    """Latitude and f0, beta on the planes that take either."""
    if settings.plane == "equatorial" and settings.beta == 0:
        return [Fault(("frame", "beta"), "beta is 0", "a beta that is not 0", 'leave it out, or choose plane = "none"')]
    if settings.plane not in ("f", "beta", "sine"):
        return []
    needs_beta = settings.plane != "f"
    outright = "f0 and beta" if needs_beta else "f0"
    rule = f"latitude, or {outright} outright, never both"
    given = [key for key in ("f0", "beta") if getattr(settings, key) is not None and (key == "f0" or needs_beta)]
    if settings.latitude is not None:
        return [Fault(("frame", key), f"{key} is given beside latitude", rule, "leave one out") for key in given]
    if not given:
        return [Fault(("frame", "latitude"), f'plane = "{settings.plane}" needs a latitude', rule, "say where")]
    wanted = ("f0", "beta") if needs_beta else ("f0",)
    return [Fault(("frame", key), f"{key} is missing", rule, f"give {key} too") for key in wanted if key not in given]


def _rotation_faults(settings: FrameSettings) -> list[Fault]:
    """Turning that is missing, nothing, or of the wrong sign."""
    key = ("frame", "rotation_rate")
    rate = settings.rotation_rate
    if settings.plane == "tank":
        if rate is None:
            return [
                Fault(key, "a turntable needs its rotation_rate", "", 'for example "10 rpm"; clockwise is negative')
            ]
        if rate == 0:
            return [Fault(key, "the table does not turn", "a rate that is not 0", 'or choose plane = "none"')]
    elif rate is not None and rate <= 0:
        allowed = "a rate above 0: north is the pole about which the body turns anticlockwise"
        return [Fault(key, f"{rate:.6g} rad/s", allowed, "for the other hemisphere give a negative latitude")]
    return []


def _custom_faults(settings: FrameSettings) -> list[Fault]:
    """What a body of one's own must give outright."""
    if settings.body != "custom":
        return []
    wanted = ["gravity"]
    if settings.plane != "none":
        f_given = settings.f0 is not None or (settings.plane == "equatorial" and settings.beta is not None)
        if not f_given:
            wanted.append("rotation_rate")
        if settings.plane in ("sine", "polar") or (settings.plane in ("beta", "equatorial") and not f_given):
            wanted.append("radius")
    return [
        Fault(("frame", key), f'body = "custom" has no {key} of its own', "", f"give {key} outright")
        for key in wanted
        if getattr(settings, key) is None
    ]
