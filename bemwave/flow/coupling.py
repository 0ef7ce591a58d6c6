"""Between the gridded surface and hull panels: one linear map, and its transpose for the way back.

`pull` takes the surface's potential to what its harmonic extension does at hulls, tested with the
hats of hull nodes (normal derivative) and panel by panel (potential); `push`, then `add_far` and
`add_near`, are the transpose, by reciprocity what hulls do to the surface. That both are one map
keeps the flow symmetric.

Zones are blended by windows. Close to the hulls the surface is a fine sheet of triangles on which
the grid's potential is interpolated; further off it is a sum over nodes; far away a sum over the
nodes of ever coarser grids that carry only the long waves, so that a larger sea adds little. In
these sums a few rows stand for all (interpolative decomposition: Cheng et al. 2005, SIAM J. Sci.
Comput. 26:1389).

All zones end with the grid; the surface of the periodic water does not. Its mean, which is felt
furthest, is put right: a potential that is the same all over moves nothing. Else a hull would draw
in water for ever when something has raised the mean, and give off less than it displaces.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.linalg import interpolative
from scipy.spatial import KDTree

from bemwave.flow.elements import Elements, hat_curls
from bemwave.flow.images import Images
from bemwave.flow.sheet import Complex, Sheet, touched
from bemwave.geometry.patterns import grid_triangles
from bemwave.kernels import panels as kernel
from bemwave.kernels.points import potential_at, velocity_at

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

FINER = 4  # cells of the fine sheet in one of the grid
COARSER = 4  # cells of the grid in one of the coarse one
CLOSE = 3.0, 8.0  # spacings from the hulls where the fine sheet gives way to nodes
FAR = 10.0, 34.0  # and these to coarse nodes
DEEP = 2.0  # spacings under which hulls see no cells, only nodes
ACCURACY = 1e-5  # of the few rows that stand for all
SAMPLE = 1200  # nodes of each zone by which they are chosen
FEW = 8  # columns of a product
POINTS = 64  # of hulls that are integrated for at a time
AT_ONCE = 2_000_000  # dipoles at points that are held in memory


class Coupling:
    """Maps between a sheet and all hull panels on it.

    Parameters
    ----------
    sheet : the grid.
    e : the hulls' elements.
    images : of the half space.
    """

    def __init__(self, sheet: Sheet, e: Elements, images: Images) -> None:
        self.sheet = sheet
        self._points = _Rule(e, images)
        plan = KDTree(e.points[:, :2])
        self._hats = self._points.by_hat.shape[0]
        near, distance = _near(plan, sheet, sheet.spacing * CLOSE[1])
        close = _window(distance / sheet.spacing, *CLOSE)
        self.close = near[close > 0.0]
        self._close = self._fine_map() * close[close > 0.0]
        self._zones = _zones(sheet, plan)
        self._few, self._spread = [], []
        for zone in self._zones:
            chosen, spread = self._points.stand_ins(zone.xy)
            self._few.append(self._points.rows(chosen, zone.xy) * zone.weight)
            self._spread.append(spread)
        self._by_mean = self._points.of_level() - self._of_level()
        self._ends = np.cumsum([len(self.close), *(len(rows) for rows in self._few)])
        self.size = self._ends[-1]
        self._sums = self._few[0].sum(axis=1)

    def _of_level(self) -> Array:
        """(hull nodes + panels,) the zones' answer to a potential of one all over."""
        answer = self._close.sum(axis=1)
        for spread, rows in zip(self._spread, self._few, strict=True):
            answer += spread @ rows.sum(axis=1)
        return np.asarray(answer)

    def pull(self, potential: Array, spectrum: Complex) -> Array:
        """What a surface potential (nx ny, k) of half spectrum (k, ...) does at the hulls.

        (hull nodes, k): int hat d(phi)/dn over the hulls, normals into the bodies. The maps have
        further rows, int phi over each panel, which only the way back has a use for.
        """
        count = self._hats
        result = times(self._close[:count], potential[self.close])
        fields = [potential[self._zones[0].nodes]]
        for zone in self._zones[1:]:
            coarse = zone.sheet.back(self.sheet.cropped(spectrum, zone.sheet))
            fields.append(coarse.reshape(len(coarse), -1).T[zone.nodes])
        for rows, spread, field in zip(self._few, self._spread, fields, strict=True):
            result += times(spread[:count], times(rows, field))
        mean = spectrum[:, 0, 0].real / self.sheet.size
        result += self._by_mean[:count, None] * mean
        return result

    def push(self, load: Array) -> Array:
        """What `add_far` and `add_near` need of a load (hull nodes, k) or (hull nodes + panels, k).

        (size, k): on the nodes close to hulls, and on the few rows of each zone. The mean of the
        surface's answer is the caller's to give.
        """
        count = len(load)
        parts = [times(self._close[:count].T, load)]
        parts += [times(spread[:count].T, load) for spread in self._spread]
        return np.concatenate(parts)

    def add_far(self, pushed: Array, spectrum: Complex) -> None:
        """The transpose of `pull` that waves carry: adds to a half spectrum (k, ...)."""
        few = np.split(pushed, self._ends[1:-1])[1:]
        for zone, rows, load in zip(self._zones[1:], self._few[1:], few, strict=True):
            coarse = np.zeros((load.shape[1], zone.sheet.size))
            coarse[:, zone.nodes] = times(rows.T, load).T
            waves = zone.sheet.transform(coarse.reshape(-1, *zone.sheet.shape))
            self.sheet.add_long(spectrum, waves, zone.sheet)

    def add_near(self, pushed: Array, field: Array) -> None:
        """And that which nodes near the hulls get: adds to a field (nx ny, k)."""
        close, few = np.split(pushed, self._ends[:2])[:2]
        field[self.close] += close
        field[self._zones[0].nodes] += times(self._few[0].T, few)

    def near(self, pushed: Array) -> Array:
        """(k,) sum over the grid of what `add_near` adds."""
        close, few = np.split(pushed, self._ends[:2])[:2]
        return np.asarray(close.sum(axis=0) + self._sums @ few)

    def _fine_map(self) -> Array:
        """`pull` of the fine sheet, by the grid's nodes close to the hulls."""
        sheet = self.sheet
        i, j = np.divmod(self.close, sheet.shape[1])
        step = sheet.spacing / FINER
        nx, ny = (FINER * (int(np.ptp(n)) + 2) for n in (i, j))
        x = sheet.west + sheet.spacing * (i.min() - 1) + step * np.arange(nx + 1)
        y = sheet.south + sheet.spacing * (j.min() - 1) + step * np.arange(ny + 1)
        plan = np.stack([g.ravel() for g in np.meshgrid(x, y, indexing="ij")], axis=1)
        triangles = grid_triangles(nx, ny)[:, ::-1]
        owned = np.zeros(sheet.size, dtype=bool)
        owned[self.close] = True
        # cells far from every hull carry nothing
        stencil = sheet.interpolation(plan)
        used = np.asarray(stencil @ owned.astype(float)) > 0.0
        triangles = triangles[used[triangles].any(axis=1)]
        fine = np.column_stack([plan, np.zeros(len(plan))])
        to_fine = _hat_projection(nx + 1, ny + 1) @ stencil[:, self.close]
        deep = self._points.at[:, 2] < -DEEP * sheet.spacing
        # deep down, and so below the bed's images, the sum over nodes is as good,
        # exp(-2 pi depth/spacing), and quicker
        whole = sheet.depth < DEEP * sheet.spacing
        shallow, nodes = np.flatnonzero(~deep), sheet.xy[self.close]
        weights = sparse.csr_matrix(to_fine.T)
        maps = self._points.of_triangles(fine, triangles, weights, shallow, whole)
        maps += self._points.of_nodes(nodes, np.flatnonzero(deep)) * sheet.spacing**2
        if not whole:
            maps += self._points.of_nodes(nodes, shallow, mirrored=True) * sheet.spacing**2
        return maps


