"""The four-column platform: columns on a ring of square pontoons, by solid modelling."""

from __future__ import annotations

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.hydrostatics import hydrostatics
from bemwave.geometry.mesher import run_job
from bemwave.geometry.patterns import polygon_radius
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import weld


def columns(
    spacing: float, column_radius: float, pontoon: float, draught: float, panel_size: float
) -> SurfaceMesh:
    """Four upright columns at (+-spacing/2, +-spacing/2) on pontoons; wetted part, in place.

    The columns' polygons have the area of their circles, so the waterplane area is exact; normals
    out of the water.

    Parameters
    ----------
    spacing : float
        Distance of neighbouring columns' axes, m.
    column_radius : float
    pontoon : float
        Height and width of the pontoons, m; their undersides are level with the columns'.
    draught : float
    panel_size : float

    Raises
    ------
    InputError
        If the dimensions do not make such a platform.
    MissingLibraryError
        If gmsh cannot be loaded.
    """
    sizes = {
        "spacing": spacing,
        "column_radius": column_radius,
        "pontoon": pontoon,
        "draught": draught,
        "panel_size": panel_size,
    }
    for key, value in sizes.items():
        if not 0.0 < value < np.inf:
            raise InputError(f"columns: {key} = {value} given, a length above zero wanted")
    if not (2.0 * column_radius < spacing and pontoon < 2.0 * column_radius and pontoon < draught):
        raise InputError(
            f"columns: spacing = {spacing}, column_radius = {column_radius}, pontoon = {pontoon}, "
            f"draught = {draught} do not fit: columns must be clear of each other, pontoons "
            "narrower than a column's diameter and lower than the draught"
        )
    around = max(8, round(2.0 * np.pi * column_radius / panel_size))
    job = {
        **sizes,
        "size": panel_size,
        "around": around,
        "column_radius": polygon_radius(column_radius, around),
    }
    return _modelled(job)


def _modelled(job: dict[str, float]) -> SurfaceMesh:
    made = run_job("columns", job, "modelling the columns")
    tolerance = 1e-9 * job["spacing"]
    points = np.where(np.abs(made["points"]) < tolerance, 0.0, made["points"])
    lids = np.any(np.all(points[made["triangles"]] == 0.0, axis=1), axis=1)
    quarter = SurfaceMesh.of_one_part(points, made["triangles"], "hull").keep(~lids)
    mirrored = quarter.with_points(quarter.points * [-1.0, 1.0, 1.0]).flipped()
    half = joined([quarter, mirrored])
    whole = joined([half, half.with_points(half.points * [1.0, -1.0, 1.0]).flipped()])
    mesh, _, _ = weld(whole, tolerance)
    return mesh if hydrostatics(mesh).volume > 0.0 else mesh.flipped()
