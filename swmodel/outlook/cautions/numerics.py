"""Cautions: schemes, step and threads; and what the start says of itself."""

from __future__ import annotations

import importlib
import sys
from collections.abc import Iterator

import numpy as np

from ...grid.domain import usable_cores
from ...quantities import format_quantity
from ..facts import Facts
from ..step import used_share
from .base import Caution


def growing_enstrophy_modes(facts: Facts) -> Iterator[Caution]:
    """A PV flux that lets energy grow over uneven depth."""
    if facts.draft.pv_flux.conserves_energy or facts.basin.even:
        return
    depth = facts.basin.depth_field
    name = facts.experiment.numerics.pv_flux
    low, high = (format_quantity(float(end), "m") for end in (depth.min(), depth.max()))
    yield Caution(
        f'the PV flux "{name}" has growing modes over uneven depth',
        f"the depth goes from {low} to {high}, and modes grow at up to 1.6 % of the largest frequency in a trial",
        'pv_flux = "both" or "energy"',
    )


def step_consumed(facts: Facts) -> Iterator[Caution]:
    """A step that leaves the flow less room than the margin."""
    step, start = facts.draft.step, facts.start
    if step is None or start is None:
        return
    u, v = (0.0, 0.0) if facts.linear else (float(np.abs(part).max()) for part in (start.u, start.v))
    used = used_share(facts, step, max(step.advection, u / facts.grid.dx + v / facts.grid.dy))
    margin = facts.experiment.time.margin
    speed = facts.experiment.time.speed
    if not facts.linear and speed is not None and speed < max(u, v):
        given, there = format_quantity(speed, "m/s"), format_quantity(max(u, v), "m/s")
        yield Caution(
            "the flow expected is slower than the start",
            f"[time] speed is {given}, and the start moves at {there}: with it the step uses {100 * used:.3g} % "
            "of the stability limit",
            "a larger speed, or leave it out",
        )
    elif used > margin * (1 + 1e-9):
        yield Caution(
            "the step uses up its margin",
            f"it takes {100 * used:.3g} % of the stability limit, and the margin is {100 * margin:.3g} %: a flow that "
            "speeds up may pass the limit",
            f'step = "auto", or at most {step.limit:.4g} s',
        )


def slow_threads(facts: Facts) -> Iterator[Caution]:
    """Threads without OpenMP; not asked where numba is not loaded anyway, since loading it takes a second."""
    threads = facts.experiment.numerics.threads or usable_cores()
    if threads < 2 or "numba" not in sys.modules:
        return
    try:
        importlib.import_module("numba.np.ufunc.omppool")
    except ImportError:
        yield Caution(
            "threads run without OpenMP",
            "the system's libgomp is missing: each parallel region takes some 60 microseconds instead of 1",
            "install libgomp (on Debian: apt install libgomp1)",
        )


def said_of_the_start(facts: Facts) -> Iterator[Caution]:
    """What the parts of the start themselves say."""
    if facts.start is not None:
        yield from map(Caution.from_text, facts.start.cautions)
