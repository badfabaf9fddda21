"""Cautions: the plane, and whether rotation matters on it."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from ...quantities import format_quantity
from ...theory import scales
from ..facts import DIRECTIONS, Facts
from .base import Caution

SMALL = 0.1  # beta Y/|f0|: what an f-plane leaves out is of that size
BETA_STRETCHED = 0.5  # beta Y/|f0|: beyond it f doubles or halves, and is no small change of f0
REACH_STRETCHED = 0.2  # Y/R: distances on the sphere differ by (Y/R)^2/2 = 2 % from there on
LARGE_ROSSBY = 1.0  # inertia and rotation are then equal
SHORT = 1.0  # inertial periods: rotation has then not turned a flow once


def plane_stretched(facts: Facts) -> Iterator[Caution]:
    """A plane that reaches too far on the body."""
    frame, reach = facts.frame, facts.northward_reach
    if frame.plane in ("none", "tank") or not math.isfinite(frame.radius):
        return
    change = scales.beta_parameter(frame.sphere_beta, reach, frame.f0)
    shown = f"{format_quantity(reach, 'm')} from y0"
    if frame.plane == "f" and "y" in facts.varying and change > SMALL:
        yield Caution(
            "the f-plane is stretched",
            f"f changes by beta Y/|f0| = {change:.2g} of itself up to {shown}, and stays f0 here",
            'plane = "beta" or "sine", or a smaller domain',
        )
    if frame.plane == "beta" and change > BETA_STRETCHED:
        yield Caution(
            "the beta-plane is stretched",
            f"f changes by beta Y/|f0| = {change:.2g} of itself up to {shown}",
            'plane = "sine", or a smaller domain',
        )
    across = 0.0 if facts.grid.periodic_x or "x" not in facts.varying else facts.grid.Lx / 2
    far = max(reach if "y" in facts.varying else 0.0, across)
    if (share := far / frame.radius) > REACH_STRETCHED:
        radius = format_quantity(frame.radius, "m")
        yield Caution(
            "the plane is stretched over the sphere",
            f"it reaches {format_quantity(far, 'm')}, {share:.2g} of the radius of {radius}: distances are off "
            f"by some {100 * share**2 / 2:.2g} %",
            "a smaller domain",
        )


def f_changes_sign(facts: Facts) -> Iterator[Caution]:
    """Another hemisphere within the domain, on a plane of one."""
    frame, f = facts.frame, facts.basin.f
    low, high = float(f.min()), float(f.max())
    if frame.plane == "equatorial" or frame.f0 == 0 or low * high >= 0:
        return
    south, north = format_quantity(low, "rad/s"), format_quantity(high, "rad/s")
    yield Caution(
        "f changes its sign within the domain",
        f"it goes from {south} to {north} on the plane of one hemisphere",
        'a smaller domain; for the equator plane = "equatorial"',
    )


def f_jumps_round(facts: Facts) -> Iterator[Caution]:
    """F that differs at the two ends of a periodic direction."""
    f = facts.basin.f
    for direction in DIRECTIONS:
        first, last = (f[:, 0], f[:, -1]) if direction == "x" else (f[0], f[-1])
        jump = float(np.abs(last - first).max())
        if facts.periodic(direction) and jump > 1e-9 * float(np.abs(f).max()):
            yield Caution(
                f"f is not periodic along {direction}, though the domain is",
                f"it jumps by {format_quantity(jump, 'rad/s')} where {direction} comes round, "
                "as a step of the planetary vorticity does",
                "walls there",
            )


def rotation_negligible(facts: Facts) -> Iterator[Caution]:
    """Rotation that has no time, or is too weak, to matter."""
    if not facts.turning:
        return
    periods = facts.until / facts.inertial_period
    if periods < SHORT:
        yield Caution(
            "the run is short against the inertial period",
            f"{format_quantity(facts.until, 's')} are {periods:.2g} of {format_quantity(facts.inertial_period, 's')}: "
            "rotation has hardly acted",
            "run longer, if rotation is to be seen",
        )
    if facts.linear or facts.start is None or not math.isfinite(facts.length):
        return
    rossby = scales.rossby_number(facts.expected_speed, facts.length, facts.turning)
    if rossby > LARGE_ROSSBY:
        yield Caution(
            "rotation is weak against inertia",
            f"the Rossby number U/(|f| L) is {rossby:.2g}, with U = {format_quantity(facts.expected_speed, 'm/s')} and "
            f"L = {format_quantity(facts.length, 'm')}",
            "a slower or larger flow, if rotation is to be seen",
        )
