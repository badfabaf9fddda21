"""Linear waves in a run: frequency, direction and speed against closed forms on the grid and in the continuum."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest
from flows import (
    ALONG_X,
    BOX,
    EDGES,
    LINEAR,
    beta_plane,
    equations_of,
    make_basin,
    run,
    watched,
)
from scipy.interpolate import BarycentricInterpolator
from scipy.linalg import eig

from swmodel.steppers import STEPPERS, filtered_leapfrog_matrix
from swmodel.theory.structures import channel_rossby_wave, kelvin_wave, poincare_wave

F, G, H = 0.8, 1.1, 0.9
C = math.sqrt(G * H)
NX, NY, DX, DY = 24, 20, 0.35, 0.5
HEMISPHERES = pytest.mark.parametrize("f0", [F, -F], ids=["north", "south"])
# six directions and lengths, from the longest in the domain to 3 and 4 cells
WAVES = [(1, 0), (0, 1), (-2, 1), (3, -4), (8, 5), (-5, -2)]


def phase_ratio(stepper, p):
    """Phase that a step turns an oscillation by over omega dt, in closed form (Durran 2010, section 2.3)."""
    if stepper == "leapfrog":
        roots = np.linalg.eigvals(filtered_leapfrog_matrix(p, 0.1, 0.7))
        return cmath.phase(roots[np.argmin(np.abs(roots - cmath.exp(1j * p)))]) / p
    real, imaginary = 1 - p**2 / 2, p - p**3 / 6
    return math.atan2(imaginary, real + (p**4 / 24 if stepper == "rk4" else 0)) / p


def frequency(phases, dt):
    """Angular frequency of exp(-i omega t) from its phase after each block of `dt`: the mean over the blocks."""
    turned = np.unwrap(phases)
    return -(turned[-1] - turned[0]) / (dt * (len(phases) - 1))


def fields_of(wave, basin):
    return tuple(
        getattr(wave, name)(*basin.grid.points(where)) for name, where in (("u", "u"), ("v", "v"), ("eta", "centre"))
    )


@HEMISPHERES
@pytest.mark.parametrize("stepper", STEPPERS)
@pytest.mark.parametrize(("m", "n"), WAVES)
def test_a_poincare_wave_has_the_exact_frequency_of_the_c_grid(m, n, stepper, f0):
    # omega^2 = f^2 cos^2(k dx/2) cos^2(l dy/2) + (4 g H/dx^2) sin^2(k dx/2) + (4 g H/dy^2) sin^2(l dy/2)
    # (Arakawa & Lamb 1977)
    basin = make_basin(NX, NY, DX, DY, gravity=G, depth=H, f=f0)
    k, l_ = 2 * math.pi * m / basin.grid.Lx, 2 * math.pi * n / basin.grid.Ly
    a, b = k * DX / 2, l_ * DY / 2
    omega = math.sqrt(
        (f0 * math.cos(a) * math.cos(b)) ** 2 + 4 * G * H * ((math.sin(a) / DX) ** 2 + (math.sin(b) / DY) ** 2)
    )
    wave = poincare_wave(amplitude=1.0, k=k, l=l_, gravity=G, depth=H, f0=f0, dx=DX, dy=DY)
    x, y = basin.grid.points("centre")
    plane = np.exp(-1j * (k * x + l_ * y))
    dt = 0.1
    seen = watched(
        equations_of(basin, LINEAR),
        fields_of(wave, basin),
        stepper,
        dt,
        300,
        1,
        lambda state: (plane * state.eta).mean(),
    )
    # the first 100 steps are left to leapfrog's computational mode to die away in, by 0.9^100 = 3e-5
    measured = frequency(np.angle(seen[100:]), dt)
    # the claim; found to some 1e-13
    assert abs(measured / (omega * phase_ratio(stepper, omega * dt)) - 1) < 1e-6


@HEMISPHERES
def test_an_inertial_oscillation_turns_the_way_of_its_hemisphere(f0):
    # Gill 1982, section 8.3: clockwise in the north, anticlockwise in the south, period 2 pi/|f|
    basin = make_basin(4, 4, f=f0)
    still = np.zeros((4, 4))
    fields = np.ones((4, 5)), np.zeros((5, 4)), still
    period = 2 * math.pi / abs(f0)
    steps = 200
    seen = watched(
        equations_of(basin, LINEAR), fields, "rk4", period / steps, steps, 1, lambda s: complex(s.u[0, 0], s.v[0, 0])
    )
    turned = np.unwrap(np.angle(seen))
    assert np.all(np.sign(np.diff(turned)) == -np.sign(f0))
    # rk4 runs slow by (2 pi/200)^4/120 = 8e-9, and damps less
    assert turned[-1] == pytest.approx(-math.copysign(2 * math.pi, f0), rel=1e-8)
    assert seen[-1] == pytest.approx(1.0, abs=1e-7)


# ------------------------------------------------------------------------------------------------ coasts


@HEMISPHERES
@pytest.mark.parametrize("edge", ["south", "north", "west", "east"])
def test_a_kelvin_wave_keeps_the_coast_on_its_right_in_the_north_and_on_its_left_in_the_south(edge, f0):
    # Thomson 1879; Gill 1982, section 10.4: speed sqrt(g H) along the coast; on the grid exactly c (2/dx) sin(k dx/2)/k
    zonal = edge in ("south", "north")
    basin = make_basin(NX, NY, DX, DY, edges=EDGES[f"channel along {'x' if zonal else 'y'}"], gravity=G, depth=H, f=f0)
    grid = basin.grid
    length, cell = (grid.Lx, DX) if zonal else (grid.Ly, DY)
    k = 2 * math.pi / length
    wall = {"south": 0.0, "west": 0.0, "north": grid.Ly, "east": grid.Lx}[edge]
    wave = kelvin_wave(amplitude=1.0, wavenumber=k, edge=edge, wall=wall, gravity=G, depth=H, f0=f0, dx=DX, dy=DY)
    x, y = grid.points("centre")
    plane = np.exp(-1j * k * (x if zonal else y))
    dt, blocks = 0.1, 200
    seen = watched(
        equations_of(basin, LINEAR), fields_of(wave, basin), "rk4", dt, blocks, 1, lambda s: (plane * s.eta).mean()
    )
    speed = frequency(np.angle(seen), dt) / k
    # facing along +x, a south coast lies on the right; along +y, an east coast does
    on_right = {"south": 1, "north": -1, "east": 1, "west": -1}[edge]
    exact = C * 2 / cell * math.sin(k * cell / 2) / k
    expected = math.copysign(exact, f0) * on_right * phase_ratio("rk4", exact * k * dt)
    assert speed == pytest.approx(expected, rel=1e-9)  # round-off of 200 steps
    # beside the continuum slow by (k dx)^2/24 = 3e-3 and 4e-3; the next term is (k dx)^4/1920 < 6e-6
    assert abs(speed) == pytest.approx(C * (1 - (k * cell) ** 2 / 24), rel=1e-5)


@HEMISPHERES
def test_a_bump_on_a_coast_sends_its_kelvin_wave_the_right_way(f0):
    # nothing prepared: a bump of eta at rest on the south wall of a wide channel; what stays at the coast goes east in
    # the north and west in the south (Gill 1982, section 10.4), 8 deformation radii in the time taken
    basin = make_basin(160, 40, 0.25, 0.25, edges=ALONG_X, gravity=1.0, depth=1.0, f=math.copysign(1.0, f0))
    x, y = basin.grid.points("centre")
    bump = np.exp(-((x - 20.0) ** 2) - y**2)
    still = np.zeros(basin.grid.shape("u")), np.zeros(basin.grid.shape("v"))
    _, _, eta = run(equations_of(basin, LINEAR), (*still, bump), "ssprk3", 0.05, 160)
    coast = eta[0]
    crest = basin.grid.x[np.argmax(coast)]
    # speed 1 for a time of 8; the crest of a dispersing rest lags by less than the bump's width of 1
    assert crest - 20.0 == pytest.approx(math.copysign(8.0, f0), abs=1.0)


def test_a_basin_seiche_has_merians_period():
    # Merian 1828: T = 2 L/sqrt(g H)
    n, dx = 64, 0.5
    basin = make_basin(n, 1, dx, 1.0, edges=BOX, gravity=G, depth=H, f=0.0)
    length = n * dx
    x, _ = basin.grid.points("centre")
    shape = np.cos(math.pi * x / length)
    fields = np.zeros((1, n + 1)), np.zeros((2, n)), shape
    period = 2 * length / C
    steps = 200
    equations = equations_of(basin, LINEAR)

    def seen(state):
        return complex((shape * state.eta).sum(), 0) / (shape**2).sum()

    swing = np.real(watched(equations, fields, "rk4", period / steps, steps, 1, seen))
    # amplitude cos(omega t): its phase near a quarter period, where it crosses 0, by linear interpolation
    k = int(np.argmax(swing < 0))
    quarter = (k - swing[k] / (swing[k] - swing[k - 1])) * period / steps
    # on the grid the wave is slow by (pi dx/L)^2/24 = 1.0e-4; interpolation and rk4 add some 1e-6
    assert 4 * quarter / period - 1 == pytest.approx((math.pi / n) ** 2 / 24, abs=5e-6)


# ------------------------------------------------------------------------------------------- Rossby waves

# an invented channel: 8 deformation radii wide, f varies by 16 % across it
BETA, WIDTH, LENGTH = 0.02, 8.0, 12.0


K = 2 * math.pi / LENGTH


def channel_mode(f0, points=48):
    """Frequency of the gravest Rossby wave of the channel, and u, v, eta of exp(i k x - i omega t), functions of y.

    From shallow water itself, g = H = 1: with v = 0 on the walls -v'' + f^2 v = lambda v, and
    omega^2 - k^2 - beta k/omega = lambda (Matsuno 1966, J. Meteor. Soc. Japan 44, eq. 6, there for f0 = 0).
    By Chebyshev collocation (Trefethen 2000, Spectral Methods in MATLAB, programs 6 and 20).
    """
    node = np.cos(np.pi * np.arange(points + 1) / points)
    weight = np.r_[2, np.ones(points - 1), 2] * (-1.0) ** np.arange(points + 1)
    D = np.outer(weight, 1 / weight) / (node[:, None] - node[None, :] + np.eye(points + 1))
    D = (D - np.diag(D.sum(1))) * 2 / WIDTH
    y = (node + 1) * WIDTH / 2
    f = f0 + BETA * (y - WIDTH / 2)
    values, vectors = eig((-D @ D + np.diag(f**2))[1:-1, 1:-1])
    gravest = np.argmin(values.real)
    roots = np.roots([1, 0, -(K**2 + values.real[gravest]), -BETA * K])
    omega = roots[np.argmin(np.abs(roots))].real
    v = np.r_[0, vectors[:, gravest].real, 0]
    u = 1j * (K * (D @ v) - omega * f * v) / (K**2 - omega**2)
    eta = 1j * (omega * (D @ v) - K * f * v) / (K**2 - omega**2)
    size = np.abs(eta).max()
    return omega, [BarycentricInterpolator(y, a / size) for a in (u, v.astype(complex), eta)]


def rossby_run(f0, across, until):
    """Frequency at which eta of the channel's Rossby wave turns on a grid, and the first and last section of eta."""
    along = across * 3 // 2
    dx, dy = LENGTH / along, WIDTH / across
    basin = make_basin(along, across, dx, dy, edges=ALONG_X, f=beta_plane(f0, BETA, WIDTH / 2))
    _, profiles = channel_mode(f0)
    fields = []
    for profile, where in zip(profiles, ("u", "v", "centre"), strict=True):
        x, y = basin.grid.points(where)
        fields.append((profile(y) * np.exp(1j * K * x)).real)
    fields[1][[0, -1]] = 0  # round-off of the interpolation
    x, y = basin.grid.points("centre")
    mode = np.exp(-1j * K * x) * profiles[2](y).conj()
    dt = 0.6 * min(dx, dy)
    blocks = 100
    steps = round(until / dt / blocks)
    seen = watched(equations_of(basin, LINEAR), fields, "ssprk3", dt, blocks, steps, lambda s: (mode * s.eta).mean())
    times = steps * dt * np.arange(blocks + 1)
    # least squares: what truncation sets going as gravity waves averages out
    return -np.polyfit(times, np.unwrap(np.angle(seen)), 1)[0]


