"""What a run keeps: balanced linear flow, mass, and over ten eddy turnovers energy and potential enstrophy."""

from __future__ import annotations

import math
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from flows import (
    EDGES,
    FULL,
    LINEAR,
    equations_of,
    make_basin,
    plain_of,
    random_basin,
    random_flow,
    run,
    watched,
)

from swmodel.diagnostics.sums import sums
from swmodel.dynamics import PV_FLUXES
from swmodel.dynamics.frequency import largest_frequency
from swmodel.dynamics.tendency import EULER
from swmodel.state import build_start
from swmodel.state.balance import velocities
from swmodel.state.starts import Vortex
from swmodel.steppers import STEPPERS, stability_limit


@pytest.mark.parametrize("stepper", STEPPERS)
@pytest.mark.parametrize("edges", EDGES)
@pytest.mark.parametrize("f", [1.0, -1.0], ids=["north", "south"])
def test_a_balanced_linear_flow_is_unchanged_after_a_hundred_inertial_periods(f, edges, stepper):
    # an f-plane over even depth: u = -d psi/dy, v = d psi/dx from corners and eta = (f/g) times the four-corner mean of
    # psi are steady on the C-grid, term by term (psi is constant along walls)
    basin = make_basin(14, 11, 0.4, 0.5, edges=EDGES[edges], f=f)
    grid = basin.grid
    psi = np.random.default_rng(6).uniform(-1, 1, grid.shape("corner"))
    for periodic, first, last in (
        (grid.periodic_x, np.s_[:, 0], np.s_[:, -1]),
        (grid.periodic_y, np.s_[0], np.s_[-1]),
    ):
        if periodic:
            psi[last] = psi[first]
        else:
            psi[first] = psi[last] = 0.0
    u, v = velocities(psi, grid)
    eta = f * (psi[1:, 1:] + psi[1:, :-1] + psi[:-1, 1:] + psi[:-1, :-1]) / 4
    dt = 0.7 * stability_limit(stepper, 0.1, 0.7) / largest_frequency(basin, 1.0, PV_FLUXES["both"])
    steps = math.ceil(200 * math.pi / dt)
    found = run(equations_of(basin, LINEAR), (u, v, eta), stepper, dt, steps)
    worst = max(np.abs(b - a).max() / np.abs(a).max() for a, b in zip((u, v, eta), found, strict=True))
    # the claim; round-off of several thousand steps adds up to some 1e-14
    assert worst < 1e-12


@pytest.mark.parametrize("stepper", STEPPERS)
@pytest.mark.parametrize("of", [FULL, LINEAR], ids=str)
@pytest.mark.parametrize("edges", EDGES)
def test_mass_stays_to_round_off(of, edges, stepper):
    basin = random_basin(np.random.default_rng(3), of, 21, 17, edges)
    fields = random_flow(np.random.default_rng(4), basin.grid, 0.3, 0.1)
    found = run(equations_of(basin, of), fields, stepper, 0.05, 200)
    # continuity in flux form: what leaves one cell enters the next, to a rounding of eta a step and cell
    assert abs(found[2].mean() - fields[2].mean()) < 200 * np.finfo(float).eps * np.abs(fields[2]).max()


# ------------------------------------------------------------------------------- ten turnovers of an eddy

# an invented meeting of three shielded vortices in gradient balance, Rossby number 0.3, deformation radius 1
SPEED, RADIUS, LX, LY = 0.2, 1.0, 8.0, 7.0
TURNOVERS = 10 * 2 * math.pi * RADIUS / SPEED
EDDIES = [(SPEED, RADIUS, (2.5, 2.2)), (-SPEED, 0.8, (5.2, 4.4)), (0.8 * SPEED, 0.9, (4.7, 1.8))]


@cache
def eddies(n, edges):
    basin = make_basin(n, n, LX / n, LY / n, edges=EDGES[edges])
    parts = [
        Vortex(profile="shielded", speed=speed, radius=radius, at=at, balance="gradient")
        for speed, radius, at in EDDIES
    ]
    start = build_start(parts, basin, plain_of(basin, FULL).tendency, Path())
    return basin, (start.u, start.v, start.eta)


def drift(n, edges, stepper, p):
    """Change of energy and potential enstrophy over ten turnovers, relative, with omega_max dt close below p."""
    basin, fields = eddies(n, edges)
    equations = equations_of(basin, FULL)
    omega = largest_frequency(basin, 1 + float(fields[2].max()), PV_FLUXES["both"])
    steps = math.ceil(TURNOVERS * omega / p)
    setup = equations.setup(EULER, 1.0)
    first, last = watched(
        equations, fields, stepper, TURNOVERS / steps, 1, steps, lambda state: sums(state.sets[0:3], setup, basin)
    )
    energy = [one["energy_kinetic"] + one["energy_potential"] for one in (first, last)]
    enstrophy = [one["potential_enstrophy"] for one in (first, last)]
    return energy[1] / energy[0] - 1, enstrophy[1] / enstrophy[0] - 1


def order(coarse, fine):
    return math.log2(abs(coarse / fine))


CELLS = [pytest.param(32, id="32 cells"), pytest.param(64, id="64 cells", marks=pytest.mark.slow)]


@pytest.mark.parametrize("n", CELLS)
def test_over_ten_turnovers_ssprk3_loses_energy_and_potential_enstrophy_at_third_order(n):
    # `both` loses neither in space, and p^4/24 a step in time makes dt^3 over a given time (Durran 2010)
    coarse, fine = drift(n, "periodic", "ssprk3", 0.6), drift(n, "periodic", "ssprk3", 0.3)
    # the claim; the fastest of the waves leave 0.1 of the order of energy at p = 0.6
    assert order(coarse[0], fine[0]) > 2.8
    assert order(coarse[1], fine[1]) > 2.8


@pytest.mark.parametrize("n", CELLS)
@pytest.mark.parametrize("edges", ["periodic", "box"])
def test_over_ten_turnovers_rk4_loses_energy_at_fifth_order(edges, n):
    # p^6/144 a step makes dt^5 over a given time
    coarse, fine = drift(n, edges, "rk4", 0.5), drift(n, edges, "rk4", 0.25)
    assert order(coarse[0], fine[0]) > 4.8  # the claim


@pytest.mark.parametrize("n", CELLS)
def test_over_ten_turnovers_ssprk3_loses_energy_at_third_order_in_a_box(n):
    coarse, fine = drift(n, "box", "ssprk3", 0.6), drift(n, "box", "ssprk3", 0.3)
    assert order(coarse[0], fine[0]) > 2.8  # the claim


@pytest.mark.slow
@pytest.mark.parametrize("edges", ["periodic", "box"])
def test_over_ten_turnovers_rk4_keeps_energy_to_1e_10_at_a_tenth(edges):
    energy, _ = drift(32, edges, "rk4", 0.1)
    assert abs(energy) < 1e-10  # the claim


def test_in_a_box_potential_enstrophy_changes_at_a_rate_that_no_step_removes():
    # the wall vorticity is prescribed, and no simple wall rule keeps potential enstrophy (Ketefian & Jacobson 2009)
    changes = [drift(32, "box", "rk4", p)[1] for p in (1.0, 0.5)]
    # 3.4e-3 in ten turnovers on 32 cells; the step changes it in the fourth digit at most
    assert changes[0] == pytest.approx(-3.4e-3, rel=0.05)
    assert changes[1] == pytest.approx(changes[0], rel=1e-3)
