"""Quantities read from a number or a text.

A text is split strictly before any unit library sees it: one number, then a unit expression, nothing else.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, replace
from fractions import Fraction

from ..errors import Fault, RequestError
from .units import read_unit, same_dimension
from .writing import shown

_NUMBER = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?"
_NAME = r"[A-Za-z\u00b5\u03bc\u00b0%][\w%\u00b0]*(?:\s*(?:\^|\*\*)\s*-?\d{1,2})?"
_UNIT = rf"(?:1\s*/\s*|/\s*)?{_NAME}(?:\s*[*/\u00b7\s]\s*{_NAME})*"
_QUANTITY = re.compile(rf"\s*({_NUMBER})\s*({_UNIT})?\s*", re.ASCII | re.IGNORECASE)
_LONGEST = 100  # characters of a quantity's text; the longest sensible one has some 30

Key = tuple[str | int, ...]


@dataclass(frozen=True)
class Dimension:
    """What a quantity measures.

    Parameters
    ----------
    noun : str
        Its name with an article: ``"a length"``.
    unit : str
        The SI unit that bare numbers are in; ``"1"`` for pure numbers.
    example : str
        How one is written.
    """

    noun: str
    unit: str
    example: str

    @property
    def allowed(self) -> str:
        """What may be written, in words."""
        if self.unit == "1":
            return f'{self.noun} is written as a number or as a percentage such as "{self.example}"'
        return f'{self.noun} is written as a number in {self.unit} or as text with a unit such as "{self.example}"'


@dataclass(frozen=True)
class Measured:
    """A quantity whose dimension is not known beforehand.

    Parameters
    ----------
    value : float
        Its value in SI base units, angles in rad.
    unit : str
        That unit, such as ``"m/s^2"`` or ``"1/m/s"``; ``"1"`` for a pure number; empty for a bare number, which is
        in the SI unit of whatever it is compared with.
    """

    value: float
    unit: str

    def __str__(self) -> str:
        return f"{self.value!r} {self.unit}" if self.unit not in ("", "1") else repr(self.value)


@dataclass(frozen=True)
class Percentage:
    """A share of something named elsewhere, as text such as ``"8 %"``.

    Parameters
    ----------
    percent : float
        The number before the sign.
    """

    percent: float

    @property
    def fraction(self) -> float:
        """The share as a fraction: 0.08 for 8 %."""
        return self.percent / 100

    def __str__(self) -> str:
        return f"{self.percent!r} %"


LENGTH = Dimension("a length", "m", "500 km")
TIME = Dimension("a time", "s", "6 h")
SPEED = Dimension("a speed", "m/s", "0.5 m/s")
ANGLE = Dimension("an angle", "rad", "45 deg")
RATE = Dimension("a rate", "1/s", "10 rpm")
ACCELERATION = Dimension("an acceleration", "m/s^2", "0.02 m/s^2")
BETA_RATE = Dimension("a rate over a length", "1/m/s", "2e-11 1/m/s")
NUMBER = Dimension("a pure number", "1", "8 %")

DIMENSIONS: dict[str, Dimension] = {
    "length": LENGTH,
    "time": TIME,
    "speed": SPEED,
    "angle": ANGLE,
    "rate": RATE,
    "acceleration": ACCELERATION,
    "rate over a length": BETA_RATE,
    "number": NUMBER,
}


def split(text: str) -> tuple[float, str]:
    """Split a text into its number and its unit expression, which may be empty.

    Raises
    ------
    RequestError
        Where it is anything else: ``1 000 km``, ``1,5 km``, ``km``, ``5 m + 3 km``, ``nan m``, ``1_000 m``.
    """
    match = _QUANTITY.fullmatch(text) if len(text) <= _LONGEST else None
    if not match:
        if re.search(r"\d[ ,'_]\d", text):
            remedy = "use a point for decimals and no thousands separator"
        else:
            remedy = "write one number, then a unit such as m, m/s^2, 1/m/s or m^-1 s^-1"
        raise RequestError(Fault((), f"{shown(text)} is not one number with a unit", remedy=remedy))
    unit = " ".join((match[2] or "").split())
    return float(match[1]), "1" + unit if unit.startswith("/") else unit


def looks_like_quantity(text: str) -> bool:
    """Whether a text begins as a quantity does, with a number that is followed by a name or nothing."""
    return re.match(rf"\s*{_NUMBER}\s*(?:$|[A-Za-z%\u00b5\u03bc\u00b0])", text) is not None


def read_measured(value: object, key: Key = ()) -> Measured:
    """Read a number or a text with a unit of any dimension.

    Parameters
    ----------
    value : object
        What was written.
    key : tuple
        Where it stands, for the message.

    Raises
    ------
    RequestError
        Where it is no quantity, its unit is not known, or its value is not finite.
    """
    if isinstance(value, str):
        try:
            number, expression = split(value)
        except RequestError as error:
            raise RequestError(replace(error.faults[0], key=key)) from None
        try:
            factor, unit = read_unit(expression) if expression else (1.0, "1")
        except RequestError as error:
            fault = error.faults[0]
            raise RequestError(replace(fault, key=key, found=f"{shown(value)} has {fault.found}")) from None
        measured = Measured(_product(number, factor), unit)
    elif isinstance(value, bool) or not isinstance(value, int | float):
        found = f"{shown(value)} is not a quantity"
        raise RequestError(Fault(key, found, 'a quantity is a number, or text with a unit such as "500 km"'))
    else:
        try:
            measured = Measured(float(value), "")
        except OverflowError:
            measured = Measured(math.inf, "")
    if not math.isfinite(measured.value):
        raise RequestError(Fault(key, f"{shown(value)} is not a finite number"))
    return measured


def _product(number: float, factor: float) -> float:
    """Multiply the number as it was written, in decimals, with one rounding: 2.2 day is 190080 s to the last bit."""
    if not math.isfinite(number):
        return number
    try:
        return float(Fraction(repr(number)) * Fraction(factor))
    except OverflowError:
        return math.copysign(math.inf, number)


def read_quantity(value: object, dimension: Dimension, key: Key = ()) -> float:
    """Read a number in SI, or a text with a unit of the given dimension, into an SI float.

    Parameters
    ----------
    value : object
        What was written, such as ``"3 h"`` or ``10800``.
    dimension : Dimension
        What it must measure, such as ``TIME``.
    key : tuple
        Where it stands, for the message.

    Raises
    ------
    RequestError
        Where it is anything else.
    """
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise RequestError(Fault(key, f"{shown(value)} is not {dimension.noun}", dimension.allowed))
    try:
        measured = read_measured(value, key)
    except RequestError as error:
        raise RequestError(replace(error.faults[0], allowed=dimension.allowed)) from None
    if isinstance(value, str) and not split(value)[1] and dimension.unit != "1":
        number = value.strip()
        remedy = f'write {number} without quotes, or "{number} {dimension.unit}"'
        raise RequestError(Fault(key, f"{shown(value)} has no unit", dimension.allowed, remedy))
    if measured.unit and not same_dimension(measured.unit, dimension.unit):
        raise RequestError(Fault(key, f"{shown(value)} is {describe(measured.unit)}", dimension.allowed))
    return measured.value


def describe(unit: str) -> str:
    """Say what an SI unit measures: ``"a speed"``, or ``"a quantity in kg m"``."""
    for dimension in DIMENSIONS.values():
        if same_dimension(unit, dimension.unit):
            return dimension.noun
    return f"a quantity in {unit}"
