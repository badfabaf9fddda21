"""The tables *Frame* and *Scales*."""

from __future__ import annotations

import math
from collections.abc import Iterator

from ..frame import PLANES
from ..theory import scales
from .facts import Facts
from .tables import Row, Table


def frame_table(facts: Facts) -> Table:
    """Say where the fluid lies, and how that place turns."""
    return Table("Frame", tuple(_frame_rows(facts)))


def scales_table(facts: Facts) -> Table:
    """Give the scales of the set-up, each with its formula."""
    return Table("Scales", tuple(_scale_rows(facts)))


def _frame_rows(facts: Facts) -> Iterator[Row]:
    frame = facts.frame
    yield Row("plane", frame.plane, note=PLANES[frame.plane].meaning)
    if frame.body is not None:
        yield Row("body", frame.body.name, note=frame.body.meaning)
    if frame.latitude is not None:
        shown = "" if frame.latitude else "0 deg"
        yield Row("latitude", frame.latitude, "rad", "geographic, north positive", shown=shown)
    if frame.rotation_rate:
        period = 2 * math.pi / abs(frame.rotation_rate)
        yield Row("rotation_period", period, "s", "2 pi/Omega, against the stars" if frame.body else "2 pi/Omega")
    if frame.plane != "none":
        given = facts.experiment.frame.f0 is not None
        formula = "given" if given else "2 Omega" if frame.plane == "tank" else "2 Omega sin(latitude)"
        yield Row("f0", frame.f0, "rad/s", formula)
    if frame.beta:
        given = facts.experiment.frame.beta is not None
        yield Row("beta", frame.beta, "1/m/s", "given" if given else "2 Omega cos(latitude)/R")
    yield Row("gravity", frame.gravity, "m/s^2", _gravity_note(facts))
    if facts.basin.gravity != frame.gravity:
        yield Row("reduced_gravity", facts.basin.gravity, "m/s^2", "given; the g of everything below")


def _gravity_note(facts: Facts) -> str:
    settings, frame = facts.experiment.frame, facts.frame
    if settings.gravity is not None:
        return "given"
    if frame.plane == "tank":
        return "standard gravity"
    return "of the level surface, centrifugal part included"


def _scale_rows(facts: Facts) -> Iterator[Row]:
    basin, frame = facts.basin, facts.frame
    depth, a = basin.reference_depth, basin.deformation_radius
    given = facts.experiment.layer.reference_depth is not None
    kind = "given" if given else "even" if basin.even else "mean"
    yield Row("depth", depth, "m", f"H, {kind}")
    yield Row("wave_speed", basin.wave_speed, "m/s", "c = sqrt(g H)")
    equatorial = frame.plane == "equatorial"
    if math.isfinite(a):
        yield Row("deformation_radius", a, "m", "a = sqrt(c/|beta|)" if equatorial else "a = c/|f0|")
    if facts.turning:
        formula = "2 pi/sqrt(c |beta|)" if equatorial else "2 pi/|f0|"
        yield Row("inertial_period", facts.inertial_period, "s", formula)
    length = facts.length
    if math.isfinite(length):
        yield Row("smallest_start_scale", length, "m", "L, of the start")
        yield Row("aspect_ratio", depth / length, "", "H/L")
        if math.isfinite(a):
            yield Row("burger_number", scales.burger_number(a, length), "", "(a/L)^2")
    yield from _flow_rows(facts)
    yield from _beta_rows(facts)


def _flow_rows(facts: Facts) -> Iterator[Row]:
    """What the start sets going."""
    if facts.start is None:
        return
    speed = facts.expected_speed
    yield Row("elevation", facts.elevation, "m", "largest at the start")
    yield Row("elevation_over_depth", facts.relative_elevation, "", "largest at the start")
    yield Row("speed", speed, "m/s", "U, largest at the start" if facts.speed else "U = c eta/H; the start is at rest")
    yield Row("froude_number", scales.froude_number(speed, facts.basin.wave_speed), "", "U/c")
    if facts.turning and math.isfinite(facts.length):
        f = "|beta| a" if facts.frame.plane == "equatorial" else "|f0|"
        yield Row("rossby_number", scales.rossby_number(speed, facts.length, facts.turning), "", f"U/({f} L)")


def _beta_rows(facts: Facts) -> Iterator[Row]:
    """How far the plane reaches on the body."""
    frame, reach = facts.frame, facts.northward_reach
    if frame.f0 and frame.sphere_beta:
        value = scales.beta_parameter(frame.sphere_beta, reach, frame.f0)
        yield Row("beta_parameter", value, "", "beta Y/|f0|, Y the reach along y from y0")
    if frame.beta and facts.start is not None and facts.expected_speed:
        yield Row("rhines_scale", scales.rhines_scale(facts.expected_speed, frame.beta), "m", "sqrt(U/|beta|)")
    if math.isfinite(frame.radius):
        yield Row("reach_over_radius", reach / frame.radius, "", "Y/R")
