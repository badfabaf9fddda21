"""Dispersion relations of linear waves over an even depth, in the continuum and exactly on the C-grid.

A wave is cos(k x + l y - omega t). Frequencies are positive; the signs of k and l say where the wave goes. Phase speeds
are those at which crests pass along one axis, omega/k along x or omega/l along y, positive eastward and northward.

On the C-grid a difference over one cell turns k into (2/dx) sin(k dx/2), and the four-point mean in the Coriolis term
turns f into f cos(k dx/2) cos(l dy/2) (Arakawa & Lamb 1977). This holds where f is uniform, for every PV flux: all of
them are then that mean. Where f varies, the relation depends on the PV flux and is not closed; it is refused.
"""

from __future__ import annotations

import math
from typing import Literal, NoReturn

from ..errors import Fault, RequestError
from .scales import deformation_radius, gravity_wave_speed

Edge = Literal["west", "east", "south", "north"]
Axis = Literal["x", "y"]
Branch = Literal["rossby", "gravity"]

# which way along +x or +y a Kelvin wave goes where f > 0: with the coast on its right
KELVIN_DIRECTION: dict[Edge, int] = {"south": 1, "east": 1, "north": -1, "west": -1}


def grid_wavenumber(k: float, spacing: float) -> float:
    """What a centred difference over one cell makes of the wavenumber k: (2/d) sin(k d/2), 1/m; k where d = 0."""
    return 2 / spacing * math.sin(k * spacing / 2) if spacing else k


def grid_coriolis(f0: float, k: float, l: float, dx: float, dy: float) -> float:
    """What the four-point mean makes of f: f cos(k dx/2) cos(l dy/2), rad/s."""
    return f0 * math.cos(k * dx / 2) * math.cos(l * dy / 2)


def _spacing(dx: float | None, dy: float | None, on_grid: bool) -> tuple[float, float]:
    """Cell sizes for the relation: 0, the continuum, unless the grid's own relation is asked for."""
    if not on_grid:
        return 0.0, 0.0
    if not (dx and dy):
        raise RequestError(Fault((), "the relation on the grid needs dx and dy", "cell sizes above 0"))
    return dx, dy


def _crest_speed(omega: float, k: float, l: float, along: Axis | None) -> float:
    """Speed of crests along an axis; without one, along x where the wave varies there, else along y."""
    number = {"x": k, "y": l}[along or ("x" if k else "y")]
    if number == 0:
        axis = f" along {along}" if along else ""
        raise RequestError(Fault((), f"a wave that does not vary{axis} has no phase speed there"))
    return omega / number


def _refuse_on_grid(wave: str) -> NoReturn:
    raise RequestError(
        Fault(
            (),
            f"there is no closed relation of {wave} waves on the grid: f varies, and it depends on the PV flux",
            "on_grid is known for inertia_gravity and kelvin",
            "leave on_grid out, and allow for the grid in within",
        )
    )


# ------------------------------------------------------------------------------------------- inertia-gravity waves


def inertia_gravity_frequency(
    gravity: float,
    depth: float,
    f0: float,
    k: float,
    l: float = 0.0,
    dx: float | None = None,
    dy: float | None = None,
    on_grid: bool = False,
) -> float:
    """Frequency of a Poincare wave, sqrt(f^2 + g H (k^2 + l^2)), rad/s, positive.

    Parameters
    ----------
    gravity, depth, f0 : float
        g in m s-2, H in m, Coriolis parameter in rad/s of either sign.
    k, l : float
        Wavenumbers along x and y, 1/m; between walls l is half waves times pi over their distance.
    dx, dy : float
        Cell sizes, m; needed on the grid.
    on_grid : bool
        Whether to give the C-grid's own frequency, exact for uniform f and even depth.

    Notes
    -----
    Source: Gill 1982, chapter 8; on the grid Arakawa & Lamb 1977.
    """
    dx, dy = _spacing(dx, dy, on_grid)
    c = gravity_wave_speed(gravity, depth)
    f = grid_coriolis(f0, k, l, dx, dy)
    return math.hypot(f, c * grid_wavenumber(k, dx), c * grid_wavenumber(l, dy))


def inertia_gravity_phase_speed(
    gravity: float,
    depth: float,
    f0: float,
    k: float,
    l: float = 0.0,
    dx: float | None = None,
    dy: float | None = None,
    on_grid: bool = False,
    along: Axis | None = None,
) -> float:
    """Phase speed of a Poincare wave along x (or y), m/s, with the sign of its wavenumber there.

    Parameters
    ----------
    gravity, depth, f0, k, l, dx, dy, on_grid
        As in `inertia_gravity_frequency`.
    along : {"x", "y"}
        Axis along which crests are timed; by default x where k is not 0, else y.
    """
    return _crest_speed(inertia_gravity_frequency(gravity, depth, f0, k, l, dx, dy, on_grid), k, l, along)


# ---------------------------------------------------------------------------------------------------- Kelvin waves


