"""VTK: a .vtp file for each frame and a .pvd file that gives them their times."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np

from bemwave import __version__
from bemwave.frames.sheet import Array, Bools
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.vtp_files import save


def write_vtp(
    path: Path,
    mesh: SurfaceMesh,
    normals: Array,
    data: Mapping[str, Array | Bools],
    note: str = "",
) -> None:
    """Write points, triangles, "Normals" and further values at the points, float32."""
    import pyvista

    drawn = pyvista.PolyData.from_regular_faces(mesh.points.astype(np.float32), mesh.triangles)
    drawn.point_data["Normals"] = normals.astype(np.float32)
    drawn.point_data.active_normals_name = "Normals"
    for name, values in data.items():
        kind = np.uint8 if values.dtype == np.bool_ else np.float32
        drawn.point_data[name] = values.astype(kind)
    if note:
        drawn.field_data["note"] = [note]
    save(drawn, path)


def pvd_text(files: Sequence[tuple[float, str]]) -> str:
    """Text of a .pvd file: the time, s, and the name of each frame's file."""
    lines = [f'    <DataSet timestep="{time!r}" part="0" file="{name}"/>' for time, name in files]
    return "\n".join(
        [
            '<?xml version="1.0"?>',
            f"<!-- bemwave {__version__} -->",
            '<VTKFile type="Collection" version="0.1" byte_order="LittleEndian">',
            "  <Collection>",
            *lines,
            "  </Collection>",
            "</VTKFile>",
            "",
        ]
    )
