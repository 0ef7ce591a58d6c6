"""The one mesh type everything else speaks: flat triangles with a named part each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class SurfaceMesh:
    """Triangles over shared points, each triangle belonging to one named part.

    On every mesh that bounds water the normals point OUT OF THE WATER: into a hull, upwards on the
    free surface, out of the tank on walls. (A hull file, before `prepare_hull`, has them out of the
    hull, as CAD programs write them.)

    Parameters
    ----------
    points : (n, 3) array_like
        Coordinates in metres.
    triangles : (m, 3) array_like of int
        Point indices, counter-clockwise seen from the side the normal points to.
    part : (m,) array_like of int
        Index of each triangle's part in `part_names`.
    part_names : sequence of str
        Names of the parts.

    Raises
    ------
    ValueError
        If shapes or indices do not fit together.

    Examples
    --------
    >>> mesh = SurfaceMesh.of_one_part([[0, 0, 0], [1, 0, 0], [0, 1, 0]], [[0, 1, 2]], "water")
    >>> mesh.areas
    array([0.5])
    """

    points: FloatArray
    triangles: IntArray
    part: IntArray
    part_names: tuple[str, ...]

    def __init__(
        self,
        points: ArrayLike,
        triangles: ArrayLike,
        part: ArrayLike,
        part_names: Sequence[str],
    ) -> None:
        values = {
            "points": np.array(points, dtype=np.float64).reshape(-1, 3),
            "triangles": np.array(triangles, dtype=np.int64).reshape(-1, 3),
            "part": np.array(part, dtype=np.int64).reshape(-1),
            "part_names": tuple(part_names),
        }
        for name, value in values.items():
            object.__setattr__(self, name, value)
        for array in (self.points, self.triangles, self.part):
            array.setflags(write=False)
        _check_indices(self)

    @classmethod
    def of_one_part(cls, points: ArrayLike, triangles: ArrayLike, name: str) -> SurfaceMesh:
        """Make a mesh whose triangles all belong to the part `name`."""
        count = np.asarray(triangles).reshape(-1, 3).shape[0]
        return cls(points, triangles, np.zeros(count, dtype=np.int64), (name,))

    @cached_property
    def vertices(self) -> FloatArray:
        """Corner coordinates, (m, 3 corners, 3), m."""
        return self.points[self.triangles]

    @cached_property
    def area_vectors(self) -> FloatArray:
        """Normals times area, (m, 3), m2."""
        a, b, c = (self.vertices[:, k] for k in range(3))
        return 0.5 * np.cross(b - a, c - a)

    @cached_property
    def areas(self) -> FloatArray:
        """Triangle areas, (m,), m2."""
        return np.asarray(np.linalg.norm(self.area_vectors, axis=1))

    @cached_property
    def normals(self) -> FloatArray:
        """Unit normals, (m, 3); zero where a triangle has no area."""
        areas = self.areas[:, None]
        return self.area_vectors / np.where(areas > 0.0, areas, 1.0)

    @cached_property
    def centroids(self) -> FloatArray:
        """Triangle centroids, (m, 3), m."""
        return np.asarray(self.vertices.mean(axis=1))

    def in_part(self, name: str) -> BoolArray:
        """Mask (m,) of the triangles of the part `name`."""
        return np.asarray(self.part == self.part_names.index(name))

    def keep(self, triangle_mask: BoolArray) -> SurfaceMesh:
        """Return the chosen triangles, without points nobody uses; all part names stay."""
        triangles = self.triangles[triangle_mask]
        used = np.zeros(len(self.points), dtype=bool)
        used[triangles] = True
        number = np.cumsum(used) - 1
        return SurfaceMesh(
            self.points[used], number[triangles], self.part[triangle_mask], self.part_names
        )

    def flipped(self) -> SurfaceMesh:
        """Return the mesh with all normals reversed."""
        return SurfaceMesh(self.points, self.triangles[:, ::-1], self.part, self.part_names)

    def with_points(self, points: ArrayLike) -> SurfaceMesh:
        """Return the same triangles over moved points, (n, 3)."""
        return SurfaceMesh(points, self.triangles, self.part, self.part_names)

    def renamed(self, name: str) -> SurfaceMesh:
        """Return the mesh as one part called `name`."""
        return SurfaceMesh.of_one_part(self.points, self.triangles, name)


def joined(meshes: Sequence[SurfaceMesh]) -> SurfaceMesh:
    """Put meshes side by side in one; points are not merged, parts of equal name are."""
    names = tuple(dict.fromkeys(name for mesh in meshes for name in mesh.part_names))
    starts = np.cumsum([0, *(len(mesh.points) for mesh in meshes[:-1])])
    parts = [
        np.array([names.index(name) for name in mesh.part_names], dtype=np.int64)[mesh.part]
        for mesh in meshes
    ]
    return SurfaceMesh(
        np.concatenate([mesh.points for mesh in meshes]),
        np.concatenate(
            [mesh.triangles + start for mesh, start in zip(meshes, starts, strict=True)]
        ),
        np.concatenate(parts),
        names,
    )


def _check_indices(mesh: SurfaceMesh) -> None:
    if len(mesh.part) != len(mesh.triangles):
        raise ValueError(
            f"part has {len(mesh.part)} entries for {len(mesh.triangles)} triangles: give one each"
        )
    for what, index, limit in (
        ("triangles", mesh.triangles, len(mesh.points)),
        ("part", mesh.part, len(mesh.part_names)),
    ):
        if index.size and (index.min() < 0 or index.max() >= limit):
            raise ValueError(
                f"{what} holds indices {index.min()} .. {index.max()}; 0 .. {limit - 1} exist"
            )
