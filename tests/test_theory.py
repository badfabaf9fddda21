"""Closed results against the equations they solve, root finders, eigen-solvers and published numbers."""

from __future__ import annotations

import inspect
import itertools
import math
from typing import Any

import numpy as np
import pytest

from swmodel.errors import RequestError
from swmodel.theory import THEORY, Theory
from swmodel.theory.scales import (
    beta_parameter,
    burger_number,
    deformation_radius,
    froude_number,
    gravity_wave_speed,
    inertial_period,
    rhines_scale,
    rossby_number,
)
from swmodel.theory.waves import (
    equatorial_frequency,
    equatorial_phase_speed,
    inertia_gravity_frequency,
    inertia_gravity_phase_speed,
    kelvin_direction,
    kelvin_frequency,
    kelvin_phase_speed,
    rossby_frequency,
    rossby_phase_speed,
)

# an ocean of 4 km at mid-latitude, north and south, in SI
LAYER = {"gravity": 9.81, "depth": 4000.0}
C = math.sqrt(9.81 * 4000)
HEMISPHERES = [1e-4, -1e-4]
BETA = 2.29e-11

# ------------------------------------------------------------------------------------------------------- scales


def test_scales_are_the_textbook_numbers() -> None:
    # source: Gill 1982, section 7.2: a barotropic ocean of 4 km has c = 200 m/s and a = 2000 km at mid-latitude;
    # section 11.5: sqrt(c/beta) of some 350 km for c = 2.8 m/s; values from memory, one or two digits
    assert gravity_wave_speed(**LAYER) == pytest.approx(200, rel=0.02)
    assert deformation_radius(**LAYER, f0=1e-4) == pytest.approx(2e6, rel=0.02)
    assert deformation_radius(gravity=2.8**2, depth=1.0, f0=0.0, beta=BETA) == pytest.approx(350e3, rel=0.02)


def test_scales_are_the_same_in_both_hemispheres() -> None:
    for scale in (
        lambda f: deformation_radius(**LAYER, f0=f),
        inertial_period,
        lambda f: rossby_number(1.0, 1e5, f),
        lambda f: beta_parameter(BETA, 1e5, f),
    ):
        assert scale(1e-4) == scale(-1e-4) > 0


def test_an_inertial_day_at_30_degrees_is_one_sidereal_day() -> None:
    # f = 2 Omega sin(30 deg) = Omega; source: 86 164.1 s, common knowledge; tolerance: its digits
    assert inertial_period(2 * 7.292115e-5 * math.sin(math.radians(30))) == pytest.approx(86164.1, abs=0.05)


def test_without_rotation_the_scales_that_need_it_are_infinite() -> None:
    assert deformation_radius(**LAYER, f0=0.0) == math.inf
    assert inertial_period(0.0) == rossby_number(1.0, 1.0, 0.0) == beta_parameter(BETA, 1.0, 0.0) == math.inf
    assert rhines_scale(1.0, 0.0) == math.inf


def test_ratios_are_as_defined() -> None:
    # Ro = sqrt(Bu) Fr for U/(f L) with a = c/f; tolerance: rounding
    a = deformation_radius(**LAYER, f0=1e-4)
    identity = math.sqrt(burger_number(a, 3e5)) * froude_number(0.7, C)
    assert rossby_number(0.7, 3e5, 1e-4) == pytest.approx(identity, rel=1e-14)
    # at the Rhines scale advection U/L equals beta L
    L = rhines_scale(0.7, -BETA)
    assert pytest.approx(BETA * L, rel=1e-14) == 0.7 / L


# ------------------------------------------------------------------------------------------ inertia-gravity waves


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_poincare_waves_are_inertial_when_long_and_gravity_waves_when_short(f0: float) -> None:
    # source: Gill 1982, chapter 8; limits: relative departures (k a)^2/2 and 1/(2 (k a)^2)
    a = C / 1e-4
    assert inertia_gravity_frequency(**LAYER, f0=f0, k=1e-4 / a) == pytest.approx(1e-4, rel=5e-9)
    assert inertia_gravity_frequency(**LAYER, f0=f0, k=1e4 / a) == pytest.approx(C * 1e4 / a, rel=5e-9)


