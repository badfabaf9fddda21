"""Balance on the grid: against closed forms, dense matrices, and the plain equations themselves."""

from __future__ import annotations

import math
import re
from typing import Any

import numpy as np
import pytest
from basins import (
    EDGES,
    EPSILON,
    HEMISPHERES,
    F,
    divergence,
    equations,
    largest,
    make_basin,
    start,
    uneven_depth,
    vorticity_inside,
)
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from swmodel.errors import RequestError
from swmodel.grid import Grid
from swmodel.state.balance import (
    ELEVATION_TOLERANCE,
    balanced_elevation,
    hold_on_walls,
    velocities,
)
from swmodel.state.poisson import solve_at_centres, solve_at_corners
from swmodel.state.starts import Jet, Vortex

Array = NDArray[np.float64]
FLUXES = ["energy", "enstrophy", "both"]


def random_streamfunction(grid: Grid, seed: int) -> Array:
    """Noise at corners, m2/s, made fit for the grid's edges."""
    psi = np.random.default_rng(seed).normal(size=grid.shape("corner")) * 1e4
    if grid.periodic_x:
        psi[:, -1] = psi[:, 0]
    if grid.periodic_y:
        psi[-1, :] = psi[0, :]
    return hold_on_walls(psi, grid)


# ------------------------------------------------------------------------------------------------ Poisson's equation


def dense_neumann(n: int, spacing: float, periodic: bool) -> Array:
    """Second difference at centres as a matrix, nothing through walls."""
    matrix = np.diag(np.full(n, -2.0)) + np.diag(np.ones(n - 1), 1) + np.diag(np.ones(n - 1), -1)
    if periodic:
        matrix[0, -1] += 1
        matrix[-1, 0] += 1
    else:
        matrix[0, 0] = matrix[-1, -1] = -1
    return matrix / spacing**2


@pytest.mark.parametrize("edges", EDGES)
@pytest.mark.parametrize("cells", [(7, 5), (8, 6), (3, 9)])
def test_the_elevation_solver_inverts_the_five_point_laplacian(edges: str, cells: tuple[int, int]) -> None:
    grid = make_basin(edges, cells=cells).grid
    nx, ny = cells
    laplacian = np.kron(np.eye(ny), dense_neumann(nx, grid.dx, grid.periodic_x))
    laplacian += np.kron(dense_neumann(ny, grid.dy, grid.periodic_y), np.eye(nx))
    source = np.random.default_rng(3).normal(size=(ny, nx))
    source -= source.mean()
    expected = (np.linalg.pinv(laplacian) @ source.ravel()).reshape(ny, nx)  # least norm: mean 0
    # the pseudo-inverse loses some digits to the condition number, here below 1e3
    np.testing.assert_allclose(solve_at_centres(source, grid), expected, rtol=0, atol=1e-12 * largest(expected))


@pytest.mark.parametrize("edges", ["channel along x", "channel along y", "box"])
def test_the_corner_solver_inverts_the_five_point_laplacian_with_nothing_on_walls(edges: str) -> None:
    grid = make_basin(edges, cells=(7, 6)).grid
    nx, ny = (7 if grid.periodic_x else 6), (6 if grid.periodic_y else 5)
    along_x, along_y = dense_neumann(nx, grid.dx, grid.periodic_x), dense_neumann(ny, grid.dy, grid.periodic_y)
    for matrix, spacing, periodic in ((along_x, grid.dx, grid.periodic_x), (along_y, grid.dy, grid.periodic_y)):
        if not periodic:  # held, not free
            matrix[0, 0] = matrix[-1, -1] = -2 / spacing**2
    laplacian = np.kron(np.eye(ny), along_x) + np.kron(along_y, np.eye(nx))
    source = np.random.default_rng(4).normal(size=(ny, nx))
    expected = np.linalg.solve(laplacian, source.ravel()).reshape(ny, nx)
    # condition number below 1e3
    np.testing.assert_allclose(solve_at_corners(source, grid), expected, rtol=0, atol=1e-12 * largest(expected))


# ------------------------------------------------------------------------------------------ streamfunctions and walls