def test_the_channels_own_rossby_frequency_is_converged():
    # a spectral method: 16 more points change the last digits only
    assert channel_mode(1.0, 64)[0] == pytest.approx(channel_mode(1.0, 48)[0], rel=1e-11)


@pytest.mark.parametrize("f0", [1.0, -1.0], ids=["north", "south"])
def test_a_rossby_wave_converges_at_second_order_toward_the_channels_own_frequency(f0):
    omega = channel_mode(f0)[0]
    errors = [rossby_run(f0, n, 300.0) / omega - 1 for n in (16, 32, 64)]
    # the error's next term is of order 4: for 16 cells across (l dy)^2 = 4 % of the first, 3/4 of it in the order
    assert math.log2(errors[0] / errors[1]) == pytest.approx(2, abs=0.05)
    assert math.log2(errors[1] / errors[2]) == pytest.approx(2, abs=0.02)
    # the closed form omega = -beta k/(k^2 + l^2 + 1/a^2) (Rossby 1939) takes f = f0 except in beta: it is off shallow
    # water itself by 0.44 % here, a factor 30 more than the finest grid
    closed = -BETA * K / (K**2 + (math.pi / WIDTH) ** 2 + 1)
    assert closed / omega - 1 == pytest.approx(-0.0044, abs=5e-5)
    assert abs(errors[2]) < abs(closed / omega - 1) / 30


