"""Variables of files: they lie where they were, in SI, and what does not fit is refused."""

from __future__ import annotations

import os
from pathlib import Path

import h5py
import netCDF4
import numpy as np
import pytest

from swmodel.errors import RequestError
from swmodel.fields import FileVariable, evaluate, evaluate_variable

KEY = ("layer", "depth")
X = np.linspace(-3e5, 3e5, 7)[None, :]
Y = np.linspace(-1e5, 2e5, 4)[:, None]


def plane(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """A bilinear function, which bilinear interpolation must give back exactly."""
    return 100 + 2e-5 * x - 3e-5 * y + 4e-11 * x * y


OWN_X = np.linspace(-4e5, 4e5, 9)
OWN_Y = np.linspace(-1e5, 2e5, 5)


def write_netcdf(path: Path, kind: str, *, unit: str = "m", scale: float = 1.0) -> None:
    """Write `plane` with coordinates, by netCDF4-python."""
    with netCDF4.Dataset(path, "w", format=kind) as file:
        for name, values in (("y", OWN_Y), ("x", OWN_X)):
            file.createDimension(name, values.size)
            variable = file.createVariable(name, "f8", (name,))
            variable.units = unit
            variable[:] = values / scale
        file.createVariable("depth", "f8", ("y", "x"))[:] = plane(OWN_X[None], OWN_Y[:, None])


@pytest.mark.parametrize("kind", ["NETCDF4", "NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET"])
@pytest.mark.parametrize(("unit", "scale"), [("m", 1.0), ("km", 1000.0)])
def test_a_netcdf_variable_is_interpolated_between_its_own_coordinates(
    tmp_path: Path, kind: str, unit: str, scale: float
) -> None:
    write_netcdf(tmp_path / "bank.nc", kind, unit=unit, scale=scale)
    values = evaluate(FileVariable(file=tmp_path / "bank.nc", variable="depth"), X, Y, {}, KEY)
    # some ten operations on numbers near 100
    np.testing.assert_allclose(values, plane(X, Y), rtol=1e-14)


def test_a_variable_on_the_points_asked_for_is_taken_bit_for_bit(tmp_path: Path) -> None:
    write_netcdf(tmp_path / "bank.nc", "NETCDF4")
    values = evaluate_variable(tmp_path / "bank.nc", "depth", OWN_X[None], OWN_Y[:, None], KEY)
    np.testing.assert_array_equal(values, plane(OWN_X[None], OWN_Y[:, None]))


def test_a_variable_stored_as_x_by_y_is_turned(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "bank.nc", "w") as file:
        for name, values in (("y", OWN_Y), ("x", OWN_X)):
            file.createDimension(name, values.size)
            file.createVariable(name, "f8", (name,))[:] = values
        file.createVariable("depth", "f8", ("x", "y"))[:] = plane(OWN_X[None], OWN_Y[:, None]).T
    values = evaluate_variable(tmp_path / "bank.nc", "depth", OWN_X[None], OWN_Y[:, None], KEY)
    np.testing.assert_array_equal(values, plane(OWN_X[None], OWN_Y[:, None]))


def test_falling_coordinates_and_plain_hdf5_are_read(tmp_path: Path) -> None:
    with h5py.File(tmp_path / "bank.h5", "w") as file:
        file["x"], file["y"] = OWN_X, OWN_Y[::-1]
        file["still/depth"] = plane(OWN_X[None], OWN_Y[::-1, None])
    values = evaluate_variable(tmp_path / "bank.h5", "still/depth", X, Y, KEY)
    # some ten operations on numbers near 100
    np.testing.assert_allclose(values, plane(X, Y), rtol=1e-14)


def test_an_array_without_coordinates_must_have_the_shape_asked_for(tmp_path: Path) -> None:
    np.save(tmp_path / "depth.npy", plane(X, Y))
    source = FileVariable(file=tmp_path / "depth.npy")
    np.testing.assert_array_equal(evaluate(source, X, Y, {}, KEY), plane(X, Y))
    with pytest.raises(RequestError) as raised:
        evaluate(source, X[:, :6], Y, {}, KEY)
    assert str(raised.value) == (
        f"layer.depth: {tmp_path}/depth.npy holds 7 x 4 values (x, y), and 6 x 4 points are asked for; "
        "the same number, or coordinates in the file to interpolate between"
    )


def test_packed_values_fill_values_and_units_are_heeded(tmp_path: Path) -> None:
    # source: CF conventions 1.11, sections 2.5.1 (missing data), 3.1 (units) and 8.1 (packed data)
    with netCDF4.Dataset(tmp_path / "packed.nc", "w") as file:
        file.createDimension("j", 1)
        file.createDimension("i", 3)
        variable = file.createVariable("u", "i2", ("j", "i"), fill_value=-99)
        variable.set_auto_maskandscale(False)
        variable.scale_factor, variable.add_offset, variable.units = 0.5, 10.0, "cm s-1"
        variable[:] = [[0, 2, 4]]
        other = file.createVariable("holed", "i2", ("j", "i"), fill_value=-99)
        other[:] = [[1, -99, 3]]
    points = np.array([[0.0, 1.0, 2.0]]), np.zeros((1, 1))
    # one rounding in the product with 0.01
    np.testing.assert_allclose(
        evaluate_variable(tmp_path / "packed.nc", "u", *points, KEY), [[0.10, 0.11, 0.12]], rtol=1e-15
    )
    with pytest.raises(RequestError, match=r"gives nan at x = 1 m, y = 0 m, and nowhere else"):
        evaluate_variable(tmp_path / "packed.nc", "holed", *points, KEY)


def test_a_time_is_chosen_from_a_variable_with_times(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "run.nc", "w") as file:
        for name, values in (("time", np.array([0.0, 1.0, 2.0])), ("y", Y.ravel()), ("x", X.ravel())):
            file.createDimension(name, values.size)
            file.createVariable(name, "f8", (name,))[:] = values
        file["time"].units = "hours since 2000-01-01"
        file.createVariable("eta", "f8", ("time", "y", "x"))[:] = np.arange(3)[:, None, None] + plane(X, Y)
    path = tmp_path / "run.nc"
    np.testing.assert_array_equal(evaluate_variable(path, "eta", X, Y, KEY, "last"), 2 + plane(X, Y))
    np.testing.assert_array_equal(evaluate_variable(path, "eta", X, Y, KEY, 3600.0), 1 + plane(X, Y))
    with pytest.raises(RequestError, match=r"has no time 5000 s; its nearest is 3600 s"):
        evaluate_variable(path, "eta", X, Y, KEY, 5000.0)
    with pytest.raises(RequestError, match=r"is 3 x 4 x 7; a variable \[y, x\] is needed"):
        evaluate(FileVariable(file=path, variable="eta"), X, Y, {}, KEY)


def fault(source: FileVariable, x: np.ndarray = X) -> str:
    with pytest.raises(RequestError) as raised:
        evaluate(source, x, Y, {}, KEY)
    return str(raised.value)


def test_a_file_or_variable_that_is_missing_is_said_with_what_there_is(tmp_path: Path) -> None:
    write_netcdf(tmp_path / "bank.nc", "NETCDF4")
    path = tmp_path / "bank.nc"
    assert fault(FileVariable(file=tmp_path / "bunk.nc")) == (
        f'layer.depth: there is no file {tmp_path}/bunk.nc; did you mean "bank.nc"?'
    )
    assert fault(FileVariable(file=tmp_path / "none" / "bank.nc")) == (
        f"layer.depth: there is no file {tmp_path}/none/bank.nc; there is no folder {tmp_path}/none"
    )
    assert fault(FileVariable(file=path, variable="dept")) == (
        f'layer.depth: {path} has no variable "dept"; it holds depth, x, y; did you mean "depth"?'
    )
    assert fault(FileVariable(file=path)) == (
        f"layer.depth: {path} holds 3 variables; name one of its variables: depth, x, y"
    )
    assert fault(FileVariable(file=path, variable="x")) == (
        f'layer.depth: the variable "x" of {path} is 9; a variable [y, x] is needed'
    )
    assert fault(FileVariable(file=path, variable="depth"), x=2 * X) == (
        f"layer.depth: {path} reaches from x = -400000 m to 400000 m, and x = -600000 m is asked for; "
        "a file must cover every point; nothing is extrapolated"
    )


@pytest.mark.parametrize(
    "content", [b"", b"hello", b"\x89HDF\r\n\x1a\n", b"CDF\x01", b"\x93NUMPY", b"\x93NUMPY\x01\x00v\x00{"]
)
def test_a_broken_file_is_a_request_error(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "broken").write_bytes(content)
    assert fault(FileVariable(file=tmp_path / "broken")).startswith(f"layer.depth: {tmp_path}/broken ")


def test_an_array_of_python_objects_is_never_unpickled(tmp_path: Path) -> None:
    class Touch:
        def __reduce__(self):
            return os.mkdir, (str(tmp_path / "executed"),)

    np.save(tmp_path / "objects.npy", np.array([[Touch()]], dtype=object), allow_pickle=True)
    assert "cannot be read" in fault(FileVariable(file=tmp_path / "objects.npy"))
    assert not (tmp_path / "executed").exists()


def test_coordinates_in_degrees_are_refused(tmp_path: Path) -> None:
    write_netcdf(tmp_path / "bank.nc", "NETCDF4", unit="degrees_east")
    assert fault(FileVariable(file=tmp_path / "bank.nc", variable="depth")) == (
        'layer.depth: the coordinate "y" is in "degrees_east"; m is needed; correct its attribute units'
    )
