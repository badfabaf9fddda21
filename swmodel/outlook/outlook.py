"""What `check` says before anything runs: can this set-up answer its question, and what will it cost."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import CAUTION, Fault, RequestError
from .cautions import Caution, gather
from .cost import Cost, is_balanced, memory_faults, memory_needed, reckon
from .expectations import Prospect, expectation_faults, prospects
from .facts import Facts
from .machine import available_memory
from .plan import Draft, Plan, begin_draft, draft_plan
from .printing import spans
from .resolution import resolution_table
from .scales import frame_table, scales_table
from .step import WaveInSteps, step_table, waves_in_steps
from .tables import Table

if TYPE_CHECKING:
    from rich.text import Text

    from ..dynamics import PVFlux
    from ..measures import Expected
    from ..settings import Experiment

FORMAT = 1
RUNS = Path("runs")


@dataclass(frozen=True)
class Outlook:
    """What can be said of an experiment before it runs; ``print(outlook)`` shows it.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    plan : Plan or None
        What would be run; None where it is refused.
    tables : tuple of Table
        *Frame*, *Scales*, *Resolution*, *Step*, *Cost*, as far as they could be made.
    waves : tuple of WaveInSteps
        What the step does to the waves of the set-up.
    cost : Cost or None
        What the run costs.
    prospects : tuple of Prospect
        The expectations with their expected values.
    refusals : list of Fault
        Why it is not run, each with its place in the configuration.
    cautions : list of Caution
        What its result must be taken with.
    """

    experiment: Experiment
    plan: Plan | None
    tables: tuple[Table, ...]
    waves: tuple[WaveInSteps, ...]
    cost: Cost | None
    prospects: tuple[Prospect, ...]
    refusals: list[Fault]
    cautions: list[Caution]

    @property
    def expected(self) -> list[Expected | None]:
        """Expected value of each expectation; None where it cannot be told."""
        return [prospect.expected for prospect in self.prospects]

    @property
    def exit_code(self) -> int:
        """0, or 2 where it is refused; cautions alone are 0."""
        return RequestError.exit_code if self.refusals else 0

    def as_json(self) -> dict[str, Any]:
        """Return everything in SI, None for what is not known."""
        tables = {table.title.lower(): table.as_json() for table in self.tables}
        return {
            "format": FORMAT,
            "title": self.experiment.title,
            "question": self.experiment.question,
            **tables,
            "waves": [wave.as_json() for wave in self.waves],
            "expectations": [prospect.as_json() for prospect in self.prospects],
            "refusals": [_fault_as_json(fault) for fault in self.refusals],
            "cautions": [{"what": one.what, "why": one.why, "remedy": one.remedy} for one in self.cautions],
            "caution": CAUTION,
        }

    def __str__(self) -> str:
        return "".join(text for text, _ in spans(self))

    def __rich__(self) -> Text:
        """Return the same with colours, for a terminal."""
        from rich.text import Text

        return Text.assemble(*spans(self))


def check(
    experiment: Experiment, *, start: Any = None, pv_flux: PVFlux | None = None, into: str | Path | None = None
) -> Outlook:
    """Say whether a set-up can answer its question, and what it will cost; nothing is run, compiled or written.

    Parameters
    ----------
    experiment : Experiment
        The settings.
    start : object or sequence, optional
        Start states of your own, in place of the experiment's: objects with ``fields(basin)``.
    pv_flux : PVFlux, optional
        A PV flux of your own.
    into : str or Path, optional
        Where the run would be written, for the room on that disk; ``runs`` by default.

    Returns
    -------
    Outlook
        With everything it is refused for, and every caution.
    """
    draft = begin_draft(experiment, start=start, pv_flux=pv_flux)
    balanced = is_balanced(draft.parts)
    needed = memory_needed(experiment.grid, experiment.time.stepper, balanced=balanced)
    refusals = memory_faults(needed, available_memory())
    if refusals:  # no large array is made
        return _outlook(draft, refusals)
    draft = draft_plan(draft)
    refusals += draft.faults
    cost = None
    if not draft.faults:
        cost = reckon(draft.plan, Path(into) if into is not None else RUNS, balanced=balanced)
        refusals += [fault for fault in cost.faults() if fault not in refusals]
    if draft.basin is not None:
        refusals += [fault for fault in expectation_faults(draft, draft.basin) if fault not in refusals]
    return _outlook(draft, refusals, cost)


def _outlook(draft: Draft, refusals: list[Fault], cost: Cost | None = None) -> Outlook:
    """Put together what is known."""
    experiment = draft.experiment
    facts = Facts(draft, draft.basin) if draft.basin is not None else None
    placed = experiment.placed(RequestError(refusals)).faults
    return Outlook(
        experiment=experiment,
        plan=None if refusals else draft.plan,
        tables=tuple(_tables(facts, cost)),
        waves=waves_in_steps(facts, draft.step) if facts is not None and draft.step is not None else (),
        cost=cost,
        prospects=prospects(draft, facts.basin) if facts is not None else (),
        refusals=placed,
        cautions=gather(facts) if facts is not None else [],
    )


def _tables(facts: Facts | None, cost: Cost | None) -> Iterator[Table]:
    if facts is not None:
        yield frame_table(facts)
        yield scales_table(facts)
        yield resolution_table(facts)
        if facts.draft.step is not None:
            yield step_table(facts, facts.draft.step)
    if cost is not None:
        yield cost.table()


def _fault_as_json(fault: Fault) -> dict[str, Any]:
    key = ".".join(map(str, fault.key))
    return {
        "key": key,
        "found": fault.found,
        "allowed": fault.allowed,
        "remedy": fault.remedy,
        "file": fault.file,
        "line": fault.line,
    }
