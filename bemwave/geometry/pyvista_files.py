"""VTP through pyvista; no window is opened."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from bemwave.geometry.meshio_files import UNNAMED, named
from bemwave.geometry.surface_mesh import SurfaceMesh


def read_vtp(path: Path) -> SurfaceMesh:
    """VTP; parts from the integer cell array "part" and the field "part_names"."""
    import pyvista as pv

    with pv.vtk_verbosity("off"):  # it prints past Python
        data = pv.read(path)
    if not data.n_faces_strict and not data.n_strips:
        return SurfaceMesh.of_one_part(np.empty((0, 3)), [], UNNAMED)
    if not data.is_all_triangles:
        data = data.triangulate()
    triangles = data.regular_faces
    points = np.asarray(data.points, dtype=np.float64)
    if "part" not in data.cell_data:
        return SurfaceMesh.of_one_part(points, triangles, UNNAMED)
    part = np.asarray(data.cell_data["part"], dtype=np.int64)[-len(triangles) :]
    if "part_names" not in data.field_data:
        return SurfaceMesh(points, triangles, *named(part))
    return SurfaceMesh(
        points, triangles, part, [str(name) for name in data.field_data["part_names"]]
    )


def write_vtp(mesh: SurfaceMesh, path: Path) -> None:
    """VTP, float64, with the integer cell array "part" and the field "part_names"."""
    import pyvista as pv

    data = pv.PolyData.from_regular_faces(mesh.points.copy(), mesh.triangles)
    data.cell_data["part"] = mesh.part.astype(np.int32)
    data.field_data["part_names"] = list(mesh.part_names)
    save(data, path)


def save(data: Any, path: Path) -> None:
    """Write a pyvista.PolyData; OSError where there is no room (VTK's own way out is a crash)."""
    from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter

    writer = vtkXMLPolyDataWriter()
    writer.SetInputData(data)
    writer.SetDataModeToBinary()
    writer.WriteToOutputStringOn()
    writer.Write()
    path.write_text(writer.GetOutputString(), encoding="utf-8")
