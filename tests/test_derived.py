"""Derived fields against flows whose vorticity, divergence and potential vorticity are known by hand."""

import numpy as np
import pytest

from swmodel.diagnostics.derived import DERIVED, corner_mean, derive
from swmodel.store.names import FIELDS

WALLS = ("wall", "wall", "wall", "wall")
PERIODIC = ("periodic", "periodic", "periodic", "periodic")
DX, DY = 3.0, 2.0


def centred(n, d):
    return (np.arange(n) - (n - 1) / 2) * d


def solid_rotation(rate, nx=6, ny=5):
    """u = -rate y, v = rate x on their faces: not a flow between walls, but exact inside."""
    u = np.broadcast_to(-rate * centred(ny, DY)[:, None], (ny, nx + 1)).copy()
    v = np.broadcast_to(rate * centred(nx, DX)[None, :], (ny + 1, nx)).copy()
    return u, v, np.zeros((ny, nx))


def take(name, u, v, eta, *, depth=10.0, f=1e-4, edges=WALLS, slip="free", linear=False):
    ny, nx = eta.shape
    f = np.broadcast_to(np.asarray(f, float), (ny + 1, nx + 1))
    return derive(name, u, v, eta, depth=depth, f=f, dx=DX, dy=DY, edges=edges, slip=slip, linear=linear)


def random_flow(rng, nx, ny, edges):
    """A flow with both ends: the last repeats the first where periodic, no flow through walls."""
    u, v, eta = rng.normal(size=(ny, nx + 1)), rng.normal(size=(ny + 1, nx)), rng.normal(size=(ny, nx))
    if edges[0] == "periodic":
        u[:, -1] = u[:, 0]
    else:
        u[:, [0, -1]] = 0
    if edges[2] == "periodic":
        v[-1] = v[0]
    else:
        v[[0, -1]] = 0
    return u, v, eta


def test_solid_rotation_has_twice_its_rate_as_vorticity_and_no_divergence():
    # kinematics: u = -W y, v = W x has zeta = 2 W; linear in x and y, so exact on the grid but for round-off
    u, v, eta = solid_rotation(0.25)
    assert np.allclose(take("vorticity", u, v, eta)[1:-1, 1:-1], 0.5, rtol=1e-14, atol=0)
    assert np.all(np.abs(take("divergence", u, v, eta)) < 1e-15)


def test_a_spreading_flow_has_the_sum_of_its_rates_as_divergence():
    # kinematics: u = A x, v = B y has divergence A + B, exact for linear fields
    nx, ny = 6, 5
    u = np.broadcast_to(0.3 * centred(nx + 1, DX)[None, :], (ny, nx + 1))
    v = np.broadcast_to(0.1 * centred(ny + 1, DY)[:, None], (ny + 1, nx))
    assert np.allclose(take("divergence", u, v, np.zeros((ny, nx))), 0.4, rtol=1e-14, atol=0)


def test_a_uniform_stream_has_its_own_speed():
    # |(3, 4)| = 5
    u, v, eta = np.full((4, 6), 3.0), np.full((5, 5), 4.0), np.zeros((4, 5))
    assert np.all(take("speed", u, v, eta) == 5.0)


def test_thickness_is_depth_and_elevation():
    u, v, eta = solid_rotation(0.0)
    assert np.all(take("h", u, v, eta + 0.5, depth=10.0) == 10.5)


def test_free_slip_walls_have_no_vorticity():
    u, v, eta = random_flow(np.random.default_rng(1), 6, 5, WALLS)
    zeta = take("vorticity", u, v, eta, slip="free")
    for side in (zeta[0], zeta[-1], zeta[:, 0], zeta[:, -1]):
        assert np.all(side == 0)


def test_no_slip_walls_have_the_vorticity_of_a_mirrored_flow():
    # a stream u = 1 along no-slip walls: -du/dy is -2 u/dy at the south wall, +2 u/dy at the north one
    ny, nx = 4, 5
    u, v, eta = np.ones((ny, nx + 1)), np.zeros((ny + 1, nx)), np.zeros((ny, nx))
    edges = ("periodic", "periodic", "wall", "wall")
    zeta = take("vorticity", u, v, eta, edges=edges, slip="none")
    assert np.all(zeta[0] == -2 / DY)
    assert np.all(zeta[-1] == 2 / DY)
    assert np.all(zeta[1:-1] == 0)
    # the same stream along y between western and eastern walls: dv/dx = 2 v/dx at the west, -2 v/dx at the east
    u, v = np.zeros((ny, nx + 1)), np.ones((ny + 1, nx))
    zeta = take("vorticity", u, v, eta, edges=("wall", "wall", "periodic", "periodic"), slip="none")
    assert np.all(zeta[:, 0] == 2 / DX)
    assert np.all(zeta[:, -1] == -2 / DX)