def test_the_grids_poincare_relation_is_the_published_one() -> None:
    # source: Arakawa & Lamb 1977, the C-grid, written out; tolerance: rounding
    f, k, other, dx, dy = -1e-4, 3e-5, -2e-5, 3e4, 5e4
    square = f**2 * math.cos(k * dx / 2) ** 2 * math.cos(other * dy / 2) ** 2
    square += 4 * C**2 / dx**2 * math.sin(k * dx / 2) ** 2 + 4 * C**2 / dy**2 * math.sin(other * dy / 2) ** 2
    found = inertia_gravity_frequency(**LAYER, f0=f, k=k, l=other, dx=dx, dy=dy, on_grid=True)
    assert found == pytest.approx(math.sqrt(square), rel=1e-14)


@pytest.mark.parametrize("f0", HEMISPHERES)
@pytest.mark.parametrize("relation", ["inertia_gravity", "kelvin"])
def test_grid_relations_reach_the_continuous_ones_at_second_order(relation: str, f0: float) -> None:
    def frequency(**grid: Any) -> float:
        function = inertia_gravity_frequency if relation == "inertia_gravity" else kelvin_frequency
        edge = {} if relation == "inertia_gravity" else {"edge": "south"}
        return function(**LAYER, f0=f0, k=2e-6, l=1e-6, **edge, **grid)

    exact = frequency()
    cells = [4e4 / 2**level for level in range(4)]
    errors = [abs(frequency(dx=dx, dy=2 * dx, on_grid=True) - exact) for dx in cells]
    orders = np.diff(np.log2(errors)) * -1
    # fourth-order terms: (k dx)^2/20 = 3e-4 of the error
    np.testing.assert_allclose(orders, 2.0, atol=1e-3)


def test_crests_pass_at_frequency_over_wavenumber_with_its_sign() -> None:
    omega = inertia_gravity_frequency(**LAYER, f0=1e-4, k=-2e-6, l=1e-6)
    # division: rounding
    assert inertia_gravity_phase_speed(**LAYER, f0=1e-4, k=-2e-6, l=1e-6) == pytest.approx(-omega / 2e-6, rel=1e-14)
    northward = inertia_gravity_phase_speed(**LAYER, f0=1e-4, k=-2e-6, l=1e-6, along="y")
    assert northward == pytest.approx(omega / 1e-6, rel=1e-14)
    meridional = inertia_gravity_phase_speed(**LAYER, f0=1e-4, k=0.0, l=-1e-6)
    assert meridional < -C
    assert inertia_gravity_phase_speed(**LAYER, f0=1e-4, k=2e-6) > C


# -------------------------------------------------------------------------------------------------- Kelvin waves

OUTWARD = {"west": (-1, 0), "east": (1, 0), "south": (0, -1), "north": (0, 1)}


@pytest.mark.parametrize("edge", OUTWARD)
@pytest.mark.parametrize("f0", HEMISPHERES)
def test_kelvin_waves_have_the_coast_on_the_right_in_the_north_and_on_the_left_in_the_south(
    edge: Any, f0: float
) -> None:
    # source: Thomson 1879; Gill 1982, chapter 10
    direction = kelvin_direction(f0, edge)
    going = (direction, 0) if edge in ("south", "north") else (0, direction)
    right = (going[1], -going[0])
    side = right[0] * OUTWARD[edge][0] + right[1] * OUTWARD[edge][1]
    assert side == (1 if f0 > 0 else -1)
    assert kelvin_phase_speed(**LAYER, f0=f0, edge=edge) == direction * gravity_wave_speed(**LAYER)


def test_kelvin_waves_do_not_disperse_in_the_continuum_and_lag_on_the_grid() -> None:
    # source: Thomson 1879: omega = c k; on the grid c (2/dy) sin(l dy/2) along a western coast; tolerance: rounding
    keys = {**LAYER, "f0": 1e-4, "edge": "west", "k": 7.0, "l": -2e-6}
    assert kelvin_frequency(**keys) == pytest.approx(C * 2e-6, rel=1e-14)
    on_grid = kelvin_frequency(**keys, dx=1.0, dy=1e5, on_grid=True)
    assert on_grid == pytest.approx(C * 2e-5 * math.sin(0.1), rel=1e-14)
    speed = kelvin_phase_speed(**keys, dx=1.0, dy=1e5, on_grid=True)
    assert speed == pytest.approx(-on_grid / 2e-6, rel=1e-14)


