"""Basins, random states and plain steppers that the tests of the dynamics share. Units are of order one throughout."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from hypothesis import strategies as st
from numpy.typing import NDArray

from swmodel.dynamics import PV_FLUXES
from swmodel.dynamics.plain import PlainEquations
from swmodel.dynamics.tendency import Equations
from swmodel.grid import Basin, Grid
from swmodel.grid.domain import allocate, inside_centre, inside_u, inside_v
from swmodel.state import State
from swmodel.steppers import STEPPERS, TimeSettings, advance

Array = NDArray[Any]
Fields = tuple[Array, Array, Array]

PERIODIC = {"west": "periodic", "east": "periodic", "south": "periodic", "north": "periodic"}
BOX = {"west": "wall", "east": "wall", "south": "wall", "north": "wall"}
ALONG_X = PERIODIC | {"south": "wall", "north": "wall"}
ALONG_Y = PERIODIC | {"west": "wall", "east": "wall"}
EDGES: dict[str, Any] = {"periodic": PERIODIC, "channel along x": ALONG_X, "channel along y": ALONG_Y, "box": BOX}


@dataclass(frozen=True)
class Combination:
    """Types that a kernel is compiled for; edges, slip, sizes and steppers are numbers at run time."""

    pv_flux: str
    depth: str
    coriolis: str
    linear: bool
    precision: str

    def __str__(self) -> str:
        return f"{self.pv_flux}-{self.depth}-{self.coriolis}-{'linear' if self.linear else 'full'}-{self.precision}"


CHOICES = (tuple(PV_FLUXES), ("even", "uneven"), ("column", "field"), (False, True), ("double", "single"))
ALL = [Combination(*row) for row in itertools.product(*CHOICES)]
# every pair of choices of two different columns stands in some row (closed by test_kernels.py), the two that most runs
# use first: each row costs some 15 s of compiling
PAIRWISE = [
    Combination("both", "even", "column", False, "double"),
    Combination("both", "even", "column", True, "double"),
    Combination("both", "uneven", "column", False, "single"),
    Combination("energy", "uneven", "field", True, "double"),
    Combination("energy", "even", "column", False, "single"),
    Combination("enstrophy", "uneven", "column", False, "double"),
    Combination("enstrophy", "even", "field", True, "single"),
    Combination("both", "uneven", "field", False, "double"),
]
FULL, LINEAR, UNEVEN = PAIRWISE[0], PAIRWISE[1], PAIRWISE[7]
EACH = [pytest.param(row, id=str(row), marks=() if row in PAIRWISE else pytest.mark.slow) for row in ALL]
EACH_PAIRWISE = [pytest.param(row, id=str(row)) for row in PAIRWISE]
# leapfrog's own loop compiles for some 5 s more and knows nothing of the equations: four rows are enough for it
LEAPING = [PAIRWISE[k] for k in (0, 1, 2, 7)]


def stepped(rows: list[Combination]) -> list[Any]:
    """Parameters (combination, stepper), the rarer ones slow."""
    return [
        pytest.param(
            row,
            stepper,
            id=f"{row}-{stepper}",
            marks=() if stepper != "leapfrog" or row in LEAPING else pytest.mark.slow,
        )
        for row in rows
        for stepper in STEPPERS
    ]


@dataclass(frozen=True)
class Turning:
    """A frame with any f(x, y)."""

    coriolis: Callable[[Array, Array], Array]


def make_basin(
    nx: int,
    ny: int,
    dx: float = 1.0,
    dy: float = 1.0,
    *,
    edges: dict[str, Any] = PERIODIC,
    slip: str = "free",
    precision: str = "double",
    gravity: float = 1.0,
    depth: Any = 1.0,
    f: Any = 1.0,
) -> Basin:
    """A basin whose south-west corner is the origin; `depth` and `f` are numbers or functions of (x, y)."""
    grid = Grid(nx, ny, dx, dy, 0.0, 0.0, **edges, slip=slip, precision=precision)
    rest = np.array(np.broadcast_to(depth(*grid.points("centre")), (ny, nx))) if callable(depth) else float(depth)
    frame: Any = Turning(f if callable(f) else lambda x, y: np.full(np.broadcast_shapes(x.shape, y.shape), float(f)))
    return Basin(grid, frame, gravity, rest, float(np.mean(rest)))


def beta_plane(f0: float, beta: float, y0: float = 0.0) -> Callable[[Array, Array], Array]:
    """f = f0 + beta (y - y0)."""
    return lambda x, y: np.broadcast_to(f0 + beta * (y - y0), np.broadcast_shapes(x.shape, y.shape))


def random_basin(rng: np.random.Generator, of: Combination, nx: int, ny: int, edges: str, slip: str = "free") -> Basin:
    """A basin of a combination's types, dx != dy; rough depth between 0.6 and 1.4, f of both signs, closed round."""
    dx, dy = rng.uniform(0.5, 2.0, 2)
    rough = rng.uniform(0.6, 1.4, (ny, nx))
    turning = rng.uniform(-1.0, 1.5, (ny + 1, nx + 1))
    if of.coriolis == "column":
        turning[...] = turning[:, :1]
    if EDGES[edges]["west"] == "periodic":
        turning[:, -1] = turning[:, 0]
    if EDGES[edges]["south"] == "periodic":
        turning[-1] = turning[0]
    return make_basin(
        nx,
        ny,
        float(dx),
        float(dy),
        edges=EDGES[edges],
        slip=slip,
        precision=of.precision,
        gravity=float(rng.uniform(0.5, 2.0)),
        depth=(lambda x, y: rough) if of.depth == "uneven" else 1.1,
        f=lambda x, y: turning,
    )


