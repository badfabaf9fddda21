"""Fused kernels against the plain equations, on random states, for every combination of types and edges."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from flows import (
    ALL,
    EACH,
    EACH_PAIRWISE,
    EDGE_NAMES,
    EDGES,
    PAIRWISE,
    SEEDS,
    SIZES,
    SLIPS,
    equations_of,
    fast_tendency,
    plain_of,
    plain_run,
    random_basin,
    random_flow,
    run,
    stepped,
)
from hypothesis import given, settings
from hypothesis import strategies as st
from rates import ROUND_OFF, energy_rates, enstrophy_rates, relative, states

from swmodel.dynamics import PV_FLUXES
from swmodel.dynamics.tendency import Equations
from swmodel.steppers import STEPPERS


def largest_terms(plain, fields):
    """Largest terms of du/dt and dv/dt, and of deta/dt: what round-off is counted against."""
    basin = plain.basin
    dx, dy = basin.grid.dx, basin.grid.dy
    u, v, eta = (np.asarray(a, float) for a in fields)
    flow = max(np.abs(u).max(initial=0), np.abs(v).max(initial=0))
    h = basin.depth_field + (0 if plain.linear else eta)
    f_and_zeta = np.abs(basin.f).max() + (0 if plain.linear else 2 * flow * (1 / dx + 1 / dy))
    coriolis = f_and_zeta / h.min() * h.max() * flow * max(dx / dy, dy / dx)
    pressure = (basin.gravity * np.abs(eta).max() + (0 if plain.linear else flow**2)) * max(1 / dx, 1 / dy)
    return coriolis + pressure, h.max() * flow * (1 / dx + 1 / dy)


def test_the_fast_combinations_hold_every_pair_of_choices():
    for a, b in itertools.combinations(range(5), 2):
        everywhere = {(tuple(vars(row).values())[a], tuple(vars(row).values())[b]) for row in ALL}
        assert everywhere == {(tuple(vars(row).values())[a], tuple(vars(row).values())[b]) for row in PAIRWISE}


@pytest.mark.parametrize("of", EACH)
@settings(max_examples=40)
@given(edges=EDGE_NAMES, slip=SLIPS, size=SIZES, seed=SEEDS)
def test_the_fused_tendency_is_the_plain_one_to_round_off(of, edges, slip, size, seed):
    rng = np.random.default_rng(seed)
    basin = random_basin(rng, of, *size, edges, slip)
    fields = random_flow(rng, basin.grid)
    found = fast_tendency(equations_of(basin, of), fields)
    plain = plain_of(basin, of)
    expected = plain.tendency(*(a.astype(float) for a in fields))
    velocity, elevation = largest_terms(plain, fields)
    # each value is a sum of some twenty products of numbers rounded a few times: 4 units in the last place of the
    # largest term
    room = 4 * np.finfo(basin.grid.dtype).eps
    for own, right, size_of_term in zip(found, expected, (velocity, velocity, elevation), strict=True):
        assert own.dtype == basin.grid.dtype
        np.testing.assert_allclose(own, right, rtol=0, atol=room * size_of_term)


@pytest.mark.parametrize(("of", "stepper"), stepped(PAIRWISE))
@settings(max_examples=15)
@given(edges=EDGE_NAMES, slip=SLIPS, size=SIZES, seed=SEEDS, steps=st.integers(1, 4))
def test_steps_in_one_pass_are_those_of_the_papers_over_whole_fields(of, stepper, edges, slip, size, seed, steps):
    rng = np.random.default_rng(seed)
    basin = random_basin(rng, of, *size, edges, slip)
    fields = random_flow(rng, basin.grid, speed=0.3, eta=0.1)
    dt = 0.05
    found = run(equations_of(basin, of), fields, stepper, dt, steps)
    expected = plain_run(plain_of(basin, of), fields, stepper, dt, steps)
    # values of order 1 and dt T below that; 4 steps of 4 stages leave a few units in the last place each
    room = 32 * np.finfo(basin.grid.dtype).eps
    for own, right in zip(found, expected, strict=True):
        np.testing.assert_allclose(own, right, rtol=0, atol=room)


@pytest.mark.parametrize(("of", "stepper"), stepped(PAIRWISE))
@settings(max_examples=10)
@given(edges=EDGE_NAMES, slip=SLIPS, size=st.tuples(st.integers(1, 40), st.integers(3, 40)), seed=SEEDS)
def test_bits_depend_on_no_number_of_bands(of, stepper, edges, slip, size, seed):
    rng = np.random.default_rng(seed)
    basin = random_basin(rng, of, *size, edges, slip)
    fields = random_flow(rng, basin.grid, speed=0.3, eta=0.1)
    one, *others = (run(equations_of(basin, of, bands), fields, stepper, 0.05, 3) for bands in (1, 2, 3))
    for other in others:
        for own, right in zip(other, one, strict=True):
            assert np.array_equal(own, right)


@pytest.mark.parametrize("stepper", STEPPERS)
def test_bits_depend_on_no_number_of_threads(stepper):
    of = PAIRWISE[0]
    rng = np.random.default_rng(1)
    basin = random_basin(rng, of, 70, 96, "box")
    fields = random_flow(rng, basin.grid, speed=0.3, eta=0.1)
    flux = PV_FLUXES[of.pv_flux]
    found = [run(Equations(basin, flux, linear=of.linear, threads=n), fields, stepper, 0.05, 5) for n in (1, 2)]
    for one, two in zip(*found, strict=True):
        assert np.array_equal(one, two)


@pytest.mark.parametrize("of", EACH_PAIRWISE)
def test_both_ends_of_a_periodic_direction_stay_equal_and_walls_shut(of):
    for edges, periodic in (("periodic", True), ("box", False)):
        rng = np.random.default_rng(5)
        basin = random_basin(rng, of, 9, 7, edges)
        u, v, _ = run(equations_of(basin, of), random_flow(rng, basin.grid, 0.3, 0.1), "rk4", 0.05, 5)
        if periodic:
            assert np.array_equal(u[:, 0], u[:, -1])
            assert np.array_equal(v[0], v[-1])
        else:
            assert not u[:, [0, -1]].any()
            assert not v[[0, -1]].any()


@pytest.mark.parametrize(("of", "stepper"), stepped([row for row in PAIRWISE if row.depth == "uneven"]))
def test_rest_over_rough_topography_stays_rest_to_the_last_bit(of, stepper):
    # hydrostatics: pressure by eta, not h; in double and in single precision, whatever the edges
    for edges in EDGES:
        basin = random_basin(np.random.default_rng(2), of, 13, 9, edges)
        u, v, eta = (np.zeros(basin.grid.shape(where), basin.grid.dtype) for where in ("u", "v", "centre"))
        # a raised level is rest too; 0.1 has no exact binary form
        for level in (0.0, 0.1):
            found = run(equations_of(basin, of), (u, v, eta + basin.grid.dtype.type(level)), stepper, 0.2, 100)
            assert not found[0].any()
            assert not found[1].any()
            assert np.all(found[2] == basin.grid.dtype.type(level))


@pytest.mark.parametrize("of", [row for row in PAIRWISE if row.precision == "double"], ids=str)
def test_the_fused_kernels_keep_what_their_flux_keeps(of):
    flux = PV_FLUXES[of.pv_flux]
    for basin, fields in states(of, 100):
        rates = fast_tendency(equations_of(basin, of), fields)
        if flux.conserves_energy:
            assert relative(energy_rates(basin, fields, rates, of.linear)) < ROUND_OFF
    for basin, fields in states(of, 100, ("periodic",)):
        rates = fast_tendency(equations_of(basin, of), fields)
        if flux.conserves_enstrophy and not of.linear:
            assert relative(enstrophy_rates(basin, fields, rates)) < ROUND_OFF
