"""Row kernels: the equations over one row, fused. reference.py says the same in plain NumPy, name for name.

`at` and `row` read a coefficient that may be a number, a column (one value a row) or a field; which it is, is settled
by its type when the kernel is compiled. Tests for None stand only in functions that take the option as an argument:
there numba drops the dead branch. U = h u, V = h v, B = K + g eta and q/24 live in rolling row buffers, never as full
fields.

Rows are read from ``W - 1`` to ``n + W``: one ghost column on either side.
"""

from __future__ import annotations

import numpy as np
from numba import types
from numba.extending import overload

from ..grid.domain import HALO_X as W
from .compilation import INLINED, ONE, U8, row_jit
from .pv_flux import pv_flux


def at(x, i):
    """``x[i]`` of an array; a number is itself."""
    return x[i] if isinstance(x, np.ndarray) else x


@overload(at, **INLINED)
def _at(x, i):
    if isinstance(x, types.Array):
        return lambda x, i: x[i]
    return lambda x, i: x


@row_jit
def thickness(linear, depth, eta, i):
    """H = H + eta; H where the equations are linear."""
    if linear is None:
        return at(depth, i) + eta[i]
    return at(depth, i)


@row_jit
def absolute_vorticity(linear, f, zeta):
    """F + zeta; f where the equations are linear."""
    if linear is None:
        return f + zeta
    return f


@row_jit
def bernoulli(linear, gravity, eta, u, v, vn, i):
    """B = K + g eta at a centre, K = (mean_x u^2 + mean_y v^2)/2; g eta where the equations are linear."""
    e = i + ONE
    if linear is None:
        quarter = u.dtype.type(0.25)
        return quarter * ((u[i] * u[i] + u[e] * u[e]) + (v[i] * v[i] + vn[i] * vn[i])) + gravity * eta[i]
    return gravity * eta[i]


@row_jit
def row_corners(q, V, u, us, v, eta, etas, depth, depths, f, linear, rx, ry, n):
    """q/24 at corners (q = (f + zeta)/h, h the mean of the four cells round it) and V = h v at y-faces.

    Suffix s is the row to the south; rx = 1/dx, ry = 1/dy; equations 1 to 3.
    """
    half = u.dtype.type(0.5)
    six = u.dtype.type(6)
    for i in range(U8(W - 1), U8(n + W + 1)):
        w = i - ONE
        h2 = thickness(linear, depth, eta, i) + thickness(linear, depths, etas, i)
        h4 = h2 + (thickness(linear, depth, eta, w) + thickness(linear, depths, etas, w))
        zeta = (v[i] - v[w]) * rx - (u[i] - us[i]) * ry
        q[i] = absolute_vorticity(linear, at(f, i), zeta) / (six * h4)
        V[i] = half * h2 * v[i]


@row_jit
def row_centres(U, B, u, v, vn, eta, depth, linear, gravity, n):
    """U = h u at x-faces and B = K + g eta at centres; suffix n is the row to the north; equations 1 to 3."""
    half = u.dtype.type(0.5)
    for i in range(U8(W - 1), U8(n + W + 1)):
        U[i] = half * (thickness(linear, depth, eta, i) + thickness(linear, depth, eta, i - ONE)) * u[i]
        B[i] = bernoulli(linear, gravity, eta, u, v, vn, i)


@row_jit
def row_update(scheme, uo, vo, eo, ub, vb, eb, u, v, eta, qs, q, qn, Vs, V, Vn, Us, U, Bs, B, blend, step, rx, ry, n):
    """One stage over a row: out = base + (blend (y - base) + step dy/dt), so that a constant stays one to the last bit.

    Rows ``uo, vo, eo`` are written, ``ub, vb, eb`` are the base; equations 1 to 3.
    """
    aspect = rx / ry
    for i in range(U8(W), U8(n + W)):
        e = i + ONE
        w = i - ONE
        du, dv = pv_flux(scheme, aspect, i, qs, q, qn, Vs, V, Vn, Us, U)
        du = du - (B[i] - B[w]) * rx
        dv = dv - (B[i] - Bs[i]) * ry
        uo[i] = ub[i] + (blend * (u[i] - ub[i]) + step * du)
        vo[i] = vb[i] + (blend * (v[i] - vb[i]) + step * dv)
        eo[i] = eb[i] + (blend * (eta[i] - eb[i]) - step * ((U[e] - U[i]) * rx + (Vn[i] - V[i]) * ry))


@row_jit
def row_gather(base, y, y1, y2, y3, n):
    """Base of the last stage of rk4: y + ((y1 - y) + 2 (y2 - y) + (y3 - y))/3; no tendency is kept."""
    two = y.dtype.type(2)
    third = y.dtype.type(1) / y.dtype.type(3)
    for i in range(U8(W), U8(n + W)):
        base[i] = y[i] + ((y1[i] - y[i]) + two * (y2[i] - y[i]) + (y3[i] - y[i])) * third
