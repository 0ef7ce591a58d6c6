"""The work done by gmsh, in a process of its own: reads a job, writes a mesh.

Run as a script by `mesher.run_job` (never imported by the package): gmsh resets the handler of
Ctrl-C, works in the main thread only, and may hang on bad input; in a process of its own none of
that reaches the run. Arrays come in and go out as .npz files.
"""

from __future__ import annotations

import sys
from collections.abc import Mapping
from typing import Any

import numpy as np

LIBRARY_MISSING = 41  # exit code: gmsh cannot load its system libraries

FRONTAL = 6  # gmsh's number of the frontal Delaunay algorithm: the most even triangles


def remesh(job: Mapping[str, Any]) -> dict[str, Any]:
    """Mesh a triangulated surface anew with edges of a given size, keeping its sharp edges."""
    import gmsh

    gmsh.initialize(interruptible=False)
    _quiet(gmsh)
    gmsh.model.add("hull")
    tag = gmsh.model.addDiscreteEntity(2)
    count = len(job["points"])
    gmsh.model.mesh.addNodes(2, tag, np.arange(1, count + 1), job["points"].ravel())
    gmsh.model.mesh.addElementsByType(tag, 2, [], (job["triangles"] + 1).ravel())
    angle = float(np.radians(job["angle"]))
    gmsh.model.mesh.classifySurfaces(angle, True, True, angle)
    gmsh.model.mesh.createGeometry()
    _constant_size(gmsh, float(job["size"]))
    gmsh.model.mesh.generate(2)
    return _surfaces(gmsh)


def water(job: Mapping[str, Any]) -> dict[str, Any]:
    """Mesh flat water between closed polygons, keeping their edges, graded away from some.

    `loop0`, `loop1` ... are polygons (n, 2); `sheet0`, ... list the loops of each sheet, the outer
    one first; sizes are `fine` at the points `near` and grow by `growth` a metre up to `spacing`.
    """
    import pygmsh
    from scipy.spatial import cKDTree

    near = job["near"]
    tree = cKDTree(near) if len(near) else None
    fine, spacing, growth = (float(job[key]) for key in ("fine", "spacing", "growth"))

    def size(dim: int, tag: int, x: float, y: float, z: float, lc: float) -> float:
        if tree is None:
            return spacing
        return min(spacing, fine + growth * float(tree.query((x, y))[0]))

    import gmsh

    with pygmsh.geo.Geometry() as geometry:
        _quiet(gmsh)
        loops = []
        for k in range(int(job["loops"])):
            polygon = geometry.add_polygon(job[f"loop{k}"], make_surface=False)
            for line in polygon.lines:
                geometry.set_transfinite_curve(line, 2, "Progression", 1.0)
            loops.append(polygon.curve_loop)
        for k in range(int(job["sheets"])):
            outer, *holes = (loops[i] for i in job[f"sheet{k}"])
            geometry.add_plane_surface(outer, holes=holes)
        geometry.set_mesh_size_callback(size)
        mesh = geometry.generate_mesh(dim=2, algorithm=FRONTAL)
    return {
        "points": np.column_stack([mesh.points[:, :2], np.zeros(len(mesh.points))]),
        "triangles": mesh.get_cells_type("triangle"),
    }


def columns(job: Mapping[str, Any]) -> dict[str, Any]:
    """Mesh the quarter x > 0, y > 0 of four columns on pontoons, by solid modelling.

    The flat cuts at x = 0, y = 0 and z = 0 are part of the result.
    """
    import gmsh
    import pygmsh

    half, radius = 0.5 * float(job["spacing"]), float(job["column_radius"])
    pontoon, draught = float(job["pontoon"]), float(job["draught"])
    low = half - 0.5 * pontoon
    with pygmsh.occ.Geometry() as geometry:
        _quiet(gmsh)
        column = geometry.add_cylinder([half, half, -draught], [0.0, 0.0, draught], radius)
        along_x = geometry.add_box([0.0, low, -draught], [half, pontoon, pontoon])
        along_y = geometry.add_box([low, 0.0, -draught], [pontoon, half, pontoon])
        geometry.boolean_union([column, along_x, along_y])
        geometry.synchronize()
        for _, curve in gmsh.model.getEntities(1):
            if gmsh.model.getType(1, curve) == "Circle" and _is_at_waterline(gmsh, curve):
                gmsh.model.mesh.setTransfiniteCurve(curve, int(job["around"]) + 1)
        _constant_size(gmsh, float(job["size"]))
        geometry.generate_mesh(dim=2, algorithm=FRONTAL)
        return _surfaces(gmsh)


def _is_at_waterline(gmsh: Any, curve: int) -> bool:
    _, _, low, _, _, high = gmsh.model.getBoundingBox(1, curve)
    return bool(low > -1e-6 and high < 1e-6)


def _quiet(gmsh: Any) -> None:
    gmsh.option.setNumber("General.Terminal", 0)
    gmsh.option.setNumber("General.NumThreads", 1)  # same mesh every time


def _constant_size(gmsh: Any, size: float) -> None:
    for option in ("ExtendFromBoundary", "FromPoints", "FromCurvature"):
        gmsh.option.setNumber(f"Mesh.MeshSize{option}", 0)
    gmsh.option.setNumber("Mesh.MeshSizeMin", size)
    gmsh.option.setNumber("Mesh.MeshSizeMax", size)
    gmsh.option.setNumber("Mesh.Algorithm", FRONTAL)


def _surfaces(gmsh: Any) -> dict[str, Any]:
    """Points, triangles and the number of the surface each triangle is on."""
    tags, points, _ = gmsh.model.mesh.getNodes()
    number = np.zeros(int(tags.max()) + 1, dtype=np.int64)
    number[tags.astype(np.int64)] = np.arange(len(tags))
    triangles, surface = [], []
    for _, entity in gmsh.model.getEntities(2):
        _, nodes = gmsh.model.mesh.getElementsByType(2, entity)
        triangles.append(number[nodes.astype(np.int64)].reshape(-1, 3))
        surface.append(np.full(len(nodes) // 3, entity))
    return {
        "points": points.reshape(-1, 3),
        "triangles": np.concatenate(triangles),
        "surface": np.concatenate(surface),
    }


def main(name: str, job_file: str, result_file: str) -> int:
    """Do the job called `name`."""
    try:
        import gmsh  # noqa: F401
    except OSError as error:
        print(error, file=sys.stderr)
        return LIBRARY_MISSING
    jobs = {"remesh": remesh, "water": water, "columns": columns}
    with np.load(job_file) as job:
        np.savez(result_file, **jobs[name](dict(job)))
    return 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
