"""What a run may start from: one class a kind, and their table. How to add one stands in `base`."""

from __future__ import annotations

from ...choices import one_of
from .base import FlowStart, OwnStart, Start, SurfaceStart
from .flows import Jet, Perturbation, Vortex
from .given import FileStart, FormulaStart, RunStart
from .shapes import Bump, Front, Rest, Step
from .waves import KelvinWave, PoincareWave, RossbyWave

__all__ = [
    "STARTS",
    "Bump",
    "FileStart",
    "FlowStart",
    "FormulaStart",
    "Front",
    "Jet",
    "KelvinWave",
    "OwnStart",
    "Perturbation",
    "PoincareWave",
    "Rest",
    "RossbyWave",
    "RunStart",
    "Start",
    "StartSettings",
    "Step",
    "SurfaceStart",
    "Vortex",
]

STARTS: dict[str, type[Start]] = {
    "rest": Rest,
    "step": Step,
    "front": Front,
    "bump": Bump,
    "vortex": Vortex,
    "jet": Jet,
    "poincare_wave": PoincareWave,
    "kelvin_wave": KelvinWave,
    "rossby_wave": RossbyWave,
    "formula": FormulaStart,
    "file": FileStart,
    "run": RunStart,
}

StartSettings = one_of(STARTS)
