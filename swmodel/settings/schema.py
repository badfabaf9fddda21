"""The JSON Schema of the configuration, for editors and for whoever writes configurations by program."""

from __future__ import annotations

from typing import Any

from .experiment import Experiment

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def schema() -> dict[str, Any]:
    """Return the JSON Schema (2020-12) of a configuration."""
    written = _as_toml(Experiment.model_json_schema(by_alias=True))
    return {"$schema": DIALECT, "title": "An experiment of swmodel", **written}


def _as_toml(node: Any) -> Any:
    """Leave out what TOML does not have, null, and the titles that only repeat the keys."""
    if isinstance(node, list):
        return [_as_toml(item) for item in node]
    if not isinstance(node, dict):
        return node
    kept = {
        key: _as_toml(value)
        for key, value in node.items()
        if not (key == "title" and isinstance(value, str)) and not (key == "default" and value is None)
    }
    if "anyOf" in kept:
        choices = [choice for choice in kept["anyOf"] if choice != {"type": "null"}]
        kept.pop("anyOf")
        kept = {**choices[0], **kept} if len(choices) == 1 else {**kept, "anyOf": choices}
    return kept
