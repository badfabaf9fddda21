"""Sums of the time series against plain NumPy and against values known by hand; the energy budget of a step."""

from __future__ import annotations

import math

import numpy as np
import pytest
from flows import (
    EDGE_NAMES,
    EDGES,
    FULL,
    LINEAR,
    PAIRWISE,
    SEEDS,
    SIZES,
    SLIPS,
    UNEVEN,
    equations_of,
    make_basin,
    make_state,
    plain_of,
    random_basin,
    random_flow,
    time_settings,
)
from hypothesis import given, settings

from swmodel.diagnostics.budgets import EnergyBudget
from swmodel.diagnostics.sums import plain_sums, sums
from swmodel.dynamics.tendency import EULER
from swmodel.steppers import STEPPERS, advance


def setup_of(equations):
    return equations.setup(EULER, 1.0)


# sums know no flux: four rows compile every choice of the rest
FEW = [pytest.param(row, id=str(row), marks=() if row in PAIRWISE[:4] else pytest.mark.slow) for row in PAIRWISE]


@pytest.mark.parametrize("of", FEW)
@settings(max_examples=25)
@given(edges=EDGE_NAMES, slip=SLIPS, size=SIZES, seed=SEEDS)
def test_the_compiled_sums_are_the_plain_ones_to_round_off(of, edges, slip, size, seed):
    rng = np.random.default_rng(seed)
    basin = random_basin(rng, of, *size, edges, slip)
    equations = equations_of(basin, of)
    state = make_state(equations, random_flow(rng, basin.grid))
    found = sums(state.sets[0:3], setup_of(equations), basin)
    expected = plain_sums(state.sets[0:3], plain_of(basin, of).basin, linear=of.linear)
    area = basin.grid.Lx * basin.grid.Ly
    # sums that may cancel, against what they are sums of
    flow = math.sqrt(2 * expected["energy_kinetic"] * expected["mass"])
    pv = max(abs(expected["pv_min"]), abs(expected["pv_max"]))
    largest = {
        "circulation": expected["vorticity_rms"] * area,
        "momentum_x": flow,
        "momentum_y": flow,
        "pv_min": pv,
        "pv_max": pv,
    }
    assert found.keys() == expected.keys()
    for name, value in found.items():
        # 1/dx, depth and f are of the fields' precision, and enter a few times
        room = 16 * float(np.finfo(basin.grid.dtype).eps) * largest.get(name, abs(expected[name]))
        assert value == pytest.approx(expected[name], rel=0, abs=room), name


def test_sums_of_a_uniform_flow_are_known_by_hand():
    # 6 x 4 cells of 2 m x 3 m: 144 m2 of water 1 m deep, raised by 0.25 m, g = 4 m s-2, f = 2 s-1, flow (3, 1) m/s
    basin = make_basin(6, 4, 2.0, 3.0, gravity=4.0, f=2.0)
    u, v, eta = (np.ones(basin.grid.shape(where)) for where in ("u", "v", "centre"))
    equations = equations_of(basin, FULL)
    found = sums(make_state(equations, (3 * u, v, 0.25 * eta)).sets[0:3], setup_of(equations), basin)
    expected = {
        "mass": 180.0,
        "energy_kinetic": 180.0 * (9 + 1) / 2,
        "energy_potential": 4 * 0.25**2 / 2 * 144,
        "potential_enstrophy": 1.25 * (2 / 1.25) ** 2 / 2 * 144,
        "circulation": 0.0,
        "momentum_x": 540.0,
        "momentum_y": 180.0,
        "speed_max": math.sqrt(10),
        "pv_min": 1.6,
        "pv_max": 1.6,
        "rossby_number": 0.0,
        "froude_number": math.sqrt(10 / (4 * 1.25)),
        "divergence_rms": 0.0,
        "vorticity_rms": 0.0,
    }
    assert found == pytest.approx(expected, rel=1e-15)  # some ten roundings of exact binary fractions


def test_the_vorticity_at_no_slip_walls_counts_into_circulation():
    # Stokes: with no slip the flow along the walls is 0, so that the circulation of the whole box is 0
    basin = make_basin(9, 7, 1.3, 0.8, edges=EDGES["box"], slip="none")
    equations = equations_of(basin, FULL)
    fields = random_flow(np.random.default_rng(5), basin.grid)
    found = sums(make_state(equations, fields).sets[0:3], setup_of(equations), basin)
    # round-off of a hundred vorticities of order 1
    assert abs(found["circulation"]) < 1e-13 * 63


# -------------------------------------------------------------------------------------------- the energy budget