@pytest.mark.parametrize("edges", ["channel along x", "channel along y", "box"])
@pytest.mark.parametrize("seed", [0, 1])
def test_holding_the_streamfunction_on_walls_stops_the_flow_through_them_and_adds_no_vorticity(
    edges: str, seed: int
) -> None:
    grid = make_basin(edges).grid
    x, y = grid.points("corner")
    # smooth, round the domain in periodic directions, and large on the walls
    wave = np.cos(2 * np.pi * x / grid.Lx + seed) + np.sin(4 * np.pi * y / grid.Ly + seed)
    psi = 1e5 * wave * (2 + np.cos(2 * np.pi * y / grid.Ly + 1))
    if grid.periodic_x:
        psi[:, -1] = psi[:, 0]
    if grid.periodic_y:
        psi[-1, :] = psi[0, :]
    free, held = velocities(psi, grid), velocities(hold_on_walls(psi, grid), grid)
    if not grid.periodic_x:
        assert not held[0][:, [0, -1]].any()
    if not grid.periodic_y:
        assert not held[1][[0, -1], :].any()
    # differences of psi over the cell, twice: some ten roundings of the largest
    round_off = 100 * EPSILON * largest(psi) / min(grid.dx, grid.dy) ** 2
    np.testing.assert_allclose(vorticity_inside(*held, grid), vorticity_inside(*free, grid), rtol=0, atol=round_off)
    assert largest(divergence(*held, grid)) <= round_off


def test_a_streamfunction_that_is_constant_along_walls_is_left_as_it_is_to_the_last_bit() -> None:
    grid = make_basin("channel along x").grid
    psi = np.broadcast_to(1e5 * np.tanh(grid.y_face / 7e4 + 0.3)[:, None], grid.shape("corner"))
    assert hold_on_walls(psi, grid) is psi


def test_a_vortex_by_a_straight_wall_is_carried_along_as_by_its_image() -> None:
    # a vortex of circulation G, anticlockwise, at a distance d north of a wall drifts eastward at G/(4 pi d):
    # Lamb 1932, Hydrodynamics, sec. 155
    basin = make_basin("box", cells=(200, 160), size=(2000e3, 1600e3))
    distance, radius, speed = 120e3, 20e3, 1.0
    vortex = Vortex(profile="gaussian", speed=speed, radius=radius, at=(0.0, -800e3 + distance), balance="none")
    u, _v, _eta = vortex.fields(basin)
    free = make_basin("box", cells=(400, 480), size=(4000e3, 4800e3))
    alone = vortex.model_copy(update={"at": (0.0, 0.0)}).fields(free)
    j, k = np.argmin(abs(basin.grid.y_face + 800e3 - distance)), np.argmin(abs(free.grid.y_face))
    drift = (u[j - 1, 100] + u[j, 100]) / 2 - (alone[0][k - 1, 200] + alone[0][k, 200]) / 2
    circulation = 2 * math.pi * radius * speed / (1 - math.exp(-1.25643))
    # the other walls, 1000 km and more away, and those round the lonely one are allowed some per cent
    assert drift == pytest.approx(circulation / (4 * math.pi * distance), rel=0.05)


# -------------------------------------------------------------------------------------------------- linear equations


@pytest.mark.parametrize("edges", EDGES)
@pytest.mark.parametrize("pv_flux", FLUXES)
@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
@settings(max_examples=5)
@given(seed=st.integers(0, 2**32 - 1))
def test_a_linear_flow_over_even_depth_from_a_corner_streamfunction_is_steady(
    edges: str, pv_flux: str, f0: float, seed: int
) -> None:
    # on the C-grid f times the four-point mean of the flow is the gradient of f times the mean of the corners'
    # streamfunction, whatever that is: plain algebra, from Arakawa & Lamb 1977
    basin = make_basin(edges, cells=(13, 10), f0=f0)
    grid, rates = basin.grid, equations(basin, pv_flux)
    u, v = velocities(random_streamfunction(grid, seed), grid)
    eta = balanced_elevation(u, v, basin, rates, linear=True)
    du, dv, deta = rates(u, v, eta, True)
    # some 50 roundings of the terms: f u, and g eta over a cell
    round_off = 50 * EPSILON * (F * largest(u, v) + 9.81 * largest(eta) / min(grid.dx, grid.dy))
    assert largest(du, dv) <= round_off
    assert largest(deta) <= 50 * EPSILON * 200 * largest(u, v) / min(grid.dx, grid.dy)
    assert abs(eta.mean()) <= 50 * EPSILON * largest(eta)


