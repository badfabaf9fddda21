"""The settings room: a TOML file to an `Experiment`, with every fault at once and its place; the JSON Schema.

It composes the settings classes that the rooms own, and parses neither quantities nor fields.
"""

from .experiment import Experiment, read
from .schema import schema

__all__ = ["Experiment", "read", "schema"]
