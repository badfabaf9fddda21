"""Choices: frozen settings classes, tables of rows to choose from, and the nearest right name.

Whatever can be chosen by name stands in a literal table at the foot of the file that holds its rows. Settings, schema,
listings, documents and parametrised tests all read the table.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Mapping
from typing import Annotated, Any, ClassVar, Literal, Protocol, Union

from pydantic import BaseModel, ConfigDict, Field


class Choice(BaseModel):
    """Base of every settings class: frozen, and no key beyond those it names.

    A class that is a row of a table sets `meaning` and `source`.
    """

    model_config = ConfigDict(frozen=True, extra="forbid", validate_default=True, defer_build=True)

    meaning: ClassVar[str] = ""
    source: ClassVar[str] = ""


class Row(Protocol):
    """What every row of a table can say of itself."""

    @property
    def meaning(self) -> str:
        """One line: what it is."""

    @property
    def source(self) -> str:
        """Where it was published, or "common practice"."""


def name_in(table: Mapping[str, Any]) -> Any:
    """Type of a name that must stand in `table`."""
    return Literal[tuple(table)]


def one_of(table: Mapping[str, type[Choice]]) -> Any:
    """Type of a settings table whose `kind` picks one row of `table`."""
    rows = tuple(table.values())
    if len(rows) == 1:
        return rows[0]
    return Annotated[Union[rows], Field(discriminator="kind")]  # noqa: UP007  (a tuple of types)


def nearest(word: str, allowed: Iterable[str]) -> str:
    """Return the allowed name nearest to `word`, or an empty string where none is near.

    Parameters
    ----------
    word : str
        What was written.
    allowed : iterable of str
        The right names.
    """
    names = {name.lower(): name for name in allowed}
    near = difflib.get_close_matches(word.lower(), names, n=1, cutoff=0.6)
    return names[near[0]] if near else ""


def did_you_mean(word: str, allowed: Iterable[str]) -> str:
    """Return ``did you mean "depth"?``, or an empty string where no name is near."""
    near = nearest(word, allowed)
    return f'did you mean "{near}"?' if near else ""
