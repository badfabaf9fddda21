"""The figure of an expectation: the points, the fit, the same curve with the expected value, and the verdict."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from ..quantities import Percentage
from .colours import BAND, EXPECTED, FIT, FOUND, INK, OTHER
from .page import INSIDE, Page, wrapped
from .rulers import Unit, padded, set_axis, unit_for, with_sign, written
from .scene import Array, Drawing, Scene

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from ..measures import Evidence
    from ..measures.verdict import Judgement

LEFT, KEY, GAP, BELOW = 0.82, 0.28, 0.14, 0.42  # inches
TALL, RULER = 2.6, 0.42
DASHED = (0, (4, 2.2))
MANY_POINTS = 150
MOST_DIGITS, DIGITS = 6, 4  # at most, and where the measure's own error is not known


def expectation_drawings(scene: Scene) -> list[Drawing]:
    """One figure an expectation: points, fit, the same curve with the expected value, and where the verdict lies."""
    judged = scene.verdict.expectations
    return [Drawing(f"expectation-{n}", partial(_paint, scene, judgement)) for n, judgement in enumerate(judged, 1)]


@dataclass(frozen=True)
class _Writing:
    """How the values of a judgement are written: one unit, and the digits that the measure's own error leaves.

    Parameters
    ----------
    unit : Unit
        The unit.
    decimals : int
        Digits after the point.
    error : float or None
        The measure's own error, SI; None where it is not known.
    si : str
        SI unit.
    """

    unit: Unit
    decimals: int
    error: float | None
    si: str

    @classmethod
    def of(cls, judgement: Judgement) -> _Writing:
        """Choose for a judgement."""
        finding, expected = judgement.finding, judgement.expected
        values = [value for value in (finding.value, expected.value if expected else None) if value is not None]
        unit = unit_for(values, finding.unit)
        error = finding.fit_error
        error = error if error is not None and math.isfinite(error) else None
        largest = max((abs(value) / unit.size for value in values if math.isfinite(value)), default=0.0)
        before = math.floor(math.log10(largest)) + 1 if largest else 1
        if error:
            # two digits of the error
            wanted = 1 - math.floor(math.log10(error / unit.size))
            decimals = min(wanted, MOST_DIGITS - before)
        else:
            decimals = (DIGITS if error is None else MOST_DIGITS) - before
        return cls(unit, max(0, decimals), error, finding.unit)

    def value(self, value: float) -> str:
        """Write a value."""
        return self.unit.after(self._number(value))

    def found(self, value: float) -> str:
        """Write a value with the measure's own error."""
        if self.error is None:
            return self.value(value)
        size = self.error / self.unit.size
        error = f"{size:.{self.decimals}f}"
        if size and not float(error):
            return f"{self.value(value)} ± {written(self.error, self.si, 2)}"
        numbers = f"{self._number(value)} ± {error if size else 0}"
        return self.unit.after(f"({numbers})" if self.unit.name.startswith("10") else numbers)

    def _number(self, value: float) -> str:
        text = f"{value / self.unit.size:.{self.decimals}f}"
        return with_sign(text) if float(text) else "0"


def _paint(scene: Scene, judgement: Judgement) -> Page:
    evidence, writing = judgement.finding.evidence, _Writing.of(judgement)
    ruled = judgement.finding.value is not None and judgement.expected is not None
    page = Page(
        judgement.expect.claim,
        height=(KEY + TALL + BELOW + GAP if evidence else 0.0) + (RULER + BELOW if ruled else 0.0),
        over=scene.title,
        under=_told(judgement, writing),
        notes=[*_notes(judgement, ruled=ruled), scene.origin],
    )
    width = INSIDE - LEFT
    if evidence is not None:
        _evidence(page.axes(LEFT, KEY, width, TALL), judgement, evidence, writing, width)
    if ruled:
        top = KEY + TALL + BELOW + GAP if evidence else 0.0
        _ruler(page.axes(LEFT, top, width, RULER), judgement, width)
    return page


def _told(judgement: Judgement, writing: _Writing) -> str:
    """The verdict in a line."""
    expected, finding, within = judgement.expected, judgement.finding, judgement.expect.within
    parts = []
    if finding.value is not None:
        parts.append(f"found {writing.found(finding.value)}")
    if expected is not None:
        name = f" ({expected.theory})" if expected.theory else ""
        room = f"{within.percent:g} %" if isinstance(within, Percentage) else written(within.value, finding.unit)
        parts.append(f"expected {writing.value(expected.value)}{name} within {room}")
    text = f"{judgement.word}: {', '.join(parts)}" if parts else str(judgement.word)
    return text + (f"; {judgement.reason}" if judgement.reason else "")


