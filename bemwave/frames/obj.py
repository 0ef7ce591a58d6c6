"""OBJ: one text file for each frame; points, normals and triangles, which is all it can hold."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from bemwave.frames.sheet import Array, Bools
from bemwave.geometry.surface_mesh import SurfaceMesh


def write_obj(
    path: Path,
    mesh: SurfaceMesh,
    normals: Array,
    data: Mapping[str, Array | Bools],
    note: str = "",
) -> None:
    """Write vertices and normals, six decimals, and triangles; `data` has no place in it."""
    corners = np.repeat(mesh.triangles + 1, 2, axis=1)
    with path.open("w", encoding="ascii") as file:
        file.write(f"# metres, z up, still water at z = 0\n# {note}\no {mesh.part_names[0]}\n")
        for mark, rows in (("v", mesh.points), ("vn", normals)):
            line = f"{mark} %.6f %.6f %.6f\n"
            file.write(line * len(rows) % tuple(rows.ravel().tolist()))
        file.write("f %d//%d %d//%d %d//%d\n" * len(corners) % tuple(corners.ravel().tolist()))
