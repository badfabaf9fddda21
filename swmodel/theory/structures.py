"""Linear waves as fields: u, v, eta at any points and time, in the continuum or exactly on the C-grid.

Every maker takes the cell sizes `dx`, `dy` (0, the default, is the continuum). With them the wave is an exact mode of
the linear C-grid equations over an even depth with uniform f: taken at the grid's own points it keeps its shape and
moves at the grid's own frequency. Phases are in rad, wavenumbers in 1/m, `amplitude` is the largest eta in m.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ..errors import Fault, RequestError
from .scales import deformation_radius, gravity_wave_speed
from .waves import Axis, Edge, grid_coriolis, grid_wavenumber, kelvin_direction

Complex = NDArray[np.complex128]
Hat = Callable[[Any, Any], Complex]


@dataclass(frozen=True)
class WaveField:
    """A wave Re[hat(x, y) exp(-i omega t)].

    Parameters
    ----------
    omega : float
        Frequency, rad/s; negative for a wave that travels against its wavenumber (Rossby).
    u_hat, v_hat, eta_hat : callable
        Complex amplitudes ``(x, y) -> array`` of u, v (m/s) and eta (m).
    """

    omega: float
    u_hat: Hat
    v_hat: Hat
    eta_hat: Hat

    def u(self, x: ArrayLike, y: ArrayLike, t: float = 0.0) -> NDArray[np.float64]:
        """Velocity along x, m/s, in the shape to which x and y (m) broadcast, at time t (s)."""
        return self._real(self.u_hat, x, y, t)

    def v(self, x: ArrayLike, y: ArrayLike, t: float = 0.0) -> NDArray[np.float64]:
        """Velocity along y, m/s; as `u`."""
        return self._real(self.v_hat, x, y, t)

    def eta(self, x: ArrayLike, y: ArrayLike, t: float = 0.0) -> NDArray[np.float64]:
        """Elevation, m; as `u`."""
        return self._real(self.eta_hat, x, y, t)

    def _real(self, hat: Hat, x: ArrayLike, y: ArrayLike, t: float) -> NDArray[np.float64]:
        x, y = np.broadcast_arrays(np.asarray(x, np.float64), np.asarray(y, np.float64))
        return np.asarray((hat(x, y) * cmath.exp(-1j * self.omega * t)).real)


def _turned(wave: WaveField) -> WaveField:
    """Turn a wave of axes (X along y, Y against x) into x and y; f and the equations do not notice."""
    return WaveField(
        wave.omega,
        u_hat=lambda x, y: -wave.v_hat(y, -x),
        v_hat=lambda x, y: wave.u_hat(y, -x),
        eta_hat=lambda x, y: wave.eta_hat(y, -x),
    )


def poincare_wave(
    *,
    amplitude: float,
    k: float,
    l: float,
    gravity: float,
    depth: float,
    f0: float,
    phase: float = 0.0,
    dx: float = 0.0,
    dy: float = 0.0,
) -> WaveField:
    """Plane Poincare wave amplitude cos(k x + l y - omega t + phase), which travels toward (k, l).

    Source: Gill 1982, chapter 8; on the grid Arakawa & Lamb 1977.
    """
    K, L = grid_wavenumber(k, dx), grid_wavenumber(l, dy)
    f = grid_coriolis(f0, k, l, dx, dy)
    if K == 0 and L == 0:
        raise RequestError(Fault((), "a Poincare wave needs a wavenumber", "k or l that is not 0"))
    omega = math.hypot(f, gravity_wave_speed(gravity, depth) * math.hypot(K, L))
    # -i omega u - f v = -i K g eta, -i omega v + f u = -i L g eta, and omega^2 - f^2 = g H (K^2 + L^2)
    to_u = (omega * K + 1j * f * L) / (depth * (K**2 + L**2))
    to_v = (omega * L - 1j * f * K) / (depth * (K**2 + L**2))

    def eta_hat(x: Any, y: Any) -> Complex:
        return np.asarray(amplitude * np.exp(1j * (k * x + l * y + phase)))

    return WaveField(omega, lambda x, y: to_u * eta_hat(x, y), lambda x, y: to_v * eta_hat(x, y), eta_hat)


def channel_poincare_wave(
    *,
    amplitude: float,
    wavenumber: float,
    half_waves: int,
    walls: tuple[float, float],
    gravity: float,
    depth: float,
    f0: float,
    along: Axis = "x",
    phase: float = 0.0,
    dx: float = 0.0,
    dy: float = 0.0,
) -> WaveField:
    """Poincare wave between two walls: `half_waves` half waves of the velocity across, travelling along the channel.

    Parameters
    ----------
    wavenumber : float
        Along the channel, 1/m; its sign is the direction of travel.
    half_waves : int
        Of the velocity across the channel, from 1 on.
    walls : tuple of float
        Where the walls lie, the lower coordinate first, m: y for a channel along x, x for one along y.
    along : {"x", "y"}
        Direction of the channel.

    Notes
    -----
    With Y from the right-hand wall and l = n pi/width, v is proportional to sin(l Y) and eta to
    omega l cos(l Y) - f k sin(l Y); omega as for the plane wave. Source: Gill 1982, chapter 10.
    """
    if half_waves < 1 or half_waves != int(half_waves):
        raise RequestError(Fault((), f"{half_waves} half waves between the walls", "a whole number from 1 on"))
    low, high = walls
    l = half_waves * math.pi / (high - low)
    start, along_cell, across_cell = (low, dx, dy) if along == "x" else (-high, dy, dx)
    K, L = grid_wavenumber(wavenumber, along_cell), grid_wavenumber(l, across_cell)
    f = grid_coriolis(f0, wavenumber, l, along_cell, across_cell)
    c = gravity_wave_speed(gravity, depth)
    omega = math.hypot(f, c * math.hypot(K, L))
    # v = i B sin; eta = H B (omega L cos - f K sin)/(omega^2 - c^2 K^2), whose largest value between walls is amplitude
    cosine, sine = amplitude * np.array([omega * L, -f * K]) / math.hypot(omega * L, f * K)
    B = amplitude * (f**2 + (c * L) ** 2) / (depth * math.hypot(omega * L, f * K))

    def wave(x: Any) -> Complex:
        return np.asarray(np.exp(1j * (wavenumber * x + phase)))

    def eta_hat(x: Any, y: Any) -> Complex:
        return np.asarray((cosine * np.cos(l * (y - start)) + sine * np.sin(l * (y - start))) * wave(x))

    def u_hat(x: Any, y: Any) -> Complex:
        return np.asarray((K * gravity * eta_hat(x, y) - f * B * np.sin(l * (y - start)) * wave(x)) / omega)

    def v_hat(x: Any, y: Any) -> Complex:
        return np.asarray(1j * B * np.sin(l * (y - start)) * wave(x))

    field = WaveField(omega, u_hat, v_hat, eta_hat)
    return field if along == "x" else _turned(field)


def kelvin_wave(
    *,
    amplitude: float,
    wavenumber: float,
    edge: Edge,
    wall: float,
    gravity: float,
    depth: float,
    f0: float,
    phase: float = 0.0,
    dx: float = 0.0,
    dy: float = 0.0,
) -> WaveField:
    """Kelvin wave along a wall, with the coast on its right where f > 0 and on its left where f < 0.

    Parameters
    ----------
    amplitude : float
        Of eta on the wall, m.
    wavenumber : float
        Along the wall, 1/m, taken positive.
    edge : {"west", "east", "south", "north"}
        Side of the domain on which the wall lies.
    wall : float
        Where it lies, m: x of a west or east wall, y of a south or north one.

    Notes
    -----
    eta falls off as exp(-d/a) with distance d from the wall; on the grid by (1 - m)/(1 + m) from cell to cell, with
    m = |f| cos(k dx/2) dy/(2 c), dy across and dx along the wall. There is no flow across it anywhere, so that a second
    wall does not matter. Source: Thomson 1879; Gill 1982, chapter 10.

    Raises
    ------
    RequestError
        Without rotation, or where cells across the wall are wider than twice the deformation radius.
    """
    direction = kelvin_direction(f0, edge)
    c = gravity_wave_speed(gravity, depth)
    meridional = edge in ("west", "east")
    along_cell, across_cell = (dy, dx) if meridional else (dx, dy)
    k = abs(wavenumber)
    rate = 1 / deformation_radius(gravity, depth, f0)
    if across_cell:
        m = rate * math.cos(k * along_cell / 2) * across_cell / 2
        if m >= 1:
            raise RequestError(
                Fault((), "cells are wider than twice the deformation radius", "", "refine the grid across the wall")
            )
        rate = 2 * math.atanh(m) / across_cell
    inward = 1 if edge in ("west", "south") else -1
    omega = direction * c * grid_wavenumber(k, along_cell)
    speed = direction * math.sqrt(gravity / depth)

    def eta_hat(x: Any, y: Any) -> Complex:
        along, across = (y, x) if meridional else (x, y)
        return np.asarray(amplitude * np.exp(-rate * inward * (across - wall) + 1j * (k * along + phase)))

    def flow(x: Any, y: Any) -> Complex:
        return speed * eta_hat(x, y)

    return WaveField(omega, *((_still, flow) if meridional else (flow, _still)), eta_hat)


def _still(x: Any, y: Any) -> Complex:
    return np.zeros(np.broadcast_shapes(np.shape(x), np.shape(y)), np.complex128)


def equatorial_kelvin_wave(
    *,
    amplitude: float,
    wavenumber: float,
    gravity: float,
    depth: float,
    beta: float,
    y0: float = 0.0,
    phase: float = 0.0,
) -> WaveField:
    """Kelvin wave along the equator y = y0: eastward where beta > 0, eta falling off as exp(-|beta| y^2/(2 c)).

    `wavenumber` (1/m) is taken positive. Source: Matsuno 1966, J. Meteor. Soc. Japan 44; Gill 1982, chapter 11.
    """
    direction = kelvin_direction(0.0, None, beta)
    c = gravity_wave_speed(gravity, depth)
    k = abs(wavenumber)
    speed = direction * math.sqrt(gravity / depth)

    def eta_hat(x: Any, y: Any) -> Complex:
        return np.asarray(amplitude * np.exp(-abs(beta) * (y - y0) ** 2 / (2 * c) + 1j * (k * x + phase)))

    return WaveField(direction * c * k, lambda x, y: speed * eta_hat(x, y), _still, eta_hat)


def rossby_wave(
    *,
    amplitude: float,
    k: float,
    l: float,
    gravity: float,
    depth: float,
    f0: float,
    beta: float,
    phase: float = 0.0,
) -> WaveField:
    """Plane quasi-geostrophic Rossby wave amplitude cos(k x + l y - omega t + phase), in geostrophic balance with f0.

    omega = -beta k/(k^2 + l^2 + 1/a^2): crests go west where beta > 0. Source: Rossby 1939; Pedlosky 1987, chapter 3.
    """
    omega = _rossby_omega(k, l, gravity, depth, f0, beta)

    def eta_hat(x: Any, y: Any) -> Complex:
        return np.asarray(amplitude * np.exp(1j * (k * x + l * y + phase)))

    # f0 v = g d eta/dx, f0 u = -g d eta/dy
    to_u, to_v = -1j * l * gravity / f0, 1j * k * gravity / f0
    return WaveField(omega, lambda x, y: to_u * eta_hat(x, y), lambda x, y: to_v * eta_hat(x, y), eta_hat)


def channel_rossby_wave(
    *,
    amplitude: float,
    wavenumber: float,
    half_waves: int,
    walls: tuple[float, float],
    gravity: float,
    depth: float,
    f0: float,
    beta: float,
    phase: float = 0.0,
) -> WaveField:
    """Quasi-geostrophic Rossby wave in a channel along x: eta = amplitude sin(l Y) cos(k x - omega t + phase).

    Y is counted from the southern of the two `walls` (y of south and north, m), l = half_waves pi/width; there is no
    flow through the walls. Source: Pedlosky 1987, chapter 3.
    """
    if half_waves < 1 or half_waves != int(half_waves):
        raise RequestError(Fault((), f"{half_waves} half waves between the walls", "a whole number from 1 on"))
    low, high = walls
    l = half_waves * math.pi / (high - low)
    k = wavenumber
    omega = _rossby_omega(k, l, gravity, depth, f0, beta)

    def wave(x: Any) -> Complex:
        return np.asarray(amplitude * np.exp(1j * (k * x + phase)))

    return WaveField(
        omega,
        u_hat=lambda x, y: -gravity / f0 * l * np.cos(l * (y - low)) * wave(x),
        v_hat=lambda x, y: gravity / f0 * 1j * k * np.sin(l * (y - low)) * wave(x),
        eta_hat=lambda x, y: np.sin(l * (y - low)) * wave(x),
    )


def _rossby_omega(k: float, l: float, gravity: float, depth: float, f0: float, beta: float) -> float:
    """Signed frequency for the wavenumber k, rad/s."""
    if f0 == 0:
        raise RequestError(Fault((), "a Rossby wave off the equator needs f0", "f0 that is not 0"))
    return -beta * k / (k**2 + l**2 + 1 / deformation_radius(gravity, depth, f0) ** 2)
