"""Types for settings classes that read quantities into SI floats, and write themselves to the schema."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from ..errors import Fault, RequestError
from .reading import (
    ACCELERATION,
    ANGLE,
    BETA_RATE,
    LENGTH,
    NUMBER,
    RATE,
    SPEED,
    TIME,
    Dimension,
    Measured,
    Percentage,
    read_measured,
    read_quantity,
    split,
)


def refusal(fault: Fault) -> PydanticCustomError:
    """Turn a fault into what a pydantic validator raises; settings turn it back, with its key and line.

    Parameters
    ----------
    fault : Fault
        What is wrong; its key is left out, since pydantic knows it.
    """
    parts = {"found": fault.found, "allowed": fault.allowed, "remedy": fault.remedy}
    return PydanticCustomError("fault", "{found}; {allowed}; {remedy}", parts)


@dataclass(frozen=True)
class QuantityType:
    """Annotation that makes a float of a settings class read quantities of one dimension."""

    dimension: Dimension

    def _read(self, value: object) -> float:
        try:
            return read_quantity(value, self.dimension)
        except RequestError as error:
            raise refusal(error.faults[0]) from None

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read before pydantic's own float, so that limits such as ``Field(gt=0)`` hold for the SI value."""
        return core_schema.no_info_before_validator_function(self._read, core_schema.float_schema())

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: object) -> dict[str, Any]:
        """Write "number or text" to the schema."""
        return quantity_schema(self.dimension)


def quantity_schema(dimension: Dimension) -> dict[str, Any]:
    """JSON Schema of a quantity."""
    unit = "" if dimension.unit == "1" else f" in {dimension.unit}"
    return {
        "anyOf": [
            {"type": "number"},
            {"type": "string", "pattern": r"^\s*[+-]?(\d|\.\d)", "examples": [dimension.example]},
        ],
        "description": f'{dimension.noun}: a number{unit}, or text such as "{dimension.example}"',
    }


@dataclass(frozen=True)
class _MeasuredType:
    """Annotation for a quantity of any dimension; with `percentage`, text in % is kept as a share of something else."""

    percentage: bool

    def _read(self, value: object) -> Measured | Percentage:
        if isinstance(value, Measured | Percentage):
            return value
        try:
            measured = read_measured(value)
            if self.percentage and isinstance(value, str) and split(value)[1] == "%":
                return Percentage(split(value)[0])
        except RequestError as error:
            raise refusal(error.faults[0]) from None
        return measured

    @staticmethod
    def _write(value: Measured | Percentage) -> float | str:
        return value.value if isinstance(value, Measured) and not value.unit else str(value)

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read by our own reader alone."""
        return core_schema.no_info_plain_validator_function(
            self._read, serialization=core_schema.plain_serializer_function_ser_schema(self._write, when_used="json")
        )

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: object) -> dict[str, Any]:
        """Write "number or text" to the schema."""
        example = "8 %" if self.percentage else "500 km"
        return quantity_schema(Dimension("a quantity", "SI", example))


Length = Annotated[float, QuantityType(LENGTH)]
Time = Annotated[float, QuantityType(TIME)]
Speed = Annotated[float, QuantityType(SPEED)]
Angle = Annotated[float, QuantityType(ANGLE)]
Rate = Annotated[float, QuantityType(RATE)]
Acceleration = Annotated[float, QuantityType(ACCELERATION)]
BetaRate = Annotated[float, QuantityType(BETA_RATE)]
Number = Annotated[float, QuantityType(NUMBER)]
AnyQuantity = Annotated[Measured, _MeasuredType(percentage=False)]
Tolerance = Annotated[Measured | Percentage, _MeasuredType(percentage=True)]