def random_flow(rng: np.random.Generator, grid: Grid, speed: float = 1.0, eta: float = 0.3) -> Fields:
    """White u and v up to `speed` and eta up to `eta`, of the grid's precision; closed round and shut at walls."""
    u = rng.uniform(-speed, speed, grid.shape("u"))
    v = rng.uniform(-speed, speed, grid.shape("v"))
    if grid.periodic_x:
        u[:, -1] = u[:, 0]
    else:
        u[:, [0, -1]] = 0
    if grid.periodic_y:
        v[-1] = v[0]
    else:
        v[[0, -1]] = 0
    elevation = rng.uniform(-eta, eta, grid.shape("centre"))
    return u.astype(grid.dtype), v.astype(grid.dtype), elevation.astype(grid.dtype)


class Banded(Equations):
    """Equations worked on in as many bands as wanted."""

    chosen = 1

    @property
    def bands(self) -> int:
        return self.chosen


def equations_of(basin: Basin, of: Combination, bands: int = 1) -> Banded:
    equations = Banded(basin, PV_FLUXES[of.pv_flux], linear=of.linear)
    equations.chosen = bands
    return equations


def plain_of(basin: Basin, of: Combination) -> PlainEquations:
    """The reference in double precision, with the depth and f that the kernels see."""
    dtype = basin.grid.dtype
    depth = basin.depth if basin.even else np.asarray(basin.depth, dtype).astype(float)
    if basin.even:
        depth = float(dtype.type(basin.depth))
    own = Basin(basin.grid, basin.frame, float(dtype.type(basin.gravity)), depth, basin.reference_depth)
    own.__dict__["f"] = basin.f.astype(dtype).astype(float)
    return PlainEquations(own, PV_FLUXES[of.pv_flux], of.linear)


def make_state(equations: Equations, fields: Fields) -> State:
    """A state of three sets, all else than its inside NaN before the edges are filled."""
    state = State(equations.basin.grid, 3)
    state.sets[...] = np.nan
    for view, values in zip((state.u, state.v, state.eta), fields, strict=True):
        view[...] = values
    equations.fill(state.sets[0:3])
    return state


