"""The judge: words by the stated rule, expected values from theory, verdict.json and the table to the letter."""

import datetime
import io
import json
import math
import textwrap
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError
from rich.console import Console
from synthetic import HOUR, OF_ETA, TURNING, expect, make_basin, make_record, turning_record

from swmodel.errors import CAUTION
from swmodel.measures import Expectation, Finding, Record, judge
from swmodel.measures.verdict import word_for
from swmodel.store import OutputSettings, resolve_output
from swmodel.store.provenance import Provenance
from swmodel.store.reading import Run
from swmodel.store.writer import RunWriter

EPOCH = datetime.datetime(2000, 1, 1)
PROGNOSTIC = (("eta", "centre"), ("u", "u"), ("v", "v"))


def level(value, times=(0.0, HOUR)):
    return make_record(make_basin(), times, eta=lambda x, y, t: value)


# ------------------------------------------------------------------------------------------------------------ the word


@pytest.mark.parametrize(
    ("difference", "error", "within", "word"),
    [
        (0.0, 0.0, 1.0, "holds"),
        (0.5, 0.5, 1.0, "holds"),
        (-0.5, 0.5, 1.0, "holds"),
        (0.5, 0.6, 1.0, "undecided"),
        (1.5, 0.6, 1.0, "undecided"),
        (1.5, 0.5, 1.0, "undecided"),
        (-1.5, 0.4, 1.0, "fails"),
        (0.0, 2.0, 1.0, "undecided"),
    ],
)
def test_the_word_follows_difference_error_and_tolerance(difference, error, within, word):
    assert word_for(difference, error, within) == word


@given(st.floats(-9, 9), st.floats(0, 9), st.floats(0, 9))
def test_a_larger_error_never_turns_one_certain_word_into_the_other(difference, error, within):
    exact, unsure = word_for(difference, 0.0, within), word_for(difference, error, within)
    assert unsure in (exact, "undecided")


def test_the_worst_word_is_the_overall_one():
    record = level(1.0)
    good, bad = expect(), expect(value="3 m")
    none = expect(measure={"kind": "amplitude", "of": "eta", "during": ["1 h", "9 day"]})
    assert judge([], record, []).overall is None
    assert judge([good], record, []).overall == "holds"
    assert judge([good, none], record, []).overall == "undecided"
    assert judge([good, none, bad], record, []).overall == "fails"


# ------------------------------------------------------------------------------------------------------------ judging


def test_the_turning_of_an_inertial_oscillation_holds_in_both_hemispheres():
    for f0 in (1e-4, -1e-4):
        record = turning_record(make_basin(f0=f0))
        one = expect(measure=TURNING, value="inertial_turning", within="1 %")
        (judgement,) = judge([one], record, []).expectations
        assert judgement.word == "holds"
        assert judgement.finding.value == pytest.approx(-f0, rel=1e-9)
        assert judgement.remarks == ("one grid: grid error not included",)
        # the sign counts: the opposite turning fails
        (judgement,) = judge([expect(measure=TURNING, value=f"{f0} rad/s", within="1 %")], record, []).expectations
        assert judgement.word == "fails"


def test_an_error_as_large_as_the_room_is_undecided_and_says_what_to_do():
    times = np.arange(40) * HOUR
    record = make_record(make_basin(), times, eta=lambda x, y, t: 1 + 0.1 * np.cos(2 * math.pi * t / (13 * HOUR)))
    one = expect(measure=OF_ETA | {"during": [0, "39 h"]}, within="1 %")
    (judgement,) = judge([one], record, []).expectations
    assert judgement.word == "undecided"
    assert judgement.reason.startswith("the measure's own error, ")
    assert judgement.reason.endswith("leaves both open; take a longer window, or store more often")


def test_aliasing_is_undecided_however_well_the_wrong_frequency_fits():
    # 1.25 snapshots a period: the fit sees exactly a fifth of the frequency, and would fail or hold by accident
    f0 = 2 * math.pi / (1.25 * HOUR)
    record = turning_record(make_basin(f0=f0))
    (judgement,) = judge([expect(measure=TURNING, value="inertial_turning")], record, []).expectations
    assert judgement.word == "undecided"
    assert "1.2 snapshots fall into one expected period" in judgement.reason
    assert judgement.finding.value is None


def test_a_run_that_ended_early_is_undecided():
    one = expect(measure=OF_ETA | {"during": ["1 h", "9 h"]})
    (judgement,) = judge([one], level(1.0, np.arange(5) * HOUR), []).expectations
    assert judgement.word == "undecided"
    assert judgement.reason == "measure.during: 9 h lies outside the run (allowed: times from 0 s to 4 h)"


class Highest:
    """A measure of one's own."""

    def take(self, record):
        last = len(record.times) - 1
        return Finding(float(np.max(record.field("eta", last))), "m", 0.05, remarks=("by hand",))


def own(**keys):
    keys = {"claim": "As high", "measure": Highest(), "value": "1 m", "within": "10 %", "because": "a test"} | keys
    return Expectation.model_validate(keys)


def test_a_measure_of_ones_own_is_judged_like_any_other():
    record = level(1.0)
    for value, word in (("1 m", "holds"), (1, "holds"), ("2 m", "fails"), ("1 s", "undecided")):
        verdict = judge([own(value=value)], record, [])
        assert verdict.overall == word
    (entry,) = judge([own()], record, []).as_json()["expectations"]
    assert entry["measure"] == {"kind": "Highest"}
    assert entry["uncertainty"] == {"fit": 0.05, "grid": None, "physics": None}
    assert entry["remarks"] == ["one grid: grid error not included", "by hand"]
    with pytest.raises(ValidationError, match="str has no take"):
        own(measure="amplitude")


