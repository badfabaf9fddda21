"""The command line: parse, call, print, exit code. Nothing heavy is loaded until a command needs it."""

from __future__ import annotations

from .parsing import main

__all__ = ["main"]