def _notes(judgement: Judgement, *, ruled: bool) -> list[str]:
    below = "below: found with the measure's own error, on what is allowed (grey)"
    known = [below] if ruled else []
    return ["; ".join([*known, f"tolerance because {judgement.expect.because}", *judgement.remarks])]


def _evidence(axes: Axes, judgement: Judgement, evidence: Evidence, writing: _Writing, width: float) -> None:
    """Draw what was measured, the best curve, and the expected one."""
    found = judgement.finding.value
    expected = judgement.expected.value if judgement.expected else None
    across = unit_for([*evidence.at, *evidence.curve_at], evidence.axis_unit)
    at, curve_at = evidence.at / across.size, evidence.curve_at / across.size
    points = _parts(evidence.values)
    curves = [(value, _parts(evidence.curve(value))) for value in (found, expected) if value is not None]
    up = unit_for(np.concatenate([part.ravel() for part in (points, *(curve for _, curve in curves))]), evidence.unit)
    names = [("o", FOUND, "u, points"), ("s", OTHER, "v, points")] if len(points) > 1 else [("o", FOUND, "points")]
    size = 4.0 if at.size <= MANY_POINTS else 2.4
    for (mark, colour, name), values in zip(names, points, strict=True):
        axes.plot(at, values / up.size, mark, color=colour, ms=size, mec="white", mew=0.4, label=name)
    if found is not None:
        level = bool(np.all(np.ptp(curves[0][1], axis=1) == 0))
        label = f"{'found' if level else 'fit'}: {writing.value(found)}"
        _curve(axes, curve_at, curves[0][1] / up.size, label, color=FIT)
    if expected is not None:
        label = f"expected: {writing.value(expected)}"
        _curve(axes, curve_at, curves[-1][1] / up.size, label, color=EXPECTED, linestyle=DASHED)
    shown = np.concatenate([np.ravel(np.asarray(line.get_ydata(), np.float64)) for line in axes.lines])
    name = evidence.name.replace("eta", "η").replace("_", " ")
    set_axis(axes, "y", padded(shown), up, "\n".join(wrapped(name, 8.0, width=0.75 * TALL)), inches=TALL)
    set_axis(axes, "x", padded([*at, *curve_at], 0.02), across, evidence.axis, inches=width)
    axes.legend(
        loc="lower left", bbox_to_anchor=(0, 1.0), ncols=4, borderaxespad=0.2, columnspacing=1.3, handlelength=1.8
    )


def _curve(axes: Axes, at: Array, parts: Array, label: str, **given: Any) -> None:
    """Draw a curve, or each part of a complex one; a single value as a level line."""
    for n, part in enumerate(parts):
        named = {"label": label, "linewidth": 1.3, **given} if n == 0 else {"linewidth": 1.3, **given}
        if part.size == 1:
            axes.axhline(float(part[0]), **named)
        else:
            axes.plot(at, part, **named)


def _parts(values: Any) -> Array:
    """Real and imaginary part as rows; one row where there is none."""
    values = np.asarray(values)
    return np.array([values.real, values.imag]) if np.iscomplexobj(values) else values[None, :].astype(np.float64)


def _ruler(axes: Axes, judgement: Judgement, width: float) -> None:
    """Draw what was found with its own error beside what is allowed."""
    assert judgement.expected is not None
    assert judgement.finding.value is not None
    expected, found, within = judgement.expected.value, judgement.finding.value, judgement.within or 0.0
    error = judgement.finding.fit_error or 0.0
    error = error if math.isfinite(error) else 0.0
    ends = [expected - within, expected + within, found - error, found + error]
    unit = unit_for(ends, judgement.finding.unit)
    axes.axvspan(ends[0] / unit.size, ends[1] / unit.size, color=BAND, linewidth=0)
    axes.axvline(expected / unit.size, color=EXPECTED, linestyle=DASHED, linewidth=1.2)
    bar = [error / unit.size] if error else None
    axes.errorbar([found / unit.size], [0.0], xerr=bar, fmt="o", color=FIT, ms=5, capsize=2.2, elinewidth=1.3)
    axes.set_ylim(-1, 1)
    axes.set_yticks([])
    axes.spines["left"].set_visible(False)
    axes.grid(visible=False)
    kind = str(getattr(judgement.expect.measure, "kind", "") or "value").replace("_", " ")
    set_axis(axes, "x", padded([end / unit.size for end in ends], 0.15), unit, kind, inches=width)
    axes.text(-0.012, 0.5, judgement.word, transform=axes.transAxes, ha="right", va="center", size=8.5, color=INK)
