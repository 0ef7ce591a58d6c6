"""Which points lie inside a hull."""

from __future__ import annotations

import numpy as np

from bemwave.geometry.surface_mesh import BoolArray, FloatArray, SurfaceMesh
from bemwave.geometry.topology import boundary_edges

_BLOCK = 50_000  # point-triangle pairs held at once: what fits the processor's cache


def inside(mesh: SurfaceMesh, points: FloatArray) -> BoolArray:
    """Tell the points inside a wetted hull, by winding number.

    The hull is closed at the waterline by its mirror image in z = 0, so that a point over still
    water counts as inside when the point as far below is; an open end at the bed is closed by a
    flat lid. On the hull itself the answer is either.

    Parameters
    ----------
    mesh : SurfaceMesh
        Wetted hull or hulls, normals out of the water.
    points : (n, 3) array_like
        Metres.

    Returns
    -------
    (n,) ndarray of bool
    """
    points = np.asarray(points, dtype=np.float64).reshape(-1, 3)
    within = np.zeros(len(points), dtype=bool)
    folded = points * [1.0, 1.0, 0.0]
    folded[:, 2] = -np.abs(points[:, 2])
    low, high = mesh.points.min(axis=0), mesh.points.max(axis=0)
    near = np.flatnonzero(np.all((folded >= low) & (folded <= [*high[:2], 0.0]), axis=1))
    vertices = np.concatenate([mesh.vertices, _bed_lid(mesh)])
    step = max(1, _BLOCK // len(vertices))
    for start in range(0, len(near), step):
        block = near[start : start + step]
        # the image's solid angle seen from a point is the hull's seen from the point's image
        angle = _solid_angle(vertices, folded[block])
        under = folded[block, 2] < 0.0
        angle[~under] *= 2.0
        angle[under] += _solid_angle(vertices, folded[block[under]] * [1.0, 1.0, -1.0])
        # normals point into the hull: from within, the whole sphere counts negative
        within[block] = angle < -2.0 * np.pi
    return within


def _solid_angle(vertices: FloatArray, points: FloatArray) -> FloatArray:
    """Signed solid angle of all triangles together seen from each point, (n,), sr.

    Positive where a triangle's normal points away from the point. Van Oosterom & Strackee (1983),
    IEEE Trans. Biomed. Eng. 30:125.
    """
    # one array for each coordinate of each corner, (points, triangles): twice as fast as np.cross
    (ax, ay, az), (bx, by, bz), (cx, cy, cz) = (
        [vertices[:, k, axis] - points[:, axis, None] for axis in range(3)] for k in range(3)
    )
    la = np.sqrt(ax * ax + ay * ay + az * az)
    lb = np.sqrt(bx * bx + by * by + bz * bz)
    lc = np.sqrt(cx * cx + cy * cy + cz * cz)
    triple = ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx)
    below = la * lb * lc
    below += (ax * bx + ay * by + az * bz) * lc
    below += (bx * cx + by * cy + bz * cz) * la
    below += (cx * ax + cy * ay + cz * az) * lb
    return np.asarray(2.0 * np.arctan2(triple, below).sum(axis=1))


def _bed_lid(mesh: SurfaceMesh) -> FloatArray:
    """Triangles closing the edges open below z = 0, as a fan in their plane, (k, 3, 3)."""
    edges = boundary_edges(mesh.triangles)
    edges = edges[np.any(mesh.points[edges, 2] != 0.0, axis=1)]
    if not len(edges):
        return np.empty((0, 3, 3))
    hub = np.broadcast_to(mesh.points[edges[0, 0]], (len(edges), 3))
    return np.stack([mesh.points[edges[:, 1]], mesh.points[edges[:, 0]], hub], axis=1)
