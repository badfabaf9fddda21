"""Symmetries of the equations, which a swapped index or sign would break: turning, mirroring, changing hemisphere."""

from __future__ import annotations

import numpy as np
import pytest
from flows import ALONG_X, ALONG_Y, BOX, FULL, PERIODIC, equations_of, make_basin, random_flow, run

from swmodel.steppers import STEPPERS

NX, NY, DX, DY, F = 11, 8, 1.3, 0.8, 0.9
TURNED = [(PERIODIC, PERIODIC), (BOX, BOX), (ALONG_X, ALONG_Y)]
NAMES = ["periodic", "box", "channel"]


def after(fields, edges, *, f=F, turned=False, slip="free", stepper="ssprk3"):
    size = (NY, NX, DY, DX) if turned else (NX, NY, DX, DY)
    basin = make_basin(*size, edges=edges, f=f, slip=slip)
    return run(equations_of(basin, FULL), fields, stepper, 0.05, 20)


def begin(edges):
    return random_flow(np.random.default_rng(8), make_basin(NX, NY, DX, DY, edges=edges).grid, 0.3, 0.1)


def same(found, expected):
    # other orders of the same sums: round-off of 20 steps of values of order 0.1, which the flow itself makes grow
    for own, right in zip(found, expected, strict=True):
        np.testing.assert_allclose(own, right, rtol=0, atol=1e-14)


@pytest.mark.parametrize("slip", ["free", "none"])
@pytest.mark.parametrize(("edges", "edges_turned"), TURNED, ids=NAMES)
@pytest.mark.parametrize("stepper", STEPPERS)
def test_a_flow_turned_by_a_right_angle_stays_the_flow_turned(stepper, edges, edges_turned, slip):
    # (x, y) -> (-y, x): u' = -v, v' = u; f does not notice
    def turn(fields):
        u, v, eta = fields
        return -v.T[:, ::-1], u.T[:, ::-1], eta.T[:, ::-1]

    fields = begin(edges)
    found = after(turn(fields), edges_turned, turned=True, slip=slip, stepper=stepper)
    same(found, turn(after(fields, edges, slip=slip, stepper=stepper)))


@pytest.mark.parametrize("slip", ["free", "none"])
@pytest.mark.parametrize("edges", [PERIODIC, BOX, ALONG_X], ids=NAMES)
def test_the_other_hemisphere_is_the_mirror_image(edges, slip):
    # y -> -y: v' = -v, and f changes its sign
    def mirror(fields):
        u, v, eta = fields
        return u[::-1], -v[::-1], eta[::-1]

    fields = begin(edges)
    same(after(mirror(fields), edges, f=-F, slip=slip), mirror(after(fields, edges, slip=slip)))


@pytest.mark.parametrize("edges", [PERIODIC, BOX, ALONG_X], ids=NAMES)
def test_with_flow_and_rotation_turned_round_time_runs_back(edges):
    # t -> -t: u, v and f change sign. rk4 keeps that to its own error, 40 steps of (omega_max dt)^5/120 = 3e-8 of 0.3
    fields = begin(edges)
    u, v, eta = after(fields, edges, stepper="rk4")
    back = after((-u, -v, eta), edges, f=-F, stepper="rk4")
    for own, right, sign in zip(back, fields, (-1, -1, 1), strict=True):
        np.testing.assert_allclose(sign * own, right, rtol=0, atol=1e-6)


def test_a_shift_by_whole_cells_shifts_the_bits():
    u, v, eta = begin(PERIODIC)

    def shift(fields):
        u, v, eta = (np.roll(a[:NY, :NX], (3, 5), (0, 1)) for a in fields)
        return np.c_[u, u[:, :1]], np.r_[v, v[:1]], eta

    found, expected = after(shift((u, v, eta)), PERIODIC), shift(after((u, v, eta), PERIODIC))
    for own, right in zip(found, expected, strict=True):
        assert np.array_equal(own, right)
