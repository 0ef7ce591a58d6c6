"""Plan geometry of waterlines: is every body in the water and clear of the others?"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.hull import Hull
from bemwave.geometry.inside import inside
from bemwave.geometry.outline import Outline
from bemwave.geometry.surface_mesh import BoolArray, FloatArray

TOUCHING = 1e-3  # of the shorter hull's length: nearer hulls count as touching


def check_layout(hulls: Sequence[Hull], outline: Outline) -> None:
    """Refuse bodies that leave the surface, overlap, or touch.

    Raises
    ------
    InputError
        Naming the bodies, where, and what to do.
    """
    for hull in hulls:
        out = ~outline.contains(hull.mesh.points)
        if out.any():
            x, y = hull.mesh.points[np.argmax(out), :2]
            raise InputError(
                f"{hull.name} reaches ({x:.4g}, {y:.4g}), outside the water surface, {outline}: "
                "move it or enlarge [surface] size"
            )
    for one, other in combinations(hulls, 2):
        _check_pair(one, other)


def _check_pair(one: Hull, other: Hull) -> None:
    a, b = one.mesh, other.mesh
    least = TOUCHING * min(one.hydrostatics.length, other.hydrostatics.length)
    apart = np.maximum(
        a.points.min(axis=0) - b.points.max(axis=0), b.points.min(axis=0) - a.points.max(axis=0)
    )
    if apart.max() > least:
        return
    crossing = any(cross(p, q) for p in one.polygons() for q in other.polygons())
    if crossing or inside(a, b.points).any() or inside(b, a.points).any():
        x, y = 0.5 * (a.points.mean(axis=0) + b.points.mean(axis=0))[:2]
        raise InputError(
            f"{one.name} and {other.name} overlap near ({x:.4g}, {y:.4g}): "
            "change the position of one of them"
        )
    near = clearance(one, other)
    if near < least:
        raise InputError(
            f"{one.name} and {other.name} touch ({near:.2g} m apart): leave a gap between them"
        )


def clearance(one: Hull, other: Hull) -> float:
    """Shortest distance between points of two hulls, m."""
    from scipy.spatial import cKDTree

    distance, _ = cKDTree(one.mesh.points).query(other.mesh.points)
    return float(np.min(distance))


def signed_area(polygon: FloatArray) -> float:
    """Area of a plan polygon (k, 2), m2, positive counter-clockwise."""
    x, y = polygon.T
    return 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def cross(one: FloatArray, other: FloatArray) -> bool:
    """Whether any edges of two plan polygons (k, 2) and (l, 2) cross or touch."""
    a, b = one[:, None], np.roll(one, -1, axis=0)[:, None]
    c, d = other[None], np.roll(other, -1, axis=0)[None]
    ab = _turn(a, b, c) * _turn(a, b, d)
    cd = _turn(c, d, a) * _turn(c, d, b)
    parallel_apart = (ab == 0.0) & (cd == 0.0)  # on one line: shared ends are found by clearance
    hit: BoolArray = (ab <= 0.0) & (cd <= 0.0) & ~parallel_apart
    return bool(hit.any())


def _turn(a: FloatArray, b: FloatArray, c: FloatArray) -> FloatArray:
    """Twice the signed area of the triangles a b c."""
    u, v = b - a, c - a
    return np.asarray(u[..., 0] * v[..., 1] - u[..., 1] * v[..., 0])
