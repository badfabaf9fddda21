"""Variables read from files: HDF5 and netCDF-4, classic netCDF, and `.npy`.

The kind of a file is told from its first bytes. Packed values (`scale_factor`, `add_offset`), fill values and `units`
are heeded as the CF conventions say.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..choices import did_you_mean
from ..errors import Fault, RequestError
from ..quantities import read_unit, same_dimension, shown

Array = NDArray[np.float64]
Key = tuple[str | int, ...]
Moment = float | Literal["only", "last"]

_NO_VARIABLE = "This is a netCDF dimension but not a netCDF variable"  # netCDF-4's mark of a dimension without values


@dataclass(frozen=True)
class Stored:
    """A two-dimensional variable of a file, in SI.

    Parameters
    ----------
    values : ndarray ``[y, x]``
        NaN where the file holds its fill value.
    x, y : ndarray or None
        Its own coordinates, m, where the file has both.
    """

    values: Array
    x: Array | None
    y: Array | None


@dataclass(frozen=True)
class _Variable:
    """A variable of an open file: sliceable data, names of its dimensions (empty where unknown), attributes."""

    data: Any
    dimensions: tuple[str, ...]
    attributes: Mapping[str, Any]


def load(path: Path, name: str | None, key: Key, moment: Moment = "only") -> Stored:
    """Read a variable of a file.

    Parameters
    ----------
    path : Path
        The file.
    name : str or None
        The variable; may be left out where the file holds only one.
    key : tuple
        Where the file is asked for, for messages.
    moment : float, "only" or "last"
        Which time of a variable ``(time, y, x)``: model time in s, the last, or the only one there is.

    Raises
    ------
    RequestError
        Where the file or the variable is missing or not readable, or the variable is not two-dimensional.
    """
    with _opened(path, key) as variables:
        if name is None:
            if len(variables) != 1:
                remedy = f"name one of its variables: {', '.join(variables)}"
                raise RequestError(Fault(key, f"{path} holds {len(variables)} variables", remedy=remedy))
            name = next(iter(variables))
        if name not in variables:
            found = f"{path} has no variable {shown(name)}"
            holds = f"it holds {', '.join(variables) or 'none'}"
            raise RequestError(Fault(key, found, holds, did_you_mean(name, variables)))
        return _stored(variables, name, key, f"the variable {shown(name)} of {path}", moment)


def _stored(variables: Mapping[str, _Variable], name: str, key: Key, whose: str, moment: Moment) -> Stored:
    """Select the time, decode the values and find the coordinates."""
    variable = variables[name]
    shape = tuple(variable.data.shape)
    if np.dtype(variable.data.dtype).kind not in "fiu":
        raise RequestError(Fault(key, f"{whose} does not hold numbers"))
    lead = len(shape) - 2
    if lead < 0 or lead > 1 or (lead == 1 and moment == "only" and shape[0] != 1):
        sizes = " x ".join(str(n) for n in shape) or "a single value"
        raise RequestError(Fault(key, f"{whose} is {sizes}", "a variable [y, x] is needed"))
    index = () if lead == 0 else (_moment_index(variables, variable, moment, key, whose),)
    values = _decoded(variable.data[index], variable.attributes, key, whose)
    if not variable.dimensions:
        return Stored(values, None, None)
    first, second = variable.dimensions[lead:]
    y, x = (_coordinate(variables, name, n, key) for name, n in zip((first, second), values.shape, strict=True))
    if first.startswith("x") and second.startswith("y"):
        values, x, y = values.T, y, x
    return Stored(values, x, y) if x is not None and y is not None else Stored(values, None, None)


def _moment_index(variables: Mapping[str, _Variable], variable: _Variable, moment: Moment, key: Key, whose: str) -> int:
    """Index of a time along the first dimension."""
    number = variable.data.shape[0]
    if number == 0:
        raise RequestError(Fault(key, f"{whose} holds no time"))
    if isinstance(moment, str):
        return int(number) - 1
    times = variables.get(variable.dimensions[0]) if variable.dimensions else None
    if times is None or times.data.shape != (number,):
        raise RequestError(Fault(key, f"{whose} has no times", remedy="leave the time out to take the last"))
    unit = str(_text(times.attributes.get("units", "s"))).split(" since ")[0]
    seconds = np.asarray(times.data[()], np.float64) * _factor(unit, "s", key, f"the time of {whose}")
    index = int(np.argmin(np.abs(seconds - moment)))
    # times are written in seconds as doubles: a microsecond is far above their round-off and below any interval
    if abs(seconds[index] - moment) > 1e-6:
        found = f"{whose} has no time {moment:.10g} s"
        raise RequestError(Fault(key, found, f"its nearest is {seconds[index]:.10g} s"))
    return index


def _decoded(raw: Any, attributes: Mapping[str, Any], key: Key, whose: str) -> Array:
    """Values in SI: fill values as NaN, unpacked, in the unit that the file names."""
    raw = np.asarray(raw)
    values = raw.astype(np.float64)
    for fill in ("_FillValue", "missing_value"):
        if fill in attributes:
            values[np.isin(raw, np.asarray(attributes[fill]))] = np.nan
    scale, offset = (attributes.get(name) for name in ("scale_factor", "add_offset"))
    values = values * (1.0 if scale is None else np.ravel(scale)[0]) + (0.0 if offset is None else np.ravel(offset)[0])
    return np.asarray(values * _factor(_text(attributes.get("units", "")), "", key, whose), np.float64)


def _coordinate(variables: Mapping[str, _Variable], name: str, length: int, key: Key) -> Array | None:
    """Values of a dimension's coordinate in m, where the file has one."""
    variable = variables.get(name)
    if variable is None or tuple(variable.data.shape) != (length,):
        return None
    values = np.asarray(variable.data[()], np.float64)
    values = values * _factor(_text(variable.attributes.get("units", "m")), "m", key, f"the coordinate {shown(name)}")
    step = np.diff(values)
    if not (np.isfinite(values).all() and ((step > 0).all() or (step < 0).all())):
        raise RequestError(Fault(key, f"the coordinate {shown(name)} of the file does not rise or fall steadily"))
    return np.asarray(values, np.float64)


