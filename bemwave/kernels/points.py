"""Potential and velocity at points of sources and dipoles on flat triangles, and their images.

Conventions and sources of the closed forms as in `panels`.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
from numba import prange

from bemwave.kernels.compiling import njit
from bemwave.kernels.panels import (
    FOUR_PI,
    THREE,
    edge_sums,
    hat_angles,
    rule_points,
    uniform_potential,
)

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

# Distance of a point from a triangle's centroid over its radius, beyond which the rule of three
# points has the triangle's potential to 2e-5 and its velocity to 1e-4.
DISTANT = 10.0

# Triangles whose influences on a point are summed over the images before they are handed on:
# few enough to stay in the fastest cache.
TILE = 256


@njit(
    cache=True, error_model="numpy", fastmath={"reassoc", "contract", "arcp", "afn", "nsz"}
)
def _far_dipoles(
    x: float, y: float, z: float, weight: float, geometry: Array, points: Array, sums: Array
) -> None:
    """Adds 1/r and (x - x').n'/r^3 at three points of each triangle that is far, else nothing."""
    share = weight / 3.0
    for t in range(sums.shape[1]):
        dx, dy, dz = x - geometry[0, t], y - geometry[1, t], z - geometry[2, t]
        far = dx * dx + dy * dy + dz * dz > geometry[3, t]
        for q in range(3):
            dx, dy, dz = x - points[0, q, t], y - points[1, q, t], z - points[2, q, t]
            square = dx * dx + dy * dy + dz * dz
            source = share * geometry[4, t] / math.sqrt(square)
            height = dx * geometry[5, t] + dy * geometry[6, t] + dz * geometry[7, t]
            sums[0, t] += source if far else 0.0
            sums[1 + q, t] += source * height / square if far else 0.0


@njit(
    cache=True, error_model="numpy", fastmath={"reassoc", "contract", "arcp", "afn", "nsz"}
)
def _far_pulls(
    x: float, y: float, z: float, weight: float, geometry: Array, points: Array, sums: Array
) -> None:
    """Adds the gradient of 1/r at three points of each triangle that is far, else nothing."""
    share = -weight / 3.0
    for t in range(sums.shape[1]):
        dx, dy, dz = x - geometry[0, t], y - geometry[1, t], z - geometry[2, t]
        far = dx * dx + dy * dy + dz * dz > geometry[3, t]
        ex, ey, ez = 0.0, 0.0, 0.0
        for q in range(3):
            dx, dy, dz = x - points[0, q, t], y - points[1, q, t], z - points[2, q, t]
            square = dx * dx + dy * dy + dz * dz
            pull = share * geometry[4, t] / (square * math.sqrt(square))
            ex, ey, ez = ex + pull * dx, ey + pull * dy, ez + pull * dz
        # chosen, not multiplied by zero: a point of a near triangle may coincide
        sums[0, t] += ex if far else 0.0
        sums[1, t] += ey if far else 0.0
        sums[2, t] += ez if far else 0.0


@njit(cache=True, error_model="numpy", inline="always")
def _is_near(x: float, y: float, z: float, tri: Array) -> bool:
    dx, dy, dz = x - tri[24], y - tri[25], z - tri[26]
    return not dx * dx + dy * dy + dz * dz > DISTANT * DISTANT * tri[27] * tri[27]


@njit(cache=True, error_model="numpy")
def _far_geometry(sources: Array) -> Array:
    """(8, m) centroid, squared distance beyond which it is far, area and normal, by rows."""
    rows = np.empty((8, sources.shape[0]))
    for t in range(sources.shape[0]):
        rows[0:3, t] = sources[t, 24:27]
        rows[3, t] = DISTANT * DISTANT * sources[t, 27] * sources[t, 27]
        rows[4, t] = sources[t, 28]
        rows[5:8, t] = sources[t, 9:12]
    return rows


@njit(cache=True, error_model="numpy", parallel=True)
def potential_at(
    x: Array,
    sources: Array,
    corners: Ints,
    nodes: int,
    signs: Array,
    shifts: Array,
    weights: Array,
) -> tuple[Array, Array]:
    """Potentials at points: of uniform sources, and minus those of linear dipoles.

    Parameters
    ----------
    x : (n, 3) points [m].  Others as in `double_layer`.

    Returns
    -------
    (n, m) int G per triangle [m], and (n, nodes) - int hat_j dG/dn' per node.
    """
    single = np.zeros((x.shape[0], sources.shape[0]))
    double = np.zeros((x.shape[0], nodes))
    geometry, points = _far_geometry(sources), rule_points(sources, THREE)
    for p in prange(x.shape[0]):
        sums = np.empty((4, TILE))
        for first in range(0, sources.shape[0], TILE):
            last = min(first + TILE, sources.shape[0])
            part = sums[:, : last - first]
            part[:] = 0.0
            for image in range(signs.shape[0]):
                px = signs[image, 0] * (x[p, 0] - shifts[image, 0])
                py = signs[image, 1] * (x[p, 1] - shifts[image, 1])
                pz = signs[image, 2] * (x[p, 2] - shifts[image, 2])
                weight = weights[image] / FOUR_PI
                shape, rule = geometry[:, first:last], points[:, :, first:last]
                _far_dipoles(px, py, pz, weight, shape, rule, part)
                for t in range(first, last):
                    if _is_near(px, py, pz, sources[t]):
                        h0, h1, h2 = hat_angles(px, py, pz, sources[t])
                        single[p, t] += weight * uniform_potential(px, py, pz, sources[t])
                        double[p, corners[t, 0]] -= weight * h0
                        double[p, corners[t, 1]] -= weight * h1
                        double[p, corners[t, 2]] -= weight * h2
            for t in range(first, last):
                total, r0, r1, r2 = part[:, t - first]
                single[p, t] += total
                rest = (r0 + r1 + r2) / 6.0
                double[p, corners[t, 0]] -= 0.5 * r0 + rest
                double[p, corners[t, 1]] -= 0.5 * r1 + rest
                double[p, corners[t, 2]] -= 0.5 * r2 + rest
    return single, double


@njit(cache=True, error_model="numpy", inline="always")
def _attraction(x: float, y: float, z: float, tri: Array) -> Any:
    """Gradient at the point of int 1/r over the triangle."""
    g0, g1, g2, _d0, _d1, _d2, _height, angle = edge_sums(x, y, z, tri)
    return (
        -(tri[12] * g0 + tri[15] * g1 + tri[18] * g2 + tri[9] * angle),
        -(tri[13] * g0 + tri[16] * g1 + tri[19] * g2 + tri[10] * angle),
        -(tri[14] * g0 + tri[17] * g1 + tri[20] * g2 + tri[11] * angle),
    )


@njit(cache=True, error_model="numpy", parallel=True)
def velocity_at(
    x: Array,
    sources: Array,
    corners: Ints,
    curls: Array,
    nodes: int,
    signs: Array,
    shifts: Array,
    weights: Array,
) -> tuple[Array, Array]:
    """Gradients of the two potentials of `potential_at`.

    A dipole sheet of strength phi moves the water as the vortex sheet n x grad phi does, uniform
    on each triangle when phi is linear: grad int phi dG/dn' = (grad int G) x (n x grad phi).
    The phi must be continuous and zero on open edges of the sheet.

    Parameters
    ----------
    curls : (m, 3, 3) n x grad hat_j of each triangle's three hats [1/m].

    Returns
    -------
    (n, 3, m) per triangle, (n, 3, nodes) per node.
    """
    single = np.zeros((x.shape[0], 3, sources.shape[0]))
    double = np.zeros((x.shape[0], 3, nodes))
    geometry, points = _far_geometry(sources), rule_points(sources, THREE)
    images = signs.shape[0]
    for p in prange(x.shape[0]):
        sums = np.empty((3, TILE))
        for first in range(0, sources.shape[0], TILE):
            last = min(first + TILE, sources.shape[0])
            part = sums[:, : last - first]
            part[:] = 0.0
            for image in range(images):
                sign = signs[image]
                px = sign[0] * (x[p, 0] - shifts[image, 0])
                py = sign[1] * (x[p, 1] - shifts[image, 1])
                pz = sign[2] * (x[p, 2] - shifts[image, 2])
                weight = weights[image] / FOUR_PI
                shape, rule = geometry[:, first:last], points[:, :, first:last]
                _far_pulls(px, py, pz, weight, shape, rule, part)
                for t in range(first, last):
                    if _is_near(px, py, pz, sources[t]):
                        ex, ey, ez = _attraction(px, py, pz, sources[t])
                        part[0, t - first] += weight * ex
                        part[1, t - first] += weight * ey
                        part[2, t - first] += weight * ez
                if image + 1 < images and (signs[image + 1] == sign).all():
                    continue  # images that mirror alike are summed before they are turned
                for t in range(first, last):
                    ex, ey, ez = part[:, t - first]
                    single[p, 0, t] += sign[0] * ex
                    single[p, 1, t] += sign[1] * ey
                    single[p, 2, t] += sign[2] * ez
                    for j in range(3):
                        cx, cy, cz = curls[t, j, 0], curls[t, j, 1], curls[t, j, 2]
                        node = corners[t, j]
                        double[p, 0, node] -= sign[0] * (ey * cz - ez * cy)
                        double[p, 1, node] -= sign[1] * (ez * cx - ex * cz)
                        double[p, 2, node] -= sign[2] * (ex * cy - ey * cx)
                part[:] = 0.0
    return single, double
