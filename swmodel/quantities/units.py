"""Units: a small table of the common ones, pint for the others, and SI units written one way."""

from __future__ import annotations

import math
import re
from functools import lru_cache
from typing import Any

from ..choices import did_you_mean
from ..errors import Fault, RequestError

DAY = 86400.0
DEGREE = math.pi / 180

# What configurations use daily, read without pint: value in SI and SI unit. A test compares every row with pint.
COMMON_UNITS: dict[str, tuple[float, str]] = {
    "m": (1.0, "m"),
    "km": (1000.0, "m"),
    "cm": (0.01, "m"),
    "mm": (0.001, "m"),
    "s": (1.0, "s"),
    "min": (60.0, "s"),
    "h": (3600.0, "s"),
    "hour": (3600.0, "s"),
    "hours": (3600.0, "s"),
    "day": (DAY, "s"),
    "days": (DAY, "s"),
    "deg": (DEGREE, "rad"),
    "degree": (DEGREE, "rad"),
    "degrees": (DEGREE, "rad"),
    "°": (DEGREE, "rad"),
    "rad": (1.0, "rad"),
    "%": (0.01, "1"),
    "m/s": (1.0, "m/s"),
    "cm/s": (0.01, "m/s"),
    "mm/s": (0.001, "m/s"),
    "km/h": (1000 / 3600, "m/s"),
    "m/s^2": (1.0, "m/s^2"),
    "m/s**2": (1.0, "m/s^2"),
    "cm/s^2": (0.01, "m/s^2"),
    "1/s": (1.0, "1/s"),
    "1/day": (1 / DAY, "1/s"),
    "rad/s": (1.0, "rad/s"),
    "rad/day": (1 / DAY, "rad/s"),
    "rpm": (2 * math.pi / 60, "rad/s"),
    "cycle/day": (2 * math.pi / DAY, "rad/s"),
    "1/m": (1.0, "1/m"),
    "rad/m": (1.0, "rad/m"),
    "1/m/s": (1.0, "1/m/s"),
    "m^-1 s^-1": (1.0, "1/m/s"),
    "m^2": (1.0, "m^2"),
    "m^2/s^2": (1.0, "m^2/s^2"),
    "m^3": (1.0, "m^3"),
    "m^5/s^2": (1.0, "m^5/s^2"),
}

# units that pint reads, but that hide a 2 pi or mean something else here
_REFUSED = {
    "hertz": "Hz hides a factor of 2 pi: write rad/s, 1/s or cycle/day",
    "counts_per_second": "cps hides a factor of 2 pi: write rad/s, 1/s or cycle/day",
    "speed_of_light": "c is the speed of light to a unit library: write the number in m/s",
}
_SYMBOLS = {"kilogram": "kg", "meter": "m", "second": "s", "ampere": "A", "kelvin": "K", "radian": "rad"}


def read_unit(expression: str) -> tuple[float, str]:
    """Return value in SI and SI unit of a unit expression."""
    return COMMON_UNITS[expression] if expression in COMMON_UNITS else _unit_by_pint(expression)


@lru_cache(maxsize=256)
def _unit_by_pint(expression: str) -> tuple[float, str]:
    """Ask pint for a unit, which keeps the radian among its base units."""
    registry = _registry()
    try:
        unit = registry.parse_units(expression)
        names = list(dict(unit._units))
        one = registry.Quantity(1.0, unit).to_base_units()
        offset = float(registry.Quantity(0.0, unit).to_base_units().magnitude)
        factor, powers = float(one.magnitude), {str(name): float(power) for name, power in one.unit_items()}
    except Exception:  # pint raises many kinds, none of them ours; whatever it cannot read is no unit here
        near = did_you_mean(expression, COMMON_UNITS)
        raise RequestError(Fault((), f"the unit {expression}, which is not known", remedy=near)) from None
    for name in names:
        if remedy := next((text for refused, text in _REFUSED.items() if name.endswith(refused)), None):
            raise RequestError(Fault((), f"the unit {expression}, which is refused", remedy=remedy))
    if offset or not 0 < factor < math.inf:
        raise RequestError(Fault((), f"the unit {expression}, which is no multiple of an SI unit"))
    return factor, _write_unit({_SYMBOLS.get(name, name): power for name, power in powers.items()})


@lru_cache(maxsize=1)
def _registry() -> Any:
    """Load pint, with its cache on disk where home is writable (saves 0.14 s)."""
    import pint

    try:
        return pint.UnitRegistry(cache_folder=":auto:")
    except OSError:
        return pint.UnitRegistry()


def _write_unit(powers: dict[str, float]) -> str:
    """Write powers of base units as ``m/s^2``, ``1/m/s`` or ``kg m^2``."""
    order = [*_SYMBOLS.values(), *sorted(set(powers) - set(_SYMBOLS.values()))]
    above = [_power(name, powers[name]) for name in order if powers.get(name, 0) > 0]
    below = [_power(name, -powers[name]) for name in order if powers.get(name, 0) < 0]
    return "/".join([" ".join(above) or "1", *below])


def _power(name: str, power: float) -> str:
    return name if power == 1 else f"{name}^{power:g}"


def same_dimension(one: str, other: str) -> bool:
    """Whether two SI units measure the same; ``1/s`` and ``rad/s`` do, ``1`` and ``rad`` do not."""
    if one in ("1", "rad") or other in ("1", "rad"):
        return one == other
    return _without_angle(one) == _without_angle(other)


def _without_angle(unit: str) -> str:
    """Leave the radian of an angular rate out: ``rad/s`` becomes ``1/s``."""
    return re.sub(r"^rad/", "1/", unit)
