"""Expectations: what they expect, where the arguments of theory come from, and what is refused with its key."""

import json
import math
import sys
from subprocess import run as run_program

import pytest
from pydantic import ValidationError
from synthetic import CHANNEL, TURNING, expect, make_basin, turning_record

from swmodel.errors import RequestError
from swmodel.measures import ExpectSettings, expected_value, faults
from swmodel.measures.expectation import expected_period
from swmodel.state.starts import KelvinWave, PoincareWave

# ---------------------------------------------------------------------------------------------------- expected values


def test_a_bare_number_is_in_the_unit_of_the_measure():
    assert expected_value(expect(value=2), make_basin(), []) == (2.0, "m", None)
    assert expected_value(expect(value="2 km"), make_basin(), []) == (2000.0, "m", None)


def test_a_name_in_theory_takes_the_experiments_own_constants():
    # sqrt(0.02 * 100) = 1.414 m/s over |f| = 1e-4 1/s, the same in the south
    one = expect(measure={"kind": "decay_length", "of": "eta", "along": "x"}, value="deformation_radius")
    for f0 in (1e-4, -1e-4):
        value, unit, name = expected_value(one, make_basin(f0=f0), [])
        assert value == pytest.approx(math.sqrt(2) / 1e-4, rel=1e-12)
        assert (unit, name) == ("m", "deformation_radius")


def test_arguments_that_are_given_count_before_the_experiments():
    one = expect(
        measure={"kind": "decay_length", "of": "eta", "along": "x"}, value={"theory": "deformation_radius", "f0": 2e-4}
    )
    assert expected_value(one, make_basin(), []).value == pytest.approx(math.sqrt(2) / 2e-4, rel=1e-12)


def wave_speed(**keys):
    return expect(
        measure={"kind": "phase_speed", "of": "eta", "along": "x"} | keys, value="inertia_gravity_phase_speed"
    )


def test_the_only_wave_of_the_start_gives_its_wavenumbers():
    basin = make_basin()
    wave = PoincareWave(amplitude=0.1, waves=(1, 0))
    k = 2 * math.pi / basin.grid.Lx
    # Gill 1982: omega^2 = f^2 + g H k^2
    omega = math.sqrt(1e-8 + 2 * k**2)
    assert expected_value(wave_speed(), basin, [wave]).value == pytest.approx(omega / k, rel=1e-12)
    backward = wave_speed(**{"from": "16 km", "to": "0 km"})
    assert expected_value(backward, basin, [wave]).value == pytest.approx(-omega / k, rel=1e-12)
    assert expected_period(wave_speed(), basin, [wave]) == pytest.approx(2 * math.pi / omega, rel=1e-12)
    outright = expect(measure={"kind": "phase_speed", "of": "eta", "along": "x"}, value="2 m/s")
    assert expected_period(outright, basin, [wave]) == pytest.approx(2 * math.pi / (2 * k), rel=1e-12)
    assert expected_period(outright, basin, []) is None


def test_on_the_grid_the_cell_sizes_are_the_grids():
    basin = make_basin()
    k, dx = 2 * math.pi / basin.grid.Lx, basin.grid.dx
    one = expect(measure=TURNING, value={"theory": "inertia_gravity_frequency", "on_grid": True})
    # Arakawa & Lamb 1977, l = 0
    omega = math.sqrt(1e-8 * math.cos(k * dx / 2) ** 2 + 8 / dx**2 * math.sin(k * dx / 2) ** 2)
    found = expected_value(one, basin, [PoincareWave(amplitude=0.1, waves=(1, 0))])
    assert found.value == pytest.approx(omega, rel=1e-12)


def test_a_kelvin_wave_knows_its_edge():
    basin = make_basin(edges=CHANNEL)
    one = expect(measure={"kind": "phase_speed", "of": "eta", "along": "x"}, value="kelvin_phase_speed")
    for edge, sign in (("south", 1), ("north", -1)):
        wave = KelvinWave(amplitude=0.1, waves=1, edge=edge)
        # Thomson 1879: sqrt(g H), the coast on the right where f > 0
        assert expected_value(one, basin, [wave]).value == pytest.approx(sign * math.sqrt(2), rel=1e-12)


