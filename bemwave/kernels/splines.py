"""Sums of periodic B-splines of seventh degree on a uniform grid, and their derivatives.

Cardinal splines and their differences: Schoenberg (1973), Cardinal Spline Interpolation, SIAM;
their use on the periodic fields of Fourier sums: Essmann et al. (1995), J. Chem. Phys. 103:8577.
The value of a wave of six nodes is then right to (1/5)^8, its m-th derivative to (1/5)^(8 - m).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from numba import prange

from bemwave.kernels.compiling import njit

Array = npt.NDArray[np.float64]
Floats = npt.NDArray[np.float32]
Ints = npt.NDArray[np.int64]

DEGREE = 7
AT_NODES = np.array([2416.0, 1191.0, 120.0, 1.0]) / 5040.0  # the spline at 0, 1, 2, 3
HIGHEST = 4  # derivatives there are of
CHUNK = 256  # places a thread takes at a time


@njit(cache=True, error_model="numpy", inline="always")
def _weights(t: float, rows: Array, last: Array) -> None:
    """Derivatives 0 to HIGHEST of the eight splines alive at t in [0, 1), one a row."""
    last[:] = 0.0  # the first stays so
    last[1] = 1.0
    for q in range(1, DEGREE + 1):
        share = 1.0 / q
        for j in range(q, -1, -1):
            last[j + 1] = share * ((t + q - j) * last[j] + (1.0 + j - t) * last[j + 1])
        if q >= DEGREE - HIGHEST:
            for j in range(DEGREE + 1):
                rows[DEGREE - q, j] = last[j + 1]
    for order in range(1, HIGHEST + 1):
        for _ in range(order):
            for j in range(DEGREE, 0, -1):
                rows[order, j] = rows[order, j - 1] - rows[order, j]
            rows[order, 0] = -rows[order, 0]


@njit(cache=True, error_model="numpy", parallel=True, fastmath={"reassoc", "contract"})
def spline_sums(coefficients: tuple[Floats, ...], at: Array, orders: Ints) -> Array:
    """Derivatives of sum over (i, j) of coefficient times spline(x - i) spline(y - j), periodic.

    Parameters
    ----------
    coefficients : of each field, (nx, ny).
    at : (n, 2) places in cells from node (0, 0).
    orders : (k, 2) of the derivatives along x and y, to HIGHEST.

    Returns
    -------
    (fields, k, n), per cell to the power of the order.
    """
    fields, (nx, ny) = len(coefficients), coefficients[0].shape
    out = np.empty((fields, orders.shape[0], at.shape[0]))
    highest = orders[:, 0].max()
    chunks = (at.shape[0] + CHUNK - 1) // CHUNK
    for chunk in prange(chunks):
        along_x = np.empty((HIGHEST + 1, DEGREE + 1))
        along_y = np.empty((HIGHEST + 1, DEGREE + 1))
        sums = np.empty((HIGHEST + 1, DEGREE + 1))
        row = np.empty(DEGREE + 1)
        column = np.empty(DEGREE + 1, dtype=np.int64)
        last = np.zeros(DEGREE + 2)
        for p in range(chunk * CHUNK, min((chunk + 1) * CHUNK, at.shape[0])):
            first_x, first_y = int(np.floor(at[p, 0])), int(np.floor(at[p, 1]))
            _weights(at[p, 0] - first_x, along_x, last)
            _weights(at[p, 1] - first_y, along_y, last)
            i0, j0 = (first_x - DEGREE // 2) % nx, (first_y - DEGREE // 2) % ny
            for j in range(DEGREE + 1):
                column[j] = j0 + j if j0 + j < ny else j0 + j - ny
            for field in range(fields):
                sums[:] = 0.0
                for i in range(DEGREE + 1):
                    line = i0 + i if i0 + i < nx else i0 + i - nx
                    for j in range(DEGREE + 1):
                        row[j] = coefficients[field][line, column[j]]
                    for order in range(highest + 1):
                        weight = along_x[order, i]
                        for j in range(DEGREE + 1):
                            sums[order, j] += weight * row[j]
                for q in range(orders.shape[0]):
                    total = 0.0
                    for j in range(DEGREE + 1):
                        total += sums[orders[q, 0], j] * along_y[orders[q, 1], j]
                    out[field, q, p] = total
    return out
