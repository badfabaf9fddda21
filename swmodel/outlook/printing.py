"""The outlook as text of 80 columns, plain; `rich` adds nothing but colours."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from ..errors import CAUTION
from ..quantities import format_quantity
from .step import ROUND_OFF, WaveInSteps
from .tables import Table

if TYPE_CHECKING:
    from .outlook import Outlook

WIDTH = 80
NAME, VALUE = 31, 16
WAVE_COLUMNS = (31, 11, 10, 13, 15)
Spans = Iterator[tuple[str, str]]  # text and style


def spans(outlook: Outlook) -> Spans:
    """Yield the pieces of the outlook and their styles."""
    experiment = outlook.experiment
    if head := experiment.question or experiment.title:
        yield wrapped(head), "bold"
    for table in outlook.tables:
        yield from _table(table)
        if table.title == "Step" and outlook.waves:
            yield from _waves(outlook.waves)
    if outlook.prospects:
        yield "\nExpectations\n", "bold"
        for number, prospect in enumerate(outlook.prospects, 1):
            first, *others = prospect.lines()
            yield wrapped(first, f"{number}. ", "   "), ""
            for line in others:
                yield wrapped(line, "   ", "     "), ""
    if outlook.refusals:
        yield "\nRefusals\n", "bold"
        yield from _numbered(list(map(str, outlook.refusals)), "red")
    if outlook.cautions:
        yield "\nCautions\n", "bold"
        yield from _numbered(list(map(str, outlook.cautions)), "yellow")
    yield "\n" + wrapped(CAUTION), ""
    yield f"{len(outlook.refusals)} refusals, {len(outlook.cautions)} cautions", "bold"


def wrapped(text: str, first: str = "", later: str = "") -> str:
    """Fill lines of 80 columns; a path or a name that is longer stays whole."""
    lines = textwrap.fill(
        text,
        WIDTH,
        initial_indent=first,
        subsequent_indent=later,
        break_long_words=False,
        break_on_hyphens=False,
    )
    return lines + "\n"


def _numbered(texts: Sequence[str], style: str) -> Spans:
    for number, text in enumerate(texts, 1):
        yield f"{number}. ", style
        yield wrapped(text, "   ", "   ")[len(f"{number}. ") :], ""


def _table(table: Table) -> Spans:
    yield f"\n{table.title}\n", "bold"
    for row in table.rows:
        name, value = row.name.ljust(NAME - 1), row.text.ljust(VALUE - 1)
        yield wrapped(row.note, f"{name} {value} ", " " * (NAME + VALUE)).rstrip() + "\n", ""


def _waves(waves: Sequence[WaveInSteps]) -> Spans:
    heads = ("what the step does to", "period", "omega dt", "runs", "lost at the end")
    yield _columns(heads) + "\n", "dim"
    for wave in waves:
        off = wave.phase_ratio - 1
        runs = f"{_size(abs(off))} {'fast' if off > 0 else 'slow'}" if abs(off) >= ROUND_OFF else "exact"
        lost = _size(wave.lost) if wave.damping >= ROUND_OFF / 1000 else "nothing"
        period = format_quantity(2 * math.pi / wave.frequency, "s")
        yield _columns((wave.name, period, f"{wave.p:.3g}", runs, lost)) + "\n", ""


def _columns(cells: Sequence[str]) -> str:
    text = "".join(f"{cell} ".ljust(width) for cell, width in zip(cells, WAVE_COLUMNS, strict=True))
    return text.rstrip()


def _size(share: float) -> str:
    """A share with two or three digits."""
    return f"{100 * share:.3g} %" if share >= 1e-3 else f"{share:.1e}"
