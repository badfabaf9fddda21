"""Energy ratio and change on records whose answers are known by hand."""

import numpy as np
import pytest
from synthetic import HOUR, WALLS, make_basin, make_record, measure

from swmodel.measures.error import measure_error

# --------------------------------------------------------------------------------------------------------- energy_ratio


def step_adjusted(dx=250.0, cells=800):
    """Two snapshots: the step, and twelve of its adjusted state (Rossby 1938), 20 radii to either side."""
    basin = make_basin(nx=cells, ny=2, dx=dx, edges=WALLS, f0=1.4142135623730951e-4)
    a, middle, eta0 = basin.deformation_radius, cells * dx / 2, 0.5

    def eta(x, y, t):
        s = x - middle
        return eta0 * np.sign(s) * (1 if t == 0 else 1 - np.exp(-np.abs(s) / a))

    def v(x, y, t):
        # geostrophic: f v = g d(eta)/dx
        s = x - middle
        return 0 * s if t == 0 else basin.gravity * eta0 / (basin.frame.f0 * a) * np.exp(-np.abs(s) / a)

    return make_record(basin, np.arange(13) * HOUR, eta=eta, v=v), a, middle


def test_one_third_of_the_released_energy_stays_in_the_adjusted_step():
    record, a, middle = step_adjusted()
    strip = {"along": "x", "from_": middle - 8 * a, "to": middle + 8 * a, "during": ["1 h", "12 h"]}
    finding = measure("energy_ratio", of="kinetic", over="released_potential", **strip).take(record)
    # Gill 1982 ch. 7: 1/3 over the whole line; outside 8 radii both parts are exp(-8) of themselves; midpoint sums over
    # cells of a/40 leave (1/40)^2/24 of it
    assert finding.value == pytest.approx(1 / 3, rel=1e-3)
    assert finding.fit_error < 1e-12
    # start and mean state in the same closed form: eta0^2 g L (1 - ...) and c^2 = f^2 a^2
    share = measure("energy_ratio", of="potential", over="start_potential", **strip).take(record)
    # released = g eta0^2 (2 a - a/2) of g eta0^2 8 a within 8 radii
    assert share.value == pytest.approx(1 - 1.5 / 8, rel=1e-3)


def test_energies_of_a_strip_take_cells_by_their_share():
    # eta = 1 everywhere at the start, 2 afterwards: the ratio is 4 whatever the strip, and the kinetic one counts h
    record = make_record(
        make_basin(nx=4, ny=3, dx=1000.0),
        np.arange(6) * HOUR,
        eta=lambda x, y, t: 1.0 if t == 0 else 2.0,
        u=lambda x, y, t: 1.0 if t == 0 else 3.0,
        linear=False,
    )
    for ends in ({}, {"along": "x", "from_": 1250, "to": 1300}, {"along": "y", "from_": 1500, "to": 100}):
        window = {"during": ["1 h", "5 h"], **ends}
        ratio = measure("energy_ratio", of="potential", over="start_potential", **window).take(record)
        assert ratio.value == pytest.approx(4.0, rel=1e-13)
        # h = 101 m at first and 102 m then; 9 times the square of the speed
        ratio = measure("energy_ratio", of="kinetic", over="start_kinetic", **window).take(record)
        assert ratio.value == pytest.approx(9 * 102 / 101, rel=1e-13)
        # both, with g = 0.02: (102 * 9/2 + 0.02 * 4/2)/(101/2 + 0.02/2)
        ratio = measure("energy_ratio", of="energy", over="start_energy", **window).take(record)
        assert ratio.value == pytest.approx((102 * 4.5 + 0.04) / (50.5 + 0.01), rel=1e-13)