@dataclass(frozen=True)
class _Zone:
    """Nodes of a sheet that a zone is a sum over.

    Attributes
    ----------
    sheet : the grid or a coarser one.
    nodes, weight : numbers of its nodes, and the area that each stands for [m^2].
    """

    sheet: Sheet
    nodes: Ints
    weight: Array

    @property
    def xy(self) -> Array:
        """(n, 2) places of the nodes [m]."""
        return self.sheet.at(self.nodes)


def _zones(sheet: Sheet, plan: KDTree) -> list[_Zone]:
    """Beyond the close one: of the grid, then of ever coarser ones, as far as it reaches."""
    factors = [1, COARSER]
    while 2.0 * FAR[1] * factors[-1] <= min(sheet.shape):
        if any(n % (2 * COARSER * factors[-1]) for n in sheet.shape):
            break
        factors.append(COARSER * factors[-1])
    zones, start = [], CLOSE
    for factor in factors:
        own, end = sheet.coarser(factor), (FAR[0] * factor, FAR[1] * factor)
        outermost = factor == factors[-1]
        nodes, distance = _near(plan, own, np.inf if outermost else sheet.spacing * end[1])
        weight = 1.0 - _window(distance / sheet.spacing, *start)
        if not outermost:
            weight *= _window(distance / sheet.spacing, *end)
        used = weight > 0.0
        zones.append(_Zone(own, nodes[used], weight[used] * own.spacing**2))
        start = end
    return zones


