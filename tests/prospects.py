"""An invented set-up that nothing can be said against, and changes of it, for the tests of the outlook."""

from __future__ import annotations

from typing import Any

import tomli
from configurations import FRONT

from swmodel.outlook import CAUTIONS, Outlook, check
from swmodel.outlook.facts import Facts
from swmodel.outlook.plan import begin_draft, draft_plan
from swmodel.settings import Experiment

OMEGA = 7.292115e-5  # rad/s, WGS 84 (NIMA TR8350.2)
RADIUS = 6371008.8  # m, mean radius of WGS 84 (Moritz 2000, J. Geodesy 74)


def experiment(values: dict[str, Any] | None = None) -> Experiment:
    """Return the front with other values by dotted key."""
    return Experiment.from_json(tomli.loads(FRONT)).with_values(values or {})


def facts(values: dict[str, Any] | None = None) -> Facts:
    """Return what is known of the front with other values."""
    draft = draft_plan(begin_draft(experiment(values)))
    assert draft.basin is not None
    return Facts(draft, draft.basin)


def cautions(name: str, values: dict[str, Any] | None = None) -> list[str]:
    """Return what one row of `CAUTIONS` says of the front with other values."""
    return [str(caution) for caution in CAUTIONS[name](facts(values))]


def outlook(values: dict[str, Any] | None = None, **given: Any) -> Outlook:
    """Check the front with other values."""
    return check(experiment(values), **given)
