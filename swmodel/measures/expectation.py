"""`[[expect]]`: what should come out, resolved into a number, and what of it can be refused before a run.

Imports neither scipy nor h5py nor numba: every command reads these settings.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Annotated, Any, Literal, NamedTuple

from pydantic import Discriminator, Field, Tag, field_validator

from ..choices import Choice, name_in
from ..errors import Fault, RequestError
from ..grid import Basin
from ..quantities import (
    Acceleration,
    AnyQuantity,
    BetaRate,
    Dimension,
    Length,
    Measured,
    Percentage,
    QuantityType,
    Rate,
    Tolerance,
    describe,
    looks_like_quantity,
    refusal,
    same_dimension,
)
from ..theory import THEORY
from .kinds import MeasureSettings
from .record import Record

Wavenumber = Annotated[float, QuantityType(Dimension("a wavenumber", "1/m", "1e-5 1/m"))]
if TYPE_CHECKING:  # a table is no type to a type checker
    TheoryName = str
    AnyMeasure = Any
else:
    TheoryName = name_in(THEORY)
    AnyMeasure = MeasureSettings


class TheoryValue(Choice):
    """A name in theory with arguments of one's own; the others come from the experiment and its only such wave."""

    theory: TheoryName
    gravity: Acceleration | None = None
    depth: Length | None = None
    f0: Rate | None = None
    beta: BetaRate | None = None
    k: Wavenumber | None = None
    l: Wavenumber | None = None  # noqa: E741  (the field's symbol)
    dx: Length | None = None
    dy: Length | None = None
    mode: Annotated[int | None, Field(ge=-1)] = None
    branch: Literal["rossby", "gravity"] | None = None
    edge: Literal["west", "east", "south", "north"] | None = None
    on_grid: Annotated[bool | None, Field(description="the C-grid's own relation")] = None


def _how_written(value: object) -> str:
    """Tell the ways to write a value apart."""
    if isinstance(value, dict | TheoryValue):
        return "table"
    return "name" if isinstance(value, str) and not looks_like_quantity(value) else "quantity"


Value = Annotated[
    Annotated[AnyQuantity, Tag("quantity")] | Annotated[TheoryName, Tag("name")] | Annotated[TheoryValue, Tag("table")],
    Discriminator(_how_written),
    Field(description='a quantity, a name in theory, or { theory = "...", k = ..., ... }'),
]


class ExpectSettings(Choice):
    """`[[expect]]`: one claim, how it is measured, what is expected, how near, and why that near."""

    claim: Annotated[str, Field(min_length=1, description="a sentence")]
    measure: AnyMeasure
    value: Value
    within: Annotated[Tolerance, Field(description="a percentage of the value, or a quantity of its dimension")]
    because: Annotated[str, Field(min_length=1, description="why that tolerance")]


class Expectation(ExpectSettings):
    """The same with a measure of your own: any object with ``take(record)`` that returns a `Finding`."""

    measure: Any

    @field_validator("measure")
    @classmethod
    def _takes(cls, measure: object) -> object:
        if not callable(getattr(measure, "take", None)):
            raise refusal(Fault((), f"{type(measure).__name__} has no take(record)", "an object that measures"))
        return measure


class Expected(NamedTuple):
    """What is expected.

    Parameters
    ----------
    value : float
        In `unit`.
    unit : str
        SI unit; empty where a bare number stands beside a measure of one's own that names none beforehand.
    theory : str or None
        Name in `THEORY`; None where the value was given outright.
    """

    value: float
    unit: str
    theory: str | None


def unit_of_measure(measure: Any) -> str:
    """SI unit of what a measure finds; empty where a measure of one's own does not say."""
    unit: Callable[[], str] | None = getattr(measure, "unit", None)
    return unit() if callable(unit) else ""


def expected_value(expect: ExpectSettings, basin: Basin, starts: Sequence[Any]) -> Expected:
    """Resolve what an expectation expects.

    Parameters
    ----------
    expect : ExpectSettings
        The expectation.
    basin : Basin
        The experiment's own constants.
    starts : sequence
        The parts of the start; a wave among them gives arguments that were left out.

    Returns
    -------
    Expected
        The sign of a phase speed from theory is turned with a line that runs toward -x or -y.

    Raises
    ------
    RequestError
        Where theory lacks an argument or has no value here, with keys relative to the expectation.
    """
    if isinstance(expect.value, Measured):
        return Expected(expect.value.value, expect.value.unit or unit_of_measure(expect.measure), None)
    row, known = _with_arguments(expect, basin, starts)
    value = _evaluate(row, known, ("value",))
    if getattr(expect.measure, "backward", False):
        value = -value
    return Expected(value, THEORY[row].unit, row)


