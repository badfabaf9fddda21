"""Least-squares fits of an oscillation, of an exponential and of a travelling wave, by variable projection.

What a curve is linear in (amplitudes, mean, trend) is eliminated at every trial of the rest (Golub & Pereyra 1973); the
rest is scanned and then refined. A fit on a part of the data starts from the whole fit and stays within its resolution.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .finding import NoAnswerError

Array = NDArray[np.float64]
Values = NDArray[Any]

SCANS_A_CYCLE = 8  # trial frequencies for every cycle more in the window
FEWEST_CYCLES = 0.5  # in the window: below, an oscillation and a trend are one
CONSTANT = 1e-12  # of the largest value: what varies less is round-off


@dataclass(frozen=True)
class Fit:
    """A fit.

    Parameters
    ----------
    parameters : tuple of float
        What the curve is not linear in.
    explained : float
        Share of the variance that it explains.
    """

    parameters: tuple[float, ...]
    explained: float


def remainder(basis: Values, values: Values) -> Values:
    """Return what the best linear combination of the columns ``[n, m]`` leaves of the values ``[n]``."""
    q, _ = np.linalg.qr(basis)
    return np.asarray(values - q @ (q.conj().T @ values))


def combine(basis: Values, values: Values, drawn: Values) -> Values:
    """Fit the columns of `basis` to the values and return the same combination of the columns of `drawn`."""
    weights, *_ = np.linalg.lstsq(basis, values, rcond=None)
    return np.asarray(drawn @ weights)


# ----------------------------------------------------------------------------------------------------- oscillation


def oscillation_basis(t: Array, omega: float) -> Array:
    """Mean, trend and the two quadratures of an oscillation, ``[n, 4]``."""
    return np.column_stack([np.ones_like(t), t, np.cos(omega * t), np.sin(omega * t)])


def turning_basis(t: Array, omega: float) -> Values:
    """Mean, trend and exp(i omega t), ``[n, 3]``."""
    return np.column_stack([np.ones_like(t), t, np.exp(1j * omega * t)])


def _oscillation_slope(t: Array, omega: float) -> Array:
    """Derivative of `oscillation_basis` with omega."""
    return np.column_stack([0 * t, 0 * t, -t * np.sin(omega * t), t * np.cos(omega * t)])


def _turning_slope(t: Array, omega: float) -> Values:
    """Derivative of `turning_basis` with omega."""
    return np.column_stack([0 * t, 0 * t, 1j * t * np.exp(1j * omega * t)])


def fit_oscillation(t: Array, values: Values, near: float | None = None, within: float = math.inf) -> Fit:
    """Fit an oscillation with mean and trend: a cosine to real values, exp(i omega t) to complex ones.

    Parameters
    ----------
    t : ndarray ``[n]``
        Times, s.
    values : ndarray ``[n]``
        Real, or u + i v.
    near : float or None
        Start here, rad/s, instead of scanning.
    within : float
        How far from `near` the frequency may move, rad/s.

    Returns
    -------
    Fit
        With omega, rad/s: positive for real values, of either sign (positive anticlockwise) for complex ones.

    Raises
    ------
    NoAnswerError
        Where the values do not vary.
    """
    t = t - t.mean()
    turning = np.iscomplexobj(values)
    basis, slope = (turning_basis, _turning_slope) if turning else (oscillation_basis, _oscillation_slope)
    window = float(t[-1] - t[0])
    rest = remainder(np.column_stack([np.ones_like(t), t]), values)
    variance = float(np.sum(np.abs(rest) ** 2))
    if not variance > t.size * (CONSTANT * float(np.max(np.abs(values)))) ** 2:
        raise NoAnswerError("nothing oscillates there: mean and trend explain the whole signal")
    lowest = 2 * math.pi * FEWEST_CYCLES / window
    highest = math.pi / float(np.median(np.diff(t)))
    if near is None:
        near, within = _scan_oscillation(t, rest, turning, lowest, highest)
    floor = -highest if turning else lowest
    (omega,) = _refine(
        partial(basis, t),
        lambda omega: [slope(t, omega)],
        values,
        (near,),
        ((max(near - within, floor), min(near + within, highest)),),
        (2 * math.pi / window,),
    )
    left = float(np.sum(np.abs(remainder(basis(t, omega), values)) ** 2))
    return Fit((omega,), 1 - left / variance)


def _scan_oscillation(t: Array, rest: Values, turning: bool, lowest: float, highest: float) -> tuple[float, float]:
    """Best trial frequency and the distance between trials; mean and trend are out of trials and data alike."""
    step = 2 * math.pi / float(t[-1] - t[0]) / SCANS_A_CYCLE
    trials = np.arange(lowest, highest + step, step)
    if turning:
        trials = np.concatenate([-trials[::-1], trials])
    q, _ = np.linalg.qr(np.column_stack([np.ones_like(t), t]))
    best, at = -1.0, float(trials[0])
    for some in np.array_split(trials, max(1, trials.size * t.size // 1_000_000)):
        turns = np.exp(1j * some[:, None] * t)
        turns = turns - (turns @ q) @ q.T
        if turning:
            power = np.abs(turns.conj() @ rest) ** 2 / np.sum(np.abs(turns) ** 2, axis=1)
        else:
            c, s = turns.real, turns.imag
            cc, ss, cs = np.sum(c * c, 1), np.sum(s * s, 1), np.sum(c * s, 1)
            cz, sz = c @ rest, s @ rest
            determinant = cc * ss - cs**2
            # at the highest frequency sine and cosine may fall together: such a trial is left out
            sound = determinant > 1e-6 * cc * ss
            power = np.where(
                sound, (ss * cz**2 - 2 * cs * cz * sz + cc * sz**2) / np.where(sound, determinant, 1.0), 0.0
            )
        k = int(np.argmax(power))
        if power[k] > best:
            best, at = float(power[k]), float(some[k])
    return at, step


# ------------------------------------------------------------------------------------------------------ exponential


def exponential_basis(s: Array, length: float, fixed: bool) -> Array:
    """Offset (unless it is fixed) and exp(-s/length), ``[n, 2 or 1]``."""
    falling = np.exp(-(s - s[0]) / length)
    return falling[:, None] if fixed else np.column_stack([np.ones_like(s), falling])


def fit_exponential(s: Array, values: Array, offset: float | None = None, near: float | None = None) -> Fit:
    """Fit A + B exp(-s/L).

    Parameters
    ----------
    s : ndarray ``[n]``
        Distances, m, increasing.
    values : ndarray ``[n]``
        Values.
    offset : float or None
        A, where it is known.
    near : float or None
        Start here, m, instead of scanning.

    Returns
    -------
    Fit
        With L, m.

    Raises
    ------
    NoAnswerError
        Where the values do not vary, or do not fall off exponentially.
    """
    fixed = offset is not None
    values = values - (offset or 0.0)
    spread = values - values.mean()
    variance = float(np.sum(spread**2))
    if not variance > s.size * (CONSTANT * float(np.max(np.abs(values)))) ** 2:
        raise NoAnswerError("the profile is the same all along the line: nothing decays there")
    span = float(s[-1] - s[0])
    shortest, longest = span / (s.size - 1) / 4, 100 * span

    def basis(log_length: float) -> Array:
        return exponential_basis(s, math.exp(log_length), fixed)

    def slopes(log_length: float) -> list[Array]:
        slope = np.zeros_like(basis(log_length))
        slope[:, -1] = (s - s[0]) / math.exp(log_length) * basis(log_length)[:, -1]
        return [slope]

    def left(log_length: float) -> float:
        return float(np.sum(remainder(basis(log_length), values) ** 2))

    trials = np.linspace(math.log(shortest), math.log(longest), 200)
    start = float(trials[int(np.argmin([left(trial) for trial in trials]))]) if near is None else math.log(near)

    (best,) = _refine(basis, slopes, values, (start,), ((float(trials[0]), float(trials[-1])),), (1.0,))
    if best > trials[-2]:
        raise NoAnswerError("the profile does not fall off exponentially: the best curve is a straight line")
    if best < math.log(2 * shortest):
        raise NoAnswerError("the profile falls off within half the distance between its points")
    return Fit((math.exp(best),), 1 - left(best) / variance)


# ---------------------------------------------------------------------------------------------------- travelling wave


def wave_basis(s: Array, t: Array, k: float, omega: float) -> Array:
    """A constant and the two quadratures of k s - omega t, ``[n_t n_s, 3]``."""
    turns = np.exp(1j * omega * t).conj()[:, None] * np.exp(1j * k * s)
    return np.column_stack([np.ones(turns.size), turns.real.ravel(), turns.imag.ravel()])


def _wave_slopes(s: Array, t: Array, k: float, omega: float) -> list[Array]:
    """Derivatives of `wave_basis` with k and with omega."""
    columns = wave_basis(s, t, k, omega)
    along_s, along_t = np.broadcast_arrays(s[None, :], t[:, None])
    turned = np.column_stack([np.zeros(len(columns)), -columns[:, 2], columns[:, 1]])
    return [turned * along_s.reshape(-1, 1), -turned * along_t.reshape(-1, 1)]


def fit_wave(t: Array, s: Array, values: Array, near: tuple[float, float] | None = None) -> Fit:
    """Fit a travelling wave A cos(k s - omega t + phase) about a constant.

    Parameters
    ----------
    t : ndarray ``[n_t]``
        Times, s.
    s : ndarray ``[n_s]``
        Distances along the line, m, evenly spaced.
    values : ndarray ``[n_t, n_s]``
        Values.
    near : tuple of float or None
        Start at this k (1/m) and omega (rad/s) instead of scanning.

    Returns
    -------
    Fit
        With k > 0, 1/m, and omega of either sign, rad/s.

    Raises
    ------
    NoAnswerError
        Where the values do not vary.
    """
    t, s = t - t.mean(), s - s.mean()
    variance = float(np.sum((values - values.mean()) ** 2))
    if not variance > values.size * (CONSTANT * float(np.max(np.abs(values)))) ** 2:
        raise NoAnswerError("the line is the same at every snapshot and place: no wave travels there")
    scales = 2 * math.pi / float(s[-1] - s[0]), 2 * math.pi / float(t[-1] - t[0])
    start = _scan_wave(t, s, values - values.mean()) if near is None else near
    bounds = (
        (max(start[0] - scales[0], 0.05 * scales[0]), start[0] + scales[0]),
        (start[1] - scales[1], start[1] + scales[1]),
    )

    k, omega = _refine(partial(wave_basis, s, t), partial(_wave_slopes, s, t), values.ravel(), start, bounds, scales)
    left = float(np.sum(remainder(wave_basis(s, t, k, omega), values.ravel()) ** 2))
    return Fit((k, omega), 1 - left / variance)


def _scan_wave(t: Array, s: Array, rest: Array) -> tuple[float, float]:
    """The k and omega of the largest value of the spectrum, zero-padded to a quarter of its resolution."""
    even = np.linspace(t[0], t[-1], t.size)
    if not np.allclose(even, t, rtol=0, atol=1e-3 * (even[1] - even[0])):
        rest = np.array([np.interp(even, t, column) for column in rest.T]).T
    sizes = 4 * t.size, 4 * s.size
    spectrum = np.abs(np.fft.fft(np.fft.rfft(rest, sizes[1], axis=1), sizes[0], axis=0))
    spectrum[:, :2] = 0  # under half a wavelength on the line
    row, column = np.unravel_index(int(np.argmax(spectrum)), spectrum.shape)
    k = 2 * math.pi * np.fft.rfftfreq(sizes[1], float(s[1] - s[0]))[column]
    # the transform's exp(-i(k s + w t)) has w = -omega
    omega = -2 * math.pi * np.fft.fftfreq(sizes[0], float(even[1] - even[0]))[row]
    return float(k), float(omega)


def _refine(
    basis: Callable[..., Values],
    slopes: Callable[..., Sequence[Values]],
    values: Values,
    start: tuple[float, ...],
    bounds: tuple[tuple[float, float], ...],
    scales: tuple[float, ...],
) -> tuple[float, ...]:
    """Refine parameters to round-off.

    Parameters
    ----------
    basis : callable
        The parameters to the columns ``[n, m]`` of which the values are a linear combination.
    slopes : callable
        The parameters to the derivatives of those columns with each parameter.
    values : ndarray ``[n]``
        Real or complex.
    start, bounds, scales : tuple
        First guess, limits, and natural size of a change of each parameter.

    Notes
    -----
    The derivative of the remainder is Kaufman's (1975, BIT 15): its gradient is exact.
    """
    from scipy.optimize import least_squares

    scale, origin = np.array(scales), np.array(start)
    size = math.sqrt(float(np.sum(np.abs(values - values.mean()) ** 2)))

    def real(array: Values) -> Array:
        return np.concatenate([array.real, array.imag]) if np.iscomplexobj(array) else array

    def left(steps: Array) -> Array:
        return real(remainder(basis(*(origin + steps * scale)), values) / size)

    def slope(steps: Array) -> Array:
        columns = basis(*(origin + steps * scale))
        weights, *_ = np.linalg.lstsq(columns, values, rcond=None)
        changes = [remainder(columns, one @ weights) for one in slopes(*(origin + steps * scale))]
        return np.column_stack([-real(change) * one / size for change, one in zip(changes, scales, strict=True)])

    low, high = ((np.array(limit) - origin) / scale for limit in zip(*bounds, strict=True))
    first = np.clip(0.0, low + 1e-9, high - 1e-9)
    result = least_squares(left, first, slope, bounds=(low, high), xtol=1e-14, ftol=1e-14, gtol=1e-14)
    return tuple(float(one) for one in origin + result.x * scale)
