"""The judge: what was found against what was expected, with the measure's own error; never a bare pass."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Literal

from ..errors import CAUTION, RequestError
from ..quantities import Measured, Percentage, format_quantity, same_dimension
from ..theory import THEORY
from .expectation import Expected, ExpectSettings, expected_value, faults, tolerance, unit_of_measure
from .finding import Finding
from .record import Record

if TYPE_CHECKING:
    from rich.text import Text

Word = Literal["holds", "fails", "undecided"]

FORMAT = 1
ONE_GRID = "one grid: grid error not included"
WORST_FIRST: tuple[Word, ...] = ("fails", "undecided", "holds")
STYLES: dict[str, str] = {"holds": "green", "fails": "bold red", "undecided": "yellow"}

WIDTH = 80
COLUMNS = (18, 18, 15, 15)  # expected, found, difference, within; the word has the rest


@dataclass(frozen=True)
class Judgement:
    """One expectation, judged.

    Parameters
    ----------
    expect : ExpectSettings
        The expectation.
    expected : Expected or None
        What was expected; None where that is not known.
    finding : Finding
        What was found, with its evidence.
    within : float or None
        Tolerance in the unit of `expected`.
    word : str
        ``"holds"``, ``"fails"`` or ``"undecided"``.
    reason : str
        Why it is undecided; empty otherwise.
    remarks : tuple of str
        What stands beside it.
    """

    expect: ExpectSettings
    expected: Expected | None
    finding: Finding
    within: float | None
    word: Word
    reason: str
    remarks: tuple[str, ...]

    @property
    def difference(self) -> float | None:
        """Found less expected."""
        if self.expected is None or self.finding.value is None:
            return None
        return self.finding.value - self.expected.value

    @property
    def matching_digits(self) -> int | None:
        """Leading digits in which found and expected agree; None where nothing was found or 0 is expected."""
        if self.difference is None or self.expected is None or self.expected.value == 0:
            return None
        share = abs(self.difference / self.expected.value)
        return 16 if share == 0 else max(0, min(16, math.floor(-math.log10(share))))

    def as_json(self) -> dict[str, Any]:
        """Return the entry of verdict.json."""
        expected, finding, within = self.expected, self.finding, self.expect.within
        unit = expected.unit if expected else finding.unit
        return {
            "claim": self.expect.claim,
            "measure": _measure_as_json(self.expect.measure),
            "because": self.expect.because,
            "expected": {
                "value": _number(expected.value if expected else None),
                "unit": unit,
                "theory": expected.theory if expected else None,
            },
            "found": {"value": _number(finding.value), "unit": finding.unit},
            "within": {"value": _number(self.within), "unit": unit, "given": _given(within)},
            "uncertainty": {"fit": _number(finding.fit_error), "grid": None, "physics": None},
            "verdict": self.word,
            "reason": self.reason or None,
            "remarks": list(self.remarks),
        }


@dataclass(frozen=True)
class Verdict:
    """What became of the expectations of a run.

    Parameters
    ----------
    expectations : tuple of Judgement
        One for each expectation, in order.
    run : str
        The run's folder.
    versions : mapping of str to str
        Versions of the packages that made it.
    """

    expectations: tuple[Judgement, ...]
    run: str = ""
    versions: Mapping[str, str] = field(default_factory=dict)

    @property
    def overall(self) -> Word | None:
        """The worst word, or None without expectations."""
        words = {judgement.word for judgement in self.expectations}
        return next((word for word in WORST_FIRST if word in words), None)

    def as_json(self) -> dict[str, Any]:
        """Return what verdict.json holds; SI throughout, None for what is not known."""
        return {
            "format": FORMAT,
            "run": self.run,
            "versions": dict(self.versions),
            "overall": self.overall,
            "caution": CAUTION,
            "expectations": [judgement.as_json() for judgement in self.expectations],
        }

    def table(self) -> str:
        """Return the verdict as plain text of 80 columns."""
        return "".join(text for text, _ in self._spans())

    def __str__(self) -> str:
        return self.table()

    def __rich__(self) -> Text:
        """Return the same with its words coloured, for a terminal."""
        from rich.text import Text

        return Text.assemble(*self._spans())

    def _spans(self) -> Iterator[tuple[str, str]]:
        """Pieces of the table and their styles."""
        if not self.expectations:
            yield "No expectations: nothing was judged.\n", ""
            return
        yield _row(("expected", "found", "difference", "within")) + "verdict\n" + "-" * WIDTH + "\n", ""
        for number, judgement in enumerate(self.expectations, 1):
            yield _wrapped(f"{number}. {judgement.expect.claim}", "", "   "), ""
            yield _row(_cells(judgement)), ""
            yield judgement.word, STYLES[judgement.word]
            yield "\n", ""
            for note in _notes(judgement):
                yield _wrapped(note, "   - ", "     "), ""
            yield "\n", ""
        yield f"overall: {self.overall}\n", ""


def judge(
    expectations: Sequence[ExpectSettings],
    record: Record,
    starts: Sequence[Any],
    *,
    run: str = "",
    versions: Mapping[str, str] | None = None,
    unfinished: str = "",
) -> Verdict:
    """Judge a run.

    Parameters
    ----------
    expectations : sequence of ExpectSettings
        What was expected.
    record : Record
        What the run left.
    starts : sequence
        The parts of its start; waves among them give arguments of theory that were left out.
    run : str
        The run's folder, as verdict.json names it.
    versions : mapping of str to str
        Versions of the packages that made the run.
    unfinished : str
        Why the run did not come to its end, where it did not. A measure without a window of its own means the whole run
        or its end, and is then undecided.

    Returns
    -------
    Verdict
        What cannot be measured or compared is undecided, with the reason.
    """
    judged = [_judge_one(expect, number, record, starts, unfinished) for number, expect in enumerate(expectations)]
    return Verdict(tuple(judged), run, dict(versions or {}))


def word_for(difference: float, error: float, within: float) -> Word:
    """Return *holds* where difference and error stay within, *fails* where even less the error it is beyond.

    Parameters
    ----------
    difference : float
        Found less expected.
    error : float
        The measure's own error M.
    within : float
        The tolerance.
    """
    if abs(difference) + error <= within:
        return "holds"
    return "fails" if abs(difference) - error > within else "undecided"


def _judge_one(
    expect: ExpectSettings, number: int, record: Record, starts: Sequence[Any], unfinished: str
) -> Judgement:
    try:
        expected = expected_value(expect, record.basin, starts)
    except RequestError:
        expected = None  # the faults say why
    wrong = faults(expect, number, record, starts)
    if wrong or expected is None:
        finding = Finding(None, unit_of_measure(expect.measure))
        # the place in the list is clear from where it stands
        reason = "; ".join(_told(fault.key[2:], str(fault.found), fault.allowed) for fault in wrong)
        return Judgement(expect, expected, finding, None, "undecided", reason, (ONE_GRID,))
    finding = expect.measure.take(record)
    expected = expected._replace(unit=expected.unit or finding.unit)
    within = tolerance(expect.within, expected)
    word, reason = _decide(finding, expected, within)
    if unfinished and getattr(expect.measure, "during", None) is None:
        word, reason = "undecided", unfinished
    return Judgement(expect, expected, finding, within, word, reason, (ONE_GRID, *finding.remarks))


def _decide(finding: Finding, expected: Expected, within: float) -> tuple[Word, str]:
    """Word, and the reason where it is undecided."""
    if finding.reason or finding.value is None:
        return "undecided", finding.reason or "nothing was found"
    if not math.isfinite(finding.value):
        return "undecided", "what was found is not a finite number"
    if not same_dimension(finding.unit, expected.unit):
        return "undecided", f"found in {finding.unit}, but expected in {expected.unit}"
    error = finding.fit_error or 0.0
    if not math.isfinite(error):
        return "undecided", "the measure does not work on parts of the window, so its own error is not known"
    word = word_for(finding.value - expected.value, error, within)
    if word != "undecided":
        return word, ""
    written = format_quantity(error, finding.unit, 2)
    return word, f"the measure's own error, {written}, leaves both open; take a longer window, or store more often"


def _told(key: tuple[str | int, ...], found: str, allowed: str) -> str:
    name = ".".join(str(part) for part in key)
    return f"{name}: {found}" + (f" (allowed: {allowed})" if allowed else "")


def _number(value: float | None) -> float | None:
    """The number, or None where it is not known or not finite, which JSON cannot write."""
    return float(value) if value is not None and math.isfinite(value) else None


def _given(within: Measured | Percentage) -> str:
    """A tolerance as it was given."""
    return f"{within.percent:g} %" if isinstance(within, Percentage) else str(within)


def _measure_as_json(measure: Any) -> Any:
    """The measure as it was configured, or the name of a measure of one's own."""
    dump = getattr(measure, "model_dump", None)
    return dump(mode="json", exclude_none=True) if callable(dump) else {"kind": type(measure).__name__}


