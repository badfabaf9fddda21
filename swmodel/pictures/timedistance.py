"""The time-distance diagram: what moves which way, and how fast."""

from __future__ import annotations

from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from .colours import EXPECTED, FAINT, INK, signed_map
from .cut import Cut, cut_of, same_line
from .page import INSIDE, Page
from .rulers import Unit, edges_note, mark_edges, round_up, set_axis, unit_for, written
from .scene import Array, Drawing, NoPictureError, Scene, largest

if TYPE_CHECKING:
    from matplotlib.axes import Axes

LEFT, GAP, TITLE, BELOW, BAR = 0.58, 0.2, 0.24, 0.42, 0.52  # inches
HEIGHT = 3.2
ROWS = 400  # snapshots that are drawn at most
FINE = 2000  # points of a path
KEY_SHARE = 0.16  # of the line, for the key of the gravity wave
LABELS = {"eta": "elevation η", "u": "u, along x", "v": "v, along y"}
UNITS = {"eta": "m", "u": "m/s", "v": "m/s"}


def time_distance_drawings(scene: Scene) -> list[Drawing]:
    """Time-distance diagram along the section's line: eta, and in a thin domain u and v beside it."""
    return [Drawing("time_distance", partial(_paint, scene))]


def _paint(scene: Scene) -> Page:
    scene.need("eta")
    if scene.times.size < 3:
        raise NoPictureError(f"{scene.times.size} snapshots make no time-distance diagram")
    cut = cut_of(scene)
    rows = _rows(scene.times)
    fields = {
        name: cut.lines(scene, name, rows)
        for name in (("eta", "u", "v") if scene.thin else ("eta",))
        if name in scene.record.names
    }
    # a velocity that is 0 throughout shows nothing
    names = [name for name, values in fields.items() if name == "eta" or largest(values)]
    page = Page(
        f"{'Elevation and velocity' if len(names) > 1 else 'Elevation'} against time, {cut.where}",
        height=TITLE + HEIGHT + BELOW + BAR,
        over=scene.title,
        under=scene.experiment.question,
        notes=[_note(scene, cut), scene.origin],
    )
    width = (INSIDE - LEFT - GAP * (len(names) - 1)) / len(names)
    length = unit_for(cut.ends(scene), "m")
    time = unit_for(scene.times, "s")
    for n, name in enumerate(names):
        axes = page.axes(LEFT + n * (width + GAP), TITLE, width, HEIGHT)
        _panel(page, axes, scene, cut, name, fields[name], (length, time), (n, width))
        if name == "eta":
            _expected_paths(axes, scene, cut, length, time)
            _wave_speed(axes, scene, cut, length, time)
    return page


def _note(scene: Scene, cut: Cut) -> str:
    notes = [edges_note(_sides(scene, cut)[:2])]
    if scene.thin is not None:
        cells = scene.record.x.size if scene.thin == "x" else scene.record.y.size
        notes.insert(0, f"{cells} cells lie across {scene.thin}: no map is drawn, but the mean over them against time")
    return "; ".join(notes)


def _rows(times: Array) -> NDArray[np.intp]:
    """Numbers of the snapshots nearest to evenly spaced times."""
    even = np.linspace(times[0], times[-1], min(times.size, ROWS))
    after = np.clip(np.searchsorted(times, even), 1, times.size - 1)
    return np.where(even - times[after - 1] < times[after] - even, after - 1, after)


