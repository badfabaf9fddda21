"""Flows found for a given elevation: bumps and fronts, against the geostrophic and the gradient wind."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from basins import HEMISPHERES, F, equations, largest, make_basin, start

from swmodel.errors import RequestError
from swmodel.state.starts import Bump, Front, Jet, Vortex


@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
@pytest.mark.parametrize("amplitude", [0.3, -0.8])
def test_a_bump_in_gradient_balance_turns_at_the_gradient_wind(f0: float, amplitude: float) -> None:
    # V = -f r/2 + sign(f) sqrt(f^2 r^2/4 + g r deta/dr), the root that is geostrophic for weak slopes: Gill 1982
    radius = 60e3
    r = np.linspace(1e3, 300e3, 3000)
    slope = -amplitude * r / radius**2 * np.exp(-(r**2) / (2 * radius**2))
    gradient_wind = -f0 * r / 2 + np.sign(f0) * np.sqrt((f0 * r) ** 2 / 4 + 9.81 * r * slope)
    expected = gradient_wind[np.argmax(np.abs(gradient_wind))]
    errors = []
    for n in (64, 128):
        basin = make_basin("box", cells=(n, n), size=(640e3, 640e3), f0=f0)
        made = start(basin, Bump(amplitude=amplitude, radius=radius, balance="gradient"))
        east_of_middle = made.v[n // 2, n // 2 :]
        found = east_of_middle[np.argmax(np.abs(east_of_middle))]
        errors.append(abs(found / expected - 1))
        assert made.eta.mean() == pytest.approx(Bump(amplitude=amplitude, radius=radius).fields(basin)[2].mean())
    assert np.sign(found) == np.sign(expected) == -np.sign(f0 * amplitude)
    # second order, the largest value falling between grid points: 12 cells a radius
    assert errors[1] < 0.01
    assert errors[1] < errors[0]


def test_a_high_steeper_than_any_gradient_wind_is_refused_and_one_just_under_is_not() -> None:
    # amplitude f^2 radius^2/(4 g) at most: the discriminant f^2 r^2/4 + g r deta/dr at the middle
    basin = make_basin("box", cells=(96, 96), size=(640e3, 640e3))
    radius = 60e3
    limit = (F * radius) ** 2 / (4 * 9.81)
    start(basin, Bump(amplitude=0.95 * limit, radius=radius, balance="gradient"))
    with pytest.raises(RequestError) as refused:
        start(basin, Bump(amplitude=1.3 * limit, radius=radius, balance="gradient"))
    (fault,) = refused.value.faults
    assert fault.found == "no flow was found that holds this elevation in gradient balance"
    assert fault.allowed == (
        "round a high the slope of the surface must stay under f^2 r/(4 g), r the distance from its middle; "
        "beside a front the shear must stay under f"
    )


@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
@pytest.mark.parametrize("along", ["x", "y"])
@pytest.mark.parametrize("balance", ["geostrophic", "gradient"])
def test_a_front_is_balanced_by_the_flow_along_it(f0: float, along: Any, balance: Any) -> None:
    # f v = g deta/dx, f u = -g deta/dy; a straight flow has no centrifugal force
    edges = "channel along y" if along == "x" else "channel along x"
    basin = make_basin(edges, cells=(100, 100), size=(800e3, 800e3), f0=f0)
    made = start(basin, Front(amplitude=0.3, width=80e3, along=along, balance=balance))
    flow = made.v if along == "x" else -made.u
    # 10 cells a width: the largest slope is met to (dx/width)^2 times a number of order 1
    assert flow[np.unravel_index(np.argmax(abs(flow)), flow.shape)] == pytest.approx(9.81 * 0.3 / 80e3 / f0, rel=0.02)
    assert made.cautions == []
    du, dv, deta = equations(basin)(made.u, made.v, made.eta, balance == "geostrophic")
    # nothing varies along the front, so that nothing is left but round-off: of f v, and of the last correction
    assert largest(du, dv) <= 1e-11 * F * largest(flow)
    assert largest(deta) <= 1e-11 * 200 * largest(flow) / 8e3


@pytest.mark.parametrize("plane", ["none", "equatorial"])
def test_an_elevation_is_not_balanced_where_f_is_or_passes_zero(plane: str) -> None:
    basin = make_basin("channel along x", f0=0.0, beta=2e-11 if plane == "equatorial" else 0.0, plane=plane)
    with pytest.raises(RequestError) as refused:
        start(basin, Bump(amplitude=0.1, radius=60e3, balance="geostrophic" if plane == "equatorial" else "gradient"))
    (fault,) = refused.value.faults
    assert fault.key == ("start", 0, "balance")
    where = "somewhere: it runs from -4e-06 to 4e-06 rad/s" if plane == "equatorial" else "everywhere"
    assert fault.found == f"an elevation is balanced by the flow g eta/f, and f is 0 {where}"


def test_geostrophic_balance_without_rotation_is_refused_with_the_remedy() -> None:
    basin = make_basin(f0=0.0, plane="none")
    with pytest.raises(RequestError) as refused:
        start(basin, Jet(speed=1.0, width=50e3), Vortex(profile="shielded", speed=1.0, radius=40e3))
    assert [fault.key for fault in refused.value.faults] == [("start", 0, "balance"), ("start", 1, "balance")]
    assert str(refused.value.faults[0]) == (
        'start.0.balance: "geostrophic" balance needs rotation, and f is 0 everywhere; balance = "gradient" '
        '(the pressure then holds the flow on its curved way) or "none"'
    )
