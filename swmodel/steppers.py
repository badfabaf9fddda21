"""Time stepping: coefficients, claims, the largest stable step, and the step that hits every output time.

A method is its coefficients plus its claims; no physics here. Stages are written as
``out = base + (blend (y - base) + weight dt dy/dt)``, so that a constant stays constant to the last bit (equation 7 of
docs/equations.md).
"""

from __future__ import annotations

import datetime
import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Annotated, Any, Literal

import numpy as np
from pydantic import Field

from .choices import Choice, name_in
from .errors import Fault, RequestError
from .quantities import Speed, Time

if TYPE_CHECKING:
    from .dynamics.tendency import Equations
    from .state.state import State

MICROSECOND = Fraction(1, 1_000_000)
EPOCH = datetime.datetime(2000, 1, 1)


@dataclass(frozen=True)
class Stepper:
    """One row of `STEPPERS`.

    Parameters
    ----------
    stages : tuple of (blend, weight)
        Coefficients of the stages.
    quadrature : tuple of float
        b_i with y[n+1] = y[n] + dt sum_i b_i T(y_i): the share of each stage's tendency in a step.
    gathers : bool
        Whether the last stage starts from y + ((y1 - y) + 2 (y2 - y) + (y3 - y))/3.
    levels : int
        Time levels that a checkpoint must hold.
    order : int
        Claimed order in time, without filter.
    meaning, source : str
        One line, and where it was published.
    """

    stages: tuple[tuple[float, float], ...]
    quadrature: tuple[float, ...]
    gathers: bool
    levels: int
    order: int
    meaning: str
    source: str

    def amplification(self, p: float) -> complex:
        """Factor of one step on dy/dt = i omega y with p = omega dt, for the one-step methods."""
        z = 1j * p
        y: list[complex] = [1.0 + 0j]
        for s, (blend, weight) in enumerate(self.stages):
            last = s == len(self.stages) - 1
            base = 1 + sum(w * (y[k] - 1) for k, w in ((1, 1), (2, 2), (3, 1))) / 3 if last and self.gathers else 1.0
            y.append(base + blend * (y[-1] - base) + weight * z * y[-1])
        return y[-1]


def filtered_leapfrog_matrix(p: float, nu: float, alpha: float) -> np.ndarray[Any, np.dtype[np.complex128]]:
    """Amplification matrix of the filtered leapfrog on dy/dt = i omega y, from (y[n-1], y[n]) to (y[n], y[n+1]).

    Williams (2009, Mon. Wea. Rev. 137), his convention: d = (nu/2)(y[n-1] - 2 y[n] + y[n+1]); y[n] += alpha d;
    y[n+1] += (alpha - 1) d.
    """
    step = np.array([[0, 1], [1, 2j * p]], np.complex128)
    d = nu / 2 * (np.array([1, -2], np.complex128) + step[1])
    return np.array([step[0] + alpha * d, step[1] + (alpha - 1) * d])


def leapfrog_limit(nu: float, alpha: float) -> float:
    """Largest p = omega dt up to which both roots of the filtered leapfrog have modulus at most 1."""

    def stable(p: float) -> bool:
        return bool(np.abs(np.linalg.eigvals(filtered_leapfrog_matrix(p, nu, alpha))).max() <= 1 + 1e-12)

    from scipy.optimize import bisect

    grid = np.linspace(1e-3, 1.0, 400)
    unstable = [p for p in grid if not stable(float(p))]
    if not unstable:
        return 1.0
    first = float(unstable[0])
    return float(bisect(lambda p: 0.5 - stable(p), max(first - grid[1] + grid[0], 1e-6), first, xtol=1e-7))


def stability_limit(stepper: str, nu: float = 0.0, alpha: float = 1.0) -> float:
    """Largest stable omega dt on the imaginary axis (Durran 2010; numbers follow from the coefficients).

    Parameters
    ----------
    stepper : str
        Name in `STEPPERS`.
    nu, alpha : float
        Filter and Williams' correction, for leapfrog.
    """
    if stepper == "leapfrog":
        return leapfrog_limit(nu, alpha)
    return {"ssprk3": math.sqrt(3), "rk4": math.sqrt(8)}[stepper]


