"""Keys that must agree with each other: a pass of its own, over every table that is right in itself."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from ..errors import Fault
from ..frame.settings import FrameSettings, frame_faults
from ..grid import EdgesSettings
from ..measures import ExpectSettings
from ..quantities import Measured, Percentage


def disagreements(tables: Mapping[str, Any]) -> list[Fault]:
    """Say which keys do not agree.

    Parameters
    ----------
    tables : mapping of str to settings
        The tables that are right in themselves; checks that need another one are left out.
    """
    return [fault for name, check in CHECKS if name in tables for fault in check(tables[name])]


def _edges(edges: EdgesSettings) -> list[Fault]:
    """A direction is periodic at both ends or at neither."""
    faults = []
    for pair in (("west", "east"), ("south", "north")):
        around = [name for name in pair if getattr(edges, name) == "periodic"]
        if len(around) == 1:
            (other,) = set(pair) - set(around)
            kind = getattr(edges, other)
            found = f'{other} is "{kind}", while {around[0]} is "periodic"'
            remedy = f'write {other} = "periodic", or {around[0]} = "{kind}"'
            faults.append(Fault(("edges", other), found, "a direction is periodic at both ends or at neither", remedy))
    return faults


def _frame(frame: FrameSettings) -> list[Fault]:
    """What each plane needs and refuses."""
    return frame_faults(frame)


def _expect(expect: Sequence[ExpectSettings]) -> list[Fault]:
    """A percentage of nothing is nothing."""
    return [
        Fault(
            ("expect", number, "within"),
            f'"{one.within.percent:g} %" of an expected value of 0 leaves no room',
            "a quantity of the dimension of the value",
        )
        for number, one in enumerate(expect)
        if isinstance(one.within, Percentage) and isinstance(one.value, Measured) and one.value.value == 0
    ]


CHECKS: tuple[tuple[str, Callable[[Any], list[Fault]]], ...] = (
    ("frame", _frame),
    ("edges", _edges),
    ("expect", _expect),
)
