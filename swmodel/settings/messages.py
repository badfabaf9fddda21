"""What pydantic found, in our words: every fault with its key, what was found, what is allowed, and a remedy.

Pydantic's places carry the names of union members, which are no keys: whatever the data does not hold is left out. A
misspelt key gives two errors there, one for the unknown and one for the missing key; they are folded into one fault.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any, get_args

from pydantic import BaseModel
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from ..choices import Choice, did_you_mean, nearest
from ..errors import Fault
from ..quantities import shown

Path = tuple[str | int, ...]


def faults_of(errors: Sequence[ErrorDetails], document: Mapping[str, Any], model: type[Choice]) -> list[Fault]:
    """Turn pydantic's errors into faults.

    Parameters
    ----------
    errors : sequence of ErrorDetails
        From `ValidationError.errors()`.
    document : mapping
        What was validated.
    model : type of Choice
        The settings class it was validated against.
    """
    placed = [(key_path(error["loc"], document, error["type"]), error) for error in errors]
    missing = [path for path, error in placed if error["type"] == "missing"]
    longest = {path[:-1]: path for path in sorted(path for path in missing if isinstance(path[-1], int))}
    faults: list[Fault] = []
    folded: set[Path] = set()
    for path, error in placed:
        if error["type"] == "extra_forbidden":
            siblings = [str(other[-1]) for other in missing if other[:-1] == path[:-1]]
            if meant := nearest(str(path[-1]), siblings):
                folded.add((*path[:-1], meant))
            faults.append(_unknown(path, model, document, meant))
    for path, same_place in _by_path(placed).items():
        if path not in folded and longest.get(path[:-1], path) == path:
            faults.append(_told(path, same_place, document, model))
    return faults


def key_path(loc: Sequence[str | int], document: Any, kind_of_error: str) -> Path:
    """Return the keys of an error's place, without the names of union members that pydantic puts between."""
    path: list[str | int] = []
    node = document
    arrived = True  # at a table whose kind has not been named yet
    for number, part in enumerate(loc):
        last = number == len(loc) - 1
        if isinstance(node, dict) and arrived and part == node.get("kind") and not last:
            arrived = False
        elif isinstance(node, dict) and part in node:
            path.append(part)
            node, arrived = node[part], True
        elif isinstance(node, list) and isinstance(part, int):
            path.append(part)
            node, arrived = (node[part] if part < len(node) else None), True
        elif last and kind_of_error in ("missing", "extra_forbidden") and isinstance(node, dict):
            path.append(part)
    return tuple(path)


def _by_path(placed: Sequence[tuple[Path, ErrorDetails]]) -> dict[Path, list[ErrorDetails]]:
    """Gather the errors of one place; where a union's member got further inside, the others' complaints are dropped."""
    gathered: dict[Path, list[ErrorDetails]] = {}
    for path, error in placed:
        if error["type"] != "extra_forbidden":
            gathered.setdefault(path, []).append(error)
    inner = [path for path, _ in placed]
    return {
        path: errors
        for path, errors in gathered.items()
        if not any(len(other) > len(path) and other[: len(path)] == path for other in inner)
    }


def _told(path: Path, errors: list[ErrorDetails], document: Mapping[str, Any], model: type[Choice]) -> Fault:
    """Say what is wrong at one place; members of a union that refuse it in turn give one fault."""
    single = [_one(path, error, document, model) for error in errors]
    if len(single) == 1:
        return single[0]
    ours = [fault for fault, error in zip(single, errors, strict=True) if error["type"] == "fault"]
    allowed = [fault.allowed or _TYPES.get(error["type"], "") for fault, error in zip(single, errors, strict=True)]
    remedy = next((fault.remedy for fault in single if fault.remedy), "")
    return replace((ours or single)[0], allowed=", or ".join(dict.fromkeys(filter(None, allowed))), remedy=remedy)