# ---------------------------------------------------------------------------------------------------------- the table


def _row(cells: Sequence[str]) -> str:
    """One row up to the word; a cell that is too long pushes the next one on."""
    row = ""
    for cell, end in zip(cells, _ends(), strict=True):
        row = f"{row}{cell} ".ljust(end)
    return row


def _ends() -> Iterator[int]:
    """Where the columns end."""
    end = 3
    for width in COLUMNS:
        end += width
        yield end


def _cells(judgement: Judgement) -> tuple[str, str, str, str]:
    expected, finding, difference = judgement.expected, judgement.finding, judgement.difference
    digits = _digits(finding)
    within = judgement.expect.within
    relative = isinstance(within, Percentage) and expected is not None and expected.value != 0
    if difference is None or expected is None:
        off = "-"
    elif relative:
        off = f"{100 * difference / abs(expected.value):+.2g} %"
    else:
        off = format_quantity(difference, expected.unit, 2)
    if isinstance(within, Percentage):
        allowed = _given(within)
    else:
        allowed = format_quantity(within.value, within.unit or (expected.unit if expected else ""), 3)
    return (
        "   " + (format_quantity(expected.value, expected.unit, digits) if expected else "-"),
        format_quantity(finding.value, finding.unit, digits) if finding.value is not None else "-",
        off,
        allowed,
    )


