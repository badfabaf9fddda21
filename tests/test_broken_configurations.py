"""Broken configurations, each message word for word: place, what was found, what is allowed, the remedy."""

from __future__ import annotations

from pathlib import Path

import pytest
from configurations import FRONT, changed

from swmodel.errors import RequestError
from swmodel.settings import read

LENGTH = 'a length is written as a number in m or as text with a unit such as "500 km"'
TIME = 'a time is written as a number in s or as text with a unit such as "6 h"'
FIELD = (
    'a field is a number in m, text with a unit such as "500 km", a formula in x and y, '
    'or { file = "...", variable = "..." }'
)
GRAMMAR = (
    "a formula is made of numbers, names, + - * / // % **, comparisons, and, or, not, and functions such as exp(x)"
)
TABLES = "known tables: [frame], [layer], [grid], [edges], [start], [numerics], [time], [output], [expect]"
KINDS = (
    'choose "rest", "step", "front", "bump", "vortex", "jet", "poincare_wave", "kelvin_wave", "rossby_wave", '
    '"formula", "file" or "run"'
)


@pytest.fixture(autouse=True)
def _in_an_empty_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


def messages(text: str | bytes, sets: dict[str, str] | None = None) -> list[str]:
    """Return what is said of a configuration called front.toml."""
    Path("front.toml").write_bytes(text if isinstance(text, bytes) else text.encode())
    with pytest.raises(RequestError) as raised:
        read("front.toml", sets)
    assert str(raised.value) == "\n".join(map(str, raised.value.faults))
    return str(raised.value).splitlines()


