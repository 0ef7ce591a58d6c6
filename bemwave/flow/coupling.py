"""Maps between the gridded surface and hull panels: dense near the hull, low rank far from it.

Near the hull the surface is a fine sheet of triangles, on which the grid's potential is
interpolated; its effect on panels is that of the samplers. Far away it is a sum over nodes, right
to the order of the field's smoothness. A smooth window parts the two. What the hull makes on the
surface is evaluated at nodes; far away through a few panels and nodes that stand for all
(interpolative decomposition: Cheng et al. 2005, SIAM J. Sci. Comput. 26:1389).
"""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.linalg import interpolative
from scipy.spatial import KDTree

from bemwave.flow.elements import Elements, hat_curls
from bemwave.flow.images import Images
from bemwave.flow.sheet import Sheet
from bemwave.geometry.patterns import grid_triangles
from bemwave.kernels import panels as kernel

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

FINER = 4  # cells of the near sheet in one of the grid
INNER, OUTER = 8.0, 20.0  # spacings from the hull where the window starts and ends
ACCURACY = 1e-6  # of the low-rank far parts
SAMPLE = 3000  # far nodes they are chosen by


class Coupling:
    """Maps of one group of hull panels.

    Parameters
    ----------
    sheet : the grid.
    e : elements without water: the group's panels.
    images : of the half space.
    """

    def __init__(self, sheet: Sheet, e: Elements, images: Images) -> None:
        self.sheet, self.e, self.images = sheet, e, images
        distance, _ = KDTree(e.points[:, :2]).query(sheet.xy)
        s = np.clip((distance / sheet.spacing - INNER) / (OUTER - INNER), 0.0, 1.0)
        window = 0.5 * (1.0 + np.cos(np.pi * s))
        self.near = np.flatnonzero(window > 0.0)
        self.far = np.flatnonzero(window < 1.0)
        flux, potential = self._near_maps()
        self._flux_near = flux[:, self.near] * window[self.near]
        self._potential_near = potential[:, self.near] * window[self.near]
        self._far_maps(1.0 - window[self.far])
        self._surface_maps()

    def flux(self, potential: Array) -> Array:
        """(panels, k) normal derivative of the surface's extension (nx ny, k)."""
        count = len(self.e.hull)
        far = self._skeleton_rows @ potential[self.far]
        return np.asarray(
            self._flux_near @ potential[self.near] + self._skeleton_spread[:count] @ far
        )

    def potential(self, potential: Array) -> Array:
        """(nodes below and on the waterline, k) of the surface's extension."""
        count = len(self.e.hull)
        far = self._skeleton_rows @ potential[self.far]
        return np.asarray(
            self._potential_near @ potential[self.near] + self._skeleton_spread[count:] @ far
        )

    def rise(self, flux: Array, potential: Array) -> Array:
        """(nx ny, k) vertical velocity at z = 0 of hull sources and dipoles."""
        result = np.zeros((self.sheet.size, flux.shape[1]))
        both = np.concatenate([flux, potential])
        result[self.close] = self._rise_close @ both
        result[self.beyond] = self._rise_beyond @ (self._gather @ both)
        return result

    def _near_maps(self) -> tuple[Array, Array]:
        """Flux on panels and potential at nodes of the near sheet, by grid node."""
        sheet, e = self.sheet, self.e
        i, j = np.divmod(self.near, sheet.shape[1])
        step = sheet.spacing / FINER
        nx, ny = (FINER * (int(np.ptp(n)) + 2) for n in (i, j))
        x = sheet.west + sheet.spacing * (i.min() - 1) + step * np.arange(nx + 1)
        y = sheet.south + sheet.spacing * (j.min() - 1) + step * np.arange(ny + 1)
        plan = np.stack([g.ravel() for g in np.meshgrid(x, y, indexing="ij")], axis=1)
        triangles = grid_triangles(nx, ny)[:, ::-1]
        fine = np.column_stack([plan, np.zeros(len(plan))])
        table = kernel.pack(fine[triangles])
        curls = hat_curls(fine[triangles], table)
        around = self.images.of_surface_dipoles()
        maps = (around.signs, around.shifts, around.weights)
        hat = _hat_projection(nx + 1, ny + 1) @ sheet.interpolation(plan)
        points = np.einsum("qj,mjc->mqc", kernel.THREE[:, :3], e.points[e.hull]).reshape(-1, 3)
        normals = np.repeat(e.hull_table[:, 9:12], 3, axis=0) / 3.0
        flux = np.zeros((len(e.hull), sheet.size))
        for start in range(0, len(points), 192):
            part = np.ascontiguousarray(points[start : start + 192])
            _, pull = kernel.velocity_at(part, table, triangles, curls, len(fine), *maps)
            along = np.einsum("pcn,pc->pn", pull, normals[start : start + 192])
            summed = along.reshape(-1, 3, len(fine)).sum(axis=1)
            flux[start // 3 : start // 3 + len(summed)] = (hat.T @ summed.T).T
        _, below = kernel.potential_at(
            np.ascontiguousarray(e.points[: e.below]), table, triangles, len(fine), *maps
        )
        potential = np.vstack(
            [(hat.T @ below.T).T, sheet.interpolation(e.points[e.below :, :2]).toarray()]
        )
        return flux, potential

    def _far_maps(self, weight: Array) -> None:
        """Flux on panels and potential at nodes of far grid nodes, through a few of them."""
        sheet, e = self.sheet, self.e
        nodes = sheet.xy[self.far]
        weight = weight * sheet.spacing**2
        panels, below = e.hull_table[:, 24:27], e.points[: e.below]
        scale = float(np.abs(e.points).max())
        sample = np.random.default_rng(1).choice(len(nodes), min(SAMPLE, len(nodes)), False)

        def rows(numbers: Ints, at: Array) -> Array:
            result = np.empty((len(numbers), len(at)))
            is_panel = numbers < len(panels)
            which = numbers[is_panel]
            normals = e.hull_table[which, 9:12]
            result[is_panel] = _surface_pull(panels[which], at, normals, self.images)
            which = numbers[~is_panel] - len(panels)
            result[~is_panel] = _surface_potential(below[which], at, self.images) / scale
            return result

        every = np.arange(len(panels) + len(below))
        tried = rows(every, nodes[sample]) * weight[sample]
        rank, order, spread = _stand_ins(tried.T)
        full = spread.T
        self._skeleton_rows = rows(order[:rank], nodes) * weight
        on_line = np.zeros((len(e.points) - e.below, rank))
        self._skeleton_spread = np.vstack(
            [full[: len(panels)], scale * full[len(panels) :], on_line]
        )

    def _surface_maps(self) -> None:
        """Vertical velocity at nodes of unit sources and dipoles of the hull."""
        sheet, e = self.sheet, self.e
        close = np.zeros(sheet.size, dtype=bool)
        close[self.near] = True
        self.close, self.beyond = np.flatnonzero(close), np.flatnonzero(~close)
        self._rise_close = self._rise(self.close, np.arange(len(e.hull) + e.below))
        sample = np.random.default_rng(2).choice(
            self.beyond, min(SAMPLE, len(self.beyond)), replace=False
        )
        tried = self._rise(sample, np.arange(len(e.hull) + e.below))
        tried *= (1.0 + np.linalg.norm(sheet.xy[sample] - e.points[:, :2].mean(axis=0), axis=1))[
            :, None
        ] ** 3
        rank, order, self._gather = _stand_ins(tried)
        self._rise_beyond = self._rise(self.beyond, order[:rank])

    def _rise(self, nodes: Ints, columns: Ints) -> Array:
        """Chosen columns: panels' sources first, then nodes' dipoles."""
        e, images = self.e, self.images
        count = len(e.hull)
        used = np.zeros(count, dtype=bool)
        used[columns[columns < count]] = True
        used |= np.isin(e.hull, columns[columns >= count] - count).any(axis=1)
        panels = np.flatnonzero(used)
        table, corners = e.hull_table[panels], e.hull[panels]
        curls = hat_curls(e.points[corners], table)
        maps = (images.signs, images.shifts, images.weights)
        result = np.empty((len(nodes), len(columns)))
        source = np.full(count, -1)
        source[panels] = np.arange(len(panels))
        is_panel = columns < count
        for start in range(0, len(nodes), 512):
            part = nodes[start : start + 512]
            at = np.column_stack([self.sheet.xy[part], np.zeros(len(part))])
            single, double = kernel.velocity_at(at, table, corners, curls, len(e.points), *maps)
            block = result[start : start + 512]
            block[:, is_panel] = single[:, 2, source[columns[is_panel]]]
            block[:, ~is_panel] = double[:, 2, columns[~is_panel] - count]
        return result


def _stand_ins(tried: Array) -> tuple[int, Ints, Array]:
    """How many columns stand for all, their numbers first, and all of them as sums of these."""
    found: Any = interpolative.interp_decomp(tried, ACCURACY, rand=False)
    rank, order, spread = found
    return rank, order, np.asarray(interpolative.reconstruct_interp_matrix(order, spread))


def _hat_projection(nx: int, ny: int) -> sparse.csr_matrix:
    """From values of a smooth field to the coefficients of its best hats on equal triangles."""

    def along(n: int) -> sparse.csr_matrix:
        second = sparse.diags([1.0, -2.0, 1.0], [-1, 0, 1], shape=(n, n))
        return sparse.csr_matrix(second)

    eye_x, eye_y = sparse.identity(nx), sparse.identity(ny)
    bend = sparse.kron(along(nx), eye_y) + sparse.kron(eye_x, along(ny))
    return sparse.csr_matrix(sparse.identity(nx * ny) - bend / 12.0)


def _surface_potential(points: Array, nodes: Array, images: Images) -> Array:
    """(p, n) - dG/dz' of unit dipoles at nodes (n, 2) of z = 0, at points (p, 3)."""
    result = np.zeros((len(points), len(nodes)))
    around = images.of_surface_dipoles()
    for sign, shift, weight in zip(around.signs, around.shifts, around.weights, strict=True):
        at = sign * (points - shift)
        r2 = (
            (at[:, 0, None] - nodes[:, 0]) ** 2
            + (at[:, 1, None] - nodes[:, 1]) ** 2
            + at[:, 2, None] ** 2
        )
        result -= weight / kernel.FOUR_PI * at[:, 2, None] * r2**-1.5
    return result


def _surface_pull(points: Array, nodes: Array, normals: Array, images: Images) -> Array:
    """(p, n) derivative of `_surface_potential` along normals (p, 3)."""
    result = np.zeros((len(points), len(nodes)))
    around = images.of_surface_dipoles()
    for sign, shift, weight in zip(around.signs, around.shifts, around.weights, strict=True):
        at, n = sign * (points - shift), sign * normals
        dx, dy = at[:, 0, None] - nodes[:, 0], at[:, 1, None] - nodes[:, 1]
        z = at[:, 2, None]
        r2 = dx**2 + dy**2 + z**2
        along = dx * n[:, 0, None] + dy * n[:, 1, None] + z * n[:, 2, None]
        result -= weight / kernel.FOUR_PI * (n[:, 2, None] - 3.0 * z * along / r2) * r2**-1.5
    return result