def test_the_equatorial_kelvin_wave_goes_east_whatever_the_sign_of_its_wavenumber() -> None:
    # source: Matsuno 1966; rounding only
    for k in (2e-6, -2e-6):
        assert kelvin_phase_speed(**LAYER, f0=0.0, beta=BETA, k=k) == gravity_wave_speed(**LAYER)
        assert equatorial_phase_speed(**LAYER, beta=BETA, k=k, mode=-1) == pytest.approx(C, rel=1e-14)


# -------------------------------------------------------------------------------------------------- Rossby waves


@pytest.mark.parametrize("f0", HEMISPHERES)
def test_rossby_waves_go_west_in_both_hemispheres(f0: float) -> None:
    for k, other in ((1e-6, 0.0), (-1e-6, 2e-6), (1e-5, -1e-6)):
        assert rossby_phase_speed(**LAYER, f0=f0, beta=1.6e-11, k=k, l=other) < 0
    assert rossby_phase_speed(**LAYER, f0=f0, beta=1.6e-11, k=1e-6) == rossby_phase_speed(
        **LAYER, f0=-f0, beta=1.6e-11, k=-1e-6
    )


def test_rossby_waves_have_the_slowest_root_of_the_shallow_water_cubic() -> None:
    # source: omega^3 - (f^2 + c^2 K^2) omega - beta k c^2 = 0 with f and beta held constant (Gill 1982, section 12.3);
    # tolerance: quasi-geostrophy drops omega^3, relative omega^2/(f^2 + c^2 K^2)
    f, beta, k, other = -1e-4, 1.6e-11, 2e-6, 1e-6
    square = f**2 + C**2 * (k**2 + other**2)
    roots = np.roots([1, 0, -square, -beta * k * C**2])
    slow = roots[np.argmin(np.abs(roots))].real
    omega = rossby_frequency(**LAYER, f0=f, beta=beta, k=k, l=other)
    assert omega == pytest.approx(abs(slow), rel=1.1 * omega**2 / square)
    assert math.copysign(1, slow / k) == math.copysign(1, rossby_phase_speed(**LAYER, f0=f, beta=beta, k=k, l=other))


def test_rossby_waves_are_fastest_where_as_wide_as_the_deformation_radius() -> None:
    # source: Pedlosky 1987, section 3.15: the largest frequency is beta a/2, at k a = 1 with l = 0
    a = C / 1e-4
    at = [rossby_frequency(**LAYER, f0=1e-4, beta=1.6e-11, k=q / a) for q in (0.5, 1.0, 2.0)]
    # rounding
    assert max(at) == at[1] == pytest.approx(1.6e-11 * a / 2, rel=1e-14)


def test_long_rossby_waves_do_not_disperse() -> None:
    # source: Pedlosky 1987: -beta a^2; departure (k a)^2
    a = C / 1e-4
    speed = rossby_phase_speed(**LAYER, f0=-1e-4, beta=1.6e-11, k=1e-4 / a)
    assert speed == pytest.approx(-1.6e-11 * a**2, rel=1e-8)


