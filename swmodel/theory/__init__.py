"""Closed results for rotating shallow water: numbers in, numbers out; usable alone, and never fed by the model.

`THEORY` holds what an expectation can name. Fields of waves are in `structures`, the adjusting step in `adjustment`.
"""

from __future__ import annotations

import inspect
import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property

from ..errors import Fault, RequestError
from . import waves
from .adjustment import adjusted_kinetic_share
from .scales import (
    deformation_radius,
    gravity_wave_speed,
    inertial_frequency,
    inertial_period,
    inertial_turning,
)

__all__ = ["THEORY", "Theory"]


@dataclass(frozen=True)
class Theory:
    """A row of `THEORY`: a number that an expectation can name.

    Parameters
    ----------
    name : str
        Its name.
    function : callable
        Gives the number from keyword arguments, SI in and out.
    unit : str
        SI unit of the result, ``"1"`` for pure numbers.
    meaning, source : str
        One line, and where it was published.
    """

    name: str
    function: Callable[..., float]
    unit: str
    meaning: str
    source: str

    @cached_property
    def arguments(self) -> tuple[str, ...]:
        """Names of all arguments: of the fixed words gravity, depth, f0, beta, k, l, dx, dy, mode, edge, on_grid..."""
        return tuple(inspect.signature(self.function).parameters)

    @cached_property
    def needed(self) -> tuple[str, ...]:
        """Names of those without a default."""
        parameters = inspect.signature(self.function).parameters.values()
        return tuple(parameter.name for parameter in parameters if parameter.default is parameter.empty)

    def value(self, known: Mapping[str, object]) -> float:
        """Evaluate with whatever of the arguments is known; anything else in `known` is left alone, None is unknown.

        Raises
        ------
        RequestError
            Where a needed argument is missing, or there is no finite value here.
        """
        given = {name: known[name] for name in self.arguments if known.get(name) is not None}
        if missing := [name for name in self.needed if name not in given]:
            raise RequestError(Fault((), f"{self.name} needs {', '.join(missing)}", self.usage))
        value = self.function(**given)
        if not math.isfinite(value):
            raise RequestError(
                Fault((), f"{self.name} is infinite here", "", "without rotation there is no such scale")
            )
        return value

    @property
    def usage(self) -> str:
        """How it is written with its arguments."""
        words = [name if name in self.needed else f"[{name}]" for name in self.arguments]
        return f"{self.name} takes {', '.join(words)}" if words else f"{self.name} takes no argument"


_GILL_WAVES = "Gill 1982, chapter 8; on the C-grid Arakawa & Lamb 1977"
_KELVIN = "Thomson 1879; Gill 1982, chapter 10"
_ROSSBY = "Rossby 1939; Pedlosky 1987, chapter 3"
_MATSUNO = "Matsuno 1966, J. Meteor. Soc. Japan 44"

_ROWS = (
    Theory("gravity_wave_speed", gravity_wave_speed, "m/s", "c = sqrt(g H)", "Gill 1982, chapter 5"),
    Theory(
        "deformation_radius",
        deformation_radius,
        "m",
        "a = c/|f0|; on the equatorial plane sqrt(c/|beta|)",
        "Rossby 1938; Gill 1982, chapters 7 and 11",
    ),
    Theory("inertial_frequency", inertial_frequency, "rad/s", "|f0|", "Gill 1982, chapter 8"),
    Theory(
        "inertial_turning",
        inertial_turning,
        "rad/s",
        "-f0, the turning of the velocity vector; negative is clockwise",
        "Gill 1982, chapter 8",
    ),
    Theory("inertial_period", inertial_period, "s", "2 pi/|f0|", "Gill 1982, chapter 8"),
    Theory(
        "adjusted_kinetic_share",
        adjusted_kinetic_share,
        "1",
        "1/3: kinetic energy of the adjusted step over its released potential energy",
        "Rossby 1938; Gill 1982, chapter 7",
    ),
    Theory(
        "inertia_gravity_frequency",
        waves.inertia_gravity_frequency,
        "rad/s",
        "sqrt(f^2 + g H (k^2 + l^2))",
        _GILL_WAVES,
    ),
    Theory(
        "inertia_gravity_phase_speed",
        waves.inertia_gravity_phase_speed,
        "m/s",
        "that over k (over l where k = 0, or along y)",
        _GILL_WAVES,
    ),
    Theory("kelvin_frequency", waves.kelvin_frequency, "rad/s", "c times the wavenumber along the coast", _KELVIN),
    Theory(
        "kelvin_phase_speed",
        waves.kelvin_phase_speed,
        "m/s",
        "c, coast on the right where f > 0; positive toward +x or +y",
        _KELVIN,
    ),
    Theory("rossby_frequency", waves.rossby_frequency, "rad/s", "|beta k|/(k^2 + l^2 + 1/a^2)", _ROSSBY),
    Theory(
        "rossby_phase_speed",
        waves.rossby_phase_speed,
        "m/s",
        "-beta/(k^2 + l^2 + 1/a^2): westward where beta > 0",
        _ROSSBY,
    ),
    Theory(
        "equatorial_frequency",
        waves.equatorial_frequency,
        "rad/s",
        "omega^2/c^2 - k^2 - beta k/omega = (2 mode + 1) beta/c; mode -1 is the Kelvin wave",
        _MATSUNO,
    ),
    Theory(
        "equatorial_phase_speed",
        waves.equatorial_phase_speed,
        "m/s",
        "that over k, positive eastward",
        _MATSUNO,
    ),
)

THEORY: dict[str, Theory] = {row.name: row for row in _ROWS}
