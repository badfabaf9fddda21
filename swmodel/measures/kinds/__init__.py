"""What an expectation can measure: one class a kind, and their table. How to add one stands in `base`."""

from __future__ import annotations

from ...choices import one_of
from .amplitude import Amplitude
from .base import Measure, OwnMeasure
from .change import Change
from .decay import DecayLength
from .energy import EnergyRatio
from .oscillation import Frequency, PhaseSpeed

__all__ = [
    "MEASURES",
    "Amplitude",
    "Change",
    "DecayLength",
    "EnergyRatio",
    "Frequency",
    "Measure",
    "MeasureSettings",
    "OwnMeasure",
    "PhaseSpeed",
]

MEASURES: dict[str, type[Measure]] = {
    "amplitude": Amplitude,
    "decay_length": DecayLength,
    "frequency": Frequency,
    "phase_speed": PhaseSpeed,
    "energy_ratio": EnergyRatio,
    "change": Change,
}

MeasureSettings = one_of(MEASURES)