def test_a_strip_that_cuts_a_cell_counts_its_part():
    # eta^2 is 1 in the western half and 9 in the eastern: from 1500 to 3250 m of four cells of 1 km there are half a
    # cell of 1 and one and a quarter of 9
    record = make_record(
        make_basin(nx=4, ny=1),
        [0.0, HOUR],
        eta=lambda x, y, t: np.where(x < 2000, 1.0, 3.0) * (1 if t == 0 else np.where(x < 2000, 1, 2)),
    )
    finding = measure("energy_ratio", of="potential", over="start_potential", along="x", from_=1500, to=3250).take(
        record
    )
    assert finding.value == pytest.approx((0.5 + 4 * 1.25 * 9) / (0.5 + 1.25 * 9), rel=1e-13)


def test_averaging_comes_before_the_energy():
    # velocities of opposite sign in turn: the mean state has no kinetic energy, though every instant has
    record = make_record(
        make_basin(),
        np.arange(12) * HOUR,
        eta=lambda x, y, t: 0.1,
        u=lambda x, y, t: 0.0 if t == 0 else (1.0 if round(t / HOUR) % 2 else -1.0),
    )
    finding = measure("energy_ratio", of="kinetic", over="start_potential", during=["1 h", "10 h"]).take(record)
    assert finding.value == pytest.approx(0, abs=1e-20)
    assert np.all(finding.evidence.values > 1)


def test_means_over_parts_of_the_window_are_those_of_the_snapshots():
    # the error from sums over groups of snapshots is the one from the snapshots themselves
    rng = np.random.default_rng(0)
    speeds = rng.normal(1, 0.2, size=23)
    record = make_record(
        make_basin(),
        np.arange(23) * HOUR,
        eta=lambda x, y, t: 0.1,
        u=lambda x, y, t: speeds[round(t / HOUR)],
    )
    finding = measure("energy_ratio", of="kinetic", over="start_kinetic", during=[0, "22 h"]).take(record)
    squares = lambda part: speeds[part].mean() ** 2 / speeds[0] ** 2  # noqa: E731
    assert finding.value == pytest.approx(squares(np.arange(23)), rel=1e-12)
    assert finding.fit_error == pytest.approx(measure_error(23, squares, squares(np.arange(23))), rel=1e-9)


# --------------------------------------------------------------------------------------------------------------- change


def record_of_series(times, **series):
    return make_record(make_basin(), [0.0], series_times=np.asarray(times, float), series=series)


def test_change_compares_the_last_with_the_first_of_the_window():
    record = record_of_series(
        [0, 1, 2, 3], mass=np.array([4.0, 5.0, 6.0, 3.0]), energy_kinetic=np.array([1.0, 2, 3, 4])
    )
    assert measure("change", of="mass").take(record).value == -0.25
    assert measure("change", of="mass", during=[0, 2]).take(record).value == 0.5
    finding = measure("change", of="mass", absolute=True, during=[1, 3]).take(record)
    assert (finding.value, finding.unit) == (-2.0, "m^3")


def test_change_of_a_negative_quantity_keeps_its_sign():
    record = record_of_series([0, 1], circulation=np.array([-4.0, -5.0]))
    assert measure("change", of="circulation").take(record).value == -0.25


def test_change_of_energy_is_that_of_both_parts_together():
    record = record_of_series([0, 1], energy_kinetic=np.array([1.0, 2.0]), energy_potential=np.array([3.0, 2.0]))
    finding = measure("change", of="energy").take(record)
    assert finding.value == 0
    # two sums, each rounded by up to two units in the last place
    assert finding.fit_error == pytest.approx(4 * 2**-52)


def test_change_of_nothing_says_so():
    record = record_of_series([0, 1], mass=np.array([0.0, 1.0]))
    assert "set absolute = true" in measure("change", of="mass").take(record).reason
    assert measure("change", of="mass", absolute=True).take(record).value == 1.0
    assert "no time series circulation" in measure("change", of="circulation").take(record).reason
    assert "takes two" in measure("change", of="mass", during=[0, 0.5]).take(record).reason
    broken = record_of_series([0, 1], mass=np.array([1.0, np.nan]))
    assert "not a number" in measure("change", of="mass").take(broken).reason