def _one(path: Path, error: ErrorDetails, document: Mapping[str, Any], model: type[Choice]) -> Fault:
    """Say one error."""
    kind, value, limits = error["type"], error["input"], error.get("ctx", {})
    if kind == "fault":
        return Fault(path, limits["found"], limits["allowed"], limits["remedy"])
    if kind == "missing":
        return _missing(path, document, model)
    if kind == "literal_error":
        return _wrong_word(path, value, _words(limits["expected"]))
    if kind == "union_tag_invalid":
        return _wrong_word((*path, "kind"), limits["tag"], _words(limits["expected_tags"]))
    if kind == "union_tag_not_found":
        return Fault((*path, "kind"), "kind is missing", f"choose {_listed(_kinds_at(path, model, document))}")
    if kind in ("too_long", "too_short"):
        limit = limits.get("max_length", limits.get("min_length"))
        bound = "at most" if kind == "too_long" else "at least"
        length = len(value) if isinstance(value, list) else limits["actual_length"]
        return Fault(path, f"a list of {length}", f"a list of {bound} {limit} is needed")
    if kind == "string_too_short":
        return Fault(path, "the text is empty")
    if kind == "tuple_type" and isinstance(value, dict) and len(path) == 1:
        return Fault(path, f"[{path[0]}] is one table", "a list of tables is needed", f"write [[{path[0]}]]")
    if kind == "model_type" and isinstance(value, list) and len(path) == 1:
        return Fault(path, f"[[{path[0]}]] is a list of tables", "one table is needed", f"write [{path[0]}]")
    if kind in _LIMITS:
        word, name = _LIMITS[kind]
        return Fault(path, f"{shown(value)} is out of range", f"{word} {limits[name]:g} is needed")
    if kind in _TYPES:
        return Fault(path, f"{shown(value)} is not {_TYPES[kind]}", remedy=_unquoted(value, kind))
    return Fault(path, f"{shown(value)}: {error['msg']}")


_LIMITS = {
    "greater_than": ("a value greater than", "gt"),
    "greater_than_equal": ("a value of at least", "ge"),
    "less_than": ("a value less than", "lt"),
    "less_than_equal": ("a value of at most", "le"),
}

_TYPES = {
    "int_type": "a whole number",
    "float_type": "a number",
    "bool_type": "true or false",
    "string_type": "text",
    "path_type": "a path, written as text",
    "tuple_type": "a list",
    "list_type": "a list",
    "dict_type": "a table",
    "model_type": "a table",
    "model_attributes_type": "a table",
    "datetime_type": "a date such as 2000-01-01 or 2000-01-01T12:00:00",
    "datetime_parsing": "a date such as 2000-01-01 or 2000-01-01T12:00:00",
}


def _unquoted(value: object, kind: str) -> str:
    """Hint at a number, a word of truth or a date that was written as text."""
    patterns = {"int_type": r"[+-]?\d+", "float_type": r"[+-]?\d*\.?\d+(e[+-]?\d+)?", "bool_type": "true|false"}
    if isinstance(value, str) and re.fullmatch(patterns.get(kind, r"\d{4}-\d\d-\d\d\b.*"), value, re.IGNORECASE):
        return "write it without quotes"
    return ""


def _words(expected: str) -> list[str]:
    """Words of pydantic's ``'a', 'b' or 'c'``."""
    return re.findall(r"'([^']*)'", expected)


def _listed(words: Sequence[str]) -> str:
    quoted = [f'"{word}"' for word in words]
    return " or ".join([", ".join(quoted[:-1]), quoted[-1]] if len(quoted) > 1 else quoted)


def _wrong_word(path: Path, value: object, words: list[str]) -> Fault:
    remedy = did_you_mean(value, words) if isinstance(value, str) else ""
    return Fault(path, f"{shown(value)} is not known here", f"choose {_listed(words)}", remedy)


# ------------------------------------------------------------------------------------------- unknown and missing keys