def fast_tendency(equations: Equations, fields: Fields) -> Fields:
    """The fused kernels' tendency; whatever is written to holds NaN before."""
    grid = equations.basin.grid
    state = make_state(equations, fields)
    out, base = allocate(grid, 1), allocate(grid, 1)
    out[...] = np.nan
    work = equations.workspace(1)
    work[...] = np.nan
    equations.stage_tendency(state.sets[0:3], out, base, work)
    return inside_u(out[0], grid), inside_v(out[1], grid), inside_centre(out[2], grid)


def time_settings(stepper: str, nu: float = 0.1, alpha: float = 0.7) -> TimeSettings:
    return TimeSettings.model_validate({"until": 1.0, "stepper": stepper, "filter": nu, "williams": alpha})


def run(
    equations: Equations, fields: Fields, stepper: str, dt: float, steps: int, nu: float = 0.1, alpha: float = 0.7
) -> Fields:
    """u, v, eta after so many steps by the compiled sweeps."""
    state = make_state(equations, fields)
    first = STEPPERS[stepper].levels == 2
    advance(state, steps, dt, equations, time_settings(stepper, nu, alpha), first=first)
    return state.u.copy(), state.v.copy(), state.eta.copy()


def watched(
    equations: Equations,
    fields: Fields,
    stepper: str,
    dt: float,
    blocks: int,
    steps: int,
    watch: Callable[[State], Any],
) -> list[Any]:
    """What `watch` sees of the state at the start and after each of so many blocks of steps."""
    state = make_state(equations, fields)
    first = STEPPERS[stepper].levels == 2
    seen = [watch(state)]
    for _ in range(blocks):
        advance(state, steps, dt, equations, time_settings(stepper), first=first)
        first = False
        seen.append(watch(state))
    return seen


def plain_run(
    plain: PlainEquations, fields: Fields, stepper: str, dt: float, steps: int, nu: float = 0.1, alpha: float = 0.7
) -> Fields:
    """The steppers as their papers write them, over whole fields of the reference.

    Shu & Osher 1988, eq. 2.18; Kutta 1901; Williams 2009, eqs. 7 to 9.
    """
    shapes = [a.shape for a in fields]
    cuts = np.cumsum([a.size for a in fields])[:-1]

    def apart(y: Array) -> Fields:
        u, v, eta = (part.reshape(shape) for part, shape in zip(np.split(y, cuts), shapes, strict=True))
        return u, v, eta

    def T(y: Array) -> Array:
        return np.concatenate([a.ravel() for a in plain.tendency(*apart(y))])

    y = np.concatenate([np.asarray(a, float).ravel() for a in fields])
    if stepper == "leapfrog":
        old, y = y, plain_once(T, y, "ssprk3", dt)
        for _ in range(steps - 1):
            new = old + 2 * dt * T(y)
            d = nu / 2 * (old - 2 * y + new)
            old, y = y + alpha * d, new + (alpha - 1) * d
    else:
        for _ in range(steps):
            y = plain_once(T, y, stepper, dt)
    return apart(y)


def plain_once(T: Callable[[Array], Array], y: Array, stepper: str, dt: float) -> Array:
    """One step of a one-step method."""
    if stepper == "ssprk3":
        y1 = y + dt * T(y)
        y2 = 3 / 4 * y + 1 / 4 * (y1 + dt * T(y1))
        return 1 / 3 * y + 2 / 3 * (y2 + dt * T(y2))
    k1 = T(y)
    k2 = T(y + dt / 2 * k1)
    k3 = T(y + dt / 2 * k2)
    k4 = T(y + dt * k3)
    return y + dt / 6 * (k1 + 2 * k2 + 2 * k3 + k4)


EDGE_NAMES = st.sampled_from(sorted(EDGES))
SIZES = st.tuples(st.integers(1, 13), st.integers(1, 13))
SEEDS = st.integers(0, 2**32 - 1)
SLIPS = st.sampled_from(["free", "none"])
