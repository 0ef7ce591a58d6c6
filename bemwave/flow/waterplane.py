"""Where hulls stand there is no free surface: fields on the grid are continued through it.

Inside waterlines the grid's fields have no meaning of their own; they are continued from outside
so smoothly that their harmonic extension is right in the water. The potential is continued by
least squares with the hull's own condition at the waterline, n.grad phi = given flux, and as small
a biharmonic as that leaves; other fields by the biharmonic alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import linalg
from scipy.spatial import KDTree

from bemwave.flow.sheet import Sheet

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Bools = npt.NDArray[np.bool_]

MARGIN = 0.03  # of a spacing: nodes nearer to a waterline than this count as inside
REACH = 4.3  # spacings outside a waterline of the nodes that a continuation is made from
RING = 1.5  # spacings inside a waterline of the nodes that local polynomials reach
NEAR = 24  # nodes outside that a polynomial is fitted to
POINTS = 8  # of the waterline, where it meets the hull's condition
WEIGHT = 3.0  # of the condition, spacing x slope, against values at nodes
DEGREE = 3

_BIHARMONIC = (
    [(0, 0, 20.0)]
    + [(i, j, -8.0) for i, j in ((1, 0), (-1, 0), (0, 1), (0, -1))]
    + [(i, j, 2.0) for i, j in ((1, 1), (1, -1), (-1, 1), (-1, -1))]
    + [(i, j, 1.0) for i, j in ((2, 0), (-2, 0), (0, 2), (0, -2))]
)


@dataclass(frozen=True)
class Waterline:
    """Points of a body's waterline, the hull's normal there, and where its given flux stands.

    points : (p, 2) m; normals : (p, 3) out of the water; rows : (p,) of the given fluxes.
    """

    points: Array
    normals: Array
    rows: Ints


class Continuation:
    """Continues fields of one body's waterplane, as small dense matrices.

    Parameters
    ----------
    sheet : the grid.
    inside : (nx ny,) nodes of this waterplane.
    waterline : of this body.
    others : (nx ny,) nodes inside any waterplane.
    """

    def __init__(self, sheet: Sheet, inside: Bools, waterline: Waterline, others: Bools) -> None:
        distance, _ = KDTree(waterline.points).query(sheet.xy)
        distance = np.asarray(distance) / sheet.spacing
        self.inside = np.flatnonzero(inside)
        self.outside = np.flatnonzero((distance < REACH) & ~others)
        self.rows = waterline.rows
        number = np.full(sheet.size, -1)
        number[self.inside] = np.arange(len(self.inside))
        number[self.outside] = len(self.inside) + np.arange(len(self.outside))
        smooth = _biharmonic_rows(sheet, self.inside, number, len(self.outside))
        n = len(self.inside)
        self._plain = -np.asarray(linalg.lstsq(smooth[:, :n], smooth[:, n:])[0])
        ring = distance[self.inside] < RING
        by_values, by_flux = self._polynomials(sheet, self.inside[ring], waterline)
        core = smooth[~ring]
        into = -np.asarray(linalg.pinv(core[:, :n][:, ~ring]))
        self._from_outside = np.empty((n, len(self.outside)))
        self._from_flux = np.empty((n, len(waterline.points)))
        self._from_outside[ring], self._from_flux[ring] = by_values, by_flux
        on_ring = core[:, :n][:, ring]
        self._from_outside[~ring] = into @ (core[:, n:] + on_ring @ by_values)
        self._from_flux[~ring] = into @ (on_ring @ by_flux)

    def smooth(self, field: Array) -> None:
        """Continue a field (nx ny, k) in place by its biharmonic alone."""
        field[self.inside] = self._plain @ field[self.outside]

    def potential(self, field: Array, flux: Array) -> None:
        """Continue a potential (nx ny, k) in place, with the given fluxes (places, k)."""
        field[self.inside] = (
            self._from_outside @ field[self.outside] + self._from_flux @ flux[self.rows]
        )

    def _polynomials(self, sheet: Sheet, nodes: Ints, waterline: Waterline) -> tuple[Array, Array]:
        """Values at nodes of the ring from nodes outside, and from fluxes of the waterline."""
        places, outside = sheet.xy[nodes], sheet.xy[self.outside]
        far, near = KDTree(outside).query(places, k=NEAR)
        _, points = KDTree(waterline.points).query(places, k=POINTS)
        at = (outside[near] - places[:, None]) / sheet.spacing
        foot = (waterline.points[points] - places[:, None]) / sheet.spacing
        normal = waterline.normals[points]
        values = _monomials(at, 0, 0)
        slopes = normal[..., 0, None] * _monomials(foot, 1, 0)
        slopes += normal[..., 1, None] * _monomials(foot, 0, 1)
        nearest = np.asarray(far)[:, :1]
        weight = np.exp(-0.5 * ((np.asarray(far) - nearest) / sheet.spacing) ** 2)
        rows = np.concatenate([values * weight[..., None], WEIGHT * slopes], axis=1)
        fit = np.linalg.pinv(rows)[:, 0]
        by_values = np.zeros((len(nodes), len(outside)))
        by_flux = np.zeros((len(nodes), len(waterline.points)))
        index = np.arange(len(nodes))[:, None]
        by_values[index, near] = fit[:, :NEAR] * weight
        by_flux[index, points] = fit[:, NEAR:] * WEIGHT * sheet.spacing
        return by_values, by_flux


def inside_nodes(sheet: Sheet, polygons: Sequence[Array], waterline: Waterline) -> Bools:
    """Nodes inside waterline polygons, or nearer to them than MARGIN."""
    from matplotlib.path import Path

    within = np.zeros(sheet.size, dtype=bool)
    for polygon in polygons:
        within ^= Path(polygon).contains_points(sheet.xy)
    distance, _ = KDTree(waterline.points).query(sheet.xy)
    return np.asarray(within | (distance < MARGIN * sheet.spacing))


def _biharmonic_rows(sheet: Sheet, inside: Ints, number: Ints, outside: int) -> Array:
    """One row a node inside: the 13-point biharmonic, in the numbering of the continuation."""
    rows = np.zeros((len(inside), len(inside) + outside))
    i, j = np.divmod(inside, sheet.shape[1])
    for di, dj, value in _BIHARMONIC:
        at = ((i + di) % sheet.shape[0]) * sheet.shape[1] + (j + dj) % sheet.shape[1]
        np.add.at(rows, (np.arange(len(inside)), number[at]), value)
    return rows


def _monomials(at: Array, dx: int, dy: int) -> Array:
    """(..., terms) monomials up to DEGREE at places (..., 2), differentiated once or not."""
    terms = []
    for degree in range(DEGREE + 1):
        for j in range(degree + 1):
            i = degree - j
            factor = (i if dx else 1) * (j if dy else 1)
            power = at[..., 0] ** max(i - dx, 0) * at[..., 1] ** max(j - dy, 0)
            terms.append(factor * power)
    return np.stack(terms, axis=-1)
