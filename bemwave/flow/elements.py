"""Linear elements on a boundary mesh: which nodes are unknown, curls of hats, mass matrices."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.sparse import csgraph
from scipy.sparse.linalg import splu

from bemwave.flow.images import Mirror
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.kernels.panels import pack

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


@dataclass(frozen=True)
class Elements:
    """A boundary mesh cut into water surface F and the rest B (hulls and meshed walls).

    Nodes are renumbered: free nodes of F first, then nodes of B off the water, then pinned
    ones (the rim of an open sheet, where the potential is zero).

    Attributes
    ----------
    points : (n, 3) in the new order.
    water, hull : (mF, 3), (mB, 3) corners.
    free, below, pinned : numbers of nodes of each kind.
    order : (n,) the mesh's node number of each new one.
    hull_triangles : the mesh's triangle numbers of the hull's.
    """

    points: Array
    water: Ints
    hull: Ints
    free: int
    below: int
    pinned: int
    order: Ints
    hull_triangles: Ints

    @property
    def nodes(self) -> int:
        """Nodes that carry a value other than zero."""
        return self.free + self.below

    @cached_property
    def water_table(self) -> Array:
        """(mF, 29) packed water triangles."""
        return pack(self.points[self.water])

    @cached_property
    def hull_table(self) -> Array:
        """(mB, 29) packed hull and wall triangles."""
        return pack(self.points[self.hull].reshape(-1, 3, 3))

    @cached_property
    def mass(self) -> sparse.csc_matrix:
        """(free, free) int over F of hat_i hat_j [m^2]."""
        return self.weighted_mass(np.ones(len(self.water)))

    def weighted_mass(self, weight: Array) -> sparse.csc_matrix:
        """(free, free) int over F of weight hat_i hat_j, weight (mF,) one a triangle."""
        local = (np.ones((3, 3)) + np.eye(3)) / 12.0
        rows = np.repeat(self.water, 3, axis=1).ravel()
        cols = np.tile(self.water, (1, 3)).ravel()
        values = ((self.water_table[:, 28] * weight)[:, None] * local.ravel()).ravel()
        n = len(self.points)
        return sparse.csc_matrix((values, (rows, cols)), shape=(n, n))[: self.free, : self.free]

    def sunken(self) -> Array:
        """(bodies, mB) ones on the triangles of each connected body wholly under water."""
        pieces = sparse.csr_matrix(
            (
                np.ones(3 * len(self.hull)),
                (np.repeat(np.arange(len(self.hull)), 3), self.hull.ravel()),
            ),
            shape=(len(self.hull), len(self.points)),
        )
        count, piece = csgraph.connected_components(pieces @ pieces.T, directed=False)
        on_surface = (self.hull < self.free) | (self.hull >= self.nodes)
        afloat = np.unique(piece[on_surface.any(axis=1)])
        under = np.setdiff1d(np.arange(count), afloat)
        return np.asarray(piece == under[:, None], dtype=np.float64)

    def shares(self, corners: Ints, table: Array) -> sparse.csr_matrix:
        """(m, nodes) int over each triangle of each hat: a third of its area at its corners."""
        values = np.repeat(table[:, 28] / 3.0, 3)
        return self._per_triangle(corners, values)

    def curls(self, corners: Ints, table: Array) -> list[sparse.csr_matrix]:
        """x, y, z components of n x grad hat, each (m, nodes) [1/m]."""
        local = hat_curls(self.points[corners].reshape(-1, 3, 3), table)
        return [self._per_triangle(corners, local[:, :, axis].ravel()) for axis in range(3)]

    def _per_triangle(self, corners: Ints, values: Array) -> sparse.csr_matrix:
        rows = np.repeat(np.arange(len(corners)), 3)
        matrix = sparse.csr_matrix(
            (values, (rows, corners.ravel())), shape=(len(corners), len(self.points))
        )
        return matrix[:, : self.nodes]


def solver_of(matrix: sparse.csc_matrix) -> Callable[[Array], Array]:
    """Applies the inverse of a symmetric positive definite sparse matrix, factored once."""
    options = {
        "SymmetricMode": True
    }  # no pivots are needed, and the factors stay a quarter smaller
    factor = splu(matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options=options)
    solve: Callable[[Array], Array] = factor.solve
    return solve


def hat_curls(vertices: Array, table: Array) -> Array:
    """(m, 3, 3) n x grad of each triangle's three hats: minus the opposite edge over 2 areas."""
    opposite = np.roll(vertices, -2, axis=1) - np.roll(vertices, -1, axis=1)
    return -opposite / (2.0 * table[:, 28, None, None])


def split(mesh: SurfaceMesh, closed: bool, mirrors: tuple[Mirror, ...], depth: float) -> Elements:
    """Cut a boundary mesh (see `geometry.boundary_mesh`) into elements.

    Parameters
    ----------
    mesh : part "water" is F, everything else B.
    closed : whether walls close the water all round; if not, the sheet's rim is pinned, but
        for rim nodes on a mirror.
    """
    is_water = mesh.part == mesh.part_names.index("water")
    water, hull = mesh.triangles[is_water], mesh.triangles[~is_water]
    on_water = np.unique(water)
    pinned = np.array([], dtype=np.int64) if closed else _open_rim(mesh, on_water, mirrors, depth)
    free = np.setdiff1d(on_water, pinned)
    below = np.setdiff1d(np.unique(hull), on_water)
    order = np.concatenate([free, below, pinned])
    number = np.full(len(mesh.points), -1, dtype=np.int64)
    number[order] = np.arange(len(order))
    return Elements(
        points=mesh.points[order],
        water=number[water],
        hull=number[hull],
        free=len(free),
        below=len(below),
        pinned=len(pinned),
        order=order,
        hull_triangles=np.flatnonzero(~is_water),
    )


def _open_rim(mesh: SurfaceMesh, on_water: Ints, mirrors: tuple[Mirror, ...], depth: float) -> Ints:
    """Nodes of F on edges that only one triangle has, off the mirrors."""
    edges = np.sort(np.vstack([mesh.triangles[:, [i, (i + 1) % 3]] for i in range(3)]), axis=1)
    unique, count = np.unique(edges, axis=0, return_counts=True)
    open_edges = unique[count == 1]
    extent = np.ptp(mesh.points[:, :2]) + 1.0
    on_mirror = np.zeros(len(open_edges), dtype=bool)
    for mirror in mirrors:
        distance = np.abs(mesh.points[open_edges, "xy".index(mirror.axis)] - mirror.position)
        on_mirror |= (distance < 1e-9 * extent).all(axis=1)
    return np.intersect1d(open_edges[~on_mirror], on_water)