def _near(plan: KDTree, sheet: Sheet, reach: float) -> tuple[Ints, Array]:
    """Nodes in a box about some places that leaves out none within reach, and their distance."""
    (low, high), (x, y) = (plan.mins - reach, plan.maxes + reach), sheet.axes
    rows = np.flatnonzero((low[0] <= x) & (x <= high[0]))
    columns = np.flatnonzero((low[1] <= y) & (y <= high[1]))
    nodes = (rows[:, None] * sheet.shape[1] + columns).ravel()
    return nodes, np.asarray(plan.query(sheet.at(nodes))[0])


class _Rule:
    """Points of a rule on hull panels, and their weights for hats and for panels."""

    def __init__(self, e: Elements, images: Images) -> None:
        count = len(e.hull)
        around = images.of_surface_dipoles()
        self._around = (around.signs, around.shifts, around.weights)
        here = around.shifts[:, 2] == 0.0
        self._here = tuple(part[here] for part in self._around)
        self._mirrored = tuple(part[~here] for part in self._around)
        self.at = np.einsum("qj,mjc->mqc", kernel.THREE[:, :3], e.points[e.hull]).reshape(-1, 3)
        self.normal = np.repeat(e.hull_table[:, 9:12], 3, axis=0)
        area = np.repeat(e.hull_table[:, 28] / 3.0, 3)
        share = np.tile(kernel.THREE[:, :3], (count, 1)) * area[:, None]
        owner = np.repeat(e.hull, 3, axis=0)
        number = np.arange(3 * count)
        shape = (len(e.points), 3 * count)
        self.by_hat = sparse.csr_matrix(
            (share.ravel(), (owner.ravel(), np.repeat(number, 3))), shape=shape
        )[e.hull.min() : e.nodes]
        self.by_panel = sparse.csr_matrix((area, (number // 3, number)), shape=(count, 3 * count))
        self._weights = sparse.csr_matrix(sparse.vstack([self.by_hat, self.by_panel]))

    def of_level(self) -> Array:
        """(hull nodes + panels,) `pull` of a potential of one: no slope, and one on every panel."""
        hats = self.by_hat.shape[0]
        return np.append(np.zeros(hats), np.asarray(self.by_panel.sum(axis=1)))

    def of_triangles(
        self, nodes: Array, triangles: Ints, weights: sparse.csr_matrix, used: Ints, whole: bool
    ) -> Array:
        """(hull nodes + panels, n) `pull` of sums of hats on triangles, at some points.

        `weights` (n, nodes): of the hats in each sum. `whole`: with the bed's images.
        """
        around = self._around if whole else self._here
        table = kernel.pack(nodes[triangles])
        curls = hat_curls(nodes[triangles], table)
        result = np.zeros((self._weights.shape[0], weights.shape[0]))
        for start in range(0, len(used), POINTS):
            part = used[start : start + POINTS]
            at = np.ascontiguousarray(self.at[part])
            velocity = velocity_at(at, table, triangles, curls, len(nodes), *around)[1]
            slope = np.einsum("pcn,pc->pn", velocity, self.normal[part])
            level = potential_at(at, table, triangles, len(nodes), *around)[1]
            self._add(result, part, (weights @ slope.T).T, (weights @ level.T).T)
        return result

    def of_nodes(self, at: Array, used: Ints, mirrored: bool = False) -> Array:
        """(hull nodes + panels, n) `pull` of dipoles at places (n, 2), per area, at some points.

        `mirrored`: of the bed's images alone.
        """
        around = self._mirrored if mirrored else self._around
        result = np.zeros((self._weights.shape[0], len(at)))
        for start in range(0, len(used), POINTS):
            part = used[start : start + POINTS]
            maps = _surface_dipoles(self.at[part], self.normal[part], at, around)
            self._add(result, part, *maps)
        return result

    def rows(self, chosen: Ints, at: Array) -> Array:
        """(chosen, n) rows of `pull` of dipoles at places (n, 2) of the surface, per area."""
        is_hat = (chosen < self.by_hat.shape[0])[:, None]
        used, weights = touched(self._weights[chosen])
        result = np.empty((len(chosen), len(at)))
        for part in np.array_split(np.arange(len(at)), 1 + len(at) * len(used) // AT_ONCE):
            maps = _surface_dipoles(self.at[used], self.normal[used], at[part], self._around)
            slope, level = (np.asarray(weights @ values) for values in maps)
            result[:, part] = np.where(is_hat, slope, level)
        return result

    def stand_ins(self, places: Array) -> tuple[Ints, Array]:
        """Rows that stand for all at places of the surface, and all as sums of these."""
        draw = np.random.default_rng(1)
        sample = places[draw.choice(len(places), min(SAMPLE, len(places)), replace=False)]
        count = self.by_hat.shape[0] + self.by_panel.shape[0]
        tried = self.rows(np.arange(count), sample)
        scale = np.linalg.norm(tried, axis=1)
        # nearby nodes would drown those far off, and slopes potentials
        size = np.linalg.norm(tried / scale[:, None], axis=0)
        found: Any = interpolative.interp_decomp(
            (tried / scale[:, None] / size).T, ACCURACY, rand=False
        )
        rank, order, coefficients = found
        sums = np.asarray(interpolative.reconstruct_interp_matrix(order, coefficients)).T
        chosen = np.asarray(order[:rank])
        return chosen, scale[:, None] * sums / scale[chosen]

    def _add(self, result: Array, part: Ints, slope: Array, level: Array) -> None:
        hats = self.by_hat.shape[0]
        for first, weights, values in ((0, self.by_hat, slope), (hats, self.by_panel, level)):
            some = sparse.csr_matrix(weights[:, part])
            rows = np.flatnonzero(np.diff(some.indptr))
            result[first + rows] += np.asarray(some[rows] @ values)


def times(matrix: Array, columns: Array) -> Array:
    """matrix @ columns (n, k); few of them one by one, for which BLAS rearranges no matrix."""
    if columns.shape[1] > FEW:
        return np.asarray(matrix @ columns)
    result = np.empty((len(matrix), columns.shape[1]), order="F")
    for k in range(columns.shape[1]):
        result[:, k] = matrix @ columns[:, k]
    return result


def _window(distance: Array, start: float, end: float) -> Array:
    """1 up to `start`, 0 from `end` on, with three continuous derivatives."""
    s = np.clip((distance - start) / (end - start), 0.0, 1.0)
    return np.asarray(1.0 - s**4 * (35.0 - 84.0 * s + 70.0 * s**2 - 20.0 * s**3))


def _hat_projection(nx: int, ny: int) -> sparse.csr_matrix:
    """From values of a smooth field to the coefficients of its best hats on equal triangles."""

    def along(n: int) -> sparse.csr_matrix:
        second = sparse.diags([1.0, -2.0, 1.0], [-1, 0, 1], shape=(n, n))
        return sparse.csr_matrix(second)

    eye_x, eye_y = sparse.identity(nx), sparse.identity(ny)
    bend = sparse.kron(along(nx), eye_y) + sparse.kron(eye_x, along(ny))
    return sparse.csr_matrix(sparse.identity(nx * ny) - bend / 12.0)


def _surface_dipoles(
    points: Array, normals: Array, nodes: Array, around: tuple[Array, ...]
) -> tuple[Array, Array]:
    """(p, n) slope along normals and potential of -dG/dz' at nodes (n, 2) of z = 0."""
    slope, level = np.zeros((2, len(points), len(nodes)))
    for sign, shift, weight in zip(*around, strict=True):
        at, n = sign * (points - shift), sign * normals
        dx, dy = at[:, 0, None] - nodes[:, 0], at[:, 1, None] - nodes[:, 1]
        z = at[:, 2, None]
        r2 = dx**2 + dy**2 + z**2
        pole = -weight / kernel.FOUR_PI * r2**-1.5
        along = dx * n[:, 0, None] + dy * n[:, 1, None] + z * n[:, 2, None]
        level += pole * z
        slope += pole * (n[:, 2, None] - 3.0 * z * along / r2)
    return slope, level
