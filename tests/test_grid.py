"""The grid: where things lie, in space and in memory; the basin that is laid into it."""

from __future__ import annotations

import math
import random

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from swmodel.errors import RequestError
from swmodel.frame import FrameSettings, build_frame
from swmodel.grid import EdgesSettings, Grid, GridSettings, LayerSettings, build_basin, build_grid
from swmodel.grid.domain import HALO_X, HALO_Y, allocate, inside_centre, ordered_sum, row_stride, spread
from swmodel.state import State

WALLS = EdgesSettings(west="wall", east="wall", south="wall", north="wall")
ROUND = EdgesSettings(west="periodic", east="periodic", south="periodic", north="periodic")


def grid_of(edges=WALLS, origin="corner", cells=(4, 3), size=(8.0, 4.5)):
    return build_grid(GridSettings(cells=cells, size=size, origin=origin), edges)


def basin_of(frame, layer, grid=None):
    grid = grid or grid_of(cells=(40, 30), size=(4.0, 3.0), origin="centre")
    settings = FrameSettings.model_validate(frame)
    return build_basin(grid, build_frame(settings, grid.south_y + grid.Ly / 2), LayerSettings.model_validate(layer))


def test_eta_lies_at_centres_u_and_v_on_faces_and_vorticity_at_corners():
    # Arakawa & Lamb 1977, grid C
    grid = grid_of()
    assert (grid.dx, grid.dy) == (2.0, 1.5)
    assert np.array_equal(grid.axes("centre")[0], [1, 3, 5, 7])
    assert np.array_equal(grid.axes("centre")[1], [0.75, 2.25, 3.75])
    assert np.array_equal(grid.axes("u")[0], [0, 2, 4, 6, 8])
    assert np.array_equal(grid.axes("u")[1], grid.axes("centre")[1])
    assert np.array_equal(grid.axes("v")[0], grid.axes("centre")[0])
    assert np.array_equal(grid.axes("v")[1], [0, 1.5, 3, 4.5])
    assert np.array_equal(grid.axes("corner")[0], grid.axes("u")[0])
    assert np.array_equal(grid.axes("corner")[1], grid.axes("v")[1])
    assert [grid.shape(where) for where in ("centre", "u", "v", "corner")] == [(3, 4), (3, 5), (4, 4), (4, 5)]


def test_the_origin_is_the_middle_or_the_south_west_corner():
    middle = grid_of(origin="centre")
    assert (middle.west_x, middle.south_y) == (-4.0, -2.25)
    assert middle.x.sum() == 0
    assert (grid_of().west_x, grid_of().south_y) == (0.0, 0.0)


@given(nx=st.integers(1, 5000), itemsize=st.sampled_from([4, 8]))
def test_rows_are_whole_cache_lines_away_from_multiples_of_2048_bytes(nx, itemsize):
    # rows that far apart fall on the same cache sets (measured: twice as slow)
    size = row_stride(nx, itemsize) * itemsize
    assert size % 64 == 0
    assert row_stride(nx, itemsize) >= nx + 2 * HALO_X
    assert min(size % 2048, -size % 2048) >= 128
    # and hardly longer than need be: the halo, one line to round up, and three lines past a multiple
    assert size - nx * itemsize <= (2 * HALO_X + 8) * itemsize + 4 * 64


@pytest.mark.parametrize("precision", ["double", "single"])
def test_the_first_inside_value_of_each_row_starts_a_cache_line(precision):
    for nx in (1, 7, 100, 517):
        state = State(Grid(nx, 3, 1.0, 1.0, 0.0, 0.0, precision=precision), 2)
        for row in state.eta:
            assert row.ctypes.data % 64 == 0


def test_the_views_of_a_state_share_its_memory():
    state = State(grid_of(), 2)
    state.u[...], state.v[...], state.eta[...] = 1.0, 2.0, 3.0
    inside = np.s_[HALO_Y : HALO_Y + 3, HALO_X : HALO_X + 4]
    for number, value in enumerate((1.0, 2.0, 3.0)):
        assert np.all(state.sets[number][inside] == value)
    assert not state.sets[3:].any()
    for own, other in zip(state.level(1), (state.u, state.v, state.eta), strict=True):
        assert own.shape == other.shape
        assert not np.shares_memory(own, other)


def test_a_coefficient_goes_on_round_the_domain_or_as_a_mirror_image_beyond_walls():
    values = np.arange(12.0).reshape(3, 4)
    across = {"periodic": [2, 3, 0, 1, 2, 3, 0, 1], "wall": [1, 0, 0, 1, 2, 3, 3, 2]}
    for edge, columns in across.items():
        grid = grid_of(ROUND if edge == "periodic" else WALLS)
        laid = spread(values, grid)
        assert laid.shape == allocate(grid, 1).shape[1:]
        assert np.array_equal(inside_centre(laid, grid), values)
        assert np.array_equal(laid[HALO_Y, HALO_X - 2 : HALO_X + 6], columns)
    assert spread(2.5, grid_of()) == 2.5


