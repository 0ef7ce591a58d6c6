"""Meshing a cut hull anew to a panel size."""

from __future__ import annotations

from typing import Any

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.faults import find_faults
from bemwave.geometry.mesher import check_count, run_job
from bemwave.geometry.surface_mesh import FloatArray, IntArray, SurfaceMesh
from bemwave.geometry.topology import boundary_edges, directed_edges, extent

# degrees between neighbours from which an edge is kept as an edge. An edge that fades out within a
# face (a stem running into a flat bottom) can leave the mesher with an open curve: then others
# are tried; at 180 only the rim is kept
SHARP = (40.0, 30.0, 60.0, 80.0, 180.0)


def remesh(mesh: SurfaceMesh, panel_size: float, what: str) -> tuple[SurfaceMesh, float]:
    """Mesh a surface anew with edges of `panel_size`, keeping sharp edges and open rims.

    New points lie on the old triangles and new rim points on the old rim, so a waterline stays at
    z = 0 exactly. The normals' sense is kept; part names are not (one part remains).

    Parameters
    ----------
    mesh : SurfaceMesh
        Wetted hull, normals out of the water.
    panel_size : float
        Metres.
    what : str
        Name of the hull, for messages.

    Returns
    -------
    mesh : SurfaceMesh
    angle : float
        Edges sharper than this many degrees were kept; 40 unless that could not be meshed.

    Raises
    ------
    MissingLibraryError
        If gmsh cannot be loaded.
    InputError
        If gmsh makes no sound mesh of it.
    """
    check_count(float(mesh.areas.sum()), panel_size, f"{what}: panel_size")
    task = f"remeshing {what} at {panel_size:g} m"
    reason = ""
    for angle in SHARP:
        job = {
            "points": mesh.points,
            "triangles": mesh.triangles,
            "size": panel_size,
            "angle": angle,
        }
        try:
            new = _remeshed(mesh, run_job("remesh", job, task))
        except InputError as error:
            reason = str(error)
            continue
        faults = find_faults(new.flipped(), open_at=np.unique(_rim(mesh)).tolist())
        if not faults:
            return new, angle
        reason = f"{task} gave a mesh in which {faults[0]}"
    raise InputError(reason)


def _remeshed(old: SurfaceMesh, result: dict[str, Any]) -> SurfaceMesh:
    new = SurfaceMesh.of_one_part(
        _rim_levels_restored(result, old), result["triangles"], old.part_names[0]
    ).keep(np.ones(len(result["triangles"]), dtype=bool))
    return _faced_like(old, new, result["surface"])


def _rim(mesh: SurfaceMesh) -> FloatArray:
    """Heights of the open edges' points."""
    return np.asarray(mesh.points[np.unique(boundary_edges(mesh.triangles)), 2])


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
    for level in np.unique(_rim(old)):
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
