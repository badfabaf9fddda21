"""What each command does: call, print, return the exit code."""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from ..errors import CAUTION, Fault, RequestError
from .words import folded

FAILED = 1


def check_command(options: argparse.Namespace) -> int:
    """`swmodel check CONFIG`."""
    from ..outlook import check

    outlook = check(_experiment(options))
    print(json.dumps(outlook.as_json(), indent=2) if options.json else outlook)
    return RequestError.exit_code if outlook.refusals else 0


def run_command(options: argparse.Namespace) -> int:
    """`swmodel run CONFIG`."""
    from ..outlook import check
    from .progress import shown_progress

    experiment = _experiment(options)
    outlook = check(experiment, into=options.into)
    for caution in outlook.cautions:
        print(folded(f"caution: {caution}"), file=sys.stderr)
    with shown_progress(experiment.title or str(experiment.path)) as report:
        from ..model import run

        held = run(experiment, options.into, outlook=outlook, progress=report)
    return _ended(held.folder, strict=options.strict)


def resume_command(options: argparse.Namespace) -> int:
    """`swmodel resume RUN`."""
    from .progress import shown_progress

    with shown_progress(options.run) as report:
        from ..model import resume

        held = resume(options.run, options.until, progress=report)
    return _ended(held.folder, strict=options.strict)


def judge_command(options: argparse.Namespace) -> int:
    """`swmodel judge RUN [CONFIG]`."""
    from ..model import judge
    from ..settings import read

    expectations = read(options.config).expect if options.config else None
    verdict = judge(options.run, expectations)
    print(json.dumps(verdict.as_json(), indent=2) if options.json else verdict)
    return _code(verdict.overall, strict=options.strict)


def draw_command(options: argparse.Namespace) -> int:
    """`swmodel draw RUN`."""
    from ..pictures import draw

    for path in draw(options.run):
        print(path)
    return 0


def list_command(options: argparse.Namespace) -> int:
    """`swmodel list [WHAT]`."""
    from .listing import listed, printed

    tables = listed(options.what)
    print(json.dumps(tables, indent=2) if options.json else printed(tables))
    return 0


def new_command(options: argparse.Namespace) -> int:
    """`swmodel new NAME`."""
    from ..choices import did_you_mean
    from .listing import starting_points

    points = starting_points()
    if options.name not in points:
        near = did_you_mean(options.name, points)
        raise RequestError(
            Fault((), f'there is no starting point "{options.name}"', f"one of {', '.join(sorted(points))}", near)
        )
    target = Path(f"{options.name}.toml")
    try:
        with target.open("x", encoding="utf-8") as file:
            file.write(points[options.name].read_text("utf-8"))
    except FileExistsError:
        raise RequestError(f"{target} is there already; it is never overwritten: rename or move it") from None
    except OSError as error:
        from ..errors import MachineError

        raise MachineError(f"{target} cannot be written: {error.strerror}") from error
    print(f"{target} written; next: swmodel check {target}")
    return 0


def schema_command(options: argparse.Namespace) -> int:
    """`swmodel schema`."""
    from ..settings import schema

    print(json.dumps(schema(), indent=2))
    return 0


def _experiment(options: argparse.Namespace) -> Any:
    """Read the configuration with what `--set` gives."""
    from ..settings import read

    return read(options.config, _sets(options.sets))


def _sets(pairs: Sequence[str]) -> dict[str, str]:
    """Split ``key=value`` at the first sign."""
    faults = [
        Fault((), f'--set "{pair}" has no "="', 'key=value, such as frame.latitude="30 deg"')
        for pair in pairs
        if "=" not in pair
    ]
    if faults:
        raise RequestError(faults)
    return {key.strip(): value.strip() for key, value in (pair.split("=", 1) for pair in pairs)}


def _ended(folder: Path, *, strict: bool) -> int:
    """Draw a run that has ended, print its verdict and say where everything is."""
    from ..model import judge
    from ..pictures import draw

    verdict = judge(folder)
    figures = draw(folder)
    print(verdict)
    print(f"run: {folder}")
    print(folded(f"figures: {', '.join(path.name for path in figures)}"))
    print(folded(CAUTION), file=sys.stderr)
    return _code(verdict.overall, strict=strict)


def _code(overall: str | None, *, strict: bool) -> int:
    """Exit code of a verdict."""
    return FAILED if overall == "fails" or (strict and overall == "undecided") else 0
