"""VTP in and out through VTK; no window is opened."""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Any

import numpy as np

from bemwave import __version__
from bemwave.geometry.meshio_files import UNNAMED, named
from bemwave.geometry.surface_mesh import FloatArray, SurfaceMesh

SECONDS = 60.0  # for one file; the largest hulls take a few


def read_vtp(path: Path) -> SurfaceMesh:
    """VTP; parts from the integer cell array "part" and the field "part_names"."""
    found = _read(path)
    points, triangles = found["points"], found["triangles"].astype(np.int64)
    if "part" not in found:
        return SurfaceMesh.of_one_part(points, triangles, UNNAMED)
    part = found["part"].astype(np.int64)
    if "names" not in found:
        return SurfaceMesh(points, triangles, *named(part))
    return SurfaceMesh(points, triangles, part, [str(name) for name in found["names"]])


def read_vtk_points(path: Path) -> FloatArray:
    """Points (n, 3) of a VTP or VTU file; ValueError if it cannot be read."""
    points: FloatArray = _read(path)["points"]
    return points


def _read(path: Path) -> dict[str, np.ndarray[Any, Any]]:
    """Have a VTK file read in a process of its own, see `vtk_jobs`."""
    script = Path(__file__).with_name("vtk_jobs.py")
    with tempfile.TemporaryDirectory() as folder:
        result = Path(folder, "result.npz")
        # -P: this folder's modules must not stand in for the library's of the same name
        command = [sys.executable, "-P", str(script), str(path.resolve()), str(result)]
        try:
            done = subprocess.run(
                command, cwd=folder, capture_output=True, timeout=SECONDS, check=False
            )
        except subprocess.TimeoutExpired:
            raise ValueError(f"its reader was not done after {SECONDS:g} s") from None
        if done.returncode != 0 or not result.exists():
            raise ValueError("its reader gave up: it is damaged, or no such file")
        with np.load(result) as arrays:
            return dict(arrays)


def write_vtp(mesh: SurfaceMesh, path: Path) -> None:
    """VTP, float64, with the integer cell array "part" and the field "part_names"."""
    import pyvista as pv

    data = pv.PolyData.from_regular_faces(mesh.points.copy(), mesh.triangles)
    data.cell_data["part"] = mesh.part.astype(np.int32)
    data.field_data["part_names"] = list(mesh.part_names)
    data.field_data["bemwave_version"] = [__version__]
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
