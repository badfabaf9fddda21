"""Starts from files and from other runs."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest
import store_trial
from basins import largest, make_basin, read, refusal, start
from numpy.typing import NDArray
from scipy.io import netcdf_file

from swmodel.grid import Basin
from swmodel.state.starts import FileStart, RunStart

Array = NDArray[np.float64]
LOCATIONS: Any = {"u": "u", "v": "v", "eta": "centre"}


def closed_form(name: str, x: Array, y: Array, basin: Basin) -> Array:
    """Smooth fields with the domain's periods, and nothing through its sides."""
    along, across = 2 * np.pi * (x / basin.grid.Lx + 0.5), 2 * np.pi * (y / basin.grid.Ly + 0.5)
    if name == "u":
        return 0.2 * np.sin(along) * np.cos(across)
    if name == "v":
        return -0.3 * np.cos(along) * np.sin(across)
    return 0.1 * np.cos(along) * np.cos(across)


def state_of(basin: Basin) -> dict[str, Array]:
    """The closed form on a basin's own points."""
    return {name: closed_form(name, *basin.grid.points(at), basin) for name, at in LOCATIONS.items()}


def write_hdf5(path: Path, fields: dict[str, Array], axes: dict[str, tuple[Array, Array]] | None = None) -> None:
    """Write fields [y, x], with coordinates as dimension scales where they are given."""
    with h5py.File(path, "w") as file:
        for name, values in fields.items():
            file[name] = values
            if axes is None:
                continue
            for place, (letter, points) in enumerate(zip("yx", axes[name][::-1], strict=True)):
                scale = f"{letter}_{name}"
                file[scale] = points
                file[scale].attrs["units"] = "m"
                file[scale].make_scale(scale)
                file[name].dims[place].attach_scale(file[scale])


# ------------------------------------------------------------------------------------------------------------- files


def test_a_file_of_the_same_shape_is_taken_to_the_last_bit_and_counts_from_the_configuration(tmp_path: Path) -> None:
    basin = make_basin("box")
    state = {name: np.random.default_rng(1).normal(size=basin.grid.shape(at)) for name, at in LOCATIONS.items()}
    state["u"][:, [0, -1]] = 0
    state["v"][[0, -1]] = 0
    write_hdf5(tmp_path / "state.h5", state)
    made = start(basin, read("file", file="state.h5"), folder=tmp_path)
    for name in LOCATIONS:
        np.testing.assert_array_equal(getattr(made, name), state[name])


def test_a_classic_netcdf_file_is_read_at_its_last_time_or_the_one_asked_for(tmp_path: Path) -> None:
    basin = make_basin("periodic")
    state = state_of(basin)
    with netcdf_file(tmp_path / "state.nc", "w") as file:
        file.createDimension("time", 3)
        times = file.createVariable("time", "d", ("time",))
        times[:] = [0.0, 1.0, 2.5]
        times.units = "hours since 2000-01-01"
        for name, values in state.items():
            for letter, n in zip("yx", values.shape, strict=True):
                file.createDimension(f"{letter}_{name}", n)
            variable = file.createVariable(f"{name}_flow", "d", ("time", f"y_{name}", f"x_{name}"))
            for k in range(3):
                variable[k] = k * values
    names = {name: f"{name}_flow" for name in LOCATIONS}
    last = start(basin, FileStart(file=tmp_path / "state.nc", **names))
    second = start(basin, read("file", file=str(tmp_path / "state.nc"), time="1 h", **names))
    np.testing.assert_array_equal(last.eta, 2 * state["eta"])
    np.testing.assert_array_equal(second.eta, state["eta"])
    faults = refusal(basin, read("file", file=str(tmp_path / "state.nc"), time="2 h", **names))
    assert [fault.key for fault in faults] == [("start", 0, name) for name in LOCATIONS]
    assert faults[0].found.endswith("has no time 7200 s")


@pytest.mark.parametrize("edges", ["periodic", "channel along x", "channel along y", "box"])
def test_centres_of_another_grid_are_interpolated_to_second_order_round_periods_and_up_to_walls(
    edges: str, tmp_path: Path
) -> None:
    basin = make_basin(edges, cells=(23, 17))
    errors = []
    for n in (40, 80):
        other = make_basin(edges, cells=(n, n))
        x, y = other.grid.axes("centre")
        fields = {name: closed_form(name, x[None, :], y[:, None], other) for name in LOCATIONS}
        # north at the top, as maps are stored
        turned = {name: values[::-1] for name, values in fields.items()}
        write_hdf5(tmp_path / f"{n}.h5", turned, dict.fromkeys(LOCATIONS, (x, y[::-1])))
        made = start(basin, FileStart(file=tmp_path / f"{n}.h5"))
        expected = state_of(basin)
        errors.append([largest(getattr(made, name) - expected[name]) for name in LOCATIONS])
        assert made.cautions == []
    # linear interpolation: spacing^2/8 times the second derivative along either direction
    assert (np.array(errors[1]) < np.array([0.2, 0.3, 0.1]) * 2 * (2 * np.pi / 80) ** 2 / 8).all()
    assert (np.log2(np.array(errors[0]) / errors[1]) > 1.5).all()


def test_points_of_the_run_itself_are_taken_to_the_last_bit_whatever_the_file_says_of_them(tmp_path: Path) -> None:
    basin = make_basin("channel along x")
    state = state_of(basin)
    state["v"][[0, -1]] = 0
    state["u"][:, -1] = state["u"][:, 0]
    write_hdf5(tmp_path / "own.h5", state, {name: basin.grid.axes(at) for name, at in LOCATIONS.items()})
    made = start(basin, FileStart(file=tmp_path / "own.h5"))
    for name in LOCATIONS:
        np.testing.assert_array_equal(getattr(made, name), state[name])


