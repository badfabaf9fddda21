"""The line through a run along which profiles and time-distance diagrams are drawn."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .rulers import number, written
from .scene import Along, Array, Scene

AVERAGED = ("decay_length", "energy_ratio")  # kinds of measure that average the fields over their window first


@dataclass(frozen=True)
class Cut:
    """A line through the domain, and the snapshots that are averaged along it.

    Parameters
    ----------
    along : str
        ``"x"`` or ``"y"``.
    at : float or None
        The line's other coordinate, m; None for the mean over the other direction.
    during : tuple of float, float or None
        Window or time of the averaged state, s; None for the last snapshot.
    """

    along: Along
    at: float | None
    during: tuple[float, float] | float | None = None

    @property
    def across(self) -> Along:
        """The other direction."""
        return "y" if self.along == "x" else "x"

    @property
    def where(self) -> str:
        """The line in words."""
        if self.at is None:
            return f"along {self.along}, mean over {self.across}"
        return f"along {self.along} at {self.across} = {written(self.at, 'm') if self.at else '0'}"

    def numbers(self, times: Array) -> NDArray[np.intp]:
        """Numbers of the snapshots that are averaged; the last one where none lies in the window."""
        from ..measures.record import chosen

        found = chosen(times, self.during, last=True)
        return found if found.size else np.arange(times.size)[-1:]

    def when(self, scene: Scene) -> str:
        """Say which snapshots are averaged."""
        numbers = self.numbers(scene.times)
        if numbers.size == 1:
            return scene.after(int(numbers[0]))
        first, last = (number(float(scene.times[k]) / scene.time_unit.size, 3) for k in (numbers[0], numbers[-1]))
        return f"mean from {first} to {scene.time_unit.after(last)}"

    def points(self, scene: Scene, name: str) -> Array:
        """Coordinates of a field's points along the line, m."""
        x, y = scene.record.axes(name)
        return x if self.along == "x" else y

    def ends(self, scene: Scene) -> tuple[float, float]:
        """First and last coordinate of what is stored along the line, m."""
        faces = scene.record.x_face if self.along == "x" else scene.record.y_face
        return float(faces[0]), float(faces[-1])

    def lines(self, scene: Scene, name: str, numbers: NDArray[np.intp]) -> Array:
        """Values of a field along the line, ``[snapshot, point]``."""
        from ..measures.lines import along_line

        sample = along_line(scene.record, name, self.along, self.at, None, None).sample
        return np.array([sample(scene.record.field(name, int(k))) for k in numbers])

    def settled(self, scene: Scene, name: str) -> Array:
        """Mean along the line over the snapshots of the window."""
        return np.asarray(self.lines(scene, name, self.numbers(scene.times)).mean(axis=0))


def cut_of(scene: Scene) -> Cut:
    """Choose the line: the first expectation's; else across what the start varies along; else through its middle."""
    for expect in scene.experiment.expect:
        measure: Any = expect.measure
        along = getattr(measure, "along", None)
        if along is None or along == scene.thin:
            continue
        at = getattr(measure, "at", None)
        averaged = measure.kind in AVERAGED
        return _inside(scene, Cut(along, at, measure.during if averaged else None))
    return _inside(scene, _cut_of_start(scene))


def same_line(cut: Cut, measure: Any) -> bool:
    """Whether a measure looks along a cut."""
    return getattr(measure, "along", None) == cut.along and getattr(measure, "at", None) == cut.at


def _cut_of_start(scene: Scene) -> Cut:
    start: Any = scene.experiment.start[0] if scene.experiment.start else None
    if scene.thin is not None:
        return Cut("y" if scene.thin == "x" else "x", None)
    along: Along = getattr(start, "along", "x")
    if getattr(start, "kind", "") == "jet":  # its `along` is that of the flow
        along = "y" if along == "x" else "x"
    at = getattr(start, "at", None)
    if isinstance(at, tuple):
        return Cut(along, float(at[1] if along == "x" else at[0]))
    faces = scene.record.y_face if along == "x" else scene.record.x_face
    return Cut(along, float(faces[0] + faces[-1]) / 2)


def _inside(scene: Scene, cut: Cut) -> Cut:
    """Move the line into what was stored."""
    if cut.at is None:
        return cut
    faces = scene.record.y_face if cut.along == "x" else scene.record.x_face
    return replace(cut, at=float(np.clip(cut.at, faces[0], faces[-1])))