BROKEN = {
    "a syntax error": (
        ('until = "3.6 day"', "until = 3.6 day"),
        "front.toml:35: this is not TOML: expected newline or end of document after a statement (column 13); "
        'write text, and numbers with a unit, between quotes: "500 km"',
    ),
    "a text without quotes": (
        ('plane = "f"', "plane = f"),
        "front.toml:7: this is not TOML: invalid value (column 9); "
        'write text, and numbers with a unit, between quotes: "500 km"',
    ),
    "a key given twice": (
        ('west = "wall"', 'west = "wall"\nwest = "wall"'),
        "front.toml:21: this is not TOML: cannot overwrite a value (column 14); write every key once",
    ),
    "a misspelt key": (
        ("precision =", "precison ="),
        "front.toml:17: grid.precison: this key is not known; known keys: cells, size, origin, precision; "
        'did you mean "precision"?',
    ),
    "a misspelt key that is needed gives one message, not two": (
        ("depth =", "deph ="),
        "front.toml:10: layer.deph: this key is not known; known keys: depth, reference_depth, reduced_gravity; "
        'did you mean "depth"?',
    ),
    "a misspelt key of a start": (
        ("eta =", "etta ="),
        'front.toml:27: start.0.etta: this key is not known; known keys: kind, eta, u, v, at; did you mean "eta"?',
    ),
    "a misspelt key of a measure": (
        ("along =", "alnog ="),
        "front.toml:44: expect.0.measure.alnog: this key is not known; "
        'known keys: kind, of, along, at, from, to, offset, during; did you mean "along"?',
    ),
    "a misspelt key of a file's variable": (
        ('depth = "100 m"', 'depth = { fil = "depth.nc" }'),
        'front.toml:10: layer.depth.fil: this key is not known; known keys: file, variable; did you mean "file"?',
    ),
    "a key of another table": (
        ('origin = "centre"', 'slip = "none"'),
        "front.toml:16: grid.slip: this key is not known; known keys: cells, size, origin, precision; "
        "it belongs to [edges]",
    ),
    "a misspelt table": (
        ("[layer]", "[layr]"),
        f'front.toml:9: layr: the table [layr] is not known; {TABLES}; did you mean "layer"?',
    ),
    "a table of something that is not built yet": (
        ("[numerics]", '[sponge]\nwidth = "50 km"\n\n[numerics]'),
        f"front.toml:29: sponge: the table [sponge] is not known; {TABLES}",
    ),
    "a list of tables that is not built yet": (
        ("[numerics]", '[[forcing]]\nkind = "wind"\n\n[numerics]'),
        f"front.toml:29: forcing: the table [forcing] is not known; {TABLES}",
    ),
    "a missing key": (
        ('until = "3.6 day"\n', ""),
        "front.toml:33: time.until: until is missing; needed: model time at the end, counted from 0",
    ),
    "a missing table": (
        ('[time]\nstepper = "ssprk3"\nuntil = "3.6 day"\n', ""),
        "front.toml: time: the table [time] is missing; it needs until",
    ),
    "a unit of another dimension": (
        ('"550 km"', '"550 s"'),
        f'front.toml:15: grid.size.0: "550 s" is a time; {LENGTH}',
    ),
    "a unit of another dimension for a field": (
        ('"100 m"', '"100 m/s"'),
        f'front.toml:10: layer.depth: "100 m/s" is a speed; {FIELD}',
    ),
    "a separator of thousands": (
        ('"550 km"', '"1 000 km"'),
        f'front.toml:15: grid.size.0: "1 000 km" is not one number with a unit; {LENGTH}; '
        "use a point for decimals and no thousands separator",
    ),
    "a number as text without a unit": (
        ('"550 km"', '"550"'),
        f'front.toml:15: grid.size.0: "550" has no unit; {LENGTH}; write 550 without quotes, or "550 m"',
    ),
    "a unit that does not exist": (
        ('until = "3.6 day"', 'until = "3.6 dayz"'),
        f'front.toml:35: time.until: "3.6 dayz" has the unit dayz, which is not known; {TIME}; did you mean "day"?',
    ),
    "hertz": (
        ('latitude = "45 deg"', 'f0 = "1e-4 Hz"'),
        'front.toml:6: frame.f0: "1e-4 Hz" has the unit Hz, which is refused; '
        'a rate is written as a number in 1/s or as text with a unit such as "10 rpm"; '
        "Hz hides a factor of 2 pi: write rad/s, 1/s or cycle/day",
    ),
    "a bad word": (
        ('west = "wall"', 'west = "preiodic"'),
        'front.toml:20: edges.west: "preiodic" is not known here; choose "periodic" or "wall"; '
        'did you mean "periodic"?',
    ),
    "an edge that is not built yet": (
        ('west = "wall"', 'west = "open"'),
        'front.toml:20: edges.west: "open" is not known here; choose "periodic" or "wall"',
    ),
    "a bad kind": (
        ('kind = "formula"', 'kind = "formular"'),
        f'front.toml:26: start.0.kind: "formular" is not known here; {KINDS}; did you mean "formula"?',
    ),
    "a kind that is missing": (
        ('kind = "formula"\n', ""),
        f"front.toml:25: start.0.kind: kind is missing; {KINDS}",
    ),
    "a word where a quantity or a word may stand": (
        ('until = "3.6 day"', 'until = "3.6 day"\nstep = "5 km"'),
        f'front.toml:36: time.step: "5 km" is a length; {TIME}, or choose "auto"',
    ),
    "a negative size": (
        ('["550 km"', '["-550 km"'),
        'front.toml:15: grid.size.0: "-550 km" is out of range; a value greater than 0 is needed',
    ),
    "no cells": (
        ("[1024, 4]", "[1024, 0]"),
        "front.toml:14: grid.cells.1: 0 is out of range; a value of at least 1 is needed",
    ),
    "a truth value where a number belongs": (
        ("[1024, 4]", "[true, 4]"),
        "front.toml:14: grid.cells.0: true is not a whole number",
    ),
    "a truth value where a field belongs": (
        ('depth = "100 m"', "depth = true"),
        f"front.toml:10: layer.depth: true is not a field; {FIELD}",
    ),
    "half a cell": (
        ("[1024, 4]", "[1024, 4.5]"),
        "front.toml:14: grid.cells.1: 4.5 is not a whole number",
    ),
    "a truth value in quotes": (
        ("linear = true", 'linear = "true"'),
        'front.toml:31: numerics.linear: "true" is not true or false; write it without quotes',
    ),
    "a number where a truth value belongs": (
        ("linear = true", "linear = 1"),
        "front.toml:31: numerics.linear: 1 is not true or false",
    ),
    "a list too short": (
        ("[1024, 4]", "[1024]"),
        "front.toml:14: grid.cells: a list of 1; a list of 2 is needed",
    ),
    "a list too long": (
        ("[1024, 4]", "[1024, 4, 4]"),
        "front.toml:14: grid.cells: a list of 3; a list of at most 2 is needed",
    ),
    "one table where a list of tables belongs": (
        ("[[start]]", "[start]"),
        "front.toml:25: start: [start] is one table; a list of tables is needed; write [[start]]",
    ),
    "a list of tables where one belongs": (
        ("[grid]", "[[grid]]"),
        "front.toml:13: grid: [[grid]] is a list of tables; one table is needed; write [grid]",
    ),
    "a date where none belongs": (
        ('until = "3.6 day"', "until = 2000-01-04"),
        "front.toml:35: time.until: 2000-01-04 is a date or time of day; only [time] start may be a date",
    ),
    "a date in quotes that is none": (
        ('until = "3.6 day"', 'until = "3.6 day"\nstart = "2000-13-01"'),
        'front.toml:36: time.start: "2000-13-01" is not a date such as 2000-01-01 or 2000-01-01T12:00:00; '
        "write it without quotes",
    ),
    "an unknown function in a formula": (
        ("sign(x)", "sgn(x)"),
        'front.toml:27: start.0.eta: the formula uses "sgn", which is not a known function; '
        "known functions: sin, cos, tan, sinh, cosh, tanh, sech, exp, log, sqrt, abs, sign, hypot, arctan2, minimum, "
        'maximum, where, erf; did you mean "sign"?',
    ),
    "an unknown name in a formula": (
        ("sign(x)", "sign(x - lx)"),
        'front.toml:27: start.0.eta: the formula uses "lx", which is not a known name; '
        'known names: x, y, f0, beta, g, H, Lx, Ly, pi, c, a; did you mean "Lx"?',
    ),
    "an attribute in a formula": (
        ("sign(x)", "x.__class__"),
        'front.toml:27: start.0.eta: the formula holds an attribute, "x.__class__", which is not allowed; ' + GRAMMAR,
    ),
    "a power as in other languages": (
        ("sign(x)", "x^2"),
        f'front.toml:27: start.0.eta: the formula holds "0.5 * x^2", which is not allowed; {GRAMMAR}; '
        "write powers with **",
    ),
    "a direction that is periodic on one side only": (
        ('south = "periodic"', 'south = "wall"'),
        'front.toml:22: edges.south: south is "wall", while north is "periodic"; '
        "a direction is periodic at both ends or at neither; "
        'write south = "periodic", or north = "wall"',
    ),
    "a latitude on a plane that has its own": (
        ('plane = "f"', 'plane = "equatorial"'),
        'front.toml:6: frame.latitude: plane = "equatorial" takes no latitude; it is the equator\'s, at y0; '
        "leave it out",
    ),
    "no latitude where one is needed": (
        ('latitude = "45 deg"\n', ""),
        'front.toml:4: frame.latitude: plane = "f" needs a latitude; latitude, or f0 outright, never both; say where',
    ),
    "a latitude in degrees without its unit": (
        ('latitude = "45 deg"', "latitude = 45"),
        "front.toml:6: frame.latitude: 45 is 2578.31 deg, since a bare number is in rad; "
        '-90 deg to 90 deg; write "45 deg"',
    ),
    "a latitude beyond the pole": (
        ('latitude = "45 deg"', 'latitude = "100 deg"'),
        "front.toml:6: frame.latitude: 100 deg is no latitude; -90 deg to 90 deg; north is positive",
    ),
    "a percentage of nothing": (
        ('value = "deformation_radius"', 'value = "0 m"'),
        'front.toml:46: expect.0.within: "8 %" of an expected value of 0 leaves no room; '
        "a quantity of the dimension of the value",
    ),
    "a name that theory does not have": (
        ('value = "deformation_radius"', 'value = "deformation_radus"'),
        'front.toml:45: expect.0.value: "deformation_radus" is not known here; '
        'choose "gravity_wave_speed", "deformation_radius", "inertial_frequency", "inertial_turning", '
        '"inertial_period", "adjusted_kinetic_share", "inertia_gravity_frequency", "inertia_gravity_phase_speed", '
        '"kelvin_frequency", "kelvin_phase_speed", "rossby_frequency", "rossby_phase_speed", "equatorial_frequency" '
        'or "equatorial_phase_speed"; did you mean "deformation_radius"?',
    ),
    "no reason for a tolerance": (
        ("26 cells a radius; two inertial periods leave some 4 % of doubt", ""),
        "front.toml:47: expect.0.because: the text is empty",
    ),
}