def begun(of, edges, stepper, *, dt=0.03, seed=7, slip="free", steps=3):
    """A random flow a few steps on its way, its equations and settings."""
    rng = np.random.default_rng(seed)
    basin = random_basin(rng, of, 14, 11, edges, slip)
    equations = equations_of(basin, of)
    chosen = time_settings(stepper)
    state = make_state(equations, random_flow(rng, basin.grid, 0.3, 0.1))
    advance(state, steps, dt, equations, chosen, first=STEPPERS[stepper].levels == 2)
    return state, equations, chosen


def energy(level, equations):
    found = plain_sums(level, equations.basin, linear=equations.linear)
    return found["energy_kinetic"] + found["energy_potential"]


@pytest.mark.parametrize("stepper", STEPPERS)
@pytest.mark.parametrize("of", [FULL, LINEAR, UNEVEN], ids=str)
@pytest.mark.parametrize("edges", EDGES)
def test_the_energy_budget_closes_to_round_off(edges, of, stepper):
    dt = 0.03
    state, equations, chosen = begun(of, edges, stepper, dt=dt)
    terms = EnergyBudget(equations, chosen).rates(state, dt)
    largest = max(abs(terms[name]) for name in ("kinetic", "potential", "filter", "change"))
    # the claim; an identity (equation 8), so that only round-off of some hundred products is left
    assert abs(terms["residual"]) < 1e-12 * largest
    assert terms["residual"] == terms["change"] - terms["time_stepping"] - terms["filter"]
    assert (terms["filter"] != 0) == (stepper == "leapfrog")


@pytest.mark.parametrize("stepper", STEPPERS)
@pytest.mark.parametrize("of", [FULL, LINEAR, UNEVEN], ids=str)
@pytest.mark.parametrize("edges", ["periodic", "box"])
def test_the_budgets_change_is_that_of_the_step_that_follows(edges, of, stepper):
    dt = 0.03
    state, equations, chosen = begun(of, edges, stepper, dt=dt, slip="none")
    leaps = stepper == "leapfrog"
    before = energy(state.sets[3:6] if leaps else state.sets[0:3], equations)
    change = EnergyBudget(equations, chosen).rates(state, dt)["change"]
    advance(state, 1, dt, equations, chosen)
    span = 2 * dt if leaps else dt
    # a difference of two energies, each rounded
    room = 16 * np.finfo(float).eps * before / span
    assert change == pytest.approx((energy(state.sets[0:3], equations) - before) / span, abs=room)


def test_the_budget_of_leapfrogs_first_step_is_that_of_one_of_ssprk3():
    state, equations, _ = begun(FULL, "periodic", "ssprk3")
    leap, one = (
        EnergyBudget(equations, time_settings(name)).rates(state, 0.03, first=True) for name in ("leapfrog", "ssprk3")
    )
    assert leap == one


@pytest.mark.parametrize("stepper", STEPPERS)
def test_taking_the_budget_changes_nothing(stepper):
    found = []
    for take in (False, True):
        state, equations, chosen = begun(FULL, "box", stepper)
        if take:
            EnergyBudget(equations, chosen).rates(state, 0.03)
        advance(state, 2, 0.03, equations, chosen)
        found.append([field.copy() for k in range(STEPPERS[stepper].levels) for field in state.level(k)])
    for one, other in zip(*found, strict=True):
        assert np.array_equal(one, other)


@pytest.mark.parametrize(("stepper", "order"), [("ssprk3", 3), ("rk4", 5)])
def test_what_time_stepping_brings_falls_with_the_step_at_its_order(stepper, order):
    # in space nothing is lost, so that only the step's own error is left: p^4/24 a step of ssprk3, p^6/144 of rk4
    # (Durran 2010), over dt
    remainder = []
    for dt in (0.08, 0.04):
        state, equations, chosen = begun(FULL, "periodic", stepper, steps=0)
        remainder.append(EnergyBudget(equations, chosen).rates(state, dt)["time_stepping"])
    # the next order makes up some per cent at these steps
    assert math.log2(remainder[0] / remainder[1]) == pytest.approx(order, abs=0.2)


def test_kinetic_and_potential_energy_feed_each_other():
    # what one gains in a step the other loses, but for the time step's own error of p^3 = (0.03 3)^3 at most
    state, equations, chosen = begun(FULL, "box", "ssprk3")
    terms = EnergyBudget(equations, chosen).rates(state, 0.03)
    assert abs(terms["kinetic"]) > 0
    assert terms["kinetic"] == pytest.approx(-terms["potential"], rel=1e-3)


def test_in_single_precision_the_budget_closes_to_the_round_off_of_the_fields():
    dt = 0.03
    state, equations, chosen = begun(PAIRWISE[2], "box", "rk4", dt=dt)
    terms = EnergyBudget(equations, chosen).rates(state, dt)
    # each value is rounded a few times a step, at random
    room = np.finfo(np.float32).eps * energy(state.sets[0:3], equations) / dt
    assert abs(terms["residual"]) < room
