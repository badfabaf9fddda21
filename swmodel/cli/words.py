"""The words of the command line, each command with its meaning, and the width they are folded to."""

from __future__ import annotations

import textwrap

COMMANDS = {
    "check": "say whether a set-up can answer its question, and what it will cost; nothing is run",
    "run": "check, run, judge and draw an experiment",
    "resume": "go on with a run from its last checkpoint, bit for bit",
    "judge": "hold what a run left against what was expected",
    "draw": "draw the figures of a run",
    "list": "list what there is to choose from, each with its meaning",
    "new": "write a commented configuration here to begin from",
    "schema": "print the JSON Schema of the configuration, for editors",
}

LISTS = ("bodies", "planes", "starts", "measures", "theory", "pv-fluxes", "steppers", "figures", "configs")


def folded(text: str) -> str:
    """Fold a sentence to the width of a terminal."""
    return textwrap.fill(text, 79, break_long_words=False, break_on_hyphens=False)
