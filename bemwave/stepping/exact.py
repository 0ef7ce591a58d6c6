"""The flow map of one step, exact in time, from the instantaneous one.

Free waves obey d2(phi)/dt2 = -g A phi with A = M^-1 S. Over steps dt their exact solution is
phi+ - 2 phi + phi- = -2 (1 - cos(dt sqrt(g A))) phi, so leapfrog with

    A_dt = 2 (1 - cos(dt sqrt(g A))) / (g dt^2) = A (1 - Y/12 + Y^2/360 - ...),  Y = g dt^2 A

in the place of A has no error in time at all. The series is entire in Y and needs no eigenvalue.
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
    flow = solve_mass(surface_matrix)
    turn = gravity * step**2
    series = [2.0 * (-1.0) ** k / math.factorial(2 * k + 2) for k in range(12)]
    bound = LARGEST_TURN**2
    degree = next(k for k in range(12) if abs(series[k]) * bound**k < 1e-15)
    scaled = turn * flow
    result = np.zeros_like(flow)
    for k in range(degree, -1, -1):
        if k < degree:
            result = scaled @ result
        result.flat[:: len(flow) + 1] += series[k]
    return flow @ result
