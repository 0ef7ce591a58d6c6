"""Reads a VTP or VTU file, in a process of its own: its points and triangles go to an .npz file.

Run as a script by `vtp_files` (never imported by the package): VTK's readers trust what a file
says of itself, and a damaged or hostile one can bring them down or have them write past their
arrays; in a process of its own none of that reaches the run.
"""

from __future__ import annotations

import resource
import sys
from pathlib import Path
from typing import Any

import numpy as np

REFUSED = 42  # exit code: the reader complained
MEMORY = 4_000_000_000, 60  # bytes at most, and for each byte of the file


def triangles_of(data: Any) -> dict[str, Any]:
    """Triangles of a vtkPolyData, with their part numbers and the table of names if it has them."""
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkFiltersCore import vtkTriangleFilter

    split = vtkTriangleFilter()
    split.SetInputData(data)
    split.PassVertsOff()
    split.PassLinesOff()
    split.Update()
    mesh = split.GetOutput()
    if not mesh.GetNumberOfPolys():
        return {"triangles": np.empty((0, 3), dtype=np.int64)}
    found: dict[str, Any] = {
        "triangles": vtk_to_numpy(mesh.GetPolys().GetConnectivityArray()).reshape(-1, 3)
    }
    part = mesh.GetCellData().GetArray("part")
    names = data.GetFieldData().GetAbstractArray("part_names")
    if part is not None:
        found["part"] = vtk_to_numpy(part)
        if names is not None:
            count = names.GetNumberOfValues()
            found["names"] = np.array([str(names.GetValue(k)) for k in range(count)])
    return found


def indices_fit(data: Any) -> bool:
    """Whether all polygons and strips of a vtkPolyData use points that are there."""
    from vtkmodules.util.numpy_support import vtk_to_numpy

    for cells in (data.GetPolys(), data.GetStrips()):
        corners = vtk_to_numpy(cells.GetConnectivityArray())
        offsets = vtk_to_numpy(cells.GetOffsetsArray())
        if len(corners) and not 0 <= corners.min() <= corners.max() < data.GetNumberOfPoints():
            return False
        if len(offsets) and (offsets[0] != 0 or offsets[-1] != len(corners)):
            return False
        if (np.diff(offsets) < 0).any():
            return False
    return True


def main(name: str, result_file: str) -> int:
    """Read a file."""
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkIOXML import vtkXMLPolyDataReader, vtkXMLUnstructuredGridReader

    most, factor = MEMORY
    allowed = most + factor * Path(name).stat().st_size
    resource.setrlimit(resource.RLIMIT_AS, (allowed, allowed))
    surface = name.lower().endswith(".vtp")
    reader = vtkXMLPolyDataReader() if surface else vtkXMLUnstructuredGridReader()
    complaints: list[str] = []
    reader.AddObserver("ErrorEvent", lambda *event: complaints.append(event[1]))
    reader.SetFileName(name)
    reader.Update()
    data = reader.GetOutput()
    if complaints or (surface and not indices_fit(data)):
        return REFUSED
    points = np.empty((0, 3))
    if data.GetPoints() is not None and data.GetNumberOfPoints():
        points = vtk_to_numpy(data.GetPoints().GetData()).astype(np.float64)
    np.savez(result_file, points=points, **(triangles_of(data) if surface else {}))
    return 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