@pytest.mark.parametrize("name", BROKEN)
def test_a_broken_configuration_is_answered_in_these_words(name: str) -> None:
    edit, message = BROKEN[name]
    assert messages(changed(edit)) == [message]


def test_all_faults_of_a_file_are_told_at_once_in_its_order() -> None:
    text = changed(
        ('latitude = "45 deg"', "latitude = 45"),
        ("depth =", "deph ="),
        ('"550 km"', '"550 s"'),
        ('west = "wall"', 'west = "preiodic"'),
        ("sign(x)", "sgn(x)"),
        ("linear = true", "linear = 1"),
        ('until = "3.6 day"\n', ""),
        ('value = "deformation_radius"', "value = 0"),
        ("[numerics]", "[sponge]\n\n[numerics]"),
    )
    told = messages(text)
    assert [line.split(": ")[:2] for line in told] == [
        ["front.toml:6", "frame.latitude"],
        ["front.toml:10", "layer.deph"],
        ["front.toml:15", "grid.size.0"],
        ["front.toml:20", "edges.west"],
        ["front.toml:27", "start.0.eta"],
        ["front.toml:29", "sponge"],
        ["front.toml:33", "numerics.linear"],
        ["front.toml:35", "time.until"],
        ["front.toml:47", "expect.0.within"],
    ]


