"""The elevation at waterlines, in steady waves.

A grid is at its worst within half a spacing of a waterline, where its fields are continued; the
hull's potential a panel further down is twice as good. So that is read off there: about each place
harmonic polynomials that obey the surface's condition, d(phi)/dz = w^2/g phi on z = 0, are fitted
to the nodes of the hull below.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from bemwave.flow.elements import Elements

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]

NODES = 12  # of the hull that are fitted to
POWERS = [(0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2)]  # of x and y


def at_waterlines(e: Elements, potential: Complex, rate: float) -> tuple[Array, Complex]:
    """Places (m, 2) of the nodes of waterlines, and the potential there (m,).

    Parameters
    ----------
    e : of the closed bodies, whose `free` nodes are those on z = 0.
    potential : (nodes,) of hulls and waterplanes.
    rate : w^2/g [1/m].
    """
    nodes = np.unique(e.hull)
    line, below = nodes[nodes < e.free], nodes[nodes >= e.free]
    if not len(line):
        return np.zeros((0, 2)), np.zeros(0, dtype=complex)
    at = e.points[line]
    count = min(NODES, len(below))
    found = KDTree(e.points[below]).query(at, k=count)
    distance, near = (np.asarray(part).reshape(len(at), count) for part in found)
    offset = e.points[below][near] - at[:, None]
    weight = np.exp(-2.0 * (distance / distance[:, -1:]) ** 2)[..., None]
    terms = _terms(offset / distance[:, -1:, None], rate * distance[:, -1:])
    fit = (np.linalg.pinv(weight * terms) * weight[:, None, :, 0])[:, 0]
    return at[:, :2], np.asarray((fit * potential[below][near]).sum(axis=1))


def _terms(offset: Array, rate: Array) -> Array:
    """(m, n, terms) at offsets (m, n, 3): P (1 + K z) - (P_xx + P_yy) (z^2/2 + K z^3/6)."""
    x, y, z = np.moveaxis(offset, -1, 0)
    columns = []
    for p, q in POWERS:
        bend = 2.0 if 2 in (p, q) else 0.0
        columns.append(x**p * y**q * (1.0 + rate * z) - bend * (z**2 / 2.0 + rate * z**3 / 6.0))
    return np.stack(columns, axis=-1)
