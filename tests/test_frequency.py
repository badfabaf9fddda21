"""The largest frequency of the discrete operator, against all eigenvalues of its matrix."""

from __future__ import annotations

import numpy as np
import pytest
from flows import EDGE_NAMES, EDGES, SEEDS, Combination, beta_plane, make_basin, random_basin
from hypothesis import given, settings
from hypothesis import strategies as st

from swmodel.dynamics import PV_FLUXES
from swmodel.dynamics.frequency import SAFETY, TOLERANCE, iterated_frequency, largest_frequency
from swmodel.dynamics.plain import PlainEquations

SMALL = st.tuples(st.integers(1, 6), st.integers(1, 6))


def all_frequencies(basin, name):
    """Imaginary parts of the eigenvalues of the linear operator, one column for each free value of u, v and eta."""
    grid = basin.grid
    plain = PlainEquations(basin, PV_FLUXES[name], linear=True)
    free = [np.ones(grid.shape(location), bool) for location in ("u", "v", "centre")]
    free[0][:, -1] = free[1][-1] = False
    free[0][:, 0] &= grid.periodic_x
    free[1][0] &= grid.periodic_y
    columns = []
    for number, mask in enumerate(free):
        for j, i in np.argwhere(mask):
            fields = [np.zeros(one.shape) for one in free]
            fields[number][j, i] = 1
            if grid.periodic_x:
                fields[0][:, -1] = fields[0][:, 0]
            if grid.periodic_y:
                fields[1][-1] = fields[1][0]
            rates = plain.tendency(*fields)
            columns.append(np.concatenate([rate[one] for rate, one in zip(rates, free, strict=True)]))
    return np.abs(np.linalg.eigvals(np.array(columns)).imag)


@pytest.mark.parametrize("f", [0.0, 0.7, -0.7, 5.0, -5.0])
@pytest.mark.parametrize("edges", EDGES)
def test_on_an_f_plane_over_even_depth_the_bound_is_met(f, edges):
    # omega^2 = max(f^2, 4 g H (1/dx^2 + 1/dy^2)): the dispersion relation is linear in sin^2(k dx/2) and sin^2(l dy/2)
    # (Arakawa & Lamb 1977), so its largest value lies at an end; on even numbers of cells the wave 2 cells long exists
    basin = make_basin(4, 6, 1.3, 0.8, edges=EDGES[edges], gravity=1.2, depth=0.9, f=f)
    true = all_frequencies(basin, "both").max()
    found = largest_frequency(basin, 0.9, PV_FLUXES["both"])
    if edges == "periodic":
        # round-off of an eigenvalue solver on some 70 unknowns
        assert found == pytest.approx(true, rel=1e-12)
    assert found > true * (1 - 1e-12)


@settings(max_examples=60)
@given(size=SMALL, edges=EDGE_NAMES, seed=SEEDS, f_scale=st.floats(0.05, 30), flux=st.sampled_from(sorted(PV_FLUXES)))
def test_no_wave_is_faster_than_the_largest_frequency_over_rough_depth_with_rough_f(size, edges, seed, f_scale, flux):
    of = Combination(flux, "uneven", "field", True, "double")
    basin = random_basin(np.random.default_rng(seed), of, *size, edges)
    basin.__dict__["f"] = basin.f * f_scale
    found = largest_frequency(basin, float(np.max(basin.depth)), PV_FLUXES[flux])
    # white f is outside what the bound is made for; the step keeps 30 % away from it
    assert all_frequencies(basin, flux).max() < 1.01 * found


@settings(max_examples=30)
@given(size=SMALL, edges=EDGE_NAMES, seed=SEEDS, beta=st.floats(-3, 3))
def test_no_wave_is_faster_than_the_largest_frequency_on_a_beta_plane(size, edges, seed, beta):
    rng = np.random.default_rng(seed)
    dx, dy = rng.uniform(0.2, 2, 2)
    rough = rng.uniform(0.5, 1.5, (size[1], size[0]))
    f = beta_plane(float(rng.uniform(-3, 3)), beta, size[1] * dy / 2)
    basin = make_basin(*size, dx, dy, edges=EDGES[edges], depth=lambda x, y: rough, f=f)
    # round-off of an eigenvalue solver
    limit = largest_frequency(basin, float(rough.max()), PV_FLUXES["both"]) * (1 + 1e-12)
    assert all_frequencies(basin, "both").max() <= limit


@pytest.mark.parametrize("flux", PV_FLUXES)
@pytest.mark.parametrize("edges", EDGES)
def test_the_iteration_finds_the_largest_eigenvalue_from_below(flux, edges):
    for seed in range(3):
        of = Combination(flux, "uneven", "field", True, "double")
        basin = random_basin(np.random.default_rng(seed), of, 7, 5, edges)
        basin.__dict__["f"] = 10 * basin.f
        true = all_frequencies(basin, flux).max()
        found = iterated_frequency(basin, float(np.max(basin.depth)), PV_FLUXES[flux])
        # the iteration stops at a relative change of TOLERANCE, and the 5 % put on top cover what is missing
        assert true * (1 - 10 * TOLERANCE) < found < true * (1 + 1e-9)
        assert true < SAFETY * found


def test_a_thicker_layer_than_at_rest_is_allowed_for():
    # c = sqrt(g h): four times the thickness, twice the frequency
    basin = make_basin(4, 4, gravity=1.2, depth=0.9)
    one, four = (largest_frequency(basin, h, PV_FLUXES["both"]) for h in (0.9, 3.6))
    # a square root of a product
    assert four == pytest.approx(2 * one, rel=1e-15)
