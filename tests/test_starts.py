"""The start states: against their closed forms, against theory, and against each other."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from basins import EDGES, EPSILON, F, largest, make_basin, read, refusal, start
from hypothesis import given, settings
from hypothesis import strategies as st
from jsonschema import Draft202012Validator
from numpy.typing import NDArray
from pydantic import TypeAdapter

from swmodel.state import STARTS, StartSettings
from swmodel.state.starts import (
    Bump,
    FormulaStart,
    Front,
    Jet,
    Step,
    Vortex,
)

Array = NDArray[np.float64]

# one example a row, as a configuration has it; those of files are tested in test_given_starts.py
EXAMPLES: dict[str, dict[str, Any]] = {
    "rest": {},
    "step": {"amplitude": "0.5 m", "at": "-10 km"},
    "front": {"amplitude": 0.4, "width": "40 km", "balance": "geostrophic"},
    "bump": {"amplitude": "-20 cm", "radius": "50 km", "at": ["20 km", 0], "balance": "gradient"},
    "vortex": {"profile": "shielded", "speed": "-1 m/s", "radius": "40 km", "at": [0, "-30 km"]},
    "jet": {"speed": 0.5, "width": "40 km", "perturbation": {"size": "5 %", "waves": 2}},
    "poincare_wave": {"amplitude": 0.1, "waves": [1, 2], "phase": "30 deg"},
    "kelvin_wave": {"amplitude": 0.1, "waves": 2, "edge": "south"},
    "rossby_wave": {"amplitude": 0.1, "waves": [2, 1]},
    "formula": {"eta": "0.1 * cos(2*pi*x/Lx)", "u": 0.1, "v": "0.1 * sin(pi * (y/Ly + 0.5))"},
}


# --------------------------------------------------------------------------------------------------------- every row


def test_every_start_has_its_name_its_meaning_and_its_source() -> None:
    assert set(EXAMPLES) | {"file", "run"} == set(STARTS)
    for name, row in STARTS.items():
        assert row.model_fields["kind"].default == name
        assert row.meaning
        assert "\n" not in row.meaning
        assert row.source


@pytest.mark.parametrize("kind", EXAMPLES)
def test_the_schema_takes_what_the_settings_take_and_asks_for_the_kind(kind: str) -> None:
    validator = Draft202012Validator(TypeAdapter(StartSettings).json_schema())
    validator.validate({"kind": kind, **EXAMPLES[kind]})
    assert not validator.is_valid(EXAMPLES[kind])
    assert not validator.is_valid({"kind": kind, **EXAMPLES[kind], "colour": "blue"})


@pytest.mark.parametrize("kind", EXAMPLES)
def test_a_start_written_as_json_reads_back_as_the_same(kind: str) -> None:
    part = read(kind, **EXAMPLES[kind])
    assert TypeAdapter(StartSettings).validate_python(part.model_dump(mode="json")) == part


@pytest.mark.parametrize("edges", EDGES)
@pytest.mark.parametrize("cells", [(24, 18), (32, 1), (1, 16)])
@pytest.mark.parametrize("kind", EXAMPLES)
def test_every_start_is_finite_holds_both_ends_and_flows_through_no_wall(
    kind: str, cells: tuple[int, int], edges: str
) -> None:
    basin = make_basin(edges, cells=cells)
    grid = basin.grid
    part = read(kind, **EXAMPLES[kind])
    closed = {"poincare_wave": "box", "rossby_wave": ("box", "channel along y")}
    if (kind == "kelvin_wave" and edges != "channel along x") or edges in closed.get(kind, ()):
        assert refusal(basin, part)
        return
    made = start(basin, part)
    for field, location in ((made.u, "u"), (made.v, "v"), (made.eta, "centre")):
        assert field.shape == grid.shape(location)
        assert field.dtype == np.float64
        assert np.isfinite(field).all()
    ends = (made.u[:, [0, -1]], grid.periodic_x), (made.v[[0, -1], :].T, grid.periodic_y)
    for end, periodic in ends:
        if periodic:
            np.testing.assert_array_equal(end[:, 0], end[:, 1])
        else:
            assert not end.any()
    assert part.scale(basin) > 0


def test_the_smallest_scale_is_the_one_the_grid_must_resolve() -> None:
    basin = make_basin("channel along x")
    # a = c/|f|; widths and radii; wavelength over 2 pi
    a = math.sqrt(9.81 * 200) / F
    scales = {kind: read(kind, **EXAMPLES[kind]).scale(basin) for kind in EXAMPLES}
    assert scales == pytest.approx(
        {
            "rest": math.inf,
            "step": a,
            "front": 40e3,
            "bump": 50e3,
            "vortex": 40e3,
            "jet": 40e3,
            "poincare_wave": 1 / math.hypot(2 * math.pi / 600e3, 2 * math.pi / 400e3),
            "kelvin_wave": 600e3 / (4 * math.pi),
            "rossby_wave": 1 / math.hypot(4 * math.pi / 600e3, math.pi / 400e3),
            "formula": a,
        },
        rel=10 * EPSILON,
    )
    assert read("jet", speed=1, width=4e5, perturbation={"size": 0.1, "waves": 3}).scale(basin) == pytest.approx(
        600e3 / (6 * math.pi)
    )


# ------------------------------------------------------------------------------------------------------ closed forms


def test_step_front_and_bump_have_their_closed_forms_at_rest() -> None:
    basin = make_basin("box")
    x, y = basin.grid.points("centre")
    r2 = (x - 2e4) ** 2 + (y + 1e4) ** 2
    expected = {
        Step(amplitude=0.5, at=1e4): 0.5 * np.sign(x - 1e4) + 0 * y,
        Step(amplitude=0.5, along="y"): 0.5 * np.sign(y) + 0 * x,
        Front(amplitude=-0.3, width=3e4, at=1e4): -0.3 * np.tanh((x - 1e4) / 3e4) + 0 * y,
        Front(amplitude=0.3, width=3e4, along="y"): 0.3 * np.tanh(y / 3e4) + 0 * x,
        Bump(amplitude=0.2, radius=5e4, at=(2e4, -1e4)): 0.2 * np.exp(-r2 / (2 * 5e4**2)),
    }
    for part, eta in expected.items():
        made = start(basin, part)
        # the same arithmetic
        np.testing.assert_allclose(made.eta, eta, rtol=1e-14, atol=0)
        assert largest(made.u, made.v) == 0
        assert made.cautions == []


@pytest.mark.parametrize("profile", ["shielded", "gaussian"])
@pytest.mark.parametrize("speed", [1.5, -1.5])
def test_a_vortex_turns_as_fast_as_it_says_where_it_says(profile: Any, speed: float) -> None:
    radius, n = 50e3, 128
    basin = make_basin("box", cells=(n, n), size=(1600e3, 1600e3))
    u, v, _eta = Vortex(profile=profile, speed=speed, radius=radius).fields(basin)
    s = basin.grid.x / radius
    if profile == "shielded":
        expected = speed * s * np.exp((1 - s**2) / 2)
    else:  # 1.256 and 1.398 as textbooks round them: Lamb 1932, sec. 334a
        expected = 1.398 * speed / s * (1 - np.exp(-1.2564 * s**2))
    near = abs(s) < 4
    # along the x axis, a row of corners: (dx/radius)^2/24 times the third derivative of the profile, at most
    # 3 sqrt(e) speed, is 1.3 %; the walls, 16 radii away, hold the gaussian one, by its speed there of 9 %, squared
    tolerance = 0.014 + (0.006 if profile == "gaussian" else 0.0)
    np.testing.assert_allclose(v[n // 2, near], expected[near], rtol=0, atol=tolerance * abs(speed))
    # round, to round-off of the walls' hold
    np.testing.assert_allclose(u[:, n // 2], -v[n // 2, :], rtol=0, atol=1e-14)


def test_a_vortex_is_fastest_at_its_radius() -> None:
    basin = make_basin("box", cells=(400, 400), size=(800e3, 800e3))
    for profile in ("shielded", "gaussian"):
        _u, v, _eta = Vortex(profile=profile, speed=1.0, radius=80e3).fields(basin)
        row = v[200, 200:]
        # the grid's own step of 2 km, half of it either way
        assert abs(basin.grid.x[200 + int(np.argmax(row))] - 80e3) <= 1e3
        # (dx/radius)^2 and the walls' hold of the gaussian one, 5 radii away
        assert row.max() == pytest.approx(1.0, abs=0.001 if profile == "shielded" else 0.02)


def test_a_jet_blows_along_its_axis_and_carries_its_wave() -> None:
    for along, edges in (("x", "channel along x"), ("y", "channel along y")):
        basin = make_basin(edges, cells=(120, 120), size=(1200e3, 1200e3))
        grid = basin.grid
        plain = Jet(speed=0.8, width=80e3, along=along, at=50e3)
        u, v, _eta = plain.fields(basin)
        flow, across = (u[:, 0], grid.y) if along == "x" else (v[0, :], grid.x)
        profile = 0.8 / np.cosh((across - 50e3) / 80e3) ** 2
        # (dx/width)^2/24 times the second derivative of sech^2, at most 2
        np.testing.assert_allclose(flow, profile, rtol=0, atol=0.8 * 2 / 24 * (10 / 80) ** 2)
        assert largest(v if along == "x" else u) == 0
        waved = read("jet", speed=0.8, width=80e3, along=along, at=50e3, perturbation={"size": 0.1, "waves": 3})
        w_u, w_v, _eta = waved.fields(basin)
        cross = w_v if along == "x" else w_u
        # v' = dpsi'/dx (or u' = -dpsi'/dy): size speed width (2 pi waves/L) at most, on the axis
        assert largest(cross) == pytest.approx(0.1 * 0.8 * 80e3 * 6 * np.pi / 1200e3, rel=0.01)


def test_a_net_circulation_is_refused_where_the_domain_is_periodic_all_round() -> None:
    vortex = Vortex(profile="gaussian", speed=1.0, radius=40e3)
    (fault,) = refusal(make_basin("periodic"), vortex)
    assert str(fault) == (
        'start.0.profile: a "gaussian" vortex has a net circulation, which a doubly periodic domain cannot hold; '
        'profile = "shielded" there; or walls on two sides'
    )
    for edges in ("channel along x", "channel along y", "box"):
        start(make_basin(edges), vortex)


# ---------------------------------------------------------------------------------------------------- images, walls


@pytest.mark.parametrize(
    ("kind", "balance"),
    [(kind, balance) for kind in ("vortex", "bump") for balance in ("none", "geostrophic")] + [("vortex", "gradient")],
)
@settings(max_examples=5)
@given(i=st.integers(-15, 15), j=st.integers(-15, 15))
def test_in_a_periodic_domain_it_does_not_matter_where_a_start_lies(kind: str, balance: Any, i: int, j: int) -> None:
    # sizes are powers of 2, so that distances are exact
    basin = make_basin("periodic", cells=(16, 16), size=(2.0**19, 2.0**19))
    keys = {"vortex": {"profile": "shielded", "speed": 1.0}, "bump": {"amplitude": -0.2}}[kind]
    middle, moved = (
        start(basin, read(kind, radius=2.0**15, balance=balance, at=[2.0**15 * a, 2.0**15 * b], **keys))
        for a, b in ((0, 0), (i, j))
    )
    shift = (j, i)
    # what comes by transforms is the same to round-off, or to that of the last correction
    tolerance = {"none": 0.0, "geostrophic": 1e-12, "gradient": 1e-11}[balance]
    for one, other in ((middle.u[:, :-1], moved.u[:, :-1]), (middle.v[:-1], moved.v[:-1]), (middle.eta, moved.eta)):
        np.testing.assert_allclose(np.roll(one, shift, (0, 1)), other, rtol=0, atol=tolerance * (largest(one) + 1))


def test_a_vortex_that_meets_its_image_is_cautioned_with_its_speed_there() -> None:
    # half a period is 200 km along y, 4 radii: V = 4 exp((1 - 16)/2) of the largest; 160 km is 3.2 radii
    quiet = start(make_basin(size=(600e3, 400e3)), Vortex(profile="shielded", speed=1.0, radius=50e3))
    assert quiet.cautions == []
    loud = start(make_basin(size=(600e3, 320e3), cells=(60, 64)), Vortex(profile="shielded", speed=1.0, radius=50e3))
    share = 3.2 * math.exp((1 - 3.2**2) / 2)
    assert loud.cautions == [
        "start.0: the vortex meets its own image: half a period away along y its speed is still "
        f"{100 * share:.2g} % of the largest, and only the nearest image is counted; a smaller vortex, or a longer "
        "domain along y"
    ]


def test_a_vortex_by_a_wall_is_cautioned_and_one_far_from_it_is_not() -> None:
    basin = make_basin("channel along x", cells=(60, 40))
    assert start(basin, Vortex(profile="shielded", speed=1.0, radius=40e3)).cautions == []
    (caution,) = start(basin, Vortex(profile="shielded", speed=1.0, radius=40e3, at=(0, 130e3))).cautions
    assert caution.startswith("start.0: a wall bends the flow of the vortex: its streamfunction is held constant")
    assert caution.endswith("% of the largest; move it away from the wall")


def test_a_jet_in_a_periodic_domain_loses_its_mean_flow_where_it_is_balanced_and_keeps_it_where_not() -> None:
    basin = make_basin("periodic", cells=(60, 80))
    width = 40e3
    mean = 2 * width / basin.grid.Ly * math.tanh(basin.grid.Ly / 2 / width)  # of speed sech^2 over the period
    kept = start(basin, Jet(speed=1.0, width=width, balance="none"))
    assert kept.u.mean() == pytest.approx(mean, rel=1e-12)  # round-off of a mean
    assert kept.cautions == []
    lost = start(basin, Jet(speed=1.0, width=width))
    assert abs(lost.u.mean()) < 1e-15
    np.testing.assert_allclose(lost.u + mean, kept.u, rtol=0, atol=1e-14)  # round-off of speeds of 1 m/s
    (caution,) = lost.cautions
    assert caution == (
        "start.0: the mean flow of the jet is taken out, 20 % of the largest speed: along y the domain is periodic, "
        "where no elevation balances a mean flow; walls on either side, or a longer domain along y"
    )


def test_a_balanced_front_in_a_periodic_direction_loses_what_it_rises() -> None:
    basin = make_basin("periodic", cells=(60, 40))
    made = start(basin, Front(amplitude=0.3, width=40e3, balance="geostrophic"))
    assert abs(made.v.mean()) < 1e-14  # round-off
    assert any("the mean flow of the front is taken out" in caution for caution in made.cautions)
    assert start(basin, Front(amplitude=0.3, width=40e3)).cautions == []


def test_a_flow_given_into_a_wall_is_stopped_and_cautioned() -> None:
    made = start(make_basin("channel along x"), FormulaStart(u=0.1, v=0.3))
    assert not made.v[[0, -1]].any()
    assert made.v[1:-1].min() == 0.3
    assert made.cautions == [
        f"start: the flow given at the {wall} wall runs into it, and is set to 0 there; that changes a speed by 100 % "
        "of the largest; give a flow along the wall"
        for wall in ("south", "north")
    ]
