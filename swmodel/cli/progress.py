"""How a run shows that it goes on: a bar on a terminal, a plain line every ten seconds elsewhere."""

from __future__ import annotations

import sys
import time as clock
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from ..quantities import format_quantity

if TYPE_CHECKING:
    from ..model import Progress

LINE_EVERY = 10.0  # s, where the output is no terminal


@contextmanager
def shown_progress(title: str) -> Iterator[Callable[[Progress], None]]:
    """Show progress on standard error while a run goes on.

    Parameters
    ----------
    title : str
        What is being run.

    Yields
    ------
    callable
        Takes a `Progress`.
    """
    if sys.stderr.isatty():
        with _bar(title) as report:
            yield report
    else:
        yield _lines(title)


@contextmanager
def _bar(title: str) -> Iterator[Callable[[Progress], None]]:
    from rich.console import Console
    from rich.progress import BarColumn, TextColumn, TimeRemainingColumn
    from rich.progress import Progress as Bar

    columns = (
        TextColumn("{task.fields[model_time]}"),
        BarColumn(bar_width=None),
        TextColumn("{task.fields[rate]}"),
        TimeRemainingColumn(compact=True),
        TextColumn("energy {task.fields[drift]}"),
    )
    console = Console(stderr=True)
    console.print(title, highlight=False, markup=False)
    with Bar(*columns, console=console) as bar:
        task = bar.add_task("", total=1.0, model_time="preparing (first use compiles)", rate="", drift="")
        begun: list[float] = []

        def report(progress: Progress) -> None:
            fields: dict[str, Any] = {**_words(progress, begun)}
            bar.update(task, completed=progress.time / progress.until, **fields)

        yield report


def _lines(title: str) -> Callable[[Progress], None]:
    last = clock.monotonic()
    begun: list[float] = []
    print(f"{title}: begins (first use compiles)", file=sys.stderr, flush=True)

    def report(progress: Progress) -> None:
        nonlocal last
        words = _words(progress, begun)
        ended = progress.time >= progress.until
        if clock.monotonic() - last >= LINE_EVERY or ended:
            last = clock.monotonic()
            share = progress.time / progress.until
            line = f"{words['model_time']}  {share:.0%}  {words['rate']}  energy {words['drift']}"
            print(line, file=sys.stderr, flush=True)

    return report


def _words(progress: Progress, begun: list[float]) -> dict[str, str]:
    """Model time, steps a second and energy drift; the clock starts when the first step is done."""
    now = clock.monotonic()
    if not begun:
        begun.extend((now, progress.steps))
    elapsed = now - begun[0]
    rate = f"{(progress.steps - begun[1]) / elapsed:.3g} steps/s" if elapsed > 0 and progress.steps > begun[1] else ""
    return {
        "model_time": format_quantity(progress.time, "s"),
        "rate": rate,
        "drift": f"{progress.energy_drift:+.1e}",
    }
