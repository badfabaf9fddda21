"""A bench for rotating shallow-water experiments.

An experiment states a set-up and what is expected of it; the package checks whether the set-up can answer the question,
runs it, measures what came out, sets it beside theory and says *holds*, *fails* or *undecided*.

>>> import swmodel
>>> experiment = swmodel.read("configs/front.toml")
>>> print(swmodel.check(experiment))
>>> run = swmodel.run(experiment, into="runs/front")

Research prototype: not for navigation, coastal-hazard or tsunami warning, or engineering design.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

from . import errors

if TYPE_CHECKING:
    from .errors import MachineError, RequestError, SolutionError, SwmodelError
    from .measures import Verdict
    from .model import Model, judge, run
    from .outlook import Outlook, check
    from .settings import Experiment, read
    from .store.reading import Run

__version__ = errors.VERSION

__all__ = [
    "Experiment",
    "MachineError",
    "Model",
    "Outlook",
    "RequestError",
    "Run",
    "SolutionError",
    "SwmodelError",
    "Verdict",
    "check",
    "judge",
    "read",
    "run",
]

# loaded when first asked for, so that `swmodel --help` need not wait for compilers and plotting
_HOMES = {
    "Experiment": ".settings",
    "MachineError": ".errors",
    "Model": ".model",
    "Outlook": ".outlook",
    "RequestError": ".errors",
    "Run": ".store.reading",
    "SolutionError": ".errors",
    "SwmodelError": ".errors",
    "Verdict": ".measures",
    "check": ".outlook",
    "judge": ".model",
    "read": ".settings",
    "run": ".model",
}


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(importlib.import_module(_HOMES[name], __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted([*globals(), *__all__])
