"""What every measure owes: a number or a reason, never a crash; and what is refused before a run."""

import math

import numpy as np
import pytest
from pydantic import ValidationError
from synthetic import HOUR, make_basin, make_record, measure, told

from swmodel.measures import MEASURES, Finding, Record

# ------------------------------------------------------------------------------------------------ every measure's duty

EXAMPLES = {
    "amplitude": {"of": "eta", "during": [0, "12 h"]},
    "decay_length": {"of": "eta", "along": "x"},
    "frequency": {"of": "velocity", "at": [0, 0]},
    "phase_speed": {"of": "eta", "along": "x"},
    "energy_ratio": {"of": "kinetic", "over": "released_potential"},
    "change": {"of": "energy"},
}


@pytest.mark.parametrize("kind", MEASURES)
def test_a_fluid_at_rest_gives_a_number_or_a_reason_but_never_a_crash(kind):
    times = np.arange(25) * HOUR
    none = np.zeros(25)
    record = make_record(make_basin(), times, series={"energy_kinetic": none, "energy_potential": none})
    finding = measure(kind, **EXAMPLES[kind]).take(record)
    assert isinstance(finding, Finding)
    assert finding.reason or finding.value == 0
    assert finding.unit == measure(kind, **EXAMPLES[kind]).unit()


@pytest.mark.parametrize("kind", MEASURES)
@pytest.mark.parametrize("count", [1, 2, 4, 6])
def test_a_short_record_gives_a_number_or_a_reason_but_never_a_crash(kind, count):
    rng = np.random.default_rng(count)
    record = make_record(
        make_basin(),
        np.arange(count) * HOUR,
        eta=lambda x, y, t: rng.normal(size=(8, 16)),
        series={"energy_kinetic": rng.normal(size=count), "energy_potential": rng.normal(size=count)},
    )
    finding = measure(kind, **EXAMPLES[kind]).take(record)
    assert finding.reason or math.isfinite(finding.value)


@pytest.mark.parametrize("kind", MEASURES)
def test_every_measure_says_what_it_is(kind):
    assert MEASURES[kind].meaning
    assert MEASURES[kind].source
    assert measure(kind, **EXAMPLES[kind]).kind == kind


@pytest.mark.parametrize("kind", MEASURES)
def test_a_measure_is_read_again_as_it_is_written(kind):
    one = measure(kind, **EXAMPLES[kind])
    assert MEASURES[kind].model_validate(one.model_dump(mode="json")) == one


@pytest.mark.parametrize("kind", [kind for kind in MEASURES if kind != "change"])
def test_a_window_outside_the_run_is_refused(kind):
    record = make_record(make_basin(), np.arange(25) * HOUR)
    one = measure(kind, **EXAMPLES[kind] | {"during": ["10 h", "30 h"]})
    assert any(key == "during" and "lies outside the run" in found for key, found in told(one, record))


# ------------------------------------------------------------------------------------------------ what check refuses


def planned(names=("eta", "u", "v"), **more):
    return Record.planned(make_basin(nx=64), np.arange(49) * HOUR, names, series_times=np.arange(49) * HOUR, **more)


@pytest.mark.parametrize(
    ("kind", "keys", "expected"),
    [
        ("amplitude", {"of": "eta", "at": ["70 km", "-1 km"]}, [
            ("at", "x = 70 km lies outside what is stored"),
            ("at", "y = -1 km lies outside what is stored"),
        ]),
        ("amplitude", {"of": "eta", "during": "90 min"}, [("during", "nothing is stored at 1.5 h")]),
        ("amplitude", {"of": "eta", "during": ["1 h", "3 h"]}, [("during", "3 stored times lie in the window")]),
        ("amplitude", {"of": "eta", "along": "y", "to": "5 km"}, [("to", "y = 5 km lies outside what is stored")]),
        ("decay_length", {"of": "eta", "along": "x", "to": "7 km"}, [
            ("to", "7 points of eta between the ends of the line")
        ]),
        ("decay_length", {"of": "eta", "along": "x", "offset": "1 m/s"}, [("offset", "the offset is a speed")]),
        ("decay_length", {"of": "eta", "along": "x", "offset": "1 cm"}, []),
        ("frequency", {"of": "eta", "at": [0, 0], "during": [0, "8 h"]}, [("during", "snapshots in the window: 9")]),
        ("phase_speed", {"of": "u", "along": "y", "from_": "1 km", "to": "2 km"}, [
            ("to", "2 points of u between the ends of the line")
        ]),
        ("energy_ratio", {"of": "kinetic", "over": "start_kinetic", "along": "x", "from_": "-3 km"}, [
            ("from", "x = -3 km lies outside what is stored")
        ]),
        ("change", {"of": "mass", "during": "3 h"}, [("during", "one time has no change")]),
        ("change", {"of": "mass", "during": [60, 120]}, [("during", "0 stored times lie in the window")]),
        ("change", {"of": "mass"}, []),
    ],
)  # fmt: skip
def test_what_cannot_be_measured_is_refused_before_the_run(kind, keys, expected):
    assert told(measure(kind, **keys), planned()) == expected


def test_a_field_that_is_not_stored_must_be_computable():
    assert told(measure("amplitude", of="pv"), planned()) == []
    assert told(measure("amplitude", of="pv"), planned(("eta", "u"))) == [
        ("of", '"pv" is not stored, nor v to compute it from')
    ]
    assert told(measure("amplitude", of="v"), planned(("eta", "u"))) == [("of", '"v" is not stored')]
    assert told(measure("frequency", of="velocity", at=[0, 0]), planned(("eta",))) == [
        ("of", '"u" is not stored'),
        ("of", '"v" is not stored'),
    ]


def test_a_place_outside_the_stored_part_is_refused():
    grid = make_basin(nx=64).grid
    axes = grid.x[10:20], grid.y, grid.x_face[10:21], grid.y_face
    record = planned(axes=axes)
    assert record.edges == ("cut", "cut", "periodic", "periodic")
    assert told(measure("amplitude", of="eta", at=["9 km", 0]), record) == [
        ("at", "x = 9 km lies outside what is stored")
    ]
    assert told(measure("amplitude", of="eta", at=["11 km", 0]), record) == []


@pytest.mark.parametrize(
    ("keys", "message"),
    [
        ({"kind": "amplitude", "of": "eta", "at": "3 km"}, "one coordinate without a direction"),
        ({"kind": "amplitude", "of": "eta", "along": "x", "at": [1, 2]}, 'a point beside along = "x"'),
        ({"kind": "amplitude", "of": "eta", "to": "3 km"}, "the end of a line without its direction"),
        ({"kind": "amplitude", "of": "eta", "during": ["3 h", "2 h"]}, "2 h comes before 3 h"),
        ({"kind": "amplitude", "of": "eta", "during": [1, 2, 3]}, "a list of 3 is not a pair"),
        ({"kind": "energy_ratio", "of": "kinetic", "over": "start_energy", "from": 1}, "the end of a strip without"),
    ],
)
def test_keys_that_do_not_go_together_are_refused(keys, message):
    with pytest.raises(ValidationError, match=message):
        MEASURES[keys["kind"]].model_validate(keys)
