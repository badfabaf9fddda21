"""The rotating frame against published gravity, shape and rotation of the bodies, and against geometry."""

from __future__ import annotations

import math
import subprocess
import sys
from typing import Any, get_args

import gsw
import numpy as np
import pytest

from swmodel.frame import (
    BODIES,
    PLANES,
    STANDARD_GRAVITY,
    Body,
    Constant,
    Frame,
    FrameSettings,
    build_frame,
    coriolis_acceleration,
    geopotential,
    traditional_acceleration,
)
from swmodel.frame.geopotential import equator_gravity, pole_gravity
from swmodel.frame.settings import BodyName, PlaneName

EARTH = BODIES["earth"]
assert isinstance(EARTH, Body)
PLANETS = [body for body in BODIES.values() if isinstance(body, Body)]
LATITUDES = np.array([-90.0, -67.5, -45.0, -10.0, -0.1, 0.0, 0.1, 10.0, 30.0, 45.0, 67.5, 90.0])


def frame_at(middle_y: float = 0.0, **keys: Any) -> Frame:
    return build_frame(FrameSettings(**keys), middle_y)


def planet(name: str) -> Body:
    body = BODIES[name]
    assert isinstance(body, Body)
    return body


# ------------------------------------------------------------------------------------------------ f and gravity


@pytest.mark.parametrize("latitude", LATITUDES)
def test_coriolis_parameter_is_that_of_teos10_in_both_hemispheres(latitude: float) -> None:
    # source: gsw.f, TEOS-10 (IOC et al. 2010), the same Omega; tolerance: rounding of one product and one sine
    assert frame_at(latitude=f"{latitude} deg").f0 == pytest.approx(gsw.f(latitude), rel=1e-15, abs=1e-20)


@pytest.mark.parametrize("latitude", LATITUDES)
def test_gravity_is_that_of_teos10_at_the_sea_surface(latitude: float) -> None:
    # source: gsw.grav, TEOS-10; its polynomial differs from WGS 84's closed formula by up to 2.2e-7
    assert frame_at(latitude=f"{latitude} deg").gravity == pytest.approx(gsw.grav(latitude, 0.0), rel=3e-7)


def test_gravity_at_equator_poles_and_on_average_is_that_of_wgs84() -> None:
    # source: NIMA TR8350.2, tables 3.3 and 3.4 (the mean: value from memory); tolerance: the ten digits published
    assert frame_at(plane="equatorial").gravity == pytest.approx(9.7803253359, abs=1e-10)
    for pole in ("90 deg", "-90 deg"):
        assert frame_at(latitude=pole).gravity == pytest.approx(9.8321849378, abs=1e-10)
    assert frame_at(plane="none").gravity == pytest.approx(9.7976432222, abs=1e-10)


def test_gravity_derived_from_the_geopotential_is_the_published_one_for_earth() -> None:
    # source: NIMA TR8350.2; tolerance: J4 is known to three digits (5e-9, five times that at the pole), J6 adds 7e-8
    GM, J2, J4, R = (EARTH.GM.value, EARTH.J2.value, EARTH.J4.value, EARTH.reference_radius.value)
    Omega, b = EARTH.rotation_rate.value, EARTH.polar_radius.value
    at_equator = equator_gravity(R, GM=GM, rotation_rate=Omega, reference_radius=R, J2=J2, J4=J4)
    assert at_equator == pytest.approx(9.7803253359, rel=1e-7)
    assert pole_gravity(b, GM=GM, reference_radius=R, J2=J2, J4=J4) == pytest.approx(9.8321849378, rel=1e-7)


@pytest.mark.parametrize(
    ("name", "published", "digits"),
    [("mars", 3.71, 0.005), ("titan", 1.354, 0.0005)],
)
def test_equator_gravity_of_other_bodies_is_the_published_one(name: str, published: float, digits: float) -> None:
    # source: NASA planetary fact sheets, values from memory; tolerance: their last digit
    assert frame_at(body=name, plane="equatorial").gravity == pytest.approx(published, abs=digits)


def test_gravity_of_jupiter_at_equator_and_pole_is_the_published_one() -> None:
    # source: Lindal et al. 1981, J. Geophys. Res. 86, at 1 bar: 23.12 and 27.01 m/s^2, values from memory
    # tolerance: its winds of some 100 m/s change the centrifugal part by 2 Omega u = 0.035 m/s^2
    assert planet("jupiter").gravity(0.0) == pytest.approx(23.12, abs=0.04)
    assert planet("jupiter").gravity(math.pi / 2) == pytest.approx(27.01, abs=0.04)


