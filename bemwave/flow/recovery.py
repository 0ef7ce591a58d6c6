"""Values and derivatives of the surface's fields at any place, by local polynomials.

What a Galerkin solution gets right is not its nodal values but its means over each node's hat:
they are those of the true field to a high order, while the nodal values of the best linear fit
exceed a sine's by (k d)^2 / 12.  So a polynomial of fourth degree is fitted, by weighted least
squares, to the hat means of the nearest nodes (moving least squares, Lancaster & Salkauskas 1981,
Math. Comput. 37:141, with means in place of values), and evaluated together with its derivatives.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import comb

import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.spatial import KDTree

from bemwave.flow.elements import Elements
from bemwave.flow.images import Images
from bemwave.kernels.panels import SEVEN

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

NEIGHBOURS = 30
POWERS = tuple((d - j, j) for d in range(5) for j in range(d + 1))


@dataclass(frozen=True)
class Recovery:
    """Linear maps from nodal values to places: value, d/dx, d/dy and the horizontal Laplacian.

    Each is sparse, (places, free nodes); `spacing` (places,) is the local distance of nodes [m].
    """

    value: sparse.csr_matrix
    dx: sparse.csr_matrix
    dy: sparse.csr_matrix
    laplacian: sparse.csr_matrix
    spacing: Array


def recover(e: Elements, xy: Array, images: Images) -> Recovery:
    """Fit at places xy (p, 2) fields of the free nodes; mirrors reflect the field."""
    nodes = e.points[: e.free, :2]
    area, moments = _hat_moments(e)
    owner, sign, shift = _with_reflections(nodes, images)
    cloud = nodes[owner] * sign + shift
    count = min(NEIGHBOURS, len(cloud))
    degree = max(d for d in range(5) if 1.5 * (d + 1) * (d + 2) / 2 <= count)
    found = KDTree(cloud).query(xy, k=count)
    distance, near = (np.asarray(part).reshape(-1, count) for part in found)
    reach = distance[:, -1]
    terms = [p for p in POWERS if sum(p) <= degree]
    basis = _hat_means(cloud, owner, sign, moments, near, xy, reach, terms)
    weight = np.exp(-2.0 * (distance / reach[:, None]) ** 2)[..., None]
    # where nodes stand in too few rows to tell all powers apart, the smallest fit there is
    fit = np.linalg.pinv(weight * basis, rcond=1e-8) * np.swapaxes(weight, 1, 2)
    means = sparse.diags(1.0 / area) @ e.mass

    def operator(rows: Array) -> sparse.csr_matrix:
        index = np.repeat(np.arange(len(xy)), count)
        picked = (rows.ravel(), (index, owner[near].ravel()))
        return sparse.csr_matrix(sparse.csr_matrix(picked, shape=(len(xy), e.free)) @ means)

    scale = 1.0 / reach[:, None]
    second = 2.0 * scale**2 * (fit[:, terms.index((2, 0))] + fit[:, terms.index((0, 2))])
    return Recovery(
        value=operator(fit[:, 0]),
        dx=operator(scale * fit[:, terms.index((1, 0))]),
        dy=operator(scale * fit[:, terms.index((0, 1))]),
        laplacian=operator(second),
        spacing=reach * np.sqrt(np.pi / count),
    )


def _hat_moments(e: Elements) -> tuple[Array, Array]:
    """Area under each free node's hat (free,), and its mean moments about the node (free, 15)."""
    moments = np.zeros((len(e.points), len(POWERS)))
    corners = e.points[e.water, :2]
    for rule in SEVEN:  # fifth degree: exact for a hat times a fourth power
        at = np.einsum("j,mjc->mc", rule[:3], corners)
        for j in range(3):
            share = e.water_table[:, 28] * rule[3] * rule[j]
            offset = at - corners[:, j]
            for k, (p, q) in enumerate(POWERS):
                power = offset[:, 0] ** p * offset[:, 1] ** q
                np.add.at(moments[:, k], e.water[:, j], share * power)
    area = moments[: e.free, 0].copy()
    return area, moments[: e.free] / area[:, None]


def _hat_means(
    cloud: Array,
    owner: Ints,
    sign: Array,
    moments: Array,
    near: Ints,
    xy: Array,
    reach: Array,
    terms: list[tuple[int, int]],
) -> Array:
    """Means over the hats near each place of the monomials about it, (places, near, terms)."""
    scale = 1.0 / reach[:, None]
    dx = (cloud[near, 0] - xy[:, None, 0]) * scale
    dy = (cloud[near, 1] - xy[:, None, 1]) * scale
    local = {
        (p, q): moments[owner[near], k] * sign[near, 0] ** p * sign[near, 1] ** q * scale ** (p + q)
        for k, (p, q) in enumerate(POWERS)
    }
    columns = []
    for i, j in terms:
        column = np.zeros_like(dx)
        for p in range(i + 1):
            for q in range(j + 1):
                factor = comb(i, p) * comb(j, q)
                column += factor * dx ** (i - p) * dy ** (j - q) * local[p, q]
        columns.append(column)
    return np.stack(columns, axis=-1)


def _with_reflections(nodes: Array, images: Images) -> tuple[Ints, Array, Array]:
    """Nodes and their reflections nearby: each one's owner, sign (n, 2) and shift (n, 2)."""
    margin = 8.0 * np.sqrt(np.prod(np.ptp(nodes, axis=0)) / len(nodes))
    low, high = nodes.min(axis=0) - margin, nodes.max(axis=0) + margin
    owners, signs, shifts = [], [], []
    for row in np.unique(np.hstack([images.signs[:, :2], images.shifts[:, :2]]), axis=0):
        sign, shift = row[:2], row[2:]
        mirrored = nodes * sign + shift
        itself = bool(np.all(sign > 0) and not shift.any())
        moved = np.linalg.norm(mirrored - nodes, axis=1) > 1e-6 * margin
        inside = ((mirrored > low) & (mirrored < high)).all(axis=1)
        keep = np.flatnonzero(inside & (moved | itself))
        owners.append(keep)
        signs.append(np.broadcast_to(sign, (len(keep), 2)))
        shifts.append(np.broadcast_to(shift, (len(keep), 2)))
    return np.concatenate(owners), np.vstack(signs), np.vstack(shifts)
