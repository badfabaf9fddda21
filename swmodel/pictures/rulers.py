"""Axes and numbers: units by size, round ticks, edges that show what they are, powers of ten set as one reads them."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import ArrayLike

from .colours import FAINT, INK

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from ..diagnostics.derived import Side

DAY = 86400.0
NO_BREAK = "\u00a0"
RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")

# for each SI unit: from this size on, and how much of the SI unit the written one is; the largest first
_WRITTEN: dict[str, tuple[tuple[float, float, str], ...]] = {
    "m": ((2000.0, 1000.0, "km"), (0.5, 1.0, "m"), (0.005, 0.01, "cm"), (0.00005, 0.001, "mm")),
    "s": ((2 * DAY, DAY, "day"), (7200.0, 3600.0, "h"), (120.0, 60.0, "min"), (0.5, 1.0, "s")),
    "m/s": ((0.15, 1.0, "m/s"), (0.0015, 0.01, "cm/s"), (0.000015, 0.001, "mm/s")),
}
_DECADE = (1.0, 2.0, 5.0)
_CLOCK = {
    "h": (0.25, 0.5, 1.0, 2.0, 3.0, 6.0, 12.0, 24.0, 48.0),
    "min": (0.5, 1.0, 2.0, 5.0, 10.0, 15.0, 20.0, 30.0, 60.0),
}
_ROUND = (1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0)


@dataclass(frozen=True)
class Unit:
    """The unit in which values are written.

    Parameters
    ----------
    size : float
        How much of the SI unit it is.
    name : str
        As it is written; empty for a pure number.
    """

    size: float
    name: str

    def label(self, text: str) -> str:
        """Return the label of an axis."""
        return f"{text} ({self.name})" if self.name else text

    def text(self, value: float, digits: int = 3) -> str:
        """Write an SI value in this unit with so many digits; number and unit do not part at the end of a line."""
        return self.after(number(value / self.size, digits))

    def after(self, numbers: str) -> str:
        """Write the unit after a number, or numbers in brackets; 0 needs no power of ten."""
        name = re.sub(r"^10[⁻⁰¹²³⁴-⁹]+ ?", "", self.name) if numbers == "0" else self.name
        link = "·" if name.startswith("10") else NO_BREAK
        return f"{numbers}{link}{name}".replace(" ", NO_BREAK) if name else numbers


def unit_for(values: ArrayLike, unit: str) -> Unit:
    """Choose the unit in which values are best written: the largest magnitude counts.

    Parameters
    ----------
    values : array_like
        In the SI unit; what is not finite does not count.
    unit : str
        SI unit, ``"1"`` or empty for pure numbers.
    """
    sizes = np.abs(np.asarray(values, np.float64))
    largest = float(np.max(sizes, where=np.isfinite(sizes), initial=0.0))
    name = "" if unit == "1" else unit
    known = _WRITTEN.get(unit, ((0.05, 1.0, name),))
    if largest == 0:
        return Unit(1.0, typeset(name))
    for least, size, written in known:
        if least <= largest < 1e5 * size:
            return Unit(size, typeset(written))
    if largest >= known[0][0] and known[0][2] != name:
        return Unit(known[0][1], typeset(known[0][2]))
    power = 3 * math.floor(math.log10(largest) / 3)
    return Unit(10.0**power, f"{power_of_ten(power)} {typeset(name)}".strip())


def written(value: float, unit: str, digits: int = 3) -> str:
    """Write an SI value in the unit that suits it.

    Parameters
    ----------
    value : float
        In the SI unit.
    unit : str
        SI unit, ``"1"`` or empty for a pure number.
    digits : int
        Significant digits.
    """
    suited = unit_for(value, unit)
    if suited.name.startswith("10"):
        suited = Unit(1.0, "" if unit == "1" else typeset(unit))
    return suited.text(value, digits)


def typeset(unit: str) -> str:
    """Write the powers of a unit raised: ``m/s^2`` as m/s²."""
    return re.sub(r"\^(-?\d+)", lambda found: found[1].translate(RAISED), unit)


def power_of_ten(power: int) -> str:
    """Write 10 to a power."""
    return "10" + str(power).translate(RAISED)


def number(value: float, digits: int = 2) -> str:
    """Write a pure number with so many digits: 0.034, −3.1·10⁻¹⁰."""
    if value == 0 or not math.isfinite(value):
        return f"{value:g}"
    mantissa, power = f"{value:.{digits - 1}e}".split("e")
    if -3 <= int(power) < 6:
        return with_sign(f"{float(f'{value:.{digits}g}'):.10g}")
    return with_sign(f"{float(mantissa):g}·{power_of_ten(int(power))}")


def with_sign(text: str) -> str:
    """Write the minus of a number as the sign that it is."""
    return re.sub(r"(?<![\w.])-(?=\d)", "−", text)


def round_up(size: float) -> float:
    """Return the round number next above a size; of zero, one."""
    if not size > 0:
        return 1.0
    decade = 10.0 ** math.floor(math.log10(size))
    # a size that is round but for round-off stays
    return next(step * decade for step in _ROUND if step * decade >= size * (1 - 1e-9))


def tick_step(span: float, count: float, unit: str) -> float:
    """Return the distance between ticks: round, and at most about `count` of them over the span.

    Hours and minutes are divided as clocks are.
    """
    least = span / max(count, 1.0)
    for step in _CLOCK.get(unit, ()):
        if step >= least:
            return step
    decade = 10.0 ** math.floor(math.log10(least))
    return next(step * decade for step in (*_DECADE, 10.0) if step * decade >= least * (1 - 1e-9))


def set_axis(
    axes: Axes, which: Literal["x", "y"], limits: tuple[float, float], unit: Unit, label: str, *, inches: float
) -> None:
    """Give an axis limits, round ticks, and its label with the unit.

    Parameters
    ----------
    axes : Axes
        Where; what is drawn is in `unit`.
    which : str
        ``"x"`` or ``"y"``.
    limits : tuple of float
        In `unit`.
    unit : Unit
        The unit.
    label : str
        What runs along it; empty for an axis that shares the labels of its neighbour.
    inches : float
        Its length.
    """
    from matplotlib.ticker import FuncFormatter, MultipleLocator, NullFormatter

    axis = axes.xaxis if which == "x" else axes.yaxis
    (axes.set_xlim if which == "x" else axes.set_ylim)(*limits)
    count = inches / (0.62 if which == "x" else 0.34)
    axis.set_major_locator(MultipleLocator(tick_step(abs(limits[1] - limits[0]), count, unit.name)))
    if label:
        axis.set_major_formatter(FuncFormatter(lambda value, _: with_sign(f"{round(value, 12):.10g}")))
        axis.set_label_text(unit.label(label))
    else:
        axis.set_major_formatter(NullFormatter())


def padded(values: ArrayLike, share: float = 0.06) -> tuple[float, float]:
    """Return limits that hold all finite values with some room; around a single value, room for its size."""
    known = np.asarray(values, np.float64)
    known = known[np.isfinite(known)]
    if not known.size:
        return -1.0, 1.0
    low, high = float(known.min()), float(known.max())
    room = share * (high - low)
    # less than round-off apart is one value
    if room <= 1e-12 * max(abs(low), abs(high)):
        room = 0.1 * max(abs(low), abs(high)) or 1.0
    return low - room, high + room


def mark_edges(axes: Axes, edges: Sequence[Side]) -> None:
    """Draw the four sides of a domain: walls heavy, periodic sides dashed, cuts through the domain thin.

    Parameters
    ----------
    axes : Axes
        Where.
    edges : sequence of str
        West, east, south and north.
    """
    for side, edge in zip(("left", "right", "bottom", "top"), edges, strict=True):
        spine = axes.spines[side]
        spine.set_visible(True)
        spine.set_zorder(4)
        if edge == "wall":
            spine.set(linewidth=2.4, color=INK)
        elif edge == "periodic":
            spine.set(linewidth=0.9, color=FAINT, linestyle=(0, (5, 3)))
        else:
            spine.set(linewidth=0.5, color=FAINT)


def edges_note(edges: Sequence[Side]) -> str:
    """Say how the sides of a map are to be read."""
    meanings = {"wall": "heavy side: wall", "periodic": "dashed side: periodic", "cut": "thin side: the domain goes on"}
    return "; ".join(meaning for edge, meaning in meanings.items() if edge in edges)
