"""Fields: a number, a quantity, a formula or a variable of a file, evaluated at given x and y; types for settings."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Annotated, Any

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from ..choices import Choice
from ..errors import Fault, RequestError
from ..quantities import LENGTH, SPEED, Dimension, read_quantity, refusal, shown, split
from .files import Moment, Stored, load
from .formula import FUNCTIONS, NAMES, Formula, is_python

__all__ = [
    "FUNCTIONS",
    "NAMES",
    "FieldType",
    "FieldValue",
    "FileVariable",
    "Formula",
    "LengthField",
    "SpeedField",
    "evaluate",
    "evaluate_variable",
    "read_field",
    "uses",
]

Array = NDArray[np.float64]
Key = tuple[str | int, ...]


class FileVariable(Choice):
    """`{ file = "...", variable = "..." }`: a variable [y, x] of an HDF5, netCDF or `.npy` file."""

    file: Annotated[Path, Field(description="the file, relative to the configuration")]
    variable: Annotated[str | None, Field(description="may be left out where the file holds only one")] = None


Source = float | Formula | FileVariable

# a number, then what no formula goes on with
_BEGINS_WITH_NUMBER = re.compile(r"\s*[+-]?\.?\d[\d.]*(e[+-]?\d+)?\s*[\w,'%\u00b0\u00b5\u03bc]", re.IGNORECASE)


# ----------------------------------------------------------------------------------------------------- evaluation


def evaluate(source: Source | str, x: Array, y: Array, constants: Mapping[str, float], key: Key) -> float | Array:
    """Evaluate a field at points.

    Parameters
    ----------
    source : float, Formula, FileVariable or str
        The field; a str is a formula.
    x : ndarray ``[1, n]``
        Abscissae, m.
    y : ndarray ``[m, 1]``
        Ordinates, m.
    constants : mapping of str to float
        What formulas may use besides x and y.
    key : tuple
        Where the field stands in the configuration, for messages.

    Returns
    -------
    float, or ndarray that broadcasts to ``[m, n]``

    Raises
    ------
    RequestError
        Where a value is not finite, a constant does not exist here, or a file does not fit.
    """
    if isinstance(source, FileVariable):
        return evaluate_variable(source.file, source.variable, x, y, key)
    if isinstance(source, str):
        source = Formula(source)
    if not isinstance(source, Formula):
        return float(source)
    known: dict[str, float | Array] = {"pi": math.pi, **constants, "x": x, "y": y}
    if missing := sorted(source.names - set(known)):
        raise RequestError(_missing(missing[0], key, constants))
    values = source.values(known)
    _refuse_not_finite(values, x, y, key, f"the formula {shown(source.text)}")
    return float(values) if values.ndim == 0 else values


def evaluate_variable(file: Path, variable: str | None, x: Array, y: Array, key: Key, moment: Moment = "only") -> Array:
    """Evaluate a variable of a file at points: as it is, or by bilinear interpolation between its own coordinates.

    Parameters
    ----------
    file, variable : Path, str or None
        Where the values are.
    x, y : ndarray ``[1, n]``, ``[m, 1]``
        The points, m.
    key : tuple
        Where the file is asked for, for messages.
    moment : float, "only" or "last"
        Which time of a variable ``(time, y, x)``: model time in s, the last, or the only one there is.

    Returns
    -------
    ndarray ``[m, n]``

    Raises
    ------
    RequestError
        Where file or variable are missing, shapes differ, points lie outside the file, or a value is not finite.
    """
    stored = load(Path(file), variable, key, moment)
    values = _at_points(stored, x, y, key, str(file))
    _refuse_not_finite(values, x, y, key, f"{file}")
    return values


def uses(source: Source | str) -> set[str]:
    """Names that a field's formula uses; empty for numbers and files."""
    if isinstance(source, str):
        source = Formula(source)
    return set(source.names) if isinstance(source, Formula) else set()


def _missing(name: str, key: Key, constants: Mapping[str, float]) -> Fault:
    found = f"the formula uses {name}, which has no value here"
    if name == "a" and constants.get("f0") == 0:
        return Fault(key, found, remedy="a = c/|f0| is infinite where f0 = 0: write a length")
    return Fault(key, found, f"known here: {', '.join(sorted({'x', 'y', 'pi', *constants}))}")


def _refuse_not_finite(values: Array, x: Array, y: Array, key: Key, whose: str) -> None:
    finite = np.isfinite(values)
    if finite.all():
        return
    shape = np.broadcast_shapes(x.shape, y.shape)
    bad = ~np.broadcast_to(finite, shape)
    first = tuple(np.argwhere(bad)[0])
    place = f"x = {np.broadcast_to(x, shape)[first]:.6g} m, y = {np.broadcast_to(y, shape)[first]:.6g} m"
    value = np.broadcast_to(values, shape)[first]
    number = f"and at {bad.sum() - 1} more of {bad.size} points" if bad.sum() > 1 else "and nowhere else"
    raise RequestError(Fault(key, f"{whose} gives {value} at {place}, {number}", "every value must be finite"))


