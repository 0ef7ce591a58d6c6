"""Hulls closed by their waterplanes: the surfaces round what is not water."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.spatial import Delaunay, KDTree

from bemwave.errors import InputError
from bemwave.geometry.hull import Hull
from bemwave.geometry.surface_mesh import FloatArray, IntArray, SurfaceMesh, joined

WATERPLANE = "waterplane"


def closed_bodies(hulls: Sequence[Hull]) -> SurfaceMesh:
    """All hulls and, as one more part, their waterplanes; normals into the bodies.

    Waterplanes share the nodes of waterlines and have triangles about as large as the edges there.

    Raises
    ------
    InputError
        If a waterline is too narrow for its own edges.
    """
    if not hulls:
        none = np.zeros((0, 3))
        return SurfaceMesh(none, none.astype(np.int64), none[:, 0].astype(np.int64), (WATERPLANE,))
    mesh = joined([hull.mesh for hull in hulls])
    points, triangles, first = [mesh.points], [], 0
    count = len(mesh.points)
    for hull in hulls:
        if hull.waterlines:
            lattice, lid = _lid(hull)
            lid = np.where(
                lid < len(hull.mesh.points), lid + first, lid - len(hull.mesh.points) + count
            )
            points.append(lattice)
            triangles.append(lid[:, ::-1])
            count += len(lattice)
        first += len(hull.mesh.points)
    lids = np.concatenate(triangles) if triangles else np.zeros((0, 3), dtype=np.int64)
    return SurfaceMesh(
        np.concatenate(points),
        np.concatenate([mesh.triangles, lids]),
        np.concatenate([mesh.part, np.full(len(lids), len(mesh.part_names))]),
        (*mesh.part_names, WATERPLANE),
    )


def _lid(hull: Hull) -> tuple[FloatArray, IntArray]:
    """Points inside the waterlines of a hull, and triangles over both, facing up.

    Points of the hull have their own numbers; those inside follow.
    """
    from matplotlib.path import Path

    loops = hull.waterlines
    polygons = hull.polygons()
    border = np.concatenate(polygons)
    edges = np.concatenate([np.column_stack([loop, np.roll(loop, -1)]) for loop in loops])
    length = np.linalg.norm(np.diff(hull.mesh.points[edges], axis=1)[:, 0], axis=1)
    size = float(np.median(length))

    def inside(places: FloatArray) -> np.ndarray:
        within = np.zeros(len(places), dtype=bool)
        for polygon in polygons:
            within ^= Path(polygon).contains_points(places)
        return within

    lattice = _lattice(border, size)
    middles = 0.5 * (border + np.concatenate([np.roll(p, -1, axis=0) for p in polygons]))
    clear = KDTree(np.concatenate([border, middles])).query(lattice)[0] > 0.6 * size
    lattice = lattice[inside(lattice) & clear]
    plan = np.concatenate([border, lattice])
    number = np.concatenate([*loops, len(hull.mesh.points) + np.arange(len(lattice))])
    found = Delaunay(plan).simplices
    found = found[inside(plan[found].mean(axis=1))]
    a, b, c = (plan[found[:, k]] for k in range(3))
    twice = (b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]
    found = np.where(twice[:, None] > 0.0, found, found[:, ::-1])[np.abs(twice) > 1e-9 * size**2]
    lid = number[found]
    _refuse_gaps(hull, edges, lid)
    return np.column_stack([lattice, np.zeros(len(lattice))]), lid


def _lattice(border: FloatArray, size: float) -> FloatArray:
    """Points of equilateral triangles over a plan."""
    low, high = border.min(axis=0), border.max(axis=0)
    row = size * np.sqrt(0.75)
    j, i = np.mgrid[: int((high[1] - low[1]) / row) + 1, : int((high[0] - low[0]) / size) + 1]
    x = low[0] + size * (i + 0.5 * (j % 2))
    return np.column_stack([x.ravel(), (low[1] + row * (j + 0.5)).ravel()])


def _refuse_gaps(hull: Hull, edges: IntArray, lid: IntArray) -> None:
    """Every edge of the waterline must be one of the waterplane's."""
    sides = {tuple(sorted(e)) for k in range(3) for e in lid[:, [k, (k + 1) % 3]].tolist()}
    if any(tuple(sorted(edge)) not in sides for edge in edges.tolist()):
        raise InputError(
            f"{hull.name}: the waterline is narrower somewhere than its panels are long; expected "
            "panels that follow it: give the body a smaller panel_size"
        )
