"""Crests as linear theory itself shapes them: the water's horizontal displacement.

A particle of a linear wave moves on an ellipse; drawn at D = i (k/|k|) coth(kh) times the
elevation, for exp(i k.x) (Dean & Dalrymple 1991, section 4.2: the particle path at z = 0), crests
are sharp and troughs flat. D is the gradient of a potential P with k tanh(kh) P = elevation in
wavenumbers. The sea's part is summed in closed form. The solved part's elevation is laid on a grid
over the solved water, inside waterlines that of the nearest waterline point, and P is found there
by cosine transform: exact for waves that have left the hulls, an approximation close to them.

It is tapered to zero at hulls, and limited so that the drawn surface nowhere folds. Rates are those
of what is drawn.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Protocol

import numpy as np
from scipy import fft, ndimage, sparse

from bemwave.flow.state import SurfaceState
from bemwave.frames.sheet import Array, Bools, Sheet, nearest_on, under_hulls
from bemwave.geometry.hull import Hull
from bemwave.geometry.outline import Rectangle

LEAST_AREA = 0.1  # of a triangle in plan, drawn over at rest: det(I + grad D)
AIM = 0.15  # what single places are limited to, so that smoothing keeps above LEAST_AREA
REACH = 4  # triangles over which a limit is spread
MOMENT = 1e-3  # s, over which the limit's own rate is taken
BLOCK = 8192  # places whose maps are built at a time

Shifted = tuple[Array, Array]  # displacement (n, 2) m, and its rate (n, 2) m/s


class SolvedMaps(Protocol):
    """Elevation and velocity of the solved field at fixed places."""

    def elevation(self, state: SurfaceState) -> Array:
        """(n,) m."""

    def velocity(self, state: SurfaceState) -> Array:
        """(n, 3) at z = 0, m/s."""


class SolvedShift:
    """The solved field's displacement at places.

    Parameters
    ----------
    sampler : callable
        Makes maps for places (n, 2): a route's `surface_sampler`.
    water : Rectangle
        Of the solved water; the field is even about its edges, as at walls, or zero there.
    contains : callable
        Tells which places (n, 2) are in it.
    hulls : sequence of Hull
    spacing : float
        m, of the grid.
    depth : float
    places : (n, 2)
        Where it is wanted; outside the water it is zero.
    """

    def __init__(
        self,
        sampler: Callable[[Array], SolvedMaps],
        water: Rectangle,
        contains: Callable[[Array], Bools],
        hulls: Sequence[Hull],
        spacing: float,
        depth: float,
        places: Array,
    ) -> None:
        low = np.array([water.x_min, water.y_min])
        size = np.array([water.x_max, water.y_max]) - low
        counts = np.ceil(size / spacing).astype(int)
        step = size / counts
        x, y = (low[a] + step[a] * (np.arange(counts[a]) + 0.5) for a in range(2))
        plan = np.stack([g.ravel() for g in np.meshgrid(x, y)], axis=1)
        wet = contains(plan)
        _, at = under_hulls(plan[wet], hulls)
        self._wet, self._shape = np.flatnonzero(wet), (len(y), len(x))
        self._maps = [sampler(at[k : k + BLOCK]) for k in range(0, len(at), BLOCK)]
        self._kx, self._ky = (np.pi * np.arange(counts[a]) / size[a] for a in range(2))
        k = np.hypot(self._kx[None, :], self._ky[:, None])
        k[0, 0] = np.inf  # the mean level moves nothing along
        self._inverse = 1.0 / (k * np.tanh(np.minimum(k * depth, 50.0)))
        self._index = ((places - low) / step - 0.5).T[::-1]
        self._outside = ~contains(places)

    def at(self, state: SurfaceState) -> Shifted:
        """Displacement and rate at the places."""
        level = np.concatenate([maps.elevation(state) for maps in self._maps])
        rising = np.concatenate([maps.velocity(state)[:, 2] for maps in self._maps])
        return self._gradient(level), self._gradient(rising)

    def _gradient(self, values: Array) -> Array:
        """Of P, at the places, for an elevation at the wet places of the grid."""
        grid = np.zeros(self._shape)
        grid.ravel()[self._wet] = values
        potential = fft.dctn(grid, type=2, norm="ortho") * self._inverse
        found = np.empty((self._index.shape[1], 2))
        for a, k in enumerate((self._kx[None, :], self._ky[:, None])):
            axis = 1 - a
            # the slope of cosines is sines, which count from one
            slope = np.roll(-k * potential, -1, axis=axis)
            slope = fft.idct(slope, type=2, norm="ortho", axis=a)
            slope = fft.idst(slope, type=2, norm="ortho", axis=axis)
            found[:, a] = ndimage.map_coordinates(slope, self._index, order=3, mode="nearest")
        found[self._outside] = 0.0
        return found


class Crests:
    """What is drawn of the displacement on a sheet: tapered at hulls, limited, with its rate.

    Parameters
    ----------
    sheet : Sheet
    waterlines : sequence of (k, 2) arrays
    width : float
        m from a waterline over which it comes up.
    solved : SolvedShift, optional
        At the sheet's vertices.
    """

    def __init__(
        self,
        sheet: Sheet,
        waterlines: Sequence[Array],
        width: float,
        solved: SolvedShift | None = None,
    ) -> None:
        self._solved = solved
        self._taper = _Taper(sheet, waterlines, width)
        self._limit = _Limit(sheet)

    def at(self, state: SurfaceState, shift: Array, rate: Array) -> Shifted:
        """From the sea's displacement and rate, (n, 2) each, to what is drawn of the whole."""
        if self._solved is not None:
            more, more_rate = self._solved.at(state)
            shift, rate = shift + more, rate + more_rate
        shift, rate = self._taper(shift), self._taper(rate)
        if self._limit.holds(shift):
            return shift, rate
        ahead, behind = (self._limit(shift + sign * MOMENT * rate) for sign in (1.0, -1.0))
        return self._limit(shift), (ahead - behind) / (2.0 * MOMENT)