@pytest.mark.parametrize("edges", ["periodic", "box"])
def test_a_file_that_does_not_cover_the_domain_is_refused_with_what_it_covers(edges: str, tmp_path: Path) -> None:
    basin = make_basin(edges)
    x, y = np.linspace(-300e3, 250e3, 56), np.linspace(-200e3, 200e3, 41)
    fields = {name: np.zeros((41, 56)) for name in LOCATIONS}
    write_hdf5(tmp_path / "small.h5", fields, dict.fromkeys(LOCATIONS, (x, y)))
    faults = refusal(basin, FileStart(file=tmp_path / "small.h5"))
    # half a spacing beyond its last point, where there is a wall
    east = 250 if edges == "periodic" else 255
    assert faults[0].key == ("start", 0, "u")
    assert faults[0].found == (
        f"{tmp_path / 'small.h5'} reaches from x = {-300 if edges == 'periodic' else -305}000 m to {east}000 m, and "
        "x = -300000 m to 300000 m is asked for"
    )


def test_what_a_file_lacks_is_said_all_at_once_with_the_remedy(tmp_path: Path) -> None:
    basin = make_basin("box")
    eta = np.zeros(basin.grid.shape("centre"))
    write_hdf5(tmp_path / "eta.h5", {"eta": eta})
    faults = refusal(basin, FileStart(file=tmp_path / "eta.h5"))
    assert [(fault.key, fault.found, fault.allowed) for fault in faults] == [
        (("start", 0, name), f'{tmp_path / "eta.h5"} has no variable "{name}"', "it holds eta") for name in ("u", "v")
    ]
    assert faults[0].remedy == 'for an elevation alone: kind = "formula" with eta = { file = "...", variable = "..." }'
    eta[3, 4] = np.nan
    write_hdf5(tmp_path / "gap.h5", state_of(basin) | {"eta": eta})
    (fault,) = refusal(basin, FileStart(file=tmp_path / "gap.h5"))
    assert str(fault) == (
        f"start.0.eta: 1 of {eta.size} values of eta in {tmp_path / 'gap.h5'} are missing or not finite; "
        "every value must be finite"
    )
    write_hdf5(tmp_path / "shape.h5", state_of(basin) | {"eta": np.zeros((5, 6))})
    (fault,) = refusal(basin, FileStart(file=tmp_path / "shape.h5"))
    assert str(fault) == (
        f"start.0.eta: {tmp_path / 'shape.h5'} holds 6 x 5 values (x, y) of it without coordinates; "
        "24 x 18, as here, or coordinates to interpolate between"
    )


def test_a_formula_start_takes_an_elevation_from_an_array_file(tmp_path: Path) -> None:
    basin = make_basin("box")
    eta = state_of(basin)["eta"]
    np.save(tmp_path / "hill.npy", eta)
    made = start(basin, read("formula", eta={"file": "hill.npy"}), folder=tmp_path)
    np.testing.assert_array_equal(made.eta, eta)
    assert largest(made.u, made.v) == 0


# -------------------------------------------------------------------------------------------------------------- runs


@pytest.fixture(scope="module")
def run_folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A run as the store leaves it: eight snapshots, a minute apart."""
    folder = tmp_path_factory.mktemp("runs") / "spin-up"
    writer = store_trial.open_writer(folder, fields=("eta", "u", "v"))
    for k in range(store_trial.SNAPSHOTS):
        writer.write_snapshot(k * store_trial.STEP, whole(k))
    writer.finish()
    return folder


def whole(k: int) -> dict[str, Array]:
    """Snapshot k of that run: no two values alike, nothing through its walls in the west and east."""
    grid = store_trial.make_basin().grid
    state = store_trial.snapshot(grid, k, ("eta", "u", "v"))
    state["u"][:, [0, -1]] = 0
    state["v"][-1] = state["v"][0]
    return state


@pytest.mark.parametrize(("time", "k"), [(None, 7), ("3 min", 3), (0, 0)])
def test_a_run_start_is_the_snapshot_to_the_last_bit(run_folder: Path, time: Any, k: int) -> None:
    keys = {} if time is None else {"time": time}
    made = start(store_trial.make_basin(), read("run", run="spin-up", **keys), folder=run_folder.parent)
    for name in LOCATIONS:
        np.testing.assert_array_equal(getattr(made, name), whole(k)[name])


def test_a_run_over_other_cells_or_another_size_is_refused(run_folder: Path) -> None:
    other = make_basin("channel along y", cells=(6, 4), size=(6000.0, 6001.0))
    (fault,) = refusal(other, RunStart(run=run_folder))
    assert str(fault) == (
        "start.0.run: its snapshots hold 6 x 4 cells over 6000 m x 6000 m; the same cells and size as here: "
        '6 x 4 over 6000 m x 6001 m; kind = "file" interpolates between grids'
    )
    (fault,) = refusal(make_basin("box", cells=(6, 5), size=(6000.0, 6000.0)), RunStart(run=run_folder))
    assert fault.allowed == "the same cells and size as here: 6 x 5 over 6000 m x 6000 m"


def test_a_moment_that_no_snapshot_holds_is_refused_with_the_nearest(run_folder: Path) -> None:
    faults = refusal(store_trial.make_basin(), read("run", run=str(run_folder), time="100 s"))
    assert faults[0].found.endswith("has no time 100 s")
    assert faults[0].allowed == "its nearest is 120 s"


def test_a_folder_that_is_no_run_is_refused(tmp_path: Path) -> None:
    (fault,) = refusal(make_basin(), RunStart(run=tmp_path))
    assert str(fault) == (
        f"start.0.run: {tmp_path} holds no snapshots.h5; the folder of a run that has stored snapshots"
    )
