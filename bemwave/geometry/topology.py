"""Which triangles and points belong together: edges, loops, pieces, welding."""

from __future__ import annotations

import numpy as np

from bemwave.geometry.surface_mesh import BoolArray, FloatArray, IntArray, SurfaceMesh


def directed_edges(triangles: IntArray) -> IntArray:
    """All edges in the sense their triangles run round them, (3 m, 2).

    Row `3 t + k` is the edge from corner k of triangle t to its next corner.
    """
    return np.stack([triangles, np.roll(triangles, -1, axis=1)], axis=-1).reshape(-1, 2)


def edge_uses(triangles: IntArray) -> tuple[IntArray, IntArray, IntArray]:
    """Undirected edges (e, 2), uses of each (e,), and which of them each directed one is (3 m,)."""
    edges, which, count = np.unique(
        np.sort(directed_edges(triangles), axis=1), axis=0, return_inverse=True, return_counts=True
    )
    return edges, count, which.reshape(-1)


def boundary_edges(triangles: IntArray) -> IntArray:
    """Directed edges that only one triangle uses, (b, 2)."""
    _, count, which = edge_uses(triangles)
    return np.asarray(directed_edges(triangles)[count[which] == 1])


def boundary_loops(triangles: IntArray) -> list[IntArray]:
    """Closed chains of boundary edges, in the sense the triangles run; each (k,) point indices.

    Loops start at their lowest point index and come in the order of that index, so the result
    depends on nothing but the numbering.

    Raises
    ------
    ValueError
        If the boundary does not fall into closed loops (neighbours run opposite ways, or more
        than two boundary edges meet in a point).
    """
    edges = boundary_edges(triangles)
    following = dict(edges.tolist())
    if len(following) != len(edges) or set(following) != set(following.values()):
        raise ValueError("the boundary edges do not form closed loops")
    loops = []
    for start in sorted(following):
        if start not in following:
            continue
        loop = [start]
        while (step := following.pop(loop[-1])) != start:
            loop.append(step)
        loops.append(np.array(loop, dtype=np.int64))
    return loops


def pieces(mesh: SurfaceMesh) -> IntArray:
    """Number of the connected piece each triangle belongs to, (m,), the largest area first.

    Connected means sharing points: weld first.
    """
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    count = len(mesh.points)
    edges = directed_edges(mesh.triangles)
    graph = coo_array((np.ones(len(edges)), edges.T), shape=(count, count))
    _, label = connected_components(graph, directed=False)
    _, piece = np.unique(label[mesh.triangles[:, 0]], return_inverse=True)
    rank = np.argsort(np.argsort(-np.bincount(piece, weights=mesh.areas), kind="stable"))
    return np.asarray(rank[piece], dtype=np.int64)


def extent(points: FloatArray) -> float:
    """Diagonal of the bounding box, m: the length that tolerances are taken of."""
    return float(np.linalg.norm(np.ptp(points, axis=0))) if len(points) else 0.0


def weld(mesh: SurfaceMesh, tolerance: float) -> tuple[SurfaceMesh, int, int]:
    """Merge points nearer than `tolerance`; drop triangles that lose a corner.

    Of each group the point with the lowest number stays where it is.

    Parameters
    ----------
    mesh : SurfaceMesh
    tolerance : float
        Metres; 0 merges equal points only.

    Returns
    -------
    mesh : SurfaceMesh
    merged : int
        How many points were merged into others.
    dropped : int
        How many triangles collapsed.
    """
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components
    from scipy.spatial import cKDTree

    count = len(mesh.points)
    pairs = cKDTree(mesh.points).query_pairs(tolerance, output_type="ndarray")
    graph = coo_array((np.ones(len(pairs)), pairs.T), shape=(count, count))
    _, label = connected_components(graph, directed=False)
    _, first, group = np.unique(label, return_index=True, return_inverse=True)
    triangles = first[group][mesh.triangles]
    whole = np.all(triangles != np.roll(triangles, 1, axis=1), axis=1)
    moved = SurfaceMesh(mesh.points, triangles, mesh.part, mesh.part_names)
    return moved.keep(whole), count - len(first), int(np.count_nonzero(~whole))


def attached(mesh: SurfaceMesh, other: SurfaceMesh, on: BoolArray) -> tuple[SurfaceMesh, int]:
    """Join `other` to `mesh`, giving its points in the mask `on` the numbers they have in `mesh`.

    Points of `mesh` keep their numbers and places. Points are taken as the same within 1e-6 of
    the smaller mesh's extent, since they were computed to be equal.

    Returns
    -------
    mesh : SurfaceMesh
    missing : int
        How many of the points in `on` have no partner in `mesh`; they are added.
    """
    from scipy.spatial import cKDTree

    tolerance = 1e-6 * min(extent(mesh.points), extent(other.points))
    distance, partner = cKDTree(mesh.points).query(other.points)
    same = on & (distance <= tolerance)
    number = np.where(same, partner, len(mesh.points) + np.cumsum(~same) - 1)
    names = tuple(dict.fromkeys(mesh.part_names + other.part_names))
    part = np.array([names.index(name) for name in other.part_names], dtype=np.int64)
    both = SurfaceMesh(
        np.concatenate([mesh.points, other.points[~same]]),
        np.concatenate([mesh.triangles, number[other.triangles]]),
        np.concatenate([mesh.part, part[other.part]]),
        names,
    )
    return both, int(np.count_nonzero(on & ~same))