# ----------------------------------------------------------------------------------------------- what is refused


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (
            lambda: rossby_frequency(**LAYER, f0=1e-4, beta=BETA, k=1e-6, on_grid=True),
            "there is no closed relation of Rossby waves on the grid: f varies, and it depends on the PV flux; "
            "on_grid is known for inertia_gravity and kelvin; leave on_grid out, and allow for the grid in within",
        ),
        (
            lambda: equatorial_frequency(**LAYER, beta=BETA, k=1e-6, mode=1, on_grid=True),
            "there is no closed relation of equatorial waves on the grid: f varies, and it depends on the PV flux; "
            "on_grid is known for inertia_gravity and kelvin; leave on_grid out, and allow for the grid in within",
        ),
        (
            lambda: inertia_gravity_frequency(**LAYER, f0=1e-4, k=1e-6, dx=1.0, on_grid=True),
            "the relation on the grid needs dx and dy; cell sizes above 0",
        ),
        (
            lambda: rossby_frequency(**LAYER, f0=0.0, beta=BETA, k=1e-6),
            "the mid-latitude Rossby wave needs f0; f0 that is not 0; on the equator use equatorial waves",
        ),
        (
            lambda: kelvin_frequency(**LAYER, f0=0.0, edge="south", k=1e-6),
            "there is no Kelvin wave without rotation; f0 that is not 0",
        ),
        (
            lambda: kelvin_frequency(**LAYER, f0=1e-4, k=1e-6),
            "a Kelvin wave off the equator needs its edge; south, east, north, west",
        ),
        (
            lambda: kelvin_frequency(**LAYER, f0=1e-4, k=1e-6, edge="west"),
            "a Kelvin wave needs its wavenumber along the coast; l that is not 0",
        ),
        (
            lambda: equatorial_frequency(**LAYER, beta=BETA, k=1e-6, mode=-2),
            "mode -2; a whole number from -1 on",
        ),
        (
            lambda: equatorial_frequency(**LAYER, beta=0.0, k=1e-6, mode=1),
            "there are no equatorial waves without beta; beta that is not 0",
        ),
        (
            lambda: inertia_gravity_phase_speed(**LAYER, f0=1e-4, k=1e-6, along="y"),
            "a wave that does not vary along y has no phase speed there",
        ),
        (
            lambda: gravity_wave_speed(gravity=9.81, depth=-1.0),
            "gravity 9.81 m/s^2 and depth -1 m; both above 0",
        ),
    ],
)
def test_where_theory_has_no_answer_it_says_why(call: Any, message: str) -> None:
    with pytest.raises(RequestError) as caught:
        call()
    assert str(caught.value) == message


# ------------------------------------------------------------------------------------------------------ the table

KNOWN: dict[str, Any] = {
    **LAYER,
    "f0": -1e-4,
    "beta": BETA,
    "k": 2e-6,
    "l": 1e-6,
    "dx": 1e4,
    "dy": 2e4,
    "mode": 1,
    "edge": "south",
    "unheard_of": 3,
}


@pytest.mark.parametrize("row", THEORY.values(), ids=lambda row: row.name)
def test_every_row_gives_a_number_and_says_what_it_is(row: Theory) -> None:
    assert math.isfinite(row.value(KNOWN))
    assert row.meaning
    assert row.source
    assert row.unit in ("m/s", "m", "rad/s", "s", "1")
    assert set(row.needed) <= set(row.arguments)
    assert inspect.getdoc(row.function)


def test_the_rows_are_those_that_expectations_can_name() -> None:
    pairs = itertools.product(("inertia_gravity", "kelvin", "rossby", "equatorial"), ("frequency", "phase_speed"))
    assert set(THEORY) == {
        "gravity_wave_speed",
        "deformation_radius",
        "inertial_frequency",
        "inertial_turning",
        "inertial_period",
        "adjusted_kinetic_share",
        *("_".join(pair) for pair in pairs),
    }


@pytest.mark.parametrize("wave", ["inertia_gravity", "kelvin", "rossby", "equatorial"])
def test_phase_speed_is_frequency_over_wavenumber(wave: str) -> None:
    speed, omega = (THEORY[f"{wave}_{what}"].value(KNOWN) for what in ("phase_speed", "frequency"))
    # rounding
    assert abs(speed) == pytest.approx(omega / 2e-6, rel=1e-14)


def test_inertial_turning_is_clockwise_in_the_north() -> None:
    # source: Gill 1982, chapter 8
    assert THEORY["inertial_turning"].value({"f0": 1e-4}) == -1e-4
    assert THEORY["inertial_turning"].value({"f0": -1e-4}) == 1e-4
    assert THEORY["inertial_frequency"].value({"f0": -1e-4}) == 1e-4


def test_a_row_says_what_it_still_needs() -> None:
    with pytest.raises(RequestError) as caught:
        THEORY["equatorial_frequency"].value({**LAYER, "beta": BETA, "mode": None})
    assert str(caught.value) == (
        "equatorial_frequency needs k, mode; "
        "equatorial_frequency takes gravity, depth, beta, k, mode, [branch], [on_grid]"
    )
    with pytest.raises(RequestError) as caught:
        THEORY["inertial_period"].value({"f0": 0.0})
    assert str(caught.value) == "inertial_period is infinite here; without rotation there is no such scale"
