"""PLY, binary little endian: one file for each frame."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from bemwave.frames.sheet import Array, Bools
from bemwave.geometry.surface_mesh import SurfaceMesh

_TYPES = {"f4": "float", "u1": "uchar"}


def write_ply(
    path: Path,
    mesh: SurfaceMesh,
    normals: Array,
    data: Mapping[str, Array | Bools],
    note: str = "",
) -> None:
    """Write vertices with normals and further values, float32 (masks: uchar), and triangles.

    A vector (n, 3) called NAME becomes the properties NAME_x, NAME_y, NAME_z.
    """
    columns: dict[str, Array | Bools] = {}
    columns |= {axis: mesh.points[:, k] for k, axis in enumerate("xyz")}
    columns |= {f"n{axis}": normals[:, k] for k, axis in enumerate("xyz")}
    for name, values in data.items():
        if values.ndim == 2:
            columns |= {f"{name}_{axis}": values[:, k] for k, axis in enumerate("xyz")}
        else:
            columns[name] = values
    kinds = {n: "u1" if v.dtype == np.bool_ else "f4" for n, v in columns.items()}
    vertices = np.empty(len(mesh.points), dtype=[(n, f"<{k}") for n, k in kinds.items()])
    for name, values in columns.items():
        vertices[name] = values
    faces = np.empty(len(mesh.triangles), dtype=[("count", "u1"), ("corners", "<i4", 3)])
    faces["count"] = 3
    faces["corners"] = mesh.triangles
    header = [
        "ply",
        "format binary_little_endian 1.0",
        "comment metres, z up, still water at z = 0",
        *([f"comment {note}"] if note else []),
        f"element vertex {len(vertices)}",
        *(f"property {_TYPES[kind]} {name}" for name, kind in kinds.items()),
        f"element face {len(faces)}",
        "property list uchar int vertex_indices",
        "end_header\n",
    ]
    with path.open("wb") as file:
        file.write("\n".join(header).encode("ascii"))
        file.write(vertices.tobytes())
        file.write(faces.tobytes())