def test_a_wave_that_is_not_the_only_one_must_be_named():
    waves = [PoincareWave(amplitude=0.1, waves=(1, 0)), PoincareWave(amplitude=0.1, waves=(2, 0))]
    with pytest.raises(RequestError, match="2 parts of the start are inertia_gravity waves; give k in value"):
        expected_value(wave_speed(), make_basin(), waves)
    with pytest.raises(RequestError, match="needs k"):
        expected_value(wave_speed(), make_basin(), [])


# -------------------------------------------------------------------------------------------------------------- faults


def refused(one, record=None, starts=()):
    told = faults(one, 2, record or turning_record(), starts)
    assert all(fault.key[:2] == ("expect", 2) for fault in told)
    return [(".".join(map(str, fault.key[2:])), fault.found, fault.allowed) for fault in told]


def test_what_is_sound_is_not_refused():
    assert refused(expect()) == []
    assert refused(expect(measure=TURNING, value="inertial_turning", within="2 %")) == []
    assert refused(expect(value=0, within="1 mm")) == []


@pytest.mark.parametrize(
    ("keys", "told"),
    [
        ({"value": "1 m/s"}, ("value", "the expected value is a speed", "a length")),
        ({"value": "inertial_period"}, ("value", "inertial_period is a time", "a length")),
        ({"within": "1 s"}, ("within", "1.0 s is a time", "a length, or a percentage")),
        ({"value": 0}, ("within", "10 % of an expected value of 0 is nothing", "a length, absolute")),
        ({"within": 0}, ("within", "a tolerance of 0 leaves no room", "a tolerance above 0")),
        ({"within": "-3 %"}, ("within", "a tolerance of -3 leaves no room", "a tolerance above 0")),
        (
            {"measure": {"kind": "amplitude", "of": "eta", "during": ["1 h", "8 day"]}},
            ("measure.during", "8 day lies outside the run", "times from 0 s to 2 day"),
        ),
        (
            {"measure": {"kind": "amplitude", "of": "eta", "at": ["-2 km", 0]}},
            ("measure.at", "x = -2 km lies outside what is stored", "x from 0 m to 16 km"),
        ),
    ],
)
def test_what_cannot_be_compared_is_refused_with_its_key(keys, told):
    assert refused(expect(**keys)) == [told]


def test_an_expected_period_that_the_output_cannot_see_is_refused():
    # f = 1e-3 1/s has a period of 1.75 h
    found = refused(expect(measure=TURNING, value="inertial_turning"), turning_record(make_basin(f0=1e-3)))
    assert found == [
        (
            "measure.during",
            "1.7 snapshots fall into one expected period of 1.75 h",
            "at least 4, better 8 and more",
        )
    ]


@pytest.mark.parametrize(
    ("keys", "place", "message"),
    [
        ({"value": "deformation_radiu"}, ("value",), "deformation_radius"),
        ({"value": True}, ("value",), "is not a quantity"),
        ({"value": {"theory": "rossby_frequency", "k": "3 s"}}, ("value",), "a wavenumber"),
        ({"within": "near"}, ("within",), "is not one number"),
        ({"claim": ""}, ("claim",), "at least 1"),
        ({"measure": {"kind": "amplitud"}}, ("measure",), "amplitude"),
    ],
)
def test_what_is_no_expectation_is_refused_where_it_stands(keys, place, message):
    with pytest.raises(ValidationError) as caught:
        expect(**keys)
    (error,) = caught.value.errors()
    assert error["loc"][: len(place)] == place
    assert message in error["msg"]


def test_an_expectation_is_read_again_as_it_is_written():
    table = {"theory": "rossby_frequency", "k": "1e-5 1/m"}
    for one in (expect(), expect(value="inertial_period"), expect(value=table, measure=TURNING, within="1e-6 rad/s")):
        assert ExpectSettings.model_validate(json.loads(one.model_dump_json())) == one


def test_expectations_load_no_heavy_package():
    heavy = ("scipy", "h5py", "numba", "matplotlib", "pint", "rich")
    code = f"import sys, swmodel.measures; print([name for name in {heavy} if name in sys.modules])"
    done = run_program([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