@pytest.mark.parametrize("f0", [1.0, -1.0], ids=["north", "south"])
def test_rossby_phases_go_west_in_both_hemispheres(f0):
    # Rossby 1939; Pedlosky 1987, section 3.9: crests at -beta/(k^2 + l^2 + 1/a^2), whatever the sign of f
    basin = make_basin(48, 32, LENGTH / 48, WIDTH / 32, edges=ALONG_X, f=beta_plane(f0, BETA, WIDTH / 2))
    known = {"gravity": 1.0, "depth": 1.0, "f0": f0, "beta": BETA}
    wave = channel_rossby_wave(amplitude=1.0, wavenumber=K, half_waves=1, walls=(0.0, WIDTH), **known)
    fields = fields_of(wave, basin)
    fields[1][[0, -1]] = 0  # round-off of the sine
    until = 60.0
    _, _, eta = run(equations_of(basin, LINEAR), fields, "ssprk3", 0.1, round(until / 0.1))
    x = basin.grid.x
    moved = cmath.phase((eta[16] * np.exp(-1j * K * x)).mean()) / -K
    expected = -BETA / (K**2 + (math.pi / WIDTH) ** 2 + 1) * until
    # the closed form is good to 0.5 %, the grid to 0.1 %; the start, balanced with f0 where f differs by up to 8 %,
    # sets some 2 % of inertia-gravity waves going: 0.02 rad of phase
    assert moved == pytest.approx(expected, abs=0.02 / K)
    assert moved < 0