@pytest.mark.parametrize(
    "edges", ["box", *(pytest.param(edges, marks=pytest.mark.slow) for edges in EDGES if edges != "box")]
)
def test_a_balanced_linear_flow_is_unchanged_after_a_hundred_inertial_periods(edges: str) -> None:
    basin = make_basin(edges, depth=1.0)
    rates = equations(basin)
    part = Vortex(profile="shielded", speed=0.05, radius=60e3, at=(30e3, -40e3))
    made = start(basin, part)
    first = state = np.array([made.u, made.v, made.eta], dtype=object)
    step = 2 * np.pi / F / 16  # omega_max is 3.8e-4/s, so that omega dt stays under 1.73
    for _ in range(100 * 16):  # SSP-RK3: Shu & Osher 1988
        one = state + step * np.array(rates(*state, True), dtype=object)
        two = 0.75 * state + 0.25 * (one + step * np.array(rates(*one, True), dtype=object))
        state = state / 3 + 2 / 3 * (two + step * np.array(rates(*two, True), dtype=object))
    # round-off that neither grows nor, at zero frequency, is damped
    for now, before in zip(state, first, strict=True):
        np.testing.assert_allclose(now, before, rtol=0, atol=1e-12 * largest(before))


@pytest.mark.parametrize("edges", EDGES)
@pytest.mark.parametrize("pv_flux", FLUXES)
@pytest.mark.parametrize("linear", [True, False], ids=["linear", "full"])
@pytest.mark.parametrize("slip", ["free", "none"])
@settings(max_examples=3)
@given(seed=st.integers(0, 2**32 - 1))
def test_the_tendency_of_a_balanced_flow_has_no_divergence(
    edges: str, pv_flux: str, linear: bool, slip: str, seed: int
) -> None:
    cells = (14, 11)
    basin = make_basin(edges, cells=cells, f0=-F, beta=2e-11, plane="beta", depth=uneven_depth(cells), slip=slip)
    grid, rates = basin.grid, equations(basin, pv_flux)
    u, v = velocities(random_streamfunction(grid, seed), grid)
    eta = balanced_elevation(u, v, basin, rates, linear=linear)
    du, dv, _deta = rates(u, v, eta, linear)
    # what the last correction of eta, which is allowed to be that large, leaves behind: g times its Laplacian
    allowed = 9.81 * ELEVATION_TOLERANCE * largest(eta) * 4 * (1 / grid.dx**2 + 1 / grid.dy**2)
    assert largest(divergence(du, dv, grid)) <= allowed


# ---------------------------------------------------------------------------------------------------- full equations


def shielded_elevation(basin: Any, speed: float, radius: float) -> Array:
    """Elevation of the shielded vortex in gradient balance, mean 0: the integral of (f V + V^2/r)/g; Gill 1982."""
    x, y = basin.grid.points("centre")
    s = (x**2 + y**2) / radius**2
    eta = (-basin.frame.f0 * speed * radius * np.exp((1 - s) / 2) - speed**2 / 2 * np.exp(1 - s)) / basin.gravity
    return eta - eta.mean()


@pytest.mark.parametrize("f0", [F, -F, 0.0], ids=["north", "south", "still"])
@pytest.mark.parametrize("speed", [4.0, -4.0])
def test_a_gradient_balanced_vortex_has_the_elevation_of_the_gradient_wind_to_second_order(
    f0: float, speed: float
) -> None:
    errors = []
    radius = 50e3
    for n in (64, 128, 256):
        basin = make_basin("box", cells=(n, n), size=(640e3, 640e3), f0=f0)
        made = start(basin, Vortex(profile="shielded", speed=speed, radius=radius, balance="gradient"))
        errors.append(largest(made.eta - shielded_elevation(basin, speed, radius)))
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    # the scheme's order is 2, from below; the coarsest grid has 5 cells a radius
    assert (orders > 1.85).all()
    assert orders[-1] > 1.95
    # 20 cells a radius: (dx/radius)^2 of the elevation
    assert errors[-1] < 0.0025 * (F * abs(speed) * radius + speed**2) / 9.81


@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
@pytest.mark.parametrize("speed", [4.0, -4.0])
def test_a_gradient_balanced_vortex_is_steady_to_second_order(f0: float, speed: float) -> None:
    rates_left = []
    for n in (64, 128, 256):
        basin = make_basin("box", cells=(n, n), size=(640e3, 640e3), f0=f0)
        made = start(basin, Vortex(profile="shielded", speed=speed, radius=50e3, balance="gradient"))
        du, dv, deta = equations(basin)(made.u, made.v, made.eta, False)
        rates_left.append([largest(du, dv), largest(deta)])
    orders = np.log2(np.array(rates_left[:-1]) / rates_left[1:])
    # the scheme's order is 2, from below
    assert (orders[-1] > 1.9).all()
    # 20 cells a radius: (dx/radius)^2 of f V, and of V h/radius
    assert rates_left[-1][0] < 0.0025 * F * 4
    assert rates_left[-1][1] < 0.0025 * 4 * 200 / 50e3


