"""Energy against time: what form it takes, how it drifts, and whether its budget closes."""

from __future__ import annotations

from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from .colours import EXPECTED, FIT, FOUND, INK, OTHER
from .page import INSIDE, Page
from .rulers import Unit, number, padded, power_of_ten, set_axis, unit_for
from .scene import Array, Drawing, NoPictureError, Scene, largest

if TYPE_CHECKING:
    from matplotlib.axes import Axes

LEFT, KEY, GAP, BELOW = 0.82, 0.28, 0.16, 0.42  # inches
TALL, LOW = 2.0, 1.25
PERCENT = 1e-4  # changes from this on are written in per cent
CLOSED = 1e-12  # of the largest term: the budget closes to round-off
LEAST = 1e-19  # below that there is nothing to draw on a scale of powers
BUDGET = "energy_budget"
TERMS = {"time_stepping": ("time stepping", FOUND), "filter": ("filter", OTHER), "residual": ("residual", FIT)}


def energy_drawings(scene: Scene) -> list[Drawing]:
    """Kinetic and potential energy against time, with the drift of their sum and the residual of the budget."""
    return [Drawing("energy", partial(_paint, scene))]


def _paint(scene: Scene) -> Page:
    record = scene.record
    if not {"energy_kinetic", "energy_potential"} <= set(record.series) or record.series_times.size < 2:
        raise NoPictureError("fewer than two times of the energies were stored")
    kinetic, potential = record.series["energy_kinetic"], record.series["energy_potential"]
    total = kinetic + potential
    terms = scene.run.series.group(BUDGET) if BUDGET in scene.run.series.groups else {}
    terms = {name: values for name, values in terms.items() if values.size == record.series_times.size}
    scale = max((largest(values) for name, values in terms.items() if name != "residual"), default=0.0)
    panels = ["form", *(["drift"] if total[0] else []), *(["budget"] if scale else [])]
    page = Page(
        _headline(scene, total, terms, scale),
        height=KEY + TALL + (len(panels) - 1) * (GAP + LOW) + ("budget" in panels) * KEY + BELOW,
        over=scene.title,
        notes=[*_notes(total, scale, closed=_closed(scene)), scene.origin],
    )
    width = INSIDE - LEFT
    time = unit_for(record.series_times, "s")
    at = record.series_times / time.size
    down = 0.0
    for n, panel in enumerate(panels):
        height = LOW if n else TALL
        down += KEY if panel in ("form", "budget") else 0.0
        axes = page.axes(LEFT, down, width, height)
        down += height + GAP
        if panel == "form":
            _form(axes, at, kinetic, potential, height)
        elif panel == "drift":
            _drift(axes, at, total, height)
        else:
            _budget(axes, at, terms, scale, closed=_closed(scene))
        label = "time" if n == len(panels) - 1 else ""
        set_axis(axes, "x", (float(at[0]), float(at[-1])), time, label, inches=width)
    page.figure.align_ylabels()
    return page


def _form(axes: Axes, at: Array, kinetic: Array, potential: Array, height: float) -> None:
    """Draw both forms of energy, as shares of what there was at the start."""
    total = kinetic + potential
    unit = Unit(float(total[0]) / 100, "% of the start") if total[0] else unit_for(total, "m^5/s^2")
    axes.plot(at, total / unit.size, color=INK, linewidth=1.0, label="sum")
    axes.plot(at, potential / unit.size, color=FOUND, label="potential")
    axes.plot(at, kinetic / unit.size, color=FIT, label="kinetic")
    high = max(largest(total), largest(potential), largest(kinetic)) / unit.size
    set_axis(axes, "y", (0.0, 1.06 * high if high else 1.0), unit, "energy", inches=height)
    _key(axes)


def _drift(axes: Axes, at: Array, total: Array, height: float) -> None:
    """Draw how the sum departs from the start."""
    drift = (total - total[0]) / total[0]
    unit = unit_for(drift, "1")
    axes.axhline(0, color=EXPECTED, linewidth=0.6)
    axes.plot(at, drift / unit.size, color=INK)
    set_axis(axes, "y", padded(drift / unit.size), unit, "drift of the sum", inches=height)


def _budget(axes: Axes, at: Array, terms: dict[str, Array], scale: float, *, closed: bool) -> None:
    """Draw the sizes of the small terms on a scale of powers of ten."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullLocator

    shown = [(name, np.abs(terms[name]) / scale) for name in TERMS if name in terms and largest(terms[name])]
    lowest = min((float(share[share > LEAST].min()) for _, share in shown if (share > LEAST).any()), default=1e-16)
    highest = max((largest(share) for _, share in shown), default=0.0)
    if closed:
        lowest, highest = min(lowest, 1e-16), max(highest, 3 * CLOSED)
    low, high = 10.0 ** np.floor(np.log10(lowest)), 10.0 ** np.ceil(np.log10(max(highest, 10 * lowest)))
    axes.set_yscale("log")
    if closed:
        axes.axhline(CLOSED, color=EXPECTED, linestyle=(0, (4, 2.2)), linewidth=0.8)
    for name, share in shown:
        text, colour = TERMS[name]
        axes.plot(at, np.where(share > LEAST, share, np.nan), ".-", color=colour, linewidth=0.7, ms=2.5, label=text)
    axes.set_ylim(low, high)
    powers = round(np.log10(high / low))
    axes.yaxis.set_major_locator(LogLocator(base=10.0 ** max(1, -(-powers // 4)), numticks=20))
    axes.yaxis.set_minor_locator(NullLocator())
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: power_of_ten(round(np.log10(value)))))
    axes.set_ylabel("share of the\nlargest term")
    if shown:
        _key(axes)


def _key(axes: Axes) -> None:
    axes.legend(loc="lower left", bbox_to_anchor=(0, 1.0), ncols=4, borderaxespad=0.2, columnspacing=1.6)


def _headline(scene: Scene, total: Array, terms: dict[str, Array], scale: float) -> str:
    times = scene.record.series_times
    lasting = unit_for(times, "s").text(float(times[-1] - times[0]))
    if not largest(total):
        return f"Nothing moves and the surface is level: no energy in {lasting}"
    if not total[0]:
        return f"Energy comes from nothing to {number(float(total[-1]))} m⁵/s² in {lasting}"
    change = float(total[-1] - total[0]) / float(total[0])
    share = f"{number(100 * change)} %" if abs(change) >= PERCENT else f"{number(change)} of its start"
    text = f"Energy changes by {share} in {lasting}"
    if scale:
        residual = largest(terms["residual"]) / scale
        text += f"; its budget closes to {number(residual)} of the largest term"
    return text


def _closed(scene: Scene) -> bool:
    """Whether round-off can be told from a fault: single precision rounds the terms themselves."""
    return scene.basin.grid.precision == "double"


def _notes(total: Array, scale: float, *, closed: bool) -> list[str]:
    notes = []
    if total[0]:
        notes.append(
            f"energy at the start: {number(float(total[0]), 4)} m⁵/s² per unit density, potential counted from rest"
        )
    if scale:
        text = f"largest term of the budget: {number(scale)} m⁵/s³"
        steady = "what round-off leaves where the terms are not small, as they are in a steady flow"
        notes.append(f"{text}; dashed: {power_of_ten(-12)}, {steady}" if closed else text)
    return ["; ".join(notes)]