def test_beyond_a_wall_f_is_held_at_its_corner():
    corners = np.arange(20.0).reshape(4, 5)
    laid = spread(corners, grid_of(WALLS), corner=True)
    assert np.array_equal(laid[HALO_Y, HALO_X - 1 : HALO_X + 6], [0, 0, 1, 2, 3, 4, 4])


@given(st.lists(st.floats(-1e300, 1e300), max_size=50), st.randoms(use_true_random=False))
def test_an_ordered_sum_depends_on_no_order(values, shuffler: random.Random):
    shuffled = list(values)
    shuffler.shuffle(shuffled)
    try:
        expected = ordered_sum(np.array(values))
    except OverflowError:  # beyond what a double holds
        return
    assert ordered_sum(np.array(shuffled)) == expected


# ------------------------------------------------------------------------------------------------------ the basin


def test_scales_of_the_basin():
    basin = basin_of({"f0": -1e-4}, {"depth": "100 m", "reduced_gravity": "0.02 m/s^2"})
    # c = sqrt(g H), a = c/|f| (Gill 1982): sqrt(2) m/s, 14.142 km, also in the south
    assert basin.wave_speed == pytest.approx(math.sqrt(2), rel=1e-15)
    assert basin.deformation_radius == pytest.approx(math.sqrt(2) * 1e4, rel=1e-15)
    assert basin.even
    assert np.all(basin.f == -1e-4)
    assert set(basin.constants) == {"f0", "beta", "g", "H", "Lx", "Ly", "c", "pi", "a"}


def test_the_equatorial_radius_follows_from_beta():
    # sqrt(c/beta) (Matsuno 1966): with c = 2.8 m/s some 350 km on Earth
    basin = basin_of({"plane": "equatorial"}, {"depth": 400.0, "reduced_gravity": 0.0196})
    beta = 2 * 7.292115e-5 / 6371008.8  # WGS 84 and IUGG mean radius
    # the mean radius is known to some 1e-6
    assert basin.deformation_radius == pytest.approx(math.sqrt(2.8 / beta), rel=1e-5)


def test_without_rotation_there_is_no_radius():
    basin = basin_of({"plane": "none"}, {"depth": 10.0})
    assert basin.deformation_radius == math.inf
    assert "a" not in basin.constants


def test_a_depth_may_be_a_formula_and_its_mean_is_the_reference():
    basin = basin_of({"f0": 1e-4}, {"depth": "100 + 20*sin(2*pi*x/Lx)"})
    assert not basin.even
    assert basin.depth.shape == (30, 40)
    # a sine over its whole period, at points symmetric about its zero
    assert basin.reference_depth == pytest.approx(100.0, rel=1e-14)
    given_one = basin_of({"f0": 1e-4}, {"depth": "H + 20*sin(2*pi*x/Lx)", "reference_depth": 90.0})
    assert given_one.reference_depth == 90.0
    assert given_one.depth.mean() == pytest.approx(90.0, rel=1e-14)


def test_a_depth_that_is_the_same_everywhere_is_a_number():
    assert basin_of({"f0": 1e-4}, {"depth": "100 + 0*x"}).depth == 100.0


def test_on_a_turntable_the_surface_at_rest_is_a_paraboloid_over_the_same_volume():
    # hydrostatics: Omega^2 r^2/(2 g) between the middle and r; `depth` is the one before the table turns
    Omega, g = 1.5, 9.80665
    basin = basin_of({"plane": "tank", "rotation_rate": Omega}, {"depth": "0.9 m"})
    x, y = basin.grid.points("centre")
    rise = Omega**2 * (x**2 + y**2) / (2 * g)
    assert basin.depth.mean() == pytest.approx(0.9, rel=1e-14)
    # round-off of sums of order 1
    np.testing.assert_allclose(basin.depth - basin.depth.min(), rise - rise.min(), rtol=0, atol=1e-14)
    assert np.all(basin.f == 2 * Omega)


def test_with_reduced_gravity_the_thickness_on_a_turntable_is_as_given():
    layer = {"depth": "0.1 m", "reduced_gravity": "0.05 m/s^2"}
    assert basin_of({"plane": "tank", "rotation_rate": 1.5}, layer).depth == 0.1


@pytest.mark.parametrize(
    ("frame", "layer", "message"),
    [
        (
            {"f0": 1e-4},
            {"depth": "10*x"},
            "layer.depth: the thickness at rest is -19.5 m at x = -1.95 m, y = -1.45 m; "
            "a thickness above 0 everywhere; deepen the layer",
        ),
        (
            {"plane": "tank", "rotation_rate": 10.0},
            {"depth": "0.3 m"},
            "layer.depth: the thickness at rest is -10.2881 m at x = -0.05 m, y = -0.05 m; "
            "a thickness above 0 everywhere; deepen the layer there, or turn the table more slowly",
        ),
        (
            {"f0": 1e-4},
            {"depth": "H + 0.1*a"},
            "layer.depth: the depth uses H, a, which follow from it; give reference_depth",
        ),
    ],
)
def test_a_layer_that_cannot_be_is_refused(frame, layer, message):
    with pytest.raises(RequestError) as error:
        basin_of(frame, layer)
    assert str(error.value) == message
