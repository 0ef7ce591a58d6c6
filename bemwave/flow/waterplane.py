"""Where hulls stand there is no free surface: fields on the grid are continued through it.

Inside waterlines the grid's fields have no meaning of their own. They are slaves of the nodes
outside, near the waterline by parabolas through these, further in as smoothly as a biharmonic
allows. What they are there does not matter to the flow, which is that of the water alone; that
they are smooth does, for the grid resolves no more than that.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from scipy import linalg, sparse
from scipy.spatial import KDTree

from bemwave.flow.sheet import Sheet

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Bools = npt.NDArray[np.bool_]

MARGIN = 0.03  # of a spacing: nodes nearer to a waterline than this count as inside
REACH = 4.3  # spacings outside a waterline of the nodes that a continuation is made from
RING = 2.0  # spacings inside a waterline of the nodes that parabolas reach
NEAR = 20  # nodes outside that a parabola is fitted to

_BIHARMONIC = (
    [(0, 0, 20.0)]
    + [(i, j, -8.0) for i, j in ((1, 0), (-1, 0), (0, 1), (0, -1))]
    + [(i, j, 2.0) for i, j in ((1, 1), (1, -1), (-1, 1), (-1, -1))]
    + [(i, j, 1.0) for i, j in ((2, 0), (-2, 0), (0, 2), (0, -2))]
)


class Continuation:
    """Continues fields through all waterplanes: maps from nodes outside to those inside.

    Parameters
    ----------
    sheet : the grid.
    waterplanes : for each body its waterlines, closed lines (k, 2) [m].

    Attributes
    ----------
    inside : (nx ny,) nodes that have no water of their own.
    """

    def __init__(self, sheet: Sheet, waterplanes: Sequence[Sequence[Array]]) -> None:
        lines = [_dense_line(polygons, sheet.spacing) for polygons in waterplanes]
        within = [
            _inside(sheet, polygons, line)
            for polygons, line in zip(waterplanes, lines, strict=True)
        ]
        self.inside = np.zeros(sheet.size, dtype=bool)
        for nodes in within:
            self.inside |= nodes
        self._pieces = [
            _continuation(sheet, nodes, line, self.inside)
            for nodes, line in zip(within, lines, strict=True)
        ]

    @property
    def map(self) -> sparse.csr_matrix:
        """(inside, nx ny) the values inside, in the order of their nodes."""
        number = np.cumsum(self.inside) - 1
        rows, columns, values = [], [], []
        for nodes, outside, weights in self._pieces:
            rows.append(np.repeat(number[nodes], len(outside)))
            columns.append(np.tile(outside, len(nodes)))
            values.append(weights.ravel())
        shape = (int(self.inside.sum()), len(self.inside))
        if not rows:
            return sparse.csr_matrix(shape)
        at = np.concatenate(rows), np.concatenate(columns)
        return sparse.csr_matrix((np.concatenate(values), at), shape=shape)

    def __call__(self, field: Array) -> Array:
        """A copy of a field (nx ny, k), continued."""
        result = field.copy(order="K")
        self.fill(result)
        return result

    def fill(self, field: Array) -> None:
        """Continue a field (nx ny, k), in place."""
        for nodes, outside, weights in self._pieces:
            field[nodes] = weights @ field[outside]

    def gather(self, load: Array) -> None:
        """Give loads (nx ny, k) inside to the nodes outside that rule there, in place."""
        for nodes, outside, weights in self._pieces:
            load[outside] += weights.T @ load[nodes]
            load[nodes] = 0.0


def _dense_line(polygons: Sequence[Array], spacing: float) -> Array:
    """Points of waterlines, at most a tenth of a spacing apart."""
    points = []
    for polygon in polygons:
        along = np.roll(polygon, -1, axis=0) - polygon
        count = int(np.ceil(10.0 * np.hypot(*along.T).max() / spacing)) + 1
        share = np.arange(count)[:, None, None] / count
        points.append((polygon + share * along).reshape(-1, 2))
    return np.concatenate(points)


def _inside(sheet: Sheet, polygons: Sequence[Array], line: Array) -> Bools:
    """Nodes inside a waterplane, or nearer to its waterline than MARGIN."""
    from matplotlib.path import Path

    close = np.flatnonzero(
        (np.abs(sheet.xy - 0.5 * (line.min(axis=0) + line.max(axis=0)))
         <= 0.5 * np.ptp(line, axis=0) + sheet.spacing).all(axis=1)
    )  # fmt: skip
    places = sheet.xy[close]
    within = np.zeros(len(close), dtype=bool)
    for polygon in polygons:
        within ^= Path(polygon).contains_points(places)
    within |= np.asarray(KDTree(line).query(places)[0]) < MARGIN * sheet.spacing
    result = np.zeros(sheet.size, dtype=bool)
    result[close[within]] = True
    return result


def _continuation(
    sheet: Sheet, inside: Bools, line: Array, others: Bools
) -> tuple[Ints, Ints, Array]:
    """Of one waterplane: the nodes inside, those outside that rule there, and by what weights."""
    distance = np.full(sheet.size, np.inf)
    low, high = line.min(axis=0), line.max(axis=0)
    reach = (REACH + 1.0) * sheet.spacing
    box = np.flatnonzero(((sheet.xy > low - reach) & (sheet.xy < high + reach)).all(axis=1))
    distance[box] = np.asarray(KDTree(line).query(sheet.xy[box])[0]) / sheet.spacing
    nodes = np.flatnonzero(inside)
    outside = np.flatnonzero((distance < REACH) & ~others)
    number = np.full(sheet.size, -1)
    number[nodes] = np.arange(len(nodes))
    number[outside] = len(nodes) + np.arange(len(outside))
    ring = distance[nodes] < RING
    values = np.zeros((len(nodes), len(outside)))
    values[ring] = _parabolas(sheet, nodes[ring], outside)
    core = _biharmonic(sheet, nodes[~ring], number, len(nodes) + len(outside))
    into, given = core[:, : len(nodes)], core[:, len(nodes) :]
    values[~ring] = -linalg.lstsq(into[:, ~ring], given + into[:, ring] @ values[ring])[0]
    return nodes, outside, values


def _parabolas(sheet: Sheet, nodes: Ints, outside: Ints) -> Array:
    """(nodes, outside) weights of the parabolas fitted to the nearest nodes outside."""
    distance, near = KDTree(sheet.xy[outside]).query(sheet.xy[nodes], k=min(NEAR, len(outside)))
    far = np.asarray(distance)
    at = (sheet.xy[outside][near] - sheet.xy[nodes][:, None]) / sheet.spacing
    x, y = at[..., 0], at[..., 1]
    terms = np.stack([np.ones_like(x), x, y, x * x, x * y, y * y], axis=-1)
    weight = np.exp(-0.5 * ((far - far[:, :1]) / sheet.spacing) ** 2)
    fit = np.linalg.pinv(terms * weight[..., None])[:, 0] * weight
    result = np.zeros((len(nodes), len(outside)))
    result[np.arange(len(nodes))[:, None], near] = fit
    return result


def _biharmonic(sheet: Sheet, nodes: Ints, number: Ints, count: int) -> Array:
    """One row a node: the 13-point biharmonic, in the numbering of the continuation."""
    rows = np.zeros((len(nodes), count))
    i, j = np.divmod(nodes, sheet.shape[1])
    for di, dj, value in _BIHARMONIC:
        at = ((i + di) % sheet.shape[0]) * sheet.shape[1] + (j + dj) % sheet.shape[1]
        np.add.at(rows, (np.arange(len(nodes)), number[at]), value)
    return rows
