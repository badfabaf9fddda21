"""Quantities: what is read, what is refused, and how numbers are written for people."""

from __future__ import annotations

import math
from typing import Annotated

import numpy as np
import pint
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import Field, ValidationError

from swmodel.choices import Choice
from swmodel.errors import RequestError
from swmodel.quantities import (
    ACCELERATION,
    ANGLE,
    BETA_RATE,
    COMMON_UNITS,
    LENGTH,
    NUMBER,
    RATE,
    SPEED,
    TIME,
    AnyQuantity,
    Length,
    Measured,
    Percentage,
    Time,
    Tolerance,
    format_quantity,
    read_measured,
    read_quantity,
    read_unit,
    same_dimension,
)
from swmodel.quantities.units import _unit_by_pint

LENGTHS = 'a length is written as a number in m or as text with a unit such as "500 km"'


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry:
    return pint.UnitRegistry()


@pytest.mark.parametrize("unit", COMMON_UNITS)
def test_every_row_of_the_small_unit_table_is_what_pint_says(unit: str, registry: pint.UnitRegistry) -> None:
    value, name = COMMON_UNITS[unit]
    theirs = registry.Quantity(1.0, registry.parse_units(unit)).to_base_units()
    # two products of the same few factors in another order: a rounding each
    assert value == pytest.approx(theirs.magnitude, rel=4 * np.finfo(float).eps, abs=0)
    assert theirs.units == (registry.parse_units(name) if name != "1" else registry.dimensionless)
    assert _unit_by_pint(unit)[1] == name


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    # source: the International System of Units, 9th edition (2019), and the units' definitions
    [
        ("500 km", LENGTH, 5e5),
        ("2148.4375 m", LENGTH, 2148.4375),
        ("1 nautical_mile", LENGTH, 1852.0),
        ("12 inch", LENGTH, 0.3048),
        ("3.6 day", TIME, 311040.0),
        ("10 min", TIME, 600.0),
        ("-45 deg", ANGLE, -math.pi / 4),
        ("30 arcmin", ANGLE, math.pi / 360),
        ("10 rpm", RATE, math.pi / 3),
        ("1 cycle/day", RATE, 2 * math.pi / 86400),
        ("2e-4 1/s", RATE, 2e-4),
        ("2e-4 /s", RATE, 2e-4),
        ("2e-4 rad/s", RATE, 2e-4),
        ("15 deg/hour", RATE, math.pi / 12 / 3600),
        ("0.02 m/s^2", ACCELERATION, 0.02),
        ("0.02 m s^-2", ACCELERATION, 0.02),
        ("2e-11 1/m/s", BETA_RATE, 2e-11),
        ("2e-11 m^-1 s^-1", BETA_RATE, 2e-11),
        ("2 cm/s", SPEED, 0.02),
        ("36 km/h", SPEED, 10.0),
        ("8 %", NUMBER, 0.08),
        ("0.08", NUMBER, 0.08),
    ],
)
def test_a_text_with_a_unit_is_read_into_si(text: str, dimension, value: float) -> None:
    # at most three roundings, in the factors and their product
    assert read_quantity(text, dimension) == pytest.approx(value, rel=4 * np.finfo(float).eps, abs=0)


def test_a_bare_number_is_in_si() -> None:
    assert read_quantity(5, LENGTH) == 5.0
    assert read_quantity(-0.5, SPEED) == -0.5


@pytest.mark.parametrize(
    ("value", "message"),
    [
        (
            "1 000 km",
            '"1 000 km" is not one number with a unit; {}; use a point for decimals and no thousands separator',
        ),
        ("1,5 km", '"1,5 km" is not one number with a unit; {}; use a point for decimals and no thousands separator'),
        ("1_0 m", '"1_0 m" is not one number with a unit; {}; use a point for decimals and no thousands separator'),
        (
            "km",
            '"km" is not one number with a unit; {}; '
            "write one number, then a unit such as m, m/s^2, 1/m/s or m^-1 s^-1",
        ),
        (
            "5 m + 3 km",
            '"5 m + 3 km" is not one number with a unit; {}; '
            "write one number, then a unit such as m, m/s^2, 1/m/s or m^-1 s^-1",
        ),
        (
            "nan m",
            '"nan m" is not one number with a unit; {}; '
            "write one number, then a unit such as m, m/s^2, 1/m/s or m^-1 s^-1",
        ),
        ("1e400 m", '"1e400 m" is not a finite number; {}'),
        (math.nan, "nan is not a finite number; {}"),
        (-math.inf, "-inf is not a finite number; {}"),
        (10**400, "a whole number of more than 20 digits is not a finite number; {}"),
        (True, "true is not a length; {}"),
        ([1, 2], "a list of 2 is not a length; {}"),
        ({"m": 1}, "a table is not a length; {}"),
        (None, "None is not a length; {}"),
        ("500", '"500" has no unit; {}; write 500 without quotes, or "500 m"'),
        ("3 s", '"3 s" is a time; {}'),
        ("45 deg", '"45 deg" is an angle; {}'),
        ("8 %", '"8 %" is a pure number; {}'),
        ("5 kg", '"5 kg" is a quantity in kg; {}'),
        ("5 hourz", '"5 hourz" has the unit hourz, which is not known; {}; did you mean "hour"?'),
        (
            "5 Hz",
            '"5 Hz" has the unit Hz, which is refused; {}; Hz hides a factor of 2 pi: write rad/s, 1/s or cycle/day',
        ),
        ("5 degC", '"5 degC" has the unit degC, which is no multiple of an SI unit; {}'),
    ],
)
def test_whatever_is_not_a_length_is_refused_in_these_words(value: object, message: str) -> None:
    with pytest.raises(RequestError) as raised:
        read_quantity(value, LENGTH, key=("grid", "size", 0))
    assert str(raised.value) == "grid.size.0: " + message.format(LENGTHS)


