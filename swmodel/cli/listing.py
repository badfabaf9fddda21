"""What there is to choose from: the tables of the rooms, each row with its meaning."""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from .words import LISTS

WIDTH = 80
Table = dict[str, str]


def listed(what: str | None) -> dict[str, Table]:
    """Return name and meaning of every row, by table.

    Parameters
    ----------
    what : str or None
        One of `LISTS`; all of them by default.
    """
    return {name: _TABLES[name]() for name in ([what] if what else LISTS)}


def printed(tables: Mapping[str, Table]) -> str:
    """Lay tables out for a terminal of 80 columns."""
    blocks = []
    for title, rows in tables.items():
        column = min(28, max((len(name) for name in rows), default=0)) + 2
        lines = [title]
        for name, meaning in rows.items():
            first = f"  {name:<{column}}"
            if len(first) > column + 2:
                lines.append(first.rstrip())
                first = " " * (column + 2)
            lines += textwrap.wrap(
                meaning, WIDTH, initial_indent=first, subsequent_indent=" " * (column + 2), break_on_hyphens=False
            ) or [first.rstrip()]
        blocks.append("\n".join(lines))
    return "\n\n".join(blocks)


def starting_points() -> dict[str, Path]:
    """Return the configurations to begin from, by name: the package's own, or those of a source checkout."""
    package = Path(__file__).parent.parent
    for folder in (package / "configs", package.parent / "configs"):
        if folder.is_dir():
            return {path.stem: path for path in sorted(folder.glob("*.toml"))}
    return {}


def _meanings(table: Mapping[str, Any]) -> Table:
    """Name and meaning of every row, with its source where it is no common practice."""
    return {name: f"{row.meaning} ({row.source})" if row.source else row.meaning for name, row in table.items()}


def _bodies() -> Table:
    from ..frame import BODIES

    return _meanings(BODIES)


def _planes() -> Table:
    from ..frame import PLANES

    return _meanings(PLANES)


def _starts() -> Table:
    from ..state import STARTS

    return _meanings(STARTS)


def _measures() -> Table:
    from ..measures import MEASURES

    return _meanings(MEASURES)


def _theory() -> Table:
    from ..theory import THEORY

    return _meanings(THEORY)


def _pv_fluxes() -> Table:
    from ..dynamics import PV_FLUXES

    return _meanings(PV_FLUXES)


def _steppers() -> Table:
    from ..steppers import STEPPERS

    return _meanings(STEPPERS)


def _figures() -> Table:
    from ..pictures import FIGURES

    return _meanings(FIGURES)


def _configs() -> Table:
    import tomli

    return {name: tomli.loads(path.read_text("utf-8")).get("question", "") for name, path in starting_points().items()}


_TABLES: dict[str, Callable[[], Table]] = {
    "bodies": _bodies,
    "planes": _planes,
    "starts": _starts,
    "measures": _measures,
    "theory": _theory,
    "pv-fluxes": _pv_fluxes,
    "steppers": _steppers,
    "figures": _figures,
    "configs": _configs,
}
