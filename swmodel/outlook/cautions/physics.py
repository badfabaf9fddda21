"""Cautions: approximations that the equations rest on."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from ...quantities import format_quantity
from ..facts import Facts
from .base import Caution

SMALL = 0.1  # elevation over depth: what theory for small waves leaves out is of that size
THIN = 0.05  # H/L and (H/L) |cot latitude|: what they leave out is then 5 % at most


def elevation_not_small(facts: Facts) -> Iterator[Caution]:
    """Elevation that is no small part of the depth."""
    share = facts.relative_elevation
    if share <= SMALL:
        return
    if facts.linear:
        yield Caution(
            "the elevation is not small against the depth",
            f"it is {share:.2g} of it, and the linear equations leave that out",
            "linear = false, or a smaller amplitude",
        )
    else:
        yield Caution(
            "the elevation is not small against the depth",
            f"it is {share:.2g} of it: crests run faster than troughs and steepen, and theory for small waves is off "
            "by about as much",
            "a smaller amplitude, or a deeper layer, unless that is what is asked",
        )


def swift_flow(facts: Facts) -> Iterator[Caution]:
    """A flow faster than its waves."""
    froude = facts.speed / facts.basin.wave_speed
    if not facts.linear and froude > 1:
        yield Caution(
            "the flow is faster than its waves",
            f"the Froude number U/c is {froude:.2g}: bores may form, which no scheme here can hold",
            "a slower flow or a deeper layer",
        )


def hydrostatic_doubtful(facts: Facts) -> Iterator[Caution]:
    """A layer that is not thin."""
    ratio = facts.basin.reference_depth / facts.length
    if ratio > THIN and math.isfinite(facts.length):
        yield Caution(
            "the hydrostatic approximation is doubtful",
            f"H/L = {ratio:.2g}, above {THIN:g}, with L = {format_quantity(facts.length, 'm')}",
            "a larger scale, or a shallower layer",
        )


def traditional_doubtful(facts: Facts) -> Iterator[Caution]:
    """The Coriolis part of cos(latitude), left out, that is no small part of what is kept."""
    basin, frame = facts.basin, facts.frame
    if not math.isfinite(facts.length) or frame.plane in ("none", "tank"):
        return
    share = frame.neglected_share(basin.reference_depth, facts.length, basin.deformation_radius)
    if share > THIN:
        cot = "R/a" if frame.plane == "equatorial" else "|cot(latitude)|"
        yield Caution(
            "the traditional approximation is doubtful",
            f"(H/L) {cot} = {share:.2g}, above {THIN:g}: the Coriolis part of cos(latitude) is left out",
            "a larger scale, a shallower layer, or a higher latitude",
        )


def at_rest(facts: Facts) -> Iterator[Caution]:
    """Nothing that could move."""
    if facts.start is not None and facts.speed == 0 and float(np.ptp(facts.start.eta)) == 0:
        yield Caution("nothing will move", "the start is at rest and level, and nothing drives it", "give a [[start]]")
