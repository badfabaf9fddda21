"""The PV flux (the Coriolis term), chosen by name.

A scheme is a point function over rows, picked at compile time by the type of an empty NamedTuple: that survives the
disk cache, which closures and functions passed as arguments do not. To add one: its marker type and its row in
schemes.py, its point function here with one entry in `POINT_FUNCTIONS`, its plain twin in reference.py; the tests that
hold for every row run on it unasked.

All point functions take ``(aspect, i, qs, q, qn, Vs, V, Vn, Us, U)``: `q` holds 1/24 of the PV at the corners of a row,
U = h u at x-faces, V = h v at y-faces; suffix s is the row to the south, n to the north; aspect = dy/dx. They return
the flux at u[i] and at v[i].
"""

from __future__ import annotations

from numba.extending import overload

from .compilation import INLINED, ONE, row_jit
from .schemes import Both, Energy, Enstrophy


@row_jit
def flux_energy(aspect, i, qs, q, qn, Vs, V, Vn, Us, U):
    """Equation 4: mean of q times mean of V at each corner (Sadourny 1975, his model I)."""
    e = i + ONE
    w = i - ONE
    six = q.dtype.type(6)
    return six * (q[i] * (V[i] + V[w]) + qn[i] * (Vn[i] + Vn[w])), -six * (
        q[i] * (U[i] + Us[i]) + q[e] * (U[e] + Us[e])
    )


@row_jit
def flux_enstrophy(aspect, i, qs, q, qn, Vs, V, Vn, Us, U):
    """Equation 5: mean of q over the face times mean of V over its four neighbours (Sadourny 1975, his model II)."""
    e = i + ONE
    w = i - ONE
    three = q.dtype.type(3)
    return (
        three * (q[i] + qn[i]) * ((V[i] + V[w]) + (Vn[i] + Vn[w])),
        -three * (q[i] + q[e]) * ((U[i] + Us[i]) + (U[e] + Us[e])),
    )


@row_jit
def flux_both(aspect, i, qs, q, qn, Vs, V, Vn, Us, U):
    """Equation 6 (Arakawa & Lamb 1981), by sums along diagonals.

    alpha = 2 d1 + d2 and delta = d1 + 2 d2; beta and gamma are delta and alpha one cell to the west; epsilon and phi
    are differences along the same diagonals.
    """
    e = i + ONE
    w = i - ONE
    two = q.dtype.type(2)
    wide = q.dtype.type(1) / aspect
    d1 = qn[e] + q[i]
    d2 = qn[i] + q[e]
    x1 = qn[e] - q[i]
    x2 = qn[i] - q[e]
    w1 = qn[i] + q[w]
    w2 = qn[w] + q[i]
    y1 = qn[i] - q[w]
    y2 = qn[w] - q[i]
    s1 = q[e] + qs[i]
    s2 = q[i] + qs[e]
    z1 = q[e] - qs[i]
    z2 = q[i] - qs[e]
    alpha = two * d1 + d2
    delta = d1 + two * d2
    flux_u = alpha * Vn[i] + (w1 + two * w2) * Vn[w] + (two * w1 + w2) * V[w] + delta * V[i]
    flux_u = flux_u - aspect * ((x1 + x2) * U[e] - (y1 + y2) * U[w])
    flux_v = alpha * U[e] + delta * U[i] + (two * s1 + s2) * Us[i] + (s1 + two * s2) * Us[e]
    flux_v = flux_v + wide * ((x2 - x1) * Vn[i] - (z2 - z1) * Vs[i])
    return flux_u, -flux_v


POINT_FUNCTIONS = {Energy: flux_energy, Enstrophy: flux_enstrophy, Both: flux_both}


def pv_flux(scheme, aspect, i, qs, q, qn, Vs, V, Vn, Us, U):
    """Flux of `scheme` at u[i] and v[i]."""
    return POINT_FUNCTIONS[type(scheme)](aspect, i, qs, q, qn, Vs, V, Vn, Us, U)


@overload(pv_flux, **INLINED)
def _pv_flux(scheme, aspect, i, qs, q, qn, Vs, V, Vn, Us, U):
    point = POINT_FUNCTIONS[scheme.instance_class]

    def flux(scheme, aspect, i, qs, q, qn, Vs, V, Vn, Us, U):
        return point(aspect, i, qs, q, qn, Vs, V, Vn, Us, U)

    return flux
