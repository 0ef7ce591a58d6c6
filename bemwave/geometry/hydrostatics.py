"""Volume, waterplane and centres of a wetted hull."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bemwave.geometry.surface_mesh import FloatArray, SurfaceMesh
from bemwave.geometry.topology import boundary_edges, boundary_loops


@dataclass(frozen=True)
class Hydrostatics:
    """What the still water makes of a hull; lengths in m, in the axes of the mesh it was taken of.

    Attributes
    ----------
    volume : float
        Displaced volume, m3.
    waterplane_area : float
        m2, holes (moonpools) taken off; 0 for a body wholly under water.
    centre_of_buoyancy : (3,) ndarray
        Centre of the displaced volume, m.
    centre_of_flotation : (2,) ndarray
        Centre of the waterplane, m; nan without a waterplane.
    waterplane_xx, waterplane_yy, waterplane_xy : float
        Integrals of (x - xf)^2, (y - yf)^2 and (x - xf)(y - yf) over the waterplane, m4, about
        the centre of flotation.
    length, beam : float
        Extent of the wetted hull along x and y, m.
    draught : float
        Depth of the lowest point, m.
    wetted_area : float
        m2.
    """

    volume: float
    waterplane_area: float
    centre_of_buoyancy: FloatArray
    centre_of_flotation: FloatArray
    waterplane_xx: float
    waterplane_yy: float
    waterplane_xy: float
    length: float
    beam: float
    draught: float
    wetted_area: float


def hydrostatics(mesh: SurfaceMesh) -> Hydrostatics:
    """Hydrostatics of a wetted hull, normals out of the water, open at z = 0 and at the bed.

    The volume integrals use the divergence theorem with horizontal fields, to which the missing
    flat lids at the waterline and at the bed add nothing; the integrands are quadratic, so the
    rule over edge midpoints is exact. The waterplane integrals follow Green's theorem along the
    waterline's straight edges.

    Parameters
    ----------
    mesh : SurfaceMesh
        Waterline points have z = 0 exactly.
    """
    low, high = mesh.points.min(axis=0), mesh.points.max(axis=0)
    origin = np.array([0.5 * (low[0] + high[0]), 0.5 * (low[1] + high[1]), 0.0])
    volume, buoyancy = _volume_and_centre(mesh, origin)
    area, flotation, xx, yy, xy = _waterplane(mesh, origin[:2])
    return Hydrostatics(
        volume=volume,
        waterplane_area=area,
        centre_of_buoyancy=buoyancy,
        centre_of_flotation=flotation,
        waterplane_xx=xx,
        waterplane_yy=yy,
        waterplane_xy=xy,
        length=float(high[0] - low[0]),
        beam=float(high[1] - low[1]),
        draught=float(-low[2]),
        wetted_area=float(mesh.areas.sum()),
    )


def least_width(mesh: SurfaceMesh) -> float:
    """Smallest extent of any waterline of a wetted hull along its x or y axis, m.

    Of a body wholly under water: its smallest extent along any axis.
    """
    loops = [mesh.points[loop] for loop in boundary_loops(mesh.triangles)]
    waterlines = [loop for loop in loops if np.all(loop[:, 2] == 0.0)]
    if not waterlines:
        return float(np.ptp(mesh.points, axis=0).min())
    return min(float(np.ptp(loop[:, :2], axis=0).min()) for loop in waterlines)


def _volume_and_centre(mesh: SurfaceMesh, origin: FloatArray) -> tuple[float, FloatArray]:
    corners = mesh.vertices - origin
    middles = 0.5 * (corners + np.roll(corners, -1, axis=1))  # (m, 3 edges, 3)
    outward = -mesh.area_vectors / 3.0  # out of the hull, a third for each edge midpoint
    x, y, z = np.moveaxis(middles, -1, 0)
    nx, ny = outward[:, :1], outward[:, 1:2]
    volume = 0.5 * float(np.sum(x * nx + y * ny))
    if volume == 0.0:
        return 0.0, np.full(3, np.nan)
    first = [
        0.5 * np.sum(x * x * nx),
        0.5 * np.sum(y * y * ny),
        0.5 * np.sum(z * (x * nx + y * ny)),
    ]
    return volume, origin + np.array(first) / volume


def _waterplane(
    mesh: SurfaceMesh, origin: FloatArray
) -> tuple[float, FloatArray, float, float, float]:
    edges = boundary_edges(mesh.triangles)
    edges = edges[np.all(mesh.points[edges, 2] == 0.0, axis=1)]
    if not len(edges):
        return 0.0, np.full(2, np.nan), 0.0, 0.0, 0.0
    # with normals out of the water a hull's waterline runs counter-clockwise, a moonpool's not
    xa, ya, xb, yb = (mesh.points[edges, :2] - origin).reshape(-1, 4).T
    cross = xa * yb - xb * ya
    area = 0.5 * float(cross.sum())
    if area <= 0.0:
        return area, np.full(2, np.nan), 0.0, 0.0, 0.0
    centre = np.array([np.sum((xa + xb) * cross), np.sum((ya + yb) * cross)]) / (6.0 * area)
    xx = np.sum((xa * xa + xa * xb + xb * xb) * cross) / 12.0 - area * centre[0] ** 2
    yy = np.sum((ya * ya + ya * yb + yb * yb) * cross) / 12.0 - area * centre[1] ** 2
    mixed = xa * yb + 2.0 * xa * ya + 2.0 * xb * yb + xb * ya
    xy = np.sum(mixed * cross) / 24.0 - area * centre[0] * centre[1]
    return area, origin + centre, float(xx), float(yy), float(xy)
