"""Balance on this grid: flows from a streamfunction at corners, and the elevation that holds them.

With u = -dpsi/dy and v = dpsi/dx from corner values the discrete divergence of the flow is 0 to round-off. The
elevation that balances it is the one for which the discrete divergence of the tendency (du/dt, dv/dt) is 0 too: the
balance equation (Charney 1955, Tellus 7; Bolin 1955, Tellus 7) in the run's own differences. So nothing sets gravity
waves going but what is of second order.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from ..errors import Fault, RequestError
from ..grid.basin import Basin
from ..grid.staggered import Grid
from .fixed_point import anderson
from .poisson import solve_at_centres, solve_at_corners

Array = NDArray[np.float64]
BalanceTendency = Callable[[Array, Array, Array, bool], tuple[Array, Array, Array]]
"""``(u, v, eta, linear) -> (du, dv, deta)``, both ends held: by the linear equations, or by the run's own in full."""

ELEVATION_TOLERANCE = 1e-13
"""Largest last correction of eta over largest eta: some 500 times the round-off of a double."""
MOST_ROUNDS = 100
STREAMFUNCTION_TOLERANCE = 1e-6
"""The same for the streamfunction of a given elevation, which then is solved for once more: below truncation errors."""
MOST_STREAMFUNCTION_ROUNDS = 100


def velocities(psi: Array, grid: Grid) -> tuple[Array, Array]:
    """Return u = -dpsi/dy on x-faces and v = dpsi/dx on y-faces, without divergence.

    Parameters
    ----------
    psi : ndarray ``[ny + 1, nx + 1]``
        Streamfunction at corners, m2/s.
    grid : Grid
        The grid.

    Returns
    -------
    tuple of ndarray
        u ``[ny, nx + 1]`` and v ``[ny + 1, nx]``, m/s.
    """
    return (psi[:-1, :] - psi[1:, :]) / grid.dy, (psi[:, 1:] - psi[:, :-1]) / grid.dx


def close_round(field: Array, grid: Grid, *, along_x: bool = True, along_y: bool = True) -> None:
    """Let the last of each periodic direction in which the field lies on faces repeat the first, in place."""
    if along_x and grid.periodic_x:
        field[:, -1] = field[:, 0]
    if along_y and grid.periodic_y:
        field[-1, :] = field[0, :]


def hold_on_walls(psi: Array, grid: Grid) -> Array:
    """Return the streamfunction held constant along each wall, so that nothing flows through it.

    What is added has no vorticity inside: the flow is changed as by the images of its vortices behind the wall, and no
    sheet forms along it. Walls that touch are one; on each the constant is the mean of what lay there.

    Parameters
    ----------
    psi : ndarray ``[ny + 1, nx + 1]``
        Streamfunction at corners, m2/s, the last repeating the first in periodic directions.
    grid : Grid
        The grid.

    Returns
    -------
    ndarray ``[ny + 1, nx + 1]``
        `psi` itself, bit for bit, where it is constant along the walls already.
    """
    excess = np.zeros_like(psi)  # on walls: what lies above the constant
    for wall in _walls(grid):
        on_wall = psi[wall]
        first = on_wall.flat[0]  # taken off, so that the mean of equal values is that value to the last bit
        excess[wall] = on_wall - (first + np.mean(on_wall - first))
    if not excess.any():
        return psi
    # the smooth field that equals the excess on the walls and has no Laplacian inside
    rows = slice(0, -1) if grid.periodic_y else slice(1, -1)
    columns = slice(0, -1) if grid.periodic_x else slice(1, -1)
    smooth = excess.copy()
    smooth[rows, columns] = solve_at_corners(-_corner_laplacian(excess, grid)[rows, columns], grid)
    close_round(smooth, grid)
    held = psi - smooth
    for wall in _walls(grid):
        held[wall] = (psi - excess)[wall].flat[0]
    return held


def _walls(grid: Grid) -> list[NDArray[np.bool_]]:
    """Corners on each connected wall: one ring round a box, two lines of a channel, none where all is periodic."""
    west, east, south, north = (np.zeros((grid.ny + 1, grid.nx + 1), bool) for _ in range(4))
    west[:, 0] = east[:, -1] = south[0, :] = north[-1, :] = True
    if grid.periodic_x and grid.periodic_y:
        return []
    if grid.periodic_x:
        return [south, north]
    if grid.periodic_y:
        return [west, east]
    return [west | east | south | north]


def _corner_laplacian(psi: Array, grid: Grid) -> Array:
    """Second differences at corners; meaningless on walls."""
    padded = np.pad(psi, 1)
    if grid.periodic_x:
        padded[:, 0], padded[:, -1] = padded[:, -3], padded[:, 2]
    if grid.periodic_y:
        padded[0, :], padded[-1, :] = padded[-3, :], padded[2, :]
    middle = padded[1:-1, 1:-1]
    along_x = padded[1:-1, 2:] - 2 * middle + padded[1:-1, :-2]
    along_y = padded[2:, 1:-1] - 2 * middle + padded[:-2, 1:-1]
    return along_x / grid.dx**2 + along_y / grid.dy**2


