"""What each PV flux keeps in space: rates of change of energy and potential enstrophy of random states."""

from __future__ import annotations

import numpy as np
import pytest
from flows import (
    EDGES,
    PAIRWISE,
    Combination,
    equations_of,
    fast_tendency,
    plain_of,
    random_basin,
    random_flow,
)

from swmodel.diagnostics.derived import Flow, corner_mean, vorticity
from swmodel.dynamics import PV_FLUXES

# round-off: sums of some 1e3 products, each with some ten roundings; the claim of the plan is 1e-12
ROUND_OFF = 1e-13
# a rate that is not conserved shows: random states lose shares of order one, averaged over some hundred cells
LOST = 1e-3


def face_means(h, grid):
    """Two-cell means of h on x-faces and y-faces; on walls the cell's own, where the velocity is 0 anyway."""
    x_mode, y_mode = ("wrap" if periodic else "edge" for periodic in (grid.periodic_x, grid.periodic_y))
    wide, tall = np.pad(h, ((0, 0), (1, 1)), mode=x_mode), np.pad(h, ((1, 1), (0, 0)), mode=y_mode)
    return (wide[:, 1:] + wide[:, :-1]) / 2, (tall[1:] + tall[:-1]) / 2


def energy_rates(basin, fields, rates, linear):
    """Terms of dE/dt, E = sum of h_u u^2/2 + h_v v^2/2 + g eta^2/2 over faces and cells (Sadourny 1975).

    Each face counts once: of two equal ends the first.
    """
    u, v, eta = fields
    du, dv, deta = rates
    h_u, h_v = face_means(basin.depth_field + (0 if linear else eta), basin.grid)
    kinetic = 0 if linear else (u[:, 1:] ** 2 + u[:, :-1] ** 2 + v[1:] ** 2 + v[:-1] ** 2) / 4
    return [(h_u * u * du)[:, :-1], (h_v * v * dv)[:-1], kinetic * deta, basin.gravity * eta * deta]


def enstrophy_rates(basin, fields, rates):
    """Terms of dZ/dt, Z = sum of h q^2/2 over corners, doubly periodic: q dzeta/dt - q^2/2 dh/dt."""
    grid = basin.grid
    edges = (grid.west, grid.east, grid.south, grid.north)
    known = {"depth": basin.depth, "f": basin.f, "dx": grid.dx, "dy": grid.dy, "edges": edges, "slip": "free"}
    zeta = vorticity(Flow(*fields, linear=False, **known))
    dzeta = vorticity(Flow(*rates, linear=False, **known))
    q = (basin.f + zeta) / corner_mean(basin.depth_field + fields[2], edges)
    dh = corner_mean(rates[2], edges)
    return [(q * dzeta)[:-1, :-1], (-(q**2) / 2 * dh)[:-1, :-1]]


def relative(terms):
    """Sum of terms over the sum of their absolute values."""
    everything = np.concatenate([np.ravel(term) for term in terms])
    return abs(everything.sum()) / np.abs(everything).sum()


def states(of, count, edges=tuple(EDGES), least=3):
    """Random basins and flows of a combination, dx != dy, over the given kinds of edges in turn.

    At least 3 cells wide: on 2 x 2 all corners are alike, no rate is left, and round-off stands against round-off.
    """
    for seed in range(count):
        rng = np.random.default_rng(seed)
        nx, ny = (int(n) for n in rng.integers(least, 16, 2))
        basin = random_basin(rng, of, nx, ny, edges[seed % len(edges)], ("free", "none")[seed % 2])
        yield basin, random_flow(rng, basin.grid)


@pytest.mark.parametrize("linear", [False, True], ids=["full", "linear"])
@pytest.mark.parametrize("name", [name for name, flux in PV_FLUXES.items() if flux.conserves_energy])
def test_energy_stays_on_every_domain(name, linear):
    # Sadourny 1975; Arakawa & Lamb 1981: on 100 random states over rough depth, f varying in x and y
    of = Combination(name, "uneven", "field", linear, "double")
    for basin, fields in states(of, 100):
        rates = plain_of(basin, of).tendency(*fields)
        assert relative(energy_rates(basin, fields, rates, linear)) < ROUND_OFF


@pytest.mark.parametrize("name", [name for name, flux in PV_FLUXES.items() if flux.conserves_enstrophy])
def test_potential_enstrophy_stays_on_doubly_periodic_domains(name):
    # Sadourny 1975; Arakawa & Lamb 1981
    of = Combination(name, "uneven", "field", False, "double")
    for basin, fields in states(of, 100, ("periodic",)):
        rates = plain_of(basin, of).tendency(*fields)
        assert relative(enstrophy_rates(basin, fields, rates)) < ROUND_OFF


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


def test_what_is_not_promised_is_not_kept():
    # so the sums above can fail: `energy` loses potential enstrophy, `enstrophy` energy
    for name, edges, terms in (
        ("energy", "periodic", enstrophy_rates),
        ("enstrophy", "periodic", lambda basin, fields, rates: energy_rates(basin, fields, rates, False)),
    ):
        of = Combination(name, "uneven", "field", False, "double")
        lost = []
        for basin, fields in states(of, 20, (edges,), least=8):
            lost.append(relative(terms(basin, fields, plain_of(basin, of).tendency(*fields))))
        assert np.median(lost) > LOST
