"""What the tables of the outlook are made of: rows with a name, a value with its unit, and how it comes about."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from ..quantities import format_quantity

BYTES = "byte"
PEOPLE = ("burger", "froude", "kelvin", "rhines", "rossby")
_BYTE_UNITS = (("TB", 1e12), ("GB", 1e9), ("MB", 1e6), ("kB", 1e3))


@dataclass(frozen=True)
class Row:
    """One row of a table.

    Parameters
    ----------
    key : str
        Its name, in words joined by ``_``.
    value : float, int, str or None
        In `unit`; text where it is a name; None where it is not known.
    unit : str
        SI unit, ``"byte"``, or empty.
    note : str
        The formula, or what else is to be said.
    shown : str
        What to print in place of the value.
    """

    key: str
    value: float | str | None
    unit: str = ""
    note: str = ""
    shown: str = ""

    @property
    def name(self) -> str:
        """Its name as it is printed."""
        return named(self.key)

    @property
    def text(self) -> str:
        """Its value as it is printed."""
        return self.shown or written(self.value, self.unit)

    def as_json(self) -> dict[str, Any]:
        """Return value, unit and note; None for what is not known or not finite."""
        return {"value": number(self.value), "unit": self.unit, "note": self.note}


@dataclass(frozen=True)
class Table:
    """A table of rows.

    Parameters
    ----------
    title : str
        One word.
    rows : tuple of Row
        Its rows.
    """

    title: str
    rows: tuple[Row, ...]

    def as_json(self) -> dict[str, Any]:
        """Return the rows by key."""
        return {row.key: row.as_json() for row in self.rows}


def named(key: str) -> str:
    """Write words joined by ``_`` apart, names of people with a capital."""
    return " ".join(word.capitalize() if word in PEOPLE else word for word in key.split("_"))


def written(value: float | str | None, unit: str) -> str:
    """Write a value with its unit for people."""
    if value is None:
        return "not known"
    if isinstance(value, str):
        return value
    if unit == BYTES:
        return _bytes(value)
    if isinstance(value, int):
        return f"{value:,}".replace(",", " ")
    if math.isinf(value):
        return "infinite"
    return format_quantity(value, unit)


def number(value: float | str | None) -> float | str | None:
    """Return a value as JSON can hold it: None for what is not finite."""
    return None if isinstance(value, float) and not math.isfinite(value) else value


def listed(words: list[str]) -> str:
    """Join words as a sentence does: ``a, b and c``."""
    return " and ".join(filter(None, [", ".join(words[:-1]), words[-1] if words else ""]))


def _bytes(size: float) -> str:
    for name, factor in _BYTE_UNITS:
        if size >= factor:
            return f"{size / factor:.3g} {name}"
    return f"{size:.0f} byte"
