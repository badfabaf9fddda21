"""Amplitude, decay length, frequency and phase speed on records whose answers are known by hand."""

import math

import numpy as np
import pytest
from synthetic import CHANNEL, DAY, HOUR, make_basin, make_record, measure, told

from swmodel.theory import THEORY

# ----------------------------------------------------------------------------------------------------------- amplitude


def test_amplitude_is_the_largest_magnitude_averaged_over_the_window():
    # a standing swing 0.3 |cos| sampled at whole periods and half periods is 0.3 at each
    times = np.arange(11) * HOUR
    basin = make_basin(nx=16)
    k = 2 * math.pi / basin.grid.Lx
    record = make_record(basin, times, eta=lambda x, y, t: 0.3 * np.sin(k * (x - 500)) * np.cos(math.pi * t / HOUR))
    finding = measure("amplitude", of="eta", during=[0, "10 h"]).take(record)
    # centres lie on the crest: round-off only
    assert finding.value == pytest.approx(0.3, rel=1e-12)
    assert finding.fit_error < 1e-12
    assert finding.unit == "m"


def test_amplitude_at_a_point_on_a_line_and_over_the_domain():
    record = make_record(make_basin(nx=16, ny=8), [0.0, HOUR], eta=lambda x, y, t: 1e-4 * (x - 2 * y))
    assert measure("amplitude", of="eta", at=["10 km", "1 km"]).take(record).value == pytest.approx(0.8, rel=1e-12)
    line = measure("amplitude", of="eta", along="x", at="1 km", from_="2 km", to="6 km").take(record)
    # centres at 2.5 to 5.5 km
    assert line.value == pytest.approx(0.35, rel=1e-12)
    assert measure("amplitude", of="eta").take(record).value == pytest.approx(1e-4 * (15500 - 500), rel=1e-12)


def test_amplitude_at_one_instant_has_no_error_of_its_own_and_says_so():
    finding = measure("amplitude", of="speed").take(make_record(make_basin(), [0.0], u=lambda x, y, t: 0.5))
    # K = u^2/2 where v = 0
    assert finding.value == pytest.approx(0.5 * math.sqrt(1), rel=1e-14)
    assert finding.fit_error is None
    assert finding.remarks == ("one instant: how it swings in time is not included",)


def test_amplitude_of_a_swing_knows_that_it_swings():
    times = np.arange(40) * HOUR
    record = make_record(make_basin(), times, eta=lambda x, y, t: 1 + 0.1 * np.cos(2 * math.pi * t / (13 * HOUR)))
    finding = measure("amplitude", of="eta", during=[0, "39 h"]).take(record)
    # the mean over about three swings is within a swing's tenth of 1
    assert abs(finding.value - 1) < finding.fit_error < 0.1


# --------------------------------------------------------------------------------------------------------- decay_length


def test_a_kelvin_waves_profile_gives_the_deformation_radius_at_one_instant():
    # exact linear solution, eta = cos(k x) exp(-y/a) on the southern wall where f > 0: Thomson 1879
    basin = make_basin(nx=32, ny=80, dy=500.0, edges=CHANNEL)
    a, k = basin.deformation_radius, 2 * math.pi / basin.grid.Lx
    record = make_record(basin, [0.0, HOUR], eta=lambda x, y, t: 0.2 * np.cos(k * (x - 500)) * np.exp(-y / a))
    line = {"of": "eta", "along": "y", "at": 500.0, "from_": 0, "to": "30 km"}
    finding = measure("decay_length", **line, during="1 h").take(record)
    # the profile is an exact exponential: round-off of the fit
    assert finding.value == pytest.approx(a, rel=1e-9)
    assert finding.fit_error < 1e-7 * a
    assert "one instant" in finding.remarks[0]
    assert measure("decay_length", **line, offset="0 m").take(record).value == pytest.approx(a, rel=1e-9)


