"""The fits behind the measures against signals with known answers; the measure's own error against Tukey's formula."""

import math

import numpy as np
import pytest

from swmodel.measures.error import every_second, halves, measure_error, without_blocks
from swmodel.measures.finding import NoAnswerError
from swmodel.measures.fits import fit_exponential, fit_oscillation, fit_wave

DAY = 86400.0


@pytest.mark.parametrize("periods", [1.5, 2.3, 7.7, 24.9])
def test_a_clean_sinusoid_with_mean_and_trend_gives_its_frequency(periods):
    t = np.linspace(0, 10 * DAY, 200)
    omega = 2 * math.pi * periods / t[-1]
    fit = fit_oscillation(t, 3.0 + 1e-6 * t + 0.1 * np.cos(omega * t + 1.0))
    # round-off, some digits lost to the mean and trend that are far larger than the oscillation
    assert fit.parameters[0] == pytest.approx(omega, rel=1e-9)
    assert fit.explained == pytest.approx(1, abs=1e-9)


@pytest.mark.parametrize("omega", [1.03e-4, -1.03e-4])
def test_a_turning_velocity_gives_the_sign_of_its_turning(omega):
    # u + i v = exp(i omega t): anticlockwise for omega > 0, by the definition of the complex plane
    t = np.arange(60) * 3600.0
    fit = fit_oscillation(t, 0.2 + 0.1j + np.exp(1j * omega * t))
    # round-off
    assert fit.parameters[0] == pytest.approx(omega, rel=1e-9)


def test_a_velocity_that_swings_along_a_line_is_half_of_either_turning():
    # cos = (exp(i w t) + exp(-i w t))/2: either explains half; the window holds whole periods, so they part cleanly
    t = np.arange(96) * 0.125
    fit = fit_oscillation(t, np.cos(2 * math.pi * t) + 0j)
    # one part in a hundred for the trend, which takes a little of the sinusoid
    assert fit.explained == pytest.approx(0.5, abs=0.01)


def test_noise_moves_the_frequency_by_no_more_than_its_bound_allows():
    # Cramer-Rao bound for one sinusoid, var = 24 sigma^2/(A^2 n^3 dt^2): Rife & Boorstyn 1974, IEEE Trans. Inf.
    # Theory 20; formula from memory
    rng = np.random.default_rng(7)
    n, sigma, omega = 120, 0.1, 0.5
    t = np.arange(n) * 1.0
    found = [fit_oscillation(t, np.cos(omega * t + 0.3) + sigma * rng.normal(size=n)).parameters[0] for _ in range(40)]
    bound = math.sqrt(24 * sigma**2 / n**3)
    # a least-squares fit reaches the bound; a spread from 40 samples is known to 11 %, three of which are allowed
    assert np.std(np.array(found) - omega) == pytest.approx(bound, rel=0.33)


@pytest.mark.parametrize("signal", [np.zeros(40), np.full(40, 2.5), np.linspace(1, 3, 40)])
def test_what_does_not_oscillate_says_so(signal):
    with pytest.raises(NoAnswerError, match="nothing oscillates"):
        fit_oscillation(np.arange(40.0), signal)


@pytest.mark.parametrize(("length", "offset", "size"), [(13.7e3, 0.5, -0.5), (2e3, 0.0, 1.0), (60e3, -3.0, 0.01)])
def test_an_exact_exponential_gives_its_length(length, offset, size):
    s = np.arange(130) * 537.0
    profile = offset + size * np.exp(-s / length)
    for given in (None, offset):
        fit = fit_exponential(s, profile, given)
        # round-off, times the ratio of offset to the part that decays over the line
        assert fit.parameters[0] == pytest.approx(length, rel=1e-8)
        assert fit.explained == pytest.approx(1, abs=1e-9)


def test_a_fixed_offset_is_used():
    # A = 0 forced on a profile with A = 0.2: the length must come out longer
    s = np.linspace(0, 5, 50)
    profile = 0.2 + np.exp(-s)
    assert fit_exponential(s, profile, 0.0).parameters[0] > 1.1
    assert fit_exponential(s, profile, 0.2).parameters[0] == pytest.approx(1, rel=1e-9)


@pytest.mark.parametrize(
    ("profile", "reason"),
    [
        (lambda s: 0 * s, "the same all along"),
        (lambda s: 0 * s + 4.0, "the same all along"),
        (lambda s: 2 + s, "straight line"),
        (lambda s: np.exp(s), "straight line"),
        (lambda s: (s < 0.01) * 1.0, "half the distance between its points"),
    ],
)
def test_what_is_no_decay_says_so(profile, reason):
    with pytest.raises(NoAnswerError, match=reason):
        fit_exponential(np.linspace(0, 1, 30), profile(np.linspace(0, 1, 30)))