def _panel(
    page: Page,
    axes: Axes,
    scene: Scene,
    cut: Cut,
    name: str,
    values: Array,
    units: tuple[Unit, Unit],
    place: tuple[int, float],
) -> None:
    """Draw one field, its axes and its colour bar."""
    length, time = units
    order, width = place
    points, ends, times = cut.points(scene, name), cut.ends(scene), scene.times
    half_x, half_t = (points[1] - points[0]) / 2, (times[-1] - times[0]) / (len(values) - 1) / 2
    limit = round_up(largest(values))
    image = axes.imshow(
        values,
        extent=(
            (points[0] - half_x) / length.size,
            (points[-1] + half_x) / length.size,
            (times[0] - half_t) / time.size,
            (times[-1] + half_t) / time.size,
        ),
        origin="lower",
        aspect="auto",
        cmap=signed_map(),
        vmin=-limit,
        vmax=limit,
        interpolation="antialiased",
    )
    limits = ends[0] / length.size, ends[1] / length.size
    set_axis(axes, "x", limits, length, cut.along, inches=width)
    time_limits = times[0] / time.size, times[-1] / time.size
    set_axis(axes, "y", time_limits, time, "time" if order == 0 else "", inches=HEIGHT)
    axes.grid(visible=False)
    mark_edges(axes, _sides(scene, cut))
    axes.set_title(LABELS[name], loc="left", size=8.5, pad=5)
    unit = unit_for(limit, UNITS[name])
    bar_width = min(3.2, 0.8 * width)
    bar_axes = page.axes(
        LEFT + order * (width + GAP) + (width - bar_width) / 2, TITLE + HEIGHT + BELOW, bar_width, 0.09
    )
    bar = page.figure.colorbar(image, cax=bar_axes, orientation="horizontal")
    ticks = limit * np.array([-1, 0, 1])
    bar.set_ticks(list(ticks), labels=[f"{tick / unit.size:.4g}".replace("-", "−") for tick in ticks])
    bar.set_label(unit.label({"eta": "η"}.get(name, name)), labelpad=2)
    bar.outline.set(linewidth=0.5, edgecolor=FAINT)
    bar_axes.grid(visible=False)


def _sides(scene: Scene, cut: Cut) -> Any:
    """What lies at both ends of the line; start and end of time are no edges."""
    edges = scene.record.edges
    return (*(edges[:2] if cut.along == "x" else edges[2:]), "cut", "cut")


def _expected_paths(axes: Axes, scene: Scene, cut: Cut, length: Unit, time: Unit) -> None:
    """Draw where a crest goes at the speed that is expected along this line."""
    for judgement in scene.verdict.expectations:
        measure, evidence = judgement.expect.measure, judgement.finding.evidence
        if getattr(measure, "kind", "") != "phase_speed" or evidence is None or judgement.expected is None:
            continue
        if measure.of != "eta" or not same_line(cut, measure):
            continue
        first, last = cut.ends(scene)
        begin = (last if measure.backward else first) if measure.from_ is None else measure.from_
        at = np.linspace(evidence.curve_at[0], evidence.curve_at[-1], FINE)
        path = np.interp(at, evidence.curve_at, evidence.curve(judgement.expected.value))
        path = begin + (-1 if measure.backward else 1) * path
        if _sides(scene, cut)[0] == "periodic":
            path = first + (path - first) % (last - first)
            path[1:][np.abs(np.diff(path)) > (last - first) / 2] = np.nan
        text = f"expected: {written(judgement.expected.value, 'm/s')}"
        where = path / length.size, at / time.size
        axes.plot(*where, color="white", linewidth=3.0, alpha=0.7)
        axes.plot(*where, color=EXPECTED, linestyle=(0, (5, 2.5)), linewidth=1.3, label=text)
        axes.legend(loc="lower right", bbox_to_anchor=(1.0, 1.0), borderaxespad=0.15, handlelength=2.6)


def _wave_speed(axes: Axes, scene: Scene, cut: Cut, length: Unit, time: Unit) -> None:
    """Draw a key: how far the gravity wave comes; only where its slope can be seen."""
    first, last = cut.ends(scene)
    lasting = scene.times[-1] - scene.times[0]
    c = scene.basin.wave_speed
    rise = KEY_SHARE * (last - first) / c
    if not 0.03 < rise / lasting < 0.8:
        return
    x0, t0 = first + 0.06 * (last - first), scene.times[0] + 0.04 * lasting
    path = np.array([x0, x0 + KEY_SHARE * (last - first)]) / length.size
    when = np.array([t0, t0 + rise]) / time.size
    axes.plot(path, when, color="white", linewidth=3.0, alpha=0.8)
    axes.plot(path, when, color=INK, linewidth=1.0)
    axes.annotate(
        f"c = {written(c, 'm/s')}",
        (path[0], when[0]),
        (7, 5),
        textcoords="offset points",
        va="top",
        size=7.2,
        bbox={"facecolor": "white", "alpha": 0.75, "edgecolor": "none", "pad": 1.0},
    )
