"""A large matrix of smooth influences at points, kept as blocks of few rows' worth each.

Points close together see what is far from all of them alike. For blocks far from the sources a few
sources stand in for all, chosen at a sample of the points (interpolative decomposition: Cheng et
al. 2005, SIAM J. Sci. Comput. 26:1389). Nearer, every row is reckoned, and those of a block are
spanned by a basis found by random sums of its columns, some at a time, of what those before leave
(Martinsson & Voronin 2016, SIAM J. Sci. Comput. 38:S485, algorithm randQB_b).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.linalg import interpolative

Array = npt.NDArray[np.float64]
Floats = npt.NDArray[np.float32]
Ints = npt.NDArray[np.int64]
Rows = Callable[[Array, Ints], Array]

LARGEST = 500  # points of a block all of whose rows are reckoned
FAR = 0.25  # of its own extent a block is from the sources to count as far
SAMPLE = 250  # of its points, by which the stand-ins are chosen
AT_ONCE = 40  # sums of columns
MANY = 150  # stand-ins: then better in halves
ACCURACY = 3e-6  # of a block, as the root of the sum of squares


class BlockMap:
    """The map from values to `components` numbers at each of n points.

    Parameters
    ----------
    points : (n, 3).
    distance : (n,) of the points from the sources [m].
    rows : gives (points, components, c) of the matrix, at some points for c of its columns.
    weights : (columns,) magnitudes of the values, by which errors are weighed.
    """

    def __init__(
        self, points: Array, distance: Array, rows: Rows, weights: Array, components: int
    ) -> None:
        self._points, self._distance, self._rows, self._weights = points, distance, rows, weights
        self._shape = (len(points), components)
        self._blocks: list[tuple[Ints, list[Floats]]] = []
        left = [np.arange(len(points))]
        while left:
            numbers = left.pop()
            factors = self._factors(numbers)
            if factors is None:
                left += _halves(points, numbers)
            else:
                self._blocks.append((numbers, factors))

    @property
    def memory(self) -> int:
        """Bytes held."""
        return sum(factor.nbytes for _, factors in self._blocks for factor in factors)

    def __matmul__(self, values: Array) -> Array:
        result = np.empty(self._shape)
        single = values.astype(np.float32)
        for numbers, factors in self._blocks:
            part = single
            for factor in reversed(factors):
                part = factor @ part
            result[numbers] = part.reshape(len(numbers), -1)
        return result

    def _factors(self, numbers: Ints) -> list[Floats] | None:
        """Of a block: matrices whose product it is, or none if it had better be halved."""
        extent = np.linalg.norm(np.ptp(self._points[numbers], axis=0)) if len(numbers) else 0.0
        if len(numbers) > SAMPLE and self._distance[numbers].min() > FAR * extent:
            factors = self._by_stand_ins(numbers)
            if factors is not None:
                return factors
        if len(numbers) > LARGEST:
            return None
        return self._by_basis(numbers)

    def _matrix(self, numbers: Ints, columns: Ints) -> Array:
        rows = self._rows(self._points[numbers], columns)
        return rows.reshape(len(numbers) * self._shape[1], len(columns))

    def _by_stand_ins(self, numbers: Ints) -> list[Floats] | None:
        sample = np.random.default_rng(1).choice(numbers, SAMPLE, replace=False)
        tried = self._matrix(sample, np.arange(len(self._weights))) * self._weights
        # what sheets and their images make falls off with the cube of the distance
        tried *= np.repeat(self._distance[sample] ** 3, self._shape[1])[:, None]
        found: Any = interpolative.interp_decomp(tried, ACCURACY, rand=False)
        rank, order, rest = found
        if rank > MANY:
            return None
        spread: Any = interpolative.reconstruct_interp_matrix(order, rest)
        chosen = order[:rank].astype(np.int64)
        spread = self._weights[chosen, None] * spread / self._weights
        return [_single(self._matrix(numbers, chosen)), _single(spread)]

    def _by_basis(self, numbers: Ints) -> list[Floats]:
        """Two thin matrices, or the block itself where they would not be thin."""
        matrix = self._matrix(numbers, np.arange(len(self._weights)))
        left = matrix * self._weights
        size = np.linalg.norm(left)
        random = np.random.default_rng(1)
        basis: list[Array] = []
        inner: list[Array] = []
        while len(basis) * AT_ONCE < min(matrix.shape) // 3:
            sums = left @ random.standard_normal((len(self._weights), AT_ONCE))
            basis.append(np.linalg.qr(sums)[0])
            inner.append(basis[-1].T @ left)
            left -= basis[-1] @ inner[-1]
            if np.linalg.norm(left) <= ACCURACY * size:
                return [_single(np.hstack(basis)), _single(np.vstack(inner) / self._weights)]
        return [_single(matrix)]


def _halves(points: Array, numbers: Ints) -> list[Ints]:
    """Numbers of points, parted across their longest side."""
    axis = np.argmax(np.ptp(points[numbers], axis=0))
    order = np.argsort(points[numbers, axis], kind="stable")
    return np.array_split(numbers[order], 2)


def _single(matrix: Array) -> Floats:
    return np.ascontiguousarray(matrix, dtype=np.float32)
