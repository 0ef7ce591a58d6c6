"""Meshes of the still-water sheet: structured in open water, graded round waterlines."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.hull import Hull
from bemwave.geometry.layout import check_layout, signed_area
from bemwave.geometry.mesher import check_count, run_job
from bemwave.geometry.outline import Circle, Outline
from bemwave.geometry.patterns import disc_angles, disc_triangles, grid_triangles, polygon_radius
from bemwave.geometry.surface_mesh import FloatArray, SurfaceMesh
from bemwave.geometry.topology import boundary_edges, extent

WATER = "water"

GROWTH = 0.2  # metres of edge length gained for each metre away from a waterline


def water_surface(
    outline: Outline,
    spacing: float,
    hulls: Sequence[Hull] = (),
    fine_spacing: float | None = None,
    *,
    structured: bool = True,
) -> SurfaceMesh:
    """Mesh the water inside an outline and outside the hulls' waterlines.

    Without a body at the surface the mesh is structured. With bodies gmsh makes it: every edge of
    every waterline and of the rim is kept, and edge lengths grow from `fine_spacing` at the
    waterlines to `spacing`. The same input gives the same mesh.

    Parameters
    ----------
    outline : Rectangle or Circle
        Absorber included, m.
    spacing : float
        Edge length far from bodies, m.
    hulls : sequence of Hull
        Those wholly under water leave the surface alone.
    fine_spacing : float, optional
        Edge length at waterlines, m; default `spacing`.
    structured : bool
        False: unstructured triangles also where no body asks for them.

    Returns
    -------
    SurfaceMesh
        One part, "water"; z = 0, normals up.

    Raises
    ------
    InputError
        For sizes not above zero, or hulls that overlap or leave the outline.
    MissingLibraryError
        If gmsh is needed and cannot be loaded.

    Examples
    --------
    >>> water = water_surface(Rectangle(-20, 20, -10, 10), 2.0, hulls=[hull], fine_spacing=0.5)
    """
    fine = spacing if fine_spacing is None else fine_spacing
    for key, value in (("spacing", spacing), ("fine_spacing", fine)):
        if not 0.0 < value < np.inf:
            raise InputError(f"{key} = {value} given, a length above zero in metres wanted")
    check_count(outline.area, spacing, "spacing")
    check_layout(hulls, outline)
    waterlines = [polygon for hull in hulls for polygon in hull.polygons()]
    if structured and not waterlines:
        return structured_water(outline, spacing)
    loops = [outline.rim(spacing), *waterlines]
    round_hulls = [0, *(k for k in range(1, len(loops)) if signed_area(loops[k]) > 0.0)]
    moonpools = [[k] for k in range(1, len(loops)) if k not in round_hulls]
    sheets = [round_hulls, *moonpools]
    job = {
        "loops": len(loops),
        "sheets": len(sheets),
        **{f"loop{k}": loop for k, loop in enumerate(loops)},
        **{f"sheet{k}": sheet for k, sheet in enumerate(sheets)},
        "near": np.concatenate(waterlines) if waterlines else np.empty((0, 2)),
        "fine": fine,
        "spacing": spacing,
        "growth": GROWTH,
    }
    made = run_job("water", job, f"meshing the water surface at {spacing:g} m", seconds=600.0)
    mesh = SurfaceMesh.of_one_part(made["points"], made["triangles"], WATER)
    return fitted_water(mesh, waterlines, "the mesher's water surface")


def expected_triangles(
    outline: Outline, spacing: float, hulls: Sequence[Hull], fine_spacing: float
) -> int:
    """How many triangles `water_surface` will make, to about an eighth where gmsh makes them.

    Of equilateral triangles, their edges growing from convex waterlines with edges of
    `fine_spacing`; finer water that several waterlines share is counted with each.
    """
    loops = [polygon for hull in hulls for polygon in hull.polygons()]
    if not loops:
        if isinstance(outline, Circle):
            return 6 * outline.rings(spacing) ** 2
        return 2 * math.prod(outline.counts(spacing))
    fine, reach = fine_spacing, (spacing - fine_spacing) / GROWTH
    # integrals over the distance r of 1/size^2 - 1/spacing^2, and of r times that
    strip = (1.0 / fine - 1.0 / spacing) / GROWTH - reach / spacing**2
    fan = (math.log(spacing / fine) + fine / spacing - 1.0) / GROWTH**2
    fan -= 0.5 * (reach / spacing) ** 2
    sides = np.concatenate([np.roll(loop, -1, axis=0) - loop for loop in loops])
    around = float(np.hypot(*sides.T).sum())
    area = outline.area - sum(signed_area(loop) for loop in loops)
    inverse = area / spacing**2 + around * strip + 2.0 * math.pi * len(loops) * fan
    return round(4.0 / math.sqrt(3.0) * inverse)


def fitted_water(mesh: SurfaceMesh, waterlines: Sequence[FloatArray], source: str) -> SurfaceMesh:
    """Check that a flat mesh is the water round these waterlines, and put its points exactly there.

    Parameters
    ----------
    mesh : SurfaceMesh
        Flat at z = 0; from a file or the mesher.
    waterlines : sequence of (k, 2) ndarray
        Polygons in plan, m (`Hull.polygons`).
    source : str
        Name for messages.

    Returns
    -------
    SurfaceMesh
        One part, "water", normals up, points of the waterlines equal to the hulls' bit by bit.

    Raises
    ------
    InputError
        If the mesh is not flat at z = 0, or a waterline's points or edges are not all in its rim.
    """
    from scipy.spatial import cKDTree

    if not len(mesh.triangles):
        raise InputError(f"{source} has no triangles; a flat mesh of the water was expected")
    tolerance = 1e-5 * extent(mesh.points)
    highest = float(np.abs(mesh.points[:, 2]).max())
    if highest > tolerance:
        raise InputError(
            f"{source} reaches |z| = {highest:.4g} m; the water surface must be flat at z = 0"
        )
    down = mesh.area_vectors[:, 2] < 0.0
    triangles = np.where(down[:, None], mesh.triangles[:, ::-1], mesh.triangles)
    points = mesh.points * [1.0, 1.0, 0.0]
    rim = {tuple(edge) for edge in boundary_edges(triangles).tolist()}
    tree = cKDTree(points[:, :2])
    for polygon in waterlines:
        distance, number = (np.asarray(found) for found in tree.query(polygon))
        edges = zip(np.roll(number, -1).tolist(), number.tolist(), strict=True)
        if distance.max() > tolerance or not rim.issuperset(edges):
            x, y = polygon[np.argmax(distance)]
            raise InputError(
                f"{source} does not follow the waterline of the hull near ({x:.4g}, {y:.4g}), "
                f"where its nearest point is {distance.max():.3g} m off: it must have been made "
                "for these hulls in these places; leave out [surface] mesh to have one made"
            )
        points[number, :2] = polygon
    return SurfaceMesh.of_one_part(points, triangles, WATER)


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
