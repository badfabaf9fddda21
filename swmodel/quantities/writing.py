"""Quantities written for people: in messages, tables and pictures."""

from __future__ import annotations

import json
import math

from .units import DAY, DEGREE

# from this magnitude on, a value in the first unit is written in the second, which is so many of the first
_SCALES = {
    "m": ((0.0, 0.001, "mm"), (0.01, 1.0, "m"), (1000.0, 1000.0, "km")),
    "s": ((0.0, 1.0, "s"), (60.0, 60.0, "min"), (3600.0, 3600.0, "h"), (DAY, DAY, "day")),
    "rad": ((0.0, DEGREE, "deg"),),
}


def format_quantity(value: float, unit: str, digits: int = 3) -> str:
    """Write an SI value for people, in a sensible unit: ``69.3 km``, ``2.2 day``, ``0.0141 m/s``.

    Parameters
    ----------
    value : float
        The value in `unit`.
    unit : str
        Its SI unit; ``"1"`` or empty for a pure number.
    digits : int
        Significant digits, as many as the value deserves.
    """
    rounded = float(f"{value:.{digits}g}")
    factor, name = 1.0, unit
    for least, its_factor, its_name in _SCALES.get(unit, ()):
        if rounded and abs(rounded) >= least and math.isfinite(rounded):
            factor, name = its_factor, its_name
    number = f"{value / factor:.{digits}g}"
    if "e" in number and 1e-3 <= abs(value / factor) < 1e6:
        number = f"{float(number):g}"
    return number if name in ("", "1") else f"{number} {name}"


def shown(value: object) -> str:
    """Show a configured value in a message, as TOML would write it, cut where it is long."""
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list | tuple):
        return f"a list of {len(value)}"
    if isinstance(value, bool | str):
        text = json.dumps(value, ensure_ascii=False)
        return text if len(text) <= 80 else f'{text[:70]}..."'
    if isinstance(value, int) and abs(value) >= 10**20:
        return "a whole number of more than 20 digits"
    return str(value)