@pytest.mark.parametrize(
    ("name", "period", "digits"),
    [
        ("earth", 86164.10, 0.01),
        ("mars", 88642.66, 0.01),
        ("jupiter", 35729.71, 0.01),
        ("saturn", 38362.4, 0.1),
        ("titan", 15.945 * 86400, 0.0005 * 86400),
    ],
)
def test_a_body_turns_once_in_its_published_period(name: str, period: float, digits: float) -> None:
    # source: sidereal periods in common use (Titan: its orbit's), values from memory; tolerance: their last digit
    assert 2 * math.pi / planet(name).rotation_rate.value == pytest.approx(period, abs=digits)


def test_f_and_beta_at_45_degrees_are_the_textbook_numbers() -> None:
    # source: Gill 1982, appendix: f = 1.031e-4 1/s and beta = 1.62e-11 1/(m s) at 45 deg; tolerance: their digits
    frame = frame_at(latitude="45 deg", plane="beta")
    assert frame.f0 == pytest.approx(1.031e-4, abs=5e-8)
    assert frame.beta == pytest.approx(1.62e-11, abs=5e-14)
    assert frame_at(plane="equatorial").beta == pytest.approx(2.29e-11, abs=5e-14)


# ------------------------------------------------------------------------------------------------- geopotential


def test_earths_level_surface_has_the_published_figure_only_with_its_oblateness() -> None:
    # source: hydrostatics with the constants of WGS 84 (NIMA TR8350.2), whose own a - b is 21 384.686 m
    # tolerance: the digits to which each figure is stated
    a = EARTH.equatorial_radius.value
    height = {harmonics: a - EARTH.level_radius(math.pi / 2, harmonics=harmonics) for harmonics in (0, 2, 4)}
    assert a - EARTH.polar_radius.value == pytest.approx(21384.686, abs=0.0005)
    assert height[0] == pytest.approx(11020, abs=0.5)
    assert height[2] == pytest.approx(21394.3, abs=0.05)
    assert height[4] == pytest.approx(21384.64, abs=0.005)
    # for a point mass closed: G M/b = G M/a + Omega^2 a^2/2; tolerance: 1e-14 of the radius, 6e-8 m, twice
    q = EARTH.rotation_rate.value**2 * a**3 / (2 * EARTH.GM.value)
    assert height[0] == pytest.approx(a * q / (1 + q), abs=2e-7)


def test_jupiters_level_surface_reaches_its_published_polar_radius() -> None:
    # source: Archinal et al. 2018, polar radius 66 854 km; tolerance: its published uncertainty, 10 km
    assert planet("jupiter").level_radius(math.pi / 2) == pytest.approx(66854e3, abs=10e3)


@pytest.mark.parametrize("body", PLANETS, ids=lambda body: body.name)
def test_a_level_surface_has_one_geopotential_and_is_the_same_north_and_south(body: Body) -> None:
    constants = {
        "GM": body.GM.value,
        "rotation_rate": body.rotation_rate.value,
        "reference_radius": body.reference_radius.value,
        "J2": body.J2.value,
        "J4": body.J4.value,
    }
    level = geopotential(body.equatorial_radius.value, 0.0, **constants)
    for degrees in (0.0, 20.0, 45.0, 70.0, 90.0):
        north, south = body.level_radius(math.radians(degrees)), body.level_radius(-math.radians(degrees))
        # the root is found to 1e-14 of the radius, the potential rounds a few times
        assert geopotential(north, math.radians(degrees), **constants) == pytest.approx(level, rel=1e-13)
        assert north == south


@pytest.mark.parametrize("latitude", [0.0, 0.4, -1.1, math.pi / 2])
def test_gravity_is_the_slope_of_the_geopotential(latitude: float) -> None:
    constants = {
        "GM": EARTH.GM.value,
        "rotation_rate": EARTH.rotation_rate.value,
        "reference_radius": EARTH.reference_radius.value,
        "J2": EARTH.J2.value,
        "J4": EARTH.J4.value,
    }
    r, step = EARTH.level_radius(latitude), 100.0
    upward = geopotential(r + step, latitude, **constants) - geopotential(r - step, latitude, **constants)
    d = step / r
    northward = geopotential(r, latitude + d, **constants) - geopotential(r, latitude - d, **constants)
    # geographic latitude of that point, where WGS 84's closed formula wants it
    flattened = (EARTH.equatorial_radius.value / EARTH.polar_radius.value) ** 2
    geographic = math.atan2(flattened * math.sin(latitude), math.cos(latitude))
    # tolerance: Phi = 6e7 m2/s2 rounds to 1e-8, over 200 m; and the harmonics left out (7e-8)
    assert math.hypot(upward, northward) / (2 * step) == pytest.approx(EARTH.gravity(geographic), rel=1e-7)


