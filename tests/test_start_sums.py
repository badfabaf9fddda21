"""Starts from formulas and objects of one's own, their sums, and what is refused."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from basins import (
    divergence,
    equations,
    largest,
    make_basin,
    read,
    refusal,
    start,
)
from numpy.typing import NDArray
from pydantic import ValidationError

from swmodel.state.starts import (
    Bump,
    Front,
    Jet,
    KelvinWave,
    Rest,
    Step,
    Vortex,
)

Array = NDArray[np.float64]


# --------------------------------------------------------------------------------------------------------- formulas


def test_a_formula_is_evaluated_at_the_points_of_its_own_variable() -> None:
    basin = make_basin("box")
    part = read("formula", eta="0.1*x/Lx", u="1e-6*x*(y - Ly)", v="1e-7*(x + 2*y)", at=["10 km", "-5 km"])
    u, v, eta = part.fields(basin)
    for field, location, closed in (
        (eta, "centre", lambda x, y: 0.1 * x / 600e3 + 0 * y),
        (u, "u", lambda x, y: 1e-6 * x * (y - 400e3)),
        (v, "v", lambda x, y: 1e-7 * (x + 2 * y)),
    ):
        x, y = basin.grid.points(location)  # type: ignore[arg-type]
        # the same arithmetic
        np.testing.assert_allclose(field, closed(x - 10e3, y + 5e3), rtol=1e-13, atol=1e-13)


def test_every_fault_of_every_part_comes_at_once_with_its_place() -> None:
    faults = refusal(
        make_basin("periodic"),
        read("formula", eta="1/(x - x)", u="log(-1 + 0*x)"),
        Vortex(profile="gaussian", speed=1.0, radius=4e4),
        KelvinWave(amplitude=0.1, waves=1, edge="north"),
    )
    assert [fault.key for fault in faults] == [
        ("start", 0, "u"),
        ("start", 0, "eta"),
        ("start", 1, "profile"),
        ("start", 2, "edge"),
    ]


@pytest.mark.parametrize(
    ("kind", "keys"),
    [
        ("front", {"amplitude": 0.1, "width": 0}),
        ("bump", {"amplitude": 0.1, "radius": "-1 km"}),
        ("vortex", {"profile": "square", "speed": 1, "radius": 1e4}),
        ("kelvin_wave", {"amplitude": 0.1, "waves": 0, "edge": "south"}),
        ("jet", {"speed": 1, "width": 1e4, "perturbation": {"size": 0.1}}),
        ("step", {"amplitude": "1 s"}),
        ("rest", {"at": [0, 0]}),
        ("swirl", {}),
    ],
)
def test_impossible_values_are_refused_when_they_are_read(kind: str, keys: dict[str, Any]) -> None:
    with pytest.raises(ValidationError):
        read(kind, **keys)


# -------------------------------------------------------------------------------------------------------------- sums


def test_no_part_is_rest() -> None:
    basin = make_basin()
    for made in (start(basin), start(basin, Rest())):
        assert largest(made.u, made.v, made.eta) == 0
        assert made.cautions == []


def test_balanced_parts_are_balanced_as_one_flow_and_the_others_are_added_as_they_are() -> None:
    basin = make_basin("box", cells=(48, 48), size=(800e3, 800e3))
    pair = [
        Vortex(profile="shielded", speed=2.0, radius=50e3, at=(place, 0), balance="gradient") for place in (-4e4, 4e4)
    ]
    still = Step(amplitude=0.3)
    whole = start(basin, pair[0], still, pair[1])
    alone = [start(basin, part) for part in pair]
    # the flow is the sum of flows, to round-off; a step brings none
    np.testing.assert_allclose(whole.u, alone[0].u + alone[1].u, rtol=0, atol=1e-14)
    # the elevation is not the sum of elevations: the flow of each turns in that of the other
    difference = whole.eta - still.fields(basin)[2] - alone[0].eta - alone[1].eta
    assert largest(difference) > 0.05 * largest(alone[0].eta)
    # without the step nothing of the tendency diverges
    rates = equations(basin)(whole.u, whole.v, whole.eta - still.fields(basin)[2], False)
    single = equations(basin)(alone[0].u, alone[0].v, 0 * alone[0].eta, False)
    # round-off of the last correction of eta against what it holds
    assert largest(divergence(*rates[:2], basin.grid)) < 1e-9 * largest(divergence(*single[:2], basin.grid))


def test_a_front_and_a_jet_are_balanced_together() -> None:
    basin = make_basin("channel along x", cells=(24, 80), size=(240e3, 800e3))
    front = Front(amplitude=0.2, width=60e3, along="y", balance="geostrophic", at=-50e3)
    jet = Jet(speed=0.5, width=60e3, at=60e3)
    whole, first, second = start(basin, front, jet), start(basin, front), start(basin, jet)
    # the linear equations add up, to round-off of the transforms
    for name in ("u", "v", "eta"):
        one, other = getattr(whole, name), getattr(first, name) + getattr(second, name)
        np.testing.assert_allclose(one, other, rtol=0, atol=1e-13)


def test_parts_that_ask_for_different_balances_are_refused() -> None:
    parts = [
        Jet(speed=1.0, width=50e3, balance="gradient"),
        Bump(amplitude=0.1, radius=50e3),
        Vortex(profile="shielded", speed=1.0, radius=40e3),
    ]
    (fault,) = refusal(make_basin("box"), *parts)
    assert str(fault) == (
        'start.2.balance: "geostrophic", and start.0 has "gradient"; balanced parts are one flow and share one word; '
        '"none" goes with either; "gradient" here too, or "geostrophic" there'
    )


def test_a_bump_keeps_its_volume_when_it_is_balanced() -> None:
    basin = make_basin("box")
    free = start(basin, Bump(amplitude=0.3, radius=60e3))
    for balance in ("geostrophic", "gradient"):
        held = start(basin, Bump(amplitude=0.3, radius=90e3, balance=balance))
        wider = start(basin, Bump(amplitude=0.3, radius=90e3))
        assert held.eta.mean() == pytest.approx(wider.eta.mean(), rel=1e-12)  # round-off
        # eta is seen through the means between centres and corners: (dx^2 + dy^2)/4 of its Laplacian, 2/radius^2
        allowed = 0.3 * 2 / 90e3**2 * (basin.grid.dx**2 + basin.grid.dy**2) / 4
        assert largest(held.eta - wider.eta) < allowed
    assert free.eta.max() > 0


# ----------------------------------------------------------------------------------------------------- of one's own


class Spike:
    """A start of one's own."""

    def __init__(self, height: float, shape: tuple[int, int] | None = None) -> None:
        self.height, self.shape = height, shape

    def fields(self, basin: Any) -> tuple[Array, Array, Array]:
        grid = basin.grid
        eta = np.zeros(self.shape or grid.shape("centre"))
        eta[0, 0] = self.height
        return np.zeros(grid.shape("u")), np.zeros(grid.shape("v")), eta


def test_an_object_of_ones_own_is_added_as_it_is() -> None:
    made = start(make_basin("box"), Spike(0.3), Step(amplitude=0.1, along="y"))
    assert made.eta[0, 0] == 0.3 - 0.1
    assert made.eta[0, 1] == -0.1


def test_an_object_of_ones_own_that_does_not_fit_is_refused() -> None:
    (shape,) = refusal(make_basin("box"), Rest(), Spike(0.3, (3, 4)))
    assert str(shape) == "start.1: its eta has the shape [3, 4]; [18, 24], y first"
    (value,) = refusal(make_basin("box"), Spike(math.inf))
    assert str(value) == "start.0: its eta is not finite everywhere; every value must be finite"