@pytest.mark.parametrize("edges", [PERIODIC, ("periodic", "periodic", "wall", "wall"), WALLS])
def test_circulation_of_all_corners_is_that_of_the_rim(edges):
    # Stokes: the sum of zeta over corners, each with its share of wet area, is 0 where nothing bounds the flow or
    # free-slip walls carry no vorticity of their own but the circulation of the innermost faces
    u, v, eta = random_flow(np.random.default_rng(2), 7, 5, edges)
    zeta = take("vorticity", u, v, eta, edges=edges)
    inner = zeta[:-1, :-1] if edges == PERIODIC else zeta[1:-1, :-1] if edges[0] == "periodic" else zeta[1:-1, 1:-1]
    if edges == PERIODIC:
        rim = 0.0
    elif edges[0] == "periodic":
        rim = DX * (u[0, :-1].sum() - u[-1, :-1].sum())
    else:
        rim = DX * (u[0].sum() - u[-1].sum()) + DY * (v[:, -1].sum() - v[:, 0].sum())
    # round-off of some hundred terms of order 1
    assert inner.sum() * DX * DY == pytest.approx(rim, abs=1e-13 * zeta.size)


@pytest.mark.parametrize("name", [name for name in DERIVED if FIELDS[name].location == "corner"])
def test_the_last_corner_repeats_the_first_where_periodic(name):
    u, v, eta = random_flow(np.random.default_rng(3), 6, 4, PERIODIC)
    field = take(name, u, v, eta, edges=PERIODIC)
    assert np.array_equal(field[0], field[-1])
    assert np.array_equal(field[:, 0], field[:, -1])


def test_corner_thickness_is_the_mean_of_the_cells_of_the_domain_round_it():
    a = np.array([[1.0, 2.0], [5.0, 10.0]])
    expected = [[1.0, 1.5, 2.0], [3.0, 4.5, 6.0], [5.0, 7.5, 10.0]]
    assert np.array_equal(corner_mean(a, WALLS), expected)
    assert np.all(corner_mean(a, PERIODIC) == 4.5)


def test_rest_on_a_rotating_plane_has_f_over_depth_as_potential_vorticity():
    # definition q = (f + zeta)/h; also south of the equator
    for f in (1e-4, -1e-4):
        u, v, eta = solid_rotation(0.0)
        for linear in (False, True):
            assert np.allclose(take("pv", u, v, eta, depth=50.0, f=f, linear=linear), f / 50, rtol=1e-15, atol=0)


def test_linear_potential_vorticity_is_the_full_one_to_first_order():
    rng = np.random.default_rng(4)
    u, v, eta = random_flow(rng, 6, 5, WALLS)
    gap = []
    for size in (1e-4, 1e-5):
        full, first = (take("pv", size * u, size * v, size * eta, f=1.0, linear=linear) for linear in (False, True))
        gap.append(np.abs(full - first).max())
    # the difference is of second order: a tenth of the amplitude leaves a hundredth; 2 % for the third order
    assert gap[0] / gap[1] == pytest.approx(100, rel=0.02)


def test_vorticity_of_a_wave_converges_at_second_order():
    # u = -sin(k y), v = sin(k x) has zeta = k (cos(k x) + cos(k y))
    error = []
    for n in (16, 32):
        d = 2 * np.pi / n
        face, centre = np.arange(n + 1) * d, (np.arange(n) + 0.5) * d
        u = np.broadcast_to(-np.sin(centre)[:, None], (n, n + 1))
        v = np.broadcast_to(np.sin(centre)[None, :], (n + 1, n))
        eta, f = np.zeros((n, n)), np.zeros((n + 1, n + 1))
        zeta = derive("vorticity", u, v, eta, depth=1.0, f=f, dx=d, dy=d, edges=PERIODIC)
        error.append(np.abs(zeta - np.cos(face)[None, :] - np.cos(face)[:, None]).max())
    # a central difference: factor 4 for half the cell, less a share of order (k dx)^2 = 4 %
    assert error[0] / error[1] == pytest.approx(4, rel=0.04)


def test_a_cut_side_gives_no_number_where_it_would_need_the_flow_beyond():
    u, v, eta = random_flow(np.random.default_rng(5), 6, 5, WALLS)
    cut = ("cut", "wall", "cut", "wall")
    for name in ("vorticity", "pv"):
        field = take(name, u, v, eta, edges=cut)
        assert np.all(np.isnan(field[:, 0]))
        assert np.all(np.isnan(field[0]))
        assert np.array_equal(field[1:, 1:], take(name, u, v, eta, edges=WALLS)[1:, 1:])


def test_single_precision_stays_single():
    u, v, eta = (a.astype(np.float32) for a in solid_rotation(0.1))
    assert take("speed", u, v, eta).dtype == np.float32
    assert take("vorticity", u, v, eta).dtype == np.float32
