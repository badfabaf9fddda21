"""Values at points and along lines, against fields that are known everywhere."""

import numpy as np
import pytest
from synthetic import PERIODIC, WALLS, make_basin, make_record

from swmodel.measures.lines import along_line, at_point
from swmodel.measures.record import si
from swmodel.store.names import FIELDS, SERIES


@pytest.mark.parametrize("edges", [PERIODIC, WALLS])
@pytest.mark.parametrize("name", ["eta", "u", "v", "vorticity"])
def test_a_linear_field_is_read_exactly_at_any_point_between_its_own(name, edges):
    record = make_record(make_basin(edges=edges), [0.0])
    x, y = record.axes(name)
    field = 3.0 + 2e-3 * x[None, :] - 1e-3 * y[:, None]
    # bilinear interpolation is exact for it; round-off
    assert at_point(record, name, (7300.0, 1240.0))(field) == pytest.approx(3 + 14.6 - 1.24, rel=1e-13)


def test_between_the_last_and_the_first_centre_of_a_period_both_count():
    record = make_record(make_basin(nx=4, ny=1), [0.0])
    field = np.array([[1.0, 0.0, 0.0, 5.0]])
    # centres at 500 and 3500 m of a period of 4000 m: its end lies half way between them
    for x in (0.0, 4000.0):
        assert at_point(record, "eta", (x, 0.0))(field) == pytest.approx(3.0, rel=1e-14)


def test_half_a_cell_from_a_wall_the_nearest_value_is_held():
    record = make_record(make_basin(nx=4, ny=1, edges=WALLS), [0.0])
    field = np.array([[1.0, 0.0, 0.0, 5.0]])
    assert at_point(record, "eta", (0.0, 0.0))(field) == 1.0
    assert at_point(record, "eta", (4000.0, 0.0))(field) == 5.0


def test_a_line_holds_the_fields_own_points_and_can_run_backward():
    record = make_record(make_basin(nx=8, ny=2), [0.0])
    forward = along_line(record, "u", "x", 250.0, 1000.0, 3000.0)
    assert np.array_equal(forward.s, [0, 1000, 2000])
    backward = along_line(record, "u", "x", 250.0, 3000.0, 1000.0)
    assert np.array_equal(backward.s, [0, 1000, 2000])
    field = np.tile(np.arange(9.0), (2, 1))
    assert np.array_equal(forward.sample(field), [1, 2, 3])
    assert np.array_equal(backward.sample(field), [3, 2, 1])
    assert np.array_equal(along_line(record, "eta", "x", None, 1000.0, 3000.0).s, [500, 1500])


@pytest.mark.parametrize("name", ["eta", "v"])
@pytest.mark.parametrize("edges", [PERIODIC, WALLS])
def test_the_mean_over_the_other_direction_is_that_of_the_domain(name, edges):
    # a field linear in y has as its mean the value at the middle, 2000 m, whichever points it lies on
    record = make_record(make_basin(ny=8, edges=edges), [0.0])
    _, y = record.axes(name)
    field = np.repeat(y[:, None], record.axes(name)[0].size, axis=1)
    # round-off
    assert along_line(record, name, "x", None, None, None).sample(field) == pytest.approx(2000.0, rel=1e-14)


def test_land_does_not_count_in_a_mean():
    record = make_record(make_basin(nx=2, ny=4), [0.0])
    field = np.array([[1.0, np.nan], [3.0, np.nan], [np.nan, np.nan], [5.0, 7.0]])
    assert np.array_equal(along_line(record, "eta", "x", None, None, None).sample(field), [3.0, 7.0])


@pytest.mark.parametrize("units", sorted({row.units for table in (FIELDS, SERIES) for row in table.values()}))
def test_units_of_the_files_are_units_that_can_be_read(units):
    # pint (an independent reader) takes both spellings for the same
    pint = pytest.importorskip("pint")
    registry = pint.UnitRegistry()
    spelt = " * ".join(f"{part.rstrip('-0123456789') or 1}**{part.lstrip('abcdefm s') or 1}" for part in units.split())
    assert registry.parse_units(si(units)) == registry.parse_units(spelt if units != "1" else "dimensionless")