STEPPERS = {
    "ssprk3": Stepper(
        stages=((1.0, 1.0), (0.25, 0.25), (2 / 3, 2 / 3)),
        quadrature=(1 / 6, 1 / 6, 2 / 3),
        gathers=False,
        levels=1,
        order=3,
        meaning="three stages, third order, strong-stability preserving",
        source="Shu & Osher 1988, J. Comput. Phys. 77",
    ),
    "rk4": Stepper(
        stages=((0.0, 0.5), (0.0, 0.5), (0.0, 1.0), (0.0, 1 / 6)),
        quadrature=(1 / 6, 1 / 3, 1 / 3, 1 / 6),
        gathers=True,
        levels=1,
        order=4,
        meaning="the classical Runge-Kutta method, four stages, fourth order",
        source="Kutta 1901, Z. Math. Phys. 46",
    ),
    "leapfrog": Stepper(
        stages=((0.0, 2.0),),
        quadrature=(1.0,),
        gathers=False,
        levels=2,
        order=2,
        meaning="leapfrog with Robert-Asselin filter and Williams' correction",
        source="Asselin 1972, Mon. Wea. Rev. 100; Williams 2009, Mon. Wea. Rev. 137",
    ),
}

if TYPE_CHECKING:
    StepperName = str
else:
    StepperName = name_in(STEPPERS)


class TimeSettings(Choice):
    """`[time]`: the stepper, its step, and how long."""

    until: Annotated[Time, Field(gt=0, description="model time at the end, counted from 0")]
    stepper: StepperName = "ssprk3"
    step: Annotated[Time, Field(gt=0)] | Literal["auto"] = "auto"
    margin: Annotated[float, Field(gt=0, le=1, description="share of the stability limit that is used")] = 0.7
    speed: Annotated[Speed, Field(ge=0, description="largest flow speed expected")] | None = None
    start: Annotated[datetime.datetime, Field(description="date of model time 0, the epoch of the files")] = EPOCH
    filter: Annotated[float, Field(ge=0, lt=1, description="Robert-Asselin coefficient nu (leapfrog)")] = 0.1
    williams: Annotated[float, Field(ge=0, le=1, description="Williams' alpha (leapfrog); 1 is the plain filter")] = 0.7


@dataclass(frozen=True)
class StepChoice:
    """The step, and why.

    Parameters
    ----------
    dt : float
        Step, s.
    limit : float
        Largest step that keeps the margin, s.
    omega_max : float
        Largest frequency of the discrete operator, rad/s.
    advection : float
        U/dx + V/dy, 1/s.
    common : float
        Greatest common divisor of the times that must be hit, s.
    given : bool
        Whether the step was given.
    """

    dt: float
    limit: float
    omega_max: float
    advection: float
    common: float
    given: bool


def common_divisor(times: Sequence[float]) -> Fraction:
    """Greatest common divisor of times in whole microseconds, s."""
    whole = [round(Fraction(time) / MICROSECOND) for time in times]
    return math.gcd(*whole) * MICROSECOND


def choose_step(
    settings: TimeSettings,
    omega_max: float,
    advection: float,
    times: dict[str, float],
    default_every: float | None = None,
) -> StepChoice:
    """Choose the step: below the limit, and a whole number of them to every given time.

    Parameters
    ----------
    settings : TimeSettings
        `[time]`.
    omega_max : float
        Largest frequency of the discrete linear operator, rad/s.
    advection : float
        U/dx + V/dy of the largest flow, 1/s.
    times : dict
        The times that must be hit, s, by key: ``time.until``, ``output.every`` and so on.
    default_every : float, optional
        An interval that would be nice to hit, s; it is dropped where it would cost more than a factor 2.

    Raises
    ------
    RequestError
        Where a given step is above the limit or does not divide, or the times force the step below half its limit.
    """
    if settings.stepper == "leapfrog" and settings.filter > 0 and settings.williams <= 0.5:
        found = f"the filtered leapfrog with williams = {settings.williams:g} grows at every step"
        raise RequestError(Fault(("time", "williams"), found, "above 0.5, up to 1", "0.7 by default"))
    factor = stability_limit(settings.stepper, settings.filter, settings.williams)
    largest = factor / (omega_max + advection) if omega_max + advection > 0 else math.inf
    limit = settings.margin * largest
    short = min(times, key=lambda key: times[key])
    if times[short] < float(MICROSECOND):
        found = f"{times[short]:g} s is too short"
        raise RequestError(Fault(tuple(short.split(".")), found, "at least a microsecond, to which times are kept"))
    common = common_divisor(list(times.values()))
    if settings.step != "auto":
        return _given_step(settings.step, largest, limit, omega_max, advection, common, times)
    if default_every is not None:
        nice = common_divisor([float(common), default_every])
        if nice and _divided(nice, limit) > limit / 2:
            return StepChoice(_divided(nice, limit), limit, omega_max, advection, float(common), given=False)
    dt = _divided(common, limit)
    # output asked for that often is one thing; intervals that fit neither each other nor the step are another
    if float(common) < limit / 2 and float(common) < min(times.values()):
        names = ", ".join(f"{key} = {time:g} s" for key, time in times.items())
        raise RequestError(
            Fault(
                ("time", "step"),
                f"the times {names} have only {float(common):g} s in common, less than half the step of {limit:.4g} s "
                "that the margin allows",
                "intervals with a larger common divisor",
                f"round them to multiples of {_round_up(limit):g} s, or leave out the odd one",
            )
        )
    return StepChoice(dt, limit, omega_max, advection, float(common), given=False)