def kelvin_direction(f0: float, edge: Edge | None, beta: float = 0.0) -> int:
    """Which way a Kelvin wave goes: 1 for +x or +y, -1 for -x or -y.

    Parameters
    ----------
    f0 : float
        Coriolis parameter, rad/s: with the coast on the right where it is positive, on the left where negative.
    edge : {"west", "east", "south", "north"} or None
        Side of the domain on which the coast lies; None for the wave along the equator.
    beta : float
        df/dy, for the wave along the equator, which goes toward +x where beta > 0.

    Raises
    ------
    RequestError
        Where nothing turns that could hold the wave to the edge, or the edge is not known.
    """
    turning = f0 if edge is not None else beta
    if edge is not None and edge not in KELVIN_DIRECTION:
        raise RequestError(Fault((), f'there is no edge "{edge}"', ", ".join(KELVIN_DIRECTION)))
    if edge is None and f0 != 0:
        raise RequestError(Fault((), "a Kelvin wave off the equator needs its edge", ", ".join(KELVIN_DIRECTION)))
    if turning == 0:
        name = "f0" if edge is not None else "beta"
        raise RequestError(Fault((), "there is no Kelvin wave without rotation", f"{name} that is not 0"))
    sense = 1 if turning > 0 else -1
    return sense * (KELVIN_DIRECTION[edge] if edge is not None else 1)


def kelvin_frequency(
    gravity: float,
    depth: float,
    f0: float,
    k: float = 0.0,
    l: float = 0.0,
    edge: Edge | None = None,
    beta: float = 0.0,
    dx: float | None = None,
    dy: float | None = None,
    on_grid: bool = False,
) -> float:
    """Frequency of a Kelvin wave, c times the size of its wavenumber along the coast, rad/s, positive.

    Parameters
    ----------
    gravity, depth, f0 : float
        g in m s-2, H in m, Coriolis parameter in rad/s of either sign.
    k, l : float
        Wavenumbers, 1/m: k counts on a south or north coast and along the equator, l on a west or east coast.
    edge : {"west", "east", "south", "north"} or None
        Side on which the coast lies; None along the equator, where f0 = 0.
    beta : float
        df/dy, 1/(m s); needed along the equator.
    dx, dy : float
        Cell sizes, m; needed on the grid.
    on_grid : bool
        Whether to give the C-grid's own frequency: along a straight coast with uniform f the wave has no flow across
        it on the grid either, so that omega = c (2/dx) sin(k dx/2) exactly.

    Notes
    -----
    Source: Thomson 1879; Gill 1982, chapter 10; along the equator Matsuno 1966.
    """
    c = gravity_wave_speed(gravity, depth)
    kelvin_direction(f0, edge, beta)
    if on_grid and edge is None:
        _refuse_on_grid("equatorial")
    number, spacing = _along_coast(k, l, edge, *_spacing(dx, dy, on_grid))
    if number == 0:
        name = "l" if edge in ("west", "east") else "k"
        raise RequestError(Fault((), "a Kelvin wave needs its wavenumber along the coast", f"{name} that is not 0"))
    return c * abs(grid_wavenumber(number, spacing))


def kelvin_phase_speed(
    gravity: float,
    depth: float,
    f0: float,
    k: float = 0.0,
    l: float = 0.0,
    edge: Edge | None = None,
    beta: float = 0.0,
    dx: float | None = None,
    dy: float | None = None,
    on_grid: bool = False,
) -> float:
    """Phase speed of a Kelvin wave along its coast, m/s, positive toward +x or +y; see `kelvin_frequency`."""
    direction = kelvin_direction(f0, edge, beta)
    if not on_grid:
        return direction * gravity_wave_speed(gravity, depth)  # for every wavenumber: none is needed
    omega = kelvin_frequency(gravity, depth, f0, k, l, edge, beta, dx, dy, on_grid)
    return direction * omega / abs(_along_coast(k, l, edge, 0.0, 0.0)[0])


def _along_coast(k: float, l: float, edge: Edge | None, dx: float, dy: float) -> tuple[float, float]:
    """Wavenumber and cell size along the coast."""
    return (l, dy) if edge in ("west", "east") else (k, dx)


# ---------------------------------------------------------------------------------------------------- Rossby waves


def rossby_frequency(
    gravity: float,
    depth: float,
    f0: float,
    beta: float,
    k: float,
    l: float = 0.0,
    on_grid: bool = False,
) -> float:
    """Frequency of a quasi-geostrophic Rossby wave, |beta k|/(k^2 + l^2 + 1/a^2), rad/s, positive.

    Parameters
    ----------
    gravity, depth, f0, beta : float
        g in m s-2, H in m, Coriolis parameter in rad/s and its slope in 1/(m s).
    k, l : float
        Wavenumbers along x and y, 1/m; between walls l is half waves times pi over their distance.
    on_grid : bool
        Refused: f varies.

    Notes
    -----
    Source: Rossby 1939; Pedlosky 1987, chapter 3. Small against |f0|; shallow water itself differs by some parts in a
    thousand.
    """
    return abs(k * _rossby_speed(gravity, depth, f0, beta, k, l, on_grid))


