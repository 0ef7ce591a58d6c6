"""Integrals of the Laplace kernel over flat triangles, and between them; at points: `points`.

Everything here is a plain function on arrays, compiled by numba.
Loops run in parallel over targets only, each written by one thread: results do not depend
on the number of threads.

Conventions: G = 1/(4 pi r); a triangle's vertices run anticlockwise seen from the tip of its
normal.  An image j of the source is x -> D_j x + b_j with D_j a diagonal of +-1 and weight
s_j; since D_j is its own inverse, G(x, D x' + b) = G(D (x - b), x'), so it is the *target*
that is mapped and the source's normal is left alone.

Sources of the closed forms: Wilton et al. (1984), IEEE Trans. Antennas Propag. 32:276, for the
potential of a uniform triangle by edge sums; Van Oosterom & Strackee (1983), IEEE Trans.
Biomed. Eng. 30:125, for the solid angle.  Quadrature: Dunavant (1985), Int. J. Numer. Methods
Eng. 21:1129 (3 and 7 points); the rule for touching triangles is Gauss-Legendre collapsed on
each vertex in turn (Duffy 1982, SIAM J. Numer. Anal. 19:1260), averaged over the three.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
from numba import prange

from bemwave.kernels.compiling import njit

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

FOUR_PI = 4.0 * math.pi

# Centroid distance over the sum of the two circumscribing radii, below which a pair counts as
# touching, or as near.  Chosen so that the single layer stays positive definite.
TOUCHING = 1.05
NEAR = 4.0

# Columns of the packed triangle table.
_VERTEX, _NORMAL, _EDGE, _LENGTH, _CENTROID, _RADIUS, _AREA, _WIDTH = 0, 9, 12, 21, 24, 27, 28, 29


def _collapsed_rule(n: int) -> Array:
    """Gauss-Legendre on a square collapsed on each vertex of a triangle: rows (l0, l1, l2, w)."""
    nodes, weights = np.polynomial.legendre.leggauss(n)
    u, wu = 0.5 * (nodes + 1.0), 0.5 * weights
    rows = [
        (1 - a, a * (1 - b), a * b, 2 * a * wa * wb / 3)
        for a, wa in zip(u, wu, strict=True)
        for b, wb in zip(u, wu, strict=True)
    ]
    rule = np.array(rows)
    return np.vstack([rule[:, [0, 1, 2, 3]], rule[:, [2, 0, 1, 3]], rule[:, [1, 2, 0, 3]]])


def _seven_points() -> Array:
    root = math.sqrt(15.0)
    rows = [(1 / 3, 1 / 3, 1 / 3, 9 / 40)]
    for a, w in (((6 - root) / 21, (155 - root) / 1200), ((6 + root) / 21, (155 + root) / 1200)):
        rows += [(1 - 2 * a, a, a, w), (a, 1 - 2 * a, a, w), (a, a, 1 - 2 * a, w)]
    return np.array(rows)


THREE = np.array([[4, 1, 1, 2], [1, 4, 1, 2], [1, 1, 4, 2]]) / 6.0
SEVEN = _seven_points()
COLLAPSED = _collapsed_rule(4)


def pack(vertices: Array) -> Array:
    """Geometry of triangles, one row each, as the kernels read it.

    Parameters
    ----------
    vertices : (m, 3, 3) corner coordinates [m].

    Returns
    -------
    (m, 29): corners, unit normal, outward in-plane edge normals, edge lengths, centroid, radius
    about the centroid, area.
    """
    vertices = np.asarray(vertices, dtype=np.float64)
    table = np.empty((len(vertices), _WIDTH))
    edges = np.roll(vertices, -1, axis=1) - vertices
    lengths = np.linalg.norm(edges, axis=2)
    cross = np.cross(edges[:, 0], edges[:, 1])
    double_area = np.linalg.norm(cross, axis=1)
    normal = cross / double_area[:, None]
    centroid = vertices.mean(axis=1)
    table[:, _VERTEX:_NORMAL] = vertices.reshape(-1, 9)
    table[:, _NORMAL:_EDGE] = normal
    outward = np.cross(edges / lengths[..., None], normal[:, None, :])
    table[:, _EDGE:_LENGTH] = outward.reshape(-1, 9)
    table[:, _LENGTH:_CENTROID] = lengths
    table[:, _CENTROID:_RADIUS] = centroid
    table[:, _RADIUS] = np.linalg.norm(vertices - centroid[:, None], axis=2).max(axis=1)
    table[:, _AREA] = 0.5 * double_area
    return table


@njit(cache=True, error_model="numpy", inline="always")
def edge_sums(x: float, y: float, z: float, tri: Array) -> Any:
    """Per edge: log term and in-plane distance; then height above the plane and solid angle."""
    ax, ay, az = tri[0] - x, tri[1] - y, tri[2] - z
    bx, by, bz = tri[3] - x, tri[4] - y, tri[5] - z
    cx, cy, cz = tri[6] - x, tri[7] - y, tri[8] - z
    ra = math.sqrt(ax * ax + ay * ay + az * az)
    rb = math.sqrt(bx * bx + by * by + bz * bz)
    rc = math.sqrt(cx * cx + cy * cy + cz * cz)
    height = -(ax * tri[9] + ay * tri[10] + az * tri[11])
    d0 = ax * tri[12] + ay * tri[13] + az * tri[14]
    d1 = bx * tri[15] + by * tri[16] + bz * tri[17]
    d2 = cx * tri[18] + cy * tri[19] + cz * tri[20]
    # on an edge itself the log is infinite but multiplied by a distance of zero
    tiny = 1e-300
    g0 = math.log((ra + rb + tri[21]) / max(ra + rb - tri[21], tiny + 1e-15 * tri[21]))
    g1 = math.log((rb + rc + tri[22]) / max(rb + rc - tri[22], tiny + 1e-15 * tri[22]))
    g2 = math.log((rc + ra + tri[23]) / max(rc + ra - tri[23], tiny + 1e-15 * tri[23]))
    bottom = (
        ra * rb * rc
        + (ax * bx + ay * by + az * bz) * rc
        + (bx * cx + by * cy + bz * cz) * ra
        + (cx * ax + cy * ay + cz * az) * rb
    )
    angle = 2.0 * math.atan2(2.0 * tri[28] * height, bottom)
    return g0, g1, g2, d0, d1, d2, height, angle


@njit(cache=True, error_model="numpy", inline="always")
def uniform_potential(x: float, y: float, z: float, tri: Array) -> float:
    """int 1/r over the triangle."""
    g0, g1, g2, d0, d1, d2, height, angle = edge_sums(x, y, z, tri)
    return d0 * g0 + d1 * g1 + d2 * g2 - height * angle


@njit(cache=True, error_model="numpy", inline="always")
def hat_angles(x: float, y: float, z: float, tri: Array) -> Any:
    """int hat_j d(1/r)/dn' over the triangle for its three hats; zero in the triangle's plane."""
    g0, g1, g2, d0, d1, d2, height, angle = edge_sums(x, y, z, tri)
    if abs(height) < 1e-12 * tri[27]:
        return 0.0, 0.0, 0.0
    mx = tri[12] * g0 + tri[15] * g1 + tri[18] * g2
    my = tri[13] * g0 + tri[16] * g1 + tri[19] * g2
    mz = tri[14] * g0 + tri[17] * g1 + tri[20] * g2
    scale = 0.5 / tri[28]
    # hat j falls from its vertex towards the edge j + 1 opposite to it
    h0 = d1 * angle + height * (tri[15] * mx + tri[16] * my + tri[17] * mz)
    h1 = d2 * angle + height * (tri[18] * mx + tri[19] * my + tri[20] * mz)
    h2 = d0 * angle + height * (tri[12] * mx + tri[13] * my + tri[14] * mz)
    return h0 * tri[22] * scale, h1 * tri[23] * scale, h2 * tri[21] * scale


@njit(cache=True, error_model="numpy", inline="always")
def _corner_sum(tri: Array, l0: float, l1: float, l2: float, axis: int) -> float:
    return l0 * tri[axis] + l1 * tri[3 + axis] + l2 * tri[6 + axis]


@njit(cache=True, error_model="numpy")
def _mean_potential(target: Array, source: Array, sign: Array, shift: Array, rule: Array) -> float:
    """int over the (mapped) target of int 1/r over the source, by a rule on the target."""
    total = 0.0
    for q in range(rule.shape[0]):
        l0, l1, l2 = rule[q, 0], rule[q, 1], rule[q, 2]
        x = sign[0] * (_corner_sum(target, l0, l1, l2, 0) - shift[0])
        y = sign[1] * (_corner_sum(target, l0, l1, l2, 1) - shift[1])
        z = sign[2] * (_corner_sum(target, l0, l1, l2, 2) - shift[2])
        total += rule[q, 3] * uniform_potential(x, y, z, source)
    return total * target[28]


@njit(cache=True, error_model="numpy", inline="always")
def _separation(target: Array, source: Array, sign: Array, shift: Array) -> float:
    dx = sign[0] * (target[24] - shift[0]) - source[24]
    dy = sign[1] * (target[25] - shift[1]) - source[25]
    dz = sign[2] * (target[26] - shift[2]) - source[26]
    return math.sqrt(dx * dx + dy * dy + dz * dz) / (target[27] + source[27])


@njit(cache=True, error_model="numpy")
def rule_points(table: Array, rule: Array) -> Array:
    """(3, points, m) coordinates of a rule's points on every triangle."""
    points = np.empty((3, rule.shape[0], table.shape[0]))
    for axis in range(3):
        for q in range(rule.shape[0]):
            for t in range(table.shape[0]):
                points[axis, q, t] = _corner_sum(
                    table[t], rule[q, 0], rule[q, 1], rule[q, 2], axis
                )
    return points