@pytest.mark.parametrize("omega", [2.1e-5, -2.1e-5])
@pytest.mark.parametrize("waves", [0.7, 1.0, 5.3])
def test_a_travelling_wave_gives_its_speed_with_its_direction(omega, waves):
    t, s = np.arange(60) * 2 * 3600.0, np.linspace(0, 400e3, 100)
    k = 2 * math.pi * waves / s[-1]
    fit = fit_wave(t, s, 50 + 0.2 * np.cos(k * s - omega * t[:, None] + 2.0))
    found_k, found_omega = fit.parameters
    # round-off, some digits lost to the constant that is far larger than the wave
    assert found_omega / found_k == pytest.approx(omega / k, rel=1e-7)
    assert fit.explained == pytest.approx(1, abs=1e-9)


def test_a_last_snapshot_off_the_rhythm_does_not_disturb_the_wave():
    t, s = np.append(np.arange(40) * 3600.0, 39.4 * 3600), np.linspace(0, 1e5, 40)
    k, omega = 2 * math.pi / 1e5, 1.4e-4
    found_k, found_omega = fit_wave(t, s, np.cos(k * s - omega * t[:, None])).parameters
    # round-off
    assert found_omega / found_k == pytest.approx(omega / k, rel=1e-9)


def test_a_standing_wave_is_half_of_either_direction():
    # cos(k s) cos(w t) = (cos(k s - w t) + cos(k s + w t))/2, and the window holds whole periods and wavelengths
    t, s = np.arange(64) / 16, np.arange(64) / 32
    fit = fit_wave(t, s, np.cos(2 * math.pi * s) * np.cos(2 * math.pi * t[:, None]))
    # the two are orthogonal there but for the freedom of k and omega, which gains a few parts in a hundred
    assert fit.explained == pytest.approx(0.5, abs=0.05)


def test_a_line_at_rest_says_so():
    with pytest.raises(NoAnswerError, match="no wave travels"):
        fit_wave(np.arange(20.0), np.arange(20.0), np.full((20, 20), 3.0))


def test_the_jackknife_of_a_mean_is_its_standard_error():
    # Tukey 1958: with blocks of one sample, the jackknife of a mean is s/sqrt(n) exactly
    values = np.array([1.0, 4.0, 2.0, 8.0, 5.0])
    left_out = np.array([values[part].mean() for part in without_blocks(5)])
    jackknife = math.sqrt(4 / 5 * np.sum((left_out - left_out.mean()) ** 2))
    # round-off
    assert jackknife == pytest.approx(values.std(ddof=1) / math.sqrt(5), rel=1e-14)


def test_parts_of_a_window_are_blocks_halves_and_every_second():
    assert [list(part) for part in without_blocks(5)][:2] == [[1, 2, 3, 4], [0, 2, 3, 4]]
    assert sorted(np.concatenate([np.setdiff1d(np.arange(11), part) for part in without_blocks(11)])) == list(range(11))
    assert [list(part) for part in halves(4)] == [[0, 1], [2, 3]]
    assert [list(part) for part in halves(5)] == [[0, 1, 2], [2, 3, 4]]
    assert [list(part) for part in every_second(5)] == [[0, 2, 4], [1, 3]]


def test_the_error_is_the_largest_of_its_three_parts():
    def mean(values):
        return measure_error(values.size, lambda part: values[part].mean(), values.mean())

    # halves differ by 1 from the whole: 2 w = 2; blocks: means without a block of four of twenty are within 0.25 of it
    halves_differ = np.repeat([-1.0, 1.0], 10)
    left_out = np.array([halves_differ[part].mean() for part in without_blocks(20)])
    jackknife = math.sqrt(4 / 5 * np.sum((left_out - left_out.mean()) ** 2))
    assert mean(halves_differ) == pytest.approx(max(2.0, 3 * jackknife), rel=1e-12)
    # every second is always 1 or -1: 3 d = 3
    assert mean(np.tile([-1.0, 1.0], 10)) == pytest.approx(3.0, rel=1e-12)
    assert mean(np.ones(20)) == 0


def test_the_error_is_infinite_where_a_part_cannot_be_measured():
    def fails_on_half(part):
        if part.size == 10:
            raise NoAnswerError("too short")
        return 1.0

    assert measure_error(20, fails_on_half, 1.0) == math.inf


def test_the_error_covers_what_noise_does():
    # the plan's trial: coverage .986 in the nominal range; here 2 misses of 40 are allowed
    rng = np.random.default_rng(11)
    t, omega = np.arange(60.0), 2 * math.pi * 5 / 60
    covered = 0
    for _ in range(40):
        values = np.cos(omega * t + rng.uniform(0, 6)) + 0.1 * rng.normal(size=60)
        found = fit_oscillation(t, values).parameters[0]

        def again(part, values=values, found=found):
            return fit_oscillation(t[part], values[part], found, 2 * math.pi / 59).parameters[0]

        covered += abs(found - omega) <= measure_error(60, again, found)
    assert covered >= 38