def _digits(finding: Finding) -> int:
    """Significant digits that a value with this error deserves."""
    if not finding.value or finding.fit_error is None or not math.isfinite(finding.fit_error):
        return 4
    if finding.fit_error == 0:
        return 6
    return max(2, min(6, math.floor(math.log10(abs(finding.value) / finding.fit_error)) + 2))


def _notes(judgement: Judgement) -> Iterator[str]:
    """What stands under a row: reason, own error and digits, source of the expectation, remarks."""
    if judgement.reason:
        yield judgement.reason
    finding, expected, digits = judgement.finding, judgement.expected, judgement.matching_digits
    if finding.value is not None:
        known = finding.fit_error is not None and math.isfinite(finding.fit_error)
        error = format_quantity(finding.fit_error, finding.unit, 2) if known and finding.fit_error else ""
        own = f"own error of the measure {error or ('0' if finding.fit_error == 0 else 'not known')}"
        matching = f"; {digits} matching digit{'s' if digits != 1 else ''}" if digits is not None else ""
        yield own + matching
    if expected is not None and expected.theory is not None:
        row = THEORY[expected.theory]
        yield f"expected {expected.theory}: {row.meaning} ({row.source})"
    elif expected is not None:
        yield "expected as given"
    yield f"tolerance because {judgement.expect.because}"
    yield from judgement.remarks


def _wrapped(text: str, first: str, later: str) -> str:
    return textwrap.fill(text, WIDTH, initial_indent=first, subsequent_indent=later) + "\n"
