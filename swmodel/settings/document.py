"""A configuration as it is written: its text, its values with those set from outside, and where each key stands."""

from __future__ import annotations

import copy
import datetime
import json
import math
import os
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import tomli

from ..choices import did_you_mean
from ..errors import Fault, RequestError
from ..quantities import shown
from .locate import Places

LARGEST = 1_000_000  # bytes: a configuration is written by hand
PATH_KEYS = ("file", "run")  # every key of these names holds a path
KEY_ALLOWED = "a key such as frame.latitude or start.0.width; lists are numbered from 0"
DATE_KEYS = (("time", "start"),)  # where a TOML date may stand

Key = tuple[str | int, ...]

_QUOTES = 'write text, and numbers with a unit, between quotes: "500 km"'
_TOML_HINTS = {
    "Invalid value": _QUOTES,
    "Expected newline": _QUOTES,
    "Cannot overwrite": "write every key once",
    "Cannot declare": "write every table once",
}


@dataclass(frozen=True)
class Document:
    """What was written.

    Parameters
    ----------
    values : dict
        Tables, lists and values as TOML has them; paths are absolute.
    text : str
        The text of the file, verbatim; empty where there is none.
    path : Path or None
        The file, as it was named.
    places : Places or None
        Where the keys stand in the text.
    outside : tuple of (key path, origin)
        Keys set from outside, and by what: ``--set``.
    """

    values: dict[str, Any]
    text: str = ""
    path: Path | None = None
    places: Places | None = None
    outside: tuple[tuple[Key, str], ...] = field(default=())

    def placed(self, faults: Sequence[Fault]) -> list[Fault]:
        """Return faults with file and line, in the order of the file."""
        return sorted((self._placed(fault) for fault in faults), key=lambda fault: fault.line or math.inf)

    def _placed(self, fault: Fault) -> Fault:
        for key, origin in reversed(self.outside):
            if fault.key[: len(key)] == key:
                return fault.placed(origin, None)
        if self.path is None:
            return fault
        where = self.places.where(fault.key) if self.places else None
        return fault.placed(str(self.path), where[0] if where else None)

    def with_values(self, values: Mapping[str, Any], origin: str) -> Document:
        """Return the document with other values.

        Parameters
        ----------
        values : mapping of str to object
            By dotted key; items of lists are numbered from 0: ``start.0.width``. Paths count from the current folder.
        origin : str
            What sets them, for messages.

        Raises
        ------
        RequestError
            Where a key leads nowhere.
        """
        changed = copy.deepcopy(self.values)
        keys, faults = [], []
        for dotted, value in values.items():
            key = tuple(int(part) if part.isdecimal() else part for part in dotted.split("."))
            try:
                _set(changed, key, absolute_paths({str(key[-1]): value}, Path.cwd())[str(key[-1])])
            except RequestError as error:
                faults += [fault.placed(origin, None) for fault in error.faults]
            keys.append((key, origin))
        if faults:
            raise RequestError(faults)
        return replace(self, values=changed, outside=(*self.outside, *keys))

    def date_faults(self) -> list[Fault]:
        """Say where a date stands that may not stand there."""
        return [
            Fault(key, f"{value} is a date or time of day", "only [time] start may be a date")
            for key, value in _leaves(self.values, ())
            if isinstance(value, datetime.date | datetime.time)
            and not (key in DATE_KEYS and isinstance(value, datetime.date))
        ]

    def as_json(self, key: str | None = None) -> str:
        """Values, or those of one table, as JSON text; dates and times as ISO 8601 in UTC."""
        return json.dumps(self.values if key is None else self.values[key], default=_iso)