# ----------------------------------------------------------------------------------------- Coriolis acceleration


@pytest.mark.parametrize("degrees", [-90, -35, 0, 35, 90])
def test_coriolis_acceleration_is_minus_twice_omega_cross_v_and_does_no_work(degrees: float) -> None:
    latitude, Omega = math.radians(degrees), 7.292115e-5
    velocity = np.random.default_rng(1).normal(size=(3, 50))
    vector = Omega * np.array([0.0, math.cos(latitude), math.sin(latitude)])
    found = coriolis_acceleration((velocity[0], velocity[1], velocity[2]), latitude, Omega)
    # source: definition; tolerance: rounding of two products, on accelerations of 1e-4
    np.testing.assert_allclose(found, -2 * np.cross(vector, velocity.T).T, rtol=0, atol=1e-18)
    np.testing.assert_allclose((found * velocity).sum(0), 0.0, atol=1e-18)


def test_shallow_water_keeps_the_horizontal_part_of_horizontal_flow() -> None:
    latitude, Omega = math.radians(-30), 7.292115e-5
    whole = coriolis_acceleration((3.0, -2.0, 0.0), latitude, Omega)
    kept = traditional_acceleration((3.0, -2.0), 2 * Omega * math.sin(latitude))
    np.testing.assert_array_equal(kept, whole[:2])


def test_inertial_motion_turns_clockwise_in_the_north_and_anticlockwise_in_the_south() -> None:
    # source: Gill 1982, chapter 8
    for latitude, sense in (("40 deg", -1), ("-40 deg", 1), ("1 deg", -1), ("-1 deg", 1)):
        f = frame_at(latitude=latitude).f0
        u, v = 0.3, -0.2
        du, dv = traditional_acceleration((u, v), f)
        turning = (u * dv - v * du) / (u**2 + v**2)
        assert math.copysign(1, turning) == sense
        # rate -f exactly: rounding of a few products
        assert turning == pytest.approx(-f, rel=1e-14)


def test_the_part_left_out_is_depth_over_length_times_cot_of_latitude() -> None:
    # source: scale analysis, Gerkema et al. 2008, Rev. Geophys. 46; tolerance: rounding
    for degrees in (45, -45):
        frame = frame_at(latitude=f"{degrees} deg")
        assert frame.neglected_share(4000.0, 1e5, 1e6) == pytest.approx(0.04, rel=1e-14)
    steep = frame_at(latitude="-10 deg").neglected_share(4000.0, 1e5, 1e6)
    assert steep == pytest.approx(0.04 / math.tan(math.radians(10)), rel=1e-14)
    equator = frame_at(plane="equatorial")
    assert equator.neglected_share(4000.0, 1e5, 3e5) == pytest.approx(0.04 * equator.radius / 3e5, rel=1e-14)
    assert frame_at(latitude="0 deg").neglected_share(4000.0, 1e5, 3e5) == math.inf


def test_nothing_is_left_out_at_a_pole_on_a_turntable_or_without_rotation() -> None:
    assert frame_at(plane="tank", rotation_rate="10 rpm").neglected_share(0.2, 0.5, 1.0) == 0
    assert frame_at(plane="none").neglected_share(0.2, 0.5, 1.0) == 0
    # the cosine of the double nearest to 90 deg is 6e-17
    assert frame_at(plane="polar", latitude="-90 deg").neglected_share(4e3, 4e3, 1e6) == pytest.approx(0, abs=1e-16)


# ------------------------------------------------------------------------------------------------------- planes

Y = np.linspace(-2e6, 2e6, 9)[:, None]
X = np.linspace(-1e6, 1e6, 5)[None, :]


@pytest.mark.parametrize("degrees", [-60, -20, 0, 20, 60])
def test_the_sine_plane_has_the_spheres_f_at_every_distance(degrees: float) -> None:
    frame = frame_at(latitude=f"{degrees} deg", plane="sine", y0="300 km")
    exact = 2 * 7.292115e-5 * np.sin(math.radians(degrees) + (Y - 3e5) / frame.radius)
    # tolerance: rounding of a sum of two products of the size of 2 Omega
    np.testing.assert_allclose(frame.coriolis(X, Y), exact + 0 * X, rtol=0, atol=1e-19)


