"""The measures room: what `[[expect]]` can measure, the measure's own error, and the judge."""

from .expectation import Expectation, Expected, ExpectSettings, TheoryValue, expected_value, faults
from .finding import Evidence, Finding
from .kinds import MEASURES, Measure, MeasureSettings, OwnMeasure
from .record import Record
from .verdict import Judgement, Verdict, judge

__all__ = [
    "MEASURES",
    "Evidence",
    "ExpectSettings",
    "Expectation",
    "Expected",
    "Finding",
    "Judgement",
    "Measure",
    "MeasureSettings",
    "OwnMeasure",
    "Record",
    "TheoryValue",
    "Verdict",
    "expected_value",
    "faults",
    "judge",
]
