"""Meshes of the still-water sheet: structured in open water, graded round waterlines."""

from __future__ import annotations

import numpy as np

from bemwave.geometry.outline import Circle, Outline
from bemwave.geometry.patterns import disc_angles, disc_triangles, grid_triangles, polygon_radius
from bemwave.geometry.surface_mesh import SurfaceMesh

WATER = "water"


def structured_water(outline: Outline, spacing: float) -> SurfaceMesh:
    """Mesh water without bodies by formula; needs no mesher.

    A rectangle gets equal right triangles, all diagonals the same way: every inner node then sees
    the same neighbourhood, and the scheme's dispersion on it has a closed form. A circle gets
    rings of 6, 12, 18 ... points and the polygon of equal area as its rim.

    Parameters
    ----------
    outline : Rectangle or Circle
        Absorber included.
    spacing : float
        Edge length aimed at, m; the nearest that divides the sides is taken.

    Returns
    -------
    SurfaceMesh
        One part, "water"; z = 0, normals up.
    """
    if isinstance(outline, Circle):
        rings = outline.rings(spacing)
        ring, angle = disc_angles(rings, 6)
        r = polygon_radius(outline.radius, 6 * rings) * ring / rings
        x, y = outline.x + r * np.cos(angle), outline.y + r * np.sin(angle)
        triangles = disc_triangles(rings, 6)
    else:
        nx, ny = outline.counts(spacing)
        y, x = np.meshgrid(
            np.linspace(outline.y_min, outline.y_max, ny + 1),
            np.linspace(outline.x_min, outline.x_max, nx + 1),
            indexing="ij",
        )
        triangles = grid_triangles(ny, nx)
    points = np.stack([x, y, np.zeros_like(x)], axis=-1)
    return SurfaceMesh.of_one_part(points, triangles, WATER)