@pytest.mark.parametrize("degrees", [-60, -20, 0, 20, 60])
def test_the_beta_plane_is_tangent_to_the_sine_plane(degrees: float) -> None:
    keys = {"latitude": f"{degrees} deg", "y0": "300 km"}
    near = 3e5 + np.array([[-1e4], [0.0], [1e4]])
    beta_plane, sine_plane = (frame_at(plane=plane, **keys) for plane in ("beta", "sine"))
    # Taylor: the second-order term, 2 Omega (s/R)^2/2, is 1.8e-10 at 10 km
    np.testing.assert_allclose(beta_plane.coriolis(0.0, near), sine_plane.coriolis(0.0, near), rtol=0, atol=1.8e-10)
    assert beta_plane.coriolis(0.0, 3e5) == beta_plane.f0


@pytest.mark.parametrize("pole", ["90 deg", "-90 deg"])
def test_the_polar_plane_is_second_order_in_distance_round_either_pole(pole: str) -> None:
    frame = frame_at(plane="polar", latitude=pole)
    r = np.hypot(X, Y)
    exact = math.copysign(2 * 7.292115e-5, frame.f0) * np.cos(r / frame.radius)
    # Taylor: the first term left out is f0 (r/R)^4/24
    error = np.abs(frame.coriolis(X, Y) - exact)
    assert np.all(error <= abs(frame.f0) * (r / frame.radius) ** 4 / 24 + 1e-19)
    assert math.copysign(1, frame.f0) == (1 if pole == "90 deg" else -1)
    assert frame.coriolis(0.0, 0.0) == frame.f0


def test_the_equatorial_plane_is_odd_about_its_equator() -> None:
    frame = frame_at(plane="equatorial", y0="100 km")
    north, south = frame.coriolis(0.0, 1e5 + 5e5), frame.coriolis(0.0, 1e5 - 5e5)
    assert north > 0
    assert south == -north
    assert frame.coriolis(0.0, 1e5) == 0


def test_a_turntable_has_twice_its_rate_and_turns_either_way() -> None:
    # 10 rpm = 10 2 pi/60 rad/s; tolerance: rounding
    for text, sense in (("10 rpm", 1), ("-10 rpm", -1)):
        frame = frame_at(plane="tank", rotation_rate=text)
        np.testing.assert_allclose(frame.coriolis(X, Y), sense * 2 * 10 * 2 * math.pi / 60, rtol=1e-15)
        # source: CGPM 1901
        assert frame.gravity == STANDARD_GRAVITY.value == 9.80665
        assert (frame.body, frame.latitude, frame.radius) == (None, None, math.inf)


def test_without_rotation_f_is_zero_everywhere_and_gravity_stays() -> None:
    frame = frame_at(plane="none", body="mars")
    np.testing.assert_array_equal(frame.coriolis(X, Y), np.zeros((9, 5)))
    assert frame.gravity == planet("mars").mean_gravity


@pytest.mark.parametrize("plane", ["f", "beta", "sine", "polar"])
@pytest.mark.parametrize("body", [body.name for body in PLANETS])
def test_the_southern_hemisphere_is_the_northern_one_mirrored(plane: str, body: str) -> None:
    degrees = 90 if plane == "polar" else 40
    north, south = (frame_at(body=body, plane=plane, latitude=f"{sign * degrees} deg") for sign in (1, -1))
    assert north.f0 > 0
    assert south.f0 == -north.f0
    assert (south.beta, south.gravity) == (north.beta, north.gravity)
    # rounding of sine and cosine of either sign: none
    np.testing.assert_array_equal(south.coriolis(X, -Y), -north.coriolis(X, Y))


@pytest.mark.parametrize("plane", ["f", "beta", "equatorial", "sine", "polar", "none", "tank"])
def test_f_comes_in_the_shape_to_which_the_points_broadcast(plane: str) -> None:
    given = {
        "equatorial": {},
        "none": {},
        "tank": {"rotation_rate": 1.0},
        "polar": {"latitude": "90 deg"},
    }
    frame = frame_at(plane=plane, **given.get(plane, {"latitude": "45 deg"}))
    assert frame.coriolis(X, Y).shape == (9, 5)
    assert frame.coriolis(0.0, 0.0).shape == ()
    assert frame.coriolis(X, Y).dtype == np.float64


