"""Mesh files that go through meshio. Called by `files` alone, which contains its outbursts."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any
from urllib.parse import quote, unquote

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.surface_mesh import FloatArray, IntArray, SurfaceMesh

UNNAMED = "unnamed"  # the only part of a mesh whose file names none

_FLAT = ("triangle", "quad", "polygon")
_IGNORED = ("vertex", "line")
_LONGEST_HEADER = 10_000  # bytes, of a PLY
_END_OF_HEADER = re.compile(rb"(?m)^[ \t]*end_header[ \t\r]*$")
_TABLE = "part:"  # start of the name of the cell array that carries the parts in a .vtu


def read_stl(path: Path) -> SurfaceMesh:
    """Binary STL."""
    import meshio

    points, triangles, _ = surface_of(meshio.stl.read(path), path)
    return SurfaceMesh.of_one_part(points, triangles, UNNAMED)


def write_stl(mesh: SurfaceMesh, path: Path) -> None:
    """Binary STL: float32, no part names."""
    import meshio

    meshio.stl.write(path, _meshio_of(mesh), binary=True)


def read_ply(path: Path) -> SurfaceMesh:
    """PLY, text or binary."""
    import meshio

    with path.open("rb") as file:
        start = file.read(_LONGEST_HEADER)
    end = _END_OF_HEADER.search(start)
    if end is None:  # the library would look for it for ever
        raise InputError(
            f"{path} has no line 'end_header' in its first {_LONGEST_HEADER} bytes: it is cut off "
            "or damaged; write it out again"
        )
    size = path.stat().st_size
    for count in map(int, re.findall(rb"element\s+\w+\s+(\d+)", start[: end.start()])):
        if count > size:  # the library would count to there
            raise InputError(
                f"{path} announces {count} elements in {size} bytes: it is cut off or damaged; "
                "write it out again"
            )
    points, triangles, _ = surface_of(meshio.ply.read(path), path)
    return SurfaceMesh.of_one_part(points, triangles, UNNAMED)


def write_ply(mesh: SurfaceMesh, path: Path) -> None:
    """Binary PLY, float64, no part names."""
    import meshio

    meshio.ply.write(path, _meshio_of(mesh), binary=True)


def read_vtu(path: Path) -> SurfaceMesh:
    """VTU; parts from the cell array that `write_vtu` names, or from an integer array `part`."""
    import meshio

    data = meshio.vtu.read(path)
    points, triangles, face = surface_of(data, path)
    for key, blocks in data.cell_data.items():
        if key == "part" or key.startswith(_TABLE):
            part = flat_values(data, blocks)[face].astype(np.int64)
            if key == "part":
                return SurfaceMesh(points, triangles, *named(part))
            names = [unquote(name) for name in key.removeprefix(_TABLE).split("|")]
            return SurfaceMesh(points, triangles, part, names)
    return SurfaceMesh.of_one_part(points, triangles, UNNAMED)


def write_vtu(mesh: SurfaceMesh, path: Path) -> None:
    """VTU, float64; a cell array "part:NAME|NAME" holds each triangle's part number.

    meshio writes no field data to this format, so the table of names is in the array's own name.
    """
    import meshio

    data = _meshio_of(mesh)
    table = _TABLE + "|".join(quote(name, safe="") for name in mesh.part_names)
    data.cell_data[table] = [mesh.part.astype(np.int32)]
    meshio.vtu.write(path, data)


def read_msh(path: Path) -> SurfaceMesh:
    """Gmsh's format, versions 2.2 and 4; parts are physical groups of surfaces."""
    import meshio

    data = meshio.gmsh.read(path)
    points, triangles, face = surface_of(data, path)
    if "gmsh:physical" not in data.cell_data:
        return SurfaceMesh.of_one_part(points, triangles, UNNAMED)
    group = flat_values(data, data.cell_data["gmsh:physical"])[face].astype(np.int64)
    names = {int(tag): name for name, (tag, dim) in data.field_data.items() if dim == 2}
    return SurfaceMesh(points, triangles, *named(group, names))


def write_msh(mesh: SurfaceMesh, path: Path) -> None:
    """Gmsh's format 2.2, binary; parts are physical groups."""
    import meshio

    data = _meshio_of(mesh)
    tags = (mesh.part + 1).astype(np.int32)
    data.cell_data = {"gmsh:physical": [tags], "gmsh:geometrical": [tags]}
    data.field_data = {name: np.array([k + 1, 2]) for k, name in enumerate(mesh.part_names)}
    meshio.gmsh.write(path, data, fmt_version="2.2", binary=True)


def surface_of(data: Any, path: Path) -> tuple[FloatArray, IntArray, IntArray]:
    """Points, triangles and the number of the file's face each triangle comes from."""
    other = sorted({block.type for block in data.cells} - {*_FLAT, *_IGNORED})
    if other:
        raise InputError(
            f"{path} holds {', '.join(other)} cells; a surface of flat triangles or quads was "
            "expected: write out its surface alone"
        )
    points = np.asarray(data.points, dtype=np.float64)
    if len(points):
        points = np.pad(points, ((0, 0), (0, max(0, 3 - points.shape[1]))))[:, :3]
    triangles, face, start = [np.empty((0, 3), dtype=np.int64)], [np.empty(0, dtype=np.int64)], 0
    for block in data.cells:
        if block.type in _FLAT:
            corners = np.asarray(block.data, dtype=np.int64)
            split = _split(corners, points)
            triangles.append(split)
            count = len(split) // max(1, len(corners))
            face.append(start + np.repeat(np.arange(len(corners)), count))
            start += len(corners)
    return points, np.concatenate(triangles), np.concatenate(face)


def flat_values(data: Any, blocks: Any) -> FloatArray:
    """Values of a cell array on the faces that `surface_of` counts."""
    kept = [
        np.asarray(values).reshape(-1)
        for block, values in zip(data.cells, blocks, strict=True)
        if block.type in _FLAT
    ]
    return np.concatenate(kept)


def named(number: IntArray, names: dict[int, str] | None = None) -> tuple[IntArray, list[str]]:
    """Parts 0, 1, ... and their names from any integers; those without a name are "partN"."""
    values, part = np.unique(number, return_inverse=True)
    return part.reshape(-1), [(names or {}).get(int(v), f"part{v}") for v in values]


def _split(corners: IntArray, points: FloatArray) -> IntArray:
    """Triangles of faces of equal corner count, each face's together; quads by the shorter way."""
    count = corners.shape[1]
    if corners.size and (corners.min() < 0 or corners.max() >= len(points)):
        raise ValueError(f"faces use point {corners.max()} of {len(points)}")
    if count == 4:
        a, b, c, d = (points[corners[:, k]] for k in range(4))
        other = np.linalg.norm(d - b, axis=1) < np.linalg.norm(c - a, axis=1)
        corners = np.where(other[:, None], np.roll(corners, -1, axis=1), corners)
    fans = [corners[:, [0, k, k + 1]] for k in range(1, count - 1)]
    return np.stack(fans, axis=1).reshape(-1, 3)


def _meshio_of(mesh: SurfaceMesh) -> Any:
    import meshio

    # int32: PLY has no longer integers, and no mesh here comes near their end
    return meshio.Mesh(mesh.points.copy(), [("triangle", mesh.triangles.astype(np.int32))])