# "ninf" and "nnan" are left out on purpose: a triangle's distance to itself is zero here and
# the entry is replaced by the closed form afterwards
@njit(cache=True, error_model="numpy", fastmath={"reassoc", "contract", "arcp", "afn", "nsz"})
def _far_potentials(
    x: float, y: float, z: float, points: Array, first: int, row: Array, weight: float
) -> None:
    """Adds weight x sum over the source's three points of 1/r to the row, from `first` on."""
    for q in range(points.shape[1]):
        px, py, pz = points[0, q], points[1, q], points[2, q]
        for t in range(first, row.shape[0]):
            dx, dy, dz = x - px[t], y - py[t], z - pz[t]
            row[t] += weight / math.sqrt(dx * dx + dy * dy + dz * dz)


@njit(cache=True, error_model="numpy")
def _single_layer_row(
    s: int,
    first: int,
    targets: Array,
    sources: Array,
    points: Array,
    signs: Array,
    shifts: Array,
    weights: Array,
    out: Array,
) -> None:
    target = targets[s]
    row = np.empty(sources.shape[0])
    for image in range(signs.shape[0]):
        sign, shift = signs[image], shifts[image]
        row[first:] = 0.0
        for q in range(3):
            x = sign[0] * (_corner_sum(target, THREE[q, 0], THREE[q, 1], THREE[q, 2], 0) - shift[0])
            y = sign[1] * (_corner_sum(target, THREE[q, 0], THREE[q, 1], THREE[q, 2], 1) - shift[1])
            z = sign[2] * (_corner_sum(target, THREE[q, 0], THREE[q, 1], THREE[q, 2], 2) - shift[2])
            _far_potentials(x, y, z, points, first, row, target[28] / 9.0)
        for t in range(first, sources.shape[0]):
            source = sources[t]
            apart = _separation(target, source, sign, shift)
            if apart > NEAR:
                value = row[t] * source[28]
            else:
                rule = COLLAPSED if apart < TOUCHING else SEVEN
                # averaging both orders of integration keeps the matrix symmetric
                value = 0.5 * (
                    _mean_potential(target, source, sign, shift, rule)
                    + _mean_potential(source, target, sign, sign * -shift, rule)
                )
            for k in range(weights.shape[1]):
                out[k, s, t] += weights[image, k] * value / FOUR_PI


