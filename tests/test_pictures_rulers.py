"""Colours, units, ticks and numbers of the pictures."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from swmodel.pictures.colours import (
    BAND,
    EXPECTED,
    FIT,
    FOUND,
    LAND,
    OTHER,
    START,
    signed_map,
    signed_shades,
)
from swmodel.pictures.rulers import number, padded, round_up, tick_step, typeset, unit_for, with_sign, written

# IEC 61966-2-1: linear sRGB to CIE XYZ with the white of D65
XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])

# Machado, Oliveira & Fernandes 2009, IEEE Trans. Vis. Comput. Graph. 15: severity 1 (values from memory)
COLOUR_BLIND = {
    "protanopia": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "deuteranopia": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "tritanopia": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}


def linear(rgb):
    """Light of sRGB values (IEC 61966-2-1)."""
    return np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)


def lab(light):
    """CIE 1976 L*, a*, b* of linear sRGB (CIE 15)."""
    t = (np.clip(light, 0, 1) @ XYZ.T) / XYZ.sum(axis=1)
    f = np.where(t > (6 / 29) ** 3, np.cbrt(t), t / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.stack([116 * f[..., 1] - 16, 500 * (f[..., 0] - f[..., 1]), 200 * (f[..., 1] - f[..., 2])], axis=-1)


def hexadecimal(colour):
    return np.array([int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)])


def test_the_map_of_signed_fields_lies_within_what_screens_show():
    assert signed_shades().min() >= 0
    assert signed_shades().max() <= 1


def test_the_map_of_signed_fields_is_lightest_at_zero_and_falls_evenly_to_both_ends():
    L = lab(linear(signed_shades()))[:, 0]
    middle = L.size // 2
    assert np.argmax(L) == middle
    assert np.all(np.diff(L[: middle + 1]) > 0)
    assert np.all(np.diff(L[middle:]) < 0)
    # the map is straight in OKLab; in CIELAB, another space, both sides agree to some units of a hundred
    assert np.max(np.abs(L - L[::-1])) < 6
    steps = np.abs(np.diff(L))
    assert steps.max() < 1.6 * steps.min()


@pytest.mark.parametrize("kind", ["none", *COLOUR_BLIND])
def test_sign_and_size_can_be_told_by_every_common_colour_vision(kind):
    light = linear(signed_shades())
    seen = lab(light @ np.array(COLOUR_BLIND.get(kind, np.eye(3))).T)
    below, above = seen[0], seen[-1]
    # a difference of 2.3 is just noticeable (Mahy 1994); half a scale apart must be far beyond
    assert np.linalg.norm(below - above) > 40
    quarter = seen.shape[0] // 4
    assert np.linalg.norm(seen[quarter] - seen[-quarter - 1]) > 20
    assert np.linalg.norm(seen[quarter] - seen[2 * quarter]) > 15


@pytest.mark.parametrize("kind", ["none", *COLOUR_BLIND])
def test_lines_can_be_told_apart_by_every_common_colour_vision(kind):
    colours = linear(np.array([hexadecimal(colour) for colour in (START, FOUND, FIT, EXPECTED)]))
    seen = lab(colours @ np.array(COLOUR_BLIND.get(kind, np.eye(3))).T)
    for n in range(len(seen)):
        for m in range(n):
            assert np.linalg.norm(seen[n] - seen[m]) > 20
    points = lab(
        linear(np.array([hexadecimal(FOUND), hexadecimal(OTHER)])) @ np.array(COLOUR_BLIND.get(kind, np.eye(3))).T
    )
    # these two differ by the shape of their marks, too
    assert np.linalg.norm(points[0] - points[1]) > 10


def test_land_and_what_is_allowed_are_no_value_of_the_map():
    shades = signed_shades()
    for colour in (LAND, BAND):
        assert np.min(np.linalg.norm(shades - hexadecimal(colour), axis=1)) > 0.03
    assert signed_map()(np.nan) == pytest.approx((*hexadecimal(LAND), 1.0))


@pytest.mark.parametrize(
    ("values", "unit", "name", "size"),
    [
        ([-275e3, 275e3], "m", "km", 1e3),
        ([0, 1999.0], "m", "m", 1.0),
        ([0.5], "m", "m", 1.0),
        ([0.2, -0.45], "m", "cm", 0.01),
        ([0.002], "m", "mm", 0.001),
        ([2e-6], "m", "10⁻⁶ m", 1e-6),
        ([0.0, np.nan], "m", "m", 1.0),
        ([3.6 * 86400], "s", "day", 86400.0),
        ([36 * 3600], "s", "h", 3600.0),
        ([3600], "s", "min", 60.0),
        ([100], "s", "s", 1.0),
        ([0.3], "m/s", "m/s", 1.0),
        ([0.007], "m/s", "cm/s", 0.01),
        ([-1e-4], "rad/s", "10⁻⁶ rad/s", 1e-6),
        ([0.33], "1", "", 1.0),
        ([4e-10], "1", "10⁻¹²", 1e-12),
        ([2.9e6], "m^5/s^2", "10⁶ m⁵/s²", 1e6),
        ([], "m^5/s^2", "m⁵/s²", 1.0),
    ],
)
def test_values_are_written_in_the_unit_of_their_size(values, unit, name, size):
    found = unit_for(values, unit)
    assert (found.name, found.size) == (name, pytest.approx(size))


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (13713.0, "m", "13.7 km"),
        (-3.5282, "m/s", "−3.53 m/s"),
        (0.0141, "m/s", "1.41 cm/s"),
        (-1.031e-4, "rad/s", "−1.03·10⁻⁴ rad/s"),
        (0.0, "rad/s", "0 rad/s"),
        (0.03, "1", "0.03"),
        (1e-6, "1", "1·10⁻⁶"),
        (-9.547e-12, "1", "−9.55·10⁻¹²"),
        (149500.0, "1", "150000"),
        (0.0, "", "0"),
    ],
)
def test_quantities_read_as_people_write_them(value, unit, text):
    assert written(value, unit).replace("\u00a0", " ") == text


def test_a_zero_in_a_unit_with_a_power_of_ten_has_none():
    assert unit_for([1e-12], "1").text(0.0) == "0"
    assert unit_for([1e-4], "rad/s").text(0.0) == "0\u00a0rad/s"


def test_numbers_have_the_digits_they_deserve():
    assert number(0.034567) == "0.035"
    assert number(-3.14159e-10, 3) == "−3.14·10⁻¹⁰"
    assert number(12.0) == "12"
    assert number(math.inf) == "inf"
    assert typeset("1/m/s") == "1/m/s"
    assert typeset("m^-1 s^-1") == "m⁻¹ s⁻¹"
    assert with_sign("mid-latitude -3 to -0.5") == "mid-latitude −3 to −0.5"


@given(st.floats(1e-15, 1e15))
def test_ends_of_colour_bars_are_round_and_just_above_the_largest_value(size):
    limit = round_up(size)
    # a value that is round but for round-off is its own end
    assert size * (1 - 1e-8) <= limit <= 1.34 * size
    assert float(f"{limit:.2g}") == pytest.approx(limit, rel=1e-12)


@given(st.floats(1e-12, 1e12), st.floats(1, 12), st.sampled_from(["km", "day", "h", "min", ""]))
def test_ticks_are_not_more_than_asked_for_and_not_too_few(span, count, unit):
    step = tick_step(span, count, unit)
    assert span / step <= count * (1 + 1e-6)
    # steps grow by at most 2.5 from one to the next; below a quarter hour no clock is asked
    if unit not in ("h", "min"):
        assert span / step >= count / 2.5 * (1 - 1e-6)


def test_hours_and_minutes_are_divided_as_clocks_are():
    assert [tick_step(span, 6, "h") for span in (6, 12, 20, 36, 70)] == [1.0, 2.0, 6.0, 6.0, 12.0]
    assert [tick_step(span, 6, "min") for span in (30, 60, 90, 120)] == [5.0, 10.0, 15.0, 20.0]


def test_limits_leave_room_and_never_fall_together():
    assert padded([0, 1], 0.1) == pytest.approx((-0.1, 1.1))
    assert padded([np.nan]) == (-1.0, 1.0)
    assert padded([5.0, 5.0]) == (4.5, 5.5)
    assert padded([0.0]) == (-1.0, 1.0)