def test_the_adjusted_step_is_one_deformation_radius_wide_on_either_side():
    # Rossby 1938; Gill 1982 ch. 7: eta0 sign(x) (1 - exp(-|x|/a))
    basin = make_basin(nx=200, ny=2, dx=1000.0, edges=CHANNEL)
    a, middle = basin.deformation_radius, 100e3
    times = np.arange(12) * HOUR
    record = make_record(
        basin, times, eta=lambda x, y, t: 0.5 * np.sign(x - middle) * (1 - np.exp(-np.abs(x - middle) / a))
    )
    for to in ("180 km", "20 km"):
        finding = measure("decay_length", of="eta", along="x", from_="100 km", to=to, during=[0, "11 h"]).take(record)
        # exact exponential: round-off of the fit
        assert finding.value == pytest.approx(a, rel=1e-9)
        assert finding.reason == ""


def test_the_mean_over_the_window_is_taken_before_the_fit():
    # the profile swings by more than itself, but the swing averages out over whole periods
    basin = make_basin(nx=60, ny=2)
    times = np.arange(24) * HOUR
    record = make_record(
        basin,
        times,
        eta=lambda x, y, t: np.exp(-x / 8e3) + 2 * np.cos(2 * math.pi * t / (12 * HOUR)) * np.cos(x / 3e3),
    )
    finding = measure("decay_length", of="eta", along="x", to="40 km", during=[0, "23 h"]).take(record)
    # the mean of the cosine over 24 hourly samples of two whole periods is 0 to round-off
    assert finding.value == pytest.approx(8e3, rel=1e-9)
    # whereas parts of the window do not average it out, and the error says so
    assert finding.fit_error > 80


def test_a_decay_that_is_longer_than_its_line_is_undecided():
    record = make_record(make_basin(nx=30), [0.0], eta=lambda x, y, t: np.exp(-x / 60e3))
    finding = measure("decay_length", of="eta", along="x").take(record)
    assert "shorter than the length found" in finding.reason
    # with A known the same line is enough, and exact
    finding = measure("decay_length", of="eta", along="x", offset=0).take(record)
    assert finding.reason == ""
    assert finding.value == pytest.approx(60e3, rel=1e-9)


def test_a_profile_that_is_hardly_exponential_is_undecided():
    rng = np.random.default_rng(3)
    noise = rng.normal(size=30)
    record = make_record(make_basin(nx=30), [0.0], eta=lambda x, y, t: 0.3 * np.exp(-x / 5e3) + noise)
    finding = measure("decay_length", of="eta", along="x").take(record)
    assert "of the variance" in finding.reason or "fall" in finding.reason


# ------------------------------------------------------------------------------------------------------------ frequency


@pytest.mark.parametrize("f0", [1e-4, -1e-4])
def test_an_inertial_oscillation_turns_clockwise_in_the_north_and_anticlockwise_in_the_south(f0):
    # Gill 1982: u + i v = exp(-i f t)
    basin = make_basin(f0=f0)
    record = make_record(
        basin,
        np.arange(49) * HOUR,
        u=lambda x, y, t: 0.3 * np.cos(f0 * t) + 0.02,
        v=lambda x, y, t: -0.3 * np.sin(f0 * t),
    )
    finding = measure("frequency", of="velocity", at=["7.3 km", "1.2 km"]).take(record)
    # a clean signal: round-off of the fit
    assert finding.value == pytest.approx(-f0, rel=1e-9)
    assert finding.value == pytest.approx(THEORY["inertial_turning"].value({"f0": f0}), rel=1e-9)
    assert finding.fit_error < 1e-9 * abs(f0)
    assert finding.reason == ""
    assert np.iscomplexobj(finding.evidence.values)
    drawn = finding.evidence.curve(-f0)
    # the curve goes through the points at both ends
    assert drawn[[0, -1]] == pytest.approx(finding.evidence.values[[0, -1]], abs=1e-9)


def test_the_frequency_of_an_elevation_is_positive():
    omega = 1.7e-4
    record = make_record(make_basin(), np.arange(60) * HOUR, eta=lambda x, y, t: 0.1 * np.sin(1e-4 * x - omega * t))
    finding = measure("frequency", of="eta", at=[0, 0], during=["6 h", "2 day"]).take(record)
    # the signal between the grid's points is the same sinusoid, a little smaller: round-off of the fit
    assert finding.value == pytest.approx(omega, rel=1e-9)