class _Taper:
    """Brings a displacement to zero towards waterlines; inside them it is zero.

    Nothing then goes through a hull. What goes along it is taken out too: cut off between two
    vertices, it would fold the triangles that lie across the waterline.
    """

    def __init__(self, sheet: Sheet, waterlines: Sequence[Array], width: float) -> None:
        plan = sheet.mesh.points[:, :2]
        self._share = np.ones((len(plan), 1))
        near = np.zeros(len(plan), dtype=bool)
        for loop in waterlines:
            low, high = loop.min(axis=0) - width, loop.max(axis=0) + width
            near |= np.all((plan >= low) & (plan <= high), axis=1)
        if near.any():
            away = plan[near] - nearest_on(waterlines, plan[near])
            share = np.clip(np.linalg.norm(away, axis=1) / width, 0.0, 1.0)
            self._share[near, 0] = share**2 * (3.0 - 2.0 * share)
        self._share[sheet.under_hull] = 0.0

    def __call__(self, vectors: Array) -> Array:
        return np.asarray(self._share * vectors)


class _Limit:
    """Lessens a displacement where triangles would fold, smoothly about those places."""

    def __init__(self, sheet: Sheet) -> None:
        self._triangles = sheet.mesh.triangles
        corners = sheet.mesh.points[self._triangles, :2]
        self._edges = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
        self._area = _cross(*self._edges)
        count = len(sheet.mesh.points)
        pairs = np.concatenate([self._triangles[:, [0, 1]], self._triangles[:, [1, 2]],
                                self._triangles[:, [2, 0]]])  # fmt: skip
        one = np.ones(len(pairs))
        joins = sparse.csr_matrix((one, (pairs[:, 0], pairs[:, 1])), shape=(count, count))
        joins = sparse.csr_matrix(joins + joins.T + sparse.identity(count))
        joins.data[:] = 1.0
        self._joins = joins
        self._mean = sparse.diags(1.0 / np.asarray(joins.sum(axis=1)).ravel()) @ self._joins

    def holds(self, shift: Array) -> bool:
        """Whether no triangle is pressed to less than AIM of its area."""
        return bool(self._allowed(shift, AIM).min() >= 1.0)

    def __call__(self, shift: Array) -> Array:
        for _ in range(3):
            allowed = self._allowed(shift, AIM)
            if allowed.min() >= 1.0:
                break
            share = np.ones(len(shift))
            for corner in range(3):
                np.minimum.at(share, self._triangles[:, corner], allowed)
            for _ in range(REACH):
                share = np.minimum.reduceat(share[self._joins.indices], self._joins.indptr[:-1])
            for _ in range(REACH):
                share = np.asarray(self._mean @ share)
            shift = share[:, None] * shift
        # what smoothing has left over is taken off everywhere alike
        return np.asarray(self._allowed(shift, LEAST_AREA).min() * shift)

    def _allowed(self, shift: Array, least: float) -> Array:
        """(m,) largest share of a displacement, up to 1, at which a triangle keeps its area."""
        at = shift[self._triangles]
        first, second = at[:, 1] - at[:, 0], at[:, 2] - at[:, 0]
        linear = (_cross(self._edges[0], second) + _cross(first, self._edges[1])) / self._area
        square = _cross(first, second) / self._area
        return _first_crossing(1.0 - least, linear, square)


def _cross(a: Array, b: Array) -> Array:
    return np.asarray(a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0])


def _first_crossing(constant: float, linear: Array, square: Array) -> Array:
    """Smallest g in [0, 1] with constant + linear g + square g^2 = 0 (n,), or 1."""
    inner = linear**2 - 4.0 * square * constant
    root = np.sqrt(np.maximum(inner, 0.0))
    # the form 2c / (-b +- root) has no loss where `square` is small
    with np.errstate(divide="ignore", invalid="ignore"):
        roots = np.array([2.0 * constant / (-linear + sign * root) for sign in (1.0, -1.0)])
    roots = np.where((roots > 0.0) & (inner >= 0.0), roots, np.inf)
    return np.asarray(np.minimum(roots.min(axis=0), 1.0))
