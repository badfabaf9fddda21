"""What every measure is, and the keys that several share.

To write another measure:

1. Make a class of `Measure` in one file of this folder: `kind` (its name), `meaning`, `source`, its keys with types.
2. Give it `unit` (of what it finds) and `find` (a `Record` to a `Finding`); where it cannot tell, raise
   `NoAnswerError` with the reason. Its own error comes from `measure_error`.
3. Give it `faults`: what can be refused before a run, with keys relative to the measure.
4. Add the class to the table `MEASURES`. The tests that hold for every row run on it unasked.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated, Any, Protocol

from pydantic import ConfigDict, Field, GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic_core import CoreSchema, core_schema

from ...choices import Choice, name_in
from ...errors import Fault, RequestError
from ...quantities import (
    LENGTH,
    TIME,
    Dimension,
    Length,
    format_quantity,
    quantity_schema,
    read_quantity,
    refusal,
    shown,
)
from ...store.names import FIELDS, SERIES
from ..finding import Finding, NoAnswerError
from ..record import Along, Record, si


@dataclass(frozen=True)
class OneOrTwo:
    """Annotation for one quantity or a pair of them.

    Parameters
    ----------
    dimension : Dimension
        What each measures.
    pair : str
        How a pair is written.
    rising : bool
        Whether the second must not be less than the first.
    """

    dimension: Dimension
    pair: str
    rising: bool = False

    def _read(self, value: object) -> tuple[float, float] | float:
        try:
            if not isinstance(value, list | tuple):
                return read_quantity(value, self.dimension)
            if len(value) != 2:
                raise RequestError(Fault((), f"{shown(value)} is not a pair", f"a pair is written {self.pair}"))
            first, second = (read_quantity(one, self.dimension) for one in value)
        except RequestError as error:
            raise refusal(error.faults[0]) from None
        if self.rising and second < first:
            names = [format_quantity(one, self.dimension.unit) for one in (first, second)]
            raise refusal(Fault((), f"{names[1]} comes before {names[0]}", f"{self.pair} with the earlier one first"))
        return first, second

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read by our own reader alone."""
        return core_schema.no_info_plain_validator_function(self._read)

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        """Write "a quantity or two" to the schema."""
        one = quantity_schema(self.dimension)
        two = {"type": "array", "items": one, "minItems": 2, "maxItems": 2}
        return {"anyOf": [*one["anyOf"], two], "description": f"{self.dimension.noun}, or a pair {self.pair}"}


if TYPE_CHECKING:  # a table is no type to a type checker
    FieldName = str
    SignalName = str
    SeriesName = str
else:
    FieldName = name_in(FIELDS)
    SignalName = name_in([*FIELDS, "velocity"])
    SeriesName = name_in([*SERIES, "energy"])
FieldOf = Annotated[FieldName, Field(description="a field, computed from eta, u, v where it was not stored")]
AlongLine = Annotated[Along, Field(description="direction of the line")]
Place = Annotated[tuple[float, float] | float, OneOrTwo(LENGTH, "[x, y]")]
During = Annotated[tuple[float, float] | float, OneOrTwo(TIME, "[t0, t1]", rising=True)]
OtherCoordinate = Annotated[
    Length | None, Field(description="the line's other coordinate; left out: mean over the other direction")
]
LineStart = Annotated[Length | None, Field(alias="from", description="where the line begins; beyond `to` it runs back")]
LineEnd = Annotated[Length | None, Field(description="where the line ends")]


def _require_kind(schema: dict[str, Any]) -> None:
    """Say in the schema what the choice among kinds needs anyway."""
    schema["required"] = ["kind", *schema.get("required", [])]


class Measure(Choice):
    """Base of the measures."""

    model_config = ConfigDict(json_schema_extra=_require_kind, serialize_by_alias=True)

    kind: Any

    def unit(self) -> str:
        """Return the SI unit of what is found, written as in `quantities`."""
        raise NotImplementedError

    def find(self, record: Record) -> Finding:
        """Measure; raise `NoAnswerError` with the reason where that is not possible."""
        raise NotImplementedError

    def faults(self, record: Record, period: float | None) -> Iterator[Fault]:
        """Yield what can be refused before a run.

        Parameters
        ----------
        record : Record
            What the run will leave, from `Record.planned`, or has left.
        period : float or None
            Expected period of what is measured, s, where it is known.
        """
        raise NotImplementedError

    def take(self, record: Record) -> Finding:
        """Measure.

        Parameters
        ----------
        record : Record
            The fields and time series of a run.

        Returns
        -------
        Finding
            With a reason instead of a value where nothing can be told.
        """
        try:
            return self.find(record)
        except NoAnswerError as error:
            return Finding(None, self.unit(), reason=str(error))


class OwnMeasure(Protocol):
    """Any object of your own that measures."""

    def take(self, record: Record) -> Finding:
        """Measure."""


def unit_of(name: str) -> str:
    """SI unit of a field, written as in `quantities`."""
    return si(FIELDS[name].units)