@pytest.mark.parametrize(("a_period", "word"), [(7.5, "snapshots a period"), (8.5, "")])
def test_fewer_than_8_snapshots_a_period_decide_nothing(a_period, word):
    omega = 2 * math.pi / (a_period * HOUR)
    record = make_record(make_basin(), np.arange(60) * HOUR, eta=lambda x, y, t: np.cos(omega * t))
    finding = measure("frequency", of="eta", at=[0, 0]).take(record)
    assert word in finding.reason
    assert bool(word) == bool(finding.reason)
    # the value is shown all the same
    assert finding.value == pytest.approx(omega, rel=1e-9)


def test_fewer_than_4_snapshots_a_period_are_refused_by_the_expected_period():
    # aliasing: 1.25 snapshots a period look like a slow swing, and no fit can tell; the expected period does
    omega = 2 * math.pi / (1.25 * HOUR)
    record = make_record(make_basin(), np.arange(60) * HOUR, eta=lambda x, y, t: np.cos(omega * t))
    one = measure("frequency", of="eta", at=[0, 0])
    assert one.take(record).value < 0.3 * omega
    assert told(one, record, 1.25 * HOUR) == [
        ("during", "1.2 snapshots fall into one expected period of 1.25 h"),
    ]
    assert told(one, record, 4 * HOUR) == []


def test_a_window_under_one_and_a_half_periods_is_refused_and_decides_nothing():
    omega = 2 * math.pi / (20 * HOUR)
    record = make_record(make_basin(), np.arange(26) * HOUR, eta=lambda x, y, t: np.cos(omega * t))
    one = measure("frequency", of="eta", at=[0, 0])
    assert told(one, record, 20 * HOUR) == [("during", "the window holds 1.2 expected periods of 20 h")]
    assert one.take(record).reason == "the window holds 1.2 periods; it takes at least 1.5"


def test_two_oscillations_of_one_size_decide_nothing():
    record = make_record(
        make_basin(), np.arange(200) * HOUR, eta=lambda x, y, t: np.cos(2e-4 * t) + 0.9 * np.cos(0.7e-4 * t + 1)
    )
    finding = measure("frequency", of="eta", at=[0, 0]).take(record)
    assert finding.reason.startswith("the best curve explains only 5")


# ---------------------------------------------------------------------------------------------------------- phase_speed


@pytest.mark.parametrize(("ends", "sign"), [({}, 1), ({"from_": "15 km", "to": "0 km"}, -1)])
@pytest.mark.parametrize("omega", [8e-5, -8e-5])
def test_phase_speed_is_positive_toward_the_end_of_the_line(ends, sign, omega):
    basin = make_basin(nx=64, dx=250.0)
    k = 2 * 2 * math.pi / basin.grid.Lx
    record = make_record(basin, np.arange(60) * HOUR, eta=lambda x, y, t: 0.1 * np.cos(k * x - omega * t + 1))
    finding = measure("phase_speed", of="eta", along="x", at="1 km", **ends).take(record)
    # a clean wave: round-off of the fit
    assert finding.value == pytest.approx(sign * omega / k, rel=1e-8)
    assert finding.fit_error < 1e-7 * abs(omega / k)
    assert finding.reason == ""
    crests = finding.evidence.values
    slope = np.polyfit(finding.evidence.at, crests, 1)[0]
    # crests found one by one move at the same speed; the line holds no whole number of waves, which makes them waver
    assert slope == pytest.approx(finding.value, rel=0.01)


def test_phase_speed_along_y_of_a_velocity():
    basin = make_basin(nx=4, ny=64)
    number = 2 * math.pi / basin.grid.Ly
    record = make_record(basin, np.arange(40) * HOUR, v=lambda x, y, t: 0.1 * np.cos(number * y + 1e-4 * t))
    finding = measure("phase_speed", of="v", along="y").take(record)
    assert finding.value == pytest.approx(-1e-4 / number, rel=1e-8)


def test_a_standing_wave_has_no_direction_and_decides_nothing():
    basin = make_basin(nx=32)
    k = 2 * math.pi / basin.grid.Lx
    record = make_record(basin, np.arange(48) * HOUR, eta=lambda x, y, t: np.cos(k * x) * np.cos(2 * math.pi * t / DAY))
    assert "of the variance" in measure("phase_speed", of="eta", along="x").take(record).reason
