"""Bodies as they are drawn: the whole hull, not only what is wetted at rest."""

from __future__ import annotations

import numpy as np

from bemwave.frames.sheet import Array
from bemwave.geometry.hull import Hull
from bemwave.geometry.surface_mesh import SurfaceMesh, joined

SIDES = 0.5  # of the draught: how high the sides of a form are drawn


def drawn_mesh(hull: Hull) -> SurfaceMesh:
    """A hull in its own axes, normals out of it.

    From a mesh file it is drawn as the file has it. A form, and a file that ends at the waterline,
    has no topsides: it gets upright sides and a flat deck, for the picture alone.
    """
    least = 0.01 * hull.hydrostatics.draught
    if hull.whole is not None and hull.whole.points[:, 2].max() > least:
        return hull.whole.renamed(hull.name)
    own = hull.mesh.flipped()
    wetted = own.with_points(hull.place.back(own.points))
    height = SIDES * hull.hydrostatics.draught
    sides = [_sides(wetted.points[loop], height, hull.name) for loop in hull.waterlines]
    return joined([wetted, *sides])


def _sides(loop: Array, height: float, name: str) -> SurfaceMesh:
    """Upright sides over a waterline, counter-clockwise from above, and a deck about its middle."""
    count = len(loop)
    low = np.arange(count)
    ahead = np.roll(low, -1)
    middle = np.full(count, 2 * count)
    top = loop + np.array([0.0, 0.0, height])
    triangles = np.concatenate(
        [
            np.column_stack([low, ahead, ahead + count]),
            np.column_stack([low, ahead + count, low + count]),
            np.column_stack([low + count, ahead + count, middle]),
        ]
    )
    points = np.vstack([loop, top, top.mean(axis=0)])
    return SurfaceMesh.of_one_part(points, triangles, name)