def test_a_fault_in_what_is_set_from_outside_names_the_option_and_not_the_file() -> None:
    sets = {"frame.latitude": "30", "grid.cells.0": "2.5", "start.0.eta": "2 x", "numerics.liner": "true"}
    assert messages(FRONT, sets) == [
        '--set: numerics.liner: this key is not known; known keys: pv_flux, linear, threads; did you mean "linear"?',
        "--set: grid.cells.0: 2.5 is not a whole number",
        f'--set: start.0.eta: "2 x" has the unit x, which is not known; {FIELD}; write "2 * x"',
        '--set: frame.latitude: 30 is 1718.87 deg, since a bare number is in rad; -90 deg to 90 deg; write "30 deg"',
    ]


def test_a_key_set_from_outside_that_leads_nowhere_is_refused() -> None:
    allowed = "a key such as frame.latitude or start.0.width; lists are numbered from 0"
    sets = {"start.1.eta": "1", "start.eta": "1", "title.en": "x", "grid..cells": "1", "grid.0": "1"}
    assert messages(FRONT, sets) == [
        f"--set: start.1.eta: start is a list of 1; {allowed}",
        f"--set: start.eta: start is a list of 1; {allowed}",
        f"--set: title.en: title is no table; {allowed}",
        f'--set: grid..cells: "" is no key; {allowed}',
        f'--set: grid.0: "0" is no key; {allowed}',
    ]


def test_a_file_that_is_missing_or_no_text_is_said() -> None:
    Path("front.toml").write_text(FRONT)
    for name, message in {
        "frnt.toml": 'the configuration frnt.toml does not exist; did you mean "front.toml"?',
        "nowhere/front.toml": "the configuration nowhere/front.toml does not exist",
        ".": "the configuration . is no file",
    }.items():
        with pytest.raises(RequestError) as raised:
            read(name)
        assert str(raised.value) == message
    assert messages(b"title = '\xff'") == ["front.toml: byte 10 is not UTF-8 text; a TOML text in UTF-8"]
    assert messages(b"#" * 1_000_001) == ["front.toml: the file holds 1000001 bytes; at most 1000000 are read"]
    assert len(messages("a = " + "[" * 100_000)) == 1


def test_an_empty_file_is_told_every_table_that_it_needs() -> None:
    assert messages("") == [
        "front.toml: layer: the table [layer] is missing; it needs depth",
        "front.toml: grid: the table [grid] is missing; it needs cells, size",
        "front.toml: edges: the table [edges] is missing; it needs west, east, south, north",
        "front.toml: time: the table [time] is missing; it needs until",
        'front.toml: frame.latitude: plane = "f" needs a latitude; latitude, or f0 outright, never both; say where',
    ]
