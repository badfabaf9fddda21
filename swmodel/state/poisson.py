"""Poisson's equation on the C-grid, solved directly: transforms that diagonalise the five-point Laplacian exactly."""

from __future__ import annotations

from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..grid.staggered import Grid

Array = NDArray[np.float64]
Side = Literal["periodic", "closed", "held"]


def solve_at_centres(source: Array, grid: Grid) -> Array:
    """Return p at centres with div(grad p) = source, no gradient through walls, mean 0.

    Parameters
    ----------
    source : ndarray ``[ny, nx]``
        Right-hand side; its mean, for which there is no solution, is left out.
    grid : Grid
        The grid, for sizes and edges.

    Notes
    -----
    The differences are the model's own: forward from centres to faces and back. Periodic directions by FFT, walled ones
    by the cosine transform DCT-II (Swarztrauber 1977, SIAM Review 19).
    """
    sides: tuple[Side, Side] = (
        "periodic" if grid.periodic_y else "closed",
        "periodic" if grid.periodic_x else "closed",
    )
    return _solve(source, sides, (grid.dy, grid.dx))


def solve_at_corners(source: Array, grid: Grid) -> Array:
    """Return p at the corners that lie on no wall, with div(grad p) = source there and p = 0 on walls.

    Parameters
    ----------
    source : ndarray ``[ny or ny - 1, nx or nx - 1]``
        Right-hand side at the corners off the walls; in a periodic direction the last is not repeated. At least one
        direction has walls.
    grid : Grid
        The grid, for sizes and edges.

    Notes
    -----
    Walled directions by the sine transform DST-I (Swarztrauber 1977, SIAM Review 19).
    """
    sides: tuple[Side, Side] = ("periodic" if grid.periodic_y else "held", "periodic" if grid.periodic_x else "held")
    return _solve(source, sides, (grid.dy, grid.dx))


def _solve(source: Array, sides: tuple[Side, Side], spacing: tuple[float, float]) -> Array:
    """Divide by the Laplacian's eigenvalues in the space of its eigenvectors; the mean, where free, becomes 0."""
    from scipy import fft

    if source.size == 0:
        return source.copy()
    around = [axis for axis in (0, 1) if sides[axis] == "periodic"]
    spectrum: NDArray[Any] = source
    for axis in (0, 1):
        if sides[axis] == "closed":
            spectrum = fft.dct(spectrum, type=2, axis=axis)
        elif sides[axis] == "held":
            spectrum = fft.dst(spectrum, type=1, axis=axis)
    if around:
        spectrum = fft.rfftn(spectrum, axes=around)
    along_y, along_x = (
        _eigenvalues(source.shape[axis], sides[axis], spacing[axis], half=around[-1:] == [axis]) for axis in (0, 1)
    )
    laplacian = along_y[:, None] + along_x[None, :]
    if "held" not in sides:
        laplacian[0, 0] = 1.0
        spectrum[0, 0] = 0.0
    spectrum = spectrum / laplacian
    if around:
        spectrum = fft.irfftn(spectrum, s=[source.shape[axis] for axis in around], axes=around)
    for axis in (0, 1):
        if sides[axis] == "closed":
            spectrum = fft.idct(spectrum, type=2, axis=axis)
        elif sides[axis] == "held":
            spectrum = fft.idst(spectrum, type=1, axis=axis)
    return np.ascontiguousarray(spectrum)


def _eigenvalues(n: int, side: Side, spacing: float, *, half: bool) -> Array:
    """Eigenvalues of the second difference over n points, 1/m2, in the order of the transform.

    `half` says that a real FFT keeps only the wavenumbers 0 to n//2 of this direction.
    """
    if side == "periodic":
        angle = np.pi * np.arange(n // 2 + 1 if half else n) / n
    elif side == "closed":
        angle = np.pi * np.arange(n) / (2 * n)
    else:
        angle = np.pi * np.arange(1, n + 1) / (2 * (n + 1))
    return -((2 / spacing * np.sin(angle)) ** 2)
