"""Formats whose part names meshio drops: STL (told text from binary here) and OBJ."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry import meshio_files
from bemwave.geometry.meshio_files import UNNAMED, surface_of
from bemwave.geometry.surface_mesh import IntArray, SurfaceMesh

_HEADER, _RECORD = 84, 50  # bytes of a binary STL: head with the count, then each triangle


def read_stl(path: Path) -> SurfaceMesh:
    """STL: binary if its length is what its count says, else text."""
    size = path.stat().st_size
    with path.open("rb") as file:
        head = file.read(_HEADER)
    count = int.from_bytes(head[80:84], "little")
    if size >= _HEADER and size == _HEADER + _RECORD * count:
        return meshio_files.read_stl(path)
    if not head.lstrip().lower().startswith(b"solid"):
        raise InputError(
            f"{path} is a binary STL of {size} bytes whose head announces {count} triangles, "
            f"{_HEADER + _RECORD * count} bytes: it is cut off or damaged; write it out again"
        )
    return _read_text_stl(path)


def _read_text_stl(path: Path) -> SurfaceMesh:
    # meshio drops the solids' names and cannot tell when the end of the file is missing
    corners: list[list[float]] = []
    solids: list[str] = []
    ended = False
    for line in path.read_text(encoding="utf-8", errors="replace").splitlines():
        word, *rest = line.split() or [""]
        match word.lower():
            case "solid":
                name, ended = " ".join(rest) or UNNAMED, False
            case "vertex":
                corners.append([float(value) for value in rest])
            case "endfacet":
                solids.append(name)
            case "endsolid":
                ended = True
    if not ended or len(corners) != 3 * len(solids):
        raise InputError(
            f"{path} breaks off after {len(solids)} triangles: a text STL ends with 'endsolid' "
            "and has three vertices a facet; write it out again"
        )
    soup = np.array(corners, dtype=np.float64).reshape(-1, 3)
    _, first, number = np.unique(soup, axis=0, return_index=True, return_inverse=True)
    order = np.argsort(first)  # points in the order of the file
    rank = np.argsort(order)
    triangles = rank[number.reshape(-1)].reshape(-1, 3)
    return SurfaceMesh(soup[first[order]], triangles, *_numbered(solids))


def write_stl(mesh: SurfaceMesh, path: Path) -> None:
    """Text STL, all digits, a solid for each run of triangles of one part."""
    lines: list[str] = []
    open_part = -1
    rows = zip(mesh.part.tolist(), mesh.normals.tolist(), mesh.vertices.tolist(), strict=True)
    for part, normal, corners in rows:
        if part != open_part:
            if lines:
                lines.append(f"endsolid {mesh.part_names[open_part]}")
            lines.append(f"solid {mesh.part_names[part]}")
            open_part = part
        lines.append("facet normal {!r} {!r} {!r}\nouter loop".format(*normal))
        lines.extend("vertex {!r} {!r} {!r}".format(*corner) for corner in corners)
        lines.append("endloop\nendfacet")
    lines.append(f"endsolid {mesh.part_names[open_part]}")
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def read_obj(path: Path) -> SurfaceMesh:
    """OBJ; parts are groups (g) or, where there are none, objects (o)."""
    import meshio

    points, triangles, face = surface_of(meshio.obj.read(path), path)
    names = _names_of_faces(path)
    if len(face) and len(names) != face[-1] + 1:
        raise ValueError(f"{face[-1] + 1} faces read of {len(names)}")
    part, table = _numbered(names)
    return SurfaceMesh(points, triangles, part[face], table)


def write_obj(mesh: SurfaceMesh, path: Path) -> None:
    """OBJ, all digits, a group for each run of triangles of one part."""
    lines = ["v {!r} {!r} {!r}".format(*point) for point in mesh.points.tolist()]
    open_part = -1
    for part, corners in zip(mesh.part.tolist(), (mesh.triangles + 1).tolist(), strict=True):
        if part != open_part:
            lines.append(f"g {mesh.part_names[part]}")
            open_part = part
        lines.append("f {} {} {}".format(*corners))
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def _names_of_faces(path: Path) -> list[str]:
    """The group, or else the object, that each face of an OBJ file stands in."""
    group, thing, names = "", "", []
    for line in path.read_text(encoding="utf-8", errors="replace").splitlines():
        word, *rest = line.split() or [""]
        if word == "g":
            group = " ".join(rest)
        elif word == "o":
            thing, group = " ".join(rest), ""
        elif word == "f":
            names.append(group or thing or UNNAMED)
    return names


def _numbered(names: list[str]) -> tuple[IntArray, list[str]]:
    """Part numbers and the table of names, in the order they first appear."""
    table = {name: number for number, name in enumerate(dict.fromkeys(names))}
    return np.array([table[name] for name in names], dtype=np.int64), list(table)