def test_hertz_is_refused_with_every_prefix_and_in_every_product() -> None:
    for unit in ("Hz", "mHz", "hertz", "Hz m/m"):
        with pytest.raises(RequestError, match="2 pi"):
            read_quantity(f"1 {unit}", RATE)


def test_an_angle_is_no_pure_number_and_a_percentage_no_angle() -> None:
    with pytest.raises(RequestError, match="is an angle"):
        read_quantity("45 deg", NUMBER)
    with pytest.raises(RequestError, match="is a pure number"):
        read_quantity("45 %", ANGLE)


def test_a_rate_may_carry_its_radian_or_not_and_nothing_else_may_drop_it() -> None:
    assert same_dimension("rad/s", "1/s")
    assert same_dimension("rad/m/s", "1/m/s")
    assert not same_dimension("rad", "1")
    assert not same_dimension("1/s", "1/s^2")


@settings(deadline=None)  # the machine may be busy
@given(st.text(max_size=60))
def test_the_reader_never_raises_anything_but_a_request_error(text: str) -> None:
    for candidate in (text, f"5 {text}", f"5 m {text}"):
        try:
            value = read_quantity(candidate, LENGTH)
        except RequestError:
            continue
        assert math.isfinite(value)


@settings(deadline=None)  # the machine may be busy
@given(st.floats(allow_nan=False, allow_infinity=False, width=32), st.sampled_from(sorted(COMMON_UNITS)))
def test_a_written_number_comes_back_times_its_unit(number: float, unit: str) -> None:
    measured = read_measured(f"{number!r} {unit}")
    # the product is rounded once from the decimals, here from the double nearest to them
    assert measured.value == pytest.approx(number * COMMON_UNITS[unit][0], rel=2 * np.finfo(float).eps, abs=0)
    assert measured.unit == COMMON_UNITS[unit][1]


def test_decimals_times_a_whole_unit_are_exact() -> None:
    # 2.2 * 86400 in doubles is 190080.00000000003, which is no whole microsecond
    assert read_quantity("2.2 day", TIME) == 190080.0
    assert read_quantity("0.3 km", LENGTH) == 300.0


@pytest.mark.parametrize("unit", sorted({name for _, name in COMMON_UNITS.values()} - {"1"}))
def test_units_that_we_write_can_be_read_again_unchanged(unit: str) -> None:
    assert read_unit(unit) == (1.0, unit)


class Settings(Choice):
    """A settings class as rooms write them."""

    width: Annotated[Length, Field(gt=0)] = 1.0
    pair: tuple[Length, Length] = (0.0, 0.0)
    until: Time | None = None
    value: AnyQuantity | None = None
    within: Tolerance | None = None


def test_settings_hold_si_floats_and_survive_json() -> None:
    settings = Settings(width="5 km", pair=["1 m", 2], until="1 h", value="3 m^5/s^2", within="8 %")  # type: ignore[arg-type]
    assert settings.width == 5000.0
    assert settings.pair == (1.0, 2.0)
    assert settings.until == 3600.0
    assert settings.value == Measured(3.0, "m^5/s^2")
    assert settings.within == Percentage(8.0)
    assert settings.within.fraction == 0.08
    assert Settings.model_validate_json(settings.model_dump_json()) == settings


@settings(deadline=None)  # the machine may be busy
@given(st.floats(allow_nan=False, allow_infinity=False), st.sampled_from(["", " %", " m", " rad/s", " m^5/s^2"]))
def test_a_quantity_of_any_dimension_survives_json_bit_for_bit(number: float, unit: str) -> None:
    settings = Settings(within=f"{number!r}{unit}", value=number)  # type: ignore[arg-type]
    assert Settings.model_validate_json(settings.model_dump_json()) == settings


def test_limits_of_a_settings_class_hold_for_the_si_value() -> None:
    with pytest.raises(ValidationError) as raised:
        Settings(width="-5 km")  # type: ignore[arg-type]
    assert [(e["type"], e["loc"], e["input"]) for e in raised.value.errors()] == [("greater_than", ("width",), "-5 km")]


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (69300.0, "m", "69.3 km"),
        (100.0, "m", "100 m"),
        (0.5, "m", "0.5 m"),
        (0.005, "m", "5 mm"),
        (999.9, "m", "1 km"),
        (0.0, "m", "0 m"),
        (190080.0, "s", "2.2 day"),
        (86400.0, "s", "1 day"),
        (5400.0, "s", "1.5 h"),
        (90.0, "s", "1.5 min"),
        (12.0, "s", "12 s"),
        (-math.pi / 4, "rad", "-45 deg"),
        (0.0141, "m/s", "0.0141 m/s"),
        (1234.5, "m/s", "1230 m/s"),
        (1.03e-4, "rad/s", "0.000103 rad/s"),
        (1.23456e9, "m^3", "1.23e+09 m^3"),
        (0.3333, "1", "0.333"),
        (math.inf, "m", "inf m"),
    ],
)
def test_quantities_are_written_in_a_sensible_unit_with_three_digits(value: float, unit: str, text: str) -> None:
    assert format_quantity(value, unit) == text