def read_document(path: Path) -> Document:
    """Read a TOML file.

    Raises
    ------
    RequestError
        Where there is no such file, it is no text, or no TOML.
    """
    text = _read_text(path)
    try:
        values = tomli.loads(text)
    except tomli.TOMLDecodeError as error:
        found = f"this is not TOML: {error.msg[:1].lower()}{error.msg[1:]} (column {error.colno})"
        hints = (hint for start, hint in _TOML_HINTS.items() if error.msg.startswith(start))
        raise RequestError(Fault((), found, "", next(hints, ""), str(path), error.lineno)) from None
    except RecursionError:
        raise RequestError(Fault((), "lists or tables are nested too deep", file=str(path))) from None
    except ValueError as error:  # a whole number with thousands of digits
        raise RequestError(Fault((), f"this cannot be read: {error}", file=str(path))) from None
    return Document(absolute_paths(values, path.absolute().parent), text, path, Places(text))


def _read_text(path: Path) -> str:
    if not path.is_file():
        what = "is no file" if path.exists() else "does not exist"
        beside = sorted(other.name for other in path.parent.glob("*.toml")) if path.parent.is_dir() else []
        raise RequestError(Fault((), f"the configuration {path} {what}", remedy=did_you_mean(path.name, beside)))
    try:
        size = path.stat().st_size
        if size > LARGEST:
            raise RequestError(Fault((), f"the file holds {size} bytes", f"at most {LARGEST} are read", file=str(path)))
        return path.read_bytes().decode("utf-8")
    except OSError as error:
        raise RequestError(Fault((), f"the configuration {path} cannot be read: {error.strerror}")) from None
    except UnicodeDecodeError as error:
        found = f"byte {error.start + 1} is not UTF-8 text"
        raise RequestError(Fault((), found, "a TOML text in UTF-8", file=str(path))) from None


def read_value(text: str) -> Any:
    """Read a value given as text: as TOML where it is, else as the text itself."""
    try:
        read = tomli.loads(f"value = {text}")
    except (tomli.TOMLDecodeError, RecursionError):
        return text
    return read["value"] if list(read) == ["value"] else text


def absolute_paths(values: dict[str, Any], folder: Path) -> dict[str, Any]:
    """Return tables with every path in them made absolute from a folder."""

    def walked(node: Any, key: str | int) -> Any:
        if isinstance(node, dict):
            return {name: walked(value, name) for name, value in node.items()}
        if isinstance(node, list | tuple):
            return [walked(value, "") for value in node]
        if key in PATH_KEYS and isinstance(node, str | Path):
            return os.path.normpath(folder / node)
        return node

    return {name: walked(value, name) for name, value in values.items()}


def _set(values: dict[str, Any], key: Key, value: Any) -> None:
    """Set a value deep in tables and lists; missing tables are made."""
    node: Any = values
    for number, part in enumerate(key):
        last = number == len(key) - 1
        here = ".".join(str(one) for one in key[:number])
        if isinstance(node, list):
            if not (isinstance(part, int) and part < len(node)):
                raise RequestError(Fault(key, f"{here} is a list of {len(node)}", KEY_ALLOWED))
        elif not isinstance(node, dict):
            raise RequestError(Fault(key, f"{here} is no table", KEY_ALLOWED))
        elif part == "" or isinstance(part, int):
            raise RequestError(Fault(key, f"{shown(str(part))} is no key", KEY_ALLOWED))
        elif not last:
            node.setdefault(part, {})
        if last:
            node[part] = value
        else:
            node = node[part]


def _leaves(node: Any, key: Key) -> Iterator[tuple[Key, Any]]:
    items = node.items() if isinstance(node, dict) else enumerate(node) if isinstance(node, list) else None
    if items is None:
        yield key, node
    else:
        for part, inner in items:
            yield from _leaves(inner, (*key, part))


def _iso(value: Any) -> str:
    if isinstance(value, datetime.datetime):
        utc = value.astimezone(datetime.UTC).replace(tzinfo=None) if value.tzinfo else value
        return utc.isoformat()
    if isinstance(value, datetime.date):
        return f"{value.isoformat()}T00:00:00"
    return str(value)
