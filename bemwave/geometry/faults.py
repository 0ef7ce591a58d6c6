"""What is wrong with a hull mesh: found and told, never repaired in silence."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from bemwave.geometry.intersections import piercing_edges
from bemwave.geometry.surface_mesh import BoolArray, FloatArray, SurfaceMesh
from bemwave.geometry.topology import directed_edges, edge_uses, extent, pieces

LONGEST = 1000.0  # m; no hull is longer, so a longer one is in other units


@dataclass(frozen=True)
class Fault:
    """One kind of fault: how many there are, where the first is, what to do."""

    kind: str
    count: int
    text: str

    def __str__(self) -> str:
        return self.text


def find_faults(mesh: SurfaceMesh, open_at: Sequence[float] = ()) -> list[Fault]:
    """Faults in the triangles of a welded hull mesh whose normals point out of the hull.

    Parameters
    ----------
    mesh : SurfaceMesh
    open_at : sequence of float
        Heights z at which the mesh may end in an open edge (waterline, bed), m.

    Returns
    -------
    list of Fault
        Kinds: "hole" (an edge used once elsewhere than at `open_at`), "flipped" (neighbours that
        run their common edge the same way), "non-manifold" (an edge of three or more triangles),
        "duplicate" (the same three corners twice), "degenerate" (no area),
        "self-intersection" (edges through other triangles), "inside out" (a piece enclosing a
        negative volume).
    """
    edges, count, which = edge_uses(mesh.triangles)
    middles = mesh.points[edges].mean(axis=1)
    lying = np.zeros(len(edges), dtype=bool)
    for level in open_at:
        lying |= np.all(np.abs(mesh.points[edges, 2] - level) < 1e-6 * extent(mesh.points), axis=1)
    directed = directed_edges(mesh.triangles)
    forward = np.bincount(which, weights=directed[:, 0] < directed[:, 1], minlength=len(edges))
    piercing = piercing_edges(mesh)
    found = [
        _fault(
            "hole", "edges belong to one triangle only (a hole)", middles, (count == 1) & ~lying,
            "close the hole in a mesh program, or set a larger weld tolerance if it is a seam",
        ),
        _fault(
            "flipped", "edges lie between triangles that face opposite ways (flipped normals)",
            middles, (count == 2) & (forward != 1),
            "make the normals consistent, out of the hull, in a mesh program",
        ),
        _fault(
            "non-manifold", "edges belong to three or more triangles", middles, count > 2,
            "remove inner walls and doubled plating so that one skin remains",
        ),
        _fault(
            "duplicate", "triangles repeat another one", mesh.centroids, _repeated(mesh),
            "remove the doubled plating",
        ),
        _fault(
            "degenerate", "triangles have no area", mesh.centroids,
            mesh.areas < 1e-12 * extent(mesh.points) ** 2,
            "remove them in a mesh program, or set a larger weld tolerance",
        ),
        _fault(
            "self-intersection", "edges pass through other triangles (self-intersection)", piercing,
            np.ones(len(piercing), dtype=bool),
            "unite the solids in a mesh program, or leave the inner one out (without)",
        ),
    ]  # fmt: skip
    found = [fault for fault in found if fault.count]
    if not {fault.kind for fault in found} & {"flipped", "non-manifold", "duplicate"}:
        found.extend(_inside_out(mesh))
    return found


def find_odd_size(mesh: SurfaceMesh, *, scale_known: bool, up_known: bool) -> list[Fault]:
    """Signs of wrong units ("size") or a wrong up axis ("up axis") in a hull file's extents.

    The second goes by symmetry: a ship is as wide to port as to starboard and is not the same
    above and below, so a file symmetric in z and not in y has its up axis along y.
    """
    if not len(mesh.points):
        return []
    low, high = mesh.points.min(axis=0), mesh.points.max(axis=0)
    size, lopsided = high - low, np.abs(high + low)
    found = []
    if size.max() > LONGEST and not scale_known:
        text = (
            f"it measures {size[0]:.6g} x {size[1]:.6g} x {size[2]:.6g} m; if the file is in "
            "millimetres give scale = 0.001, if it is as large as that give scale = 1.0"
        )
        found.append(Fault("size", 1, text))
    if not up_known and lopsided[2] < 1e-3 * size[2] and lopsided[1] > 0.02 * size[1] > 0.0:
        text = (
            f"it is symmetric about z = 0 (z {low[2]:.4g} to {high[2]:.4g}, y {low[1]:.4g} to "
            f'{high[1]:.4g}), as a hull with y up is; give up = "y", or up = "z" if z is up'
        )
        found.append(Fault("up axis", 1, text))
    return found


def _fault(kind: str, what: str, places: FloatArray, bad: BoolArray, advice: str) -> Fault:
    count = int(np.count_nonzero(bad))
    x, y, z = places[np.argmax(bad)] if count else (0.0, 0.0, 0.0)
    text = f"{count} {what}, the first near ({x:.4g}, {y:.4g}, {z:.4g}); {advice}"
    return Fault(kind, count, text)


def _repeated(mesh: SurfaceMesh) -> BoolArray:
    _, first = np.unique(np.sort(mesh.triangles, axis=1), axis=0, return_index=True)
    repeated = np.ones(len(mesh.triangles), dtype=bool)
    repeated[first] = False
    return repeated


def _inside_out(mesh: SurfaceMesh) -> list[Fault]:
    """Pieces whose normals all point inwards: their enclosed volume comes out negative."""
    if not len(mesh.triangles):
        return []
    piece = pieces(mesh)
    middle = mesh.points.mean(axis=0)
    # horizontal fields only, so that flat openings at waterline and bed count for nothing
    share = np.sum((mesh.centroids - middle)[:, :2] * mesh.area_vectors[:, :2], axis=1) / 2.0
    volume = np.bincount(piece, weights=share)
    bad = volume < -1e-9 * extent(mesh.points) ** 3
    if not bad.any():
        return []
    text = (
        f"{np.count_nonzero(bad)} of {len(bad)} connected pieces are inside out (volume "
        f"{volume[bad].sum():.4g} m3); reverse their normals in a mesh program so that they point "
        "out of the hull"
    )
    return [Fault("inside out", int(np.count_nonzero(bad)), text)]
