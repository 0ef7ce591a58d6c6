"""What panels see along their normals, and beside them: all against all, compiled."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from numba import prange

from bemwave.kernels.compiling import njit

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_ON_EDGE = 1e-9  # of a triangle's area: how far outside it a ray still meets it
_SAME_SIDE = 0.5  # product of normals, at least


def first_hits(
    origins: Array, directions: Array, vertices: Array, least: float
) -> tuple[Array, Ints]:
    """First triangle that each ray meets, from either side.

    Parameters
    ----------
    origins, directions : (n, 3), m and unit vectors.
    vertices : (m, 3, 3) corners, m.
    least : hits nearer than this are not counted, m: those of the triangle a ray starts on.

    Returns
    -------
    distance : (n,) m, inf where there is none.
    which : (n,) int, -1 where there is none.
    """
    first = np.ascontiguousarray(vertices[:, 0])
    u, v = vertices[:, 1] - first, vertices[:, 2] - first
    normal = np.cross(u, v)
    offset = np.sum(normal * first, axis=1)
    distance, which = np.empty(len(origins)), np.empty(len(origins), dtype=np.int64)
    _meet(origins, directions, first, u, v, normal, offset, least, distance, which)
    return distance, which


@njit(cache=True, parallel=True, error_model="numpy")
def _meet(
    origins: Array,
    directions: Array,
    first: Array,
    u: Array,
    v: Array,
    normal: Array,
    offset: Array,
    least: float,
    distance: Array,
    which: Ints,
) -> None:
    for i in prange(len(origins)):
        ox, oy, oz = origins[i, 0], origins[i, 1], origins[i, 2]
        dx, dy, dz = directions[i, 0], directions[i, 1], directions[i, 2]
        best, at = np.inf, -1
        for j in range(len(normal)):
            nx, ny, nz = normal[j, 0], normal[j, 1], normal[j, 2]
            along = (offset[j] - ox * nx - oy * ny - oz * nz) / (dx * nx + dy * ny + dz * nz)
            if not least < along < best:
                continue
            px = ox + along * dx - first[j, 0]
            py = oy + along * dy - first[j, 1]
            pz = oz + along * dz - first[j, 2]
            # p = b u + c v, times the square of twice the area
            qx, qy, qz = ny * pz - nz * py, nz * px - nx * pz, nx * py - ny * px
            b = v[j, 0] * qx + v[j, 1] * qy + v[j, 2] * qz
            c = -(u[j, 0] * qx + u[j, 1] * qy + u[j, 2] * qz)
            square = nx * nx + ny * ny + nz * nz
            if min(b, c, square - b - c) >= -_ON_EDGE * square:
                best, at = along, j
        distance[i], which[i] = best, at


@njit(cache=True, parallel=True, error_model="numpy")
def stays_thin(
    centroids: Array,
    normals: Array,
    thickness: Array,
    panels: Ints,
    enough: Array,
    reach: Array,
) -> npt.NDArray[np.bool_]:
    """Which panels have none near by, on their side, that is thick.

    Parameters
    ----------
    centroids, normals : (m, 3) of all panels, m.
    thickness : (m,) m; nan is not thick.
    panels : (n,) that are asked about.
    enough, reach : (n,) thickness that counts as thick, and how far "near by" is, m.
    """
    stays = np.ones(len(panels), dtype=np.bool_)
    for i in prange(len(panels)):
        at, square = panels[i], reach[i] ** 2
        for j in range(len(thickness)):
            if not thickness[j] >= enough[i]:
                continue
            distance, along = 0.0, 0.0
            for axis in range(3):
                distance += (centroids[j, axis] - centroids[at, axis]) ** 2
                along += normals[j, axis] * normals[at, axis]
            if distance < square and along > _SAME_SIDE:
                stays[i] = False
                break
    return stays