@pytest.mark.parametrize("value", [None, math.nan, math.inf])
def test_a_measure_that_finds_nothing_finite_decides_nothing(value):
    measure = SimpleNamespace(take=lambda record: Finding(value, "m", math.inf))
    verdict = judge([own(measure=measure)], level(1.0), [])
    assert verdict.overall == "undecided"
    entry = json.loads(json.dumps(verdict.as_json(), allow_nan=False))["expectations"][0]
    assert entry["found"]["value"] is None
    assert entry["uncertainty"]["fit"] is None


# ---------------------------------------------------------------------------------------------- verdict.json and table


def test_verdict_json_is_as_agreed():
    one = expect(claim="The level stays", within="5 cm", because="nothing moves")
    verdict = judge([one], level(1.02), [], run="runs/level", versions={"swmodel": "0.1.0"})
    assert verdict.as_json() == {
        "format": 1,
        "run": "runs/level",
        "versions": {"swmodel": "0.1.0"},
        "overall": "holds",
        "caution": CAUTION,
        "expectations": [
            {
                "claim": "The level stays",
                "measure": {"kind": "amplitude", "of": "eta"},
                "because": "nothing moves",
                "expected": {"value": 1.0, "unit": "m", "theory": None},
                "found": {"value": 1.02, "unit": "m"},
                "within": {"value": 0.05, "unit": "m", "given": "0.05 m"},
                "uncertainty": {"fit": None, "grid": None, "physics": None},
                "verdict": "holds",
                "reason": None,
                "remarks": ["one grid: grid error not included", "one instant: how it swings in time is not included"],
            }
        ],
    }


TABLE = """\
    expected             found             difference     within         verdict
    --------------------------------------------------------------------------------
    1. The velocity vector turns once in an inertial period, and clockwise, since
       this is the northern hemisphere
       -0.0001 rad/s     -0.0001003 rad/s  -0.3 %         1 %            holds
       - own error of the measure 2e-07 rad/s; 2 matching digits
       - expected inertial_turning: -f0, the turning of the velocity vector;
         negative is clockwise (Gill 1982, chapter 8)
       - tolerance because a test
       - one grid: grid error not included

    2. It stays
       1 m               0 m               -1 m           0.1 m          fails
       - own error of the measure not known; 0 matching digits
       - expected as given
       - tolerance because a test
       - one grid: grid error not included
       - one instant: how it swings in time is not included

    overall: fails
    """


def long_claims():
    class Turning:
        """A stand-in for a fit: its numbers are the same on every machine."""

        def take(self, record):
            return Finding(-1.003e-4, "rad/s", 2e-7)

    claim = "The velocity vector turns once in an inertial period, and clockwise, since this is the northern hemisphere"
    return judge(
        [own(claim=claim, measure=Turning(), value="inertial_turning", within="1 %"), expect(within="10 cm")],
        level(0.0),
        [],
    )


def test_the_table_reads_so():
    assert str(long_claims()) == textwrap.dedent(TABLE)


def test_the_table_fits_80_columns():
    assert max(len(line) for line in long_claims().table().splitlines()) <= 80


def test_colour_changes_no_letter_and_is_off_in_a_pipe():
    piped, coloured = io.StringIO(), io.StringIO()
    Console(file=piped, width=80).print(long_claims(), end="")
    Console(file=coloured, width=80, force_terminal=True, color_system="standard").print(long_claims(), end="")
    assert piped.getvalue() == long_claims().table()
    assert "\x1b[" in coloured.getvalue()


def test_no_expectations_are_said_to_be_none():
    assert str(judge([], level(1.0), [])) == "No expectations: nothing was judged.\n"


# ------------------------------------------------------------------------------------------------------- from the disk


def test_a_record_of_a_run_reads_its_fields_and_series(tmp_path):
    basin = make_basin()
    grid = basin.grid
    # cells 4 to 7 of 16: what was stored is a part of the domain
    output = resolve_output(OutputSettings(region=("4 km", "8 km", 0, "4 km")), grid, 2 * HOUR, HOUR)
    provenance = Provenance("", {}, "swmodel run", {})
    with RunWriter(tmp_path / "run", basin, provenance=provenance, output=output, epoch=EPOCH) as writer:
        for k in range(3):
            writer.write_diagnostics(k * HOUR, {"mass": 1.0 + k}, {})
            writer.write_snapshot(k * HOUR, {name: np.full(grid.shape(at), 1.0 + k) for name, at in PROGNOSTIC})
        writer.finish()
    record = Record.from_run(Run(tmp_path / "run"), basin, linear=False)
    assert record.edges == ("cut", "cut", "periodic", "periodic")
    assert (record.dx, record.dy) == (grid.dx, grid.dy)
    assert np.array_equal(record.times, [0, HOUR, 2 * HOUR])
    assert np.all(record.field("h", 1) == 102.0)
    # speed = sqrt(u^2 + v^2) of a uniform stream
    assert record.field("speed", 1) == pytest.approx(2 * math.sqrt(2), rel=1e-14)
    grown = expect(measure={"kind": "change", "of": "mass"}, value=2, within="1 %")
    outside = expect(measure={"kind": "amplitude", "of": "eta", "at": ["3 km", 0]})
    assert [one.word for one in judge([grown, outside], record, []).expectations] == ["holds", "undecided"]
