"""Equatorially trapped waves against Matsuno's relation, a root finder and an eigen-solver."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from swmodel.theory.waves import equatorial_frequency, equatorial_phase_speed

BETA = 2.29e-11
# an invented reduced-gravity layer: c = 2.8 m/s
THIN = {"gravity": 0.0784, "depth": 100.0}
C_THIN = 2.8
A_EQUATOR = math.sqrt(C_THIN / BETA)
WAVENUMBERS = [q / A_EQUATOR for q in (-3.0, -1.0, -0.3, -1e-3, 1e-3, 0.3, 1.0, 3.0)]


@pytest.mark.parametrize("mode", [1, 2, 3, 7])
@pytest.mark.parametrize("k", WAVENUMBERS)
def test_equatorial_frequencies_are_the_roots_of_matsunos_cubic(mode: int, k: float) -> None:
    # source: Matsuno 1966, by numpy.roots in units of sqrt(beta c) and a; waves go west where omega/k < 0
    q = k * A_EQUATOR
    roots = np.sort(np.roots([1.0, 0.0, -(q**2 + 2 * mode + 1), -q]).real) * math.sqrt(BETA * C_THIN)
    # tolerance: numpy.roots finds the small root to some 1e-14 of the largest, which is up to 1e5 times larger
    gravity = equatorial_frequency(**THIN, beta=BETA, k=k, mode=mode, branch="gravity")
    assert gravity == pytest.approx(roots[2], rel=1e-9)
    rossby = equatorial_frequency(**THIN, beta=BETA, k=k, mode=mode)
    assert rossby == pytest.approx(abs(roots[1]), rel=1e-9)
    assert rossby < gravity
    assert equatorial_phase_speed(**THIN, beta=BETA, k=k, mode=mode) == pytest.approx(roots[1] / k, rel=1e-9)
    gravity_speed = equatorial_phase_speed(**THIN, beta=BETA, k=k, mode=mode, branch="gravity")
    assert gravity_speed == pytest.approx(roots[2] / k, rel=1e-9)


@pytest.mark.parametrize("k", WAVENUMBERS)
def test_the_mixed_wave_solves_matsunos_relation_and_not_its_spurious_root(k: float) -> None:
    # source: Matsuno 1966: omega^2 - k c omega - beta c = 0; tolerance: rounding of three terms
    omega = equatorial_frequency(**THIN, beta=BETA, k=k, mode=0)
    largest = omega**2 + abs(k * C_THIN * omega) + BETA * C_THIN
    assert abs(omega**2 - k * C_THIN * omega - BETA * C_THIN) < 1e-15 * largest
    assert omega > 0
    assert math.copysign(1, equatorial_phase_speed(**THIN, beta=BETA, k=k, mode=0)) == math.copysign(1, k)


def test_long_equatorial_rossby_waves_go_west_at_c_over_2n_plus_1() -> None:
    # source: Gill 1982, section 11.8; departure of the order of (k a)^2/(2 n + 1)
    for mode in (1, 2, 3):
        speed = equatorial_phase_speed(**THIN, beta=BETA, k=1e-4 / A_EQUATOR, mode=mode)
        assert speed == pytest.approx(-C_THIN / (2 * mode + 1), rel=1e-8)


@pytest.mark.parametrize("mode", [-1, 0, 1])
def test_where_f_decreases_northward_equatorial_waves_go_the_other_way(mode: int) -> None:
    k = 1 / A_EQUATOR
    # mirror x: rounding
    speed = equatorial_phase_speed(**THIN, beta=BETA, k=k, mode=mode)
    mirrored = equatorial_phase_speed(**THIN, beta=-BETA, k=-k, mode=mode)
    assert mirrored == pytest.approx(-speed, rel=1e-14)


def test_equatorial_frequencies_are_eigenvalues_of_the_equations_across_the_equator() -> None:
    q = 0.7

    def across_the_equator(n: int) -> Any:
        # the linear equations for exp(i k x) on a staggered line of y, in units of a and sqrt(beta c): u, eta at
        # centres, w = i v between; walls at 8 a, where the modes are below 1e-10
        y_v, d = np.linspace(-8, 8, n + 1)[1:-1], 16 / n
        matrix = np.zeros((3 * n - 1, 3 * n - 1))
        w = 2 * n + np.arange(n - 1)
        for side in (0, 1):  # i w_t = y u + d(eta)/dy, u the mean of both sides
            matrix[w, side + np.arange(n - 1)] = y_v / 2
            matrix[w, n + side + np.arange(n - 1)] = (2 * side - 1) / d
        matrix[np.arange(n), n + np.arange(n)] = q  # i u_t = y w + k eta, i eta_t = k u - dw/dy
        return np.linalg.eigvalsh(np.maximum(matrix, matrix.T) + np.minimum(matrix, matrix.T))

    coarse, fine = across_the_equator(160), across_the_equator(320)
    unit, k = math.sqrt(BETA * C_THIN), q / A_EQUATOR
    expected = [
        equatorial_frequency(**THIN, beta=BETA, k=k, mode=-1),
        equatorial_frequency(**THIN, beta=BETA, k=k, mode=0),
        -equatorial_frequency(**THIN, beta=BETA, k=-k, mode=0),
        *(-equatorial_frequency(**THIN, beta=BETA, k=k, mode=mode) for mode in (1, 2)),
        *(equatorial_frequency(**THIN, beta=BETA, k=k, mode=mode, branch="gravity") for mode in (1, 2)),
        *(-equatorial_frequency(**THIN, beta=BETA, k=-k, mode=mode, branch="gravity") for mode in (1, 2)),
    ]
    for omega in expected:
        near = [values[np.argmin(np.abs(values - omega / unit))] for values in (coarse, fine)]
        # second order in d, extrapolated; the fourth-order rest is of the size (2 n + 1)^2 d^4 = 1.6e-4 for mode 2
        assert (4 * near[1] - near[0]) / 3 == pytest.approx(omega / unit, rel=1.6e-4)
