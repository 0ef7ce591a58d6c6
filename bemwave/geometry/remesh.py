"""Meshing a cut hull anew to a panel size."""

from __future__ import annotations

from typing import Any

import numpy as np

from bemwave.geometry.mesher import run_job
from bemwave.geometry.surface_mesh import FloatArray, IntArray, SurfaceMesh
from bemwave.geometry.topology import boundary_edges, directed_edges, extent

SHARP = 40.0  # degrees between neighbours from which an edge is kept as an edge


def remesh(mesh: SurfaceMesh, panel_size: float, what: str) -> SurfaceMesh:
    """Mesh a surface anew with edges of `panel_size`, keeping sharp edges and open rims.

    New points lie on the old triangles and new rim points on the old rim, so a waterline stays at
    z = 0 exactly. The normals' sense is kept; part names are not (one part remains).

    Parameters
    ----------
    mesh : SurfaceMesh
    panel_size : float
        Metres.
    what : str
        Name of the hull, for messages.

    Raises
    ------
    MissingLibraryError
        If gmsh cannot be loaded.
    InputError
        If gmsh fails, or the rim does not come back where it was.
    """
    job = {
        "points": mesh.points,
        "triangles": mesh.triangles,
        "size": panel_size,
        "angle": SHARP,
    }
    result = run_job("remesh", job, f"remeshing {what} at {panel_size:g} m")
    new = SurfaceMesh.of_one_part(
        _rim_levels_restored(result, mesh), result["triangles"], mesh.part_names[0]
    ).keep(np.ones(len(result["triangles"]), dtype=bool))
    return _faced_like(mesh, new, result["surface"])


def is_even(mesh: SurfaceMesh, panel_size: float) -> bool:
    """Whether a mesh already is what `remesh` would make: edges near the size, no needles."""
    length = edge_lengths(mesh)
    return bool(
        0.6 * panel_size < length.mean() < 1.3 * panel_size
        and length.max() < 2.0 * panel_size
        and quality(mesh).min() > 0.1
    )


def edge_lengths(mesh: SurfaceMesh) -> FloatArray:
    """Lengths of the triangles' sides, (m, 3), m."""
    ends = mesh.points[directed_edges(mesh.triangles)]
    return np.asarray(np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).reshape(-1, 3))


def quality(mesh: SurfaceMesh) -> FloatArray:
    """Shape of each triangle, (m,): 1 equilateral, 0 flat; 4 sqrt(3) area over squared sides."""
    return np.asarray(4.0 * np.sqrt(3.0) * mesh.areas / np.sum(edge_lengths(mesh) ** 2, axis=1))


def _rim_levels_restored(result: dict[str, Any], old: SurfaceMesh) -> FloatArray:
    """New points, rim points put exactly on the flat levels of the old rim."""
    points = np.array(result["points"], dtype=np.float64)
    rim = np.unique(boundary_edges(result["triangles"]))
    tolerance = 1e-9 * extent(old.points)
    for level in np.unique(old.points[np.unique(boundary_edges(old.triangles)), 2]):
        near = rim[np.abs(points[rim, 2] - level) < tolerance]
        points[near, 2] = level
    return points


def _faced_like(old: SurfaceMesh, new: SurfaceMesh, surface: IntArray) -> SurfaceMesh:
    """Turn each of the mesher's surfaces to face the way the old mesh faces there."""
    from scipy.spatial import cKDTree

    # an old triangle may be long, so look at points spread over it, not at its centre alone
    spread = np.array([[4, 1, 1], [1, 4, 1], [1, 1, 4], [2, 2, 2]]) / 6.0
    samples = np.einsum("sc,mcx->msx", spread, old.vertices).reshape(-1, 3)
    _, nearest = cKDTree(samples).query(new.centroids)
    agree = np.sum(old.normals[nearest // 4] * new.area_vectors, axis=1)
    _, which = np.unique(surface, return_inverse=True)
    reverse = (np.bincount(which, weights=agree) < 0.0)[which]
    triangles = np.where(reverse[:, None], new.triangles[:, ::-1], new.triangles)
    return SurfaceMesh(new.points, triangles, new.part, new.part_names)