def rossby_phase_speed(
    gravity: float,
    depth: float,
    f0: float,
    beta: float,
    k: float,
    l: float = 0.0,
    on_grid: bool = False,
    along: Axis | None = None,
) -> float:
    """Phase speed of a Rossby wave along x, -beta/(k^2 + l^2 + 1/a^2), m/s: westward where beta > 0.

    Parameters
    ----------
    gravity, depth, f0, beta, k, l, on_grid
        As in `rossby_frequency`.
    along : {"x", "y"}
        Axis along which crests are timed; by default x.
    """
    speed = _rossby_speed(gravity, depth, f0, beta, k, l, on_grid)
    return speed if along != "y" else _crest_speed(k * speed, k, l, along)


def _rossby_speed(
    gravity: float,
    depth: float,
    f0: float,
    beta: float,
    k: float,
    l: float,
    on_grid: bool,
) -> float:
    """Phase speed along x, m/s."""
    if on_grid:
        _refuse_on_grid("Rossby")
    if f0 == 0:
        raise RequestError(
            Fault(
                (), "the mid-latitude Rossby wave needs f0", "f0 that is not 0", "on the equator use equatorial waves"
            )
        )
    return -beta / (k**2 + l**2 + 1 / deformation_radius(gravity, depth, f0) ** 2)


# ------------------------------------------------------------------------------------------------ equatorial waves


def equatorial_frequency(
    gravity: float,
    depth: float,
    beta: float,
    k: float,
    mode: int,
    branch: Branch = "rossby",
    on_grid: bool = False,
) -> float:
    """Frequency of an equatorially trapped wave, rad/s, positive.

    Parameters
    ----------
    gravity, depth, beta : float
        g in m s-2, H in m, df/dy in 1/(m s).
    k : float
        Wavenumber along x, 1/m; where both directions exist, positive travels east and negative west.
    mode : int
        -1: Kelvin wave, always eastward. 0: mixed Rossby-gravity wave, either way. From 1 on: see `branch`.
    branch : {"rossby", "gravity"}
        From mode 1 on, the slow wave (always westward, whatever the sign of k) or the inertia-gravity wave (either
        way). Modes -1 and 0 have one branch each.
    on_grid : bool
        Refused: f varies.

    Notes
    -----
    omega^2/c^2 - k^2 - beta k/omega = (2 n + 1) beta/c (Matsuno 1966, J. Meteor. Soc. Japan 44); directions are given
    for beta > 0 and turn round with its sign.
    """
    return _equatorial_wave(gravity, depth, beta, k, mode, branch, on_grid)[0]


def equatorial_phase_speed(
    gravity: float,
    depth: float,
    beta: float,
    k: float,
    mode: int,
    branch: Branch = "rossby",
    on_grid: bool = False,
) -> float:
    """Phase speed of an equatorially trapped wave along x, m/s, positive eastward; see `equatorial_frequency`."""
    omega, travelling = _equatorial_wave(gravity, depth, beta, k, mode, branch, on_grid)
    return _crest_speed(omega, travelling, 0.0, "x")


def _equatorial_wave(
    gravity: float, depth: float, beta: float, k: float, mode: int, branch: Branch, on_grid: bool
) -> tuple[float, float]:
    """Return the positive frequency, and k with the sign of the direction in which that wave travels."""
    c = gravity_wave_speed(gravity, depth)
    if on_grid:
        _refuse_on_grid("equatorial")
    if beta == 0:
        raise RequestError(Fault((), "there are no equatorial waves without beta", "beta that is not 0"))
    if mode != int(mode) or mode < -1:
        raise RequestError(Fault((), f"mode {mode:g}", "a whole number from -1 on"))
    if branch not in ("rossby", "gravity"):
        raise RequestError(Fault((), f'branch "{branch}"', '"rossby" or "gravity"'))
    east = 1.0 if beta > 0 else -1.0
    if mode == -1:
        return c * abs(k), east * abs(k)
    B = abs(beta)
    # with beta < 0 the same waves travel the other way: solve for B > 0 and k turned round
    if mode == 0:
        half, root = east * c * k / 2, math.hypot(c * k / 2, math.sqrt(B * c))
        return (half + root if half > 0 else B * c / (root - half)), k
    p = (c * k) ** 2 + (2 * mode + 1) * B * c
    if branch == "gravity":
        return _largest_root(p, B * east * k * c**2), k
    # Rossby: of the three roots, whose product is q, the one of middle size follows from the outer two
    q = -B * abs(k) * c**2
    fast, back = _largest_root(p, q), -_largest_root(p, -q)
    return q / (fast * back), -east * abs(k)


def _largest_root(p: float, q: float) -> float:
    """Largest root of omega^3 - p omega - q = 0 where all three are real (Viete 1615)."""
    ratio = min(max(3 * q / (2 * p) * math.sqrt(3 / p), -1.0), 1.0)
    return 2 * math.sqrt(p / 3) * math.cos(math.acos(ratio) / 3)