def _factor(unit: str, wanted: str, key: Key, whose: str) -> float:
    """Value in SI of a unit as CF writes it (``m s-1``)."""
    if unit in ("", "1"):
        return 1.0
    try:
        factor, found = read_unit(re.sub(r"([A-Za-z])(-?\d+)\b", r"\1^\2", unit))
    except RequestError:
        factor, found = 0.0, ""
    if not found or (wanted and not same_dimension(found, wanted)):
        allowed = f"{wanted} is needed" if wanted else ""
        raise RequestError(Fault(key, f"{whose} is in {shown(unit)}", allowed, "correct its attribute units"))
    return factor


def _text(value: Any) -> str:
    """Text of an attribute, which may be bytes."""
    return value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)


# ------------------------------------------------------------------------------------------------ the kinds of files


@contextmanager
def _opened(path: Path, key: Key) -> Iterator[Mapping[str, _Variable]]:
    """Open a file of any kind; yields its variables by name."""
    if not path.is_file():
        raise RequestError(Fault(key, f"there is no file {path}", remedy=_nearest_file(path)))
    try:
        with path.open("rb") as file:
            start = file.read(8)
        kind = next((kind for magic, kind in _KINDS.items() if start.startswith(magic)), None)
        if kind is None:
            allowed = "HDF5, netCDF-4, classic netCDF and .npy can be read"
            raise RequestError(Fault(key, f"{path} is of no known kind", allowed))
        with kind(path) as variables:
            yield variables
    except (OSError, ValueError, TypeError, EOFError, LookupError) as error:
        reason = str(error).splitlines()[0] if str(error) else type(error).__name__
        raise RequestError(Fault(key, f"{path} cannot be read: {reason}")) from error


def _nearest_file(path: Path) -> str:
    """Return a hint at a file of a similar name beside it."""
    if not path.parent.is_dir():
        return f"there is no folder {path.parent}"
    return did_you_mean(path.name, sorted(other.name for other in path.parent.iterdir() if other.is_file()))


@contextmanager
def _hdf5(path: Path) -> Iterator[Mapping[str, _Variable]]:
    import h5py

    with h5py.File(path, "r") as file:
        variables: dict[str, _Variable] = {}

        def collect(name: str, item: Any) -> None:
            if isinstance(item, h5py.Dataset) and not _text(item.attrs.get("NAME", "")).startswith(_NO_VARIABLE):
                variables[name] = _Variable(item, _hdf5_dimensions(item, file), item.attrs)

        file.visititems(collect)
        yield variables


def _hdf5_dimensions(dataset: Any, file: Any) -> tuple[str, ...]:
    """Names of a dataset's dimension scales; without scales, (y, x) where such datasets fit."""
    if any(len(dimension) for dimension in dataset.dims):
        return tuple(dimension[0].name.lstrip("/") if len(dimension) else "" for dimension in dataset.dims)
    fits = [name in file and file[name].shape == (n,) for name, n in zip("yx", dataset.shape, strict=False)]
    if len(dataset.shape) == 2 and all(fits):
        return ("y", "x")
    return ()


@contextmanager
def _classic(path: Path) -> Iterator[Mapping[str, _Variable]]:
    from scipy.io import netcdf_file

    with netcdf_file(path, "r", mmap=False) as file:
        stored: Mapping[str, Any] = file.variables
        yield {
            name: _Variable(variable.data, tuple(variable.dimensions), variable._attributes)
            for name, variable in stored.items()
        }


@contextmanager
def _npy(path: Path) -> Iterator[Mapping[str, _Variable]]:
    yield {path.stem: _Variable(np.load(path, allow_pickle=False), (), {})}


_KINDS = {b"\x89HDF\r\n\x1a\n": _hdf5, b"CDF": _classic, b"\x93NUMPY": _npy}
