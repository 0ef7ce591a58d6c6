"""The flow map of one step, exact in time, from the instantaneous one.

Free waves obey d2(phi)/dt2 = -g A phi with A = M^-1 S. Over steps dt their exact solution is
phi+ - 2 phi + phi- = -2 (1 - cos(dt sqrt(g A))) phi, so leapfrog with

    A_dt = 2 (1 - cos(dt sqrt(g A))) / (g dt^2) = (Y - Y^2/12 + Y^3/360 - ...) / (g dt^2)

in the place of A has no error in time at all, Y = g dt^2 A. The series is entire in Y and needs no
eigenvalue; how far it is taken depends on how far the mesh's fastest wave turns in a step.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

# A step at which the fastest wave of the mesh turns by this angle [rad] is the longest taken:
# 2 is leapfrog's own limit, and sampling in time is by polynomials through the steps.
LARGEST_TURN = 1.8


def fastest_frequency(
    surface_matrix: Array, solve_mass: Callable[[Array], Array], gravity: float
) -> float:
    """The largest angular frequency of a mesh's free waves [rad/s], by power iteration, + 2 %."""
    vector = np.random.default_rng(1).standard_normal(len(surface_matrix))
    largest = 0.0
    for _ in range(60):
        image = solve_mass(surface_matrix @ vector)
        largest = float(np.linalg.norm(image) / np.linalg.norm(vector))
        vector = image / np.linalg.norm(image)
    return 1.02 * math.sqrt(gravity * largest)


def exact_map(
    surface_matrix: Array, solve_mass: Callable[[Array], Array], gravity: float, step: float
) -> Array:
    """A_dt, dense (n, n) [1/m], for `step` with at most LARGEST_TURN of the fastest wave.

    Parameters
    ----------
    surface_matrix : (n, n) S of the flow map [m].
    solve_mass : applies M^-1 to (n, k).
    gravity, step : m/s^2, s.
    """
    scaled = solve_mass(gravity * step**2 * surface_matrix)
    # no eigenvalue is above any norm; this one is a few dozen per cent too large
    largest = float(np.linalg.norm(scaled, np.inf))
    return _polynomial(_cosine_series(largest), scaled) / (gravity * step**2)


def _cosine_series(largest: float) -> list[float]:
    """Coefficients of Y, Y^2 ... of 2 (1 - cos(sqrt(Y))), all that count for Y up to `largest`."""
    coefficients = [1.0]
    while abs(coefficients[-1]) * largest ** (len(coefficients) - 1) > 1e-16:
        power = 2 * len(coefficients)
        coefficients.append(-coefficients[-1] / ((power + 1) * (power + 2)))
    return coefficients


def _polynomial(coefficients: list[float], y: Array) -> Array:
    """c1 y + c2 y^2 + ... of a matrix, in blocks of three terms by Horner's rule in y^3.

    Paterson & Stockmeyer (1973), SIAM J. Comput. 2:60; two products, and one for each block.
    """
    square = y @ y
    cube = square @ y
    *first, last = [coefficients[k : k + 3] for k in range(0, len(coefficients), 3)]
    result = sum(c * power for c, power in zip(last, (y, square, cube), strict=False))
    for block in reversed(first):
        result = cube @ result
        for c, power in zip(block, (y, square, cube), strict=True):
            result += c * power
    return np.asarray(result)
