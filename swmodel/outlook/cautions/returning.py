"""Cautions: fast waves that come back."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from ...quantities import format_quantity
from .. import returns
from ..facts import Direction, Facts
from ..tables import listed
from .base import Caution


def waves_return(facts: Facts) -> Iterator[Caution]:
    """Fast waves that are back before the end: round a periodic direction, or from a wall."""
    if facts.start is None or facts.only_waves:
        return
    ways = []
    for direction in facts.varying:
        back = returns.return_time(facts, direction)
        if back < facts.until:
            size, time = format_quantity(facts.size(direction), "m"), format_quantity(back, "s")
            way = (
                f"come round {size} along {direction}"
                if facts.periodic(direction)
                else f"return from walls along {direction}"
            )
            ways.append(f"{way} within {time}")
    if not ways:
        return
    why = f"at {format_quantity(facts.fastest_wave, 'm/s')} they {listed(ways)}, while the run lasts "
    why += format_quantity(facts.until, "s")
    if facts.balanced:
        why += ", though a balanced start sends out few"
    remedy = "a larger domain, or measure before, unless the domain's own oscillations are meant"
    yield Caution("fast waves are back before the end", why, remedy)


def windows_after_return(facts: Facts) -> Iterator[Caution]:
    """Expectations that look at a place after waves are back there."""
    if facts.start is None or facts.only_waves or facts.balanced:
        return
    late = [
        (number, *seen) for number, expect in enumerate(facts.experiment.expect, 1) if (seen := _late(facts, expect))
    ]
    if late:
        numbers = listed([str(number) for number, *_ in late])
        plural = len(late) > 1
        times = [
            f"after {format_quantity(back, 's')} along {direction}, seen until {format_quantity(end, 's')}"
            + (f" by {number}" if plural else "")
            for number, direction, back, end in late
        ]
        yield Caution(
            f"expectation{'s' * plural} {numbers} look{'s' * (not plural)} on after fast waves are back",
            f"at {'their places' if plural else 'its place'} they are back {listed(times)}",
            "an earlier window or a larger domain, unless the domain's own oscillations are meant",
        )


def _late(facts: Facts, expect: Any) -> tuple[Direction, float, float] | None:
    """Direction and time of the first return to where an expectation looks, and until when it looks; None if before."""
    if getattr(expect.measure, "kind", "") == "change" or not facts.varying:
        return None
    end = returns.window_end(expect.measure, facts.until)
    backs = {}
    for direction in facts.varying:
        faces = facts.grid.x_face if direction == "x" else facts.grid.y_face
        backs[direction] = returns.return_time(facts, direction, returns.region_of(expect.measure, direction, faces))
    first = min(backs, key=lambda direction: backs[direction])
    return (first, backs[first], end) if backs[first] < end else None
