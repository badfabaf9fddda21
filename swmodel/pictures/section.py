"""The section: the profile at the start, what became of it, and theory on top."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from ..theory.adjustment import adjusted_elevation, adjusted_velocity
from .colours import EXPECTED, FOUND, START, ZERO
from .cut import Cut, cut_of, same_line
from .page import INSIDE, Page
from .rulers import Unit, number, padded, set_axis, unit_for, written
from .scene import Array, Drawing, Scene, largest

if TYPE_CHECKING:
    from matplotlib.axes import Axes

LEFT, KEY, GAP, BELOW = 0.72, 0.3, 0.16, 0.42  # inches
TALL, LOW = 2.5, 1.55
COMPARED = 8.0  # deformation radii on either side of a step within which theory and model are compared
FAINTEST = 0.01  # of the velocity along the line: less across it is not shown
SMALL = 0.1  # of the depth: theory is for small steps
DASHED = (0, (4, 2.2))


def section_drawings(scene: Scene) -> list[Drawing]:
    """Profile of eta and of the velocity across it along a line, with theory on top where there is one."""
    return [Drawing("section", partial(_paint, scene))]


@dataclass(frozen=True)
class _Step:
    """A step in elevation at rest, over even depth on a plane of uniform f: its end state is known.

    Parameters
    ----------
    at : float
        Where it jumps, m.
    eta0 : float
        Elevation on its far side, m; the opposite on its near side.
    """

    at: float
    eta0: float

    def elevation(self, scene: Scene, s: Array) -> Array:
        """Elevation of its end state, m."""
        basin = scene.basin
        known = {"eta0": self.eta0, "gravity": basin.gravity, "depth": basin.reference_depth, "f0": basin.frame.f0}
        return adjusted_elevation(s - self.at, **known)

    def velocity(self, scene: Scene, s: Array, cut: Cut) -> Array:
        """Velocity across the line in its end state, m/s: eastward where the line runs north, the sign turns."""
        basin = scene.basin
        known = {"eta0": self.eta0, "gravity": basin.gravity, "depth": basin.reference_depth, "f0": basin.frame.f0}
        return (1 if cut.along == "x" else -1) * adjusted_velocity(s - self.at, **known)


def _paint(scene: Scene) -> Page:
    scene.need("eta")
    cut = cut_of(scene)
    step = _step(scene, cut)
    panels = ["eta", *_velocity(scene, cut)]
    first, last = cut.ends(scene)
    length = unit_for((first, last), "m")
    page = Page(
        _headline(scene, cut, step),
        height=KEY + TALL + BELOW + (GAP + LOW if len(panels) > 1 else 0),
        over=scene.title,
        under=scene.experiment.question,
        notes=[*_notes(scene, step), scene.origin],
    )
    width = INSIDE - LEFT
    s = np.linspace(first, last, 2001)
    for n, name in enumerate(panels):
        height = LOW if n else TALL
        axes = page.axes(LEFT, KEY + n * (TALL + GAP), width, height)
        theory = np.zeros(0)
        if step is not None and name != ("u" if cut.along == "x" else "v"):
            theory = step.elevation(scene, s) if name == "eta" else step.velocity(scene, s, cut)
        unit = _curves(axes, scene, cut, name, theory)
        if theory.size:
            label = f"theory: end state of the step, a = {written(scene.basin.deformation_radius, 'm')}"
            axes.plot(s / length.size, theory / unit.size, color=EXPECTED, linestyle=DASHED, linewidth=1.2, label=label)
        elif step is None and name == "eta":
            _expected_curves(axes, scene, cut, length, unit)
        shown = [np.asarray(line.get_ydata()) for line in axes.lines]
        text = "elevation η" if name == "eta" else f"velocity {name}"
        set_axis(axes, "y", padded(np.concatenate(shown)), unit, text, inches=height)
        label = cut.along if n == len(panels) - 1 else ""
        set_axis(axes, "x", (first / length.size, last / length.size), length, label, inches=width)
        if n == 0:
            axes.legend(loc="lower left", bbox_to_anchor=(0, 1.0), ncols=4, borderaxespad=0.2, columnspacing=1.6)
    page.figure.align_ylabels()
    return page


def _velocity(scene: Scene, cut: Cut) -> list[str]:
    """Choose the velocity that is shown: the one across the line, unless all the flow goes along it."""
    names = ("v", "u") if cut.along == "x" else ("u", "v")
    stored = [name for name in names if name in scene.record.names]
    if len(stored) < 2:
        return stored
    across, along = (largest(cut.lines(scene, name, np.array([0, -1]))) for name in names)
    return [names[0] if across >= FAINTEST * along else names[1]]


def _curves(axes: Axes, scene: Scene, cut: Cut, name: str, theory: Array) -> Unit:
    """Draw the start and what became of it; return the unit of the axis, which suits theory, too."""
    length = unit_for(cut.ends(scene), "m")
    at = cut.points(scene, name) / length.size
    start = cut.lines(scene, name, np.array([0]))[0]
    settled = cut.settled(scene, name)
    unit = unit_for([*start, *settled, *theory], "m" if name == "eta" else "m/s")
    axes.axhline(0, color=ZERO, linewidth=0.5)
    axes.plot(at, start / unit.size, color=START, linewidth=2.6, solid_joinstyle="miter", label="start")
    if scene.times.size > 1:
        axes.plot(at, settled / unit.size, color=FOUND, label=cut.when(scene))
    return unit


def _step(scene: Scene, cut: Cut) -> _Step | None:
    """Recognise a step by what was stored at time 0, however the start was written."""
    frame, record = scene.basin.frame, scene.record
    edge = record.edges[0] if cut.along == "x" else record.edges[2]
    uniform = frame.f0 != 0 and bool(np.all(record.f == record.f.flat[0]))
    if not (uniform and scene.basin.even and scene.has_velocity and edge != "periodic" and abs(scene.times[0]) < 1):
        return None
    if largest(record.field("u", 0)) or largest(record.field("v", 0)):
        return None
    eta = record.field("eta", 0)
    profile = (eta if cut.along == "x" else eta.T)[0]
    same = np.all(eta == (profile[None, :] if cut.along == "x" else profile[:, None]))
    eta0 = float(profile[-1])
    changes = np.flatnonzero(np.diff(profile))
    # one jump between -eta0 and eta0; with an odd number of cells the middle one may hold 0
    if not same or not eta0 or profile[0] != -eta0 or not 1 <= changes.size <= 2:
        return None
    points = cut.points(scene, "eta")
    if changes.size == 1:
        return _Step(float(points[changes[0]] + points[changes[0] + 1]) / 2, eta0)
    middle = changes[1]
    return _Step(float(points[middle]), eta0) if changes[0] == middle - 1 and profile[middle] == 0 else None


def _expected_curves(axes: Axes, scene: Scene, cut: Cut, length: Unit, unit: Unit) -> None:
    """Draw the curve of every expectation on the decay of eta along this line, with its expected value."""
    for judgement in scene.verdict.expectations:
        measure, evidence = judgement.expect.measure, judgement.finding.evidence
        if getattr(measure, "kind", "") != "decay_length" or evidence is None or judgement.expected is None:
            continue
        if measure.of != "eta" or not same_line(cut, measure):
            continue
        first, last = cut.ends(scene)
        begin = first if measure.from_ is None else measure.from_
        toward = -1 if begin > (last if measure.to is None else measure.to) else 1
        at = (begin + toward * evidence.curve_at) / length.size
        label = f"expected: {written(judgement.expected.value, 'm')}"
        curve = evidence.curve(judgement.expected.value) / unit.size
        axes.plot(at, curve, color=EXPECTED, linestyle=DASHED, linewidth=1.2, label=label)


def _headline(scene: Scene, cut: Cut, step: _Step | None) -> str:
    if scene.times.size < 2:
        return f"Elevation {cut.where} {scene.after(0)}"
    at = cut.points(scene, "eta")
    if step is None:
        change = largest(cut.settled(scene, "eta") - cut.lines(scene, "eta", np.array([0]))[0])
        return f"Elevation {cut.where} departs by up to {written(change, 'm', 2)} from its start"
    near = np.abs(at - step.at) < COMPARED * scene.basin.deformation_radius
    gap = largest((cut.settled(scene, "eta") - step.elevation(scene, at))[near]) / abs(step.eta0)
    return (
        f"What stays of the step lies within {number(100 * gap)} % of η₀ of theory, "
        f"up to {COMPARED:g} deformation radii away"
    )


def _notes(scene: Scene, step: _Step | None) -> list[str]:
    if step is None:
        return []
    notes = [f"theory: Rossby 1938, linear, unbounded; η₀ = {written(abs(step.eta0), 'm')}"]
    ratio = abs(step.eta0) / scene.basin.reference_depth
    if not scene.record.linear and ratio > SMALL:
        notes.append(f"the step is {number(100 * ratio)} % of the depth, not small as theory takes it")
    return ["; ".join(notes)]
