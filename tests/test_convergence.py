"""Observed order in space and time on a smooth nonlinear flow over uneven depth, toward an independent solution."""

from __future__ import annotations

import math
from functools import cache

import numpy as np
import pytest
from flows import UNEVEN, Combination, equations_of, make_basin, plain_of, plain_run, run

from swmodel.dynamics import PV_FLUXES
from swmodel.steppers import STEPPERS

LX, LY = 2 * math.pi, 1.6 * math.pi
GRAVITY = 1.0
UNTIL = 0.5


def depth(x, y):
    return 1 + 0.2 * np.cos(x - 0.4) * np.cos(2 * np.pi * y / LY)


def coriolis(x, y):
    return 1 + 0.3 * np.sin(x) + 0.4 * np.cos(2 * np.pi * y / LY)


def start_u(x, y):
    return 0.15 * np.sin(x + 0.3) * np.cos(2 * np.pi * y / LY) + 0.05


def start_v(x, y):
    return 0.15 * np.cos(x) * np.sin(2 * np.pi * y / LY + 0.5)


def start_eta(x, y):
    return 0.1 * np.cos(x + 2 * np.pi * y / LY) + 0.0 * x * y


@cache
def spectral_solution(n: int = 40, steps: int = 100):
    """Fourier coefficients of u, v, eta at the end, by a pseudo-spectral method in advective form.

    Nothing in common with the scheme under test: du/dt = -u du/dx - v du/dy + f v - g deta/dx and so on, derivatives
    exact for every wave (Gottlieb & Orszag 1977), classical Runge-Kutta in time.
    """
    x, y = np.arange(n)[None, :] * LX / n, np.arange(n)[:, None] * LY / n
    k = 2j * np.pi * np.fft.fftfreq(n, LX / n)[None, :]
    m = 2j * np.pi * np.fft.fftfreq(n, LY / n)[:, None]
    H, f = depth(x, y), coriolis(x, y)

    def slope(a, number):
        return np.fft.ifft2(number * np.fft.fft2(a)).real

    def rates(state):
        u, v, eta = state
        h = H + eta
        return np.array(
            [
                f * v - u * slope(u, k) - v * slope(u, m) - GRAVITY * slope(eta, k),
                -f * u - u * slope(v, k) - v * slope(v, m) - GRAVITY * slope(eta, m),
                -slope(h * u, k) - slope(h * v, m),
            ]
        )

    state = np.array([start_u(x, y), start_v(x, y), start_eta(x, y)])
    dt = UNTIL / steps
    for _ in range(steps):
        k1 = rates(state)
        k2 = rates(state + dt / 2 * k1)
        k3 = rates(state + dt / 2 * k2)
        k4 = rates(state + dt * k3)
        state = state + dt / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
    return np.fft.fft2(state) / n**2


def truth(basin):
    """The spectral solution at the points of u, v and eta."""
    found = []
    for coefficients, location in zip(spectral_solution(), ("u", "v", "centre"), strict=True):
        n = coefficients.shape[0]
        number = np.fft.fftfreq(n, 1 / n)
        x, y = basin.grid.points(location)
        along_x = np.exp(2j * np.pi * number[:, None] * x / LX)
        along_y = np.exp(2j * np.pi * y * number[None, :] / LY)
        found.append((along_y @ coefficients @ along_x).real)
    return found


def on_grid(n, coriolis=coriolis, depth=depth):
    """Basin of n by n cells, dx != dy, and the start on it."""
    basin = make_basin(n, n, LX / n, LY / n, gravity=GRAVITY, depth=depth, f=coriolis)
    starts = zip((start_u, start_v, start_eta), ("u", "v", "centre"), strict=True)
    return basin, tuple(start(*basin.grid.points(location)) for start, location in starts)


def error(found, expected):
    """Root of the mean square over all points of u, v, eta."""
    return math.sqrt(np.mean(np.concatenate([np.ravel(a - b) for a, b in zip(found, expected, strict=True)]) ** 2))


def test_the_spectral_solution_is_converged():
    x, y = np.linspace(0, LX, 7)[None, :], np.linspace(0, LY, 7)[:, None]

    def at_points(coefficients):
        number = np.fft.fftfreq(coefficients.shape[-1], 1 / coefficients.shape[-1])
        along_x, along_y = np.exp(2j * np.pi * number[:, None] * x / LX), np.exp(2j * np.pi * y * number / LY)
        return (along_y @ coefficients @ along_x).real

    # some thousand times less than the errors below
    assert np.abs(at_points(spectral_solution()) - at_points(spectral_solution(32, 70))).max() < 1e-8


@pytest.mark.parametrize("name", PV_FLUXES)
def test_every_flux_converges_at_second_order_toward_a_spectral_solution(name):
    of = Combination(name, "uneven", "field", False, "double")
    errors = []
    for n in (32, 64):
        basin, fields = on_grid(n)
        errors.append(error(plain_run(plain_of(basin, of), fields, "rk4", UNTIL / 24, 24), truth(basin)))
    # the next term of the error is of order 4: (2 pi/32)^2 = 4 % of the first, and 1 % of that is left in the order
    assert math.log2(errors[0] / errors[1]) == pytest.approx(2, abs=0.02)


@pytest.mark.parametrize("stepper", STEPPERS)
def test_every_stepper_converges_at_its_order_in_time(stepper):
    basin, fields = on_grid(16)
    equations = equations_of(basin, UNEVEN)
    # the same grid with a step so short that only round-off is left
    exact = run(equations, fields, "rk4", UNTIL / 1600, 1600)
    # without filter: with it leapfrog has no such claim
    errors = [error(run(equations, fields, stepper, UNTIL / n, n, 0.0, 1.0), exact) for n in (10, 20, 40)]

    claim = STEPPERS[stepper].order
    # the next order makes up some per cent at these steps
    assert math.log2(errors[1] / errors[2]) == pytest.approx(claim, abs=0.1)
