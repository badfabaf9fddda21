"""Balanced vortices of either sign in either hemisphere stay; unbalanced ones do not."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from flows import FULL, equations_of, make_basin, plain_of, watched

from swmodel.state import build_start
from swmodel.state.starts import Vortex

# Rossby and Froude number 0.2 in a domain of 10 deformation radii: five turnovers
SPEED, RADIUS, LENGTH = 0.2, 1.0, 10.0
UNTIL = 5 * 2 * math.pi * RADIUS / SPEED
WHERE = [
    pytest.param(f, turning, id=f"{name} in the {half}")
    for f, half in ((1.0, "north"), (-1.0, "south"))
    for turning, name in ((1, "anticlockwise"), (-1, "clockwise"))
]


def changes(basin, fields):
    """Largest change of eta and of the flow in five turnovers, each over the largest value at the start."""
    eta, speed = np.abs(fields[2]).max() or SPEED, np.abs(fields[0]).max()
    steps = 100 * math.ceil(UNTIL / (0.4 * basin.grid.dx) / 100)
    seen = watched(
        equations_of(basin, FULL),
        fields,
        "ssprk3",
        UNTIL / steps,
        50,
        steps // 50,
        lambda state: (np.abs(state.eta - fields[2]).max() / eta, np.abs(state.u - fields[0]).max() / speed),
    )
    return np.max(seen, axis=0)


def laid_out(n, f, turning, balance):
    """The vortex as a start state lays it out, balanced on the grid itself."""
    basin = make_basin(n, n, LENGTH / n, LENGTH / n, f=f)
    part = Vortex(
        profile="shielded", speed=turning * SPEED, radius=RADIUS, at=(LENGTH / 2, LENGTH / 2), balance=balance
    )
    start = build_start([part], basin, plain_of(basin, FULL).tendency, Path())
    return basin, (start.u, start.v, start.eta)


def in_closed_form(n, f, turning):
    """The vortex of exact gradient-wind balance, f V + V^2/r = g d eta/dr (Gill 1982, section 7.10, g = H = 1).

    V = U (r/R) exp((1 - s)/2), s = r^2/R^2, gives eta = -f U R exp((1 - s)/2) - (U^2/2) exp(1 - s).
    """
    basin = make_basin(n, n, LENGTH / n, LENGTH / n, f=f)
    U = turning * SPEED

    def at(where):
        x, y = (axis - LENGTH / 2 for axis in basin.grid.points(where))
        s = (x**2 + y**2) / RADIUS**2
        return x, y, s, U / RADIUS * np.exp((1 - s) / 2)

    _, y, _, rate = at("u")
    u = -rate * y
    x, _, _, rate = at("v")
    v = rate * x
    _, _, s, rate = at("centre")
    return basin, (u, v, -f * RADIUS**2 * rate - U**2 / 2 * np.exp(1 - s))


@pytest.mark.parametrize(("f", "turning"), WHERE)
def test_a_vortex_in_gradient_wind_balance_stays_as_it_is(f, turning):
    # steady in the continuum; on the grid truncation moves it at second order
    coarse, fine = changes(*in_closed_form(32, f, turning)), changes(*in_closed_form(64, f, turning))
    assert np.all(fine < 0.01)
    # the largest change of a wake that swings: the order is seen to some 0.2
    assert np.all(np.log2(coarse / fine) > 1.8)


@pytest.mark.parametrize(("f", "turning"), WHERE)
def test_a_vortex_balanced_on_the_grid_stays_and_the_same_flow_without_balance_does_not(f, turning):
    # 6 cells a radius: the elevation solves the balance equation on the grid, and what moves is of second order in time
    assert np.all(changes(*laid_out(32, f, turning, "gradient")) < [0.002, 0.006])
    # V^2/r against f V is the Rossby number: what geostrophy leaves out moves the vortex by some 10 %
    assert np.all(changes(*laid_out(32, f, turning, "geostrophic")) > 0.05)
    assert np.all(changes(*laid_out(32, f, turning, "none")) > 0.5)