@njit(cache=True, error_model="numpy", parallel=True)
def single_layer(
    targets: Array, sources: Array, signs: Array, shifts: Array, weights: Array
) -> Array:
    """Single layer between uniform triangles: int int G over both.

    Parameters
    ----------
    targets, sources : (n, 29), (m, 29) packed triangles.
    signs, shifts : (images, 3) the maps x -> sign x + shift.
    weights : (images, k) for each image its weight in each of k sums.

    Returns
    -------
    (k, n, m) [m^3].
    """
    out = np.zeros((weights.shape[1], targets.shape[0], sources.shape[0]))
    points = rule_points(sources, THREE)
    for s in prange(targets.shape[0]):
        _single_layer_row(s, 0, targets, sources, points, signs, shifts, weights, out)
    return out


@njit(cache=True, error_model="numpy", parallel=True)
def single_layer_self(table: Array, signs: Array, shifts: Array, weights: Array) -> Array:
    """`single_layer` of a set of triangles with itself: half the work, exactly symmetric.

    The set of images must contain the inverse of each of its members with the same weights.
    """
    n = table.shape[0]
    out = np.zeros((weights.shape[1], n, n))
    points = rule_points(table, THREE)
    for pair in prange((n + 1) // 2):
        # a long row and a short one together, so that threads get equal shares
        _single_layer_row(pair, pair, table, table, points, signs, shifts, weights, out)
        if n - 1 - pair != pair:
            s = n - 1 - pair
            _single_layer_row(s, s, table, table, points, signs, shifts, weights, out)
    for s in prange(n):
        for t in range(s):
            for k in range(weights.shape[1]):
                out[k, s, t] = out[k, t, s]
    return out


@njit(cache=True, error_model="numpy", fastmath={"reassoc", "contract", "arcp", "afn", "nsz"})
def _far_angles(
    x: float, y: float, z: float, points: Array, normals: Array, rows: Array, weight: float
) -> None:
    """Adds weight x (x - x').n'/r^3 at each of the source's three points to its row."""
    nx, ny, nz = normals[0], normals[1], normals[2]
    for q in range(points.shape[1]):
        px, py, pz, row = points[0, q], points[1, q], points[2, q], rows[q]
        for t in range(row.shape[0]):
            dx, dy, dz = x - px[t], y - py[t], z - pz[t]
            square = dx * dx + dy * dy + dz * dz
            height = dx * nx[t] + dy * ny[t] + dz * nz[t]
            row[t] += weight * height / (square * math.sqrt(square))


@njit(cache=True, error_model="numpy", parallel=True)
def double_layer(
    targets: Array,
    sources: Array,
    corners: Ints,
    nodes: int,
    signs: Array,
    shifts: Array,
    weights: Array,
) -> Array:
    """Double layer of linear sources tested by uniform targets: int int hat_j dG/dn'.

    Parameters
    ----------
    targets, sources : (n, 29), (m, 29) packed triangles.
    corners : (m, 3) node numbers of the sources' corners, below `nodes`.
    signs, shifts : (images, 3); weights : (images,).

    Returns
    -------
    (n, nodes) [m^2]; a triangle has no effect on points of its own plane.
    """
    out = np.zeros((targets.shape[0], nodes))
    points = rule_points(sources, THREE)
    normals = np.ascontiguousarray(sources[:, 9:12].T)
    for s in prange(targets.shape[0]):
        target = targets[s]
        rows = np.empty((3, sources.shape[0]))
        for image in range(signs.shape[0]):
            sign, shift = signs[image], shifts[image]
            rows[:] = 0.0
            for q in range(3):
                l0, l1, l2 = THREE[q, 0], THREE[q, 1], THREE[q, 2]
                x = sign[0] * (_corner_sum(target, l0, l1, l2, 0) - shift[0])
                y = sign[1] * (_corner_sum(target, l0, l1, l2, 1) - shift[1])
                z = sign[2] * (_corner_sum(target, l0, l1, l2, 2) - shift[2])
                _far_angles(x, y, z, points, normals, rows, target[28] / 9.0)
            for t in range(sources.shape[0]):
                source = sources[t]
                apart = _separation(target, source, sign, shift)
                if apart > NEAR:
                    r0, r1, r2 = rows[0, t], rows[1, t], rows[2, t]
                    rest = (r0 + r1 + r2) / 6.0
                    h0, h1, h2 = 0.5 * r0 + rest, 0.5 * r1 + rest, 0.5 * r2 + rest
                    h0, h1, h2 = h0 * source[28], h1 * source[28], h2 * source[28]
                else:
                    rule = COLLAPSED if apart < TOUCHING else SEVEN
                    h0, h1, h2 = 0.0, 0.0, 0.0
                    for q in range(rule.shape[0]):
                        l0, l1, l2 = rule[q, 0], rule[q, 1], rule[q, 2]
                        x = sign[0] * (_corner_sum(target, l0, l1, l2, 0) - shift[0])
                        y = sign[1] * (_corner_sum(target, l0, l1, l2, 1) - shift[1])
                        z = sign[2] * (_corner_sum(target, l0, l1, l2, 2) - shift[2])
                        a0, a1, a2 = hat_angles(x, y, z, source)
                        w = rule[q, 3] * target[28]
                        h0, h1, h2 = h0 + w * a0, h1 + w * a1, h2 + w * a2
                scale = weights[image] / FOUR_PI
                out[s, corners[t, 0]] += scale * h0
                out[s, corners[t, 1]] += scale * h1
                out[s, corners[t, 2]] += scale * h2
    return out
