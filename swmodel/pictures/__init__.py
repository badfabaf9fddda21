"""Pictures: one function a figure, drawn from what a run left on disk.

To add a figure:

1. Write a function in a file of its own that takes a `Scene` and returns its `Drawing` (or several); each paints a
   `Page`. The plotting library is imported inside functions only: listings read this table.
2. Add a row to `FIGURES`. The tests that hold for every row run on it unasked.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from ..choices import did_you_mean
from ..errors import Fault, RequestError
from .energy import energy_drawings
from .expectation import expectation_drawings
from .fieldmap import map_drawings
from .page import our_style, write_image
from .scene import Drawing, NoPictureError, Scene, short_caution
from .section import section_drawings
from .timedistance import time_distance_drawings

__all__ = ["FIGURES", "Picture", "draw"]

FOLDER = "figures"

log = logging.getLogger(__name__)


@dataclass(frozen=True)
class Picture:
    """A row of `FIGURES`.

    Parameters
    ----------
    drawings : callable
        Takes a `Scene` and returns what is to be drawn, each with the name of its file.
    meaning, source : str
        One line, and where it was published, or "common practice".
    """

    drawings: Callable[[Scene], list[Drawing]]
    meaning: str
    source: str


FIGURES: dict[str, Picture] = {
    "map": Picture(
        map_drawings,
        "elevation in colour and velocity as arrows, at the start and at the end",
        "common practice",
    ),
    "time_distance": Picture(
        time_distance_drawings,
        "elevation against time along a line: which way signals go, and how fast",
        "Hovmöller 1949, Tellus 1",
    ),
    "section": Picture(
        section_drawings,
        "elevation and velocity along a line, at the start and settled, with theory on top",
        "common practice; theory of the step from Rossby 1938, J. Mar. Res. 1",
    ),
    "energy": Picture(
        energy_drawings,
        "kinetic and potential energy against time, their drift, and how the budget closes",
        "common practice",
    ),
    "expectation": Picture(
        expectation_drawings,
        "for each expectation its points, the fit, the same curve with the expected value, and the verdict",
        "common practice",
    ),
}


def draw(run_folder: Path | str, only: Sequence[str] | None = None) -> list[Path]:
    """Draw a run's figures into its folder ``figures/``.

    Parameters
    ----------
    run_folder : Path or str
        The run's folder.
    only : sequence of str, optional
        Names in `FIGURES`; all of them by default.

    Returns
    -------
    list of Path
        The images. What cannot be drawn from what was stored is left out, and the log says why.

    Raises
    ------
    RequestError
        Where a name is not in `FIGURES`, or the folder is not a run's.
    MachineError
        Where the run cannot be read or an image not be written.
    """
    from ..store.durable import make_folder

    names = list(FIGURES) if only is None else list(only)
    if faults := list(_unknown(names)):
        raise RequestError(faults)
    scene = Scene.of(run_folder)
    drawings = {drawing.name: drawing for name in names for drawing in FIGURES[name].drawings(scene)}
    folder = Path(run_folder) / FOLDER
    make_folder(folder)
    paths = []
    with our_style():
        for drawing in drawings.values():
            try:
                page = drawing.paint()
            except NoPictureError as reason:
                log.warning("no figure %s: %s", drawing.name, reason)
                continue
            path = folder / f"{drawing.name}.png"
            write_image(path, page.png(scene.software, short_caution()))
            paths.append(path)
    return paths


def _unknown(names: Sequence[str]) -> Iterator[Fault]:
    for name in names:
        if name not in FIGURES:
            yield Fault((), f'there is no figure "{name}"', f"one of {', '.join(FIGURES)}", did_you_mean(name, FIGURES))
