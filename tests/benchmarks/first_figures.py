"""Nanoseconds per cell and step of the fused kernels, beside the NumPy twin in one run; compile and start-up times.

    python tests/benchmarks/first_figures.py

Runs are interleaved (A B A B); medians are printed. Absolute times are this machine's; ratios travel.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from types import SimpleNamespace

import numpy as np

from swmodel.dynamics import PV_FLUXES
from swmodel.dynamics.plain import PlainEquations
from swmodel.dynamics.tendency import Equations
from swmodel.grid import Grid
from swmodel.state import State
from swmodel.steppers import advance

REPEATS = 5


def problem(n: int, threads: int) -> tuple[Equations, State]:
    """A doubly periodic flow over even depth on an f-plane."""
    grid = Grid(n, n, 1e4, 1e4, 0.0, 0.0)
    basin = SimpleNamespace(grid=grid, f=np.full((n + 1, n + 1), 1e-4), depth=1000.0, gravity=9.81)
    equations = Equations(basin, PV_FLUXES["both"], threads=threads)  # type: ignore[arg-type]
    state = State(grid, 2)
    state.eta[...] = np.random.default_rng(0).random((n, n))
    equations.fill(state.sets[0:3])
    return equations, state


def fused(n: int, threads: int, steps: int) -> float:
    """Nanoseconds per cell and step."""
    equations, state = problem(n, threads)
    settings = SimpleNamespace(stepper="ssprk3", filter=0.1, williams=0.7)
    advance(state, 2, 20.0, equations, settings)  # type: ignore[arg-type]
    begun = time.perf_counter()
    advance(state, steps, 20.0, equations, settings)  # type: ignore[arg-type]
    return (time.perf_counter() - begun) / steps / n**2 * 1e9


def plain(n: int) -> float:
    """The same of the NumPy twin: three tendencies and three combinations a step."""
    equations, state = problem(n, 1)
    twin = PlainEquations(equations.basin, PV_FLUXES["both"])
    y = [a.copy() for a in (state.u, state.v, state.eta)]
    begun = time.perf_counter()
    base = y
    for blend, weight in ((1.0, 1.0), (0.25, 0.25), (2 / 3, 2 / 3)):
        rates = twin.tendency(*y)
        y = [b + (blend * (a - b) + weight * 20.0 * rate) for a, b, rate in zip(y, base, rates, strict=True)]
    return (time.perf_counter() - begun) / n**2 * 1e9


def seconds(command: list[str], **environment: str) -> float:
    """Wall time of a whole process, median."""
    times = []
    for _ in range(3):
        begun = time.perf_counter()
        subprocess.run(command, check=True, capture_output=True, env={**os.environ, **environment})
        times.append(time.perf_counter() - begun)
    return statistics.median(times)


def main() -> None:
    """Print the table."""
    print(f"{'grid':>10} {'1 thread':>10} {'2 threads':>10} {'NumPy':>10} {'NumPy / 2 threads':>18}")
    for n, steps in ((128, 400), (512, 40), (2048, 4)):
        rows = [(fused(n, 1, steps), fused(n, 2, steps), plain(n)) for _ in range(REPEATS)]
        one, two, numpy = (statistics.median(column) for column in zip(*rows, strict=True))
        print(f"{n:>5} x {n:<4}{one:>8.1f} ns {two:>7.1f} ns {numpy:>7.0f} ns {numpy / two:>17.0f}")
    with tempfile.TemporaryDirectory() as folder:
        first = seconds_of_first_use(folder)
        second = seconds_of_first_use(folder)
    print(f"first use to first step, cold cache: {first:.1f} s; second process: {second:.2f} s")
    help_time = seconds([sys.executable, "-c", "from swmodel.cli import main; main(['--help'])"])
    nothing = seconds([sys.executable, "-c", "pass"])
    print(f"swmodel --help: {help_time:.3f} s; python -c pass: {nothing:.3f} s; ratio {help_time / nothing:.1f}")


def seconds_of_first_use(folder: str) -> float:
    """Wall time of a process that takes one step, with its compiled kernels kept in a folder."""
    begun = time.perf_counter()
    command = [sys.executable, __file__, "--first-use"]
    subprocess.run(command, check=True, env={**os.environ, "SWMODEL_CACHE": folder})
    return time.perf_counter() - begun


if __name__ == "__main__":
    if "--first-use" in sys.argv:
        fused(64, 1, 1)
    else:
        main()