def _at_points(stored: Stored, x: Array, y: Array, key: Key, file: str) -> Array:
    """Values of a stored variable at the points asked for."""
    shape = np.broadcast_shapes(x.shape, y.shape)
    if stored.x is None or stored.y is None:
        if stored.values.shape != shape:
            sizes, wanted = (" x ".join(map(str, reversed(s))) for s in (stored.values.shape, shape))
            found = f"{file} holds {sizes} values (x, y), and {wanted} points are asked for"
            raise RequestError(Fault(key, found, "the same number, or coordinates in the file to interpolate between"))
        return stored.values
    if stored.values.shape == shape and _same(stored.x, x) and _same(stored.y, y):
        return stored.values
    xs, ys = (_inside(own, asked, name, key, file) for own, asked, name in ((stored.x, x, "x"), (stored.y, y, "y")))
    return _bilinear(stored, np.broadcast_to(xs, shape), np.broadcast_to(ys, shape))


def _same(own: Array, asked: Array) -> bool:
    """Whether coordinates agree within round-off of their conversion, far below any spacing."""
    return own.size == asked.size and bool(np.allclose(own, asked.ravel(), rtol=1e-9, atol=1e-9 * np.ptp(own)))


def _inside(own: Array, asked: Array, name: str, key: Key, file: str) -> Array:
    """Return points asked for, moved onto the file's rim where they miss it by round-off; farther out is refused."""
    low, high = float(own.min()), float(own.max())
    slack = 1e-9 * (high - low)
    outside = asked[(asked < low - slack) | (asked > high + slack)]
    if outside.size:
        found = (
            f"{file} reaches from {name} = {low:.6g} m to {high:.6g} m, and {name} = {outside[0]:.6g} m is asked for"
        )
        raise RequestError(Fault(key, found, "a file must cover every point; nothing is extrapolated"))
    return np.clip(asked, low, high)


def _bilinear(stored: Stored, x: Array, y: Array) -> Array:
    from scipy.interpolate import RegularGridInterpolator

    assert stored.x is not None
    assert stored.y is not None
    return np.asarray(RegularGridInterpolator((stored.y, stored.x), stored.values)((y, x)), np.float64)


# -------------------------------------------------------------------------------------- types for settings classes


def read_field(value: object, dimension: Dimension) -> Source:
    """Read what stands for a field in a configuration: a number, a quantity or a formula.

    Raises
    ------
    RequestError
        Where it is none of them.
    """
    allowed = (
        f'a field is a number in {dimension.unit}, text with a unit such as "{dimension.example}", '
        'a formula in x and y, or { file = "...", variable = "..." }'
    )
    if isinstance(value, Formula):
        return value
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise RequestError(Fault((), f"{shown(value)} is not a field", allowed))
    if isinstance(value, str) and (is_python(value) or not _BEGINS_WITH_NUMBER.match(value)):
        return Formula(value)
    try:
        return read_quantity(value, dimension)
    except RequestError as error:
        fault = error.faults[0]
        remedy = _product(str(value)) or fault.remedy
        raise RequestError(replace(fault, allowed=allowed, remedy=remedy)) from None


def _product(text: str) -> str:
    """Hint at a product that was written without its sign, such as ``2 x``."""
    try:
        number, name = split(text)
    except RequestError:
        return ""
    return f'write "{number:g} * {name}"' if name in NAMES else ""


@dataclass(frozen=True)
class FieldType:
    """Annotation that makes an entry of a settings class read fields of one dimension."""

    dimension: Dimension

    def _read(self, value: object) -> Source:
        if isinstance(value, dict | FileVariable):
            return FileVariable.model_validate(value)
        try:
            return read_field(value, self.dimension)
        except RequestError as error:
            raise refusal(error.faults[0]) from None

    @staticmethod
    def _write(value: Source) -> Any:
        if isinstance(value, FileVariable):
            return value.model_dump(mode="json", exclude_none=True)
        return value.text if isinstance(value, Formula) else value

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read by our own reader alone."""
        return core_schema.no_info_plain_validator_function(
            self._read, serialization=core_schema.plain_serializer_function_ser_schema(self._write, when_used="json")
        )

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: object) -> dict[str, Any]:
        """Write "number, text, or file and variable" to the schema."""
        unit, example = self.dimension.unit, self.dimension.example
        return {
            "anyOf": [
                {"type": "number", "description": f"in {unit}"},
                {"type": "string", "minLength": 1, "examples": [example, "10 * exp(-(x/a)**2)"]},
                {
                    "type": "object",
                    "properties": {"file": {"type": "string", "format": "path"}, "variable": {"type": "string"}},
                    "required": ["file"],
                    "additionalProperties": False,
                },
            ],
            "description": f"a field in {unit}: a number, a quantity, a formula, or a variable of a file",
        }


LengthField = Annotated[float | Formula | FileVariable, FieldType(LENGTH)]
SpeedField = Annotated[float | Formula | FileVariable, FieldType(SPEED)]
FieldValue = LengthField
