"""What is stored, where and how often."""

import subprocess
import sys

import numpy as np
import pytest
from pydantic import ValidationError

from swmodel.errors import RequestError
from swmodel.grid import Grid
from swmodel.store import OutputSettings, Window, build_window, resolve_output

GRID = Grid(15, 9, 1000.0, 2000.0, -7500.0, 0.0)
EVERY_LOCATION = ("centre", "u", "v", "corner")


def faults(call):
    with pytest.raises(RequestError) as caught:
        call()
    return [str(fault) for fault in caught.value.faults]


def intervals(until=3600.0, step=10.0, **settings):
    output = resolve_output(OutputSettings(**settings), GRID, until, step)
    return output.steps_between_snapshots, output.steps_between_diagnostics


def test_the_settings_load_neither_hdf5_nor_compiled_code():
    words = "import sys, swmodel.store; print([n for n in ('h5py', 'numba', 'xarray', 'isal') if n in sys.modules])"
    answer = subprocess.run([sys.executable, "-c", words], capture_output=True, text=True, check=True)
    assert answer.stdout.strip() == "[]"


def test_defaults_are_those_of_the_interface():
    settings = OutputSettings()
    assert settings.fields == ("eta", "u", "v")
    assert settings.checkpoint_every == 600.0
    assert settings.compression is True
    assert settings.budgets == "rates"


def test_nothing_given_means_fifty_intervals():
    assert intervals(until=3600.0, step=9.0) == (8, 8)


def test_a_default_interval_is_never_less_than_one_step():
    assert intervals(until=300.0, step=10.0) == (1, 1)


def test_the_default_between_snapshots_is_the_nearest_multiple_of_that_between_diagnostics():
    # until/50 is 72 s; multiples of 50 s are 50 and 100
    assert intervals(until=3600.0, diagnostics_every=50.0) == (5, 5)
    assert intervals(until=3600.0, diagnostics_every=30.0) == (6, 3)
    assert intervals(until=3600.0, diagnostics_every=600.0) == (60, 60)


def test_diagnostics_come_with_the_snapshots_by_default():
    assert intervals(every="5 min") == (30, 30)


def test_given_intervals_are_kept():
    assert intervals(every="5 min", diagnostics_every="20 s") == (30, 2)


def test_an_interval_that_is_no_whole_number_of_steps_is_refused():
    assert faults(lambda: intervals(every="5 min", diagnostics_every=25.0, step=10.0)) == [
        "output.diagnostics_every: 25 s is 2.5 steps of 10 s; a whole number of steps"
    ]


def test_the_whole_domain_is_stored_by_default():
    window = build_window(OutputSettings(), GRID)
    assert window == Window(0, 15, 0, 9)
    for location in EVERY_LOCATION:
        assert window.cut(np.empty(GRID.shape(location)), location).shape == GRID.shape(location)


def test_a_region_is_widened_to_whole_cells():
    window = build_window(OutputSettings(region=("-3.6 km", "2.4 km", "1 m", "3 km")), GRID)
    assert (window.west, window.east, window.south, window.north) == (3, 10, 0, 2)


def test_a_region_that_ends_on_faces_takes_no_further_cells():
    # 0.1 + 0.2 is not 0.3: round-off must not take one cell more
    grid = Grid(10, 10, 0.1, 0.1, 0.0, 0.0)
    window = build_window(OutputSettings(region=(0.1, 0.1 + 0.2, 0.3, 0.7)), grid)
    assert (window.west, window.east, window.south, window.north) == (1, 3, 3, 7)


def test_a_region_within_one_cell_is_that_cell():
    window = build_window(OutputSettings(region=(100.0, 200.0, 300.0, 400.0)), GRID)
    assert (window.west, window.east, window.south, window.north) == (7, 8, 0, 1)


@pytest.mark.parametrize(
    ("region", "found"),
    [
        (
            ("2 km", "1 km", "0 km", "1 km"),
            "output.region: the region reaches from x = 2 km to 1 km; [x0, x1, y0, y1] with x0 < x1 and y0 < y1",
        ),
        (
            ("-1 km", "1 km", "0 km", "20 km"),
            "output.region: the region reaches from y = 0 m to 20 km; within the domain, 0 m to 18 km",
        ),
    ],
)
def test_a_region_that_is_empty_or_leaves_the_domain_is_refused(region, found):
    assert faults(lambda: build_window(OutputSettings(region=region), GRID)) == [found]


@pytest.mark.parametrize("stride", [2, 5, 9])
def test_a_stride_that_leaves_no_c_grid_is_refused(stride):
    assert faults(lambda: build_window(OutputSettings(stride=stride), GRID)) == [
        f"output.stride: stride {stride} does not leave a C-grid of 15 x 9 cells; an odd number that divides both: 1, 3"
    ]


def test_every_fault_comes_at_once():
    found = faults(lambda: intervals(every=15.0, fields=("eta", "u", "eta"), stride=2, step=10.0))
    assert [line.split(":")[0] for line in found] == ["output.every", "output.fields", "output.stride"]


@pytest.mark.parametrize("stride", [1, 3])
def test_what_a_stride_keeps_is_again_a_c_grid(stride):
    settings = OutputSettings(region=("-4.5 km", "4.5 km", "0 km", "12 km"), stride=stride)
    window = build_window(settings, GRID)
    x, y = window.axes(GRID, "centre")
    x_face, y_face = window.axes(GRID, "corner")
    assert (x_face.size, y_face.size) == (x.size + 1, y.size + 1)
    # centres are odd multiples of half a cell: exact in binary for these sizes
    np.testing.assert_array_equal(x, (x_face[1:] + x_face[:-1]) / 2)
    np.testing.assert_array_equal(y, (y_face[1:] + y_face[:-1]) / 2)
    assert (x_face[0], x_face[-1], y_face[0], y_face[-1]) == (-4500.0, 4500.0, 0.0, 12000.0)


@pytest.mark.parametrize("location", EVERY_LOCATION)
def test_a_window_keeps_a_field_where_its_axes_say(location):
    window = build_window(OutputSettings(region=("-4.5 km", "4.5 km", "0 km", "12 km"), stride=3), GRID)
    x, y = GRID.points(location)
    kept_x, kept_y = window.axes(GRID, location)
    np.testing.assert_array_equal(window.cut(x + 1e6 * y, location), kept_x[None, :] + 1e6 * kept_y[:, None])


@pytest.mark.parametrize("settings", [{"fields": ()}, {"fields": ("etta",)}, {"every": 0.0}, {"stride": 0}])
def test_what_cannot_be_meant_is_refused_by_the_settings(settings):
    with pytest.raises(ValidationError):
        OutputSettings(**settings)
