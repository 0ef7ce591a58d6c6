"""Prims of an OpenUSD stage from meshes, lines and arrays."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy import sparse

from bemwave.frames.sheet import Array, Bools
from bemwave.geometry.surface_mesh import SurfaceMesh

CREASE = 40.0  # degrees


@dataclass(frozen=True)
class Guide:
    """Lines that show where something is and are not rendered: polylines (k, 3), m."""

    name: str
    lines: Sequence[Array]


def define_body(stage: Any, path: str, mesh: SurfaceMesh, name: str) -> None:
    """A rigid mesh whose transform is to be set, by its name in the case."""
    from pxr import UsdGeom

    body = UsdGeom.Mesh.Define(stage, path)
    body.GetPrim().SetDisplayName(name)
    set_triangles(body, mesh)
    body.CreatePointsAttr().Set(vectors(mesh.points))
    body.CreateExtentAttr().Set(vectors(np.array([mesh.points.min(0), mesh.points.max(0)])))
    body.CreateNormalsAttr().Set(vectors(creased_normals(mesh)))
    body.SetNormalsInterpolation(UsdGeom.Tokens.faceVarying)
    body.AddTransformOp()


def creased_normals(mesh: SurfaceMesh) -> Array:
    """At every corner of every triangle, (3 m, 3): smooth, but for edges sharper than CREASE."""
    count = len(mesh.triangles)
    triangle, vertex = np.repeat(np.arange(count), 3), mesh.triangles.ravel()
    shape = (len(mesh.points), count)
    about = sparse.csr_matrix((np.ones(3 * count), (vertex, triangle)), shape=shape)
    pairs = about[vertex].tocoo()  # a corner and each triangle that meets its vertex
    alike = np.sum(mesh.normals[triangle[pairs.row]] * mesh.normals[pairs.col], axis=1)
    smooth = alike > math.cos(math.radians(CREASE))
    sums = np.zeros((3 * count, 3))
    np.add.at(sums, pairs.row[smooth], mesh.area_vectors[pairs.col[smooth]])
    return np.asarray(sums / np.maximum(np.linalg.norm(sums, axis=1, keepdims=True), 1e-300))


def define_guide(stage: Any, path: str, guide: Guide) -> None:
    """Lines of the purpose "guide"."""
    from pxr import UsdGeom

    lines = UsdGeom.BasisCurves.Define(stage, path)
    lines.GetPrim().SetDisplayName(guide.name)
    lines.CreatePurposeAttr(UsdGeom.Tokens.guide)
    lines.CreateTypeAttr(UsdGeom.Tokens.linear)
    lines.CreateCurveVertexCountsAttr([len(line) for line in guide.lines])
    points = np.concatenate(guide.lines)
    lines.CreatePointsAttr(vectors(points))
    lines.CreateWidthsAttr([0.02])
    lines.SetWidthsInterpolation(UsdGeom.Tokens.constant)
    lines.CreateExtentAttr(vectors(np.array([points.min(0) - 0.01, points.max(0) + 0.01])))


def set_triangles(prim: Any, mesh: SurfaceMesh) -> None:
    """Topology of a mesh: triangles as they are, seen from both sides."""
    from pxr import UsdGeom, Vt

    counts = np.full(len(mesh.triangles), 3, dtype=np.int32)
    corners = mesh.triangles.ravel().astype(np.int32)
    prim.CreateFaceVertexCountsAttr(Vt.IntArray.FromNumpy(counts))
    prim.CreateFaceVertexIndicesAttr(Vt.IntArray.FromNumpy(corners))
    prim.CreateSubdivisionSchemeAttr(UsdGeom.Tokens.none)
    prim.CreateOrientationAttr(UsdGeom.Tokens.rightHanded)
    prim.CreateDoubleSidedAttr(True)


def primvar(prim: Any, name: str, kind: Any) -> Any:
    """A primvar with a value at every vertex."""
    from pxr import UsdGeom

    return UsdGeom.PrimvarsAPI(prim).CreatePrimvar(name, kind, UsdGeom.Tokens.vertex)


def valid_names(names: list[str]) -> list[str]:
    """Names that prims can have, each once."""
    from pxr import Tf

    result: list[str] = []
    for name in names:
        word = base = Tf.MakeValidIdentifier("_" + name if name[0].isdigit() else name)
        number = 2
        while word in result:
            word, number = f"{base}_{number}", number + 1
        result.append(word)
    return result


def value_types() -> Any:
    """Sdf.ValueTypeNames."""
    from pxr import Sdf

    return Sdf.ValueTypeNames


def vectors(rows: Array) -> Any:
    """Rows (n, 3) or (n, 2) as an array of float vectors."""
    from pxr import Vt

    kind = Vt.Vec3fArray if rows.shape[1] == 3 else Vt.Vec2fArray
    return kind.FromNumpy(np.ascontiguousarray(rows, dtype=np.float32))


def scalars(values: Array | Bools) -> Any:
    """Values (n,) as an array of floats."""
    from pxr import Vt

    return Vt.FloatArray.FromNumpy(np.ascontiguousarray(values, dtype=np.float32))
