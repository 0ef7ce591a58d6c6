"""GLB: the latest frame with its bodies as one binary glTF 2.0 file, for a quick look."""

from __future__ import annotations

import json
import struct
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemwave.frames.sheet import Array
from bemwave.geometry.surface_mesh import SurfaceMesh

_FLOAT, _UNSIGNED = 5126, 5125  # component types of the format
_VERTICES, _INDICES = 34962, 34963
_WATER, _PAINT = [0.04, 0.19, 0.27, 1.0], [0.75, 0.72, 0.68, 1.0]  # base colours


def write_glb(path: Path, meshes: Mapping[str, tuple[SurfaceMesh, Array]], note: str) -> None:
    """Write meshes with normals (n, 3) by name, "water" among them; turned to y up, as glTF has it.

    Khronos glTF 2.0 specification, sections 3 and 4.
    """
    blocks: list[bytes] = []
    views: list[dict[str, Any]] = []
    accessors: list[dict[str, Any]] = []

    def put(values: NDArray[Any], target: int) -> int:
        kind, component = ("VEC3", _FLOAT) if values.ndim == 2 else ("SCALAR", _UNSIGNED)
        start = sum(map(len, blocks))
        blocks.append(values.tobytes())
        views.append(
            {"buffer": 0, "byteOffset": start, "byteLength": len(blocks[-1]), "target": target}
        )
        accessors.append(
            {
                "bufferView": len(views) - 1,
                "componentType": component,
                "count": len(values),
                "type": kind,
                "min": np.atleast_1d(values.min(axis=0)).tolist(),
                "max": np.atleast_1d(values.max(axis=0)).tolist(),
            }
        )
        return len(accessors) - 1

    shapes, nodes = [], []
    for number, (name, (mesh, normals)) in enumerate(meshes.items()):
        attributes = {
            "POSITION": put(mesh.points.astype("<f4"), _VERTICES),
            "NORMAL": put(normals.astype("<f4"), _VERTICES),
        }
        indices = put(mesh.triangles.ravel().astype("<u4"), _INDICES)
        paint = 0 if name == "water" else 1
        part = {"attributes": attributes, "indices": indices, "material": paint}
        shapes.append({"name": name, "primitives": [part]})
        nodes.append({"name": name, "mesh": number})
    half = float(np.sqrt(0.5))
    top = {"name": "sea", "children": list(range(len(nodes))), "rotation": [-half, 0.0, 0.0, half]}
    document = {
        "asset": {"version": "2.0", "generator": "bemwave", "extras": {"note": note}},
        "scene": 0,
        "scenes": [{"nodes": [len(nodes)]}],
        "nodes": [*nodes, top],
        "meshes": shapes,
        "materials": [_material("water", _WATER, 0.15), _material("paint", _PAINT, 0.7)],
        "accessors": accessors,
        "bufferViews": views,
        "buffers": [{"byteLength": sum(map(len, blocks))}],
    }
    text = json.dumps(document).encode("utf-8")
    chunks = [(b"JSON", text + b" " * (-len(text) % 4)), (b"BIN\0", b"".join(blocks))]
    with path.open("wb") as file:
        length = 12 + sum(8 + len(content) for _, content in chunks)
        file.write(struct.pack("<4sII", b"glTF", 2, length))
        for kind, content in chunks:
            file.write(struct.pack("<I4s", len(content), kind) + content)


def _material(name: str, colour: list[float], roughness: float) -> dict[str, Any]:
    surface = {"baseColorFactor": colour, "metallicFactor": 0.0, "roughnessFactor": roughness}
    return {"name": name, "doubleSided": True, "pbrMetallicRoughness": surface}
