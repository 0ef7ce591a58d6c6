"""Cut a mesh along a horizontal plane and keep what lies below (or above) it."""

from __future__ import annotations

import numpy as np

from bemwave.geometry.surface_mesh import FloatArray, IntArray, SurfaceMesh


def below(mesh: SurfaceMesh, level: float, snap: float) -> SurfaceMesh:
    """Keep the part of the mesh under the plane z = level; the cut is left open.

    Points within `snap` of the plane are put on it first, for a row of points a hair under the
    plane would leave slivers that no mesher survives. Triangles lying in the plane are dropped:
    they are a lid, not hull. Neighbours share the points of the cut, whose z is `level` exactly.

    Parameters
    ----------
    mesh : SurfaceMesh
    level : float
        Height of the plane, m.
    snap : float
        Metres.
    """
    points = mesh.points.copy()
    points[np.abs(points[:, 2] - level) < snap, 2] = level
    side = np.sign(points[:, 2] - level).astype(np.int64)
    corner_side = side[mesh.triangles]
    whole = (corner_side.max(axis=1) <= 0) & (corner_side.min(axis=1) < 0)
    crossing = (corner_side.max(axis=1) > 0) & (corner_side.min(axis=1) < 0)
    pieces, owner, new_points = _lower_parts(mesh.triangles[crossing], points, side, level)
    clipped = SurfaceMesh(
        np.concatenate([points, new_points]),
        np.concatenate([mesh.triangles[whole], pieces]),
        np.concatenate([mesh.part[whole], mesh.part[crossing][owner]]),
        mesh.part_names,
    )
    return clipped.keep(np.ones(len(clipped.triangles), dtype=bool))


def above(mesh: SurfaceMesh, level: float, snap: float) -> SurfaceMesh:
    """Keep the part of the mesh over the plane z = level, as `below` does for the other side."""
    turned = mesh.with_points(mesh.points * [1.0, 1.0, -1.0])
    kept = below(turned, -level, snap)
    return kept.with_points(kept.points * [1.0, 1.0, -1.0] + [0.0, 0.0, 0.0])


def _lower_parts(
    triangles: IntArray, points: FloatArray, side: IntArray, level: float
) -> tuple[IntArray, IntArray, FloatArray]:
    """Lower parts of triangles through the plane: triangles, whose part each is, new points."""
    # start each triangle at its lone corner: the one above if two are below, else the one below;
    # the others may lie on the plane only in the second case
    corner_side = side[triangles]
    lone = np.where(np.sum(corner_side < 0, axis=1) == 2, 1, -1)
    first = np.argmax(corner_side == lone[:, None], axis=1)
    a, b, c = (np.take_along_axis(triangles, (first[:, None] + k) % 3, 1)[:, 0] for k in range(3))
    number: dict[tuple[int, int], int] = {}

    def through(p: int, q: int) -> int:
        if side[q] == 0:
            return q
        return number.setdefault((min(p, q), max(p, q)), len(points) + len(number))

    lower: list[tuple[int, int, int]] = []
    owner: list[int] = []
    for t, (p, q, r) in enumerate(zip(a.tolist(), b.tolist(), c.tolist(), strict=True)):
        pq, pr = through(p, q), through(p, r)
        found = [(p, pq, pr)] if lone[t] < 0 else [(pq, q, r), (pq, r, pr)]
        lower.extend(found)
        owner.extend([t] * len(found))
    ends = np.array(list(number), dtype=np.int64).reshape(-1, 2)
    start, end = points[ends[:, 0]], points[ends[:, 1]]
    share = (level - start[:, 2]) / (end[:, 2] - start[:, 2])
    new = start + share[:, None] * (end - start)
    new[:, 2] = level
    return (
        np.array(lower, dtype=np.int64).reshape(-1, 3),
        np.array(owner, dtype=np.int64),
        new,
    )