def test_the_latitudes_own_line_is_the_middle_of_the_domain_unless_given() -> None:
    assert frame_at(250e3, latitude="45 deg", plane="beta").y0 == 250e3
    assert frame_at(250e3, latitude="45 deg", plane="beta", y0="10 km").y0 == 10e3
    assert frame_at(250e3, latitude="90 deg", plane="polar").y0 == 0
    assert frame_at(250e3, plane="tank", rotation_rate=1.0).y0 == 0


# ------------------------------------------------------------------------------------------------ given outright


def test_what_is_given_outright_goes_before_the_bodys_own() -> None:
    frame = frame_at(latitude="30 deg", plane="beta", gravity=10.0, rotation_rate=1e-4, radius="5000 km")
    # 2 Omega sin(30 deg) = Omega, 2 Omega cos(30 deg)/R = sqrt(3) Omega/R; tolerance: rounding
    assert frame.f0 == pytest.approx(1e-4, rel=1e-15)
    assert frame.beta == pytest.approx(math.sqrt(3) * 1e-4 / 5e6, rel=1e-15)
    assert frame.gravity == 10


def test_f_given_outright_needs_no_latitude_and_keeps_its_sign() -> None:
    frame = frame_at(f0="-1e-4 rad/s")
    assert (frame.f0, frame.beta, frame.latitude) == (-1e-4, 0, None)
    sloping = frame_at(plane="beta", f0=-1e-4, beta="2e-11 1/m/s")
    assert sloping.coriolis(0.0, 1e6) == pytest.approx(-1e-4 + 2e-5, rel=1e-14)
    assert frame_at(plane="equatorial", beta=3e-11).coriolis(0.0, -1e6) == pytest.approx(-3e-5, rel=1e-14)


def test_the_sine_plane_from_f_and_beta_is_the_one_from_the_latitude() -> None:
    whole = frame_at(plane="sine", latitude="-25 deg")
    outright = frame_at(plane="sine", f0=whole.f0, beta=whole.beta)
    np.testing.assert_array_equal(outright.coriolis(X, Y), whole.coriolis(X, Y))
    # cos from f0 = 2 Omega sin: rounding
    assert outright.horizontal_coriolis == pytest.approx(whole.horizontal_coriolis, rel=1e-14)


def test_the_slope_on_the_body_is_known_where_the_plane_drops_it() -> None:
    flat, sloping = (frame_at(latitude="-50 deg", plane=plane) for plane in ("f", "beta"))
    assert flat.beta == 0
    # two ways to write one product
    assert flat.sphere_beta == pytest.approx(sloping.beta, rel=1e-15)
    assert frame_at(plane="tank", rotation_rate=1.0).sphere_beta == 0


def test_a_body_of_ones_own_is_what_is_given() -> None:
    keys = {"body": "custom", "gravity": 3.0, "rotation_rate": "2 cycle/day", "radius": "4000 km"}
    frame = frame_at(plane="beta", latitude="90 deg", **keys)
    # 2 Omega, Omega = 2 cycles a day; tolerance: rounding
    assert frame.f0 == pytest.approx(2 * 2 * 2 * math.pi / 86400, rel=1e-15)
    assert (frame.body, frame.gravity, frame.radius) == (None, 3, 4e6)
    assert frame_at(body="custom", gravity=3.0, f0=1e-4).rotation_rate == 0.5e-4


# ------------------------------------------------------------------------------------------------------- tables


def test_what_may_be_written_is_what_the_tables_hold() -> None:
    assert set(get_args(BodyName)) == set(BODIES)
    assert set(get_args(PlaneName)) == set(PLANES)
    assert all(
        plane.name == name and set(plane.refuses) <= set(FrameSettings.model_fields) for name, plane in PLANES.items()
    )


@pytest.mark.parametrize("row", [*BODIES.values(), *PLANES.values()], ids=lambda row: row.name)
def test_every_row_says_what_it_is_and_where_it_is_from(row: Any) -> None:
    assert row.meaning
    assert "\n" not in row.meaning
    assert row.source


@pytest.mark.parametrize("body", PLANETS, ids=lambda body: body.name)
def test_every_constant_of_a_body_has_a_unit_and_a_source(body: Body) -> None:
    constants = [value for value in vars(body).values() if isinstance(value, Constant)]
    assert len(constants) == 8
    assert all(constant.unit and len(constant.source) > 10 for constant in constants)
    assert body.polar_radius.value < body.mean_radius.value < body.equatorial_radius.value


def test_the_frame_loads_without_the_heavy_libraries() -> None:
    heavy = "{'scipy', 'numba', 'h5py', 'pint'}"
    code = f"import sys, swmodel.frame, swmodel.theory; print(sorted({heavy} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
