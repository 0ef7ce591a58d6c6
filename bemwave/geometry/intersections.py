"""Where a mesh passes through itself: an appendage sunk into a hull, a fold."""

from __future__ import annotations

import numpy as np

from bemwave.geometry.surface_mesh import BoolArray, FloatArray, IntArray, SurfaceMesh
from bemwave.geometry.topology import edge_uses

_BLOCK = 50_000  # edges looked up at once
_CLEAR = 1e-6  # share of a side by which a crossing must be clear of touching


def piercing_edges(mesh: SurfaceMesh) -> FloatArray:
    """Middles of the edges that pass through a triangle they share no corner with, (n, 3), m.

    Mere touching is not counted, nor are faces lying in one plane.
    """
    edges, _, _ = edge_uses(mesh.triangles)
    ends = mesh.points[edges]
    middles = ends.mean(axis=1)
    reach = 0.5 * np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1)
    radius = np.linalg.norm(mesh.vertices - mesh.centroids[:, None], axis=2).max(axis=1)
    pierced = np.zeros(len(edges), dtype=bool)
    for few in np.array_split(np.arange(len(edges)), len(edges) // _BLOCK + 1):
        edge, triangle = _near(middles[few], reach[few], mesh.centroids, radius)
        edge = few[edge]
        apart = ~np.any(
            edges[edge][:, :, None] == mesh.triangles[triangle][:, None, :], axis=(1, 2)
        )
        edge, triangle = edge[apart], triangle[apart]
        pierced[edge[_pierces(ends[edge], mesh.vertices[triangle])]] = True
    return np.asarray(middles[pierced])


def _near(
    centres: FloatArray, reach: FloatArray, others: FloatArray, radius: FloatArray
) -> tuple[IntArray, IntArray]:
    """Pairs of balls that may overlap: numbers in `centres` and in `others`."""
    from scipy.spatial import cKDTree

    # searched by classes of like size, or one long triangle would make everything near
    size_class = np.ceil(np.log2(np.maximum(radius, 1e-300))).astype(np.int64)
    first, second = [np.empty(0, dtype=np.int64)], [np.empty(0, dtype=np.int64)]
    for k in np.unique(size_class):
        members = np.flatnonzero(size_class == k)
        found = cKDTree(others[members]).query_ball_point(centres, reach + 2.0**k)
        counts = np.array([len(row) for row in found], dtype=np.int64)
        if counts.any():
            first.append(np.repeat(np.arange(len(centres)), counts))
            second.append(members[np.concatenate(found).astype(np.int64)])
    return np.concatenate(first), np.concatenate(second)


def _pierces(ends: FloatArray, corners: FloatArray) -> BoolArray:
    """Whether segments (n, 2, 3) pass clearly through the inside of triangles (n, 3, 3)."""
    p, q = ends[:, 0], ends[:, 1]
    a, b, c = (corners[:, k] for k in range(3))
    normal = np.cross(b - a, c - a)
    # heights over the plane, as shares of the segment, times the normal's length
    length = np.linalg.norm(normal, axis=1) * np.linalg.norm(q - p, axis=1)
    low, high = _dot(normal, p - a), _dot(normal, q - a)
    through = (low * high < 0.0) & (np.minimum(abs(low), abs(high)) > _CLEAR * length)
    # the segment's line sees the triangle's sides all turning one way
    along = q - p
    turns = np.stack([_dot(along, np.cross(u - p, v - p)) for u, v in ((a, b), (b, c), (c, a))])
    total = turns.sum(axis=0)
    inner = np.all(turns * np.sign(total) > _CLEAR * abs(total), axis=0)
    return np.asarray(through & inner)


def _dot(one: FloatArray, other: FloatArray) -> FloatArray:
    return np.asarray(np.einsum("nx,nx->n", one, other))
