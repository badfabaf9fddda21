"""Wave fields against the linear equations, differenced finely, and on the C-grid, where they are exact modes."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from swmodel.errors import RequestError
from swmodel.theory.structures import (
    WaveField,
    channel_poincare_wave,
    channel_rossby_wave,
    equatorial_kelvin_wave,
    kelvin_wave,
    poincare_wave,
    rossby_wave,
)
from swmodel.theory.waves import (
    inertia_gravity_frequency,
    kelvin_direction,
    kelvin_frequency,
    rossby_frequency,
)

Array = NDArray[np.float64]
LAYER = {"gravity": 9.81, "depth": 40.0}
C = math.sqrt(9.81 * 40)
F = 1e-4
HEMISPHERES = [F, -F]
EDGES: list[Any] = ["west", "east", "south", "north"]
# an invented basin: uneven numbers, dx != dy, the origin off its corner
NX, NY, DX, DY, X0, Y0 = 14, 9, 30e3, 20e3, -50e3, 70e3
LX, LY = NX * DX, NY * DY
X_WALLS, Y_WALLS = (X0, X0 + LX), (Y0, Y0 + LY)
K, L = 2 * math.pi / LX, 2 * math.pi / LY

MAKERS: dict[str, Any] = {
    "plane": lambda f0, **grid: poincare_wave(amplitude=0.3, k=2 * K, l=-L, phase=0.4, f0=f0, **LAYER, **grid),
    "plane north": lambda f0, **grid: poincare_wave(amplitude=0.3, k=0.0, l=L, f0=f0, **LAYER, **grid),
    "channel along x": lambda f0, **grid: channel_poincare_wave(
        amplitude=0.3, wavenumber=-2 * K, half_waves=3, walls=Y_WALLS, phase=0.4, f0=f0, **LAYER, **grid
    ),
    "channel along y": lambda f0, **grid: channel_poincare_wave(
        amplitude=0.3, wavenumber=L, half_waves=2, walls=X_WALLS, along="y", phase=0.4, f0=f0, **LAYER, **grid
    ),
    **{
        f"kelvin {edge}": lambda f0, edge=edge, **grid: kelvin_wave(
            amplitude=0.3,
            wavenumber=L if edge in ("west", "east") else K,
            edge=edge,
            wall={"west": X_WALLS[0], "east": X_WALLS[1], "south": Y_WALLS[0], "north": Y_WALLS[1]}[edge],
            phase=0.4,
            f0=f0,
            **LAYER,
            **grid,
        )
        for edge in EDGES
    },
}
WALLS = {"plane": "", "plane north": "", "channel along x": "y", "channel along y": "x"} | {
    f"kelvin {edge}": "x" if edge in ("west", "east") else "y" for edge in EDGES
}


def residuals(wave: WaveField, f: Any, x: Array, y: Array, t: float, d: float, dt: float) -> tuple[Array, Array, Array]:
    """Linear equations at points, by centred differences over 2 d and 2 dt."""

    def slope(field: Any, along: str) -> Array:
        if along == "x":
            return (field(x + d, y, t) - field(x - d, y, t)) / (2 * d)
        if along == "y":
            return (field(x, y + d, t) - field(x, y - d, t)) / (2 * d)
        return (field(x, y, t + dt) - field(x, y, t - dt)) / (2 * dt)

    g, H = LAYER["gravity"], LAYER["depth"]
    return (
        slope(wave.u, "t") - f * wave.v(x, y, t) + g * slope(wave.eta, "x"),
        slope(wave.v, "t") + f * wave.u(x, y, t) + g * slope(wave.eta, "y"),
        slope(wave.eta, "t") + H * (slope(wave.u, "x") + slope(wave.v, "y")),
    )


def points() -> tuple[Array, Array]:
    rng = np.random.default_rng(2)
    return X0 + LX * rng.random(60), Y0 + LY * rng.random(60)


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("name", MAKERS)
def test_a_wave_solves_the_linear_equations(name: str, f0: float) -> None:
    wave = MAKERS[name](f0)
    x, y = points()
    found = residuals(wave, f0, x, y, 5e3, 10.0, 1.0)
    # centred differences: (omega dt)^2/6 = 2.4e-7 at omega = 1.2e-3, (k d)^2/6 less, of terms of the size omega u
    speed = 0.3 * C / 40
    for residual, size in zip(found, (speed, speed, 0.3), strict=True):
        assert np.abs(residual).max() < 1e-6 * abs(wave.omega) * size


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("name", MAKERS)
def test_on_the_grid_a_wave_is_an_exact_mode_of_the_c_grid_equations(name: str, f0: float) -> None:
    # the C-grid written here on its own (Arakawa & Lamb 1977): both ends held, four-point means, no flow through walls
    wave = MAKERS[name](f0, dx=DX, dy=DY)
    closed = WALLS[name]
    x_c, x_f = X0 + (np.arange(NX) + 0.5) * DX, X0 + np.arange(NX + 1) * DX
    y_c, y_f = Y0 + (np.arange(NY) + 0.5) * DY, Y0 + np.arange(NY + 1) * DY
    t, quarter = 1.7e4, math.pi / 2 / wave.omega

    def fields(time: float) -> tuple[Array, Array, Array]:
        return (
            wave.u(x_f[None, :], y_c[:, None], time),
            wave.v(x_c[None, :], y_f[:, None], time),
            wave.eta(x_c[None, :], y_c[:, None], time),
        )

    def padded(field: Array, axis: int) -> Array:
        """One centre more on each side along an axis, round the domain."""
        return np.concatenate([field.take([-1], axis), field, field.take([0], axis)], axis)

    u, v, eta = fields(t)
    g, H = LAYER["gravity"], LAYER["depth"]
    v_c, u_c = (v[1:] + v[:-1]) / 2, (u[:, 1:] + u[:, :-1]) / 2
    v_x, u_y = padded(v_c, 1), padded(u_c, 0)
    eta_x, eta_y = padded(eta, 1), padded(eta, 0)
    du = f0 * (v_x[:, 1:] + v_x[:, :-1]) / 2 - g * np.diff(eta_x, axis=1) / DX
    dv = -f0 * (u_y[1:] + u_y[:-1]) / 2 - g * np.diff(eta_y, axis=0) / DY
    deta = -H * (np.diff(u, axis=1) / DX + np.diff(v, axis=0) / DY)
    if closed == "x":
        assert np.abs(u[:, [0, -1]]).max() < 1e-15
        du[:, [0, -1]] = 0
    if closed == "y":
        assert np.abs(v[[0, -1]]).max() < 1e-15
        dv[[0, -1]] = 0
    # d/dt of Re[hat exp(-i omega t)] is omega times the field a quarter period earlier
    expected = [wave.omega * part for part in fields(t - quarter)]
    # round-off of phases up to some 50 rad and of sums of six terms
    for found, exact, size in zip((du, dv, deta), expected, (0.3 * C / 40, 0.3 * C / 40, 0.3), strict=True):
        np.testing.assert_allclose(found, -exact, rtol=0, atol=1e-13 * abs(wave.omega) * size)


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("grid", [{}, {"dx": DX, "dy": DY}], ids=["continuum", "grid"])
def test_a_wave_has_the_frequency_of_its_dispersion_relation(f0: float, grid: dict[str, float]) -> None:
    known = {**LAYER, "f0": f0, **grid, "on_grid": bool(grid)}
    # hypot of the same terms in another order: rounding
    assert MAKERS["plane"](f0, **grid).omega == pytest.approx(
        inertia_gravity_frequency(k=2 * K, l=-L, **known), rel=1e-14
    )
    along_x = inertia_gravity_frequency(k=-2 * K, l=3 * math.pi / LY, **known)
    assert MAKERS["channel along x"](f0, **grid).omega == pytest.approx(along_x, rel=1e-14)
    along_y = inertia_gravity_frequency(k=2 * math.pi / LX, l=L, **known)
    assert MAKERS["channel along y"](f0, **grid).omega == pytest.approx(along_y, rel=1e-14)
    for edge in EDGES:
        omega = MAKERS[f"kelvin {edge}"](f0, **grid).omega
        # positive where the wave goes toward +x or +y
        expected = kelvin_direction(f0, edge) * kelvin_frequency(k=K, l=L, edge=edge, **known)
        assert omega == pytest.approx(expected, rel=1e-14)


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("name", MAKERS)
@pytest.mark.parametrize("grid", [{}, {"dx": DX, "dy": DY}], ids=["continuum", "grid"])
def test_the_amplitude_is_the_largest_elevation(name: str, f0: float, grid: dict[str, float]) -> None:
    wave = MAKERS[name](f0, **grid)
    x, y = np.linspace(*X_WALLS, 401)[None, :], np.linspace(*Y_WALLS, 401)[:, None]
    # crests fall between points: 1 - cos(k d/2) with k d up to 2 pi 2/400
    assert np.abs(wave.eta(x, y)).max() == pytest.approx(0.3, rel=2e-4)


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_poincare_crests_travel_toward_their_wavenumber(f0: float) -> None:
    wave = MAKERS["plane"](f0)
    x, y = points()
    t, size = 3e3, (2 * K) ** 2 + L**2
    later = wave.eta(x + 2 * K * wave.omega * t / size, y - L * wave.omega * t / size, t)
    # rounding of phases
    np.testing.assert_allclose(later, wave.eta(x, y), rtol=0, atol=1e-14)


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_the_velocity_of_a_poincare_wave_turns_clockwise_in_the_north(f0: float) -> None:
    # source: Gill 1982, chapter 8: an ellipse, anticyclonic
    wave = MAKERS["plane"](f0)
    u, v = wave.u_hat(0.0, 0.0), wave.v_hat(0.0, 0.0)
    # u dv/dt - v du/dt of Re[hat exp(-i omega t)], the same at all times
    turning = wave.omega * float((np.conj(u) * v).imag)
    assert math.copysign(1, turning) == -math.copysign(1, f0)


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("edge", EDGES)
def test_a_kelvin_wave_is_one_deformation_radius_wide_and_has_no_flow_across(edge: Any, f0: float) -> None:
    wave = MAKERS[f"kelvin {edge}"](f0)
    inward = {"west": (1, 0), "east": (-1, 0), "south": (0, 1), "north": (0, -1)}[edge]
    x0 = X_WALLS[1] if edge == "east" else X_WALLS[0]
    y0 = Y_WALLS[1] if edge == "north" else Y_WALLS[0]
    a = C / F
    # source: Thomson 1879: exp(-distance/a); tolerance: rounding
    ratio = wave.eta(x0 + a * inward[0], y0 + a * inward[1]) / wave.eta(x0, y0)
    assert ratio == pytest.approx(math.exp(-1), rel=1e-13)
    x, y = points()
    across = wave.u(x, y) if edge in ("west", "east") else wave.v(x, y)
    assert np.all(across == 0)


def test_on_the_grid_a_kelvin_wave_falls_off_as_in_the_continuum_to_second_order() -> None:
    def width(d: float) -> float:
        wave = kelvin_wave(amplitude=1.0, wavenumber=K, edge="south", wall=0.0, f0=F, dx=d, dy=d, **LAYER)
        return float(np.log(wave.eta(0.0, 0.0) / wave.eta(0.0, 1e5)))

    errors = [abs(width(d) - 1e5 * F / C) for d in (4e4, 2e4, 1e4)]
    # fourth-order terms: (d/a)^2 = 0.04 at the coarsest
    np.testing.assert_allclose(np.log2(np.array(errors[:-1]) / errors[1:]), 2.0, atol=0.04)


@pytest.mark.parametrize("beta", [2.3e-11, -2.3e-11])
def test_the_equatorial_kelvin_wave_solves_the_equations_and_goes_east_where_f_grows_northward(beta: float) -> None:
    # source: Matsuno 1966
    wave = equatorial_kelvin_wave(amplitude=0.3, wavenumber=2 * K, beta=beta, y0=1e5, phase=0.2, **LAYER)
    x, y = points()
    found = residuals(wave, beta * (y - 1e5), x, y, 5e3, 10.0, 1.0)
    # centred differences as above
    for residual, size in zip(found, (0.3 * C / 40, 0.3 * C / 40, 0.3), strict=True):
        assert np.abs(residual).max() < 1e-6 * abs(wave.omega) * size
    assert math.copysign(1, wave.omega) == math.copysign(1, beta)
    # sqrt(c/beta) from the equator eta is down by exp(-1/2); rounding
    radius = math.sqrt(C / abs(beta))
    assert wave.eta(0.0, 1e5 - radius) / wave.eta(0.0, 1e5) == pytest.approx(math.exp(-0.5), rel=1e-13)


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("shape", ["plane", "channel"])
def test_a_rossby_wave_is_geostrophic_and_keeps_quasi_geostrophic_vorticity(shape: str, f0: float) -> None:
    keys = {"amplitude": 0.3, "phase": 0.4, "f0": f0, "beta": 1.6e-11, **LAYER}
    if shape == "plane":
        wave, other = rossby_wave(k=2 * K, l=L, **keys), L
    else:
        wave, other = channel_rossby_wave(wavenumber=2 * K, half_waves=2, walls=Y_WALLS, **keys), 2 * math.pi / LY
        # no flow through the walls: sin(n pi) rounds
        assert np.abs(wave.v(points()[0], np.array(Y_WALLS)[:, None])).max() < 1e-15
    x, y = points()
    d, t, dt, g = 10.0, 5e3, 1e3, LAYER["gravity"]
    slope_x = (wave.eta(x + d, y, t) - wave.eta(x - d, y, t)) / (2 * d)
    slope_y = (wave.eta(x, y + d, t) - wave.eta(x, y - d, t)) / (2 * d)
    speed = g / F * 0.3 * 2 * K
    # centred differences, (k d)^2/6 = 2e-8; rounding of eta over 20 m, 3e-18/3e-5
    np.testing.assert_allclose(f0 * wave.v(x, y, t), g * slope_x, rtol=0, atol=1e-6 * F * speed)
    np.testing.assert_allclose(f0 * wave.u(x, y, t), -g * slope_y, rtol=0, atol=1e-6 * F * speed)

    def vorticity(time: float) -> Any:
        turning = (
            wave.v(x + d, y, time) - wave.v(x - d, y, time) - wave.u(x, y + d, time) + wave.u(x, y - d, time)
        ) / (2 * d)
        return turning - f0 / LAYER["depth"] * wave.eta(x, y, time)

    # source: Pedlosky 1987, chapter 3: d/dt (zeta - f0 eta/H) + beta v = 0; differences: (omega dt)^2/6 < 1e-6
    change = (vorticity(t + dt) - vorticity(t - dt)) / (2 * dt)
    np.testing.assert_allclose(change, -1.6e-11 * wave.v(x, y, t), rtol=0, atol=1e-6 * 1.6e-11 * speed)
    # rounding; westward: negative for a positive wavenumber
    assert wave.omega == pytest.approx(-rossby_frequency(k=2 * K, l=other, f0=f0, beta=1.6e-11, **LAYER), rel=1e-14)


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (
            lambda: poincare_wave(amplitude=1.0, k=0.0, l=0.0, f0=F, **LAYER),
            "a Poincare wave needs a wavenumber; k or l that is not 0",
        ),
        (
            lambda: channel_poincare_wave(amplitude=1.0, wavenumber=K, half_waves=0, walls=(0.0, 1.0), f0=F, **LAYER),
            "0 half waves between the walls; a whole number from 1 on",
        ),
        (
            lambda: kelvin_wave(amplitude=1.0, wavenumber=K, edge="west", wall=0.0, f0=0.0, **LAYER),
            "there is no Kelvin wave without rotation; f0 that is not 0",
        ),
        (
            lambda: kelvin_wave(amplitude=1.0, wavenumber=K, edge="south", wall=0.0, f0=F, dx=1.0, dy=5e5, **LAYER),
            "cells are wider than twice the deformation radius; refine the grid across the wall",
        ),
        (
            lambda: rossby_wave(amplitude=1.0, k=K, l=0.0, f0=0.0, beta=1e-11, **LAYER),
            "a Rossby wave off the equator needs f0; f0 that is not 0",
        ),
        (
            lambda: channel_rossby_wave(
                amplitude=1.0, wavenumber=K, half_waves=0, walls=(0.0, 1.0), f0=F, beta=1e-11, **LAYER
            ),
            "0 half waves between the walls; a whole number from 1 on",
        ),
        (
            lambda: equatorial_kelvin_wave(amplitude=1.0, wavenumber=K, beta=0.0, **LAYER),
            "there is no Kelvin wave without rotation; beta that is not 0",
        ),
    ],
)
def test_where_there_is_no_such_wave_it_says_why(make: Any, message: str) -> None:
    with pytest.raises(RequestError) as caught:
        make()
    assert str(caught.value) == message