def test_geostrophic_balance_leaves_the_centrifugal_force_and_gradient_balance_does_not() -> None:
    basin = make_basin("periodic", cells=(128, 128), size=(640e3, 640e3))
    left = {}
    for balance in ("none", "geostrophic", "gradient"):
        made = start(basin, Vortex(profile="shielded", speed=4.0, radius=50e3, balance=balance))
        du, dv, _deta = equations(basin)(made.u, made.v, made.eta, False)
        left[balance] = largest(divergence(du, dv, basin.grid))
    # without any elevation: f zeta, and what the centrifugal force adds; at the middle zeta = 2 sqrt(e) V/radius
    zeta = 2 * math.sqrt(math.e) * 4 / 50e3
    # 10 cells a radius: some (dx/radius)^2
    assert left["none"] == pytest.approx(F * zeta + zeta**2 / 2, rel=0.05)
    assert left["geostrophic"] == pytest.approx(zeta**2 / 2, rel=0.05)
    assert left["gradient"] < 1e-9 * left["geostrophic"]


def test_a_flow_too_fast_for_its_layer_is_refused_with_the_place_where_it_would_outcrop() -> None:
    basin = make_basin("box", cells=(32, 32), size=(640e3, 640e3), depth=1.0)
    with pytest.raises(RequestError) as refused:
        start(basin, Vortex(profile="shielded", speed=4.0, radius=50e3, balance="gradient"))
    (fault,) = refused.value.faults
    assert fault.key == ("start", 0, "balance")
    # the first of the four middle cells; -(f V r sqrt(e) + e V^2/2)/g + 1 m is -4.6 m, blurred by 20 km cells
    assert re.fullmatch(
        r"the elevation that would hold this flow leaves a thickness of -[34]\.\d+ m at x = -10000 m, y = -10000 m",
        fault.found,
    )
    assert fault.allowed == "a thickness above 0 everywhere"
    assert fault.remedy == 'a slower or narrower flow, a deeper layer, or balance = "none"'


# ------------------------------------------------------------------------------------------------------------ mirror


@pytest.mark.parametrize("balance", ["none", "geostrophic", "gradient"])
def test_the_mirror_image_of_a_start_north_for_south_is_the_start_of_the_other_hemisphere(balance: Any) -> None:
    # mirrored in y: y, v, f and the sense of turning change their signs; sizes are powers of 2, so that y is exact
    size, cells = (2.0**19, 2.0**19), (32, 32)
    north, south = (make_basin("channel along x", cells=cells, size=size, f0=f0) for f0 in (F, -F))
    place, radius = (2.0**16, 2.0**15), 2.0**15

    def parts(sense: int) -> list[Any]:
        at = place[0], sense * place[1]
        jet = Jet(speed=0.7, width=2.0**16, at=-sense * 2.0**14, balance=balance)
        return [Vortex(profile="shielded", speed=sense * 2.0, radius=radius, at=at, balance=balance), jet]

    one, other = start(north, *parts(1)), start(south, *parts(-1))
    if balance == "none":
        np.testing.assert_array_equal(one.u, other.u[::-1])
        np.testing.assert_array_equal(one.v, -other.v[::-1])
        np.testing.assert_array_equal(one.eta, other.eta[::-1])
        return
    # the wall's hold and the elevation come from transforms, which sum in another order
    np.testing.assert_allclose(one.u, other.u[::-1], rtol=0, atol=1e-14 * largest(one.u))
    np.testing.assert_allclose(one.v, -other.v[::-1], rtol=0, atol=1e-14 * largest(one.u))
    np.testing.assert_allclose(one.eta, other.eta[::-1], rtol=0, atol=1e-12 * largest(one.eta))


def test_rounds_that_do_not_close_in_are_refused_with_what_they_still_change() -> None:
    basin = make_basin("box")
    x, _y = basin.grid.points("u")

    def deaf(u: Array, v: Array, eta: Array, linear: bool) -> tuple[Array, Array, Array]:
        """Rates that eta does not change."""
        return 1e-6 * np.sin(2 * np.pi * x / basin.grid.Lx) + 0 * u, 0 * v, 0 * eta

    rest = np.zeros(basin.grid.shape("u")), np.zeros(basin.grid.shape("v"))
    with pytest.raises(RequestError) as refused:
        balanced_elevation(*rest, basin, deaf, linear=False)
    # after n equal corrections the last is 1/n of the whole
    assert str(refused.value).startswith(
        "balance: no balanced elevation was found: after 100 rounds it still changes by 0.01 of its size, with the "
    )
