"""The table *Step*: its limit, what was chosen and why, and what it does to the waves of the set-up."""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..quantities import format_quantity
from ..steppers import STEPPERS, StepChoice, TimeSettings, filtered_leapfrog_matrix, stability_limit
from .facts import Facts, Wave
from .tables import Row, Table

ROUND_OFF = 1e-12  # phases and dampings below it are not told from none


@dataclass(frozen=True)
class WaveInSteps:
    """What the step does to a wave.

    Parameters
    ----------
    name : str
        What it is.
    frequency : float
        omega, rad/s.
    p : float
        omega dt.
    phase_ratio : float
        Frequency in steps over the exact one: above 1 the wave runs fast.
    damping : float
        Share of its amplitude that a step takes.
    lost : float
        Share that the whole run takes.
    """

    name: str
    frequency: float
    p: float
    phase_ratio: float
    damping: float
    lost: float

    def as_json(self) -> dict[str, Any]:
        """Return the numbers."""
        return {
            "name": self.name,
            "frequency": self.frequency,
            "omega_dt": self.p,
            "phase_ratio": self.phase_ratio,
            "damping_a_step": self.damping,
            "lost_by_the_end": self.lost,
        }


def amplification(settings: TimeSettings, p: float) -> complex:
    """Factor of one step on dy/dt = i omega y, p = omega dt; of the filtered leapfrog its physical root.

    Parameters
    ----------
    settings : TimeSettings
        Stepper, and filter and correction of leapfrog.
    p : float
        omega dt.
    """
    stepper = STEPPERS[settings.stepper]
    if stepper.levels == 1:
        return stepper.amplification(p)
    roots = np.linalg.eigvals(filtered_leapfrog_matrix(p, settings.filter, settings.williams))
    return complex(min(roots, key=lambda root: abs(root - cmath.exp(1j * p))))


def in_steps(settings: TimeSettings, wave: Wave, dt: float, steps: int) -> WaveInSteps:
    """Say what a step does to a wave.

    Parameters
    ----------
    settings : TimeSettings
        The stepper.
    wave : Wave
        The wave.
    dt : float
        The step, s.
    steps : int
        Steps to the end.

    Notes
    -----
    On the imaginary axis ssprk3 runs fast by p^4/30 and damps p^4/24 a step, rk4 runs slow by p^4/120 and damps
    p^6/144: the first terms of the expansion of the factor over exp(i p) (Durran 2010, section 2.3).
    """
    p = wave.frequency * dt
    # the error of one step is small: it is taken out of the factor before the logarithm, which would drown it
    error = amplification(settings, p) * cmath.exp(-1j * p) - 1
    logarithm = cmath.log(1 + error) if abs(error) > 1e-3 else error - error**2 / 2 + error**3 / 3
    ratio = 1 + logarithm.imag / p if p else 1.0
    return WaveInSteps(
        wave.name, wave.frequency, p, ratio, -math.expm1(logarithm.real), -math.expm1(steps * logarithm.real)
    )


def waves_in_steps(facts: Facts, step: StepChoice) -> tuple[WaveInSteps, ...]:
    """Say what the step does to the waves of the set-up.

    They are the start's own by theory, else the gravity wave of its smallest scale; inertial oscillations; and the
    fastest that the grid holds.
    """
    waves = list(facts.waves)
    if not waves and math.isfinite(facts.length):
        omega = math.hypot(facts.turning, facts.basin.wave_speed / facts.length)
        waves.append(Wave("gravity wave of scale L", omega))
    if facts.turning:
        waves.append(Wave("inertial oscillation", facts.turning))
    waves.append(Wave("fastest on the grid", step.omega_max))
    steps = max(1, round(facts.until / step.dt))
    return tuple(in_steps(facts.experiment.time, wave, step.dt, steps) for wave in waves if wave.frequency)


def step_table(facts: Facts, step: StepChoice) -> Table:
    """Say which step was chosen and why."""
    return Table("Step", tuple(_rows(facts, step)))


def used_share(facts: Facts, step: StepChoice, advection: float) -> float:
    """Share of the stability limit that the step uses, for a flow of so much U/dx + V/dy (1/s)."""
    time = facts.experiment.time
    return step.dt * (step.omega_max + advection) / stability_limit(time.stepper, time.filter, time.williams)


def _rows(facts: Facts, step: StepChoice) -> Iterator[Row]:
    time = facts.experiment.time
    row = STEPPERS[time.stepper]
    yield Row("stepper", time.stepper, note=f"order {row.order}: {row.meaning}")
    limit = stability_limit(time.stepper, time.filter, time.williams)
    yield Row("largest_omega_dt", limit, "", "on the imaginary axis; beyond it waves grow")
    yield Row(
        "limit", step.limit, "s", f"{time.margin:g} x {limit:.4g}/(omega_max + U/dx + V/dy); margin {time.margin:g}"
    )
    yield Row("chosen", step.dt, "s", _chosen(facts, step))
    yield Row("set_by", "waves" if step.omega_max >= step.advection else "flow", note=_set_by(facts, step))
    used = used_share(facts, step, step.advection)
    yield Row("used", used, "", "of the stability limit", shown=f"{100 * used:.3g} %")


def _chosen(facts: Facts, step: StepChoice) -> str:
    if step.given:
        return "given"
    if step.dt > step.limit * (1 - 1e-9):
        return "the limit itself"
    output = facts.experiment.output
    times = ["until", *(key for key in ("every", "diagnostics_every") if getattr(output, key))]
    return f"shortened to divide {' and '.join(times) if len(times) < 3 else ', '.join(times)}"


def _set_by(facts: Facts, step: StepChoice) -> str:
    """What makes up the limit."""
    grid = facts.grid
    f = float(np.abs(facts.basin.f).max())
    what = "rotation" if step.omega_max <= f * (1 + 1e-9) else "gravity waves over two cells"
    parts = f"{what}, omega_max = {format_quantity(step.omega_max, 'rad/s')}"
    if step.advection:
        share = step.advection / (step.omega_max + step.advection)
        speeds = " and ".join(format_quantity(one, "m/s") for one in facts.draft.flow or ())
        cells = f"{format_quantity(grid.dx, 'm')} and {format_quantity(grid.dy, 'm')}"
        parts += f"; flow of {speeds} over {cells}, {100 * share:.2g} % of it"
    return parts
