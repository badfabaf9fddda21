"""Starts that are waves: modes of the grid at theory's own frequency, and which way they go."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from basins import (
    HEMISPHERES,
    equations,
    largest,
    make_basin,
    refusal,
    start,
    uneven_depth,
)
from numpy.typing import NDArray

from swmodel.state.starts import (
    KelvinWave,
    PoincareWave,
    RossbyWave,
)
from swmodel.theory.waves import inertia_gravity_frequency, kelvin_direction, kelvin_frequency, rossby_phase_speed

Array = NDArray[np.float64]


@pytest.mark.parametrize("edges", ["periodic", "channel along x", "channel along y"])
@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
@pytest.mark.parametrize("waves", [(1, 1), (2, 1), (1, 3), (-2, 1), (3, 2), (0, 2)])
def test_a_poincare_start_is_one_mode_of_the_grid_and_travels_the_way_it_says(
    edges: str, f0: float, waves: tuple[int, int]
) -> None:
    basin = make_basin(edges, f0=f0)
    part = PoincareWave(amplitude=0.2, waves=waves, phase=0.4)
    if edges == "channel along y" and waves[0] < 1:
        (fault,) = refusal(basin, part)
        assert str(fault) == (
            f"start.0.waves: {waves[0]} half waves between the walls along x; a whole number from 1 on"
        )
        return
    rates, made = equations(basin), start(basin, part)
    state = made.u, made.v, made.eta
    once = rates(*state, True)
    twice = rates(*once, True)
    arguments = part.theory_arguments(basin)
    # theory's own C-grid frequency: Arakawa & Lamb 1977
    omega = inertia_gravity_frequency(
        9.81, 200.0, f0, float(arguments["k"]), float(arguments["l"]), basin.grid.dx, basin.grid.dy, on_grid=True
    )
    for field, change in zip(state, twice, strict=True):
        # two tendencies, each some ten roundings of terms up to omega_max = 4 c/dx of 3e-3 against omega of 6e-4
        np.testing.assert_allclose(change, -(omega**2) * field, rtol=0, atol=1e-12 * omega**2 * largest(*state))
    # energy goes toward (m, n): the flux g eta u, along x or, where that is a standing wave, y
    flux_x = (made.eta * (made.u[:, 1:] + made.u[:, :-1])).mean()
    flux_y = (made.eta * (made.v[1:] + made.v[:-1])).mean()
    scale = 1e-12 * largest(made.eta) * largest(made.u, made.v)  # round-off of the mean
    if edges != "channel along y":
        assert np.sign(flux_x) == np.sign(waves[0]) or (waves[0] == 0 and abs(flux_x) <= scale)
    if edges != "channel along x":
        assert np.sign(flux_y) == np.sign(waves[1])


@pytest.mark.parametrize("edge", ["west", "east", "south", "north"])
@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
def test_a_kelvin_start_hugs_its_wall_and_goes_with_the_coast_on_its_right_in_the_north(edge: Any, f0: float) -> None:
    along_y = edge in ("west", "east")
    basin = make_basin("channel along y" if along_y else "channel along x", f0=f0)
    grid = basin.grid
    part = KelvinWave(amplitude=0.2, waves=2, edge=edge, phase=0.3)
    rates, made = equations(basin), start(basin, part)
    state = made.u, made.v, made.eta
    twice = rates(*rates(*state, True), True)
    keys: dict[str, Any] = part.theory_arguments(basin)
    omega = kelvin_frequency(9.81, 200.0, f0, dx=grid.dx, dy=grid.dy, on_grid=True, **keys)
    for field, change in zip(state, twice, strict=True):
        # as above
        np.testing.assert_allclose(change, -(omega**2) * field, rtol=0, atol=1e-12 * omega**2 * largest(*state))
    assert largest(made.u if along_y else made.v) == 0
    # it falls off from its wall
    by_line = np.abs(made.eta).max(axis=0 if along_y else 1)
    slopes = np.diff(by_line if edge in ("west", "south") else by_line[::-1])
    assert (slopes < 0).all()
    # coast on the right where f > 0, on the left where f < 0: Thomson 1879
    right_of_travel = {"south": 1, "east": 1, "north": -1, "west": -1}[edge]
    flow = (made.v[1:] + made.v[:-1]) if along_y else (made.u[:, 1:] + made.u[:, :-1])
    assert np.sign((made.eta * flow).mean()) == right_of_travel * np.sign(f0) == kelvin_direction(f0, edge)


def test_an_equatorial_kelvin_start_leans_on_the_equator_and_goes_east() -> None:
    basin = make_basin("channel along x", cells=(64, 60), size=(8000e3, 6000e3), f0=0, beta=2.3e-11, plane="equatorial")
    made = start(basin, KelvinWave(amplitude=0.2, waves=2))
    assert largest(made.v) == 0
    c = math.sqrt(9.81 * 200)
    by_row = np.abs(made.eta).max(axis=1)
    # eta falls off as exp(-beta y^2/(2 c)): Matsuno 1966
    np.testing.assert_allclose(
        by_row / by_row.max(), np.exp(-2.3e-11 * (basin.grid.y**2 - 50e3**2) / (2 * c)), rtol=1e-12, atol=0
    )
    assert (made.eta * (made.u[:, 1:] + made.u[:, :-1])).mean() > 0


@pytest.mark.parametrize(
    ("edges", "keys", "message"),
    [
        ("channel along x", {}, 'edge: it is missing; "west", "east", "south" or "north": the wall it leans on'),
        (
            "periodic",
            {"edge": "south"},
            'edge: south is periodic; a Kelvin wave leans on a wall; south = "wall"',
        ),
        (
            "box",
            {"edge": "south"},
            "kind: walls at west and east stop it; whole wavelengths go round; periodic west and east",
        ),
    ],
)
def test_a_kelvin_wave_needs_a_wall_to_lean_on_and_a_way_round(edges: str, keys: Any, message: str) -> None:
    (fault,) = refusal(make_basin(edges), KelvinWave(amplitude=0.1, waves=1, **keys))
    assert str(fault) == f"start.0.{message}"


def test_on_the_equatorial_plane_a_kelvin_wave_has_no_edge() -> None:
    basin = make_basin("channel along x", f0=0, beta=2e-11, plane="equatorial")
    (fault,) = refusal(basin, KelvinWave(amplitude=0.1, waves=1, edge="south"))
    assert str(fault) == 'start.0.edge: "south", on the equatorial plane; there it leans on the equator: no edge'


@pytest.mark.parametrize("f0", HEMISPHERES.values(), ids=HEMISPHERES)
@pytest.mark.parametrize("edges", ["channel along x", "periodic"])
@pytest.mark.parametrize("balance", ["none", "geostrophic", "gradient"])
def test_a_rossby_start_is_geostrophic_and_its_vorticity_goes_west(f0: float, edges: str, balance: Any) -> None:
    # a deep layer: the wave is short against the deformation radius, and c = -beta/(k^2 + l^2) in the limit
    basin = make_basin(edges, cells=(96, 64), f0=f0, beta=2e-11, plane="beta", depth=4000.0)
    part = RossbyWave(amplitude=0.05, waves=(2, 1), balance=balance)
    made = start(basin, part)
    grid = basin.grid
    x, y = grid.points("centre")
    k, l = part.theory_arguments(basin)["k"], part.theory_arguments(basin)["l"]  # noqa: E741
    if edges == "periodic":
        expected = 0.05 * np.cos(k * x + l * y)
    else:
        expected = 0.05 * np.sin(l * (y + grid.Ly / 2)) * np.cos(k * x)
    # beta Ly/f0 is 8 %, the elevation that holds the same flow differs by that share at most
    np.testing.assert_allclose(made.eta, expected, rtol=0, atol=0.05 * 0.08)
    du, dv, _deta = equations(basin)(made.u, made.v, made.eta, True)
    inner = slice(8, -8)  # where f of a periodic domain has no seam
    zeta = (np.diff(made.v, axis=1)[1:-1] / grid.dx - np.diff(made.u, axis=0)[:, 1:-1] / grid.dy)[inner]
    change = (np.diff(dv, axis=1)[1:-1] / grid.dx - np.diff(du, axis=0)[:, 1:-1] / grid.dy)[inner]
    slope = np.gradient(zeta, grid.dx, axis=1)
    speed = -(change * slope).sum() / (slope * slope).sum()
    assert speed < 0
    # the wavelengths are far below 2 pi a = 12 000 km: 1/a^2 adds under 1 %; differences of the grid another
    assert speed == pytest.approx(rossby_phase_speed(9.81, 4000.0, f0, 2e-11, float(k), float(l)), rel=0.03)


def test_waves_between_walls_all_round_or_without_a_wavelength_are_refused() -> None:
    (box,) = refusal(make_basin("box"), PoincareWave(amplitude=0.1, waves=(1, 1)))
    assert str(box) == (
        "start.0.kind: plane waves have no closed form between walls all round; one periodic direction or two"
    )
    (none,) = refusal(make_basin(), PoincareWave(amplitude=0.1, waves=(0, 0)))
    assert str(none) == "start.0.waves: [0, 0] is no wave; at least one of them other than 0"
    (equator,) = refusal(
        make_basin("channel along x", f0=0, beta=2e-11, plane="equatorial"),
        RossbyWave(amplitude=0.1, waves=(1, 1), balance="none"),
    )
    assert str(equator) == "start.0.kind: its flow is g eta/f0, and f0 is 0; a plane with f0, such as beta"
    (across,) = refusal(make_basin("channel along x"), PoincareWave(amplitude=0.1, waves=(1, 1), at=(0, 1e3)))
    assert str(across) == ("start.0.at: y = 1000 m; 0 along y: between walls the pattern is fixed by them")


def test_the_phase_of_a_wave_counts_from_its_place() -> None:
    basin = make_basin("periodic", cells=(16, 16), size=(2.0**19, 2.0**19))
    middle = PoincareWave(amplitude=0.1, waves=(2, 1)).fields(basin)
    moved = PoincareWave(amplitude=0.1, waves=(2, 1), at=(2.0**15, 2.0**16)).fields(basin)
    # one cell along x, two along y; round-off of the phase
    np.testing.assert_allclose(np.roll(middle[2], (2, 1), (0, 1)), moved[2], rtol=0, atol=1e-14)


def test_a_wave_over_uneven_depth_or_varying_f_is_cautioned() -> None:
    cells = (24, 18)
    sloping = make_basin("channel along x", cells=cells, depth=uneven_depth(cells), beta=2e-11, plane="beta")
    depth, turning = start(sloping, PoincareWave(amplitude=0.1, waves=(1, 1))).cautions
    assert depth.startswith("start.0: the poincare wave is laid out for an even depth; here it varies by 80 % of the ")
    # 400 km of beta over f0
    assert turning.startswith("start.0: the poincare wave is laid out for an even f; here it varies by 8 % of f0; ")