def geostrophic_streamfunction(eta: Array, basin: Basin) -> Array:
    """Return psi = g eta/f at corners, eta being the mean of the cells round the corner.

    Parameters
    ----------
    eta : ndarray ``[ny, nx]``
        Elevation, m.
    basin : Basin
        For g, f and the grid.

    Raises
    ------
    RequestError
        Where f is 0 or changes its sign in the domain.
    """
    grid = basin.grid
    lowest, highest = float(np.min(basin.f)), float(np.max(basin.f))
    if not (lowest > 0 or highest < 0):
        where = "everywhere" if lowest == highest else f"somewhere: it runs from {lowest:.3g} to {highest:.3g} rad/s"
        raise RequestError(
            Fault(
                ("balance",),
                f"an elevation is balanced by the flow g eta/f, and f is 0 {where}",
                "f of one sign over the whole domain",
                'balance = "none", or a vortex or jet, whose flow is given',
            )
        )
    around = np.pad(eta, ((1, 1), (0, 0)), mode="wrap" if grid.periodic_y else "edge")
    around = np.pad(around, ((0, 0), (1, 1)), mode="wrap" if grid.periodic_x else "edge")
    south, north = around[:-1, :-1] + around[:-1, 1:], around[1:, :-1] + around[1:, 1:]
    psi = basin.gravity * ((south + north) / 4) / basin.f
    close_round(psi, grid)
    return psi


def tendency_divergence(du: Array, dv: Array, grid: Grid) -> Array:
    """Divergence of the tendency at centres, s-2, ``[ny, nx]``."""
    return (du[:, 1:] - du[:, :-1]) / grid.dx + (dv[1:, :] - dv[:-1, :]) / grid.dy


def balanced_elevation(
    u: Array, v: Array, basin: Basin, tendency: BalanceTendency, *, linear: bool, mean: float = 0.0
) -> Array:
    """Return the elevation for which the divergence of the tendency is 0 to round-off.

    The part of the tendency that is not -g grad(eta) does not know eta in the linear equations, and knows it only
    through differences of grid scale in the full ones: each round solves Poisson's equation for what is left.

    Parameters
    ----------
    u, v : ndarray ``[ny, nx + 1]``, ``[ny + 1, nx]``
        The flow, m/s.
    basin : Basin
        Where it lives.
    tendency : callable
        The run's own tendency.
    linear : bool
        Balance by the linear equations instead of those in full.
    mean : float
        Mean of the elevation, m, which no flow determines.

    Raises
    ------
    RequestError
        Where the layer would have to be thinner than nothing, or the rounds do not close in.
    """
    eta = np.full((basin.grid.ny, basin.grid.nx), mean)
    correction = eta
    for _ in range(MOST_ROUNDS):
        du, dv, _deta = tendency(u, v, eta, linear)
        correction = solve_at_centres(tendency_divergence(du, dv, basin.grid), basin.grid) / basin.gravity
        eta = eta + correction
        if not linear:
            _refuse_outcrop(eta, basin)
        if np.max(np.abs(correction)) <= ELEVATION_TOLERANCE * np.max(np.abs(eta)):
            return eta
    left = float(np.max(np.abs(correction)) / np.max(np.abs(eta)))
    thinnest = float(np.min(basin.depth_field + eta))
    raise RequestError(
        Fault(
            ("balance",),
            f"no balanced elevation was found: after {MOST_ROUNDS} rounds it still changes by {left:.2g} of its size, "
            f"with the layer {thinnest:.3g} m thick at its thinnest",
            remedy='a slower or wider flow, a deeper layer, or balance = "none"',
        )
    )


def _refuse_outcrop(eta: Array, basin: Basin) -> None:
    """Raise where the full equations have no meaning."""
    thickness = basin.depth_field + eta
    low = float(np.min(thickness))
    if low > 0:
        return
    j, i = np.unravel_index(int(np.argmin(thickness)), thickness.shape)
    raise RequestError(
        Fault(
            ("balance",),
            f"the elevation that would hold this flow leaves a thickness of {low:.3g} m at "
            f"x = {basin.grid.x[i]:.6g} m, y = {basin.grid.y[j]:.6g} m",
            "a thickness above 0 everywhere",
            'a slower or narrower flow, a deeper layer, or balance = "none"',
        )
    )


def gradient_streamfunction(eta: Array, basin: Basin, tendency: BalanceTendency) -> Array:
    """Return the streamfunction whose flow the given elevation holds by the equations in full.

    What is to be met is the elevation that geostrophy gives the streamfunction g eta/f: eta as seen through the means
    between centres and corners. The divergence of the tendency says what elevation is still missing, and g/f times that
    how to correct the streamfunction.

    Parameters
    ----------
    eta : ndarray ``[ny, nx]``
        Elevation, m.
    basin : Basin
        Where it lives; f keeps one sign over the domain.
    tendency : callable
        The run's own tendency.

    Raises
    ------
    RequestError
        Where the rounds do not close in: round a high the pressure gradient may exceed what any circling flow balances.
    """
    grid = basin.grid
    first = hold_on_walls(geostrophic_streamfunction(eta, basin), grid)
    flow = velocities(first, grid)
    aim = balanced_elevation(*flow, basin, tendency, linear=True, mean=float(np.mean(eta)))
    _refuse_outcrop(aim, basin)
    size = float(np.max(np.abs(first)))

    def correction(share: Array) -> Array:
        du, dv, _deta = tendency(*velocities(first + size * share, grid), aim, False)
        missing = solve_at_centres(tendency_divergence(du, dv, grid), grid) / -basin.gravity
        return hold_on_walls(geostrophic_streamfunction(missing, basin), grid) / size

    with np.errstate(all="ignore"):  # where it does not close in, values may overflow on the way
        share = anderson(
            correction, np.zeros_like(first), tolerance=STREAMFUNCTION_TOLERANCE, rounds=MOST_STREAMFUNCTION_ROUNDS
        )
    if share is None:
        raise RequestError(_NO_FLOW)
    return first + size * share


_NO_FLOW = Fault(
    ("balance",),
    "no flow was found that holds this elevation in gradient balance",
    "round a high the slope of the surface must stay under f^2 r/(4 g), r the distance from its middle; "
    "beside a front the shear must stay under f",
    'a lower or wider one, balance = "geostrophic", or a vortex or jet, whose flow is given',
)
