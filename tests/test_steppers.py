"""Steppers: their algebra first, then what a run of them does, then the step that is chosen."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from flows import EDGES, LINEAR, equations_of, make_basin, make_state, random_flow, run, time_settings, watched
from hypothesis import given, settings
from hypothesis import strategies as st

from swmodel.dynamics import PV_FLUXES
from swmodel.dynamics.frequency import largest_frequency
from swmodel.errors import RequestError
from swmodel.steppers import (
    STEPPERS,
    TimeSettings,
    advance,
    choose_step,
    common_divisor,
    filtered_leapfrog_matrix,
    leapfrog_limit,
    stability_limit,
)

ONE_STEP = [name for name, stepper in STEPPERS.items() if stepper.levels == 1]
FILTERS = [(0.0, 1.0), (0.1, 0.7), (0.2, 0.53)]


def tableau(stepper):
    """Runge-Kutta coefficients A and b that follow from the stages (Butcher 1964, J. Austral. Math. Soc. 4)."""
    n = len(stepper.stages)
    rows = [np.zeros(n)]
    for s, (blend, weight) in enumerate(stepper.stages):
        gathered = stepper.gathers and s == n - 1
        base = (rows[1] + 2 * rows[2] + rows[3]) / 3 if gathered else np.zeros(n)
        rows.append(base + blend * (rows[s] - base) + weight * np.eye(n)[s])
    return np.array(rows[:-1]), rows[-1]


@pytest.mark.parametrize("name", ONE_STEP)
def test_coefficient_properties(name):
    # the order conditions up to order 4 (Hairer, Norsett & Wanner 1993, Solving ODEs I, II.2)
    stepper = STEPPERS[name]
    A, b = tableau(stepper)
    c = A.sum(1)
    conditions = {
        1: [(b.sum(), 1)],
        2: [(b @ c, 1 / 2)],
        3: [(b @ c**2, 1 / 3), (b @ A @ c, 1 / 6)],
        4: [(b @ c**3, 1 / 4), (b @ (c * (A @ c)), 1 / 8), (b @ A @ c**2, 1 / 12), (b @ A @ A @ c, 1 / 24)],
    }
    for order in range(1, stepper.order + 1):
        for found, wanted in conditions[order]:
            # round-off of sums of products of a few thirds
            assert found == pytest.approx(wanted, abs=1e-15)
    if stepper.order < 4:
        assert any(abs(found - wanted) > 1e-3 for found, wanted in conditions[stepper.order + 1])
    # the shares that the energy budget weights the stages with are the b of the method
    np.testing.assert_allclose(stepper.quadrature, b, rtol=0, atol=1e-15)


def test_the_stages_of_rk4_are_the_classical_ones():
    # Kutta 1901; Hairer et al. 1993, table II.1.2
    A, b = tableau(STEPPERS["rk4"])
    np.testing.assert_allclose(A, [[0, 0, 0, 0], [1 / 2, 0, 0, 0], [0, 1 / 2, 0, 0], [0, 0, 1, 0]], atol=1e-16)
    np.testing.assert_allclose(b, [1 / 6, 1 / 3, 1 / 3, 1 / 6], atol=1e-16)


def test_every_stage_of_ssprk3_is_a_mean_of_euler_steps():
    # Shu & Osher 1988: with T a forward Euler step of dt keeps a bound, each stage is a convex mean of such steps
    for blend, weight in STEPPERS["ssprk3"].stages:
        assert 0 <= blend <= 1
        assert weight == blend


@pytest.mark.parametrize("p", [0.1, 0.5, 1.0, 1.7])
def test_amplification_of_ssprk3(p):
    # any three-stage third-order method: A = 1 + z + z^2/2 + z^3/6 (Durran 2010, section 2.3), so
    # |A|^2 = 1 - p^4/12 + p^6/36 on the imaginary axis
    factor = STEPPERS["ssprk3"].amplification(p)
    z = 1j * p
    assert factor == pytest.approx(1 + z + z**2 / 2 + z**3 / 6, abs=1e-15)
    assert abs(factor) ** 2 == pytest.approx(1 - p**4 / 12 + p**6 / 36, abs=1e-15)


@pytest.mark.parametrize("p", [0.1, 0.5, 1.0, 2.0, 2.8])
def test_amplification_of_rk4(p):
    # A = 1 + z + z^2/2 + z^3/6 + z^4/24 (Durran 2010), so |A|^2 = 1 - p^6/72 + p^8/576
    factor = STEPPERS["rk4"].amplification(p)
    z = 1j * p
    # powers of 2.8 up to 61/24: some ten units in the last place
    assert factor == pytest.approx(1 + z + z**2 / 2 + z**3 / 6 + z**4 / 24, abs=3e-15)
    assert abs(factor) ** 2 == pytest.approx(1 - p**6 / 72 + p**8 / 576, abs=3e-15)


def test_phase_and_damping_of_slow_waves_are_as_documented():
    # numerics: ssprk3 runs fast by p^4/30 and damps p^4/24 a step; rk4 runs slow by p^4/120. The series go on with p^6:
    # at p = 0.1 a hundredth of the leading term
    p = 0.1
    A = STEPPERS["ssprk3"].amplification(p)
    assert math.atan2(A.imag, A.real) / p - 1 == pytest.approx(p**4 / 30, rel=0.01)
    assert 1 - abs(A) == pytest.approx(p**4 / 24, rel=0.01)
    A = STEPPERS["rk4"].amplification(p)
    assert math.atan2(A.imag, A.real) / p - 1 == pytest.approx(-(p**4) / 120, rel=0.01)


@pytest.mark.parametrize(("name", "limit"), [("ssprk3", 1.7320508), ("rk4", 2.8284271)])
def test_one_step_methods_amplify_from_their_limit_on(name, limit):
    # |A| = 1 in the closed forms above: p^2 = 3, p^2 = 8; Durran 2010, table 2.2, has 1.73 and 2.82 (from memory)
    assert stability_limit(name) == pytest.approx(limit, abs=1e-7)
    assert abs(STEPPERS[name].amplification(limit * 0.9999)) < 1
    assert abs(STEPPERS[name].amplification(limit * 1.0001)) > 1


@pytest.mark.parametrize("nu", [0.0, 0.1, 0.2, 0.5])
def test_limit_of_leapfrog_with_the_plain_filter(nu):
    # gamma = nu/2: omega dt < sqrt((1 - gamma)/(1 + gamma)) (Asselin 1972, Mon. Wea. Rev. 100, from memory)
    # the limit is found to 1e-7 where a root of modulus at most 1 + 1e-12 ends
    assert leapfrog_limit(nu, 1.0) == pytest.approx(math.sqrt((2 - nu) / (2 + nu)), abs=2e-7)


@pytest.mark.parametrize(("nu", "alpha", "limit"), [(0.1, 0.7, 0.872), (0.2, 0.53, 0.438)])
def test_limit_of_leapfrog_with_williams_correction(nu, alpha, limit):
    # by scanning the roots of the amplification matrix in steps of 0.001: the first p with a growing root
    assert limit - 1e-3 < leapfrog_limit(nu, alpha) <= limit


def test_the_roots_of_the_filtered_leapfrog_are_those_of_its_recurrence():
    # Williams 2009, eqs. 7 to 9, stepped in the open: x[n+1] = xbar[n-1] + 2 i p x[n], then the filter
    p, nu, alpha = 0.6, 0.1, 0.7
    old, now = 1.0 + 0j, 0.3 - 0.2j
    pair = np.array([old, now])
    for _ in range(10):
        new = old + 2j * p * now
        d = nu / 2 * (old - 2 * now + new)
        old, now = now + alpha * d, new + (alpha - 1) * d
        pair = filtered_leapfrog_matrix(p, nu, alpha) @ pair
    # ten products of numbers of order 1
    np.testing.assert_allclose(pair, [old, now], rtol=1e-14)


def test_order_of_leapfrog_without_filter_is_its_claim():
    # A = i p + sqrt(1 - p^2) (Durran 2010): off e^{ip} by p^3/6 a step, so that the order is 2; p^5 adds 1 % at p = 0.2
    def error(p):
        roots = np.linalg.eigvals(filtered_leapfrog_matrix(p, 0.0, 1.0))
        return np.abs(roots - np.exp(1j * p)).min()

    assert error(0.1) == pytest.approx(0.1**3 / 6, rel=0.01)
    assert math.log2(error(0.2) / error(0.1)) - 1 == pytest.approx(STEPPERS["leapfrog"].order, abs=0.03)


# ------------------------------------------------------------------------------------------------ in a run


def inertial_basin(f=1.0):
    """A doubly periodic f-plane; a uniform flow on it feels nothing but f."""
    return make_basin(3, 4, 1.3, 0.8, f=f)


def uniform_flow(basin):
    u, v, eta = (np.zeros(basin.grid.shape(location)) for location in ("u", "v", "centre"))
    return u + 1.0, v, eta


def velocity(state):
    """U + i v of a uniform flow, once checked to be uniform."""
    assert np.ptp(state.u) == 0
    assert np.ptp(state.v) == 0
    return complex(state.u[0, 0], state.v[0, 0])


@pytest.mark.parametrize("name", ONE_STEP)
@pytest.mark.parametrize("p", [0.1, 0.5, 1.0, 1.7])
def test_a_run_multiplies_an_inertial_oscillation_by_the_amplification_factor(name, p):
    # d(u + iv)/dt = -i f (u + iv), so each step multiplies by A(-p)
    basin = inertial_basin()
    seen = watched(equations_of(basin, LINEAR), uniform_flow(basin), name, p, 20, 1, velocity)
    A = STEPPERS[name].amplification(-p)
    # 20 steps, each with some ten roundings
    np.testing.assert_allclose(seen, A ** np.arange(21), rtol=0, atol=1e-14)


@pytest.mark.parametrize(("nu", "alpha"), FILTERS)
def test_a_leapfrog_run_multiplies_an_inertial_oscillation_by_its_amplification_matrix(nu, alpha):
    p, basin = 0.4, inertial_basin()
    u, v, _ = run(equations_of(basin, LINEAR), uniform_flow(basin), "leapfrog", p, 21, nu, alpha)
    # the first step is one of ssprk3
    pair = np.array([1.0, STEPPERS["ssprk3"].amplification(-p)])
    for _ in range(20):
        pair = filtered_leapfrog_matrix(-p, nu, alpha) @ pair
    # 20 steps, each with some ten roundings
    assert complex(u[0, 0], v[0, 0]) == pytest.approx(complex(pair[1]), abs=1e-14)


@pytest.mark.parametrize(("nu", "alpha"), FILTERS[1:])
def test_a_leapfrog_run_grows_from_the_limit_on(nu, alpha):
    basin = inertial_basin()
    size = {}
    for share in (0.99, 1.01):
        p = share * leapfrog_limit(nu, alpha)
        u, v, _ = run(equations_of(basin, LINEAR), uniform_flow(basin), "leapfrog", p, 100_000, nu, alpha)
        size[share] = math.hypot(u[0, 0], v[0, 0])
    # 1 % beside the limit the modulus of the root is off 1 by at least 1.6e-5: a factor 5 in 100 000 steps
    assert size[0.99] < 0.5
    assert size[1.01] > 2


@pytest.mark.parametrize("name", STEPPERS)
@pytest.mark.parametrize("edges", ["periodic", "box"])
def test_the_grids_fastest_wave_grows_from_the_limit_on(name, edges):
    # white noise holds the wave two cells long; the energy of the linear equations is the yardstick
    basin = make_basin(8, 6, 1.3, 0.8, edges=EDGES[edges], f=0.7)
    equations = equations_of(basin, LINEAR)
    fields = random_flow(np.random.default_rng(3), basin.grid)
    limit = stability_limit(name, 0.1, 0.7) / largest_frequency(basin, 1.0, PV_FLUXES["both"])

    def energy(fields):
        u, v, eta = fields
        return ((u[:, :-1] ** 2).sum() + (v[:-1] ** 2).sum() + (eta**2).sum()) / 2

    assert energy(run(equations, fields, name, 0.995 * limit, 2000)) < energy(fields)
    # between walls the fastest wave is some per cent slower than the bound
    assert energy(run(equations, fields, name, 1.1 * limit, 400)) > 10 * energy(fields)


@pytest.mark.parametrize("name", STEPPERS)
def test_a_constant_stays_constant_to_the_last_bit(name):
    # stages are base + (blend (y - base) + weight dt T); a y + b y could round 0.1
    basin = make_basin(7, 5, 1.3, 0.8, f=0.0)
    fields = tuple(np.full(basin.grid.shape(where), 0.1) for where in ("u", "v", "centre"))
    for field in run(equations_of(basin, LINEAR), fields, name, 0.1, 50):
        assert np.all(field == 0.1)


@pytest.mark.parametrize("name", STEPPERS)
def test_blocks_of_steps_make_no_difference(name):
    basin = make_basin(9, 7, 1.3, 0.8)
    fields = random_flow(np.random.default_rng(4), basin.grid)
    equations = equations_of(basin, LINEAR)
    whole = run(equations, fields, name, 0.1, 12)
    state = make_state(equations, fields)
    first = STEPPERS[name].levels == 2
    for steps in (1, 2, 4, 5):
        advance(state, steps, 0.1, equations, time_settings(name), first=first)
        first = False
    assert state.steps == 12
    for own, other in zip(whole, (state.u, state.v, state.eta), strict=True):
        assert np.array_equal(own, other)


# ------------------------------------------------------------------------------------------ the step chosen


def time_of(**keys):
    return TimeSettings.model_validate({"until": 86400.0, **keys})


@settings(max_examples=150)
@given(
    unit=st.integers(1, 10**9),
    counts=st.lists(st.integers(1, 500), min_size=1, max_size=3),
    omega=st.floats(1e-6, 1e3),
    advection=st.floats(0, 10),
    margin=st.floats(0.05, 1),
    stepper=st.sampled_from(sorted(STEPPERS)),
)
def test_the_automatic_step_divides_every_given_time(unit, counts, omega, advection, margin, stepper):
    times = {f"time {k}": float(Fraction(unit * count, 10**6)) for k, count in enumerate(counts)}
    limit = margin * stability_limit(stepper, 0.1, 0.7) / (omega + advection)
    common = float(common_divisor(list(times.values())))
    try:
        choice = choose_step(time_of(stepper=stepper, margin=margin), omega, advection, times)
    except RequestError:
        # refused where the intervals have little in common, and only there
        assert common < limit / 2
        assert common < min(times.values())
        return
    assert choice.limit == pytest.approx(limit, rel=1e-12)  # a product and a quotient
    assert choice.dt <= limit * (1 + 1e-9)
    assert not choice.given
    for time in times.values():
        # hit to the microsecond that times are rounded to
        assert abs(round(time / choice.dt) * choice.dt - time) < 1e-6 + 1e-12 * time
    # never shorter than need be: one step fewer between two times would be too long
    steps = round(common / choice.dt)
    assert steps == 1 or common / (steps - 1) > limit * (1 - 1e-9)


def test_a_default_interval_is_hit_where_that_is_cheap_and_dropped_where_it_is_not():
    time, omega = time_of(margin=0.5), math.sqrt(3) / 100  # a limit of 50 s
    hit = choose_step(time, omega, 0.0, {"time.until": 86400.0}, 1728.0)
    assert hit.dt == pytest.approx(1728.0 / 35, rel=1e-15)  # 34 steps would be longer than 50 s; one division
    odd = choose_step(time, omega, 0.0, {"time.until": 86400.0}, 1728.1)
    assert odd.dt == pytest.approx(50.0, rel=1e-15)


def test_a_given_step_is_taken_as_it_is():
    choice = choose_step(time_of(step=60.0), 0.01, 0.0, {"time.until": 86400.0})
    assert choice.dt == 60.0
    assert choice.given


@pytest.mark.parametrize(
    ("keys", "times", "message"),
    [
        (
            {"step": 200.0},
            {"time.until": 86400.0},
            "time.step: 200 s is above the stability limit of 173.2 s; at most 173.2 s; the margin allows 121.2 s; "
            'shorten it, or write step = "auto"',
        ),
        (
            {"step": 70.0},
            {"time.until": 86400.0, "output.every": 700.0},
            "time.step: 70 s does not divide time.until = 86400 s; a step that divides every given time; "
            "for example 50 s",
        ),
        (
            {},
            {"time.until": 86400.0, "output.every": 3601.0},
            "time.step: the times time.until = 86400 s, output.every = 3601 s have only 1 s in common, less than half "
            "the step of 121.2 s that the margin allows; intervals with a larger common divisor; "
            "round them to multiples of 200 s, or leave out the odd one",
        ),
        (
            {},
            {"time.until": 86400.0, "output.every": 1e-7},
            "output.every: 1e-07 s is too short; at least a microsecond, to which times are kept",
        ),
    ],
)
def test_a_step_that_cannot_be_is_refused_with_a_remedy(keys, times, message):
    with pytest.raises(RequestError) as error:
        choose_step(time_of(**keys), 0.01, 0.0, times)
    assert str(error.value) == message