def expected_period(expect: ExpectSettings, basin: Basin, starts: Sequence[Any]) -> float | None:
    """Period of the oscillation that an expectation is about, s; None where there is none or it is not known."""
    kind = getattr(expect.measure, "kind", "")
    if kind not in ("frequency", "phase_speed"):
        return None
    try:
        if kind == "frequency":
            omega = expected_value(expect, basin, starts).value
        elif isinstance(expect.value, Measured):
            waves = [start.theory_arguments(basin) for start in starts if hasattr(start, "theory_arguments")]
            number = waves[0].get("k" if expect.measure.along == "x" else "l", 0.0) if len(waves) == 1 else 0.0
            omega = expect.value.value * number
        else:
            row, known = _with_arguments(expect, basin, starts)
            partner = row.replace("_phase_speed", "_frequency")
            if partner == row:
                return None
            omega = _evaluate(partner, known, ())
    except RequestError:
        return None
    return 2 * math.pi / abs(omega) if omega else None


def tolerance(within: Measured | Percentage, expected: Expected) -> float:
    """Tolerance in the unit of what is expected."""
    return within.fraction * abs(expected.value) if isinstance(within, Percentage) else within.value


def faults(expect: ExpectSettings, number: int, record: Record, starts: Sequence[Any]) -> list[Fault]:
    """Say everything for which an expectation is refused.

    Parameters
    ----------
    expect : ExpectSettings
        The expectation.
    number : int
        Its place in the list, from 0.
    record : Record
        What the run will leave, from `Record.planned`, or has left.
    starts : sequence
        The parts of the start.

    Returns
    -------
    list of Fault
        Keyed ``("expect", number, ...)``.
    """
    found = []
    unit = unit_of_measure(expect.measure)
    expected = None
    try:
        expected = expected_value(expect, record.basin, starts)
    except RequestError as error:
        found += error.faults
    if expected is not None and expected.unit and unit and not same_dimension(expected.unit, unit):
        found.append(Fault(("value",), f"{_named(expected)} is {describe(expected.unit)}", f"{describe(unit)}"))
    found += _within_faults(expect.within, expected, unit)
    turning = getattr(expect.measure, "of", None) == "velocity"
    if getattr(expect.measure, "kind", "") == "frequency" and not turning and expected and expected.value < 0:
        what = f"{_named(expected)} is negative, and the frequency of {expect.measure.of} has no sense of turning"
        found.append(Fault(("value",), what, "a frequency above 0", 'measure of = "velocity", or expect its size'))
    refuse = getattr(expect.measure, "faults", None)
    if callable(refuse):
        period = expected_period(expect, record.basin, starts)
        found += [replace(fault, key=("measure", *fault.key)) for fault in refuse(record, period)]
    return [replace(fault, key=("expect", number, *fault.key)) for fault in found]


def _within_faults(within: Measured | Percentage, expected: Expected | None, unit: str) -> list[Fault]:
    """Say what is wrong with a tolerance."""
    if isinstance(within, Percentage):
        if expected is not None and expected.value == 0:
            wanted = f"{describe(unit)}, absolute" if unit else "an absolute tolerance"
            return [Fault(("within",), f"{within.percent:g} % of an expected value of 0 is nothing", wanted)]
    elif within.unit and unit and not same_dimension(within.unit, unit):
        return [Fault(("within",), f"{within} is {describe(within.unit)}", f"{describe(unit)}, or a percentage")]
    size = within.percent if isinstance(within, Percentage) else within.value
    return [] if size > 0 else [Fault(("within",), f"a tolerance of {size:g} leaves no room", "a tolerance above 0")]


def _named(expected: Expected) -> str:
    return expected.theory or "the expected value"


def _with_arguments(expect: ExpectSettings, basin: Basin, starts: Sequence[Any]) -> tuple[str, dict[str, object]]:
    """Name in theory and everything that is known for it."""
    table = expect.value if isinstance(expect.value, TheoryValue) else TheoryValue(theory=str(expect.value))
    frame, grid = basin.frame, basin.grid
    known: dict[str, object] = {
        "gravity": basin.gravity,
        "depth": basin.reference_depth,
        "f0": frame.f0,
        "beta": frame.beta,
        "along": getattr(expect.measure, "along", None),
    }
    given = {key: value for key, value in table.model_dump(exclude={"theory"}).items() if value is not None}
    if given.get("on_grid"):
        if not basin.even or basin.f.min() != basin.f.max():
            found = "the relation on the grid is known for even depth and uniform f alone"
            raise RequestError(Fault(("value",), found, "", "leave on_grid out"))
        known |= {"dx": grid.dx, "dy": grid.dy}
    family = table.theory.removesuffix("_frequency").removesuffix("_phase_speed")
    waves = [start for start in starts if getattr(start, "wave", None) == family]
    if len(waves) == 1:
        known |= waves[0].theory_arguments(basin)
    known |= given
    missing = [name for name in THEORY[table.theory].needed if known.get(name) is None]
    if missing and len(waves) > 1:
        remedy = f"give {', '.join(missing)} in value"
        raise RequestError(Fault(("value",), f"{len(waves)} parts of the start are {family} waves", "", remedy))
    return table.theory, known


def _evaluate(name: str, known: dict[str, object], key: tuple[str, ...]) -> float:
    try:
        return THEORY[name].value(known)
    except RequestError as error:
        raise RequestError([replace(fault, key=key) for fault in error.faults]) from None