def _divided(common: Fraction, limit: float) -> float:
    """Largest step not above `limit` that divides `common`."""
    return float(common / max(1, math.ceil(float(common) / limit * (1 - 1e-12))))


def _round_up(limit: float) -> float:
    """A round number of seconds not below `limit`."""
    power = 10.0 ** math.floor(math.log10(limit))
    return next(m * power for m in (1, 2, 5, 10) if m * power >= limit)


def _given_step(
    dt: float,
    largest: float,
    limit: float,
    omega_max: float,
    advection: float,
    common: Fraction,
    times: dict[str, float],
) -> StepChoice:
    """Check a step that was given."""
    faults = []
    if dt > largest:
        faults.append(
            Fault(
                ("time", "step"),
                f"{dt:g} s is above the stability limit of {largest:.4g} s",
                f"at most {largest:.4g} s; the margin allows {limit:.4g} s",
                'shorten it, or write step = "auto"',
            )
        )
    for key, time in times.items():
        count = time / dt
        if abs(count - round(count)) * dt > float(MICROSECOND) or round(count) < 1:
            faults.append(
                Fault(
                    ("time", "step"),
                    f"{dt:g} s does not divide {key} = {time:g} s",
                    "a step that divides every given time",
                    f"for example {_divided(common, min(limit, dt)):.10g} s",
                )
            )
    if faults:
        raise RequestError(faults)
    return StepChoice(dt, limit, omega_max, advection, float(common), given=True)


def advance(
    state: State, steps: int, dt: float, equations: Equations, settings: TimeSettings, *, first: bool = False
) -> None:
    """Advance the state by whole steps in one compiled call.

    Parameters
    ----------
    state : State
        Present state, ghosts filled; changed in place, but for its time, which the model keeps.
    steps : int
        How many steps.
    dt : float
        The step, s.
    equations : Equations
        What the flow obeys.
    settings : TimeSettings
        Stepper, filter and correction.
    first : bool
        Whether leapfrog has no earlier level yet: its first step is then one of ssprk3.
    """
    from .dynamics.sweeps import run_leapfrog, run_one_step_methods

    if steps < 1:
        return
    equations.claim_threads()
    stepper = STEPPERS[settings.stepper]
    if stepper.levels == 1 or first:
        method = STEPPERS["ssprk3"] if first and stepper.levels == 2 else stepper
        count = 1 if method is not stepper else steps
        before = state.sets[0:3].copy() if method is not stepper else None
        setup = equations.setup(method.stages, dt, gathers=method.gathers)
        work = equations.workspace(len(method.stages))
        run_one_step_methods(equations.pv_flux.scheme, state.sets[0:6], count, work, setup, equations.bands)
        if before is not None:
            state.sets[3:6] = before
        state.steps += count
        if count == steps:
            return
        steps -= count
    setup = equations.setup(stepper.stages, dt)
    work = equations.workspace(1)
    number = state.grid.dtype.type
    run_leapfrog(
        equations.pv_flux.scheme,
        state.sets,
        steps,
        work,
        setup,
        equations.bands,
        number(settings.filter),
        number(settings.williams),
    )
    state.steps += steps
