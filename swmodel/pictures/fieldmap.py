"""The map: elevation in colour, velocity as arrows, at the start and at the end."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from .colours import FAINT, INK, signed_map
from .page import INSIDE, Page
from .rulers import Unit, edges_note, mark_edges, number, round_up, set_axis, tick_step, unit_for, written
from .scene import Array, Drawing, Scene, largest
from .timedistance import time_distance_drawings

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.quiver import Quiver

LEFT, BELOW, GAP = 0.58, 0.42, 0.4  # room for the ticks and labels of a panel, and between panels, inches
TITLE = 0.26  # above a panel
BAR = 0.52  # a colour bar with its label
TALLEST = 3.4
NARROWEST, WIDEST = 0.15, 2.0  # of height over width: beyond, the map is stretched
BESIDE = 0.55  # of height over width: from here on two panels stand side by side

ARROW_SPACING = 0.16  # inches
LONGEST_ARROW = 0.24
LEAST_ARROW = 0.03  # of the largest speed: shorter arrows are left out
OWN_SCALE = 4.0  # times smaller: the panel gets a scale of its own


def map_drawings(scene: Scene) -> list[Drawing]:
    """Map of eta with velocity; where only few cells lie across the domain, its time-distance diagram."""
    if scene.thin is not None:
        return time_distance_drawings(scene)
    return [Drawing("map", partial(_paint, scene))]


@dataclass(frozen=True)
class _Layout:
    """Where the panels of a map stand, inches.

    Parameters
    ----------
    width, height : float
        Of a panel.
    places : sequence of tuple
        Left and top of each panel.
    stretch : float
        How much longer a metre along y is than one along x.
    own_bars : bool
        Whether each panel has its own colour bar.
    """

    width: float
    height: float
    places: Sequence[tuple[float, float]]
    stretch: float
    own_bars: bool

    @classmethod
    def of(cls, shape: float, panels: int, own_bars: bool) -> _Layout:
        """Lay out panels of a domain with this height over width."""
        drawn = float(np.clip(shape, NARROWEST, WIDEST))
        beside = panels == 2 and drawn > BESIDE
        room = INSIDE - LEFT - (GAP if beside else 0.0)
        width = min(room / (2 if beside else 1), TALLEST / drawn)
        height = width * drawn
        if beside:
            places = [(LEFT + n * (width + GAP), TITLE) for n in range(2)]
        else:
            step = TITLE + height + (BELOW + BAR if own_bars else 0.14)
            places = [(LEFT, TITLE + n * step) for n in range(panels)]
        return cls(width, height, places, drawn / shape, own_bars)

    @property
    def beside(self) -> bool:
        """Whether the panels stand side by side."""
        return len(self.places) > 1 and self.places[0][1] == self.places[1][1]

    @property
    def content(self) -> float:
        """Height of everything."""
        return self.places[-1][1] + self.height + BELOW + BAR


def _paint(scene: Scene) -> Page:
    scene.need("eta")
    record = scene.record
    numbers = [0, scene.times.size - 1] if scene.times.size > 1 else [0]
    etas = [record.field("eta", k) for k in numbers]
    flows = [_flow(scene, k) for k in numbers] if scene.has_velocity else []
    sizes = [largest(eta) for eta in etas]
    own = min(sizes) > 0 and max(sizes) > OWN_SCALE * min(sizes)
    limits = [round_up(size if own else max(sizes)) for size in sizes]
    x, y = record.x_face, record.y_face
    layout = _Layout.of(float((y[-1] - y[0]) / (x[-1] - x[0])), len(numbers), own)
    page = Page(
        _headline(scene, sizes, limits, flows),
        height=layout.content,
        over=scene.title,
        under=scene.experiment.question,
        notes=[*_notes(scene, layout), scene.origin],
    )
    length = unit_for([*x, *y], "m")
    speed = max((largest(np.hypot(*flow)) for flow in flows), default=0.0)
    for n, (place, eta) in enumerate(zip(layout.places, etas, strict=True)):
        axes = page.axes(*place, layout.width, layout.height)
        limit = limits[n]
        image = axes.imshow(
            eta,
            extent=(x[0] / length.size, x[-1] / length.size, y[0] / length.size, y[-1] / length.size),
            origin="lower",
            aspect="auto",
            cmap=signed_map(),
            vmin=-limit,
            vmax=limit,
            interpolation="antialiased",
        )
        _frame(
            axes,
            scene,
            layout,
            length,
            labelled=(not layout.beside or n == 0, layout.beside or own or n == len(etas) - 1),
        )
        axes.set_title(scene.after(numbers[n]), loc="left", size=8.5, pad=5)
        _depth_lines(axes, scene, length)
        if flows and speed > 0:
            arrows = _arrows(axes, scene, layout, length, flows[n], speed)
            if n == len(etas) - 1:
                _arrow_key(axes, arrows, layout, speed)
        if own or n == len(etas) - 1:
            _bar(page, image, layout, place if own or not layout.beside else None, limit)
    return page


def _headline(
    scene: Scene, sizes: Sequence[float], limits: Sequence[float], flows: Sequence[tuple[Array, Array]]
) -> str:
    """What the map shows, in numbers."""
    speed = f", speed {written(largest(np.hypot(*flows[-1])), 'm/s', 2)}" if flows else ""
    if not max(sizes):
        return f"The surface is level {scene.after(-1)}{speed}"
    first, last = (
        unit_for(limit, "m").text(size, 2) for limit, size in ((limits[0], sizes[0]), (limits[-1], sizes[-1]))
    )
    text = f"|η| reaches {first} {scene.after(0)}"
    if len(sizes) > 1:
        text += f" and {last} {scene.after(-1)}"
    return f"{text}{speed}"


def _notes(scene: Scene, layout: _Layout) -> list[str]:
    notes = [edges_note(scene.record.edges)]
    if not scene.has_velocity:
        notes.append("no arrows: u and v were not stored")
    if abs(layout.stretch - 1) > 0.01:
        longer, other, times = ("y", "x", layout.stretch) if layout.stretch > 1 else ("x", "y", 1 / layout.stretch)
        notes.append(f"{longer} is stretched {times:.2g} times against {other}, arrows with it")
    levels = _depth_levels(scene)
    if levels.size:
        unit = unit_for(levels, "m")
        ends = number(float(levels[0]) / unit.size, 4), unit.text(float(levels[-1]), 4)
        every = f", every {unit.text(float(levels[1] - levels[0]))}" if levels.size > 1 else ""
        notes.append(f"grey lines: depth at rest, {' to '.join(ends)}{every}")
    return ["; ".join(notes)]


def _frame(axes: Axes, scene: Scene, layout: _Layout, length: Unit, *, labelled: tuple[bool, bool]) -> None:
    x, y = scene.record.x_face / length.size, scene.record.y_face / length.size
    show_y, show_x = labelled
    set_axis(axes, "x", (x[0], x[-1]), length, "x" if show_x else "", inches=layout.width)
    set_axis(axes, "y", (y[0], y[-1]), length, "y" if show_y else "", inches=layout.height)
    axes.grid(visible=False)
    mark_edges(axes, scene.record.edges)


def _depth_levels(scene: Scene) -> Array:
    """Round depths at which lines are drawn; none where the depth is even."""
    depth = np.asarray(scene.record.depth)
    low, high = float(np.nanmin(depth)), float(np.nanmax(depth))
    # depths that differ by less than a millionth are one
    if high - low <= 1e-6 * high:
        return np.zeros(0)
    step = tick_step(high - low, 6, "m")
    return np.asarray(step * np.arange(np.ceil(low / step), np.floor(high / step) + 1))


def _depth_lines(axes: Axes, scene: Scene, length: Unit) -> None:
    levels = _depth_levels(scene)
    if levels.size:
        x, y = scene.record.x / length.size, scene.record.y / length.size
        axes.contour(x, y, scene.record.depth, levels=levels, colors=FAINT, linewidths=0.5, alpha=0.7)


def _flow(scene: Scene, k: int) -> tuple[Array, Array]:
    """Velocity at centres: the mean of the two faces beside each."""
    u, v = scene.record.field("u", k), scene.record.field("v", k)
    return (u[:, 1:] + u[:, :-1]) / 2, (v[1:] + v[:-1]) / 2


def _arrows(axes: Axes, scene: Scene, layout: _Layout, length: Unit, flow: tuple[Array, Array], speed: float) -> Quiver:
    """Draw every n-th velocity, long enough to read."""
    rows = _every(scene.record.y.size, layout.height)
    columns = _every(scene.record.x.size, layout.width)
    u, v = (part[rows, columns] for part in flow)
    small = np.hypot(u, v) < LEAST_ARROW * speed
    u, v = np.where(small, np.nan, u), np.where(small, np.nan, v)
    return axes.quiver(
        scene.record.x[columns] / length.size,
        scene.record.y[rows] / length.size,
        u,
        v,
        angles="xy",
        pivot="middle",
        scale_units="inches",
        scale=speed / LONGEST_ARROW,
        units="inches",
        width=0.011,
        headwidth=3.6,
        headlength=4.2,
        headaxislength=3.8,
        minlength=0.1,
        color=INK,
        zorder=3,
    )


def _arrow_key(axes: Axes, arrows: Quiver, layout: _Layout, speed: float) -> None:
    """Draw an arrow of round speed above a panel, at its right end."""
    unit = unit_for(speed, "m/s")
    shown = _key_speed(speed / unit.size)
    axes.quiverkey(
        arrows,
        1 - LONGEST_ARROW * shown * unit.size / speed / layout.width,
        1 + 0.115 / layout.height,
        shown * unit.size,
        f"{shown:g} {unit.name} ",
        labelpos="W",
        coordinates="axes",
        fontproperties={"size": 7.5},
        labelsep=0.05,
        angle=0,
    )


def _key_speed(speed: float) -> float:
    """Return the largest round number up to a speed."""
    decade = 10.0 ** np.floor(np.log10(speed))
    return float(max(step for step in (1.0, 2.0, 5.0) if step * decade <= speed * (1 + 1e-9)) * decade)


def _every(cells: int, inches: float) -> slice:
    """Return the cells of a direction that get an arrow, the outermost as far from either side."""
    # a fifth closer is still read
    step = max(1, math.ceil(cells * ARROW_SPACING / inches - 0.2))
    return slice(((cells - 1) % step) // 2, None, step)


def _bar(page: Page, image: Any, layout: _Layout, under: tuple[float, float] | None, limit: float) -> None:
    """Draw the colour bar: under a panel, or in the middle under both."""
    unit = unit_for(limit, "m")
    room = layout.places[-1][0] + layout.width - LEFT if under is None else layout.width
    width = min(3.2, 0.8 * room)
    left = (LEFT if under is None else under[0]) + (room - width) / 2
    top = (layout.places[-1] if under is None else under)[1] + layout.height + BELOW
    axes = page.axes(left, top, width, 0.09)
    bar = page.figure.colorbar(image, cax=axes, orientation="horizontal")
    ticks = limit * np.array([-1, -0.5, 0, 0.5, 1])
    bar.set_ticks(list(ticks), labels=[f"{tick / unit.size:.4g}".replace("-", "−") for tick in ticks])
    bar.set_label(unit.label("elevation η"), labelpad=2)
    bar.outline.set(linewidth=0.5, edgecolor=FAINT)
    axes.grid(visible=False)
