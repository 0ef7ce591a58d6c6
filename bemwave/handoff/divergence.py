"""Is the velocity handed over free of divergence? The net flux of small closed cells of a box."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from bemwave.flow.state import SurfaceState
from bemwave.handoff.box import Array, Box, cell_edges, free_points, turn
from bemwave.handoff.closure import share_of_largest
from bemwave.handoff.fields import Flow
from bemwave.handoff.sampler import HandoffSampler
from bemwave.waves import Sea

_GAUSS = 0.5 / np.sqrt(3.0)  # two-point rule on an edge of length 1 about its middle


@dataclass(frozen=True)
class DivergenceInstant:
    """Of all cells at one time: the largest net flux, the largest flux through a face, m3/s."""

    net_flux: float
    face_flux: float


class CellDivergence:
    """Cells along the inside of a box's sides, from the surface down, tried by their fluxes.

    Each cell is one of the box's own; its faces are integrated by 2 x 2 Gauss points, so that the
    figure speaks of the velocity and not of the rule.

    Parameters
    ----------
    box : Box
    sea : Sea
    flow : Flow or None
    solid : callable, optional
        Tells which points (n, 3) lie inside hulls; cells that touch one are left out.
    """

    def __init__(
        self,
        box: Box,
        sea: Sea,
        flow: Flow | None,
        solid: Callable[[Array], np.ndarray[tuple[int], np.dtype[np.bool_]]] | None = None,
    ) -> None:
        corners, sizes = _cells(box)
        points, outward = _cell_points(box, corners, sizes)
        if solid is not None:
            clear = ~solid(points.reshape(-1, 3)).reshape(len(points), -1).any(axis=1)
            points, outward = points[clear], outward[clear]
        self._outward = outward
        self._sampler = HandoffSampler(free_points(points.reshape(-1, 3)), sea, flow)

    def at(self, state: SurfaceState) -> DivergenceInstant:
        """Fluxes of the cells at the time of a solved state."""
        velocity = self._sampler.first_order(state).reshape(self._outward.shape)
        by_face = np.sum(velocity * self._outward, axis=(2, 3))
        net = np.abs(by_face.sum(axis=1))
        return DivergenceInstant(
            float(net.max(initial=0.0)), float(np.abs(by_face).max(initial=0.0))
        )


def divergence_figure(net_flux: Array, face_flux: Array) -> float:
    """Largest net flux of a cell over all instants, as a share of the largest face flux."""
    return share_of_largest(net_flux, face_flux)


def _cells(box: Box) -> tuple[Array, Array]:
    """Low corners and sizes, (c, 3), of cells at the corners and middles of the sides, 3 deep."""
    edges = cell_edges(box)
    x, y = (np.unique([0, (len(e) - 1) // 2, len(e) - 2]) for e in edges[:2])
    submerged = int(np.sum(edges[2] < 0.0)) - (0 if edges[2][-1] >= 0.0 else 1)
    z = np.unique([0, submerged // 2, submerged - 1])
    index = np.stack([g.ravel() for g in np.meshgrid(x, y, z, indexing="ij")], axis=1)
    # in the middle of the box there may be a hull, and the near field is the other solver's
    at_side = np.isin(index[:, 0], x[[0, -1]]) | np.isin(index[:, 1], y[[0, -1]])
    index = index[at_side]
    low = np.column_stack([edges[k][index[:, k]] for k in range(3)])
    high = np.column_stack([edges[k][index[:, k] + 1] for k in range(3)])
    return low, high - low


def _cell_points(box: Box, low: Array, size: Array) -> tuple[Array, Array]:
    """Gauss points on the faces and their outward area vectors, on earth, (c, 6, 4, 3) each."""
    unit, normal = [], []
    for axis in range(3):
        others = [k for k in range(3) if k != axis]
        for far in (0.0, 1.0):
            for a in (-_GAUSS, _GAUSS):
                for b in (-_GAUSS, _GAUSS):
                    place = np.full(3, far)
                    place[others] = 0.5 + a, 0.5 + b
                    unit.append(place)
                    normal.append(np.where(np.arange(3) == axis, 2.0 * far - 1.0, 0.0))
    points = low[:, None] + size[:, None] * np.array(unit)
    outward = 0.25 * np.prod(size, axis=1)[:, None, None] / size[:, None] * np.array(normal)
    points[..., :2] = box.to_earth(points[..., :2])
    outward[..., :2] = outward[..., :2] @ turn(box.angle).T
    return points.reshape(-1, 6, 4, 3), outward.reshape(-1, 6, 4, 3)
