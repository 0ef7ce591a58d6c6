"""The whole boundary of the water as one mesh: surface, hulls and meshed walls, nodes shared."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.hull import Hull
from bemwave.geometry.outline import SIDES
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import BoolArray, FloatArray, IntArray, SurfaceMesh, joined
from bemwave.geometry.topology import attached, boundary_edges, extent, weld

RIM = "rim"


def boundary_mesh(
    water: SurfaceMesh,
    hulls: Sequence[Hull] = (),
    walls: Sequence[str] = (),
    depth: float = math.inf,
) -> SurfaceMesh:
    """Join the water surface, hulls and walls into one mesh with common nodes where they meet.

    The water's nodes come first and keep their numbers; then each hull's other nodes, then each
    wall's. The bed is not meshed (images stand for it); walls end there with an open edge.

    Parameters
    ----------
    water : SurfaceMesh
        Part "water", as `water_surface` makes it.
    hulls : sequence of Hull
        One part each, named by the body; those that cut the surface have their waterlines in
        `water`.
    walls : sequence of str
        Sides to mesh: "x_min", "x_max", "y_min", "y_max", or "rim" for the whole rim (round
        water). Their parts are called "wall_x_min", ..., "wall_rim".
    depth : float
        Water depth, m; finite where there are walls.

    Raises
    ------
    InputError
        If walls are asked for in deep water, or a waterline is missing from the water mesh.

    Examples
    --------
    >>> from bemwave.geometry.outline import Circle
    >>> tank = boundary_mesh(structured_water(Circle(0, 0, 1), 0.2), walls=["rim"], depth=1.0)
    >>> tank.part_names
    ('water', 'wall_rim')
    """
    mesh = water
    for hull in hulls:
        mesh, missing = attached(mesh, hull.mesh, hull.mesh.points[:, 2] == 0.0)
        if missing:
            raise InputError(
                f"{missing} waterline points of {hull.name} are not in the water "
                "mesh: the water mesh must have been made for this hull in this place; "
                "leave out [surface] mesh to have it made, or make it again"
            )
    if len(walls):
        rim = outer_rim(water, mesh)
        edges = {side: rim[_on_side(water, rim, side)] for side in walls}
        # one set of layers, or walls would not share their nodes where they meet
        z = -_layers(water, np.concatenate(list(edges.values())), walls[0], depth)
        for side in walls:
            wall = _wall(water, edges[side], f"wall_{side}", z)
            mesh, _ = attached(mesh, wall, np.ones(len(wall.points), dtype=bool))
    return mesh


def outer_rim(water: SurfaceMesh, mesh: SurfaceMesh) -> IntArray:
    """Directed edges of the water's boundary that no hull in `mesh` shares, (n, 2)."""
    edges = boundary_edges(water.triangles)
    others = mesh.triangles[len(water.triangles) :]
    hull_edges = {tuple(edge) for edge in boundary_edges(others).tolist()}
    # hull and water run along a common waterline in opposite directions
    free = [(b, a) not in hull_edges for a, b in edges.tolist()]
    return np.asarray(edges[np.array(free, dtype=bool)])


def _on_side(water: SurfaceMesh, rim: IntArray, side: str) -> BoolArray:
    """Which of the rim's edges lie on the named side."""
    if side == RIM:
        return np.ones(len(rim), dtype=bool)
    axis, end = SIDES.index(side) // 2, SIDES.index(side) % 2
    across = water.points[:, axis]
    place = across.max() if end else across.min()
    tolerance = 1e-6 * extent(water.points)
    return np.asarray(np.all(np.abs(across[rim] - place) < tolerance, axis=1))


def _layers(water: SurfaceMesh, edges: IntArray, side: str, depth: float) -> FloatArray:
    """Depths of the rows of nodes of all walls that stand on these edges of the rim."""
    if not math.isfinite(depth):
        raise InputError(
            f"wall_{side} is to be meshed in water of depth 'deep': walls need a bed to stand on; "
            "give [water] depth in metres"
        )
    length = np.linalg.norm(np.diff(water.points[edges], axis=1), axis=-1).mean()
    return wall_layers(depth, float(length))


def _wall(water: SurfaceMesh, edges: IntArray, name: str, z: FloatArray) -> SurfaceMesh:
    """Extrude rim edges from z = 0 down to the bed; normals out of the tank."""
    start, end = water.points[edges[:, 0]], water.points[edges[:, 1]]
    # the water lies to the left of its rim: along the rim x down points into the tank
    strips = []
    for a, b in zip(start, end, strict=True):
        points = np.empty((len(z), 2, 3))
        points[:, 0], points[:, 1] = a, b
        points[:, :, 2] = z[:, None]
        strip = SurfaceMesh.of_one_part(points, grid_triangles(len(z) - 1, 1), name)
        strips.append(strip.flipped())
    return weld(joined(strips), 0.0)[0]


def wall_layers(depth: float, edge: float) -> FloatArray:
    """Depths of a wall's rows of nodes, from 0 to `depth`, (n,), m.

    Layers are half as high as the rim's edges are long at the surface, where a tank's error comes
    from, and grow evenly to as high at the bed (or 10 edges down; waves fade): the mesh is refined
    everywhere when the edges are, and sloshing frequencies keep the scheme's third order.
    """
    reach = min(depth, 10.0 * edge)
    count = max(1, math.ceil(2.0 * reach / edge * math.log1p(depth / reach)))
    return np.asarray(reach * np.expm1(np.linspace(0.0, math.log1p(depth / reach), count + 1)))
