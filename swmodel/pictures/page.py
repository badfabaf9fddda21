"""The page that every figure stands on: the experiment, the claim, the panels, and what a reader must know below."""

from __future__ import annotations

import io
import os
import re
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .colours import FAINT, GRID, INK

if TYPE_CHECKING:
    from matplotlib.axes import Axes

DPI = 200
WIDTH = 7.2  # inches: 1440 pixels
MARGIN = 0.3
INSIDE = WIDTH - 2 * MARGIN

OVER, HEAD, UNDER, NOTE = 8.0, 11.5, 8.5, 6.8  # sizes of type, points
LINE = 1.32 / 72  # inches of a line for each point of type
GAP = 0.12

STYLE: dict[str, Any] = {
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],  # comes with the plotting library, so that every machine has it
    "font.size": 8.0,
    "text.color": INK,
    "text.parse_math": False,  # a dollar in a title is a dollar
    "axes.edgecolor": FAINT,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.6,
    "axes.grid": True,
    "axes.axisbelow": True,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "grid.color": GRID,
    "grid.linewidth": 0.5,
    "xtick.color": FAINT,
    "ytick.color": FAINT,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.labelsize": 7.5,
    "ytick.labelsize": 7.5,
    "legend.frameon": False,
    "legend.fontsize": 7.8,
    "lines.linewidth": 1.4,
    "lines.solid_capstyle": "round",
}


@contextmanager
def our_style() -> Iterator[None]:
    """Draw in our own style, whatever the user's settings say, and leave those as they were."""
    import matplotlib.style

    with matplotlib.style.context(STYLE, after_reset=True), warnings.catch_warnings():
        # a title in a script that the typeface lacks shows boxes; the figure says so by itself
        warnings.filterwarnings("ignore", r"Glyph \d+", UserWarning)
        yield


class Page:
    """A figure of fixed width, laid out in inches from the top left corner of its content.

    Parameters
    ----------
    headline : str
        The claim, or what the figure shows, in a sentence.
    height : float
        Of the content, inches.
    over : str
        A small line above the headline: the experiment.
    under : str
        A line below it.
    notes : sequence of str
        What a reader must know, below the content; each begins a new line.
    """

    def __init__(
        self, headline: str, *, height: float, over: str = "", under: str = "", notes: Sequence[str] = ()
    ) -> None:
        from matplotlib.backends.backend_agg import FigureCanvasAgg
        from matplotlib.figure import Figure

        self.headline = re.sub(r"\s+", " ", headline).strip()
        head = [
            (line, size, weight, colour)
            for text, size, weight, colour in (
                (over, OVER, "normal", FAINT),
                (headline, HEAD, "bold", INK),
                (under, UNDER, "normal", INK),
            )
            for line in wrapped(text, size, weight)
        ]
        foot = [line for note in notes for line in wrapped(note, NOTE)]
        self._top = 0.22 + sum(size * LINE for _, size, _, _ in head) + GAP
        self.height = self._top + height + GAP + len(foot) * NOTE * LINE + 0.2
        self.figure = Figure(figsize=(WIDTH, self.height), dpi=DPI, facecolor="white")
        self._canvas = FigureCanvasAgg(self.figure)
        down = 0.22
        for line, size, weight, colour in head:
            self._write(line, down, size, weight, colour)
            down += size * LINE
        down = self._top + height + GAP
        for line in foot:
            self._write(line, down, NOTE, "normal", FAINT)
            down += NOTE * LINE

    def axes(self, left: float, top: float, width: float, height: float, **given: Any) -> Axes:
        """Return axes at a place of the content, inches; `left` counts from the margin.

        Parameters
        ----------
        left, top, width, height : float
            Inches; `top` is the distance of their upper side from the upper end of the content.
        **given
            Passed on to ``Figure.add_axes``.
        """
        bottom = self.height - self._top - top - height
        box = ((MARGIN + left) / WIDTH, bottom / self.height, width / WIDTH, height / self.height)
        return self.figure.add_axes(box, **given)

    def png(self, software: str, comment: str) -> bytes:
        """Return the figure as PNG, with its headline, origin and a comment inside."""
        image = io.BytesIO()
        about = {"Title": self.headline, "Software": software, "Comment": comment}
        self.figure.savefig(image, format="png", dpi=DPI, metadata=about)
        return image.getvalue()

    def _write(self, text: str, down: float, size: float, weight: str, colour: str) -> None:
        place = MARGIN / WIDTH, 1 - down / self.height
        self.figure.text(*place, text, size=size, weight=weight, color=colour, ha="left", va="top")


def wrapped(text: str, size: float, weight: str = "normal", width: float = INSIDE) -> list[str]:
    """Break a text into lines that fit a width in inches; words longer than a line are cut.

    Parameters
    ----------
    text : str
        Any text; line ends count as blanks.
    size : float
        Size of its type, points.
    weight : str
        ``"normal"`` or ``"bold"``.
    width : float
        Inches.
    """
    blank = word_width("x x", size, weight) - 2 * word_width("x", size, weight)
    lines: list[str] = []
    room = 0.0  # left on the last line
    for word in re.findall(r"[^ \t\r\n]+", text):  # a no-break space holds its words together
        needed = blank + word_width(word, size, weight)
        if needed <= room:
            lines[-1] += f" {word}"
            room -= needed
            continue
        while word_width(word, size, weight) > width and len(word) > 1:
            cut = next(n for n in range(len(word) - 1, 0, -1) if n == 1 or word_width(word[:n], size, weight) <= width)
            lines.append(word[:cut])
            word = word[cut:]
        lines.append(word)
        room = width - word_width(word, size, weight)
    return lines


@lru_cache(maxsize=4096)  # the last lines of all figures of a run are the same
def word_width(word: str, size: float, weight: str) -> float:
    """Measure a word as it will be drawn, inches."""
    from matplotlib.backends.backend_agg import RendererAgg
    from matplotlib.font_manager import FontProperties

    renderer: Any = RendererAgg(1, 1, DPI)  # type: ignore[no-untyped-call]
    face = FontProperties(family=STYLE["font.sans-serif"], size=size, weight=weight)
    return float(renderer.get_text_width_height_descent(word, face, False)[0]) / DPI


def write_image(path: Path, image: bytes) -> None:
    """Write a file that appears under its name whole, or not at all.

    Raises
    ------
    MachineError
        Where it cannot be written.
    """
    from ..store.durable import BESIDE, machine_errors

    partial = path.with_name(f"{path.name}.{os.getpid()}{BESIDE}")
    with machine_errors(path):
        try:
            partial.write_bytes(image)
            partial.replace(path)
        finally:
            partial.unlink(missing_ok=True)
