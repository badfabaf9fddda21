"""What the chosen step does to waves, and why it was chosen."""

from __future__ import annotations

import math
from typing import Any

import pytest
from prospects import OMEGA, experiment, facts, outlook

from swmodel.outlook.facts import Wave
from swmodel.outlook.step import amplification, in_steps, waves_in_steps
from swmodel.steppers import STEPPERS, TimeSettings

DT = 100.0
C = math.sqrt(0.02 * 100)
F45 = 2 * OMEGA * math.sin(math.pi / 4)


def settings(**keys: Any) -> TimeSettings:
    return TimeSettings.model_validate({"until": 1e5, **keys})


def effect(p: float, stepper: str, steps: int = 1000, **keys: Any) -> Any:
    return in_steps(settings(stepper=stepper, **keys), Wave("", p / DT), DT, steps)


@pytest.mark.parametrize("p", [0.01, 0.03, 0.1])
def test_ssprk3_runs_fast_by_a_thirtieth_of_p4_and_damps_a_twenty_fourth(p: float) -> None:
    # expansion of 1 + z + z^2/2 + z^3/6 over exp(z), z = i p (Durran 2010, section 2.3): the next terms are p^2 smaller
    wave = effect(p, "ssprk3")
    assert wave.phase_ratio - 1 == pytest.approx(p**4 / 30, rel=2 * p**2, abs=1e-14)
    # a damping is known to round-off of 1
    assert wave.damping == pytest.approx(p**4 / 24, rel=2 * p**2, abs=3e-16)


@pytest.mark.parametrize("p", [0.03, 0.1, 0.2])
def test_rk4_runs_slow_by_p4_over_120_and_damps_p6_over_144(p: float) -> None:
    wave = effect(p, "rk4")
    assert wave.phase_ratio - 1 == pytest.approx(-(p**4) / 120, rel=2 * p**2, abs=1e-14)
    assert wave.damping == pytest.approx(p**6 / 144, rel=2 * p**2, abs=3e-16)


@pytest.mark.parametrize("p", [0.05, 0.2])
def test_leapfrog_without_filter_runs_fast_by_a_sixth_of_p2_and_damps_nothing(p: float) -> None:
    # sin(omega' dt) = omega dt (Mesinger & Arakawa 1976): omega' dt = arcsin(p)
    wave = effect(p, "leapfrog", filter=0.0)
    assert wave.phase_ratio == pytest.approx(math.asin(p) / p, rel=1e-13)
    assert wave.damping == pytest.approx(0, abs=3e-16)


def test_the_plain_filter_damps_leapfrog_by_a_half_nu_p2() -> None:
    # Williams 2009, Mon. Wea. Rev. 137: |A| = 1 - nu p^2/(2 (2 - nu)) with alpha = 1, to leading order
    p, nu = 0.02, 0.1
    wave = effect(p, "leapfrog", filter=nu, williams=1.0)
    assert wave.damping == pytest.approx(nu * p**2 / (2 * (2 - nu)), rel=p)


def test_williams_correction_takes_most_of_the_filters_damping_away() -> None:
    # alpha = 1/2 makes the damping fourth order (Williams 2009)
    plain = effect(0.05, "leapfrog", filter=0.1, williams=1.0).damping
    assert effect(0.05, "leapfrog", filter=0.1, williams=0.5).damping < 0.01 * plain


@pytest.mark.parametrize("stepper", STEPPERS)
def test_a_wave_of_large_step_is_told_as_its_factor_says(stepper: str) -> None:
    p = 0.7
    time = settings(stepper=stepper)
    wave = in_steps(time, Wave("", p / DT), DT, 3)
    factor = amplification(time, p)
    assert wave.damping == pytest.approx(1 - abs(factor), abs=1e-15)
    assert wave.lost == pytest.approx(1 - abs(factor) ** 3, abs=1e-15)
    assert wave.phase_ratio == pytest.approx(math.atan2(factor.imag, factor.real) / p, rel=1e-12)


def test_losses_add_up_over_the_run() -> None:
    wave = effect(0.1, "ssprk3", steps=10_000)
    assert wave.lost == pytest.approx(1 - math.exp(-10_000 * 0.1**4 / 24), rel=0.01)


def test_the_waves_of_the_set_up_are_named_with_their_frequencies() -> None:
    known = facts()
    assert known.draft.step is not None
    waves = {wave.name: wave.frequency for wave in waves_in_steps(known, known.draft.step)}
    # sqrt(f^2 + (c/L)^2), L = a for a formula: sqrt(2) f (Gill 1982, chapter 8)
    assert waves["gravity wave of scale L"] == pytest.approx(math.sqrt(2) * F45, rel=1e-6)
    assert waves["inertial oscillation"] == pytest.approx(F45, rel=1e-6)
    # 2 c sqrt(1/dx^2 + 1/dy^2) with square cells (Arakawa & Lamb 1977)
    assert waves["fastest on the grid"] == pytest.approx(2 * math.sqrt(2) * C / (550e3 / 1024), rel=1e-6)


def test_a_wave_start_is_told_with_theorys_frequency_and_the_grids_error() -> None:
    wave = {"kind": "kelvin_wave", "amplitude": 0.1, "waves": 2, "edge": "west"}
    values = {"start": [wave], "grid.cells": [64, 32], "grid.size": [1e5, 1e5], "expect": []}
    said = outlook(values)
    kelvin = said.waves[0]
    # omega = c k along the coast (Gill 1982, chapter 10); on the grid (2/dy) sin(k dy/2) for k
    k, dy = 4 * math.pi / 1e5, 1e5 / 32
    assert kelvin.frequency == pytest.approx(C * k, rel=1e-12)
    row = said.as_json()["resolution"]["grid_error_of_start_0"]
    assert row["value"] == pytest.approx(2 / (k * dy) * math.sin(k * dy / 2) - 1, rel=1e-9)
    assert "Kelvin wave, start.0" in str(said)


def test_the_step_says_what_set_it() -> None:
    assert outlook().as_json()["step"]["set_by"]["value"] == "waves"
    swift = {"numerics.linear": False, "start": [{"kind": "formula", "v": 20.0}], "expect": []}
    said = outlook(swift).as_json()["step"]
    assert said["set_by"]["value"] == "flow"
    shortened = outlook().as_json()["step"]
    # 2.4 min divides the hour and 3.6 days; the limit is 0.7 sqrt(3)/omega_max
    assert shortened["chosen"]["value"] == 144.0
    assert "shortened" in shortened["chosen"]["note"]
    limit = 0.7 * math.sqrt(3) / (2 * math.sqrt(2) * C / (550e3 / 1024))
    assert shortened["limit"]["value"] == pytest.approx(limit, rel=1e-9)
    assert outlook({"time.step": 120.0}).as_json()["step"]["chosen"]["note"] == "given"


def test_a_wave_in_the_southern_hemisphere_is_treated_alike() -> None:
    assert experiment({"frame.latitude": "-45 deg"}).frame.latitude == pytest.approx(-math.pi / 4)
    north, south = outlook().waves, outlook({"frame.latitude": "-45 deg", "expect": []}).waves
    assert [wave.frequency for wave in north] == [wave.frequency for wave in south]
