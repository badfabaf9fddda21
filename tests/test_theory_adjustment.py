"""The adjusting step against the equations, quadrature and its published end state."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad

from swmodel.theory.adjustment import (
    adjusted_elevation,
    adjusted_energies,
    adjusted_velocity,
    adjusting_step,
)

# an ocean of 4 km at mid-latitude, north and south, in SI
LAYER = {"gravity": 9.81, "depth": 4000.0}
C = math.sqrt(9.81 * 4000)
HEMISPHERES = [1e-4, -1e-4]


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_one_third_of_the_released_energy_stays_with_the_adjusted_step(f0: float) -> None:
    keys = {"eta0": 0.3, **LAYER, "f0": f0}
    # source: Rossby 1938; Gill 1982, section 7.2; tolerance: rounding
    assert adjusted_energies(**keys).kinetic_share == pytest.approx(1 / 3, rel=1e-14)
    a, half = C / 1e-4, 3 * C / 1e-4
    energies = adjusted_energies(**keys, within=half)
    kinetic = 2 * quad(lambda x: 4000 / 2 * float(adjusted_velocity(x, **keys)) ** 2, 0, half, epsabs=0)[0]
    released = 2 * quad(lambda x: 9.81 / 2 * (0.09 - float(adjusted_elevation(x, **keys)) ** 2), 0, half, epsabs=0)[0]
    # the quadrature promises 1.5e-8
    assert energies.kinetic == pytest.approx(kinetic, rel=1.5e-8)
    assert energies.released_potential == pytest.approx(released, rel=1.5e-8)
    # 3/2 and 1/2 of g eta0^2 a over the whole line
    assert adjusted_energies(**keys).kinetic == pytest.approx(9.81 * 0.09 * a / 2, rel=1e-14)


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_the_adjusted_step_is_geostrophic_and_keeps_its_potential_vorticity(f0: float) -> None:
    keys = {"eta0": 0.3, **LAYER, "f0": f0}
    a = C / 1e-4
    x, d = np.linspace(-5, 5, 40) * a, 1e-3 * a
    slope = (adjusted_elevation(x + d, **keys) - adjusted_elevation(x - d, **keys)) / (2 * d)
    turning = (adjusted_velocity(x + d, **keys) - adjusted_velocity(x - d, **keys)) / (2 * d)
    # centred differences of exp(-x/a): (d/a)^2/6 = 2e-7
    np.testing.assert_allclose(f0 * adjusted_velocity(x, **keys), 9.81 * slope, rtol=2e-7)
    start = -f0 / 4000 * 0.3 * np.sign(x)
    np.testing.assert_allclose(turning - f0 / 4000 * adjusted_elevation(x, **keys), start, rtol=2e-7)


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_the_adjusting_step_obeys_the_linear_equations(f0: float) -> None:
    keys = {"eta0": 0.3, **LAYER, "f0": f0}
    a, T = C / 1e-4, 1e4
    x, t = np.array([-3.2, -1.0, -0.3, 0.2, 0.9, 2.5]) * a, 4.3 * T
    dx, dt = 1e-3 * a, 1e-3 * T

    def slope(of: int, along: str) -> Any:
        if along == "t":
            return (adjusting_step(x, t + dt, **keys)[of] - adjusting_step(x, t - dt, **keys)[of]) / (2 * dt)
        return (adjusting_step(x + dx, t, **keys)[of] - adjusting_step(x - dx, t, **keys)[of]) / (2 * dx)

    u, v, _ = adjusting_step(x, t, **keys)
    # centred differences: third derivatives of swings of frequency up to some f t/sqrt(t^2 - s^2) = 1.5 f, (1e-3)^2/2
    speed = 0.3 * C / 4000
    np.testing.assert_allclose(slope(0, "t") - f0 * v + 9.81 * slope(2, "x"), 0, atol=2e-6 * 1e-4 * speed)
    np.testing.assert_allclose(slope(1, "t") + f0 * u, 0, atol=2e-6 * 1e-4 * speed)
    np.testing.assert_allclose(slope(2, "t") + 4000 * slope(0, "x"), 0, atol=2e-6 * 1e-4 * 0.3)


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_the_adjusting_step_starts_at_rest_and_ends_in_the_adjusted_one(f0: float) -> None:
    keys = {"eta0": 0.3, **LAYER, "f0": f0}
    a = C / 1e-4
    x = np.array([-2.0, -0.5, 0.5, 1.0]) * a
    u, v, eta = adjusting_step(x, 0.0, **keys)
    np.testing.assert_array_equal([u, v, eta], [0 * x, 0 * x, 0.3 * np.sign(x)])
    # ahead of the front nothing has happened
    assert [float(part[0]) for part in adjusting_step(x, 1.9e4, **keys)] == [0, 0, -0.3]
    u, v, eta = adjusting_step(x, 4000e4, **keys)
    # source: Gill 1982, section 7.3: the wake dies as (f t)^-1/2, here sqrt(2/(pi 4000)) = 0.0127 of g eta0/c
    assert np.abs(u).max() < 0.0127 * 0.3 * 9.81 / C
    np.testing.assert_allclose(v, adjusted_velocity(x, **keys), rtol=0, atol=0.0127 * 0.3 * 9.81 / C)
    np.testing.assert_allclose(eta, adjusted_elevation(x, **keys), rtol=0, atol=0.0127 * 0.3)


def test_the_current_left_by_a_step_has_the_high_side_on_its_right_in_the_north() -> None:
    # eta rises eastward: northward flow in the north (high on the right), southward in the south
    assert float(adjusted_velocity(0.0, eta0=0.3, **LAYER, f0=1e-4)) > 0
    assert float(adjusted_velocity(0.0, eta0=0.3, **LAYER, f0=-1e-4)) < 0
