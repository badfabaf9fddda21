"""The experiment: every room's settings in one frozen class, read from a TOML file with all its faults at once."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Self

from pydantic import Field, PrivateAttr, TypeAdapter, ValidationError, model_validator

from ..choices import Choice
from ..dynamics import NumericsSettings
from ..errors import Fault, RequestError
from ..frame import FrameSettings
from ..grid import EdgesSettings, GridSettings, LayerSettings
from ..measures import ExpectSettings
from ..quantities import refusal
from ..state import StartSettings
from ..steppers import TimeSettings
from ..store import OutputSettings
from .agreement import disagreements
from .document import Document, absolute_paths, read_document, read_value
from .messages import faults_of

if TYPE_CHECKING:  # a union made from a table is no type to a type checker
    AnyStart = Any
else:
    AnyStart = StartSettings


class Experiment(Choice):
    """An experiment and what is expected of it: validated, frozen, in SI.

    Each table of the configuration is an attribute of its name, of the settings class of the room that it describes.
    """

    title: Annotated[str, Field(description="one line")] = ""
    question: Annotated[str, Field(description="what the experiment is to answer")] = ""
    notes: Annotated[str, Field(description="anything else worth keeping")] = ""
    frame: Annotated[FrameSettings, Field(description="where on what body", default_factory=FrameSettings)]
    layer: Annotated[LayerSettings, Field(description="the fluid")]
    grid: Annotated[GridSettings, Field(description="cells and size")]
    edges: Annotated[EdgesSettings, Field(description="what lies at each side")]
    start: Annotated[tuple[AnyStart, ...], Field(description="parts of the start state, summed; none is rest")] = ()
    numerics: Annotated[NumericsSettings, Field(description="schemes", default_factory=NumericsSettings)]
    time: Annotated[TimeSettings, Field(description="stepper, step and end")]
    output: Annotated[OutputSettings, Field(description="what is stored", default_factory=OutputSettings)]
    expect: Annotated[tuple[ExpectSettings, ...], Field(description="what should come out")] = ()

    _document: Document | None = PrivateAttr(default=None)

    @model_validator(mode="after")
    def _agree(self) -> Self:
        """Refuse keys that do not agree with each other."""
        if faults := disagreements(dict(self)):
            found = "; ".join(str(fault) for fault in faults)
            raise refusal(Fault((), found))
        return self

    @classmethod
    def from_json(cls, values: Mapping[str, Any]) -> Experiment:
        """Build an experiment from tables and lists, such as those of `as_json`.

        Parameters
        ----------
        values : mapping
            As a configuration holds them; paths count from the current folder.

        Raises
        ------
        RequestError
            With every fault at once.
        """
        return _validated(Document(absolute_paths(dict(values), Path.cwd())))

    def as_json(self) -> dict[str, Any]:
        """Return everything, defaults filled and paths absolute, as JSON has it; `from_json` gives the same back."""
        return self.model_dump(mode="json", by_alias=True)

    def with_values(self, values: Mapping[str, Any]) -> Experiment:
        """Return the experiment with other values.

        Parameters
        ----------
        values : mapping of str to object
            By dotted key, items of lists numbered from 0: ``{"frame.latitude": "30 deg", "start.0.width": 5e4}``.

        Raises
        ------
        RequestError
            Where a key leads nowhere or a value is refused; every fault at once.
        """
        document = self._document or Document(self.as_json())
        return _validated(document.with_values(values, "with_values"))

    @property
    def text(self) -> str:
        """Text of the configuration, verbatim; empty where there was none."""
        return self._document.text if self._document else ""

    @property
    def path(self) -> Path | None:
        """The configuration's file, as it was named; None where there was none."""
        return self._document.path if self._document else None

    def placed(self, error: RequestError) -> RequestError:
        """Return an error that was found later with the places of its keys in the configuration."""
        return RequestError(self._document.placed(error.faults)) if self._document else error

    def __eq__(self, other: object) -> bool:
        """Two experiments are equal where all their settings are, whatever they were read from."""
        return isinstance(other, Experiment) and self.__dict__ == other.__dict__

    def __hash__(self) -> int:
        return hash(tuple(self.__dict__.values()))


def read(path: str | Path, sets: Mapping[str, str] | None = None) -> Experiment:
    """Read an experiment from a TOML file.

    Parameters
    ----------
    path : str or Path
        The file; paths in it count from its folder.
    sets : mapping of str to str
        Other values by dotted key (``start.0.width``), each read as TOML, else as text; paths in them count from the
        current folder.

    Raises
    ------
    RequestError
        With every fault at once, each with file, line, key, what was found, what is allowed, and a remedy.
    """
    document = read_document(Path(path))
    if sets:
        document = document.with_values({key: read_value(text) for key, text in sets.items()}, "--set")
    return _validated(document)


def _validated(document: Document) -> Experiment:
    """Build the experiment, or raise every fault of it."""
    dates = document.date_faults()
    try:
        # as JSON, strictly: a number is no truth value, a text no number, and lists may be what settings hold as tuples
        experiment = Experiment.model_validate_json(document.as_json(), strict=True)
    except ValidationError as error:
        faults = faults_of([one for one in error.errors() if one["loc"]], document.values, Experiment)
        faults += disagreements(_right_tables(document, {fault.key[0] for fault in (*faults, *dates)}))
        dated = {fault.key for fault in dates}
        faults = [_bare_degrees(fault, document) for fault in faults if fault.key not in dated] + dates
        raise RequestError(document.placed(faults)) from None
    if dates:
        raise RequestError(document.placed(dates))
    experiment._document = document
    return experiment


def _right_tables(document: Document, wrong: set[str | int]) -> dict[str, Any]:
    """Return the tables that are right in themselves, by name."""
    tables: dict[str, Any] = {}
    for name, field in Experiment.model_fields.items():
        if name in wrong:
            continue
        if name in document.values:
            reader: TypeAdapter[Any] = TypeAdapter(field.rebuild_annotation())
            tables[name] = reader.validate_json(document.as_json(name), strict=True)
        else:
            tables[name] = field.get_default(call_default_factory=True, validated_data={})
    return tables


def _bare_degrees(fault: Fault, document: Document) -> Fault:
    """Hint at a latitude in degrees that was written without its unit."""
    written = document.values.get("frame", {}).get("latitude") if fault.key == ("frame", "latitude") else None
    if isinstance(written, bool) or not isinstance(written, int | float) or not math.pi / 2 < abs(written) <= 90:
        return fault
    found = f"{written:g} is {math.degrees(written):.6g} deg, since a bare number is in rad"
    return replace(fault, found=found, remedy=f'write "{written:g} deg"')