def _unknown(path: Path, model: type[Choice], document: Mapping[str, Any], meant: str) -> Fault:
    """Say that a key is not known, with the nearest right name, or the table where it belongs."""
    name = str(path[-1])
    inside = class_at(path[:-1], model, document)
    known = keys_of(inside) if inside else []
    remedy = did_you_mean(name, [meant] if meant else known)
    if len(path) == 1 and isinstance(document[name], dict | list):
        listed = ", ".join(f"[{key}]" for key in known if _classes(_field(model, key).annotation))
        return Fault(path, f"the table [{name}] is not known", f"known tables: {listed}", remedy)
    if not remedy:
        tables = {key: _classes(_field(model, key).annotation) for key in keys_of(model)}
        homes = [key for key, rows in tables.items() if len(rows) == 1 and name in keys_of(rows[0])]
        remedy = f"it belongs to [{homes[0]}]" if homes else ""
    return Fault(path, "this key is not known", f"known keys: {', '.join(known)}", remedy)


def _missing(path: Path, document: Mapping[str, Any], model: type[Choice]) -> Fault:
    """Say that a key, a table or an item of a list is missing."""
    name = path[-1]
    if isinstance(name, int):  # pydantic tells the places of a list of fixed length that are not there
        return Fault(path[:-1], f"a list of {_length(path[:-1], document)}", f"a list of {name + 1} is needed")
    inside = class_at(path[:-1], model, document)
    if inside is None:
        return Fault(path, f"{name} is missing")
    field = _field(inside, name)
    if len(path) == 1 and len(tables := _classes(field.annotation)) == 1:
        needed = ", ".join(key for key in keys_of(tables[0]) if _field(tables[0], key).is_required())
        return Fault(path, f"the table [{name}] is missing", f"it needs {needed}")
    return Fault(path, f"{name} is missing", f"needed: {field.description}" if field.description else "")


def _length(path: Path, document: Any) -> int:
    node = document
    for part in path:
        node = node[part]
    return len(node)


# --------------------------------------------------------------------------------- which settings class stands where


def _kinds_at(path: Path, model: type[Choice], document: Any) -> list[str]:
    """Kinds to choose from for the table at a path, which names none."""
    outer, key = next((path[:n], path[n]) for n in range(len(path) - 1, -1, -1) if isinstance(path[n], str))
    inside = class_at(outer, model, document)
    rows = _classes(_field(inside, str(key)).annotation) if inside else []
    return [str(kind) for row in rows for kind in get_args(row.model_fields["kind"].annotation)]


def keys_of(model: type[BaseModel]) -> list[str]:
    """Keys of a settings class, as they are written."""
    return [field.alias or name for name, field in model.model_fields.items()]


def class_at(path: Sequence[str | int], model: type[Choice], document: Any) -> type[Choice] | None:
    """Return the settings class that reads the table at a path; None where there is none or it cannot be told."""
    classes: list[type[Choice]] = [model]
    node = document
    for part in path:
        if isinstance(part, str):
            current = _picked(classes, node)
            if current is None or part not in keys_of(current):
                return None
            classes = _classes(_field(current, part).annotation)
        node = node[part]
    return _picked(classes, node)


def _picked(classes: list[type[Choice]], node: Any) -> type[Choice] | None:
    """Return the class that reads a table: the only one, or the one of its kind."""
    if len(classes) > 1 and isinstance(node, dict):
        classes = [one for one in classes if node.get("kind") in get_args(one.model_fields["kind"].annotation)]
    return classes[0] if len(classes) == 1 else None


def _classes(annotation: Any) -> list[type[Choice]]:
    """Settings classes within a type."""
    if isinstance(annotation, type) and issubclass(annotation, Choice):
        return [annotation]
    return [found for part in get_args(annotation) for found in _classes(part)]


def _field(model: type[BaseModel], key: str) -> FieldInfo:
    return next(field for name, field in model.model_fields.items() if (field.alias or name) == key)
